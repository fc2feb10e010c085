"""The folded shift axis: stretches that hold something, at one scale.

Shifts in ppm, positions in user units (CSS pixels) from left to right, so that
high shifts stand on the left.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from spinledger.values.ledger import Entry, Ledger

Range = tuple[float, float]
# Narrower than this share of all that is shown, a stretch could not carry a label.
_SMALLEST_SHARE = 0.055
_MOST_STRETCHES = 14
# A huge water line is shown by its middle only, ppm.
_WIDEST_STRAY_PPM = 0.30
_HIDDEN_KINDS = ("satellite", "sideband")


@dataclass(frozen=True, slots=True, kw_only=True)
class Stretch:
    """One shown stretch of the axis and where it is drawn."""

    low_ppm: float
    high_ppm: float
    left: float
    right: float

    def x(self, shift_ppm: float) -> float:
        """Position of a shift; outside the stretch it runs on."""
        share = (self.high_ppm - shift_ppm) / (self.high_ppm - self.low_ppm)
        return self.left + share * (self.right - self.left)

    def holds(self, shift_ppm: float) -> bool:
        """Whether a shift lies inside."""
        return self.low_ppm <= shift_ppm <= self.high_ppm


@dataclass(frozen=True, slots=True, kw_only=True)
class FoldedAxis:
    """Stretches from left to right, all at the same units per ppm."""

    stretches: tuple[Stretch, ...]

    @property
    def units_per_ppm(self) -> float:
        """Scale of every stretch."""
        first = self.stretches[0]
        return (first.right - first.left) / (first.high_ppm - first.low_ppm)

    def find(self, shift_ppm: float) -> Stretch | None:
        """Stretch that holds a shift, or None where it is folded away."""
        return next((one for one in self.stretches if one.holds(shift_ppm)), None)


def fold_axis(
    regions: Sequence[Range], *, left: float, right: float, gap: float
) -> FoldedAxis:
    """Axis of the given regions at one scale, ``gap`` units between stretches.

    Parameters
    ----------
    regions : sequence of (low_ppm, high_ppm)
        May overlap and come in any order; not empty.
    left, right : float
    gap : float
    """
    merged = _spread(_merge(sorted(regions), 0.0))
    while len(merged) > _MOST_STRETCHES:
        merged = _merge(merged, _smallest_gap(merged))
    room = right - left - gap * (len(merged) - 1)
    scale = room / sum(high - low for low, high in merged)
    stretches: list[Stretch] = []
    x = left
    for low, high in reversed(merged):
        width = (high - low) * scale
        stretches.append(Stretch(low_ppm=low, high_ppm=high, left=x, right=x + width))
        x += width + gap
    return FoldedAxis(stretches=tuple(stretches))


def shown_regions(ledger: Ledger) -> tuple[Range, ...]:
    """Regions worth showing: entries, unfulfilled claims, and strays.

    Regions that lie outside the acquired sweep are left out; with nothing at
    all to show, the whole sweep is given.
    """
    spectrum = ledger.evidence.spectrum
    field_mhz = spectrum.spectrometer_frequency_mhz
    regions = [
        region
        for entry in ledger.entries
        if (region := entry_region(entry, field_mhz)) is not None
    ]
    for stray in ledger.strays:
        if stray.kind not in _HIDDEN_KINDS:
            regions.append(_cropped((stray.low_ppm, stray.high_ppm)))
    sweep = (spectrum.last_point_ppm, spectrum.first_point_ppm)
    inside = [
        (max(low, sweep[0]), min(high, sweep[1]))
        for low, high in regions
        if low < sweep[1] and high > sweep[0]
    ]
    return tuple(one for one in inside if one[0] < one[1]) or (sweep,)


def entry_region(entry: Entry, field_mhz: float) -> Range | None:
    """Where an entry is to be drawn; None for silent claims."""
    if entry.state == "silent":
        return None
    if entry.shift_ppm is None:  # open: where it was claimed
        return (entry.predicted_shift_ppm - 0.02, entry.predicted_shift_ppm + 0.02)
    if entry.range_ppm is not None:
        return entry.range_ppm
    margin = 12.0 / field_mhz
    return (entry.shift_ppm - margin, entry.shift_ppm + margin)


def _cropped(region: Range) -> Range:
    low, high = region
    if high - low <= _WIDEST_STRAY_PPM:
        return region
    middle = (low + high) / 2
    return (middle - _WIDEST_STRAY_PPM / 2, middle + _WIDEST_STRAY_PPM / 2)


def _spread(regions: list[Range]) -> list[Range]:
    """Regions with margins, none too narrow, merged where the margins meet."""
    total = sum(high - low for low, high in regions)
    margin = max(0.012, 0.02 * total)
    smallest = max(0.05, _SMALLEST_SHARE * (total + 2 * margin * len(regions)))
    wider: list[Range] = []
    for low, high in regions:
        half = max((high - low) / 2 + margin, smallest / 2)
        middle = (low + high) / 2
        wider.append((middle - half, middle + half))
    return _merge(sorted(wider), 0.5 * margin)


def _merge(regions: Sequence[Range], reach: float) -> list[Range]:
    """Regions joined where their distance is ``reach`` or less."""
    merged: list[Range] = []
    for low, high in regions:
        if merged and low - merged[-1][1] <= reach:
            merged[-1] = (merged[-1][0], max(merged[-1][1], high))
        else:
            merged.append((low, high))
    return merged


def _smallest_gap(regions: Sequence[Range]) -> float:
    return min(second[0] - first[1] for first, second in pairwise(regions))
