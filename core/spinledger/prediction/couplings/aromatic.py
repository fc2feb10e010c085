"""Couplings within aromatic rings and from their side groups, in Hz."""

from __future__ import annotations

from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame

_STEPS = {1: "ortho", 2: "meta", 3: "para"}
_FIVE_RING_NAMES = {8: "furan", 16: "thiophene", 34: "thiophene", 7: "pyrrole"}


def aromatic(frame: Frame, first: int, second: int) -> Estimate | None:
    """Coupling of two protons on one aromatic ring, or between fused rings."""
    a, b = frame.carrier(first), frame.carrier(second)
    if not (frame.is_aromatic(a) and frame.is_aromatic(b)):
        return None
    ring = frame.aromatic_ring_with(a, b)
    if ring is None:
        return _between_rings(frame, a, b)
    gap = abs(ring.index(a) - ring.index(b))
    steps = min(gap, len(ring) - gap)
    if 7 in (frame.element(a), frame.element(b)):
        return _ring_nh(steps)
    if len(ring) == 5:
        return _five_ring(frame, ring, a, b, steps)
    if len(ring) == 6:
        return _six_ring(frame, ring, a, b, steps)
    return None


def _ring_nh(steps: int) -> Estimate:
    key = "H-N aromatic ring" if steps == 1 else "H-N aromatic ring beta"
    return from_table(key, "NH aromatic", is_rigid=False)


def _six_ring(
    frame: Frame, ring: tuple[int, ...], a: int, b: int, steps: int
) -> Estimate:
    name = _STEPS[steps]
    nitrogens = [i for i in ring if frame.element(i) != 6]
    if nitrogens:
        return from_table(_azine_key(frame, ring, a, b, steps), name, is_rigid=True)
    fused = _fused_key(frame, ring, a, b, steps)
    return from_table(fused or f"benzene {name}", name, is_rigid=True)


def _azine_key(frame: Frame, ring: tuple[int, ...], a: int, b: int, steps: int) -> str:
    beside = sum(
        any(frame.element(n) == 7 and n in ring for n in frame.others(atom))
        for atom in (a, b)
    )
    if steps == 1:
        return "azine ortho next to N" if beside else "azine ortho"
    if steps == 3:
        return "azine para"
    if beside == 2 and any(
        frame.element(n) == 7 and n in frame.others(b) for n in frame.others(a)
    ):
        return "azine meta across N"
    return "azine meta" if beside else "azine meta beta"


def _fused_key(
    frame: Frame, ring: tuple[int, ...], a: int, b: int, steps: int
) -> str | None:
    """Naphthalene-like rings: bond fixation by a six-ring fused to this one."""
    fused = [i for i in ring if _is_fused_aromatic(frame, i, ring)]
    if len(fused) != 2:
        return None
    beside = [any(n in fused for n in frame.others(atom)) for atom in (a, b)]
    if steps == 1:
        return "fused 1-2" if any(beside) else "fused 2-3"
    return "fused meta" if steps == 2 else "fused para"


def _is_fused_aromatic(frame: Frame, atom: int, ring: tuple[int, ...]) -> bool:
    return any(
        atom in other and other != ring and len(other) == 6
        for other in frame.rings
        if all(map(frame.is_aromatic, other))
    )


def _five_ring(
    frame: Frame, ring: tuple[int, ...], a: int, b: int, steps: int
) -> Estimate:
    heteros = [i for i in ring if frame.element(i) != 6]
    kind = "ortho five-ring" if steps == 1 else "meta five-ring"
    if len(heteros) > 1:
        return from_table(_azole_key(frame, heteros, steps), kind, is_rigid=True)
    hetero = heteros[0] if heteros else None
    name = (
        _FIVE_RING_NAMES.get(frame.element(hetero), "pyrrole")
        if hetero is not None
        else "pyrrole"
    )
    beside = [hetero in frame.others(atom) for atom in (a, b)]
    if steps == 1 and name == "pyrrole" and any(beside) and _has_benzo(frame, ring):
        return from_table("indole 2-3", kind, is_rigid=True)
    if steps == 1:
        position = "2-3" if any(beside) else "3-4"
    else:
        position = "2-5" if all(beside) else "2-4"
    return from_table(f"{name} {position}", kind, is_rigid=True)


def _has_benzo(frame: Frame, ring: tuple[int, ...]) -> bool:
    return any(_is_fused_aromatic(frame, atom, ring) for atom in ring)


def _azole_key(frame: Frame, heteros: list[int], steps: int) -> str:
    elements = {frame.element(i) for i in heteros}
    if 16 in elements:
        return "thiazole 4-5" if steps == 1 else "thiazole 2-5"
    if 8 in elements and steps == 1:
        return "oxazole 4-5"
    return "azole ortho" if steps == 1 else "azole meta"


def _between_rings(frame: Frame, a: int, b: int) -> Estimate | None:
    """Five bonds along a zigzag between fused rings, as H4-H8 of naphthalene."""
    if frame.n_bonds(a, b) != 3:
        return None
    for _, c, d, _ in frame.paths(a, b):
        ring_left = frame.aromatic_ring_with(a, c, d)
        ring_right = frame.aromatic_ring_with(c, d, b)
        if ring_left is not None and ring_right is not None:
            return None
    for _, c, d, _ in frame.paths(a, b):
        if frame.is_aromatic(c) and frame.is_aromatic(d):
            shared = frame.aromatic_ring_with(a, c), frame.aromatic_ring_with(d, b)
            if shared[0] and shared[1] and frame.aromatic_ring_with(c, d):
                return from_table("epi zigzag", "five bonds zigzag", is_rigid=True)
    return None


def benzylic(frame: Frame, first: int, second: int) -> Estimate | None:
    """Small coupling of a saturated or formyl CH with a ring proton."""
    a, b = frame.carrier(first), frame.carrier(second)
    if frame.is_aromatic(a):
        a, b = b, a
    if frame.is_aromatic(a) or not frame.is_aromatic(b) or frame.element(b) != 6:
        return None
    anchors = [n for n in frame.others(a) if frame.is_aromatic(n)]
    rings = [(n, frame.aromatic_ring_with(n, b)) for n in anchors]
    found = [(n, ring) for n, ring in rings if ring is not None]
    if len(found) != 1 or frame.element(found[0][0]) != 6:
        return None
    anchor, ring = found[0]
    gap = abs(ring.index(anchor) - ring.index(b))
    steps = min(gap, len(ring) - gap)
    if frame.is_carbonyl(a):
        return _formyl(steps, len(ring))
    if not frame.is_sp3_carbon(a):
        return None
    if len(ring) == 5:
        return (
            from_table("benzylic five-ring", "benzylic", is_rigid=False)
            if steps == 1
            else None
        )
    return from_table(f"benzylic {_STEPS[steps]}", "benzylic", is_rigid=False)


def _formyl(steps: int, size: int) -> Estimate | None:
    if steps == 2 and size == 6:
        return from_table("aldehyde meta", "aldehyde aromatic", is_rigid=False)
    return None
