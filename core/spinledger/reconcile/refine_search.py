"""Second thoughts about a fit: other places, exchanged couplings; Hz."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt

from spinledger.reconcile.refine_data import stage_data
from spinledger.reconcile.refine_model import Layout, Problem, evaluate
from spinledger.reconcile.refine_places import Reach, better_places, crowds
from spinledger.reconcile.refine_run import Fit, Run
from spinledger.reconcile.refine_starts import alternatives
from spinledger.reconcile.refine_values import Stage, Start

Floats = npt.NDArray[np.float64]

# Where other places are looked for.
_BROAD_VIEW = Stage(broadening_hz=3.0, max_steps=6)

# Finished fits are compared with this half width put on.
_FINAL_VIEW_HZ = 0.3

# A claim with more than this share of misfit may stand wrongly.
_BAD_SHARE = 0.03

# Arrangements whose cost is looked at, and how many of them are fitted.
_MOST_LOOKED_AT = 16
_MOST_FITTED = 5

# Systems that take longer than this (about microseconds a simulation) are
# given fewer trials.
_DEAR_COST = 8_000.0

# Trials are finished unless they are clearly worse in the broad view; a
# finished one must be better by more than the line shape can make up.
_WORTH_FINISHING = 1.1
_BETTER = 0.98


def reconsidered(run: Run, fit: Fit, shares: Floats) -> Fit:
    """The fit, or a better one with some claims elsewhere.

    Parameters
    ----------
    run : Run
    fit : Fit
        A finished one.
    shares : numpy.ndarray, shape (n_claims,)
        Misfit where each claim stands; nan if it has no lines.

    Notes
    -----
    Claims that the fit left with misfit are taken out, with their neighbours,
    and put to their best places by their shapes; the couplings of these claims
    go back to the start, once as they are and once exchanged within each pair
    of claims. The best trials are fitted, first in a broad view, and compared
    on the same data.
    """
    ranked = np.argsort(-np.nan_to_num(shares), kind="stable").tolist()
    bad = tuple(k for k in ranked if np.nan_to_num(shares)[k] > _BAD_SHARE)
    for _ in range(run.settings.second_thoughts):
        if run.budget.is_used_up or not bad:
            return fit
        better = _best_move(run, fit, bad)
        if better is None:
            return fit
        fit = better
    return fit


def _best_move(run: Run, fit: Fit, bad: tuple[int, ...]) -> Fit | None:
    """The best finished fit with some claims moved, if it is better."""
    layout = fit.problem.layout
    n_plain = layout.n_moving + 1 + layout.drawn.size
    known = fit.descent.evaluation.parameters[:n_plain]
    is_dear = fit.problem.plan.cost > _DEAR_COST
    begins = _arrangements(run, known, bad, most=3 if is_dear else _MOST_FITTED)
    trials = [known]
    for begin in begins:
        trial = run.stage(_BROAD_VIEW, begin).descent.evaluation.parameters
        if not any(_is_same(trial, other, layout.n_moving) for other in trials):
            trials.append(trial)
    if len(trials) == 1:
        return None
    broad = _BROAD_VIEW.broadening_hz
    costs = _compare(run, trials, broad)
    order = [int(k) for k in np.argsort(costs) if k != 0][: 1 if is_dear else 2]
    stages = run.settings.stages
    skip = sum(stage.broadening_hz >= broad for stage in stages)
    finished = [
        run.through(trials[k], skip=min(skip, len(stages) - 1))
        for k in order
        if costs[k] < _WORTH_FINISHING * costs[0]
    ]
    if not finished:
        return None
    fits = [fit, *finished]
    final = _compare_fits(run, fits)
    best = int(np.argmin(final))
    return fits[best] if best and final[best] < _BETTER * final[0] else None


def _is_same(first: Floats, second: Floats, n_moving: int) -> bool:
    """True if no shift and no coupling differs by 1.5 Hz."""
    return bool(np.abs(first - second)[:n_moving].max() < 1.5)


def _arrangements(
    run: Run, known: Floats, bad: tuple[int, ...], *, most: int
) -> list[Floats]:
    """The most promising other arrangements of badly fitted claims."""
    problem = run.problem(_BROAD_VIEW.broadening_hz, known)
    run.budget.spend()
    now = evaluate(problem, known)
    layout = problem.layout
    place = {int(claim): k for k, claim in enumerate(layout.shift_claims)}
    begins = _alternatives(run, known, layout)
    for group in crowds(problem, now, bad):
        fresh = _with_fresh_couplings(run, known, layout, frozenset(group))
        begins += [fresh, *_exchanged_couplings(run, fresh, layout, frozenset(group))]
        begins += _alternatives(run, fresh, layout)
        run.budget.spend()
        moves = better_places(
            problem,
            now,
            evaluate(problem, _within(problem, fresh)),
            claims=group,
            reach=Reach(distance_hz=max(30.0, 0.06 * run.prepared.frequency_mhz)),
        )
        for move in moves[:_MOST_LOOKED_AT]:
            begin = np.array(fresh)
            for claim, shift in move.shifts_hz.items():
                begin[place[claim]] = shift
            begins.append(begin)
    costs = []
    for begin in begins:
        run.budget.spend()
        costs.append(evaluate(problem, _within(problem, begin)).cost)
    order = np.argsort(costs, kind="stable")[:most]
    return [begins[k] for k in order]


def _alternatives(run: Run, known: Floats, layout: Layout) -> list[Floats]:
    """The fit with close like claims, or couplings, exchanged, or signs turned."""
    n_shifts, frequency_mhz = layout.shift_claims.size, run.prepared.frequency_mhz
    here = Start(
        shifts_ppm=layout.shifts_hz(known, run.start_shifts_hz) / frequency_mhz,
        couplings_hz=layout.couplings_hz(known, run.start_couplings_hz),
        absent=run.start.absent,
    )
    found = []
    for other in alternatives(run.network.claims, here):
        begin = np.array(known)
        begin[:n_shifts] = other.shifts_ppm[layout.shift_claims] * frequency_mhz
        begin[n_shifts : layout.n_moving] = other.couplings_hz[layout.couplings]
        found.append(begin)
    return found


def _within(problem: Problem, parameters: Floats) -> Floats:
    return np.asarray(np.clip(parameters, problem.layout.low, problem.layout.high))


def _with_fresh_couplings(
    run: Run, known: Floats, layout: Layout, claims: frozenset[int]
) -> Floats:
    """Couplings and widths of some claims as at the start.

    The fit may have bent them to suit a wrong place; so the common width.
    """
    parameters = np.array(known)
    couplings = run.start_couplings_hz
    for k, index in enumerate(layout.couplings, start=layout.shift_claims.size):
        if run.network.claims_of(int(index)) & claims:
            parameters[k] = couplings[index]
    parameters[layout.n_moving] = layout.centres[layout.n_moving]
    begin = layout.n_moving + 1
    for row, claim in enumerate(layout.drawn.tolist()):
        if claim in claims:
            parameters[begin + row] = 0.0
    return parameters


def _exchanged_couplings(
    run: Run, fresh: Floats, layout: Layout, claims: frozenset[int]
) -> list[Floats]:
    """J and J' of the same two claims in each other's place, pair by pair."""
    by_owners: dict[frozenset[int], list[int]] = {}
    for k, index in enumerate(layout.couplings, start=layout.shift_claims.size):
        owners = run.network.claims_of(int(index))
        if owners & claims and len(owners) == 2:
            by_owners.setdefault(owners, []).append(k)
    found = []
    for places in by_owners.values():
        if len(places) == 2:
            begin = np.array(fresh)
            begin[places] = begin[places[::-1]]
            found.append(begin)
    return found


def _compare(run: Run, trials: list[Floats], broadening_hz: float) -> list[float]:
    """Costs of parameter vectors on one and the same data."""
    problems = [run.problem(broadening_hz, trial) for trial in trials]
    return _costs(run, problems, trials, broadening_hz)


def _compare_fits(run: Run, fits: list[Fit]) -> list[float]:
    """Costs of finished fits, each with its own line shape, on the same data."""
    problems, ends = [], []
    for fit in fits:
        ends.append(fit.descent.evaluation.parameters)
        shape = replace(fit.problem.shape, extra_width_hz=2.0 * _FINAL_VIEW_HZ)
        problems.append(replace(fit.problem, shape=shape, exact_slopes=False))
    return _costs(run, problems, ends, _FINAL_VIEW_HZ)


def _costs(
    run: Run, problems: list[Problem], ends: list[Floats], broadening_hz: float
) -> list[float]:
    lines = [
        problem.network.lines(
            problem.layout.shifts_hz(end, problem.start_shifts_hz),
            problem.layout.couplings_hz(end, problem.start_couplings_hz),
            plan=problem.plan,
        ).frequencies_hz
        for problem, end in zip(problems, ends, strict=True)
    ]
    data = stage_data(
        run.prepared,
        np.concatenate(lines),
        broadening_hz=broadening_hz,
        width_hz=0.5,
    )
    costs = []
    for problem, end in zip(problems, ends, strict=True):
        run.budget.spend()
        costs.append(evaluate(replace(problem, data=data), end).cost)
    return costs
