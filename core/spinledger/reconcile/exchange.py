"""Claims whose order the data do not decide, and the odds of each order.

Shifts in ppm, couplings in Hz; costs are negative log likelihoods.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from spinledger.reconcile.assess import COUPLING_EXTRA_SD_HZ, SHIFT_EXTRA_SD_PPM
from spinledger.reconcile.coarse import BoolArray, FloatArray
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.refine_values import Refinement
from spinledger.reconcile.search import shift_cost
from spinledger.reconcile.side_costs import placement_cost
from spinledger.reconcile.side_evidence import SideEvidence
from spinledger.values.claim import ClaimSet

SURE_ODDS = 0.95


@dataclass(frozen=True, slots=True, kw_only=True)
class Exchange:
    """Two claims that could stand the other way round.

    Attributes
    ----------
    first, second : int
        Claims.
    couplings : tuple of (int, int)
        Couplings that take each other's value.
    """

    first: int
    second: int
    couplings: tuple[tuple[int, int], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Odds:
    """Odds that two claims stand as booked and not the other way round."""

    first: int
    second: int
    odds: float


def like_pairs(claims: ClaimSet, absent: frozenset[int]) -> Iterator[Exchange]:
    """Pairs of claims whose exchange leaves the model spectrum as it is.

    They have the same number of protons, and for every coupling of the one
    there is a coupling of the other to the same third claim.
    """
    table = _couplings_by_claims(claims)
    listed = claims.claims
    for first in range(len(listed)):
        for second in range(first + 1, len(listed)):
            if first in absent or second in absent:
                continue
            same = (
                listed[first].n_protons == listed[second].n_protons
                and listed[first].species == listed[second].species
                and listed[first].is_exchangeable == listed[second].is_exchangeable
            )
            mapped = _mapped(table, first, second) if same else None
            if mapped is not None:
                yield Exchange(first=first, second=second, couplings=mapped)


def _couplings_by_claims(
    claims: ClaimSet,
) -> dict[tuple[int, int], tuple[int, ...]]:
    """Couplings between two claims; a hetero particle counts below zero."""
    table: dict[tuple[int, int], tuple[int, ...]] = {}
    for index, coupling in enumerate(claims.couplings):
        one, other = coupling.pairs[0]
        owners = []
        for number in (one, other):
            owner = claims.particles[number].claim
            owners.append(-1 - number if owner is None else owner)
        low, high = sorted(owners)
        table[low, high] = (*table.get((low, high), ()), index)
    return table


def _mapped(
    table: dict[tuple[int, int], tuple[int, ...]], first: int, second: int
) -> tuple[tuple[int, int], ...] | None:
    """Couplings of one claim with their counterparts of the other."""
    mapped: list[tuple[int, int]] = []
    others = {
        (low if high in (first, second) else high)
        for low, high in table
        if first in (low, high) or second in (low, high)
    } - {first, second}
    for other in others:
        low_1, high_1 = sorted((first, other))
        low_2, high_2 = sorted((second, other))
        mine = table.get((low_1, high_1), ())
        theirs = table.get((low_2, high_2), ())
        if len(mine) != len(theirs):
            return None
        mapped += zip(mine, theirs, strict=True)
    own_1, own_2 = table.get((first, first), ()), table.get((second, second), ())
    if len(own_1) != len(own_2):
        return None
    mapped += zip(own_1, own_2, strict=True)
    return tuple(mapped)


def best_order(
    claims: ClaimSet,
    refinement: Refinement,
    absent: frozenset[int],
    *,
    offset_ppm: float = 0.0,
    constraints: Constraints | None = None,
) -> tuple[Refinement, tuple[Odds, ...]]:
    """Exchange look-alikes until no exchange helps, and the odds of what is left.

    The measured spectrum is silent about such an exchange, so that predicted
    shifts and couplings alone give the odds.
    """
    pinned = {pin.claim for pin in constraints.pins} if constraints else set()
    pairs = [
        pair
        for pair in like_pairs(claims, absent)
        if pinned.isdisjoint(
            (claims.claims[pair.first].label, claims.claims[pair.second].label)
        )
    ]
    side = constraints.side if constraints else None

    def change(fit: Refinement, pair: Exchange) -> float:
        return _change(claims, fit, pair, offset_ppm) + _side_change(
            claims, fit, pair, absent, side
        )

    current = refinement
    for _ in range(len(pairs) + 1):
        changes = [change(current, pair) for pair in pairs]
        if not changes or min(changes) > -1e-9:
            break
        current = exchanged(claims, current, pairs[int(np.argmin(changes))])
    odds = []
    for pair in pairs:
        share = float(1.0 / (1.0 + np.exp(-min(change(current, pair), 50.0))))
        if share < SURE_ODDS:
            odds.append(Odds(first=pair.first, second=pair.second, odds=share))
    return current, tuple(odds)


def _change(
    claims: ClaimSet, refinement: Refinement, pair: Exchange, offset_ppm: float
) -> float:
    """Cost of the exchanged order minus the cost of the present one."""
    before = _shift(claims, refinement.shifts_ppm, pair, offset_ppm)
    turned = _turned(refinement.shifts_ppm, [(pair.first, pair.second)])
    after = _shift(claims, turned, pair, offset_ppm)
    moved = _turned(refinement.couplings_hz, list(pair.couplings))
    determined = refinement.determined
    before += _coupling(claims, refinement.couplings_hz, determined, pair)
    after += _coupling(
        claims, moved, _turned_flags(determined, list(pair.couplings)), pair
    )
    return after - before


def _side_change(
    claims: ClaimSet,
    refinement: Refinement,
    pair: Exchange,
    absent: frozenset[int],
    side: SideEvidence | None,
) -> float:
    """What HSQC and COSY add to the cost of the exchanged order."""
    turned = _turned(refinement.shifts_ppm, [(pair.first, pair.second)])
    return placement_cost(claims, turned, absent, side) - placement_cost(
        claims, refinement.shifts_ppm, absent, side
    )


def _shift(
    claims: ClaimSet, shifts_ppm: FloatArray, pair: Exchange, offset_ppm: float
) -> float:
    cost = 0.0
    for index in (pair.first, pair.second):
        claim = claims.claims[index]
        sd = float(np.hypot(claim.shift_sd_ppm, SHIFT_EXTRA_SD_PPM))
        z = (float(shifts_ppm[index]) - claim.shift_ppm - offset_ppm) / sd
        cost += float(shift_cost(np.array([z]))[0])
    return cost


def _coupling(
    claims: ClaimSet,
    couplings_hz: FloatArray,
    determined: BoolArray,
    pair: Exchange,
) -> float:
    cost = 0.0
    for index in {k for row in pair.couplings for k in row}:
        if not determined[index]:
            continue
        claim = claims.couplings[index]
        sd = float(np.hypot(claim.j_sd_hz, COUPLING_EXTRA_SD_HZ))
        z = (abs(float(couplings_hz[index])) - abs(claim.j_hz)) / sd
        cost += float(shift_cost(np.array([z]))[0])
    return cost


def _turned(values: FloatArray, rows: list[tuple[int, int]]) -> FloatArray:
    moved = np.array(values)
    for one, other in rows:
        moved[one], moved[other] = values[other], values[one]
    return moved


def _turned_flags(flags: BoolArray, rows: list[tuple[int, int]]) -> BoolArray:
    moved = np.array(flags)
    for one, other in rows:
        moved[one], moved[other] = flags[other], flags[one]
    return moved


def exchanged(claims: ClaimSet, refinement: Refinement, pair: Exchange) -> Refinement:
    """The same fit with two look-alike claims the other way round."""
    swap = [(pair.first, pair.second)]
    rows = list(pair.couplings)
    names = {
        claims.claims[pair.first].label: claims.claims[pair.second].label,
        claims.claims[pair.second].label: claims.claims[pair.first].label,
    }
    return replace(
        refinement,
        shifts_ppm=_turned(refinement.shifts_ppm, swap),
        shift_sds_ppm=_turned(refinement.shift_sds_ppm, swap),
        widths_hz=_turned(refinement.widths_hz, swap),
        protons=_turned(refinement.protons, swap),
        couplings_hz=_turned(refinement.couplings_hz, rows),
        coupling_sds_hz=_turned(refinement.coupling_sds_hz, rows),
        determined=_turned_flags(refinement.determined, rows),
        claim_lines=tuple(
            replace(one, claim=names.get(one.claim, one.claim))
            for one in refinement.claim_lines
        ),
    )
