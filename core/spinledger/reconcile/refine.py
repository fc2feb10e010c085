"""Total-lineshape refinement: shifts in ppm, couplings and widths in Hz.

Data and model are broadened and sharpened in stages; areas and local baselines
are solved linearly inside; predictions are priors.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from spinledger.reconcile.options import Constraints
from spinledger.reconcile.refine_data import (
    PreparedEvidence,
    StageData,
    prepare,
    stage_data,
)
from spinledger.reconcile.refine_layout import (
    Fixed,
    Ground,
    fixed_by,
    make_layout,
)
from spinledger.reconcile.refine_measures import residual_autocorrelation
from spinledger.reconcile.refine_model import (
    AmplitudePrior,
    Evaluation,
    Layout,
    Problem,
)
from spinledger.reconcile.refine_result import Outcome, make_refinement
from spinledger.reconcile.refine_steps import Budget, Descent, descend
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
from spinledger.spins.network import ClaimNetwork, Plan
from spinledger.spins.synthesis import LineShape
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence, LineKernel

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

Floats = npt.NDArray[np.float64]

Progress = Callable[[str, float], None]


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
    run = _Run.begin(
        evidence,
        claims,
        start,
        constraints=constraints,
        settings=settings or FROM_MATCH,
        cancelled=cancelled,
    )
    parameters = run.first_parameters()
    descent = None
    stages = run.settings.stages
    for index, stage in enumerate(stages):
        if progress is not None:
            progress(f"refining at {stage.broadening_hz:g} Hz", index / len(stages))
        descent, problem = run.stage(stage, parameters)
        parameters = descent.evaluation.parameters
        if run.budget.is_used_up:
            break
    if descent is None:
        raise ValueError("settings: need at least one stage")
    if run.settings.fit_shape and not run.budget.is_used_up:
        if progress is not None:
            progress("fitting the line shape", 0.9)
        descent, problem = run.finish(problem, descent)
    return make_refinement(
        Outcome(
            prepared=run.prepared,
            network=run.network,
            problem=problem,
            descent=descent,
            start=start,
            n_evaluations=run.budget.n_evaluations,
            seconds=time.perf_counter() - began,
            ran_out_of_time=run.budget.is_used_up,
        )
    )


@dataclass(frozen=True, slots=True, eq=False)
class _Run:
    """What all stages share."""

    prepared: PreparedEvidence
    network: ClaimNetwork
    start: Start
    fixed: Fixed
    settings: RefineSettings
    budget: Budget

    @classmethod
    def begin(
        cls,
        evidence: Evidence | PreparedEvidence,
        claims: ClaimSet | ClaimNetwork,
        start: Start,
        *,
        constraints: Constraints | None,
        settings: RefineSettings,
        cancelled: Callable[[], bool] | None,
    ) -> _Run:
        if isinstance(evidence, PreparedEvidence):
            prepared = evidence
        else:
            prepared = prepare(evidence, constraints)
        network = claims if isinstance(claims, ClaimNetwork) else ClaimNetwork(claims)
        deadline = None
        if settings.time_budget_s is not None:
            deadline = time.monotonic() + settings.time_budget_s
        return cls(
            prepared,
            network,
            start,
            fixed_by(network.claims, constraints, prepared.frequency_mhz),
            settings,
            Budget(cancelled=cancelled, deadline_s=deadline),
        )

    @property
    def start_shifts_hz(self) -> Floats:
        return np.asarray(self.start.shifts_ppm) * self.prepared.frequency_mhz

    @property
    def start_couplings_hz(self) -> Floats:
        couplings = np.array(self.start.couplings_hz, dtype=np.float64)
        for index, value in self.fixed.couplings_hz.items():
            couplings[index] = value
        return couplings

    def layout(self, plan: Plan, *, fits_gauss_share: bool = False) -> Layout:
        return make_layout(
            self.network,
            plan,
            ground=Ground(
                start_shifts_hz=self.start_shifts_hz,
                fixed=self.fixed,
                frequency_mhz=self.prepared.frequency_mhz,
                line_width_hz=self.prepared.line_width_hz,
            ),
            fits_gauss_share=fits_gauss_share,
        )

    def plan(
        self, shifts_hz: Floats, couplings_hz: Floats, broadening_hz: float = 0.0
    ) -> Plan:
        """Solving plan; broad views need fewer lines."""
        effort = self.settings.effort
        if broadening_hz > 0.0:
            effort = replace(
                effort,
                bin_hz=max(effort.bin_hz, _BIN_SHARE * 2.0 * broadening_hz),
                smallest=max(effort.smallest, 3e-4),
            )
        return self.network.plan(
            shifts_hz, couplings_hz, without=self.start.absent, effort=effort
        )

    def first_parameters(self) -> Floats:
        plan = self.plan(self.start_shifts_hz, self.start_couplings_hz)
        layout = self.layout(plan)
        parameters = np.array(layout.centres)
        n_shifts = layout.shift_claims.size
        parameters[:n_shifts] = self.start_shifts_hz[layout.shift_claims]
        parameters[n_shifts : layout.n_moving] = self.start_couplings_hz[
            layout.couplings
        ]
        return _apart(parameters, layout)

    def stage(self, stage: Stage, parameters: Floats) -> tuple[Descent, Problem]:
        """Run one stage from the given parameters."""
        broadening_hz = stage.broadening_hz
        plan = self.plan(self.start_shifts_hz, self.start_couplings_hz, broadening_hz)
        layout = self.layout(plan)
        shifts = layout.shifts_hz(parameters, self.start_shifts_hz)
        couplings = layout.couplings_hz(parameters, self.start_couplings_hz)
        if plan.is_cut:
            plan = self.plan(shifts, couplings, broadening_hz)
            layout = self.layout(plan)
        lines = self.network.lines(shifts, couplings, plan=plan)
        data = stage_data(
            self.prepared,
            lines.frequencies_hz,
            broadening_hz=stage.broadening_hz,
            width_hz=float(layout.widths_hz(parameters).min()),
        )
        problem = Problem(
            network=self.network,
            plan=plan,
            layout=_with_reach(layout, stage.broadening_hz),
            start_shifts_hz=shifts,
            start_couplings_hz=couplings,
            amplitude_prior=self._amplitude_prior(layout),
            shape=LineShape(
                extra_width_hz=2.0 * stage.broadening_hz,
                treatment=self.prepared.treatment,
            ),
            data=data,
        )
        descent = descend(
            problem,
            parameters,
            max_steps=stage.max_steps,
            budget=self.budget,
            small_gain=3e-3 if broadening_hz > 0.0 else 1e-3,
        )
        return descent, problem

    def _amplitude_prior(self, layout: Layout) -> AmplitudePrior:
        claims = self.network.claims.claims
        usual = 0.6 if self.prepared.evidence.presaturated else 0.3
        loose = [
            1.0
            if claims[k].is_exchangeable or claims[k].visibility == "optional"
            else usual
            for k in layout.drawn
        ]
        return AmplitudePrior(
            relative_sds=np.array(loose),
            species=np.array([claims[k].species for k in layout.drawn], dtype=np.int64),
        )

    def finish(self, problem: Problem, descent: Descent) -> tuple[Descent, Problem]:
        """Weights by the misfit found; Gauss share or common kernel, the better."""
        max_steps = self.settings.stages[-1].max_steps
        data = _reweighted(self.prepared, problem, descent.evaluation)
        tries = [self._with_gauss_share(problem, descent, data)]
        kernel = self.prepared.evidence.kernel
        if kernel is not None:
            tries.append(_with_kernel(problem, descent, data, kernel=kernel))
        fits = [
            (descend(p, begin, max_steps=max_steps, budget=self.budget), p)
            for p, begin in tries
        ]
        best, chosen = min(fits, key=lambda fit: fit[0].evaluation.cost)
        chosen = replace(
            chosen,
            data=_reweighted(self.prepared, chosen, best.evaluation),
            exact_slopes=self.settings.exact_slopes
            and _exact_is_affordable(chosen.plan),
        )
        last = descend(
            chosen,
            best.evaluation.parameters,
            max_steps=max_steps,
            budget=self.budget,
            small_gain=1e-5,
        )
        return last, chosen

    def _with_gauss_share(
        self, problem: Problem, descent: Descent, data: StageData
    ) -> tuple[Problem, Floats]:
        layout = self.layout(problem.plan, fits_gauss_share=True)
        voigt = replace(
            problem,
            layout=_with_reach(layout, 0.0),
            data=data,
            shape=replace(problem.shape, gauss_share=0.1),
        )
        return voigt, np.append(descent.evaluation.parameters, 0.1)


def _with_kernel(
    problem: Problem, descent: Descent, data: StageData, *, kernel: LineKernel
) -> tuple[Problem, Floats]:
    shaped = replace(problem, data=data, shape=replace(problem.shape, kernel=kernel))
    begin = np.array(descent.evaluation.parameters)
    begin[problem.layout.n_moving] = np.log(kernel.width_hz)
    return shaped, begin


# Bins of this share of the line width change a line by less than 2e-4 of its
# height.
_BIN_SHARE = 0.02


def _apart(parameters: Floats, layout: Layout) -> Floats:
    """Claims that start at one place moved 1 Hz apart, so that they can part."""
    shifts = parameters[: layout.shift_claims.size]
    order = np.argsort(shifts, kind="stable")
    for before, after in pairwise(order.tolist()):
        if abs(shifts[after] - shifts[before]) < 0.5:
            shifts[after] = shifts[before] + 1.0
    return parameters


def _with_reach(layout: Layout, broadening_hz: float) -> Layout:
    limits = np.array(layout.step_limits)
    limits[: layout.shift_claims.size] = max(8.0, broadening_hz)
    return replace(layout, step_limits=limits)


def _exact_is_affordable(plan: Plan) -> bool:
    return plan.exact_slope_cost <= 40_000.0


def _reweighted(
    prepared: PreparedEvidence, problem: Problem, evaluation: Evaluation
) -> StageData:
    """Weights by the misfit of every window, and its correlation length."""
    data = problem.data
    sds = np.array(data.sds)
    for window in data.windows:
        rms = float(np.sqrt(np.mean(evaluation.residual[window] ** 2)))
        sds[window] = max(rms, prepared.noise_sd)
    return replace(
        data,
        sds=sds,
        correlation=residual_autocorrelation(evaluation.residual / sds, data.windows),
    )
