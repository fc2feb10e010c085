"""Stages of a refinement: from a start through broad views to the line shape.

Parameter vectors are in Hz, except logarithms of widths and the Gauss share.
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
    Refinement,
    RefineSettings,
    Stage,
    Start,
)
from spinledger.spins.clusters import FULL_EFFORT
from spinledger.spins.network import ClaimNetwork
from spinledger.spins.plan import Plan
from spinledger.spins.synthesis import LineShape
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence, LineKernel

Floats = npt.NDArray[np.float64]

Progress = Callable[[str, float], None]


def say_nothing(_stage: str, _fraction: float) -> None:
    """Progress that nobody asked for."""


@dataclass(frozen=True, slots=True, eq=False)
class Fit:
    """Where a run of stages ended."""

    descent: Descent
    problem: Problem


@dataclass(frozen=True, slots=True, eq=False)
class Run:
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
    ) -> Run:
        """Run on prepared data, with the constraints by number."""
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
        """Start shifts of all claims, Hz."""
        return np.asarray(self.start.shifts_ppm) * self.prepared.frequency_mhz

    @property
    def start_couplings_hz(self) -> Floats:
        """Start couplings, those that the user holds at their value."""
        couplings = np.array(self.start.couplings_hz, dtype=np.float64)
        for index, value in self.fixed.couplings_hz.items():
            couplings[index] = value
        return couplings

    def layout(self, plan: Plan, *, fits_gauss_share: bool = False) -> Layout:
        """Parameter vector for a plan."""
        return make_layout(
            self.network,
            plan,
            ground=Ground(
                start_shifts_hz=self.start_shifts_hz,
                fixed=self.fixed,
                frequency_mhz=self.prepared.frequency_mhz,
                line_width_hz=self.prepared.line_width_hz,
                absent=self.start.absent,
            ),
            fits_gauss_share=fits_gauss_share,
        )

    def plan(
        self, shifts_hz: Floats, couplings_hz: Floats, broadening_hz: float = 0.0
    ) -> Plan:
        """Solving plan; broad views need fewer lines."""
        effort = self.settings.effort
        if broadening_hz > 0.0:
            # What a cut displaces is seen against the width of the line.
            wider = 1.0 + 2.0 * broadening_hz
            effort = replace(
                effort,
                tolerance_hz=max(effort.tolerance_hz, wider * FULL_EFFORT.tolerance_hz),
                flip_tolerance_hz=max(
                    effort.flip_tolerance_hz, wider * FULL_EFFORT.flip_tolerance_hz
                ),
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
        tell: Progress = say_nothing,
        *,
        skip: int = 0,
    ) -> Fit:
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

    def result(self, fit: Fit, began: float) -> Refinement:
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

    def stage(self, stage: Stage, parameters: Floats) -> Fit:
        """Run one stage from the given parameters."""
        problem = self.problem(stage.broadening_hz, parameters)
        descent = descend(
            problem,
            parameters,
            max_steps=stage.max_steps,
            budget=self.budget,
            small_gain=3e-3 if stage.broadening_hz > 0.0 else 1e-3,
        )
        return Fit(descent, problem)

    def problem(self, broadening_hz: float, parameters: Floats) -> Problem:
        """Data and model of one view near some parameters."""
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
            amplitude_prior=self._amplitude_prior(layout, broadening_hz),
            shape=LineShape(
                extra_width_hz=2.0 * broadening_hz,
                treatment=self.prepared.treatment,
            ),
            data=data,
        )

    def _amplitude_prior(self, layout: Layout, broadening_hz: float) -> AmplitudePrior:
        """Areas near the common one; nearer while lines still run together."""
        claims = self.network.claims.claims
        usual = (
            _AREA_SD_PRESATURATED if self.prepared.evidence.presaturated else _AREA_SD
        )
        if broadening_hz > 0.0:
            usual = _AREA_SD_BROAD
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

    def finish(self, fit: Fit) -> Fit:
        """Weights by the misfit found; Gauss share or common kernel, the better."""
        problem, descent = fit.problem, fit.descent
        max_steps = self.settings.stages[-1].max_steps
        data = _reweighted(self.prepared, problem, descent.evaluation)
        tries = [self._with_gauss_share(problem, descent, data)]
        kernel = self.prepared.evidence.kernel
        if kernel is not None:
            tries.append(_with_kernel(problem, descent, data, kernel=kernel))
        # A few steps tell which shape is the better one.
        few = min(_STEPS_PER_SHAPE, max_steps)
        fits = [
            (descend(p, begin, max_steps=few, budget=self.budget), p)
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
            small_gain=_LAST_GAIN if chosen.exact_slopes else _LAST_ROUGH_GAIN,
        )
        return Fit(last, chosen)

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


# Prior sd of a claim's area over that of the common proton. Relaxation and pulse
# angle move areas by 5 to 10 %, presaturation by up to 40 %; in a broad view
# free areas let one claim take the place of another.
_AREA_SD = 0.2
_AREA_SD_PRESATURATED = 0.3
_AREA_SD_BROAD = 0.12

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


_STEPS_PER_SHAPE = 5

# Relative gain at which the last descent ends: some hundredth of an sd away from
# the minimum; frequencies alone do not lead as near.
_LAST_GAIN = 1e-5
_LAST_ROUGH_GAIN = 1e-4

# About microseconds an evaluation; beyond, frequencies alone steer the fit.
_MOST_SLOPE_COST = 10_000.0


def _exact_is_affordable(plan: Plan) -> bool:
    return plan.exact_slope_cost <= _MOST_SLOPE_COST


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
