"""Fits of the lines in each range; frequencies count from point 0, in Hz."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import numpy.typing as npt

from spinledger.lines.deconvolution import FittedLines, NoiseModel, fit_lines
from spinledger.lines.picking import Picks
from spinledger.lines.shapes import lorentzian
from spinledger.lines.splitting import Stretch, fit_with_splits
from spinledger.values.spectrum import Spectrum

_MOST_LINES_AT_ONCE = 24
_MARGIN_HZ = 4.0
_MOST_POINTS = 1500
_CLEAR_SHARE = 0.25
# Ranges hold three widths of a line at least, or the fit looks beyond them.
_BROAD_WIDTHS = 3.0


def fit_range(
    spectrum: Spectrum, picks: Picks, start: int, stop: int, *, noise: NoiseModel
) -> tuple[FittedLines, ...]:
    """Fitted lines between two point indices, in blocks of neighbours.

    Where nothing is picked the whole range is one broad line.
    """
    inside = (picks.points >= start) & (picks.points < stop)
    points, heights = picks.points[inside], picks.heights[inside]
    if points.size == 0:
        return (_hump(spectrum, *_wider(picks, start, stop), noise),)
    width_hz = _typical_width_hz(spectrum, points, heights)
    limits = (start, stop)
    if _BROAD_WIDTHS * width_hz > (stop - start) * spectrum.step_hz:
        limits = _wider(picks, start, stop)
    cuts = _block_cuts(points)
    return tuple(
        _fit_block(spectrum, points[low:high], limits, width_hz, noise)
        for low, high in pairwise(cuts)
    )


def model_of(
    fits: tuple[FittedLines, ...], frequencies_hz: npt.NDArray[np.float64]
) -> npt.NDArray[np.float64]:
    """Sum of all fitted lines at given frequencies."""
    total = np.zeros(frequencies_hz.size)
    for fit in fits:
        apart = frequencies_hz[:, None] - fit.centres_hz
        total += lorentzian(apart, fit.widths_hz) @ fit.areas
    return total


def _typical_width_hz(
    spectrum: Spectrum,
    points: npt.NDArray[np.float64],
    heights: npt.NDArray[np.float64],
) -> float:
    """Full width of the tallest lines, by the nearer half-height crossing."""
    tallest = np.argsort(-heights)[:8]
    widths = [_half_height_width(spectrum, round(points[one])) for one in tallest]
    return float(np.clip(np.quantile(widths, 0.25), 3 * spectrum.step_hz, 30.0))


def _half_height_width(spectrum: Spectrum, top: int) -> float:
    trace = spectrum.intensities
    half = trace[top] / 2
    reach = int(30.0 / spectrum.step_hz)
    right = trace[top : top + reach] < half
    left = trace[max(0, top - reach) : top + 1][::-1] < half
    sides = [int(np.argmax(side)) for side in (left, right) if side.any()]
    return 2 * min(sides, default=reach) * spectrum.step_hz


def _block_cuts(points: npt.NDArray[np.float64]) -> list[int]:
    """Indices between which at most 24 lines stand, cut at the widest gaps."""
    cuts = [0]
    while points.size - cuts[-1] > _MOST_LINES_AT_ONCE:
        low = cuts[-1] + _MOST_LINES_AT_ONCE // 2
        high = cuts[-1] + _MOST_LINES_AT_ONCE
        gaps = np.diff(points[low - 1 : high + 1])
        cuts.append(low + int(np.argmax(gaps)))
    return [*cuts, int(points.size)]


def _fit_block(
    spectrum: Spectrum,
    points: npt.NDArray[np.float64],
    limits: tuple[int, int],
    width_hz: float,
    noise: NoiseModel,
) -> FittedLines:
    step_hz = spectrum.step_hz
    margin = int(max(_MARGIN_HZ, 4 * width_hz) / step_hz)
    start = max(limits[0], int(points[0]) - margin)
    stop = min(limits[1], int(points[-1]) + margin + 1)
    stride = max(1, min((stop - start) // _MOST_POINTS, int(width_hz / 6 / step_hz)))
    index = np.arange(start, stop, stride)
    stretch = Stretch(
        frequencies_hz=index.astype(np.float64) * step_hz,
        intensities=spectrum.intensities[index],
        width_hz=width_hz,
        noise=noise.every(stride),
    )
    return fit_with_splits(stretch, points * step_hz)


def _wider(picks: Picks, start: int, stop: int) -> tuple[int, int]:
    """Range of a broad line with as much again on both sides, short of other lines.

    The range holds its top; without its feet the base would take them.
    """
    before, after = (
        picks.points[picks.points < start],
        picks.points[picks.points >= stop],
    )
    low, high = 2 * start - stop, 2 * stop - start
    clear = _CLEAR_SHARE * (stop - start)
    if before.size:
        low = max(low, int(before.max() + clear))
    if after.size:
        high = min(high, int(after.min() - clear))
    return max(0, min(low, start)), max(high, stop)


def _hump(spectrum: Spectrum, start: int, stop: int, noise: NoiseModel) -> FittedLines:
    trace = np.maximum(spectrum.intensities[start:stop], 0.0)
    index = np.arange(start, stop)
    total = float(trace.sum())
    centre = float(index @ trace / total) if total > 0 else (start + stop) / 2
    stride = max(1, (stop - start) // 400)
    chosen = index[::stride]
    return fit_lines(
        chosen.astype(np.float64) * spectrum.step_hz,
        spectrum.intensities[chosen],
        np.array([centre * spectrum.step_hz]),
        width_hz=max((stop - start) * spectrum.step_hz / 6, 3 * spectrum.step_hz),
        noise=noise.every(stride),
    )
