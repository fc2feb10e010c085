"""Exact spin physics: systems, transitions, derivatives, trees, synthesis."""
