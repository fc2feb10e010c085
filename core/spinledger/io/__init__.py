"""Reading and writing of vendor and standard files; the only room that sees their parameter names."""
