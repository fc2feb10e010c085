"""Levenberg-Marquardt steps on a projected least-squares problem."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.errors import CancelledError
from spinledger.reconcile.refine_model import Evaluation, Layout, Problem, evaluate

Floats = npt.NDArray[np.float64]


@dataclass(slots=True, eq=False)
class Budget:
    """Counts evaluations and says when to stop.

    Attributes
    ----------
    cancelled : callable or None
    deadline_s : float or None
        On the monotonic clock.
    n_evaluations : int
    """

    cancelled: Callable[[], bool] | None = None
    deadline_s: float | None = None
    n_evaluations: int = 0

    def spend(self) -> None:
        """Count one evaluation.

        Raises
        ------
        CancelledError
            If the user stopped the fit.
        """
        self.n_evaluations += 1
        if self.cancelled is not None and self.cancelled():
            raise CancelledError("the refinement was stopped")

    @property
    def is_used_up(self) -> bool:
        """True once the deadline has passed."""
        return self.deadline_s is not None and time.monotonic() > self.deadline_s


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Descent:
    """Where a run of steps ended."""

    evaluation: Evaluation
    converged: bool


# A step that lowers the cost by less than this share ends the stage.
_SMALL_GAIN = 1e-4
_TRIES = 6


def descend(
    problem: Problem,
    parameters: Floats,
    *,
    max_steps: int,
    budget: Budget,
    small_gain: float = _SMALL_GAIN,
) -> Descent:
    """Lower the cost by damped Gauss-Newton steps within bounds.

    Parameters
    ----------
    problem : Problem
    parameters : numpy.ndarray
        Where to begin; clipped to the bounds.
    max_steps : int
    budget : Budget
    small_gain : float
        Relative gain at which to stop.

    References
    ----------
    .. [1] D. W. Marquardt, J. Soc. Ind. Appl. Math. 11 (1963) 431-441,
       doi:10.1137/0111030.
    """
    layout = problem.layout
    budget.spend()
    now = evaluate(problem, np.clip(parameters, layout.low, layout.high))
    damping = 1e-3
    for _ in range(max_steps):
        if budget.is_used_up:
            return Descent(evaluation=now, converged=False)
        better = None
        for _ in range(_TRIES):
            trial = _step(layout, now, damping)
            budget.spend()
            then = evaluate(problem, trial)
            if then.cost < now.cost:
                better = then
                break
            damping = max(damping, 1e-6) * 6.0
            if _is_tiny(layout, trial - now.parameters):
                break
        if better is None:
            return Descent(evaluation=now, converged=True)
        gain = (now.cost - better.cost) / max(now.cost, 1e-30)
        now, damping = better, max(damping / 6.0, 1e-9)
        if gain < small_gain:
            return Descent(evaluation=now, converged=True)
    return Descent(evaluation=now, converged=False)


def _step(layout: Layout, now: Evaluation, damping: float) -> Floats:
    hessian = now.hessian + damping * np.diag(np.diag(now.hessian))
    # Parameters that sit on a bound and want beyond it stay there.
    held = ((now.parameters <= layout.low) & (now.gradient > 0)) | (
        (now.parameters >= layout.high) & (now.gradient < 0)
    )
    free = np.flatnonzero(~held)
    step = np.zeros(layout.n_parameters)
    step[free] = -np.linalg.solve(hessian[np.ix_(free, free)], now.gradient[free])
    step = np.clip(step, -layout.step_limits, layout.step_limits)
    return np.clip(now.parameters + step, layout.low, layout.high)


def _is_tiny(layout: Layout, step: Floats) -> bool:
    return bool(np.all(np.abs(step) < 1e-5 * np.maximum(layout.step_limits, 1e-12)))
