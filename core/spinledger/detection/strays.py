"""Signals that are recognised without a structure; shifts in ppm."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from spinledger.processing.solvents import (
    WaterLine,
    is_aqueous,
    residual_lines,
    water_lines,
)
from spinledger.processing.standard import DSS_CHAIN_PPM
from spinledger.values.evidence import Line, Signal, Stray
from spinledger.values.recipe import Reference

# How far a residual line may stand from the table after referencing.
_SOLVENT_TOLERANCE_PPM = 0.03
_STANDARD_TOLERANCE_PPM = 0.02
_STANDARD_HALF_HZ = 12.0
_WATER_REACH_SD = 3.0
_SATELLITE_RANGE_HZ = (57.0, 110.0)
_SATELLITE_SHARE = (0.002, 0.012)
_SATELLITE_MATCH_HZ = 1.0
_CARBON_13_SHARE = 0.0107


@dataclass(frozen=True, slots=True, kw_only=True)
class StrayFacts:
    """What the labels are told from."""

    solvent: str | None
    temperature_k: float | None
    reference: Reference
    spectrometer_frequency_mhz: float


def recognised_strays(
    signals: tuple[Signal, ...], *, facts: StrayFacts
) -> tuple[Stray, ...]:
    """Solvent, water, reference, and 13C satellites of strong lines."""
    strays = [
        *_solvent(signals, facts),
        *_water(signals, facts),
        *_standard(signals, facts),
    ]
    taken = tuple(strays)
    return (*taken, *_satellites(signals, taken, facts))


def _solvent(signals: tuple[Signal, ...], facts: StrayFacts) -> list[Stray]:
    strays = []
    tolerance = _SOLVENT_TOLERANCE_PPM + 2 * min(facts.reference.sd_ppm, 0.05)
    for residual in residual_lines(facts.solvent):
        half_hz = 2.0 + 2.5 * (residual.j_hd_hz or 0.0)
        stretch = _stretch_at(signals, residual.shift_ppm, tolerance, half_hz, facts)
        if stretch is not None:
            low, high = stretch
            strays.append(
                Stray(
                    low_ppm=low,
                    high_ppm=high,
                    kind="solvent",
                    why=f"Residual {residual.species} of {facts.solvent}, "
                    f"expected at {residual.shift_ppm:.2f} ppm.",
                )
            )
    return strays


def _stretch_at(
    signals: tuple[Signal, ...],
    shift_ppm: float,
    tolerance_ppm: float,
    half_hz: float,
    facts: StrayFacts,
) -> tuple[float, float] | None:
    """Range about the tallest line near a shift, or None where there is none."""
    lines = _lines_near(signals, shift_ppm, tolerance_ppm)
    if not lines:
        return None
    tallest = max(lines, key=lambda line: line.area / line.width_hz)
    half_ppm = (half_hz + tallest.width_hz) / facts.spectrometer_frequency_mhz
    return tallest.shift_ppm - half_ppm, tallest.shift_ppm + half_ppm


def _lines_near(
    signals: tuple[Signal, ...], shift_ppm: float, tolerance_ppm: float
) -> list[Line]:
    return [
        line
        for signal in signals
        for line in signal.lines
        if abs(line.shift_ppm - shift_ppm) < tolerance_ppm
    ]


def _water(signals: tuple[Signal, ...], facts: StrayFacts) -> list[Stray]:
    strays = []
    for water in water_lines(facts.solvent, facts.temperature_k):
        signal = _water_signal(signals, water, facts)
        if signal is not None:
            strays.append(
                Stray(
                    low_ppm=signal.low_ppm,
                    high_ppm=signal.high_ppm,
                    kind="water",
                    why=f"{water.species} in {facts.solvent}, expected near "
                    f"{water.shift_ppm:.2f} ppm.",
                )
            )
    return strays


def _water_signal(
    signals: tuple[Signal, ...], water: WaterLine, facts: StrayFacts
) -> Signal | None:
    """Largest signal that may be water: a lone line, but any shape in D2O."""
    aqueous = is_aqueous(facts.solvent)
    reach = (_WATER_REACH_SD if aqueous else 1.0) * water.sd_ppm
    near = [
        signal
        for signal in signals
        if any(abs(line.shift_ppm - water.shift_ppm) < reach for line in signal.lines)
        and (aqueous or _is_lone(signal))
    ]
    return max(near, key=lambda one: one.area, default=None)


def _is_lone(signal: Signal) -> bool:
    """One line holds four fifths of the area."""
    largest = max(line.area for line in signal.lines)
    return largest > 0.8 * sum(line.area for line in signal.lines)


def _standard(signals: tuple[Signal, ...], facts: StrayFacts) -> list[Stray]:
    by = facts.reference.by
    if by not in ("DSS", "TMS", "TSP"):
        return []
    half_ppm = _STANDARD_HALF_HZ / facts.spectrometer_frequency_mhz
    strays = [
        Stray(
            low_ppm=-half_ppm,
            high_ppm=half_ppm,
            kind="reference",
            why=f"Methyl line of {by}, the zero of the axis.",
        )
    ]
    if by == "DSS" and "CH2 signals" in facts.reference.why:
        strays += _chain(signals, facts)
    return strays


def _chain(signals: tuple[Signal, ...], facts: StrayFacts) -> list[Stray]:
    strays = []
    half_ppm = 0.01 + 10 / facts.spectrometer_frequency_mhz
    for chain_ppm in DSS_CHAIN_PPM:
        if _lines_near(signals, chain_ppm, half_ppm):
            strays.append(
                Stray(
                    low_ppm=chain_ppm - half_ppm,
                    high_ppm=chain_ppm + half_ppm,
                    kind="reference",
                    why="A CH2 signal of DSS.",
                )
            )
    return strays


def _satellites(
    signals: tuple[Signal, ...], taken: tuple[Stray, ...], facts: StrayFacts
) -> list[Stray]:
    frequency = facts.spectrometer_frequency_mhz
    lines = [line for signal in signals for line in signal.lines]
    if not lines:
        return []
    hz = np.array([line.shift_ppm * frequency for line in lines])
    areas = np.array([line.area for line in lines])
    strays = []
    for parent in np.argsort(-areas)[:30]:
        for low, high in _pairs(hz, areas, int(parent)):
            strays += [
                Stray(
                    low_ppm=(hz[one] - 3.0) / frequency,
                    high_ppm=(hz[one] + 3.0) / frequency,
                    kind="satellite",
                    why=f"13C satellite of the line at {hz[parent] / frequency:.3f} "
                    f"ppm, 1J {hz[high] - hz[low]:.0f} Hz.",
                )
                for one in (low, high)
                if not _covered(hz[one] / frequency, taken)
            ]
    return strays


def _pairs(hz: np.ndarray, areas: np.ndarray, parent: int) -> list[tuple[int, int]]:
    """Pairs of weak lines at equal distances on both sides of a strong one."""
    apart = hz - hz[parent]
    share = areas / areas[parent]
    weak = (share > _SATELLITE_SHARE[0]) & (share < _SATELLITE_SHARE[1])
    reach = (np.abs(apart) > _SATELLITE_RANGE_HZ[0]) & (
        np.abs(apart) < _SATELLITE_RANGE_HZ[1]
    )
    lower = np.flatnonzero(weak & reach & (apart < 0))
    upper = np.flatnonzero(weak & reach & (apart > 0))
    return [
        (int(low), int(high))
        for low in lower
        for high in upper
        if abs(apart[low] + apart[high]) < _SATELLITE_MATCH_HZ
    ]


def _covered(shift_ppm: float, strays: tuple[Stray, ...]) -> bool:
    return any(stray.low_ppm <= shift_ppm <= stray.high_ppm for stray in strays)
