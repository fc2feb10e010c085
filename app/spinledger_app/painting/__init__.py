"""Brush work that all panels share: text, rules, state marks, icons."""
