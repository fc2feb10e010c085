"""Four-bond couplings along a planar zigzag of saturated bonds, in Hz."""

from __future__ import annotations

import numpy as np

from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame

#: A zigzag counts when both dihedrals are within this of 180 degrees.
_ANTI_DEG = 25.0


def zigzag(frame: Frame, first: int, second: int) -> Estimate | None:
    """W coupling H-C-X-C-H held flat by rings."""
    a, b = frame.carrier(first), frame.carrier(second)
    middles = [path[1] for path in frame.paths(a, b)]
    held = [m for m in middles if _is_held(frame, a, m, b)]
    if not held or frame.conformers.is_empty:
        return None
    flat = sum(_flat_share(frame, (first, a, middle, b, second)) for middle in held)
    estimate = _by_ring(frame, a, b, len(middles))
    return estimate.changed(
        j_hz=estimate.j_hz * flat / len(held),
        j_sd_hz=max(estimate.j_sd_hz * flat / len(held), 0.2),
    )


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


def _by_ring(frame: Frame, a: int, b: int, n_paths: int) -> Estimate:
    rings = [r for r in frame.rings if a in r and b in r]
    sizes = sorted(len(ring) for ring in rings)
    if n_paths == 3:
        key = "W bicyclo[1.1.1]"
    elif n_paths == 2:
        key = "W bicyclo[2.1.1]"
    elif sizes[:1] == [5] and len(_bridging(frame, a, b)) > 1:
        key = "W bicyclo[2.2.1]"
    else:
        key = "W ring"
    return from_table(key, "W", is_rigid=True)


def _bridging(frame: Frame, a: int, b: int) -> list[tuple[int, ...]]:
    """Rings through either carbon that share a bridgehead with another ring."""
    return [r for r in frame.rings if (a in r or b in r) and len(r) in (5, 6)]
