"""Boxcars, stretches and edge baselines against slow or closed forms."""

import numpy as np
import pytest

from spinledger.reconcile.windows import (
    Stretch,
    boxcar,
    edge_baseline,
    stretches,
    widened,
)


def test_boxcar_is_the_plain_mean_of_its_neighbours() -> None:
    values = np.random.default_rng(1).normal(size=50)
    slow = [values[max(0, i - 3) : i + 4].mean() for i in range(50)]
    # Rounding of a running sum of 50 numbers near one.
    assert boxcar(values, 3) == pytest.approx(slow, abs=1e-12)


def test_stretches_are_padded_and_merged() -> None:
    inside = np.zeros(30, dtype=bool)
    inside[[5, 6, 10, 25]] = True
    assert stretches(inside, pad=2) == (
        Stretch(start=3, stop=13),
        Stretch(start=23, stop=28),
    )


def test_widened_reaches_exactly_the_pad() -> None:
    inside = np.zeros(9, dtype=bool)
    inside[4] = True
    assert widened(inside, 2).tolist() == [False] * 2 + [True] * 5 + [False] * 2


def test_edge_baseline_follows_a_slope_and_ignores_the_middle() -> None:
    slope = np.linspace(1.0, 3.0, 101)
    bumped = slope.copy()
    bumped[40:60] += 10.0
    found = edge_baseline(bumped, (Stretch(start=0, stop=101),), 1)
    # One edge point at each end: the straight line through them.
    assert found == pytest.approx(slope, abs=1e-12)
