"""Rows of the ledger: claims, what they are put to, and the residuals.

Shifts in ppm, couplings and widths in Hz, areas in intensity * Hz.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from spinledger.reconcile.assess import ClaimResidual, expected_protons
from spinledger.reconcile.envelopes import (
    Envelope,
    balance_of,
    claim_ranges,
    common_scale,
    raw_integrals,
    shared_envelopes,
)
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.solve import Solution
from spinledger.reconcile.words import (
    amplitude_reason,
    coupling_reason,
    hidden_reason,
    misfit_reason,
    open_reason,
    optional_reason,
    shift_reason,
)
from spinledger.spins.network import ClaimNetwork
from spinledger.spins.tree import Resolution, splitting_tree
from spinledger.values.claim import Claim
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import (
    Balance,
    Entry,
    EntryCoupling,
    EntryGroup,
    State,
)

DISPUTED_Z = 3.0
DISPUTED_MISFIT = 0.5
DISPUTED_AMPLITUDE_LOG = 0.55
OPEN_AMPLITUDE = 0.2
BROAD_RATIO = 3.0
BROAD_HZ = 4.0
# Pulse angle, delay and baseline leave integrals this unsure [common practice].
INTEGRAL_SD_SHARE = 0.08
# Saturation reaches protons that exchange or relax with water, alpha-H most.
WATER_REACH_PPM = 1.5


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Booking:
    """Entries with their balance and the scale they share.

    Attributes
    ----------
    entries : tuple of Entry
    balance : Balance
    area_per_proton : float
        Intensity * Hz.
    """

    entries: tuple[Entry, ...]
    balance: Balance
    area_per_proton: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class _Page:
    """What the rows have in common."""

    evidence: Evidence
    solution: Solution
    ranges: dict[int, tuple[float, float]]
    envelopes: tuple[Envelope, ...]
    integrals: dict[int, float]
    disputed: dict[int, frozenset[int]]
    network: ClaimNetwork
    in_full: bool


def book_entries(
    evidence: Evidence,
    solution: Solution,
    constraints: Constraints | None = None,
    *,
    in_full: bool = True,
) -> Booking:
    """One entry a claim, in the order of the claims.

    Parameters
    ----------
    evidence : Evidence
    solution : Solution
    constraints : Constraints, optional
    in_full : bool
        False leaves out the multiplicities, which take simulations.
    """
    lines = {one.claim: one for one in solution.best.refinement.claim_lines}
    ranges = claim_ranges(evidence, solution, lines)
    envelopes = shared_envelopes(evidence, solution, ranges, constraints)
    raw = raw_integrals(solution, envelopes)
    scale, scale_signal = common_scale(solution, envelopes, raw)
    integrals = {index: value / scale for index, value in raw.items()}
    page = _Page(
        evidence=evidence,
        solution=solution,
        ranges=ranges,
        envelopes=envelopes,
        integrals=integrals,
        disputed=_booked_once(solution),
        network=ClaimNetwork(solution.claims),
        in_full=in_full,
    )
    return Booking(
        entries=tuple(
            _entry(page, index) for index in range(len(solution.claims.claims))
        ),
        balance=balance_of(solution, integrals, scale_signal),
        area_per_proton=solution.best.refinement.area_per_proton * scale,
    )


def unsolved_entries(solution_claims: tuple[Claim, ...]) -> tuple[Entry, ...]:
    """Entries where nothing could be placed: open or silent."""
    return tuple(
        _row(claim, "silent" if claim.visibility != "seen" else "open", claim.why)
        for claim in solution_claims
    )


def _row(claim: Claim, state: State, why: str, reasons: tuple[str, ...] = ()) -> Entry:
    return Entry(
        claim=claim.label,
        atoms=claim.atoms,
        species=claim.species,
        protons=claim.n_protons,
        state=state,
        predicted_shift_ppm=claim.shift_ppm,
        predicted_shift_sd_ppm=claim.shift_sd_ppm,
        why=why,
        reasons=reasons,
    )


def _booked_once(solution: Solution) -> dict[int, frozenset[int]]:
    """Disputed rigid couplings by the one claim that they are booked to."""
    rows: dict[int, set[int]] = {}
    for one in solution.best.assessment.couplings:
        if not one.is_rigid or abs(one.z) < DISPUTED_Z:
            continue
        owners = _owners(solution, one.coupling)
        rows.setdefault(min(owners), set()).add(one.coupling)
    return {claim: frozenset(couplings) for claim, couplings in rows.items()}


def _owners(solution: Solution, coupling: int) -> list[int]:
    claims = solution.claims
    owners = {
        owner
        for number in claims.couplings[coupling].pairs[0]
        if (owner := claims.particles[number].claim) is not None
    }
    return sorted(owners)


def _entry(page: _Page, index: int) -> Entry:
    solution = page.solution
    claim = solution.claims.claims[index]
    residual = _residual_of(solution, index)
    if residual is None or index not in page.ranges:
        return _unplaced(page, index)
    refinement = solution.best.refinement
    envelope = next(one for one in page.envelopes if index in one.members)
    integral = page.integrals[index]
    integral_sd = envelope.area_sd / max(refinement.area_per_proton, 1e-300)
    expected = expected_protons(solution.claims, claim)
    spread = float(np.hypot(INTEGRAL_SD_SHARE * expected, integral_sd))
    reasons = _reasons(page, index, residual, envelope)
    return Entry(
        claim=claim.label,
        atoms=claim.atoms,
        species=claim.species,
        protons=claim.n_protons,
        state="disputed" if reasons else "settled",
        predicted_shift_ppm=claim.shift_ppm,
        predicted_shift_sd_ppm=claim.shift_sd_ppm,
        shift_ppm=float(refinement.shifts_ppm[index]),
        shift_sd_ppm=float(refinement.shift_sds_ppm[index]),
        range_ppm=page.ranges[index],
        integral_protons=integral,
        integral_sd_protons=integral_sd,
        multiplicity=_measured_multiplicity(page, index) if page.in_full else None,
        predicted_multiplicity=(
            _drawn_multiplicity(page, index) if page.in_full else ""
        ),
        width_hz=float(refinement.widths_hz[index]),
        couplings=entry_couplings(solution, index, page.disputed.get(index)),
        group=_group(solution, index, envelope),
        shift_residual_sd=residual.shift_z,
        integral_residual_sd=(integral - expected) / max(spread, 1e-9),
        j_residual_sd=_worst_coupling(solution, index),
        why=claim.why,
        reasons=reasons,
    )


def _residual_of(solution: Solution, index: int) -> ClaimResidual | None:
    """Residuals of a placed claim; None where it is absent or far too faint."""
    rows = solution.best.assessment.claims
    found = next((one for one in rows if one.claim == index), None)
    if found is None or index in solution.hidden:
        return None
    faint = found.is_counted and found.amplitude_log < np.log(OPEN_AMPLITUDE)
    return None if faint else found


def _unplaced(page: _Page, index: int) -> Entry:
    solution = page.solution
    claim = solution.claims.claims[index]
    couplings = entry_couplings(solution, index, None, withheld=True)
    if claim.visibility == "silent":
        row = _row(claim, "silent", claim.why)
    elif index in solution.hidden:
        place = float(solution.best.refinement.shifts_ppm[index])
        row = _row(claim, "silent", hidden_reason(page.evidence, place))
    elif claim.visibility == "optional":
        row = _row(claim, "silent", claim.why or optional_reason(claim))
    else:
        shape = _drawn_multiplicity(page, index)
        row = _row(claim, "open", "", (open_reason(claim, shape),))
    return _with_couplings(row, couplings)


def _with_couplings(row: Entry, couplings: tuple[EntryCoupling, ...]) -> Entry:
    return replace(row, couplings=couplings)


def _reasons(
    page: _Page, index: int, residual: ClaimResidual, envelope: Envelope
) -> tuple[str, ...]:
    """Why an entry is disputed; empty where it is settled."""
    if not residual.is_counted:
        return ()
    solution = page.solution
    claim = solution.claims.claims[index]
    reasons = []
    shift_ppm = float(solution.best.refinement.shifts_ppm[index])
    if abs(residual.shift_z) > DISPUTED_Z:
        reasons.append(shift_reason(claim, shift_ppm, residual.shift_z))
    for coupling in sorted(page.disputed.get(index, frozenset())):
        j_hz = float(solution.best.refinement.couplings_hz[coupling])
        reasons.append(coupling_reason(solution.claims, coupling, j_hz))
    ratio = page.integrals[index] / expected_protons(solution.claims, claim)
    alone = len(envelope.members) == 1
    if (
        alone
        and abs(np.log(max(ratio, 1e-3))) > DISPUTED_AMPLITUDE_LOG
        and not _is_bleached(page, shift_ppm, ratio)
    ):
        reasons.append(amplitude_reason(claim, page.integrals[index]))
    if residual.residual_share > DISPUTED_MISFIT:
        reasons.append(misfit_reason(claim))
    return tuple(reasons)


def _is_bleached(page: _Page, shift_ppm: float, ratio: float) -> bool:
    """Whether presaturated water may have taken the intensity away."""
    if not page.evidence.presaturated or ratio > 1.0:
        return False
    return any(
        stray.kind == "water"
        and stray.low_ppm - WATER_REACH_PPM
        < shift_ppm
        < stray.high_ppm + WATER_REACH_PPM
        for stray in page.evidence.strays
    )


def _measured_multiplicity(page: _Page, index: int) -> str:
    refinement = page.solution.best.refinement
    tree = splitting_tree(
        page.network,
        index,
        refinement.shifts_ppm * page.evidence.spectrum.spectrometer_frequency_mhz,
        refinement.couplings_hz,
        resolution=Resolution(
            width_hz=float(refinement.widths_hz[index]),
            determined=refinement.determined,
        ),
        absent=page.solution.absent,
    )
    return _broad(page, index) + tree.multiplicity


def _drawn_multiplicity(page: _Page, index: int) -> str:
    claims = page.solution.claims
    predicted = np.array([one.shift_ppm for one in claims.claims])
    tree = splitting_tree(
        page.network,
        index,
        predicted * page.evidence.spectrum.spectrometer_frequency_mhz,
        np.array([one.j_hz for one in claims.couplings]),
        absent=page.solution.absent,
    )
    return tree.multiplicity


def _broad(page: _Page, index: int) -> str:
    """Give "br " for a line much wider than the others."""
    widths = page.solution.best.refinement.widths_hz
    placed = [float(widths[i]) for i in page.ranges]
    own = float(widths[index])
    common = float(np.median(placed))
    return "br " if own > BROAD_HZ and own > BROAD_RATIO * common else ""


def entry_couplings(
    solution: Solution,
    index: int,
    disputed: frozenset[int] | None,
    *,
    withheld: bool = False,
) -> tuple[EntryCoupling, ...]:
    """Couplings of one claim, each once a partner and parameter.

    Parameters
    ----------
    solution : Solution
    index : int
        Claim.
    disputed : frozenset of int, optional
        Couplings booked as disputed to this claim.
    withheld : bool
        True for a claim that was not placed: predictions only.
    """
    claims = solution.claims
    refinement = solution.best.refinement
    rows = []
    for number, coupling in enumerate(claims.couplings):
        partner = _partner(solution, number, index)
        if partner is None:
            continue
        other = next((i for i in _owners(solution, number) if i != index), index)
        unplaced = other in solution.absent or other in solution.hidden
        known = bool(refinement.determined[number]) and not withheld and not unplaced
        if other == index and partner == claims.claims[index].label and not known:
            continue
        rows.append(
            EntryCoupling(
                partner=partner,
                j_hz=float(refinement.couplings_hz[number]) if known else None,
                j_sd_hz=float(refinement.coupling_sds_hz[number]) if known else None,
                determined=known,
                predicted_j_hz=coupling.j_hz,
                predicted_j_sd_hz=coupling.j_sd_hz,
                kind=coupling.kind,
                sum_hz=None if withheld or known else _sum_of(solution, number),
                is_disputed=disputed is not None and number in disputed,
            )
        )
    return tuple(rows)


def _sum_of(solution: Solution, coupling: int) -> float | None:
    """Sum that is known although this coupling alone is not."""
    for one in solution.best.refinement.known_sums:
        if coupling in (one.first, one.second):
            return one.sum_hz
    return None


def _partner(solution: Solution, coupling: int, index: int) -> str | None:
    """Label of what a claim couples to by a parameter; None if it does not."""
    claims = solution.claims
    for pair in claims.couplings[coupling].pairs:
        owners = [claims.particles[number].claim for number in pair]
        if index not in owners:
            continue
        side = 1 - owners.index(index)
        owner = owners[side]
        if owner is None:
            return claims.particles[pair[side]].nucleus
        return claims.claims[owner].label
    return None


def _group(solution: Solution, index: int, envelope: Envelope) -> EntryGroup | None:
    labels = [claim.label for claim in solution.claims.claims]
    rows = [one for one in solution.odds if index in (one.first, one.second)]
    if rows:
        partners = [
            labels[one.second if one.first == index else one.first] for one in rows
        ]
        return EntryGroup(
            kind="interchangeable",
            partners=tuple(partners),
            odds=min(one.odds for one in rows),
        )
    others = tuple(labels[i] for i in envelope.members if i != index)
    return EntryGroup(kind="shared", partners=others) if others else None


def _worst_coupling(solution: Solution, index: int) -> float | None:
    z = [
        one.z
        for one in solution.best.assessment.couplings
        if index in _owners(solution, one.coupling)
    ]
    return max(z, key=abs) if z else None
