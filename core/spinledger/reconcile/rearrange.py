"""Local search over arrangements of the claims on the close view.

From the arrangement of a fit claims exchange their places, follow each other in
rings, or leave for stretches that the model does not reach, as long as the exact
line shape gains. Shifts in ppm, steps in Hz.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from spinledger.reconcile.beam import place_costs
from spinledger.reconcile.closeup import Arrangement, CloseUp, without
from spinledger.reconcile.coarse import FloatArray
from spinledger.reconcile.search import correlate

Move = dict[int, float]

# Dearer moves by the predicted shifts alone are not looked at.
DEAREST_MOVE = 9.0
DEAREST_RING = 6.0
SAME_PLACE_HZ = 6.0
N_FREE_PLACES = 4
N_AFTER_EVICTION = 2
N_DRAWN = 8
MAX_ROUNDS = 8
LEAST_GAIN = 0.3
CLEAR_GAIN = 2.0
LEAST_TRUST = 0.5


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Found:
    """An arrangement that was drawn, by its places and its cost."""

    places: FloatArray
    cost: float


def rearranged(
    close: CloseUp,
    starts: Iterable[FloatArray],
    *,
    is_over: Callable[[], bool],
) -> tuple[Found, ...]:
    """Arrangements near some starts, best first, the starts among them.

    Parameters
    ----------
    close : CloseUp
    starts : iterable of numpy.ndarray
        FloatArray of the members.
    is_over : callable
        Asked between rounds; true ends the search.

    Notes
    -----
    In each round every move is judged with the shapes that the members have
    where they stand; the most promising few are drawn exactly.
    """
    drawn: dict[tuple[int, ...], Found] = {}
    for start in starts:
        if is_over():
            break
        _descend(close, start, drawn, is_over)
    return tuple(sorted(drawn.values(), key=lambda one: one.cost))


def _descend(
    close: CloseUp,
    start: FloatArray,
    drawn: dict[tuple[int, ...], Found],
    is_over: Callable[[], bool],
) -> None:
    plan = close.plan(start)
    current = close.arrange(start, plan)
    key = _key(close, start)
    if key in drawn:
        return
    drawn[key] = Found(places=current.places, cost=current.cost)
    for _ in range(MAX_ROUNDS):
        best = current
        n_drawn = 0
        for _cost, places in _promising(close, current):
            key = _key(close, places)
            if key in drawn:
                continue
            n_drawn += 1
            if n_drawn > N_DRAWN:
                break
            tried = close.arrange(places, plan)
            drawn[key] = Found(places=tried.places, cost=tried.cost)
            if tried.cost < best.cost:
                best = tried
            if best.cost < current.cost - CLEAR_GAIN:
                break
        if best.cost > current.cost - LEAST_GAIN or is_over():
            return
        if plan.is_cut:
            plan = close.plan(best.places)
            best = close.arrange(best.places, plan)
        current = best


def _key(close: CloseUp, places: FloatArray) -> tuple[int, ...]:
    """FloatArray to a few Hz, to know an arrangement again."""
    width = SAME_PLACE_HZ / close.search.coarse.step_hz
    return tuple(round(place / width) for place in places.tolist())


def _promising(close: CloseUp, current: Arrangement) -> list[tuple[float, FloatArray]]:
    """Moved places by rising cost, judged with the present shapes."""
    judged = []
    trust = close.search.coarse.trust
    for move in _moves(close, current):
        # Under a mask every misfit vanishes.
        if any(trust[round(place)] < LEAST_TRUST for place in move.values()):
            continue
        places = current.places.copy()
        for member, place in move.items():
            places[member] = place
        judged.append((_judged(close, current, move), places))
    judged.sort(key=lambda row: row[0])
    return judged


def _judged(close: CloseUp, current: Arrangement, move: Move) -> float:
    """Misfit and shift cost after a move, with shapes and areas kept."""
    residual = without(current, list(move))
    for member, place in move.items():
        moved = shifted(
            current.images[member], round(place - float(current.places[member]))
        )
        residual -= current.amplitudes[member] * moved
    return close.misfit_cost(residual) + _price(close, current, move)


def shifted(row: FloatArray, n_points: int) -> FloatArray:
    """Row moved by some points, zeros behind it."""
    moved = np.zeros_like(row)
    if n_points >= 0:
        moved[n_points:] = row[: row.size - n_points]
    else:
        moved[:n_points] = row[-n_points:]
    return moved


def _moves(close: CloseUp, current: Arrangement) -> Iterator[Move]:
    shown = [int(m) for m in np.flatnonzero(current.places >= 0)]
    for first, second in combinations(shown, 2):
        turned = {
            first: float(current.places[second]),
            second: float(current.places[first]),
        }
        if _price(close, current, turned) < DEAREST_MOVE:
            yield turned
    for one, other, third in combinations(shown, 3):
        for ring in ((one, other, third), (one, third, other)):
            turned = _ring(current, ring)
            if _price(close, current, turned) < DEAREST_RING:
                yield turned
    yield from _departures(close, current, shown)
    yield from _evictions(close, current, shown)


def _ring(current: Arrangement, members: Sequence[int]) -> Move:
    """Each member at the place of the next one."""
    after = [*members[1:], members[0]]
    return {
        member: float(current.places[other])
        for member, other in zip(members, after, strict=True)
    }


def _price(close: CloseUp, current: Arrangement, move: Move) -> float:
    """Rise of the shift cost."""
    priors = close.search.priors
    return sum(
        float(
            priors[member, round(place)]
            - priors[member, round(float(current.places[member]))]
        )
        for member, place in move.items()
    )


def _departures(
    close: CloseUp, current: Arrangement, shown: list[int]
) -> Iterator[Move]:
    """A member goes where the spectrum asks for it."""
    for member in shown:
        left = without(current, [member])[None, :]
        for place in _wanted(close, current, member, left, N_FREE_PLACES)[0]:
            yield {member: place}


def _evictions(
    close: CloseUp, current: Arrangement, shown: list[int]
) -> Iterator[Move]:
    """A member takes another's place, which goes where the spectrum asks for it."""
    for other in shown:
        place = float(current.places[other])
        members = [
            member
            for member in shown
            if member != other
            and _price(close, current, {member: place}) < DEAREST_RING
        ]
        rows = []
        for member in members:
            left = without(current, [member, other])
            step = round(place - float(current.places[member]))
            moved = shifted(current.images[member], step)
            rows.append(left - current.amplitudes[member] * moved)
        if not rows:
            continue
        wanted = _wanted(close, current, other, np.array(rows), N_AFTER_EVICTION)
        for member, places in zip(members, wanted, strict=True):
            for free in places:
                yield {member: place, other: free}


def _wanted(
    close: CloseUp,
    current: Arrangement,
    member: int,
    residuals: FloatArray,
    n_places: int,
) -> list[list[float]]:
    """FloatArray of lowest cost of a member for each row of residuals."""
    search = close.search
    supports = correlate(
        residuals * search.weights,
        search.shape_transforms[member][None, :],
        search.length,
        search.half_points,
    )
    costs, _ = place_costs(search, member, supports, common=current.common)
    apart = int(SAME_PLACE_HZ / search.coarse.step_hz)
    chosen = []
    for row in costs:
        lowest = (row[1:-1] <= row[:-2]) & (row[1:-1] <= row[2:])
        candidates = np.flatnonzero(lowest) + 1
        order = candidates[np.argsort(row[candidates], kind="stable")]
        here = float(current.places[member])
        chosen.append(
            [
                float(place)
                for place in order[: n_places + 1]
                if abs(place - here) > apart
            ]
        )
    return chosen
