"""Other places for claims that a fit has left with misfit; Hz."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.reconcile.refine_model import Evaluation, Problem
from spinledger.spins.synthesis import Images, LineList, draw

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Move:
    """Some claims put elsewhere.

    Attributes
    ----------
    shifts_hz : mapping of int to float, Hz
        New shift of every claim that is moved.
    gain : float
        Share of the misfit of the stretches concerned that the move promises
        to take away; below 0 it makes things worse at first.
    """

    shifts_hz: Mapping[int, float]
    gain: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Reach:
    """How widely places are looked for.

    Attributes
    ----------
    distance_hz : float, Hz
        From where a claim stands.
    most_places : int
        Places tried for each claim beside each arrangement of the others.
    width : int
        Arrangements kept.
    """

    distance_hz: float
    most_places: int = 5
    width: int = 16


_MOST_TOGETHER = 5
_NEAR_HZ = 45.0
_LEAST_MOVE_HZ = 4.0
_LEAST_GAIN = -20.0
_GAIN_SPREAD = 4.0


def crowds(
    problem: Problem, evaluation: Evaluation, bad: tuple[int, ...]
) -> tuple[tuple[int, ...], ...]:
    """Bad claims with their neighbours, one group for each crowded stretch.

    A claim can stand well in another's place, so those near a bad one are
    moved with it. Pinned claims, and those that are hardly compared, never are.

    Parameters
    ----------
    problem : Problem
    evaluation : Evaluation
    bad : tuple of int
        Worst first.
    """
    board = _Board(problem, evaluation)
    layout = problem.layout
    images = _images(problem, evaluation)
    free = [
        int(claim)
        for row, claim in enumerate(layout.shift_claims)
        if layout.high[row] - layout.low[row] > _LEAST_MOVE_HZ
        and int(claim) in images
        and board.sees(images[int(claim)])
    ]
    left = [claim for claim in bad if claim in free]
    found = []
    while left:
        group, frontier = [left[0]], [left[0]]
        while frontier:
            here = frontier.pop()
            near = [
                claim
                for claim in free
                if claim not in group
                and _gap(images[claim], images[here]) < _NEAR_HZ / board.step_hz
            ]
            group += near
            frontier += near
        found.append(tuple(group[:_MOST_TOGETHER]))
        left = [claim for claim in left if claim not in group]
    return tuple(found)


def _gap(first: Images, second: Images) -> float:
    """Points between the middles of two images."""
    middle = first.start + 0.5 * first.value.size
    return abs(middle - second.start - 0.5 * second.value.size)


def better_places(
    problem: Problem,
    evaluation: Evaluation,
    shapes: Evaluation,
    *,
    claims: tuple[int, ...],
    reach: Reach,
) -> tuple[Move, ...]:
    """Arrangements of some claims that promise a lower cost, best first.

    Parameters
    ----------
    problem : Problem
        Of a broad view (a few Hz), where neighbouring places join.
    evaluation : Evaluation
        The fit as it is.
    shapes : Evaluation
        The same with those couplings and widths of the claims that their
        shapes are to be drawn with.
    claims : tuple of int
        Which claims to move.
    reach : Reach

    Notes
    -----
    The claims are taken out of the model. One after the other is held against
    the weighted residual at every offset at once and put to each of its best
    places; the best arrangements are kept. Both orders are gone through.
    """
    board = _Board(problem, evaluation)
    now = _images(problem, evaluation)
    images = _images(problem, shapes)
    shifts = {
        int(claim): float(shapes.parameters[row])
        for row, claim in enumerate(problem.layout.shift_claims)
    }
    empty = board.residual.copy()
    for claim in claims:
        add_image(empty, now[claim], 1.0)
    before = board.cost(board.residual)
    scale = max(before, 1e-30)
    moves: list[Move] = []
    for order in (claims, claims[::-1]):
        for one in _arrange(board, empty, order, images=images, reach=reach):
            moves.append(
                Move(
                    shifts_hz={
                        claim: shifts[claim] - offset * board.step_hz
                        for claim, offset in one.offsets.items()
                    },
                    gain=(before - board.cost(one.residual)) / scale,
                )
            )
    moves.sort(key=lambda move: -move.gain)
    stands = {claim: shifts[claim] for claim in claims}
    return tuple(_distinct(moves, stands))


@dataclass(frozen=True, slots=True, eq=False)
class _Arrangement:
    offsets: dict[int, int]
    residual: Floats
    gain: float


def _arrange(
    board: _Board,
    empty: Floats,
    order: tuple[int, ...],
    *,
    images: dict[int, Images],
    reach: Reach,
) -> list[_Arrangement]:
    kept = [_Arrangement({}, empty, 0.0)]
    for claim in order:
        grown = []
        for one in kept:
            gains = board.gains(images[claim], one.residual, reach.distance_hz)
            here = gains.size // 2
            for place in _peaks(gains, board.step_hz, reach.most_places):
                left = one.residual.copy()
                offset = place - here
                moved = Images(
                    start=images[claim].start + offset, value=images[claim].value
                )
                add_image(left, moved, -1.0)
                grown.append(
                    _Arrangement(
                        {**one.offsets, claim: offset},
                        left,
                        one.gain + float(gains[place]),
                    )
                )
        grown.sort(key=lambda one: -one.gain)
        kept = grown[: reach.width]
    return kept


class _Board:
    """Residual and weights of a fit on the whole thinned axis."""

    def __init__(self, problem: Problem, evaluation: Evaluation) -> None:
        data = problem.data
        self.step_hz = data.axis.step_hz
        self.residual = np.zeros(data.axis.n_points)
        self.weight = np.zeros(data.axis.n_points)
        for run, window in zip(data.runs, data.windows, strict=True):
            self.residual[run] = -evaluation.residual[window]
            self.weight[run] = data.sds[window] ** -2.0 / data.correlation

    def cost(self, residual: Floats) -> float:
        """Weighted sum of squares."""
        return float(self.weight @ residual**2)

    def sees(self, image: Images) -> bool:
        """True if more than half of a claim's shape is compared."""
        begin = max(image.start, 0)
        end = min(image.start + image.value.size, self.residual.size)
        shape = image.value[begin - image.start : end - image.start]
        seen = float(shape[self.weight[begin:end] > 0.0].sum())
        return begin < end and seen > 0.5 * float(image.value.sum())

    def gains(self, image: Images, residual: Floats, distance_hz: float) -> Floats:
        """Cost saved by an image at every offset within reach."""
        n_reach = round(distance_hz / self.step_hz)
        index = np.arange(
            image.start - n_reach, image.start + image.value.size + n_reach
        )
        inside = (index >= 0) & (index < residual.size)
        safe = np.clip(index, 0, residual.size - 1)
        weight = np.where(inside, self.weight[safe], 0.0)
        fits = np.correlate(weight * residual[safe], image.value, mode="valid")
        norms = np.correlate(weight, image.value**2, mode="valid")
        return np.asarray(2.0 * fits - norms)


def _images(problem: Problem, evaluation: Evaluation) -> dict[int, Images]:
    """Image of every drawn claim, at its fitted area."""
    layout, lines = problem.layout, evaluation.lines
    widths = layout.widths_hz(evaluation.parameters)
    images = {}
    for row, claim in enumerate(layout.drawn.tolist()):
        own = lines.claim == claim
        drawn = draw(
            LineList(
                frequencies_hz=lines.frequencies_hz[own], protons=lines.protons[own]
            ),
            problem.data.axis,
            width_hz=float(widths[row]),
            shape=problem.shape,
            pad_hz=10.0,
        )
        images[claim] = Images(
            start=drawn.start, value=drawn.value * evaluation.amplitudes[row]
        )
    return images


def add_image(target: Floats, image: Images, factor: float) -> None:
    """Add an image in place, clipped at the ends of the axis."""
    begin = max(image.start, 0)
    end = min(image.start + image.value.size, target.size)
    if begin < end:
        piece = image.value[begin - image.start : end - image.start]
        target[begin:end] += factor * piece


def _peaks(gains: Floats, step_hz: float, most: int) -> list[int]:
    """Highest places, apart from each other."""
    apart = max(1, round(_LEAST_MOVE_HZ / step_hz))
    chosen: list[int] = []
    for place in np.argsort(-gains, kind="stable").tolist():
        if all(abs(place - other) >= apart for other in chosen):
            chosen.append(place)
        if len(chosen) >= most:
            break
    return chosen


def _distinct(moves: list[Move], stands: dict[int, float]) -> list[Move]:
    """Moves without those that lead close to a better one or change nothing."""
    kept: list[dict[int, float]] = [stands]
    found = []
    for move in moves:
        if move.gain < max(_LEAST_GAIN, moves[0].gain - _GAIN_SPREAD):
            break
        places = dict(move.shifts_hz)
        if all(
            max(abs(places[claim] - other[claim]) for claim in places) > _LEAST_MOVE_HZ
            for other in kept
        ):
            kept.append(places)
            found.append(move)
    return found
