"""Carbon count with DEPT, and edited HSQC, foretold for two structures; ppm."""

from __future__ import annotations

from collections.abc import Sequence

from spinledger.reconcile.advice_view import MOST_LOG_ODDS, Finding, View
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.side_costs import (
    carbon_result,
    hsqc_result,
    types_in_words,
)
from spinledger.reconcile.side_evidence import HsqcPeak, ListedCarbon, SideEvidence
from spinledger.reconcile.side_verdict import carbons_of
from spinledger.structure.carbons import CarbonLine

#: Chosen far apart, so that every carbon of a foretold HSQC is its own.
_SPACING_PPM = 5.0


def carbon_finding(own: View, other: View, options: ReconcileOptions) -> Finding | None:
    """Number and types of carbon lines, each list held against the other structure."""
    mine, theirs = (
        carbons_of(
            (one.evaluation.structure, *options.species),
            one.evaluation.evidence,
            options,
        )
        for one in (own, other)
    )
    odds = 0.5 * (
        carbon_result(*theirs, _listed(mine[0])).cost
        + carbon_result(*mine, _listed(theirs[0])).cost
    )
    words = [
        types_in_words([line.n_protons for line in one[0]]) for one in (mine, theirs)
    ]
    if words[0] == words[1] or odds <= 0.0:
        return None
    return Finding(
        log_odds=min(odds, MOST_LOG_ODDS),
        look_for=f"{len(mine[0])} lines ({words[0]}) if {own.name} is right, "
        f"{len(theirs[0])} ({words[1]}) if {other.name} is",
    )


def _listed(lines: Sequence[CarbonLine]) -> SideEvidence:
    return SideEvidence(
        carbons=tuple(
            ListedCarbon(n_protons=frozenset({line.n_protons})) for line in lines
        )
    )


def hsqc_finding(own: View, other: View) -> Finding | None:
    """Which protons share a carbon, and whether it is CH, CH2 or CH3."""
    if not own.places or not other.places:
        return None
    odds = 0.5 * (
        _cost_against(other, foretold_hsqc(own))
        + _cost_against(own, foretold_hsqc(other))
    )
    sentence = _type_sentence(own, other) or _pair_sentence(own, other)
    if odds <= 0.0 or not sentence:
        return None
    return Finding(log_odds=min(odds, MOST_LOG_ODDS), look_for=sentence)


def foretold_hsqc(view: View) -> tuple[HsqcPeak, ...]:
    """Peaks that a structure would give at its fitted shifts; carbon shifts made up."""
    carriers: dict[tuple[int, tuple[int, ...]], list[int]] = {}
    claims = view.evaluation.claims.claims
    for claim in view.places:
        carriers.setdefault((claims[claim].species, claims[claim].atoms), []).append(
            claim
        )
    return tuple(
        HsqcPeak(
            proton_ppm=view.places[claim],
            carbon_ppm=_SPACING_PPM * (number + 1),
            n_protons=frozenset({_protons_each(view, group)}),
        )
        for number, group in enumerate(carriers.values())
        for claim in group
    )


def _protons_each(view: View, group: Sequence[int]) -> int:
    claims = view.evaluation.claims.claims
    return sum(claims[k].n_protons for k in group) // max(
        len(claims[group[0]].atoms), 1
    )


def _cost_against(view: View, peaks: tuple[HsqcPeak, ...]) -> float:
    shifts = view.solution.best.refinement.shifts_ppm
    side = SideEvidence(hsqc=peaks)
    return hsqc_result(view.evaluation.claims, shifts, view.gone, side).cost


def _type_sentence(own: View, other: View) -> str:
    names = {1: "CH", 2: "CH2", 3: "CH3"}
    mine = {peak.proton_ppm: min(peak.n_protons) for peak in foretold_hsqc(own)}
    theirs = {peak.proton_ppm: min(peak.n_protons) for peak in foretold_hsqc(other)}
    for shift, count in sorted(mine.items()):
        claim = other.near(shift)
        if claim is None:
            continue
        not_mine = theirs[other.places[claim]]
        if count != not_mine:
            return (
                f"the carbon under {shift:.2f} ppm is {names.get(count, 'CH')} if "
                f"{own.name} is right, {names.get(not_mine, 'CH')} if {other.name} is"
            )
    return ""


def _pair_sentence(own: View, other: View) -> str:
    """Two protons that share a carbon in one structure only."""
    for right, wrong in ((own, other), (other, own)):
        claims = right.evaluation.claims.claims
        rivals = wrong.evaluation.claims.claims
        for claim, shift in right.places.items():
            partner = next(
                (
                    k
                    for k in right.places
                    if k > claim and claims[k].atoms == claims[claim].atoms
                ),
                None,
            )
            if partner is None:
                continue
            theirs = wrong.near(shift), wrong.near(right.places[partner])
            if None in theirs or theirs[0] == theirs[1]:
                continue
            if rivals[theirs[0] or 0].atoms != rivals[theirs[1] or 0].atoms:
                return (
                    f"{shift:.2f} and {right.places[partner]:.2f} ppm share a carbon if "
                    f"{right.name} is right, and do not if {wrong.name} is"
                )
    return ""
