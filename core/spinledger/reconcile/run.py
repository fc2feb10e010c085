"""The whole of a reconciliation: claims, match, refinement, verdict, contenders."""

from __future__ import annotations

from dataclasses import replace
from typing import Literal

from spinledger.errors import StructureError
from spinledger.reconcile.advice import advise
from spinledger.reconcile.cautions import cautions
from spinledger.reconcile.contenders import Isomer, close_isomers
from spinledger.reconcile.entries import unsolved_entries
from spinledger.reconcile.evaluate import Bench, Evaluation, evaluate, lay_out
from spinledger.reconcile.geometry import what_couplings_say
from spinledger.reconcile.judge import PRIOR, likelihood_ratio
from spinledger.reconcile.options import Candidate, ReconcileOptions
from spinledger.reconcile.ranking import (
    Cancelled,
    Progress,
    RankedCandidate,
    Ranking,
    limits_of,
    rank,
    standing,
)
from spinledger.reconcile.reasons import verdict_reasons
from spinledger.reconcile.solve import Limits
from spinledger.structure.read import molecule, read_structure
from spinledger.values.evidence import Evidence
from spinledger.values.geometry import Geometry
from spinledger.values.ledger import (
    Advice,
    Balance,
    Contender,
    Ledger,
    Model,
    Verdict,
)
from spinledger.values.structure import Structure

__all__ = [
    "Candidate",
    "RankedCandidate",
    "Ranking",
    "ReconcileOptions",
    "rank",
    "reconcile",
]

Origin = Literal["given", "enumerated"]

DEFAULT_CONTENDERS = 4
CONTENDER_REFINED = 2
# Odds of 20 to 1 against exclude a contender.
EXCLUDED_LOGIT = 3.0
# What fine refinement may still gain over a broad fit.
ROUGH_MARGIN = 1.0


def reconcile(
    evidence: Evidence,
    structure: Structure,
    *,
    options: ReconcileOptions | None = None,
    progress: Progress | None = None,
    cancelled: Cancelled | None = None,
) -> Ledger:
    """Reconcile a spectrum with a claimed structure.

    Parameters
    ----------
    evidence : Evidence
    structure : Structure
    options : ReconcileOptions, optional
    progress : callable, optional
        Called with a stage in words and a fraction from 0 to 1.
    cancelled : callable, optional
        Asked now and then; true stops the work.

    Returns
    -------
    Ledger

    Raises
    ------
    CancelledError
        If the user stopped.
    StructureError
        If the structure cannot be handled.
    """
    chosen = options or ReconcileOptions()
    report = progress or _silent
    report("matching claims to the spectrum", 0.05)
    bench = lay_out(evidence, chosen)
    limits = limits_of(chosen, cancelled)
    own = evaluate(structure, bench, limits, in_full=True)
    report("testing contenders", 0.5)
    contenders, tested = _contenders(own, bench, limits, report)
    report("weighing further measurements", 0.95)
    advice = () if chosen.quick else advise(own, tested, limits, options=chosen)
    geometry = _geometry(own, chosen, limits)
    ledger = ledger_of(own, contenders, advice=advice, options=chosen)
    return replace(ledger, geometry=geometry)


def _geometry(
    own: Evaluation, options: ReconcileOptions, limits: Limits
) -> Geometry | None:
    """What the couplings say; nothing where they do not belong to the structure."""
    if options.quick or own.state in ("not reconciled", "not judged"):
        return None
    return what_couplings_say(own, limits, ph=options.ph)


def _silent(_stage: str, _fraction: float) -> None:
    return None


def _contenders(
    own: Evaluation, bench: Bench, limits: Limits, report: Progress
) -> tuple[tuple[Contender, ...], tuple[tuple[str, Evaluation], ...]]:
    """Contenders with their outcome, and the evaluations of those that stand."""
    if own.logit is None:
        return (), ()
    wanted: list[tuple[str, str, Structure | None, Origin]] = [
        (one.name or one.given, one.smiles, one, "given")
        for one in bench.options.contenders
    ]
    wanted += [
        (isomer.change, isomer.smiles, None, "enumerated")
        for isomer in _enumerated(own, bench, limits)
    ]
    rows: list[Contender] = []
    standing_rows: list[tuple[str, Evaluation]] = []
    narrow = replace(limits, max_refined=CONTENDER_REFINED, is_rough=True)
    for number, (name, smiles, given, origin) in enumerate(wanted):
        limits.checked()
        report(f"testing {smiles}", 0.5 + 0.45 * number / len(wanted))
        if limits.is_over():
            rows.append(_unread(name, smiles, origin, "the time allowed ran out"))
            continue
        try:
            if given is not None:
                other = evaluate(given, bench, limits)
            else:
                other = evaluate(read_structure(smiles), bench, narrow)
        except StructureError as error:
            rows.append(_unread(name, smiles, origin, error.reason))
            continue
        row = _outcome((name, smiles, origin), own, other)
        rows.append(row)
        if not row.excluded:
            standing_rows.append((smiles, other))
    return tuple(rows), tuple(standing_rows)


def _enumerated(own: Evaluation, bench: Bench, limits: Limits) -> tuple[Isomer, ...]:
    options = bench.options
    limit = DEFAULT_CONTENDERS if options.n_contenders is None else options.n_contenders
    if options.quick or limit == 0:
        return ()
    return close_isomers(molecule(own.structure), limit=limit, cancelled=limits.check)


def _unread(name: str, smiles: str, origin: Origin, reason: str) -> Contender:
    return Contender(
        name=name,
        smiles=smiles,
        origin=origin,
        probability=None,
        verdict="not judged",
        excluded=False,
        why=f"not tested: {reason}",
    )


def _outcome(
    named: tuple[str, str, Origin], own: Evaluation, other: Evaluation
) -> Contender:
    name, smiles, origin = named
    behind = standing(own) - standing(other)
    margin = ROUGH_MARGIN if origin == "enumerated" else 0.0
    excluded = behind > EXCLUDED_LOGIT + margin
    reasons = verdict_reasons(other)
    if excluded:
        why = f"excluded: {reasons[0]}" if reasons else "excluded by its fit"
    elif behind < 0:
        why = "not excluded: fits as well or better"
    else:
        why = "not excluded: the residuals do not decide"
    return Contender(
        name=name,
        smiles=smiles,
        origin=origin,
        probability=other.probability,
        verdict=other.state,
        excluded=excluded,
        why=why,
    )


def ledger_of(
    own: Evaluation,
    contenders: tuple[Contender, ...],
    *,
    advice: tuple[Advice, ...],
    options: ReconcileOptions,
) -> Ledger:
    """Ledger of one evaluation with its contenders and advice."""
    booking = own.booking
    return Ledger(
        evidence=own.evidence,
        structure=own.structure,
        claims=own.claims,
        entries=booking.entries if booking else unsolved_entries(own.claims.claims),
        strays=own.strays,
        balance=booking.balance if booking else _empty_balance(own),
        verdict=_verdict(own, contenders, options),
        model=_model(own),
        contenders=contenders,
        advice=advice,
        edits=options.constraints.sentences(),
        cautions=cautions(own),
        side=own.side,
    )


def _empty_balance(own: Evaluation) -> Balance:
    claimed = sum(
        claim.n_protons
        for claim in own.claims.claims
        if claim.visibility == "seen" and not claim.is_exchangeable
    )
    return Balance(claimed=float(claimed), found=0.0)


def _verdict(
    own: Evaluation, contenders: tuple[Contender, ...], options: ReconcileOptions
) -> Verdict:
    probability = own.probability
    left = [one for one in contenders if not one.excluded]
    reasons = list(verdict_reasons(own))
    for one in left:
        fate = "was not tested" if one.verdict == "not judged" else "is not excluded"
        reasons.append(f"{one.smiles} ({one.name}) {fate}")
    tested = not options.quick
    return Verdict(
        state=own.state,
        probability=probability,
        prior=PRIOR,
        likelihood_ratio=None if probability is None else likelihood_ratio(probability),
        unique=own.state == "reconciled" and not left and tested,
        reasons=tuple(reasons),
    )


def _model(own: Evaluation) -> Model | None:
    if own.solution is None or own.booking is None:
        return None
    refinement = own.solution.best.refinement
    return Model(
        intensities=refinement.intensities,
        claim_lines=refinement.claim_lines,
        area_per_proton=own.booking.area_per_proton,
    )
