"""One structure against one spectrum: match, refine the best few, take the best.

Shifts in ppm, couplings in Hz, times in s.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from spinledger.reconcile.assess import Assessment, assess
from spinledger.reconcile.closeup import close_up
from spinledger.reconcile.coarse import CoarseSpectrum, FloatArray
from spinledger.reconcile.exchange import Odds, best_order, like_pairs
from spinledger.reconcile.match import (
    Hypothesis,
    match,
    starting_couplings,
)
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.rearrange import rearranged
from spinledger.reconcile.refine import refine
from spinledger.reconcile.refine_data import PreparedEvidence, prepare
from spinledger.reconcile.refine_values import (
    Refinement,
    RefineSettings,
    Stage,
    Start,
)
from spinledger.reconcile.search import shift_cost
from spinledger.spins.clusters import QUICK_EFFORT
from spinledger.spins.network import ClaimNetwork
from spinledger.values.claim import Claim, ClaimSet
from spinledger.values.evidence import Evidence

MAX_REFINED = 6
MAX_REFINED_QUICK = 2
COST_WINDOW = 6.0
# A fit this good needs only its near ties beside it.
GOOD_RESIDUAL = 0.05
NEAR_TIE_COST = 3.0
MAX_FINISHED = 2
FINISH_WINDOW = 3.0
MAX_ROUNDS = 2
# Fits below this need no other arrangement.
WELL_FITTED = 0.06
NEIGHBOUR_PPM = 0.1
NEIGHBOUR_PRICE = 5.0
ALIKE_PRICE = 2.5
# How much sooner a claim that fits badly is exchanged.
MISFIT_DRAW = 5.0
# Where the best quick fit leaves this share, a finer one changes nothing.
HOPELESS_RESIDUAL = 0.6
# Nothing is gained beyond a fit as good as the misfit can tell.
PERFECT = 0.022
# Starts of the search beside a good fit, and beside others.
N_SEARCHED_GOOD = 3
N_SEARCHED = 6
MAX_SEARCHES = 3
N_SKETCHED = 4
SEARCH_WINDOW = 6.0
TIE_WINDOW = 1.0
# Misfit is judged after a boxcar of 3 Hz, so that broad stages tell fits apart.
SKETCH = RefineSettings(
    stages=(
        Stage(broadening_hz=6.0, max_steps=6),
        Stage(broadening_hz=2.0, max_steps=6),
    ),
    effort=QUICK_EFFORT,
    fit_shape=False,
    exact_slopes=False,
    second_thoughts=0,
)
# From a quick fit on, only the sharper stages are needed.
FINISH = RefineSettings(
    stages=(
        Stage(broadening_hz=2.0, max_steps=8),
        Stage(broadening_hz=0.5, max_steps=12),
        Stage(broadening_hz=0.0, max_steps=20),
    ),
    # Other places were already tried by the match.
    second_thoughts=0,
)
# Without the common kernel and the exact slopes: half the time, shifts and J the
# same to a few hundredths of a Hz.
FINISH_QUICK = replace(FINISH, fit_shape=False, exact_slopes=False)


@dataclass(frozen=True, slots=True, kw_only=True)
class Limits:
    """How long a solution may be worked at.

    Attributes
    ----------
    max_refined : int
        Hypotheses refined at most.
    finish : RefineSettings
        Of the fine fits.
    is_rough : bool
        Only broad fits: enough to see that a structure does not fit.
    check : callable or None
        Raises when the user stopped.
    deadline_s : float or None
        Value of the monotonic clock after which no refinement begins.
    """

    max_refined: int = MAX_REFINED
    finish: RefineSettings = FINISH
    is_rough: bool = False
    check: Callable[[], None] | None = None
    deadline_s: float | None = None

    def is_over(self) -> bool:
        """Whether the time is used up."""
        return self.deadline_s is not None and time.monotonic() > self.deadline_s

    def checked(self) -> None:
        """Let the user's wish to stop through."""
        if self.check is not None:
            self.check()


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Fitted:
    """One hypothesis after refinement.

    Attributes
    ----------
    hypothesis : Hypothesis
    refinement : Refinement
    assessment : Assessment
    broad : Refinement or None
        The broadened fit that a fine one began with.
    """

    hypothesis: Hypothesis
    refinement: Refinement
    assessment: Assessment
    broad: Refinement | None = None


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Solution:
    """The best fit of a claim set, with what stood beside it.

    Attributes
    ----------
    claims : ClaimSet
    best : Fitted
        In the order of look-alike claims that suits the predictions best.
    others : tuple of Fitted
        Further refined hypotheses, best first.
    odds : tuple of Odds
        Pairs of claims whose order is not sure.
    match_cost : float
        Of the best hypothesis on the coarse view.
    is_complete : bool
        False where the time ran out before all hypotheses were refined.
    """

    claims: ClaimSet
    best: Fitted
    others: tuple[Fitted, ...]
    odds: tuple[Odds, ...]
    match_cost: float
    is_complete: bool

    @property
    def fits(self) -> tuple[Refinement, ...]:
        """The best refinement, and the broadened fit that it began with."""
        best = self.best
        return (
            (best.refinement,) if best.broad is None else (best.refinement, best.broad)
        )

    @property
    def absent(self) -> frozenset[int]:
        """Claims that are not in the spectrum."""
        return self.best.hypothesis.absent

    @property
    def hidden(self) -> frozenset[int]:
        """Claims under a mask."""
        return self.best.hypothesis.hidden


DEFAULT_LIMITS = Limits()


def solve(
    evidence: Evidence,
    claims: ClaimSet,
    *,
    constraints: Constraints | None = None,
    coarse: CoarseSpectrum | None = None,
    limits: Limits = DEFAULT_LIMITS,
) -> Solution | None:
    """Best fit of a claim set, or None where nothing can be placed.

    Parameters
    ----------
    evidence : Evidence
    claims : ClaimSet
    constraints : Constraints, optional
    coarse : CoarseSpectrum, optional
        Shared by the candidates of one spectrum.
    limits : Limits
    """
    found = match(
        evidence, claims, constraints=constraints, coarse=coarse, cancelled=limits.check
    )
    if not found.hypotheses:
        return None
    best_cost = found.hypotheses[0].cost
    starts = [
        one
        for one in found.hypotheses[: limits.max_refined]
        if one.cost <= best_cost + COST_WINDOW and _shows_something(claims, one)
    ]
    if not starts:
        return None
    sketchpad = _Sketchpad(
        prepared=prepare(evidence, constraints),
        network=ClaimNetwork(claims),
        constraints=constraints,
    )
    sketches: list[Fitted] = []
    is_complete = True
    for one in starts:
        limits.checked()
        if sketches and limits.is_over():
            is_complete = False
            break
        if _is_good(sketches) and one.cost > best_cost + NEAR_TIE_COST:
            break
        sketches.append(sketchpad.fitted(one, one.shifts_ppm, None, SKETCH))
    sketches.sort(key=_score)
    sketches = _rearranged(sketchpad, _searched(sketchpad, sketches, limits), limits)
    fits, rest = _finished(sketchpad, sketches, limits)
    best, odds = sketchpad.ordered(fits[0])
    return Solution(
        claims=claims,
        best=best,
        others=(*fits[1:], *rest),
        odds=odds,
        match_cost=best_cost,
        is_complete=is_complete,
    )


def _searched(
    sketchpad: _Sketchpad, sketches: list[Fitted], limits: Limits
) -> list[Fitted]:
    """Sketches with those of better arrangements that a local search finds."""
    if limits.is_rough:
        return sketches
    tried = {_arrangement(one) for one in sketches}
    for _ in range(MAX_SEARCHES):
        best = sketches[0]
        share = best.assessment.residual_share
        if not PERFECT < share < HOPELESS_RESIDUAL or limits.is_over():
            break
        # A good fit is only held against what looks as good from close by.
        is_good = share < WELL_FITTED
        window, most = (TIE_WINDOW, 2) if is_good else (SEARCH_WINDOW, N_SKETCHED)
        added: list[Fitted] = []
        for shifts_ppm in _proposals(sketchpad, sketches, limits, window):
            limits.checked()
            key = _places(shifts_ppm)
            if key in tried or len(added) >= most or limits.is_over():
                continue
            tried.add(key)
            start = replace(best.hypothesis, shifts_ppm=shifts_ppm)
            added.append(sketchpad.fitted(start, shifts_ppm, None, SKETCH))
        sketches = sorted([*sketches, *added], key=_score)
        if is_good or sketches[0] is best:
            break
    return sketches


def _proposals(
    sketchpad: _Sketchpad, sketches: list[Fitted], limits: Limits, window: float
) -> list[FloatArray]:
    """Shifts of promising arrangements on the close view, best first."""
    best = sketches[0]
    is_good = best.assessment.residual_share < WELL_FITTED
    most = N_SEARCHED_GOOD if is_good else N_SEARCHED
    gone = best.hypothesis.absent | best.hypothesis.hidden
    close = close_up(
        sketchpad.prepared.evidence,
        sketchpad.network,
        starting_couplings(sketchpad.network.claims, sketchpad.constraints),
        offset_ppm=best.assessment.offset_ppm,
        line_width_hz=sketchpad.prepared.line_width_hz,
        constraints=sketchpad.constraints,
    )
    starts = [
        close.places_of(one.refinement.shifts_ppm, gone)
        for one in sketches[:most]
        if one.hypothesis.absent | one.hypothesis.hidden == gone
    ]
    found = rearranged(close, starts, is_over=limits.is_over)
    return [
        close.shifts_of(one.places, best.refinement.shifts_ppm)
        for one in found
        if one.cost <= found[0].cost + window
    ]


def _rearranged(
    sketchpad: _Sketchpad, sketches: list[Fitted], limits: Limits
) -> list[Fitted]:
    """Sketches with neighbours and look-alikes of the best one exchanged.

    The coarse view cannot tell the order of claims that lie a few line widths
    apart; the exact line shape can.
    """
    tried = {_arrangement(fit) for fit in sketches}
    for _ in range(MAX_ROUNDS):
        best = sketches[0]
        share = best.assessment.residual_share
        if limits.is_rough or not WELL_FITTED < share < HOPELESS_RESIDUAL:
            break
        for shifts_ppm in exchanged_starts(sketchpad.network.claims, best, limit=4):
            limits.checked()
            if limits.is_over():
                return sketches
            start = replace(best.hypothesis, shifts_ppm=shifts_ppm)
            if (key := _places(shifts_ppm)) in tried:
                continue
            tried.add(key)
            sketches.append(sketchpad.fitted(start, shifts_ppm, None, SKETCH))
        sketches.sort(key=_score)
        if sketches[0] is best:
            break
    return sketches


def _arrangement(fit: Fitted) -> tuple[int, ...]:
    return _places(fit.refinement.shifts_ppm)


def _places(shifts_ppm: FloatArray) -> tuple[int, ...]:
    """Shifts in steps of 0.01 ppm, to know an arrangement again."""
    return tuple(round(100.0 * float(shift)) for shift in shifts_ppm)


def exchanged_starts(
    claims: ClaimSet, fit: Fitted, *, limit: int
) -> tuple[FloatArray, ...]:
    """Shifts of a fit with two claims exchanged, the likeliest exchanges first.

    Neighbours within 0.1 ppm, and claims of as many protons whose predictions
    allow the exchange; not those whose exchange changes nothing.
    """
    gone = fit.hypothesis.absent | fit.hypothesis.hidden
    same = {(one.first, one.second) for one in like_pairs(claims, gone)}
    shifts = fit.refinement.shifts_ppm
    here = [i for i in range(len(claims.claims)) if i not in gone]
    misfits = {one.claim: one.residual_share for one in fit.assessment.claims}
    rows: list[tuple[float, int, int]] = []
    for position, first in enumerate(here):
        for second in here[position + 1 :]:
            one, other = claims.claims[first], claims.claims[second]
            gap = abs(float(shifts[first] - shifts[second]))
            if (first, second) in same or gap < 0.002:
                continue
            price = _exchange_price(
                one, other, float(shifts[first]), float(shifts[second])
            )
            alike = one.n_protons == other.n_protons and price < ALIKE_PRICE
            if alike or (gap < NEIGHBOUR_PPM and price < NEIGHBOUR_PRICE):
                worst = max(misfits.get(first, 0.0), misfits.get(second, 0.0))
                rows.append((price - MISFIT_DRAW * min(worst, 1.0), first, second))
    starts = []
    for _, first, second in sorted(rows)[:limit]:
        turned = np.array(shifts)
        turned[first], turned[second] = shifts[second], shifts[first]
        starts.append(turned)
    return tuple(starts)


def _exchange_price(
    one: Claim, other: Claim, at_one_ppm: float, at_other_ppm: float
) -> float:
    """Rise of the shift cost when two claims take each other's place."""
    z = [
        (at_other_ppm - one.shift_ppm) / one.shift_sd_ppm,
        (at_one_ppm - other.shift_ppm) / other.shift_sd_ppm,
        (at_one_ppm - one.shift_ppm) / one.shift_sd_ppm,
        (at_other_ppm - other.shift_ppm) / other.shift_sd_ppm,
    ]
    costs = shift_cost(np.array(z))
    return float(costs[0] + costs[1] - costs[2] - costs[3])


def _shows_something(claims: ClaimSet, hypothesis: Hypothesis) -> bool:
    """Whether any claim is left to fit."""
    gone = hypothesis.absent | hypothesis.hidden
    return len(gone) < len(claims.claims)


def _finished(
    sketchpad: _Sketchpad, sketches: list[Fitted], limits: Limits
) -> tuple[list[Fitted], list[Fitted]]:
    """The best sketches after fine refinement, best first, and the rest as is."""
    is_hopeless = sketches[0].assessment.residual_share > HOPELESS_RESIDUAL
    if limits.is_rough or is_hopeless:
        return sketches[:1], sketches[1:]
    fits: list[Fitted] = []
    for sketch in sketches[:MAX_FINISHED]:
        limits.checked()
        # The broad view can flatter a fit: others follow while they could win.
        lowest = min(map(_score, fits), default=np.inf)
        is_beaten = _score(sketch) > min(lowest, _score(sketches[0]) + FINISH_WINDOW)
        if fits and (is_beaten or limits.is_over()):
            break
        fits.append(sketchpad.finished(sketch, limits.finish))
    return sorted(fits, key=_score), sketches[len(fits) :]


def _score(fit: Fitted) -> float:
    return fit.assessment.selection_score


def _is_good(fits: list[Fitted]) -> bool:
    return any(fit.assessment.residual_share < GOOD_RESIDUAL for fit in fits)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class _Sketchpad:
    """What the refinements of one claim set share."""

    prepared: PreparedEvidence
    network: ClaimNetwork
    constraints: Constraints | None

    def fitted(
        self,
        hypothesis: Hypothesis,
        shifts_ppm: FloatArray,
        couplings_hz: FloatArray | None,
        settings: RefineSettings,
    ) -> Fitted:
        """Refine from given shifts; a hidden claim shows no lines but couples."""
        claims = self.network.claims
        if couplings_hz is None:
            couplings_hz = starting_couplings(claims, self.constraints)
        start = Start(
            shifts_ppm=shifts_ppm,
            couplings_hz=couplings_hz,
            absent=hypothesis.absent | hypothesis.hidden,
        )
        refinement = refine(
            self.prepared,
            self.network,
            start,
            constraints=self.constraints,
            settings=settings,
        )
        return self._assessed(hypothesis, refinement, None)

    def finished(self, sketch: Fitted, settings: RefineSettings) -> Fitted:
        """A sketch refined on."""
        fine = self.fitted(
            sketch.hypothesis,
            sketch.refinement.shifts_ppm,
            sketch.refinement.couplings_hz,
            settings,
        )
        return self._assessed(sketch.hypothesis, fine.refinement, sketch.refinement)

    def ordered(self, fit: Fitted) -> tuple[Fitted, tuple[Odds, ...]]:
        """The fit with look-alikes in their best order, assessed anew."""
        refinement, odds = best_order(
            self.network.claims,
            fit.refinement,
            fit.hypothesis.absent | fit.hypothesis.hidden,
            offset_ppm=fit.assessment.offset_ppm,
            constraints=self.constraints,
        )
        if refinement is fit.refinement:
            return fit, odds
        return self._assessed(fit.hypothesis, refinement, fit.broad), odds

    def _assessed(
        self, hypothesis: Hypothesis, refinement: Refinement, broad: Refinement | None
    ) -> Fitted:
        assessment = assess(
            self.prepared.evidence,
            self.network.claims,
            [one for one in (refinement, broad) if one is not None],
            absent=hypothesis.absent,
            hidden=hypothesis.hidden,
            constraints=self.constraints,
        )
        return Fitted(
            hypothesis=hypothesis,
            refinement=refinement,
            assessment=assessment,
            broad=broad,
        )
