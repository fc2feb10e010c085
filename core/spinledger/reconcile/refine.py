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
    evaluate,
)
from spinledger.reconcile.refine_places import Reach, bad_claims, better_places
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
    chosen = settings or FROM_MATCH
    if not chosen.stages:
        raise ValueError("settings: need at least one stage")
    run = _Run.begin(
        evidence,
        claims,
        start,
        constraints=constraints,
        settings=chosen,
        cancelled=cancelled,
    )
    tell = progress or _say_nothing
    fit = run.through(run.first_parameters(start), tell)
    result = run.result(fit, began)
    if chosen.second_thoughts and result.residuals.boxcar_share > _GOOD_SHARE:
        tell("trying other places", 0.7)
        fit = run.reconsidered(fit)
        result = run.result(fit, began)
    return result


# A fit that leaves less than this share is not questioned.
_GOOD_SHARE = 0.02


def _say_nothing(_stage: str, _fraction: float) -> None:
    """Progress that nobody asked for."""


@dataclass(frozen=True, slots=True, eq=False)
class _Fit:
    """Where a run of stages ended."""

    descent: Descent
    problem: Problem


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

    def first_parameters(self, start: Start) -> Floats:
        """Parameter vector at a start, widths at their typical value."""
        plan = self.plan(self.start_shifts_hz, self.start_couplings_hz)
        layout = self.layout(plan)
        parameters = np.array(layout.centres)
        n_shifts = layout.shift_claims.size
        shifts = np.asarray(start.shifts_ppm) * self.prepared.frequency_mhz
        parameters[:n_shifts] = shifts[layout.shift_claims]
        couplings = np.asarray(start.couplings_hz)
        parameters[n_shifts : layout.n_moving] = couplings[layout.couplings]
        return _apart(parameters, layout)

    def through(
        self,
        parameters: Floats,
        tell: Progress = _say_nothing,
        *,
        skip: int = 0,
    ) -> _Fit:
        """All stages but the first few, then the line shape."""
        stages = self.settings.stages[skip:]
        for index, stage in enumerate(stages):
            tell(f"refining at {stage.broadening_hz:g} Hz", 0.7 * index / len(stages))
            fit = self.stage(stage, parameters)
            parameters = fit.descent.evaluation.parameters
            if self.budget.is_used_up:
                return fit
        if self.settings.fit_shape:
            tell("fitting the line shape", 0.6)
            return self.finish(fit)
        return fit

    def reconsidered(self, fit: _Fit) -> _Fit:
        """The fit, or a better one with some claims elsewhere."""
        for _ in range(self.settings.second_thoughts):
            if self.budget.is_used_up:
                return fit
            better = self._best_move(fit)
            if better is None:
                return fit
            fit = better
        return fit

    def _best_move(self, fit: _Fit) -> _Fit | None:
        """The best finished fit with some claims moved, if it is better."""
        layout = fit.problem.layout
        n_plain = layout.n_moving + 1 + layout.drawn.size
        known = fit.descent.evaluation.parameters[:n_plain]
        trials = [known, *self._rearranged(known)]
        if len(trials) == 1:
            return None
        broad = _BROAD_VIEW.broadening_hz
        costs = self._compare(trials, broad)
        order = [int(k) for k in np.argsort(costs) if k != 0][:2]
        stages = self.settings.stages
        skip = sum(stage.broadening_hz >= broad for stage in stages)
        finished = [
            self.through(trials[k], skip=min(skip, len(stages) - 1))
            for k in order
            if costs[k] < _WORTH_FINISHING * costs[0]
        ]
        if not finished:
            return None
        fits = [fit, *finished]
        ends = [one.descent.evaluation.parameters[:n_plain] for one in fits]
        final = self._compare(ends, 0.5)
        best = int(np.argmin(final))
        return fits[best] if best and final[best] < 0.98 * final[0] else None

    def _rearranged(self, known: Floats) -> list[Floats]:
        """Parameters after a few steps from other arrangements of bad claims."""
        problem = self._problem(_BROAD_VIEW.broadening_hz, known)
        self.budget.spend()
        now = evaluate(problem, known)
        bad = bad_claims(problem, now)
        if not bad:
            return []
        layout = problem.layout
        fresh = self._with_fresh_couplings(known, layout, frozenset(bad))
        self.budget.spend()
        moves = better_places(
            problem,
            now,
            evaluate(problem, fresh),
            claims=bad,
            reach=Reach(distance_hz=max(30.0, 0.06 * self.prepared.frequency_mhz)),
        )
        place = {int(claim): k for k, claim in enumerate(layout.shift_claims)}
        trials = []
        for move in moves[:_MOST_MOVES]:
            begin = np.array(fresh)
            for claim, shift in move.shifts_hz.items():
                begin[place[claim]] = shift
            fit = self.stage(_BROAD_VIEW, begin)
            trials.append(fit.descent.evaluation.parameters)
        return trials

    def _with_fresh_couplings(
        self, known: Floats, layout: Layout, claims: frozenset[int]
    ) -> Floats:
        """Couplings and widths of some claims as at the start.

        The fit may have bent them to suit a wrong place.
        """
        parameters = np.array(known)
        couplings = self.start_couplings_hz
        for k, index in enumerate(layout.couplings, start=layout.shift_claims.size):
            if self.network.claims_of(int(index)) & claims:
                parameters[k] = couplings[index]
        begin = layout.n_moving + 1
        for row, claim in enumerate(layout.drawn.tolist()):
            if claim in claims:
                parameters[begin + row] = 0.0
        return parameters

    def _compare(self, trials: list[Floats], broadening_hz: float) -> list[float]:
        """Costs of parameter vectors on one and the same data."""
        problems = [self._problem(broadening_hz, trial) for trial in trials]
        lines = [
            problem.network.lines(
                problem.start_shifts_hz, problem.start_couplings_hz, plan=problem.plan
            ).frequencies_hz
            for problem in problems
        ]
        data = stage_data(
            self.prepared,
            np.concatenate(lines),
            broadening_hz=broadening_hz,
            width_hz=0.5,
        )
        costs = []
        for problem, trial in zip(problems, trials, strict=True):
            self.budget.spend()
            costs.append(evaluate(replace(problem, data=data), trial).cost)
        return costs

    def result(self, fit: _Fit, began: float) -> Refinement:
        """Everything that is reported about a fit."""
        return make_refinement(
            Outcome(
                prepared=self.prepared,
                network=self.network,
                problem=fit.problem,
                descent=fit.descent,
                start=self.start,
                n_evaluations=self.budget.n_evaluations,
                seconds=time.perf_counter() - began,
                ran_out_of_time=self.budget.is_used_up,
            )
        )

    def stage(self, stage: Stage, parameters: Floats) -> _Fit:
        """Run one stage from the given parameters."""
        problem = self._problem(stage.broadening_hz, parameters)
        descent = descend(
            problem,
            parameters,
            max_steps=stage.max_steps,
            budget=self.budget,
            small_gain=3e-3 if stage.broadening_hz > 0.0 else 1e-3,
        )
        return _Fit(descent, problem)

    def _problem(self, broadening_hz: float, parameters: Floats) -> Problem:
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
            broadening_hz=broadening_hz,
            width_hz=float(layout.widths_hz(parameters).min()),
        )
        return Problem(
            network=self.network,
            plan=plan,
            layout=_with_reach(layout, broadening_hz),
            start_shifts_hz=shifts,
            start_couplings_hz=couplings,
            amplitude_prior=self._amplitude_prior(layout),
            shape=LineShape(
                extra_width_hz=2.0 * broadening_hz,
                treatment=self.prepared.treatment,
            ),
            data=data,
        )

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
            is_steady=np.array(
                [not claims[k].is_exchangeable for k in layout.drawn], dtype=np.bool_
            ),
        )

    def finish(self, fit: _Fit) -> _Fit:
        """Weights by the misfit found; Gauss share or common kernel, the better."""
        problem, descent = fit.problem, fit.descent
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
        return _Fit(last, chosen)

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


# Where other places are looked for.
_BROAD_VIEW = Stage(broadening_hz=3.0, max_steps=6)
_MOST_MOVES = 6

# Trials are finished unless they are clearly worse in the broad view.
_WORTH_FINISHING = 1.1

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


# Largest model error, as a share of a window's tallest point.
_LARGEST_ERROR = 0.05


def _reweighted(
    prepared: PreparedEvidence, problem: Problem, evaluation: Evaluation
) -> StageData:
    """Weights by the misfit of every window, and its correlation length."""
    data = problem.data
    sds = np.array(data.sds)
    for window in data.windows:
        rms = float(np.sqrt(np.mean(evaluation.residual[window] ** 2)))
        level = float(np.abs(data.values[window]).max())
        # A window that does not fit at all must not be let off.
        sds[window] = max(min(rms, _LARGEST_ERROR * level), prepared.noise_sd)
    return replace(
        data,
        sds=sds,
        correlation=residual_autocorrelation(evaluation.residual / sds, data.windows),
    )
