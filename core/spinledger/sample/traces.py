"""Two spectra on one axis: resampling, integrals over a local ground, and sds.

Shifts in ppm, widths in Hz, areas in intensity * Hz.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.interpolate import CubicSpline

from spinledger.values.evidence import Evidence
from spinledger.values.spectrum import Spectrum

Floats = npt.NDArray[np.float64]
Range = tuple[float, float]

# Ground on each side of an integral, as a share of its width.
FLANK_SHARE = 0.25
LEAST_FLANK_HZ = 4.0
# As many empty stretches at least, to take an integral's sd from them.
LEAST_STRETCHES = 12
MOST_STRETCHES = 60
EDGE_SHARE = 0.03


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Trace:
    """Intensities on a uniform axis, with the stretches that hold no signal.

    Attributes
    ----------
    shifts_ppm : numpy.ndarray, shape (n_points,), ppm
        Descending.
    intensities : numpy.ndarray, shape (n_points,)
    frequency_mhz : float, MHz
    is_empty : numpy.ndarray of bool, shape (n_points,)
    noise_sd : float
        Of one point.
    """

    shifts_ppm: Floats
    intensities: Floats
    frequency_mhz: float
    is_empty: npt.NDArray[np.bool_]
    noise_sd: float

    @property
    def step_hz(self) -> float:
        """Distance of neighbouring points, Hz."""
        apart_ppm = float(self.shifts_ppm[0] - self.shifts_ppm[-1])
        return apart_ppm / (self.shifts_ppm.size - 1) * self.frequency_mhz

    def points(self, low_ppm: float, high_ppm: float) -> slice:
        """Points between two shifts, clipped to the axis."""
        step_ppm = self.step_hz / self.frequency_mhz
        top = float(self.shifts_ppm[0])
        first = int(np.ceil((top - high_ppm) / step_ppm))
        last = int(np.floor((top - low_ppm) / step_ppm)) + 1
        n_points = self.shifts_ppm.size
        return slice(min(max(first, 0), n_points), min(max(last, 0), n_points))


@dataclass(frozen=True, slots=True, kw_only=True)
class Integral:
    """Area over a local straight ground, with its sd from empty stretches."""

    area: float
    sd: float


def trace_of(evidence: Evidence) -> Trace:
    """Trace of a spectrum as it stands."""
    spectrum = evidence.spectrum
    return Trace(
        shifts_ppm=spectrum.shifts_ppm,
        intensities=spectrum.intensities,
        frequency_mhz=spectrum.spectrometer_frequency_mhz,
        is_empty=empty_points(spectrum.shifts_ppm, occupied(evidence)),
        noise_sd=evidence.noise_sd,
    )


def trace_upon(evidence: Evidence, axis: Trace, *, offset_ppm: float = 0.0) -> Trace:
    """Trace of a spectrum on the axis of another, moved up by ``offset_ppm``.

    Points beyond its own ends are 0 and not empty.
    """
    spectrum = evidence.spectrum
    moved = resampled(spectrum, axis.shifts_ppm - offset_ppm)
    lows = [(low + offset_ppm, high + offset_ppm) for low, high in occupied(evidence)]
    inside = covers(spectrum, axis.shifts_ppm - offset_ppm)
    return Trace(
        shifts_ppm=axis.shifts_ppm,
        intensities=moved,
        frequency_mhz=axis.frequency_mhz,
        is_empty=empty_points(axis.shifts_ppm, lows) & inside,
        noise_sd=evidence.noise_sd,
    )


def resampled(spectrum: Spectrum, shifts_ppm: npt.NDArray[np.floating]) -> Floats:
    """Intensities at other shifts, by cubic spline; 0 beyond the ends."""
    ascending = spectrum.shifts_ppm[::-1]
    spline = CubicSpline(ascending, spectrum.intensities[::-1], extrapolate=False)
    return np.nan_to_num(np.asarray(spline(shifts_ppm), dtype=np.float64), nan=0.0)


def covers(spectrum: Spectrum, shifts_ppm: Floats) -> npt.NDArray[np.bool_]:
    """Which shifts lie on the axis of a spectrum."""
    return np.asarray(
        (shifts_ppm <= spectrum.first_point_ppm)
        & (shifts_ppm >= spectrum.last_point_ppm)
    )


def occupied(evidence: Evidence) -> list[Range]:
    """Stretches with a signal or a stray."""
    return [(one.low_ppm, one.high_ppm) for one in evidence.signals] + [
        (one.low_ppm, one.high_ppm) for one in evidence.strays
    ]


def empty_points(shifts_ppm: Floats, ranges: Sequence[Range]) -> npt.NDArray[np.bool_]:
    """Points outside all ranges and away from the edges of the axis."""
    empty = np.ones(shifts_ppm.size, dtype=np.bool_)
    edge = int(EDGE_SHARE * shifts_ppm.size)
    empty[:edge] = False
    empty[shifts_ppm.size - edge :] = False
    for low, high in ranges:
        empty[(shifts_ppm >= low) & (shifts_ppm <= high)] = False
    return empty


def integral(trace: Trace, low_ppm: float, high_ppm: float) -> Integral:
    """Area between two shifts above the line through the flanks on both sides.

    Parameters
    ----------
    trace : Trace
    low_ppm, high_ppm : float, ppm

    Notes
    -----
    The sd is the robust spread of the same integral over empty stretches of the
    same trace, so that correlated noise and a rolling baseline are in it. Where
    too few are empty, it is taken from the noise of a point, four points to a
    degree of freedom.
    """
    window = trace.points(low_ppm, high_ppm)
    n_points = max(window.stop - window.start, 1)
    flank = flank_points(trace, n_points)
    area = _over_ground(trace.intensities, window.start, n_points, flank)
    return Integral(
        area=area * trace.step_hz, sd=_spread(trace, n_points, flank) * trace.step_hz
    )


def flank_points(trace: Trace, n_points: int) -> int:
    """Points of the ground on each side of an integral."""
    least = int(np.ceil(LEAST_FLANK_HZ / trace.step_hz))
    return max(least, round(FLANK_SHARE * n_points))


def _over_ground(values: Floats, first: int, n_points: int, flank: int) -> float:
    """Sum over a window minus the straight ground through the flanks' medians."""
    left = values[max(first - flank, 0) : first]
    right = values[first + n_points : first + n_points + flank]
    levels = [float(np.median(side)) for side in (left, right) if side.size]
    ground = float(np.mean(levels)) if levels else 0.0
    return float(values[first : first + n_points].sum() - ground * n_points)


def _areas_over_ground(
    values: Floats, firsts: npt.NDArray[np.int64], n_points: int, flank: int
) -> Floats:
    """The same for many windows that lie well inside the trace."""
    sums = np.concatenate([[0.0], np.cumsum(values)])
    reach = np.arange(flank)
    left = np.median(values[firsts[:, None] - flank + reach], axis=1)
    right = np.median(values[firsts[:, None] + n_points + reach], axis=1)
    areas = sums[firsts + n_points] - sums[firsts] - n_points * (left + right) / 2.0
    return np.asarray(areas, dtype=np.float64)


def _spread(trace: Trace, n_points: int, flank: int) -> float:
    """Robust sd of the integral over empty stretches, in intensity * points."""
    length = n_points + 2 * flank
    counts = np.concatenate([[0], np.cumsum(~trace.is_empty)])
    starts = np.arange(0, trace.is_empty.size - length, max(length // 3, 1))
    free = [int(s) for s in starts if counts[s + length] == counts[s]]
    if len(free) >= LEAST_STRETCHES:
        chosen = free[:: max(-(-len(free) // MOST_STRETCHES), 1)]
        areas = _areas_over_ground(
            trace.intensities, np.array(chosen) + flank, n_points, flank
        )
        # 1.4826: median deviation to sd of a normal distribution.
        return float(1.4826 * np.median(np.abs(areas - np.median(areas))))
    # The ground's medians add as much again for these flanks (pi / 2 over 2 shares).
    ground = 1.0 + np.pi / 2.0 * n_points / (2.0 * flank)
    return float(trace.noise_sd * np.sqrt(4.0 * n_points * ground))
