"""Extremes by columns against a plain loop over the points."""

from __future__ import annotations

import numpy as np
import pytest

from spinledger_app.lanes.pyramid import Pyramid


@pytest.mark.parametrize("n_points", [5, 700, 4096, 50_001])
@pytest.mark.parametrize("n_columns", [1, 7, 640])
def test_no_extreme_is_lost_and_none_is_far_off(n_points: int, n_columns: int) -> None:
    rng = np.random.default_rng(11)
    values = rng.normal(size=n_points)
    pyramid = Pyramid(values)
    start, stop = 0.2 * n_points, 0.9 * n_points
    columns = pyramid.columns(start, stop, n_columns)
    edges = np.linspace(start, stop, n_columns + 1)
    # Blocks are taken whole: never wider than a quarter of a column, or a point.
    slack = max(1, int(np.ceil((stop - start) / n_columns / 4)))
    for k in range(n_columns):
        first, last = int(edges[k]), int(np.ceil(edges[k + 1]))
        inside = values[first : max(last, first + 1)]
        around = values[max(0, first - slack) : last + slack + 1]
        assert columns.highs[k] >= inside.max()
        assert columns.highs[k] <= around.max()
        assert columns.lows[k] <= inside.min()
        assert columns.lows[k] >= around.min()


def test_one_spike_in_a_million_points_shows_in_its_column() -> None:
    values = np.zeros(1_048_576)
    values[777_777] = 5.0
    columns = Pyramid(values).columns(0, values.size, 1000)
    assert int(columns.highs.argmax()) == 777_777 * 1000 // values.size
    assert columns.highs.max() == 5.0


def test_the_last_point_counts() -> None:
    values = np.zeros(1000)
    values[-1] = 3.0
    assert Pyramid(values).extremes(0, 1000) == (0.0, 3.0)


def test_no_column_is_refused() -> None:
    with pytest.raises(ValueError, match="need a column"):
        Pyramid(np.zeros(10)).columns(0, 10, 0)
