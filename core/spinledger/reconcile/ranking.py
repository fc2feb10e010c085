"""Several structures against one spectrum, best first."""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from spinledger.errors import CancelledError, StructureError
from spinledger.reconcile.evaluate import Bench, Evaluation, evaluate, lay_out
from spinledger.reconcile.options import Candidate, ReconcileOptions
from spinledger.reconcile.reasons import verdict_reasons
from spinledger.reconcile.solve import (
    FINISH,
    FINISH_QUICK,
    MAX_REFINED,
    MAX_REFINED_QUICK,
    Limits,
)
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import VerdictState

Progress = Callable[[str, float], None]
Cancelled = Callable[[], bool]

# Log odds this close are no reason to prefer one structure.
TIE_LOGIT = 0.5


@dataclass(frozen=True, slots=True, kw_only=True)
class RankedCandidate:
    """One candidate with its place among the others and its own verdict.

    Attributes
    ----------
    name, smiles : str
        As given.
    probability : float or None
        Among the candidates; they sum to 1.
    verdict : str
    verdict_probability : float or None
        The candidate's own.
    reasons : tuple of str
    """

    name: str
    smiles: str
    probability: float | None
    verdict: VerdictState
    verdict_probability: float | None
    reasons: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Ranking:
    """Candidates, best first; those that could not be judged stand last."""

    candidates: tuple[RankedCandidate, ...]


def rank(
    evidence: Evidence,
    candidates: Sequence[Candidate],
    *,
    options: ReconcileOptions | None = None,
    progress: Progress | None = None,
    cancelled: Cancelled | None = None,
) -> Ranking:
    """Rank candidate structures by how well they own a spectrum.

    Parameters
    ----------
    evidence : Evidence
    candidates : sequence of Candidate
        Kept in the order given where nothing tells them apart.
    options : ReconcileOptions, optional
    progress : callable, optional
        Called with a stage in words and a fraction from 0 to 1.
    cancelled : callable, optional
        Asked now and then; true stops the work.

    Raises
    ------
    CancelledError
        If the user stopped.
    """
    bench = lay_out(evidence, options or ReconcileOptions())
    limits = limits_of(bench.options, cancelled)
    rows: list[Evaluation | str] = []
    for number, candidate in enumerate(candidates):
        if progress is not None:
            progress(f"weighing {candidate.name}", number / len(candidates))
        limits.checked()
        rows.append(_weighed(candidate, bench, limits))
    return Ranking(candidates=_in_order(candidates, rows, bench))


def limits_of(options: ReconcileOptions, cancelled: Cancelled | None) -> Limits:
    """Limits of one structure's solution, counted from now."""

    def check() -> None:
        if cancelled is not None and cancelled():
            raise CancelledError("stopped")

    return Limits(
        max_refined=MAX_REFINED_QUICK if options.quick else MAX_REFINED,
        finish=FINISH_QUICK if options.quick else FINISH,
        check=check,
        deadline_s=time.monotonic() + options.time_budget_s,
    )


def _weighed(candidate: Candidate, bench: Bench, limits: Limits) -> Evaluation | str:
    """Evaluation of a candidate, or in one sentence why there is none."""
    if candidate.structure is None:
        return candidate.reason or "the structure could not be read"
    try:
        deadline_s = time.monotonic() + bench.options.time_budget_s
        fresh = replace(limits, deadline_s=deadline_s)
        return evaluate(candidate.structure, bench, fresh)
    except StructureError as error:
        return error.reason


def standing(evaluation: Evaluation) -> float:
    """Log odds by which structures of one spectrum are compared."""
    return evaluation.logit if evaluation.logit is not None else -np.inf


def shares(logits: Sequence[float], temperature: float) -> list[float]:
    """Tempered softmax of log odds; they sum to 1."""
    values = np.array(logits) / temperature
    weights = np.exp(values - values.max())
    return [float(weight) for weight in weights / weights.sum()]


def _in_order(
    candidates: Sequence[Candidate], rows: list[Evaluation | str], bench: Bench
) -> tuple[RankedCandidate, ...]:
    judged = [
        (number, row)
        for number, row in enumerate(rows)
        if isinstance(row, Evaluation) and row.logit is not None
    ]
    logits = [standing(row) for _, row in judged]
    relative = shares(logits, bench.model.temperature) if judged else []
    order = sorted(range(len(judged)), key=lambda k: (-round(logits[k], 6), k))
    ranked = []
    for place, k in enumerate(order):
        number, row = judged[k]
        others = [
            candidates[judged[m][0]].name
            for m in order
            if m != k and abs(logits[m] - logits[k]) < TIE_LOGIT
        ]
        said = _tie_sentence(others) if place == 0 or others else ()
        ranked.append(
            RankedCandidate(
                name=candidates[number].name,
                smiles=candidates[number].smiles,
                probability=relative[k],
                verdict=row.state,
                verdict_probability=row.probability,
                reasons=(*said, *verdict_reasons(row)),
            )
        )
    for number, left in enumerate(rows):
        if isinstance(left, Evaluation) and left.logit is not None:
            continue
        reasons = (left,) if isinstance(left, str) else verdict_reasons(left)
        ranked.append(
            RankedCandidate(
                name=candidates[number].name,
                smiles=candidates[number].smiles,
                probability=None,
                verdict="not judged",
                verdict_probability=None,
                reasons=reasons,
            )
        )
    return tuple(ranked)


def _tie_sentence(others: list[str]) -> tuple[str, ...]:
    if not others:
        return ()
    return (
        f"cannot be told from {', '.join(others)} by this spectrum; ties keep the "
        "order given",
    )
