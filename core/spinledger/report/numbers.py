"""Numbers as they stand in files."""

from __future__ import annotations

import math


def finite(value: float | None) -> float | int | None:
    """Plain finite number with seven digits, or None."""
    if value is None or not math.isfinite(value):
        return None
    rounded = float(f"{float(value):.7g}") + 0.0  # minus zero becomes zero
    return int(value) if isinstance(value, int) else rounded
