"""A batch against a reference spectrum of the same compound; ppm, mol %.

Amounts are counted as if a line came from one proton, so that a methyl line of an
impurity stands for a third of its figure.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np

from spinledger.errors import EvidenceError
from spinledger.sample.align import Alignment, CommonSignal, align, compound_windows
from spinledger.sample.difference import Difference, scaled
from spinledger.sample.roles import same_field
from spinledger.sample.shim import match_widths
from spinledger.sample.traces import Range, Trace, integral, trace_of, trace_upon
from spinledger.values.evidence import Evidence, Signal

MARGIN_HZ = 6.0
MARGIN_WIDTHS = 3.0
SURE_SD = 4.0
# Tails, phase and shim leave this share of a signal in a difference [common practice].
LEAST_SHARE_SD = 0.01
_NOT_COUNTED = ("solvent", "water", "reference", "satellite", "sideband")

DeviationKind = Literal["new", "missing", "more", "less", "moved"]


@dataclass(frozen=True, slots=True, kw_only=True)
class BatchLimits:
    """What a batch may differ by.

    Attributes
    ----------
    line_mol_percent : float
        Of a new or missing line.
    integral_percent : float
        Of a signal that both show.
    shift_ppm : float, ppm
        Of a signal against the others.
    """

    line_mol_percent: float = 1.0
    integral_percent: float = 5.0
    shift_ppm: float = 0.02

    def __post_init__(self) -> None:
        for name in ("line_mol_percent", "integral_percent", "shift_ppm"):
            if not getattr(self, name) > 0.0:
                raise ValueError(f"{name} must be > 0, got {getattr(self, name)!r}")


@dataclass(frozen=True, slots=True, kw_only=True)
class Deviation:
    """One stretch in which the batch differs by more than its limit.

    Attributes
    ----------
    kind : str
    low_ppm, high_ppm : float, ppm
    amount, sd : float
        mol % for new and missing lines, % of the signal for more and less, ppm
        for moved ones.
    limit : float
        In the same unit.
    noise_sd : float
        Largest height of the difference there, in noise sd.
    """

    kind: DeviationKind
    low_ppm: float
    high_ppm: float
    amount: float
    sd: float
    limit: float
    noise_sd: float

    def sentence(self) -> str:
        """What stands out, in words."""
        where = f"{self.high_ppm:.2f} to {self.low_ppm:.2f} ppm"
        if self.kind == "moved":
            return (
                f"The signal at {where} has moved by {self.amount:+.3f} ppm against "
                f"the others (limit {self.limit:g})."
            )
        if self.kind in ("new", "missing"):
            word = "New line" if self.kind == "new" else "Line of the reference missing"
            return (
                f"{word} at {where}: {abs(self.amount):.1f} ± {self.sd:.1f} mol % if it "
                f"is one proton (limit {self.limit:g})."
            )
        return (
            f"The signal at {where} is {abs(self.amount):.1f} ± {self.sd:.1f} % "
            f"{'larger' if self.kind == 'more' else 'smaller'} than in the reference "
            f"(limit {self.limit:g})."
        )


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class BatchComparison:
    """Outcome of a batch against a reference.

    Attributes
    ----------
    batch, reference : str
        Names of the spectra.
    passed : bool
    deviations : tuple of Deviation
        Beyond the limits, largest first.
    alignment : Alignment
    difference : Difference
        Batch minus reference, brought to one line width.
    limits : BatchLimits
    notes : tuple of str
    """

    batch: str
    reference: str
    passed: bool
    deviations: tuple[Deviation, ...]
    alignment: Alignment
    difference: Difference
    limits: BatchLimits
    notes: tuple[str, ...]

    def sentences(self) -> tuple[str, ...]:
        """Result first, then every deviation and note."""
        verdict = (
            f"{self.batch} agrees with the reference {self.reference} within the limits."
            if self.passed
            else f"{self.batch} differs from the reference {self.reference} by more than "
            "the limits."
        )
        return (verdict, *(one.sentence() for one in self.deviations), *self.notes)


def compare_batch(
    batch: Evidence,
    reference: Evidence,
    *,
    n_protons: float,
    limits: BatchLimits | None = None,
) -> BatchComparison:
    """Lay a batch upon a reference spectrum and list what differs.

    Parameters
    ----------
    batch, reference : Evidence
    n_protons : float
        That the compound shows; sets the scale of mol %.
    limits : BatchLimits, optional

    Raises
    ------
    EvidenceError
        If the two are in different solvents, or have no signal in common.
    ValueError
        If ``n_protons`` is not above 0.
    """
    if not n_protons > 0.0:
        raise ValueError(f"n_protons must be > 0, got {n_protons!r}")
    _check_solvents(batch, reference)
    chosen = limits or BatchLimits()
    alignment = align(batch, reference)
    first = trace_of(batch)
    second = trace_upon(reference, first, offset_ppm=alignment.offset_ppm)
    common = [(one.low_ppm, one.high_ppm) for one in alignment.signals]
    matched = match_widths(first, second, common)
    ghost = scaled(matched.other, alignment.scale)
    apart = replace(
        matched.main,
        intensities=matched.main.intensities - ghost.intensities,
        is_empty=matched.main.is_empty & ghost.is_empty,
        noise_sd=float(np.hypot(first.noise_sd, ghost.noise_sd)),
    )
    margin_ppm = MARGIN_HZ / first.frequency_mhz
    stretches = joined_ranges(
        [
            *_counted(batch, 0.0),
            *_counted(reference, alignment.offset_ppm),
        ]
    )
    compound = sum(
        integral(matched.main, low, high).area
        for low, high in joined_ranges(
            [(low - margin_ppm, high + margin_ppm) for low, high in common]
        )
    )
    per_proton = compound / n_protons
    found = [
        _deviation(one, (matched.main, ghost, apart), per_proton, chosen)
        for one in stretches
    ]
    rows = [one for one in found if one is not None]
    rows.sort(key=lambda one: -abs(one.amount) / one.limit)
    moved = [_moved(one, alignment, chosen) for one in alignment.signals]
    rows += [one for one in moved if one is not None]
    return BatchComparison(
        batch=batch.metadata.source_name,
        reference=reference.metadata.source_name,
        passed=not rows,
        deviations=tuple(rows),
        alignment=alignment,
        difference=Difference(
            shifts_ppm=first.shifts_ppm,
            main=matched.main,
            other=ghost,
            intensities=apart.intensities,
            noise_sd=apart.noise_sd,
        ),
        limits=chosen,
        notes=_notes(batch, reference),
    )


def joined_ranges(ranges: Sequence[Range]) -> list[Range]:
    """Ranges with those that overlap made one, ascending."""
    rows: list[Range] = []
    for low, high in sorted(ranges):
        if rows and low <= rows[-1][1]:
            rows[-1] = (rows[-1][0], max(rows[-1][1], high))
        else:
            rows.append((low, high))
    return rows


def _check_solvents(batch: Evidence, reference: Evidence) -> None:
    if batch.solvent and reference.solvent and batch.solvent != reference.solvent:
        raise EvidenceError(
            reference.metadata.source_name,
            f"the reference is in {reference.solvent} and the batch in "
            f"{batch.solvent}; take a reference in the same solvent",
        )


def _counted(evidence: Evidence, offset_ppm: float) -> list[Range]:
    """Stretches of all signals but solvent, water, reference and the like."""
    frequency_mhz = evidence.spectrum.spectrometer_frequency_mhz

    def margin(signal: Signal) -> float:
        widest_hz = max((line.width_hz for line in signal.lines), default=0.0)
        return max(MARGIN_HZ, MARGIN_WIDTHS * widest_hz) / frequency_mhz

    strays = [one for one in evidence.strays if one.kind in _NOT_COUNTED]
    return [
        (
            one.low_ppm + offset_ppm - margin(one),
            one.high_ppm + offset_ppm + margin(one),
        )
        for one in evidence.signals
        if not any(
            one.low_ppm < stray.high_ppm and stray.low_ppm < one.high_ppm
            for stray in strays
        )
    ]


def _deviation(
    window: Range,
    traces: tuple[Trace, Trace, Trace],
    per_proton: float,
    limits: BatchLimits,
) -> Deviation | None:
    low, high = window
    here, there, apart = (integral(one, low, high) for one in traces)
    larger = max(here.area, there.area)
    sd = float(np.hypot(apart.sd, LEAST_SHARE_SD * larger))
    if abs(apart.area) < SURE_SD * sd or per_proton <= 0.0:
        return None
    smaller = min(here.area, there.area)
    is_line = smaller < max(0.1 * larger, 3.0 * max(here.sd, there.sd))
    scale = 100.0 / (per_proton if is_line else max(there.area, 1e-300))
    limit = limits.line_mol_percent if is_line else limits.integral_percent
    amount = apart.area * scale
    if abs(amount) <= limit:
        return None
    kinds: tuple[DeviationKind, DeviationKind] = (
        ("new", "missing") if is_line else ("more", "less")
    )
    points = traces[2].points(low, high)
    height = float(np.abs(traces[2].intensities[points]).max(initial=0.0))
    return Deviation(
        kind=kinds[0] if amount > 0.0 else kinds[1],
        low_ppm=low,
        high_ppm=high,
        amount=amount,
        sd=sd * scale,
        limit=limit,
        noise_sd=height / traces[2].noise_sd,
    )


def _moved(
    one: CommonSignal, alignment: Alignment, limits: BatchLimits
) -> Deviation | None:
    move_ppm = alignment.offset_ppm - one.offset_ppm
    if abs(move_ppm) <= limits.shift_ppm:
        return None
    return Deviation(
        kind="moved",
        low_ppm=one.low_ppm,
        high_ppm=one.high_ppm,
        amount=move_ppm,
        sd=alignment.offset_sd_ppm,
        limit=limits.shift_ppm,
        noise_sd=0.0,
    )


def _notes(batch: Evidence, reference: Evidence) -> tuple[str, ...]:
    fields = [one.spectrum.spectrometer_frequency_mhz for one in (batch, reference)]
    if same_field(fields[0], fields[1]):
        return ()
    return (
        f"The reference was measured at {fields[1]:.0f} MHz and the batch at "
        f"{fields[0]:.0f}: line shapes differ, and only areas and places compare.",
    )


def best_reference(
    spectrum: Evidence, references: Sequence[Evidence]
) -> tuple[Evidence, float] | None:
    """Reference whose signals a spectrum shows best, with the share it shows.

    Parameters
    ----------
    spectrum : Evidence
    references : sequence of Evidence
        Those in other solvents are passed over.

    Returns
    -------
    (Evidence, float) or None
        None where none has as much as half of its signals in the spectrum.
    """
    best: tuple[Evidence, float] | None = None
    for one in references:
        if one.solvent and spectrum.solvent and one.solvent != spectrum.solvent:
            continue
        share = common_share(one, spectrum)
        if share >= 0.5 and (best is None or share > best[1]):
            best = (one, share)
    return best


def common_share(reference: Evidence, spectrum: Evidence) -> float:
    """Share of signal area that two spectra have in common, each way, the lower."""
    shares = []
    for one, other in ((reference, spectrum), (spectrum, reference)):
        windows = compound_windows(one)
        try:
            found = align(one, other, windows)
        except EvidenceError:
            return 0.0
        areas = {
            (signal.low_ppm, signal.high_ppm): signal.area for signal in one.signals
        }
        total = sum(areas[window] for window in windows)
        shown = sum(
            areas[signal.low_ppm, signal.high_ppm] * signal.correlation
            for signal in found.signals
            # An area three times off is another signal in the same place.
            if 1 / 3 < signal.ratio / found.scale < 3
        )
        shares.append(shown / total if total > 0.0 else 0.0)
    return min(shares)
