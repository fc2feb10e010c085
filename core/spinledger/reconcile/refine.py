"""Total-lineshape refinement: shifts in ppm, couplings and widths in Hz.

Data and model are broadened and sharpened in stages; areas and local baselines
are solved linearly inside; predictions are priors.
"""

from __future__ import annotations

import time
from collections.abc import Callable

from spinledger.reconcile.options import Constraints
from spinledger.reconcile.refine_data import PreparedEvidence
from spinledger.reconcile.refine_run import Progress, Run, say_nothing
from spinledger.reconcile.refine_search import reconsidered
from spinledger.reconcile.refine_values import (
    FROM_AFAR,
    FROM_MATCH,
    QUICK,
    KnownSum,
    Refinement,
    RefineSettings,
    Residuals,
    Stage,
    Start,
)
from spinledger.spins.network import ClaimNetwork
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence

__all__ = [
    "FROM_AFAR",
    "FROM_MATCH",
    "QUICK",
    "KnownSum",
    "RefineSettings",
    "Refinement",
    "Residuals",
    "Stage",
    "Start",
    "refine",
]


def refine(  # noqa: PLR0913 - the two sides, the start, and how to run
    evidence: Evidence | PreparedEvidence,
    claims: ClaimSet | ClaimNetwork,
    start: Start,
    *,
    constraints: Constraints | None = None,
    settings: RefineSettings | None = None,
    progress: Progress | None = None,
    cancelled: Callable[[], bool] | None = None,
) -> Refinement:
    """Fit shifts, couplings, widths and areas to the measured line shape.

    Parameters
    ----------
    evidence : Evidence or PreparedEvidence
        Prepare once where many hypotheses are refined.
    claims : ClaimSet or ClaimNetwork
    start : Start
    constraints : Constraints, optional
        Pinned claims stay in their stretch, fixed couplings keep their value,
        excluded stretches and declared impurities are not compared.
    settings : RefineSettings, optional
        The schedule for starts from a match if not given.
    progress : callable, optional
        Called with the stage in words and the fraction done.
    cancelled : callable, optional
        Asked before every evaluation.

    Raises
    ------
    CancelledError
        If ``cancelled`` said so.
    ValueError
        If no claim is left to fit.

    Notes
    -----
    Weighted least squares on the points of all signals and all stretches where
    the model has lines, so that unexplained signals count. The weight of a
    window follows its misfit, divided by the length over which misfit is
    correlated, so that data and priors stand on one scale.
    """
    began = time.perf_counter()
    chosen = settings or FROM_MATCH
    if not chosen.stages:
        raise ValueError("settings: need at least one stage")
    run = Run.begin(
        evidence,
        claims,
        start,
        constraints=constraints,
        settings=chosen,
        cancelled=cancelled,
    )
    tell = progress or say_nothing
    fit = run.through(run.first_parameters(start), tell)
    result = run.result(fit, began)
    if chosen.second_thoughts and result.residuals.boxcar_share > _GOOD_SHARE:
        tell("trying other places", 0.7)
        fit = reconsidered(run, fit, result.residuals.claim_shares)
        result = run.result(fit, began)
    return result


# A fit that leaves less than this share is not questioned.
_GOOD_SHARE = 0.02
