"""Smallest and largest values of a long trace per screen column, made once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

_STEP = 4
_COARSEST = 512


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Columns:
    """Lowest and highest value in each screen column, both shape (n_columns,)."""

    lows: npt.NDArray[np.float64]
    highs: npt.NDArray[np.float64]


class Pyramid:
    """A trace with its minima and maxima over blocks of 4, 16, 64 … points.

    Parameters
    ----------
    values : array, shape (n_points,)
        Kept by reference, not copied.
    """

    def __init__(self, values: npt.NDArray[np.float64]) -> None:
        self.values = values
        lows: npt.NDArray[np.float64] = values
        highs: npt.NDArray[np.float64] = values
        self._levels = [(lows, highs)]
        while lows.size > _COARSEST:
            lows = _blocks(lows, np.minimum)
            highs = _blocks(highs, np.maximum)
            self._levels.append((lows, highs))

    @property
    def n_points(self) -> int:
        """Number of points of the trace."""
        return int(self.values.size)

    def columns(self, start: float, stop: float, n_columns: int) -> Columns:
        """Extremes over ``n_columns`` equal parts of the points start to stop.

        Blocks at the ends of a column are taken whole, so an extreme may stand
        a quarter of a column off, never go missing.

        Raises
        ------
        ValueError
            If there is no column or no point.
        """
        if n_columns < 1 or not stop > start:
            raise ValueError(
                f"need a column and a range, got {n_columns}, {start}-{stop}"
            )
        points_per_column = (stop - start) / n_columns
        level = 0
        while (
            level + 1 < len(self._levels)
            and _STEP ** (level + 1) * _STEP <= points_per_column
        ):
            level += 1
        lows, highs = self._levels[level]
        edges = np.linspace(start, stop, n_columns + 1) / _STEP**level
        first = np.clip(edges[:-1].astype(np.int64), 0, lows.size - 1)
        last = np.clip(np.ceil(edges[1:]).astype(np.int64), first + 1, lows.size)
        # Columns share their border block, so that a stroke has no breaks.
        bounds = np.empty(2 * n_columns, dtype=np.int64)
        bounds[0::2] = first
        bounds[1::2] = last
        return Columns(
            lows=_reduced(np.minimum, lows, bounds),
            highs=_reduced(np.maximum, highs, bounds),
        )

    def extremes(self, start: int, stop: int) -> tuple[float, float]:
        """Smallest and largest value of the points start to stop."""
        columns = self.columns(max(start, 0), max(stop, start + 1), 1)
        return float(columns.lows[0]), float(columns.highs[0])


def _reduced(
    ufunc: np.ufunc, values: npt.NDArray[np.float64], bounds: npt.NDArray[np.int64]
) -> npt.NDArray[np.float64]:
    capped = np.minimum(bounds, values.size - 1)
    reduced = ufunc.reduceat(values, capped)[0::2]
    # A stop that had to be capped left the last value out; put it in again.
    clipped = bounds[1::2] > capped[1::2]
    if np.any(clipped):
        reduced[clipped] = ufunc(reduced[clipped], values[-1])
    return np.asarray(reduced, dtype=np.float64)


def _blocks(
    values: npt.NDArray[np.float64], ufunc: np.ufunc
) -> npt.NDArray[np.float64]:
    whole = values.size // _STEP * _STEP
    blocks = ufunc.reduce(values[:whole].reshape(-1, _STEP), axis=1)
    if whole < values.size:
        blocks = np.append(blocks, ufunc.reduce(values[whole:]))
    return np.asarray(blocks, dtype=np.float64)
