"""Areas of isolated signals, all measured alike; ppm, Hz, intensity * Hz."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.values.evidence import Evidence
from spinledger.values.ledger import Entry, Ledger

# Integration reaches this many line widths beyond the outermost lines, and no
# less than the second figure where a neighbour stands close.
REACH_WIDTHS = 20.0
LEAST_WIDTHS = 5.0
# Ranges of entries end this many widths outside their lines.
_RANGE_WIDTHS = 1.5


@dataclass(frozen=True, slots=True, kw_only=True)
class Area:
    """One signal.

    Attributes
    ----------
    labels : tuple of str
        Claims that it holds.
    low_ppm, high_ppm : float, ppm
        Where it was integrated.
    n_protons : int
        0 where the number is not known here.
    area, noise_sd : float, intensity * Hz
        Corrected for the tails outside; sd from the noise.
    tails : float
        Share of the signal that the correction added.
    """

    labels: tuple[str, ...]
    low_ppm: float
    high_ppm: float
    n_protons: int
    area: float
    noise_sd: float
    tails: float


@dataclass(frozen=True, slots=True, kw_only=True)
class LeftOut:
    """Claims whose signal does not serve, and why."""

    labels: tuple[str, ...]
    why: str


@dataclass(frozen=True, slots=True, kw_only=True)
class _Block:
    """A stretch of lines that belongs to claims, or to nobody."""

    low_ppm: float
    high_ppm: float
    entries: tuple[Entry, ...]


def claim_areas(ledger: Ledger) -> tuple[tuple[Area, ...], tuple[LeftOut, ...]]:
    """Areas of the signals that serve as a measure, and those that do not.

    Used are signals of settled, non-exchangeable claims that stand clear of all
    others, of strays (satellites aside, they belong to their parent) and of the
    solvent.
    """
    blocks = _blocks(ledger)
    exchangeable = {c.label for c in ledger.claims.claims if c.is_exchangeable}
    areas: list[Area] = []
    left: list[LeftOut] = []
    for block in blocks:
        if not block.entries:
            continue
        labels = tuple(one.claim for one in block.entries)
        if any(label in exchangeable for label in labels):
            left.append(LeftOut(labels=labels, why="exchangeable"))
        elif any(one.state == "disputed" for one in block.entries):
            left.append(LeftOut(labels=labels, why="inconsistent"))
        else:
            area = _clear_area(ledger, block, blocks)
            if area is None:
                why = "another signal stands too close"
                left.append(LeftOut(labels=labels, why=why))
            else:
                areas.append(area)
    return tuple(areas), tuple(left)


def area_at(ledger: Ledger, shift_ppm: float) -> Area | None:
    """Area of the detected signal at a shift; None if nothing stands clear there."""
    evidence = ledger.evidence
    signal = next(
        (s for s in evidence.signals if s.low_ppm <= shift_ppm <= s.high_ppm), None
    )
    if signal is None or not signal.lines:
        return None
    shifts = np.array([line.shift_ppm for line in signal.lines])
    weights = np.array([max(line.area, 0.0) for line in signal.lines])
    if not weights.sum() > 0:
        return None
    width_hz = float(
        np.average([line.width_hz for line in signal.lines], weights=weights)
    )
    tall = weights > 0.02 * weights.max()
    low, high = float(shifts[tall].min()), float(shifts[tall].max())
    blocks = _blocks(ledger)
    if any(b.entries and b.low_ppm <= high and b.high_ppm >= low for b in blocks):
        return None
    others = [b for b in blocks if not b.low_ppm <= shift_ppm <= b.high_ppm]
    reach_hz = _reach_hz(evidence, (low, high), width_hz, others)
    if reach_hz is None:
        return None
    lines = (shifts[tall], weights[tall])
    return _integrated(evidence, (low, high), reach_hz, width_hz, lines)


def _clear_area(
    ledger: Ledger, block: _Block, blocks: tuple[_Block, ...]
) -> Area | None:
    evidence = ledger.evidence
    frequency = evidence.spectrum.spectrometer_frequency_mhz
    width_hz = max(one.width_hz or 1.0 for one in block.entries)
    inset = _RANGE_WIDTHS * width_hz / frequency
    ends = (block.low_ppm + inset, block.high_ppm - inset)
    if ends[0] > ends[1]:
        middle = (block.low_ppm + block.high_ppm) / 2
        ends = (middle, middle)
    others = [one for one in blocks if one is not block]
    reach_hz = _reach_hz(evidence, ends, width_hz, others)
    if reach_hz is None:
        return None
    names = {one.claim for one in block.entries}
    own = [one for one in (ledger.model.claim_lines if ledger.model else ())
           if one.claim in names]  # fmt: skip
    if own:
        lines = (
            np.concatenate([one.shifts_ppm for one in own]),
            np.concatenate([np.maximum(one.protons, 0.0) for one in own]),
        )
    else:
        lines = (np.array(ends), np.ones(2))
    area = _integrated(evidence, ends, reach_hz, width_hz, lines)
    return Area(
        labels=tuple(one.claim for one in block.entries),
        low_ppm=area.low_ppm,
        high_ppm=area.high_ppm,
        n_protons=sum(one.protons for one in block.entries),
        area=area.area,
        noise_sd=area.noise_sd,
        tails=area.tails,
    )


def _reach_hz(
    evidence: Evidence,
    ends: tuple[float, float],
    width_hz: float,
    others: list[_Block],
) -> float | None:
    """How far beyond its lines a signal can be integrated; None if too little."""
    frequency = evidence.spectrum.spectrometer_frequency_mhz
    gaps = [max(one.low_ppm - ends[1], ends[0] - one.high_ppm) for one in others]
    room_hz = min(gaps, default=math.inf) * frequency / 2
    spectrum = evidence.spectrum
    edge_hz = frequency * min(
        spectrum.first_point_ppm - ends[1], ends[0] - spectrum.last_point_ppm
    )
    reach = min(REACH_WIDTHS * width_hz, room_hz, edge_hz)
    return reach if reach >= LEAST_WIDTHS * width_hz else None


def _integrated(
    evidence: Evidence,
    ends: tuple[float, float],
    reach_hz: float,
    width_hz: float,
    lines: tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]],
) -> Area:
    spectrum = evidence.spectrum
    frequency = spectrum.spectrometer_frequency_mhz
    low, high = ends[0] - reach_hz / frequency, ends[1] + reach_hz / frequency
    window = spectrum.window(low, high)
    step = spectrum.step_hz
    n_points = window.stop - window.start
    raw = float(spectrum.intensities[window].sum()) * step
    inside = _share_inside(lines, (low, high), width_hz / frequency)
    return Area(
        labels=(),
        low_ppm=low,
        high_ppm=high,
        n_protons=0,
        area=raw / inside,
        noise_sd=evidence.noise_sd * step * math.sqrt(n_points) / inside,
        tails=1.0 - inside,
    )


def _share_inside(
    lines: tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]],
    window: tuple[float, float],
    width_ppm: float,
) -> float:
    """Share of Lorentzian lines that a window holds, weighted by their areas."""
    shifts, weights = lines
    left = np.arctan(2.0 * (shifts - window[0]) / width_ppm)
    right = np.arctan(2.0 * (window[1] - shifts) / width_ppm)
    kept = (shifts >= window[0]) & (shifts <= window[1])
    if not np.any(kept) or not weights[kept].sum() > 0:
        return 1.0
    return float(np.average(((left + right) / np.pi)[kept], weights=weights[kept]))


def _blocks(ledger: Ledger) -> tuple[_Block, ...]:
    """All stretches with lines: claims that overlap together, and strays."""
    placed = sorted(
        (one for one in ledger.entries if one.range_ppm is not None),
        key=lambda one: one.range_ppm or (0.0, 0.0),
    )
    blocks: list[_Block] = []
    for entry in placed:
        low, high = entry.range_ppm or (0.0, 0.0)
        if blocks and low <= blocks[-1].high_ppm:
            last = blocks[-1]
            blocks[-1] = _Block(
                low_ppm=last.low_ppm,
                high_ppm=max(high, last.high_ppm),
                entries=(*last.entries, entry),
            )
        else:
            blocks.append(_Block(low_ppm=low, high_ppm=high, entries=(entry,)))
    strays = [
        _Block(low_ppm=one.low_ppm, high_ppm=one.high_ppm, entries=())
        for one in ledger.strays
        if one.kind not in ("satellite", "sideband")
    ]
    return (*blocks, *strays)
