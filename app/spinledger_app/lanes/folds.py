"""Which stretches of the axis hold something, judged by area so that humps stay.

Shifts in ppm, smoothing widths in Hz.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterable, Sequence

import numpy as np
import numpy.typing as npt

from spinledger.values.evidence import Line
from spinledger.values.spectrum import Spectrum
from spinledger_app.lanes.shift_map import Stretch

SMOOTHING_HZ = (2.0, 8.0, 32.0, 80.0)
MARGIN_HZ = 14.0
_THRESHOLD_SD = 5.0
_MOST_STRETCHES = 9
_CELL_HZ = 2.0
# A fold has to hide more than its own strip takes, in margins.
_LEAST_FOLD = 1.5
# Real lines have wider feet than a Lorentzian; so much of its tail is allowed for.
_FEET = 3.0
# 1.4826 turns a median absolute deviation into a normal sd (closed form).
_MAD_TO_SD = 1.4826


def filled_stretches(
    spectrum: Spectrum,
    ranges_ppm: Iterable[tuple[float, float]],
    *,
    whole: Stretch,
    lines: Sequence[Line] = (),
    places_ppm: Iterable[float] = (),
) -> tuple[Stretch, ...]:
    """Stretches of the axis that are not empty.

    Parameters
    ----------
    spectrum : Spectrum
    ranges_ppm : iterable of (low_ppm, high_ppm)
        Signals and strays that were found; they are always kept.
    whole : Stretch
        The axis that is shown when nothing is folded.
    lines : sequence of Line
        Their Lorentzian tails do not count as something that is there.
    places_ppm : iterable of float
        Shifts that must stay on the axis (claims without a signal).

    Returns
    -------
    tuple of Stretch
        By descending shift, at most nine; the whole axis if nothing is there.
    """
    margin_ppm = MARGIN_HZ / spectrum.spectrometer_frequency_mhz
    spans = [(low, high) for low, high in ranges_ppm]
    spans += [(place - margin_ppm, place + margin_ppm) for place in places_ppm]
    spans += _spans_by_area(spectrum, lines)
    widened = [
        (max(low - margin_ppm, whole.low_ppm), min(high + margin_ppm, whole.high_ppm))
        for low, high in spans
    ]
    merged = _merged(
        [span for span in widened if span[0] < span[1]], _LEAST_FOLD * margin_ppm
    )
    while len(merged) > _MOST_STRETCHES:
        merged = _closest_joined(merged)
    if not merged:
        return (whole,)
    return tuple(Stretch(low_ppm=low, high_ppm=high) for low, high in reversed(merged))


def _spans_by_area(
    spectrum: Spectrum, lines: Sequence[Line]
) -> list[tuple[float, float]]:
    points_per_cell = max(1, round(_CELL_HZ / spectrum.step_hz))
    n_cells = spectrum.n_points // points_per_cell
    if n_cells < 8:
        return []
    cells = spectrum.intensities[: n_cells * points_per_cell]
    means = cells.reshape(n_cells, points_per_cell).mean(axis=1)
    cell_ppm = spectrum.step_ppm * points_per_cell
    cells_at = np.arange(n_cells, dtype=np.float64) + 0.5
    centres = spectrum.first_point_ppm - cell_ppm * cells_at
    tails = _tails(
        np.asarray(centres * spectrum.spectrometer_frequency_mhz), lines, spectrum
    )
    filled = np.zeros(n_cells, dtype=bool)
    for width_hz in SMOOTHING_HZ:
        filled |= _outstanding(means, tails, max(1, round(width_hz / _CELL_HZ)))
    starts, stops = _runs(filled)
    return [
        (
            spectrum.first_point_ppm - stop * cell_ppm,
            spectrum.first_point_ppm - start * cell_ppm,
        )
        for start, stop in zip(starts, stops, strict=True)
    ]


def _tails(
    places_hz: npt.NDArray[np.float64], lines: Sequence[Line], spectrum: Spectrum
) -> npt.NDArray[np.float64]:
    """Sum of the lines' Lorentzian shapes at some places."""
    total = np.zeros_like(places_hz)
    for line in lines:
        half = max(line.width_hz, 0.2) / 2
        away = places_hz - line.shift_ppm * spectrum.spectrometer_frequency_mhz
        total += line.area * half / np.pi / (away**2 + half**2)
    return total


def _outstanding(
    means: npt.NDArray[np.float64], tails: npt.NDArray[np.float64], n_cells: int
) -> npt.NDArray[np.bool_]:
    kernel = np.ones(n_cells) / n_cells
    rest = np.convolve(means - tails, kernel, mode="same")
    expected = np.convolve(np.abs(tails), kernel, mode="same")
    middle = np.median(rest)
    sd = _MAD_TO_SD * float(np.median(np.abs(rest - middle)))
    limit = _THRESHOLD_SD * max(sd, 1e-300) + _FEET * expected
    above = np.abs(rest - middle) > limit
    if n_cells == 1:
        return above
    return np.convolve(above, np.ones(max(1, n_cells // 2)), mode="same") > 0.5


def _runs(filled: npt.NDArray[np.bool_]) -> tuple[list[int], list[int]]:
    padded = np.concatenate(([False], filled, [False])).astype(np.int8)
    changes = np.diff(padded)
    starts = np.flatnonzero(changes == 1)
    stops = np.flatnonzero(changes == -1)
    return [int(one) for one in starts], [int(one) for one in stops]


def _merged(
    spans: list[tuple[float, float]], smallest_fold_ppm: float
) -> list[tuple[float, float]]:
    merged: list[tuple[float, float]] = []
    for low, high in sorted(spans):
        if merged and low - merged[-1][1] < smallest_fold_ppm:
            merged[-1] = (merged[-1][0], max(high, merged[-1][1]))
        else:
            merged.append((low, high))
    return merged


def _closest_joined(spans: list[tuple[float, float]]) -> list[tuple[float, float]]:
    folds = [after[0] - before[1] for before, after in itertools.pairwise(spans)]
    index = int(np.argmin(folds))
    joined = (spans[index][0], spans[index + 1][1])
    return [*spans[:index], joined, *spans[index + 2 :]]
