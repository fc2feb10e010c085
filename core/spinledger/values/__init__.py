"""Frozen values that every room hands on; no computation beyond derived properties."""
