"""Other starts: like protons exchanged, couplings exchanged, signs turned."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from itertools import combinations

import numpy as np
import numpy.typing as npt

from spinledger.reconcile.refine_values import Start
from spinledger.values.claim import ClaimSet

Floats = npt.NDArray[np.float64]


def alternatives(
    claims: ClaimSet,
    start: Start,
    *,
    within_ppm: float = 0.08,
    most: int = 8,
) -> tuple[Start, ...]:
    """Starts that a fit may not reach from the given one.

    Parameters
    ----------
    claims : ClaimSet
    start : Start
    within_ppm : float, ppm
        Like claims farther apart than this are not exchanged.
    most : int
        At most so many, the closest exchanges first.

    Returns
    -------
    tuple of Start
        Like claims exchanged, then couplings exchanged with the partner that
        they name, then geminal couplings with the other sign. The given start
        is not among them.
    """
    found = [
        exchanged(start, first, second)
        for first, second in close_pairs(claims, start, within_ppm=within_ppm)
    ]
    found += list(_coupling_swaps(claims, start))
    found += list(_sign_turns(claims, start))
    return tuple(found[:most])


def close_pairs(
    claims: ClaimSet, start: Start, *, within_ppm: float
) -> list[tuple[int, int]]:
    """Pairs of present claims with as many protons, nearest first."""
    shifts = np.asarray(start.shifts_ppm)
    present = [
        k
        for k, claim in enumerate(claims.claims)
        if k not in start.absent and claim.visibility != "silent"
    ]
    pairs = []
    for first, second in combinations(present, 2):
        gap = abs(float(shifts[first] - shifts[second]))
        same = claims.claims[first].n_protons == claims.claims[second].n_protons
        if same and 0.0 < gap <= within_ppm:
            pairs.append((gap, first, second))
    return [(first, second) for _, first, second in sorted(pairs)]


def exchanged(start: Start, first: int, second: int) -> Start:
    """The start with two claims in each other's place."""
    shifts = np.array(start.shifts_ppm, dtype=np.float64)
    shifts[[first, second]] = shifts[[second, first]]
    return replace(start, shifts_ppm=shifts)


def _coupling_swaps(claims: ClaimSet, start: Start) -> Iterator[Start]:
    """J with J', and the J of one diastereotopic proton with the other's."""
    for index, coupling in enumerate(claims.couplings):
        other = coupling.swaps_with
        if other is None or other <= index:
            continue
        couplings = np.array(start.couplings_hz, dtype=np.float64)
        if abs(couplings[index] - couplings[other]) < 0.5:
            continue
        couplings[[index, other]] = couplings[[other, index]]
        yield replace(start, couplings_hz=couplings)


def _sign_turns(claims: ClaimSet, start: Start) -> Iterator[Start]:
    for index, coupling in enumerate(claims.couplings):
        if coupling.bonds == 2 and abs(start.couplings_hz[index]) > 1.0:
            couplings = np.array(start.couplings_hz, dtype=np.float64)
            couplings[index] = -couplings[index]
            yield replace(start, couplings_hz=couplings)
