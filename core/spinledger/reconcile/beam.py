"""Beam search of the claims over the coarse line shape.

Every claim is tried at every position at once by two correlations; the best
hypotheses are kept and polished one claim at a time. Costs are in units of a
negative log likelihood; shifts in ppm, steps in Hz.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
from scipy.optimize import linear_sum_assignment

from spinledger.reconcile.coarse import FloatArray
from spinledger.reconcile.search import (
    EXPLAIN_ALL_COST,
    FORBIDDEN_COST,
    SKIP_OPTIONAL_COST,
    Search,
    correlate,
)

ABSENT = -1
AMPLITUDE_LIMITS = (0.35, 1.8)
SAME_PLACE_HZ = 8.0


@dataclass(frozen=True, slots=True, kw_only=True)
class BeamSettings:
    """How wide the beam searches.

    Attributes
    ----------
    width : int
        Hypotheses kept after each claim.
    n_places : int
        Places tried for each claim in each hypothesis.
    n_polished : int
        Hypotheses polished at the end.
    n_sweeps : int
        Sweeps of the polish over all claims.
    """

    width: int = 60
    n_places: int = 12
    n_polished: int = 25
    n_sweeps: int = 3


@dataclass(slots=True)
class Placement:
    """One hypothesis during the search: a place and an amplitude a member."""

    cost: float
    places: npt.NDArray[np.int64]
    amplitudes: FloatArray
    model: FloatArray
    area_per_proton: float = 0.0


def run_beam(
    search: Search,
    settings: BeamSettings,
    cancelled: Callable[[], None] | None = None,
) -> list[Placement]:
    """Best placements of all members, polished, best first."""
    n_members = len(search.members)
    empty = Placement(
        EXPLAIN_ALL_COST,
        np.full(n_members, ABSENT - 1, dtype=np.int64),
        np.zeros(n_members),
        np.zeros(search.coarse.n_points),
    )
    kept = [empty]
    for member in range(n_members):
        if cancelled is not None:
            cancelled()
        kept = _extend(search, kept, member, settings)
    polished = [
        polish(rescaled(search, placement), placement, settings.n_sweeps)
        for placement in kept[: settings.n_polished]
    ]
    for placement in kept:
        placement.area_per_proton = search.area_per_proton
    return _distinct(search, sorted(kept + polished, key=lambda one: one.cost))


def _extend(
    search: Search, kept: list[Placement], member: int, settings: BeamSettings
) -> list[Placement]:
    residuals = np.array(
        [
            search.weights * (search.coarse.intensities - placement.model)
            for placement in kept
        ]
    )
    supports = correlate(
        residuals,
        search.shape_transforms[member][None, :],
        search.length,
        search.half_points,
    )
    costs, amplitudes = place_costs(search, member, supports)
    grown: list[tuple[float, int, int]] = []
    for number, placement in enumerate(kept):
        row = costs[number]
        for place in _minima(row, placement, settings.n_places):
            grown.append((placement.cost + float(row[place]), number, int(place)))
        skipped = placement.cost + float(search.skip_costs[member])
        grown.append((skipped, number, ABSENT))
    grown.sort()
    return _grow_distinct(search, kept, member, grown, amplitudes, settings.width)


def place_costs(
    search: Search, member: int, supports: FloatArray, *, common: float | None = None
) -> tuple[FloatArray, FloatArray]:
    """Cost change of putting a member at each place, and its best amplitude.

    The amplitude is free about the common one with the member's sd; the
    minimum over it is closed form and then limited.
    """
    common = search.area_per_proton if common is None else common
    stiffness = 1.0 / (2.0 * (search.amplitude_sds[member] * common) ** 2)
    overlap = search.overlap[member]
    amplitudes = (supports + stiffness * common) / (overlap + stiffness)
    low, high = AMPLITUDE_LIMITS
    amplitudes = np.clip(amplitudes, low * common, high * common)
    costs = amplitudes * (amplitudes * overlap - 2.0 * supports)
    costs += stiffness * (amplitudes - common) ** 2 + search.priors[member]
    return costs, amplitudes


def _minima(row: FloatArray, placement: Placement, n_places: int) -> FloatArray:
    """Grid points of the lowest local minima, and places already taken."""
    inner = (row[1:-1] <= row[:-2]) & (row[1:-1] <= row[2:])
    inner &= row[1:-1] < FORBIDDEN_COST / 2
    places = np.flatnonzero(inner) + 1
    if places.size == 0:
        places = np.array([int(np.argmin(row))])
    if places.size > n_places:
        best = np.argpartition(row[places], n_places)[:n_places]
        places = places[best]
    taken = placement.places[placement.places >= 0]
    return np.unique(np.concatenate([places, taken]))


def _key(
    search: Search, places: npt.NDArray[np.int64], upto: int
) -> tuple[tuple[int, int], ...]:
    """Same for placements that differ by an exchange of look-alikes."""
    bin_points = SAME_PLACE_HZ / search.coarse.step_hz
    return tuple(
        sorted(
            (search.kinds[m], round(places[m] / bin_points) if places[m] >= 0 else -1)
            for m in range(upto)
        )
    )


def _grow_distinct(
    search: Search,
    kept: list[Placement],
    member: int,
    grown: list[tuple[float, int, int]],
    amplitudes: FloatArray,
    width: int,
) -> list[Placement]:
    """The best grown placements; at most two of each set of look-alikes."""
    seen: dict[tuple[tuple[int, int], ...], int] = {}
    exact: set[tuple[int, ...]] = set()
    chosen: list[Placement] = []
    bin_points = SAME_PLACE_HZ / search.coarse.step_hz
    for cost, number, place in grown:
        places = kept[number].places.copy()
        places[member] = place
        precise = tuple(round(p / bin_points) for p in places[: member + 1])
        key = _key(search, places, member + 1)
        if precise in exact or seen.get(key, 0) >= 2:
            continue
        exact.add(precise)
        seen[key] = seen.get(key, 0) + 1
        strengths = kept[number].amplitudes.copy()
        model = kept[number].model
        if place >= 0:
            strengths[member] = amplitudes[number, place]
            model = model.copy()
            add_shape(search, model, member, place, float(strengths[member]))
        chosen.append(Placement(cost, places, strengths, model))
        if len(chosen) >= width:
            break
    return chosen


def add_shape(
    search: Search, model: FloatArray, member: int, place: int, amplitude: float
) -> None:
    """Add a member's shape to a model in place."""
    half = search.half_points
    low, high = max(0, place - half), min(model.size, place + half + 1)
    shape = search.shapes[member][low - place + half : high - place + half]
    model[low:high] += amplitude * shape


def rescaled(search: Search, placement: Placement) -> Search:
    """The search with the common area that a placement asks for.

    Claims that may be absent have no say: they would soak up what is left of
    a signal that the common area does not reach.
    """
    sure = [
        member
        for member, place in enumerate(placement.places)
        if place >= 0 and search.skip_costs[member] > SKIP_OPTIONAL_COST
    ]
    ratios = placement.amplitudes[sure] / search.area_per_proton
    model = np.zeros_like(placement.model)
    for member in sure:
        place = int(placement.places[member])
        add_shape(search, model, member, place, float(placement.amplitudes[member]))
    # What optional claims took is left to the sure ones.
    overlap = float((search.weights * model**2).sum())
    support = float((search.weights * model * search.coarse.intensities).sum())
    if not sure or overlap <= 0.0:
        return search
    scale = float(np.clip(np.median(ratios) * support / overlap, 0.4, 2.5))
    return replace(search, area_per_proton=search.area_per_proton * scale)


def polish(search: Search, placement: Placement, n_sweeps: int) -> Placement:
    """Move one member at a time to its best place until nothing moves."""
    current = Placement(
        placement.cost,
        placement.places.copy(),
        placement.amplitudes.copy(),
        placement.model.copy(),
        search.area_per_proton,
    )
    for _ in range(n_sweeps):
        moved = False
        for member in range(len(search.members)):
            moved |= _move_to_best(search, current, member)
        moved |= _order_alike(search, current)
        if not moved:
            break
    return current


def _order_alike(search: Search, current: Placement) -> bool:
    """Give the places that look-alikes hold to those whom they suit best."""
    changed = False
    for kind in sorted(set(search.kinds)):
        group = [
            member
            for member, own in enumerate(search.kinds)
            if own == kind and current.places[member] >= 0
        ]
        if len(group) < 2:
            continue
        places = current.places[group]
        costs = search.priors[group][:, places]
        _, columns = linear_sum_assignment(costs)
        gain = float(np.trace(costs) - costs[np.arange(len(group)), columns].sum())
        if gain > 1e-6:
            current.places[group] = places[columns]
            current.amplitudes[group] = current.amplitudes[group][columns]
            changed = True
    if changed:
        current.model = model_of(search, current)
        current.cost = total_cost(search, current)
    return changed


def model_of(search: Search, placement: Placement) -> FloatArray:
    """Coarse model of a placement, shape (n,)."""
    model = np.zeros(search.coarse.n_points)
    for member, place in enumerate(placement.places):
        if place >= 0:
            add_shape(
                search, model, member, int(place), float(placement.amplitudes[member])
            )
    return model


def _move_to_best(search: Search, current: Placement, member: int) -> bool:
    place = int(current.places[member])
    if place >= 0:
        add_shape(
            search, current.model, member, place, -float(current.amplitudes[member])
        )
    residual = search.weights * (search.coarse.intensities - current.model)
    support = correlate(
        residual[None, :],
        search.shape_transforms[member][None, :],
        search.length,
        search.half_points,
    )[0]
    costs, amplitudes = place_costs(search, member, support)
    best = int(np.argmin(costs))
    skip = float(search.skip_costs[member])
    before = float(costs[place]) if place >= 0 else skip
    after = float(costs[best])
    if skip < after:
        best, after = ABSENT, skip
    # The amplitude may have drifted since the member was placed; the cost is
    # therefore taken anew from the data.
    current.places[member] = best
    current.amplitudes[member] = amplitudes[best] if best >= 0 else 0.0
    if best >= 0:
        add_shape(search, current.model, member, best, float(amplitudes[best]))
    current.cost = total_cost(search, current)
    return before - after > 1e-6


def total_cost(search: Search, placement: Placement) -> float:
    """Cost of a placement from the beginning: data, shifts, amplitudes, skips."""
    residual = search.coarse.intensities - placement.model
    cost = float((search.weights * residual**2).sum())
    for member, place in enumerate(placement.places):
        if place < 0:
            cost += float(search.skip_costs[member])
            continue
        ratio = placement.amplitudes[member] / search.area_per_proton
        cost += 0.5 * float((ratio - 1.0) / search.amplitude_sds[member]) ** 2
        cost += float(search.priors[member, place])
    return cost


def _distinct(search: Search, placements: list[Placement]) -> list[Placement]:
    """Drop placements within the same few Hz of a better one."""
    chosen: list[Placement] = []
    limit = SAME_PLACE_HZ / search.coarse.step_hz
    for placement in placements:
        near = any(
            np.abs(placement.places - other.places).max(initial=0) < limit
            and np.array_equal(placement.places < 0, other.places < 0)
            for other in chosen
        )
        if not near:
            chosen.append(placement)
    return chosen
