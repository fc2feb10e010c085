"""Stretches of a spectrum, boxcar means and local baselines.

Shifts in ppm, widths in Hz; arrays run along the evidence's own axis.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from spinledger.reconcile.coarse import BoolArray, FloatArray
from spinledger.values.spectrum import Spectrum


@dataclass(frozen=True, slots=True, kw_only=True)
class Stretch:
    """A run of points, ``stop`` excluded."""

    start: int
    stop: int

    def range_ppm(self, spectrum: Spectrum) -> tuple[float, float]:
        """Lowest and highest shift of the run, ppm."""
        step = spectrum.step_ppm
        low = spectrum.first_point_ppm - step * (self.stop - 1)
        return low, spectrum.first_point_ppm - step * self.start


def boxcar(values: FloatArray, half_points: int) -> FloatArray:
    """Mean over ``2 * half_points + 1`` points; fewer at the ends."""
    if half_points < 1:
        return np.array(values, dtype=np.float64)
    sums = np.concatenate([[0.0], np.cumsum(values)])
    where = np.arange(values.size)
    low = np.maximum(where - half_points, 0)
    high = np.minimum(where + half_points + 1, values.size)
    return np.asarray((sums[high] - sums[low]) / (high - low))


def stretches(inside: BoolArray, *, pad: int = 0) -> tuple[Stretch, ...]:
    """Runs of true points, widened by ``pad`` points and merged."""
    flags = widened(inside, pad) if pad else inside
    steps = np.diff(np.concatenate([[0], flags.astype(np.int8), [0]]))
    starts, stops = np.flatnonzero(steps == 1), np.flatnonzero(steps == -1)
    return tuple(
        Stretch(start=int(start), stop=int(stop))
        for start, stop in zip(starts, stops, strict=True)
    )


def widened(inside: BoolArray, pad: int) -> BoolArray:
    """True wherever a true point lies within ``pad`` points."""
    counts = np.concatenate([[0], np.cumsum(inside.astype(np.int64))])
    where = np.arange(inside.size)
    low = np.maximum(where - pad, 0)
    high = np.minimum(where + pad + 1, inside.size)
    return np.asarray(counts[high] > counts[low])


def points_of_hz(spectrum: Spectrum, width_hz: float) -> int:
    """Points that a width covers, at least one."""
    return max(1, round(width_hz / spectrum.step_hz))


def inside_ranges(
    spectrum: Spectrum, ranges_ppm: Iterable[tuple[float, float]]
) -> BoolArray:
    """Points within any of the (low_ppm, high_ppm) ranges."""
    inside = np.zeros(spectrum.n_points, dtype=np.bool_)
    for low_ppm, high_ppm in ranges_ppm:
        inside[spectrum.window(low_ppm, high_ppm)] = True
    return inside


def edge_baseline(
    residual: FloatArray, windows: tuple[Stretch, ...], edge_points: int
) -> FloatArray:
    """Straight line through the residual at both edges of every window.

    Parameters
    ----------
    residual : numpy.ndarray, shape (n_points,)
        Measured minus modelled.
    windows : tuple of Stretch
        Signals with some empty spectrum at both ends.
    edge_points : int
        Points at each end whose median is taken.
    """
    baseline = np.zeros(residual.size)
    for window in windows:
        size = window.stop - window.start
        n_edge = max(1, min(edge_points, size // 4))
        inside = residual[window.start : window.stop]
        left = float(np.median(inside[:n_edge]))
        right = float(np.median(inside[-n_edge:]))
        baseline[window.start : window.stop] = np.linspace(left, right, size)
    return baseline
