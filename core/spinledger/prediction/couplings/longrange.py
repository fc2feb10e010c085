"""Four-bond couplings along a planar zigzag of saturated bonds, in Hz."""

from __future__ import annotations

import numpy as np

from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame

#: A zigzag counts when both dihedrals are within this of 180 degrees.
_ANTI_DEG = 25.0
#: Least share of the conformers that must hold the zigzag flat: rings that
#: flip halve a coupling that is hardly resolved as it is.
_LEAST_SHARE = 0.7


def zigzag(frame: Frame, first: int, second: int) -> Estimate | None:
    """W coupling H-C-X-C-H held flat by rings."""
    a, b = frame.carrier(first), frame.carrier(second)
    middles = [path[1] for path in frame.paths(a, b)]
    held = [m for m in middles if _is_held(frame, a, m, b)]
    if not held or frame.conformers.is_empty:
        return None
    shares = [_flat_share(frame, (first, a, m, b, second)) for m in held]
    if max(shares) < _LEAST_SHARE:
        return None
    return from_table(_key(frame, a, held, b), "W", is_rigid=True)


def _is_held(frame: Frame, a: int, middle: int, b: int) -> bool:
    saturated = all(map(frame.is_sp3_carbon, (a, b)))
    return (
        saturated
        and frame.element(middle) in (6, 7, 8, 16)
        and 0 < frame.ring_size(a, middle, b) <= 7
    )


def _flat_share(frame: Frame, path: tuple[int, ...]) -> float:
    first, a, middle, b, second = path
    angles = np.array(
        [
            frame.dihedral_deg(first, a, middle, b),
            frame.dihedral_deg(a, middle, b, second),
        ]
    )
    is_flat = np.all(np.abs(angles) > 180.0 - _ANTI_DEG, axis=0)
    return float(frame.conformers.weights @ is_flat)


def _key(frame: Frame, a: int, middles: list[int], b: int) -> str:
    """Row of the rule table by the number of bridges between the two carbons."""
    if len(middles) >= 3:
        return "W bicyclo[1.1.1]"
    if len(middles) == 2:
        return "W bicyclo[2.1.1]"
    ring = frame.ring_with(a, middles[0], b) or ()
    return "W bicyclo[2.2.1]" if frame.is_bridged(ring) else "W ring"
