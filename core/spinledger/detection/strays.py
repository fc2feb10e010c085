"""Solvent, water and reference lines, told without a structure; shifts in ppm."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import ndimage

from spinledger.lines.deconvolution import NoiseModel
from spinledger.processing.reference import Referencing
from spinledger.processing.solvents import (
    ResidualLine,
    WaterLine,
    is_aqueous,
    residual_lines,
    water_lines,
)
from spinledger.processing.standard import DSS_CHAIN_PPM
from spinledger.values.evidence import Line, Signal, Stray
from spinledger.values.spectrum import Spectrum

Floats = npt.NDArray[np.float64]

_SOLVENT_TOLERANCE_PPM = 0.03
_STANDARD_HALF_HZ = 12.0
_NEAR_HZ = 12.0
_NEAR_SHARE = 0.2
_LONE_SHARE = 0.8
_WATER_TOLERANCE_PPM = 0.12
_AQUEOUS_REACH_PPM = 0.3
_CARRIER_REACH_PPM = 0.08
# Water is masked out to where it has fallen to this share of its top, or to the
# first minimum beyond the nearest Hz, where a signal beside it begins.
_WATER_FOOT_SHARE = 0.003
_RISE = 1.3
_ENVELOPE_HZ = 5.0
_REMNANT_SD = 6.0
_WATER_NEAREST_HZ = 15.0
_WATER_SMOOTHING_HZ = 2.0
# Lines closer than this may be one line in a poor shim.
_SHIM_REACH_HZ = 2.6
_FOOT_SD = 10.0
_CHAIN_SHARE = 2 / 9
_CHAIN_RANGE = (0.4, 2.2)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class StrayFacts:
    """What the labels are told from.

    Attributes
    ----------
    spectrum : Spectrum
        On the referenced axis.
    noise : NoiseModel
    referencing : Referencing
    temperature_k : float or None, K
    carrier_ppm : float or None, ppm
        Where water is irradiated, if it is; on the referenced axis.
    """

    spectrum: Spectrum
    noise: NoiseModel
    referencing: Referencing
    temperature_k: float | None
    carrier_ppm: float | None

    @property
    def frequency_mhz(self) -> float:
        """Spectrometer frequency, MHz."""
        return self.spectrum.spectrometer_frequency_mhz


def recognised_lines(
    signals: tuple[Signal, ...], facts: StrayFacts
) -> tuple[Stray, ...]:
    """Strays of kind solvent, water and reference."""
    return (*_solvent(signals, facts), *_water(signals, facts), *_standard(facts))


def _solvent(signals: tuple[Signal, ...], facts: StrayFacts) -> list[Stray]:
    strays = []
    for residual in residual_lines(facts.referencing.solvent):
        place = _residual_place(signals, residual, facts)
        if place is None:
            continue
        half_hz = 3.0 + 2.5 * (residual.j_hd_hz or 0.0)
        half_ppm = half_hz / facts.frequency_mhz
        strays.append(
            Stray(
                low_ppm=place - half_ppm,
                high_ppm=place + half_ppm,
                kind="solvent",
                why=f"Residual {residual.species} of {residual.solvent}, "
                f"expected at {residual.shift_ppm:.2f} ppm.",
            )
        )
    return strays


def _residual_place(
    signals: tuple[Signal, ...], residual: ResidualLine, facts: StrayFacts
) -> float | None:
    """Where a residual line stands; None where it cannot be told from others."""
    if residual.species in ("CHCl3", "CD2H"):
        seen = facts.referencing.residual_ppm
        near = seen is not None and abs(seen - residual.shift_ppm) < 0.2
        return seen if near else None
    tolerance = _SOLVENT_TOLERANCE_PPM + min(facts.referencing.reference.sd_ppm, 0.05)
    lines = [line for signal in signals for line in signal.lines]
    near_lines = [
        line for line in lines if abs(line.shift_ppm - residual.shift_ppm) < tolerance
    ]
    if not near_lines:
        return None
    tallest = max(near_lines, key=lambda line: line.area)
    return tallest.shift_ppm if _stands_alone(tallest, lines, facts) else None


def _stands_alone(line: Line, lines: list[Line], facts: StrayFacts) -> bool:
    near_ppm = _NEAR_HZ / facts.frequency_mhz
    return not any(
        other.area > _NEAR_SHARE * line.area
        for other in lines
        if 0 < abs(other.shift_ppm - line.shift_ppm) < near_ppm
    )


def _water(signals: tuple[Signal, ...], facts: StrayFacts) -> list[Stray]:
    solvent = facts.referencing.solvent
    strays = []
    for water in water_lines(solvent, facts.temperature_k):
        top = (
            _aqueous_top(signals, water, facts)
            if is_aqueous(solvent)
            else _lone_top(signals, water, facts.spectrum)
        )
        if top is None:
            continue
        low, high = _foot(top, facts)
        strays.append(
            Stray(
                low_ppm=low,
                high_ppm=high,
                kind="water",
                why=f"{water.species} in {solvent}, expected near "
                f"{water.shift_ppm:.2f} ppm.",
            )
        )
    return strays


def _aqueous_top(
    signals: tuple[Signal, ...], water: WaterLine, facts: StrayFacts
) -> float | None:
    """Top of the water signal: at the carrier if irradiated, else the largest."""
    if facts.carrier_ppm is not None:
        return _tallest_at_carrier(facts, facts.carrier_ppm)
    near = [
        line
        for signal in signals
        for line in signal.lines
        if abs(line.shift_ppm - water.shift_ppm) < _AQUEOUS_REACH_PPM
    ]
    return max(near, key=lambda line: line.area).shift_ppm if near else None


def _tallest_at_carrier(facts: StrayFacts, carrier_ppm: float) -> float | None:
    """Place of the remnant, which may be dispersive or negative."""
    spectrum = facts.spectrum
    window = spectrum.window(
        carrier_ppm - _CARRIER_REACH_PPM, carrier_ppm + _CARRIER_REACH_PPM
    )
    piece = np.abs(spectrum.intensities[window])
    top = int(np.argmax(piece))
    if piece[top] < _REMNANT_SD * facts.noise.sd:
        return None
    return float(spectrum.first_point_ppm - spectrum.step_ppm * (window.start + top))


def _lone_top(
    signals: tuple[Signal, ...], water: WaterLine, spectrum: Spectrum
) -> float | None:
    """The largest one-line signal near the place of water in an organic solvent.

    A poor shim gives one line several maxima: lines closer than that count as one.
    """
    near = []
    for signal in signals:
        largest = max(signal.lines, key=lambda line: line.area)
        reach_hz = max(_SHIM_REACH_HZ, largest.width_hz)
        reach_ppm = reach_hz / spectrum.spectrometer_frequency_mhz
        together = sum(
            line.area
            for line in signal.lines
            if abs(line.shift_ppm - largest.shift_ppm) <= reach_ppm
        )
        lone = together > _LONE_SHARE * sum(line.area for line in signal.lines)
        close = abs(largest.shift_ppm - water.shift_ppm) < _WATER_TOLERANCE_PPM
        if lone and close:
            near.append(largest)
    return max(near, key=lambda line: line.area).shift_ppm if near else None


def _foot(top_ppm: float, facts: StrayFacts) -> tuple[float, float]:
    """Range of a water signal, out to its feet or to the next signal."""
    spectrum = facts.spectrum
    sigma = _WATER_SMOOTHING_HZ / spectrum.step_hz
    smooth = np.abs(ndimage.gaussian_filter1d(spectrum.intensities, sigma))
    # The envelope, as a dispersive remnant passes through zero.
    width = 2 * int(_ENVELOPE_HZ / spectrum.step_hz) + 1
    smooth = ndimage.maximum_filter1d(smooth, width)
    top = spectrum.index_of_ppm(top_ppm)
    level = max(_WATER_FOOT_SHARE * smooth[top], _FOOT_SD * facts.noise.sd)
    nearest = int(_WATER_NEAREST_HZ / spectrum.step_hz)
    up = _outwards(smooth[top:], nearest, level)
    down = _outwards(smooth[top::-1], nearest, level)
    low_ppm = spectrum.first_point_ppm - spectrum.step_ppm * (top + up)
    high_ppm = spectrum.first_point_ppm - spectrum.step_ppm * (top - down)
    return low_ppm, high_ppm


def _outwards(trace: Floats, nearest: int, level: float) -> int:
    """Points from the top to the end of the foot, or to where a signal rises."""
    rest = trace[nearest:]
    if rest.size < 2:
        return int(trace.size - 1)
    lowest = np.minimum.accumulate(rest)
    ends = (rest < level) | (rest > _RISE * lowest)
    if not ends.any():
        return int(trace.size - 1)
    first = int(np.argmax(ends))
    return nearest + int(np.argmin(rest[: first + 1]))


def _standard(facts: StrayFacts) -> list[Stray]:
    by = facts.referencing.reference.by
    if by not in ("DSS", "TMS", "TSP"):
        return []
    half_ppm = _STANDARD_HALF_HZ / facts.frequency_mhz
    methyl = Stray(
        low_ppm=-half_ppm,
        high_ppm=half_ppm,
        kind="reference",
        why=f"Methyl line of {by}, the zero of the axis.",
    )
    return [methyl, *_chain(facts, half_ppm)] if by == "DSS" else [methyl]


def _chain(facts: StrayFacts, methyl_half_ppm: float) -> list[Stray]:
    """CH2 signals of DSS, where the area is what two protons of nine give."""
    methyl = _area(facts.spectrum, -methyl_half_ppm, methyl_half_ppm)
    half_ppm = 0.012 + 9 / facts.frequency_mhz
    noise = 3 * facts.noise.sd * np.sqrt(facts.noise.correlation)
    strays = []
    for chain_ppm in DSS_CHAIN_PPM:
        low, high = chain_ppm - half_ppm, chain_ppm + half_ppm
        area = _area(facts.spectrum, low, high)
        window = facts.spectrum.window(low, high)
        least = noise * np.sqrt(window.stop - window.start) * facts.spectrum.step_hz
        share = area / methyl / _CHAIN_SHARE if methyl > 0 else 0.0
        if area > least and _CHAIN_RANGE[0] < share < _CHAIN_RANGE[1]:
            strays.append(
                Stray(
                    low_ppm=low,
                    high_ppm=high,
                    kind="reference",
                    why="A CH2 signal of DSS, with the area of two protons of nine.",
                )
            )
    return strays


def _area(spectrum: Spectrum, low_ppm: float, high_ppm: float) -> float:
    """Sum over a straight base through the ends, intensity * Hz."""
    piece = spectrum.intensities[spectrum.window(low_ppm, high_ppm)]
    ends = max(3, piece.size // 8)
    base = np.linspace(np.median(piece[:ends]), np.median(piece[-ends:]), piece.size)
    return float(np.sum(piece - base)) * spectrum.step_hz
