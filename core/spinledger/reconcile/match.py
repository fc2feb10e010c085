"""Claims to places in the spectrum: the k best hypotheses and their gap.

Shifts in ppm; costs are negative log likelihoods.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace

import numpy as np

from spinledger.reconcile.beam import BeamSettings, Placement, run_beam
from spinledger.reconcile.coarse import (
    CoarseSpectrum,
    FloatArray,
    coarse_spectrum,
    first_order_sticks,
)
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.search import Search, prepare_search
from spinledger.reconcile.side_costs import placement_cost
from spinledger.reconcile.side_evidence import SideEvidence
from spinledger.values.arrays import locked_floats
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence

SMALL_REFERENCE_SD_PPM = 0.02
NOTICEABLE_SCALE = 0.12
HIDDEN_SHARE = 0.7


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Hypothesis:
    """One way to put the claims to the spectrum, from the coarse view.

    Attributes
    ----------
    shifts_ppm : numpy.ndarray, shape (n_claims,)
        Predicted shift where a claim is silent or absent.
    absent : frozenset of int
        Claims that are not in the spectrum (silent ones included).
    hidden : frozenset of int
        Claims that lie under a mask.
    cost : float
    offset_ppm : float
        Common error of the reference that the cost assumes.
    area_per_proton : float
    amplitudes : numpy.ndarray, shape (n_claims,)
        Relative to the common area of one proton; 0 where absent.
    """

    shifts_ppm: FloatArray
    absent: frozenset[int]
    hidden: frozenset[int]
    cost: float
    offset_ppm: float
    area_per_proton: float
    amplitudes: FloatArray

    def __post_init__(self) -> None:
        for name in ("shifts_ppm", "amplitudes"):
            object.__setattr__(self, name, locked_floats(getattr(self, name), name))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Match:
    """Hypotheses, best first, and the coarse spectrum they were found on."""

    hypotheses: tuple[Hypothesis, ...]
    coarse: CoarseSpectrum


def match(
    evidence: Evidence,
    claims: ClaimSet,
    *,
    constraints: Constraints | None = None,
    settings: BeamSettings | None = None,
    coarse: CoarseSpectrum | None = None,
    cancelled: Callable[[], None] | None = None,
) -> Match:
    """Best hypotheses over shift, area, splitting and one reference offset.

    Parameters
    ----------
    evidence : Evidence
    claims : ClaimSet
    constraints : Constraints, optional
        Hand edits.
    settings : BeamSettings, optional
        Chosen by the number of claims when not given.
    coarse : CoarseSpectrum, optional
        Of the same evidence and constraints, where it was made before.
    cancelled : callable, optional
        Raises when the user stopped.

    Notes
    -----
    A search is repeated with a new common area when the best placement shows
    that strays or hidden claims made the first guess wrong, and with shifted
    predictions when the reference is uncertain.
    """
    view = coarse or coarse_spectrum(evidence, masked_by_hand(constraints))
    couplings_hz = starting_couplings(claims, constraints)
    if all(claim.visibility == "silent" for claim in claims.claims):
        return Match(hypotheses=(), coarse=view)
    sticks = first_order_sticks(claims, couplings_hz)
    chosen = settings or default_settings(len(claims.claims))
    found: list[Hypothesis] = []
    for offset_ppm in _offsets(evidence.reference.sd_ppm):
        scale = 1.0
        for _ in range(2):
            search = prepare_search(
                view,
                claims,
                couplings_hz=couplings_hz,
                offset_ppm=offset_ppm,
                area_scale=scale,
                constraints=constraints,
            )
            placements = run_beam(search, chosen, cancelled)
            found += [
                _hypothesis(search, one, claims, offset_ppm, sticks)
                for one in placements
            ]
            scale *= placements[0].area_per_proton / search.area_per_proton
            if abs(np.log(scale)) < NOTICEABLE_SCALE:
                break
    settled = [_with_offset(one, claims, evidence.reference.sd_ppm) for one in found]
    if constraints is not None and constraints.side is not None:
        settled = [_with_side(one, claims, constraints.side) for one in settled]
    return Match(hypotheses=_best_distinct(settled, view), coarse=view)


def default_settings(n_claims: int) -> BeamSettings:
    """Wider for many claims, since their order matters more."""
    if n_claims > 10:
        return BeamSettings(width=120, n_places=12, n_polished=30)
    return BeamSettings()


def masked_by_hand(
    constraints: Constraints | None,
) -> tuple[tuple[float, float], ...]:
    """Ranges that the user left out or declared impurities."""
    if constraints is None:
        return ()
    declared = tuple((one.low_ppm, one.high_ppm) for one in constraints.impurities)
    return (*constraints.excluded_ppm, *declared)


def starting_couplings(claims: ClaimSet, constraints: Constraints | None) -> FloatArray:
    """Predicted couplings, with those that the user holds, shape (n_couplings,)."""
    values = np.array([one.j_hz for one in claims.couplings], dtype=np.float64)
    for index in held_couplings(claims, constraints):
        values[index[0]] = index[1]
    return values


def held_couplings(
    claims: ClaimSet, constraints: Constraints | None
) -> Iterable[tuple[int, float]]:
    """Index and value of every coupling that the user holds."""
    for held in constraints.fixed_couplings if constraints else ():
        wanted = {held.claim, held.partner}
        for index, coupling in enumerate(claims.couplings):
            labels = {
                claims.claims[owner].label
                for pair in coupling.pairs[:1]
                for number in pair
                if (owner := claims.particles[number].claim) is not None
            }
            if labels == wanted:
                yield index, held.j_hz
                break


def _offsets(sd_ppm: float) -> tuple[float, ...]:
    """Reference errors to try; one when the shifts hardly notice."""
    if sd_ppm <= SMALL_REFERENCE_SD_PPM * 2.5:
        return (0.0,)
    return (0.0, -1.3 * sd_ppm, 1.3 * sd_ppm)


def _hypothesis(
    search: Search,
    placement: Placement,
    claims: ClaimSet,
    offset_ppm: float,
    sticks: tuple[tuple[FloatArray, FloatArray], ...],
) -> Hypothesis:
    shifts = np.array([claim.shift_ppm for claim in claims.claims])
    amplitudes = np.zeros(len(claims.claims))
    absent = {
        i for i, claim in enumerate(claims.claims) if claim.visibility == "silent"
    }
    hidden = set()
    for member, place in enumerate(placement.places):
        index = search.members[member]
        if place < 0:
            absent.add(index)
            continue
        shifts[index] = search.coarse.grid_ppm[place]
        amplitudes[index] = placement.amplitudes[member] / placement.area_per_proton
        under = search.coarse.hidden_share(sticks[index], float(shifts[index]))
        if under > HIDDEN_SHARE:
            hidden.add(index)
    return Hypothesis(
        shifts_ppm=shifts,
        absent=frozenset(absent),
        hidden=frozenset(hidden),
        cost=placement.cost,
        offset_ppm=offset_ppm,
        area_per_proton=placement.area_per_proton,
        amplitudes=amplitudes,
    )


def _with_offset(
    hypothesis: Hypothesis, claims: ClaimSet, reference_sd_ppm: float
) -> Hypothesis:
    """Cost with the reference error that suits this hypothesis best."""
    weight, pull, before = 0.0, 0.0, 0.0
    gaps, sds = [], []
    for index, claim in enumerate(claims.claims):
        if index in hypothesis.absent:
            continue
        gap = float(hypothesis.shifts_ppm[index]) - claim.shift_ppm
        sd = max(claim.shift_sd_ppm, 0.02)
        gaps.append(gap)
        sds.append(sd)
        weight += 1.0 / sd**2
        pull += gap / sd**2
    if not gaps or reference_sd_ppm <= 0.0:
        return hypothesis
    offset = pull / (weight + 1.0 / reference_sd_ppm**2)
    z = np.array(gaps) / np.array(sds)
    moved = (np.array(gaps) - offset) / np.array(sds)
    assumed = (np.array(gaps) - hypothesis.offset_ppm) / np.array(sds)
    before = float(_t(assumed).sum())
    after = float(_t(moved).sum()) + 0.5 * (offset / reference_sd_ppm) ** 2
    unmoved = float(_t(z).sum())
    best_offset, best = (offset, after) if after < unmoved else (0.0, unmoved)
    return Hypothesis(
        shifts_ppm=hypothesis.shifts_ppm,
        absent=hypothesis.absent,
        hidden=hypothesis.hidden,
        cost=hypothesis.cost - before + best,
        offset_ppm=best_offset,
        area_per_proton=hypothesis.area_per_proton,
        amplitudes=hypothesis.amplitudes,
    )


def _with_side(
    hypothesis: Hypothesis, claims: ClaimSet, side: SideEvidence
) -> Hypothesis:
    """Cost with what HSQC and COSY say of the placement."""
    gone = hypothesis.absent | hypothesis.hidden
    extra = placement_cost(claims, hypothesis.shifts_ppm, gone, side)
    return replace(hypothesis, cost=hypothesis.cost + extra)


def _t(z: FloatArray) -> FloatArray:
    return np.asarray(2.5 * np.log1p(np.square(z) / 4.0))


def _best_distinct(
    found: list[Hypothesis], view: CoarseSpectrum
) -> tuple[Hypothesis, ...]:
    """Sorted by cost, without those within a few Hz of a better one."""
    limit_ppm = 8.0 / view.frequency_mhz
    chosen: list[Hypothesis] = []
    for one in sorted(found, key=lambda hypothesis: hypothesis.cost):
        near = any(
            one.absent == other.absent
            and np.abs(one.shifts_ppm - other.shifts_ppm).max(initial=0.0) < limit_ppm
            for other in chosen
        )
        if not near:
            chosen.append(one)
    return tuple(chosen)
