"""One structure's own verdict: the same for reconcile and for rank."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from spinledger.prediction.claims import make_claims
from spinledger.processing.solvents import is_aqueous
from spinledger.reconcile.assess import Assessment, assess
from spinledger.reconcile.coarse import CoarseSpectrum, coarse_spectrum
from spinledger.reconcile.companions import given_strays
from spinledger.reconcile.entries import Booking, book_entries
from spinledger.reconcile.judge import VerdictModel, load_model, logit_of, state_of
from spinledger.reconcile.match import masked_by_hand
from spinledger.reconcile.misfit import spectrum_misfit
from spinledger.reconcile.mixture import joined
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.side_verdict import side_findings
from spinledger.reconcile.solve import Limits, Solution, solve
from spinledger.reconcile.strays import (
    Unowned,
    book_strays,
    own_satellites,
    released,
    table_impurities,
    unowned_stretches,
)
from spinledger.reconcile.tails import with_tails
from spinledger.values.claim import Claim, ClaimSet
from spinledger.values.evidence import Evidence, Stray
from spinledger.values.ledger import SideFinding, VerdictState
from spinledger.values.structure import Structure

MUCH_IMPURITY = 0.2
POOR_RESIDUAL = 0.25
MUCH_BETTER = 0.6


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Evaluation:
    """What one structure comes to against one spectrum.

    Attributes
    ----------
    structure : Structure
    claims : ClaimSet
    evidence : Evidence
        With the claimed structure's own lines given back to it, and with the
        strays that could be explained.
    solution : Solution or None
        None where nothing could be compared.
    assessment : Assessment or None
        After explained strays were taken out of the misfit.
    booking : Booking or None
    strays : tuple of Stray
    faults : dict
        Features of the verdict by name.
    logit : float or None
        Log odds at a prior of one half.
    state : str
    side : tuple of SideFinding
        What carbon list, HSQC and COSY said; their cost is in the logit.
    """

    structure: Structure
    claims: ClaimSet
    evidence: Evidence
    solution: Solution | None
    assessment: Assessment | None
    booking: Booking | None
    strays: tuple[Stray, ...]
    faults: dict[str, float]
    logit: float | None
    state: VerdictState
    side: tuple[SideFinding, ...] = ()

    @property
    def probability(self) -> float | None:
        """Probability that the structure is right, at a prior of one half."""
        if self.logit is None:
            return None
        return float(1.0 / (1.0 + np.exp(-np.clip(self.logit, -30.0, 30.0))))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Bench:
    """One spectrum laid out for several structures; the coarse view is shared."""

    evidence: Evidence
    options: ReconcileOptions
    coarse: CoarseSpectrum
    model: VerdictModel


def lay_out(
    evidence: Evidence, options: ReconcileOptions, model: VerdictModel | None = None
) -> Bench:
    """Prepare what all structures of one spectrum share."""
    evidence = with_tails(evidence)
    return Bench(
        evidence=evidence,
        options=options,
        coarse=coarse_spectrum(evidence, masked_by_hand(options.constraints)),
        model=model or load_model(),
    )


def claims_of(structure: Structure, bench: Bench) -> ClaimSet:
    """Claims of a structure, and of the further species that share the tube."""
    options = bench.options
    temperature_k = options.temperature_k or bench.evidence.metadata.temperature_k
    sets = [
        make_claims(
            one,
            solvent=bench.evidence.solvent,
            ph=options.ph,
            temperature_k=temperature_k,
        )
        for one in (structure, *options.species)
    ]
    return joined(sets)


def evaluate(
    structure: Structure, bench: Bench, limits: Limits, *, in_full: bool = False
) -> Evaluation:
    """Claims, match, refinement, booking and own verdict of one structure.

    Parameters
    ----------
    structure : Structure
    bench : Bench
    limits : Limits
    in_full : bool
        Book multiplicities too, which a ranking does not need.
    """
    claims = claims_of(structure, bench)
    evidence = released(bench.evidence, structure)
    shared = bench.coarse if evidence is bench.evidence else None
    constraints = bench.options.constraints
    solution = None
    if evidence.signals and any(one.visibility != "silent" for one in claims.claims):
        solution = solve(
            evidence, claims, constraints=constraints, coarse=shared, limits=limits
        )
        evidence, solution = _second_look(evidence, claims, solution, bench, limits)
    if solution is None:
        return _not_judged(structure, claims, evidence)
    booking = book_entries(evidence, solution, constraints, in_full=in_full)
    misfit = spectrum_misfit(evidence, solution.best.refinement, constraints)
    unowned = unowned_stretches(evidence, misfit, booking.area_per_proton)
    explained = _explained(evidence, solution, bench, unowned)
    settled = replace(evidence, strays=(*evidence.strays, *explained.values()))
    # So much area cannot be set aside when the structure is judged.
    judged = evidence if _is_much(explained.values(), booking) else settled
    assessment = assess(
        judged,
        claims,
        solution.fits,
        absent=solution.absent,
        hidden=solution.hidden,
        constraints=constraints,
    )
    faults = assessment.faults()
    side = side_findings(structure, claims, solution, evidence, bench.options)
    logit = logit_of(faults, bench.model) - sum(one.cost for one in side)
    rest = [one for number, one in enumerate(unowned) if number not in explained]
    return Evaluation(
        structure=structure,
        claims=claims,
        evidence=settled,
        solution=solution,
        assessment=assessment,
        booking=booking,
        strays=book_strays(
            settled, rest, booking.area_per_proton, constraints=constraints
        ),
        faults=faults,
        logit=logit,
        state=state_of(1.0 / (1.0 + float(np.exp(-logit))), bench.model),
        side=side,
    )


def _second_look(
    evidence: Evidence,
    claims: ClaimSet,
    solution: Solution | None,
    bench: Bench,
    limits: Limits,
) -> tuple[Evidence, Solution | None]:
    """Give a line taken for water or solvent to a claim that is predicted there.

    Only where the first fit is poor, and only where the line may not be water at
    all: in heavy water it always is.
    """
    share = solution.best.assessment.residual_share if solution else 1.0
    if share < POOR_RESIDUAL or is_aqueous(evidence.solvent) or limits.is_over():
        return evidence, solution
    doubtful = [
        stray
        for stray in evidence.strays
        if stray.kind in {"water", "solvent"}
        and any(_may_own(claim, stray) for claim in claims.claims)
    ]
    if not doubtful:
        return evidence, solution
    kept = tuple(stray for stray in evidence.strays if stray not in doubtful)
    freed = replace(evidence, strays=kept)
    again = solve(freed, claims, constraints=bench.options.constraints, limits=limits)
    if again is None:
        return evidence, solution
    if again.best.assessment.residual_share < MUCH_BETTER * share:
        return freed, again
    return evidence, solution


def _may_own(claim: Claim, stray: Stray) -> bool:
    """Whether a claim is predicted within three sd of a stray."""
    reach = 3.0 * claim.shift_sd_ppm
    return (
        claim.visibility == "seen"
        and stray.low_ppm - reach <= claim.shift_ppm <= stray.high_ppm + reach
    )


def _is_much(strays: Iterable[Stray], booking: Booking) -> bool:
    """Whether impurities by table make up a large part of the sample."""
    protons = sum(stray.protons or 0.0 for stray in strays if stray.kind == "impurity")
    return protons > MUCH_IMPURITY * max(booking.balance.found, 1e-9)


def _explained(
    evidence: Evidence,
    solution: Solution,
    bench: Bench,
    unowned: Sequence[Unowned],
) -> dict[int, Stray]:
    """Unowned stretches with a known owner: the tables', or a given companion."""
    named = table_impurities(evidence, unowned)
    named |= given_strays(evidence, solution, unowned, bench.options.companions)
    area = solution.best.refinement.area_per_proton
    named |= own_satellites(
        evidence, unowned, solution.best.refinement.claim_lines, area
    )
    return {
        number: Stray(
            low_ppm=unowned[number].low_ppm,
            high_ppm=unowned[number].high_ppm,
            kind=kind,
            why=why,
            protons=unowned[number].area / area if area > 0 else None,
        )
        for number, (kind, why) in named.items()
    }


def _not_judged(
    structure: Structure, claims: ClaimSet, evidence: Evidence
) -> Evaluation:
    return Evaluation(
        structure=structure,
        claims=claims,
        evidence=evidence,
        solution=None,
        assessment=None,
        booking=None,
        strays=book_strays(evidence, (), 0.0),
        faults={},
        logit=None,
        state="not judged",
    )
