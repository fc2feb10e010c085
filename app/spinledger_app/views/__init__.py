"""Widgets: show_…() in, signals out; no decisions, no numerics."""
