"""A D2O shake pair: what went, what stayed, and what that says; ppm and Hz."""

from __future__ import annotations

from dataclasses import dataclass

from spinledger.processing.solvents import is_aqueous, water_lines
from spinledger.sample.align import Alignment
from spinledger.sample.collapse import Collapse, collapses
from spinledger.sample.difference import Difference, difference
from spinledger.sample.exchanged import (
    ExchangedFraction,
    Loss,
    Plot,
    exchanged_areas,
    matched_traces,
)
from spinledger.structure.exchange import exchanges
from spinledger.structure.read import molecule
from spinledger.values.evidence import Evidence, Signal
from spinledger.values.ledger import Ledger

# Heavy water that does not mix hangs as droplets, HOD near its place in water.
DROPLET_HOD_PPM = (4.6, 4.95)
WATER_REACH_PPM = 0.15
CHANGED_SD = 3.0
ALL_GONE = 0.9
# A line that takes less than this share of its claim's area is no line of it.
LEAST_LINE_SHARE = 0.02


@dataclass(frozen=True, slots=True, kw_only=True)
class Gain:
    """A signal that came with the shake."""

    low_ppm: float
    high_ppm: float
    is_water: bool


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Shake:
    """What a shake pair proves.

    Attributes
    ----------
    before, after : str
        Names of the spectra.
    alignment : Alignment
    fractions : tuple of ExchangedFraction
    collapses : tuple of Collapse
    losses : tuple of Loss
        Claims that lost or won area although they must not.
    gains : tuple of Gain
    difference : Difference
        Before minus after, the latter moved and scaled.
    """

    before: str
    after: str
    alignment: Alignment
    fractions: tuple[ExchangedFraction, ...]
    collapses: tuple[Collapse, ...]
    losses: tuple[Loss, ...]
    gains: tuple[Gain, ...]
    difference: Difference

    def sentences(self) -> tuple[str, ...]:
        """What the pair says, the most telling first."""
        return (
            *(_loss_sentence(one) for one in self.losses),
            *(_fraction_sentence(one) for one in self.fractions),
            *(_collapse_sentence(one, self.fractions) for one in self.collapses),
            *(_gain_sentence(one) for one in self.gains),
        )

    @property
    def contradicts(self) -> bool:
        """Whether a claim that cannot exchange has gone."""
        return any(one.fraction > 0.0 for one in self.losses)


def shake_pair(ledger: Ledger, after: Evidence) -> Shake:
    """Compare a reconciled spectrum with the one after a shake with heavy water.

    Parameters
    ----------
    ledger : Ledger
        Of the spectrum before the shake.
    after : Evidence

    Raises
    ------
    EvidenceError
        If the two spectra have no common signal to align on.
    """
    before = ledger.evidence
    gains = _gains(before, after)
    waters = [
        (one.low_ppm, one.high_ppm)
        for evidence in (before, after)
        for one in evidence.strays
        if one.kind == "water"
    ]
    waters += [(one.low_ppm, one.high_ppm) for one in gains if one.is_water]
    areas = exchanged_areas(before, after, plots_of(ledger), waters=waters)
    return Shake(
        before=before.metadata.source_name,
        after=after.metadata.source_name,
        alignment=areas.alignment,
        fractions=areas.fractions,
        collapses=collapses(ledger, matched_traces(before, after, areas.alignment)),
        losses=areas.losses,
        gains=gains,
        difference=difference(before, after, areas.alignment),
    )


def plots_of(ledger: Ledger) -> tuple[Plot, ...]:
    """Where each placed claim stands, and whether it may exchange."""
    if ledger.model is None:
        return ()
    fading = {
        atom
        for atom, one in exchanges(molecule(ledger.structure), "D2O").items()
        if not one.is_exchangeable
    }
    claims = {one.label: one for one in ledger.claims.claims}
    ranges = {
        one.claim: one.range_ppm for one in ledger.entries if one.range_ppm is not None
    }
    plots = []
    for lines in ledger.model.claim_lines:
        if lines.claim not in ranges:
            continue
        claim = claims[lines.claim]
        low, high = ranges[lines.claim]
        # Strong coupling gives faint lines far away, which are not its own.
        shown = (lines.protons > LEAST_LINE_SHARE * lines.protons.max()) & (
            (lines.shifts_ppm >= low) & (lines.shifts_ppm <= high)
        )
        if not shown.any():
            continue
        may_exchange = (
            claim.is_exchangeable
            or claim.visibility == "optional"
            or (claim.species == 0 and bool(set(claim.atoms) & fading))
        )
        plots.append(
            Plot(
                claim=lines.claim,
                n_protons=claim.n_protons,
                low_ppm=float(lines.shifts_ppm[shown].min()),
                high_ppm=float(lines.shifts_ppm[shown].max()),
                width_hz=lines.width_hz,
                frequency_mhz=ledger.evidence.spectrum.spectrometer_frequency_mhz,
                may_exchange=may_exchange,
            )
        )
    return tuple(plots)


def _gains(before: Evidence, after: Evidence) -> tuple[Gain, ...]:
    """Signals after the shake where there was none before."""
    known = [
        *((one.low_ppm, one.high_ppm) for one in before.signals),
        *((one.low_ppm, one.high_ppm) for one in before.strays),
    ]
    weak = {"satellite", "sideband", "reference", "solvent"}
    strays = [one for one in after.strays if one.kind in weak]
    new = []
    for signal in after.signals:
        taken = [*known, *((one.low_ppm, one.high_ppm) for one in strays)]
        if signal.area < 5.0 * signal.area_sd or any(
            signal.low_ppm < high and low < signal.high_ppm for low, high in taken
        ):
            continue
        new.append(
            Gain(
                low_ppm=signal.low_ppm,
                high_ppm=signal.high_ppm,
                is_water=_is_water(signal, after),
            )
        )
    return tuple(new)


def _is_water(signal: Signal, after: Evidence) -> bool:
    middle = (signal.low_ppm + signal.high_ppm) / 2.0
    if not is_aqueous(after.solvent) and (
        DROPLET_HOD_PPM[0] <= middle <= DROPLET_HOD_PPM[1]
    ):
        return True
    expected = water_lines(after.solvent, after.metadata.temperature_k)
    return any(abs(one.shift_ppm - middle) <= WATER_REACH_PPM for one in expected)


def _names(claims: tuple[str, ...]) -> str:
    return " and ".join(claims)


def _fraction_sentence(one: ExchangedFraction) -> str:
    names = _names(one.claims)
    if one.fraction is None or one.sd is None:
        return one.why
    figure = f"{one.fraction:.2f} ± {one.sd:.2f} of its area is gone"
    if len(one.claims) > 1:
        figure = figure.replace("its", "their common")
    rest = f" {one.why}" if one.why else ""
    if one.fraction < CHANGED_SD * one.sd:
        return f"{names} stayed in the shake ({figure}).{rest}"
    if one.fraction + CHANGED_SD * one.sd >= 1.0 or one.fraction > ALL_GONE:
        return f"{names} exchanged ({figure}).{rest}"
    return f"{names} exchanged in part ({figure}).{rest}"


def _collapse_sentence(one: Collapse, fractions: tuple[ExchangedFraction, ...]) -> str:
    expected = next((row for row in fractions if one.claim in row.claims), None)
    figure = f"{one.fraction:.2f} ± {one.sd:.2f}"
    start = (
        f"The coupling of {one.partner} to {one.claim} ({abs(one.j_hz):.1f} Hz) has "
        f"collapsed in {figure} of the molecules"
    )
    if expected is None or expected.fraction is None or expected.sd is None:
        return f"{start}."
    apart = abs(one.fraction - expected.fraction)
    if apart <= CHANGED_SD * (one.sd**2 + expected.sd**2) ** 0.5:
        return f"{start}, as its loss asks for."
    return (
        f"{start}, while {expected.fraction:.2f} ± {expected.sd:.2f} of its area is "
        "gone; the two do not agree."
    )


def _loss_sentence(one: Loss) -> str:
    verb = "lost" if one.fraction > 0.0 else "won"
    return (
        f"{_names(one.claims)} {verb} {abs(one.fraction):.2f} ± {one.sd:.2f} of its "
        "area in the shake, although it should not exchange."
    )


def _gain_sentence(one: Gain) -> str:
    middle = (one.low_ppm + one.high_ppm) / 2.0
    if one.is_water:
        return f"The signal at {middle:.2f} ppm came with the heavy water: HOD."
    return f"The signal at {middle:.2f} ppm is new after the shake."
