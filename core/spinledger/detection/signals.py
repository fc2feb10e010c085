"""Signals of a processed spectrum: ranges, fitted lines, integrals, each with sd.

Shifts in ppm, frequencies and widths in Hz, areas in intensity * Hz.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.detection.fitting import fit_range
from spinledger.detection.ranges import signal_ranges
from spinledger.lines.deconvolution import FittedLines, NoiseModel
from spinledger.lines.picking import Picks
from spinledger.lines.shapes import lorentzian, share_within
from spinledger.values.evidence import Line, Signal
from spinledger.values.spectrum import Spectrum

# A fit may move at most this share of an integral into or out of the range.
_MOST_TAIL_SHARE = 0.2
_TAIL_DOUBT = 0.3
_FOOT_DOUBT = 0.5
_GOOD_MISFIT = 1.25
_AGREEMENT_SD = 3.0
# The baseline cannot follow tails of lines nearer than this.
_NEAR_HZ = 150.0
_FAR_SHARE = 0.05
# Where the level beside a range is read, from its edge; a third must be free.
_MARGIN_HZ = (2.0, 17.0)
_LEAST_MARGIN_SHARE = 0.3
_BASE_SDS = 4.0


@dataclass(frozen=True, slots=True, kw_only=True)
class IntegralDoubt:
    """What an integral is uncertain by, beside noise.

    Attributes
    ----------
    relative_sd : float
        Share of the integral: relaxation, pulse angle, line feet.
    near_water_sd : float
        The same where water is suppressed, within ``water_reach_ppm`` of it.
    water_ppm : float or None, ppm
    water_reach_ppm : float, ppm
    baseline_sd : float
        Doubt of the baseline under a signal, in intensity.
    """

    relative_sd: float
    near_water_sd: float
    water_ppm: float | None
    water_reach_ppm: float
    baseline_sd: float

    def at(self, shift_ppm: float) -> float:
        """Relative sd of an integral at a shift."""
        if (
            self.water_ppm is not None
            and abs(shift_ppm - self.water_ppm) < self.water_reach_ppm
        ):
            return self.near_water_sd
        return self.relative_sd


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class _Part:
    """One range with its lines as flat arrays; Hz from point 0."""

    start: int
    stop: int
    centres: npt.NDArray[np.float64]
    centre_sds: npt.NDArray[np.float64]
    areas: npt.NDArray[np.float64]
    area_sds: npt.NDArray[np.float64]
    widths: npt.NDArray[np.float64]
    width_sds: npt.NDArray[np.float64]
    total_area_sd: float
    misfit_sd: float


def find_signals(
    spectrum: Spectrum, picks: Picks, *, noise: NoiseModel, doubt: IntegralDoubt
) -> tuple[Signal, ...]:
    """All signals by falling shift, weak ones and broad humps included.

    Parameters
    ----------
    spectrum : Spectrum
        Phased and flat.
    picks : Picks
        Its lines.
    noise : NoiseModel
    doubt : IntegralDoubt

    Notes
    -----
    An integral is the sum over the range, less what other signals' lines leave in
    it, plus what its own lines leave outside (Lorentz tails from the fit). Sums
    beat fitted areas where the line shape is not known; the fit only moves tails.
    """
    parts = []
    for start, stop in signal_ranges(spectrum, picks, noise_sd=noise.sd):
        fits = fit_range(spectrum, picks, start, stop, noise=noise)
        part = _part(start, stop, fits)
        if part.centres.size:
            parts.append(part)
    return tuple(_signal(spectrum, part, parts, noise, doubt) for part in parts)


def _part(start: int, stop: int, fits: tuple[FittedLines, ...]) -> _Part:
    areas = np.concatenate([fit.areas for fit in fits])
    real = areas > 0
    return _Part(
        start=start,
        stop=stop,
        centres=np.concatenate([fit.centres_hz for fit in fits])[real],
        centre_sds=np.concatenate([fit.centre_sds_hz for fit in fits])[real],
        areas=areas[real],
        area_sds=np.concatenate([fit.area_sds for fit in fits])[real],
        widths=np.concatenate([fit.widths_hz for fit in fits])[real],
        width_sds=np.concatenate([fit.width_sds_hz for fit in fits])[real],
        total_area_sd=math.sqrt(sum(fit.total_area_sd**2 for fit in fits)),
        misfit_sd=max(fit.misfit_sd for fit in fits),
    )


def _signal(
    spectrum: Spectrum,
    part: _Part,
    parts: list[_Part],
    noise: NoiseModel,
    doubt: IntegralDoubt,
) -> Signal:
    step_hz, frequency = spectrum.step_hz, spectrum.spectrometer_frequency_mhz
    low_hz, high_hz = (part.start - 0.5) * step_hz, (part.stop - 0.5) * step_hz
    middle_ppm = spectrum.first_point_ppm - (low_hz + high_hz) / 2 / frequency
    area, random_sd = _integral(spectrum, part, parts, noise)
    area_sd = np.sqrt(
        random_sd**2
        + (doubt.baseline_sd * (high_hz - low_hz)) ** 2
        + (doubt.at(middle_ppm) * area) ** 2
    )
    return Signal(
        low_ppm=spectrum.first_point_ppm - high_hz / frequency,
        high_ppm=spectrum.first_point_ppm - low_hz / frequency,
        area=area,
        area_sd=float(area_sd),
        lines=_lines(spectrum, part),
    )


def _integral(
    spectrum: Spectrum, part: _Part, parts: list[_Part], noise: NoiseModel
) -> tuple[float, float]:
    """Area of a signal and its sd without what is common to all."""
    fitted, fitted_sd = float(part.areas.sum()), part.total_area_sd
    described, step_hz = _is_described(part, noise), spectrum.step_hz
    if described and _is_broad(part, step_hz):
        # Most of a broad line lies outside its range: only the fit sees it.
        return fitted, math.hypot(fitted_sd, _TAIL_DOUBT * _outside(part, step_hz))
    summed, summed_sd = _summed(spectrum, part, parts, noise)
    if described and abs(fitted - summed) < _AGREEMENT_SD * summed_sd:
        # Lorentz lines describe it to the noise: their sum is the best estimate.
        return fitted, fitted_sd
    if summed <= 0:
        # Signals on the dispersive foot of water: only the lines can be weighed.
        return fitted, math.hypot(fitted_sd, _FOOT_DOUBT * fitted)
    return summed, summed_sd


def _is_described(part: _Part, noise: NoiseModel) -> bool:
    """Whether Lorentz lines describe the range to its noise."""
    return part.misfit_sd < _GOOD_MISFIT * noise.sd


def _is_broad(part: _Part, step_hz: float) -> bool:
    """Whether a fifth of the fitted area or more lies outside the range."""
    return _outside(part, step_hz) > _MOST_TAIL_SHARE * float(part.areas.sum())


def _outside(part: _Part, step_hz: float) -> float:
    """Area of its lines beyond the range."""
    low_hz, high_hz = (part.start - 0.5) * step_hz, (part.stop - 0.5) * step_hz
    inside = share_within(low_hz, high_hz, part.centres, part.widths)
    return float(part.areas @ (1 - inside))


def _summed(
    spectrum: Spectrum, part: _Part, parts: list[_Part], noise: NoiseModel
) -> tuple[float, float]:
    """Sum over the range, moved by what lines leave in it and outside it."""
    step_hz = spectrum.step_hz
    low_hz, high_hz = (part.start - 0.5) * step_hz, (part.stop - 0.5) * step_hz
    summed = float(spectrum.intensities[part.start : part.stop].sum()) * step_hz
    outside = _outside(part, step_hz)
    intruding = _intruding(parts, part, low_hz, high_hz)
    most = _MOST_TAIL_SHARE * abs(summed)
    correction = float(np.clip(outside - intruding, -most, most))
    n_points = part.stop - part.start
    random_sd = noise.sd * step_hz * math.sqrt(n_points * noise.correlation)
    moved = (summed + correction, math.hypot(random_sd, _TAIL_DOUBT * correction))
    near = [other for other in parts if _are_near(part, other, step_hz)]
    intruding_near = _intruding(near, part, low_hz, high_hz)
    if intruding - intruding_near < _FAR_SHARE * abs(summed):
        return moved
    # Tails of a giant further off: the stiff baseline has taken out most of them,
    # and what is left is read beside the range.
    correction = outside - intruding_near
    correction -= _local_base(spectrum, part, near, noise) * n_points * step_hz
    levelled = (summed + correction, math.hypot(random_sd, _TAIL_DOUBT * correction))
    fitted = float(part.areas.sum())
    return min(moved, levelled, key=lambda one: abs(one[0] - fitted))


def _intruding(
    others: list[_Part], part: _Part, low_hz: float, high_hz: float
) -> float:
    """Area that the lines of other signals leave in a range."""
    return sum(
        float(other.areas @ share_within(low_hz, high_hz, other.centres, other.widths))
        for other in others
        if other is not part
    )


def _are_near(part: _Part, other: _Part, step_hz: float) -> bool:
    """Whether the baseline is too stiff to have followed the other's tails."""
    apart = max(part.start - other.stop, other.start - part.stop, 0)
    return apart * step_hz < _NEAR_HZ


def _local_base(
    spectrum: Spectrum, part: _Part, near: list[_Part], noise: NoiseModel
) -> float:
    """Mean level on both sides of a range, beyond all lines; 0 within its noise.

    The stiff baseline leaves something beside a giant line such as water.
    """
    step_hz = spectrum.step_hz
    skip, reach = int(_MARGIN_HZ[0] / step_hz), int(_MARGIN_HZ[1] / step_hz)
    levels, variance = [], 0.0
    for low, high in (
        (part.start - reach, part.start - skip),
        (part.stop + skip, part.stop + reach),
    ):
        index = np.arange(max(low, 0), min(high, spectrum.n_points))
        for other in near:
            clear = (index < other.start - skip) | (index >= other.stop + skip)
            index = index[clear]
        if index.size < _LEAST_MARGIN_SHARE * (reach - skip):
            return 0.0
        level = spectrum.intensities[index]
        for other in near:
            apart = index[:, None] * step_hz - other.centres
            level = level - lorentzian(apart, other.widths) @ other.areas
        levels.append(float(np.median(level)))
        # A median scatters pi/2 more than a mean.
        variance += noise.sd**2 * noise.correlation / index.size * math.pi / 2
    base = sum(levels) / 2
    return base if abs(base) > _BASE_SDS * math.sqrt(variance) / 2 else 0.0


def _lines(spectrum: Spectrum, part: _Part) -> tuple[Line, ...]:
    frequency = spectrum.spectrometer_frequency_mhz
    return tuple(
        Line(
            shift_ppm=float(spectrum.first_point_ppm - part.centres[k] / frequency),
            shift_sd_ppm=float(part.centre_sds[k] / frequency),
            area=float(part.areas[k]),
            area_sd=float(part.area_sds[k]),
            width_hz=float(part.widths[k]),
            width_sd_hz=float(part.width_sds[k]),
        )
        for k in np.argsort(part.centres)
    )
