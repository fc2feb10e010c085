"""Couplings of protons to fluorine over two to five bonds, in Hz."""

from __future__ import annotations

import numpy as np

from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame

_STEPS = {1: "ortho", 2: "meta", 3: "para"}


def fluorine(frame: Frame, hydrogen: int, fluorine_atom: int) -> Estimate | None:
    """Coupling of a proton to a fluorine on carbon."""
    a, b = frame.carrier(hydrogen), frame.carrier(fluorine_atom)
    if frame.element(b) != 6 or frame.element(a) != 6:
        return None
    n_bonds = frame.n_bonds(hydrogen, fluorine_atom)
    if n_bonds == 2:
        return _two_bonds(frame, a)
    ring = _aromatic(frame, a, b)
    if ring is not None:
        return ring
    if n_bonds == 3:
        return _three_bonds(frame, hydrogen, fluorine_atom)
    if n_bonds == 4:
        return _four_bonds(frame, a, b)
    return None


def _two_bonds(frame: Frame, carbon: int) -> Estimate:
    if not frame.is_sp3_carbon(carbon):
        return from_table("HF 2J vinyl", "HF geminal", is_rigid=True)
    count = sum(frame.element(n) == 9 for n in frame.others(carbon))
    key = {1: "HF 2J sp3", 2: "HF 2J CHF2"}.get(count, "HF 2J CHF3")
    return from_table(key, "HF geminal", is_rigid=True)


def _aromatic(frame: Frame, a: int, b: int) -> Estimate | None:
    """Both on one ring; or one on the ring and the other on a group at it."""
    ring = frame.aromatic_ring_with(a, b)
    if ring is not None:
        return _on_one_ring(frame, ring, a, b)
    if frame.is_aromatic(b) and frame.is_sp3_carbon(a):
        return _ortho_group(frame, a, b, "HF benzylic 4J")
    if frame.is_aromatic(a) and frame.is_sp3_carbon(b):
        return _ortho_group(frame, b, a, "HF CF3 ortho")
    return None


def _on_one_ring(
    frame: Frame, ring: tuple[int, ...], a: int, b: int
) -> Estimate | None:
    gap = abs(ring.index(a) - ring.index(b))
    steps = min(gap, len(ring) - gap)
    if len(ring) != 6:
        return from_table("HF azine ortho", "HF aromatic", is_rigid=True)
    if any(frame.element(i) != 6 for i in ring) and steps == 1:
        beside = any(frame.element(n) == 7 for n in frame.others(b))
        if beside:
            return from_table("HF azine ortho", "HF aromatic", is_rigid=True)
    return from_table(f"HF {_STEPS[steps]}", "HF aromatic", is_rigid=True)


def _ortho_group(frame: Frame, group: int, ring_atom: int, key: str) -> Estimate | None:
    anchors = [n for n in frame.others(group) if frame.is_aromatic(n)]
    if any(frame.n_bonds(anchor, ring_atom) == 1 for anchor in anchors):
        return from_table(key, "HF aromatic side", is_rigid=False)
    return None


def _three_bonds(frame: Frame, hydrogen: int, fluorine_atom: int) -> Estimate | None:
    a, b = frame.carrier(hydrogen), frame.carrier(fluorine_atom)
    if frame.bond_order(a, b) == 2:
        return _vinyl(frame, hydrogen, a, b, fluorine_atom)
    if frame.is_carbonyl(a):
        return from_table("HF 3J CHO", "HF vicinal", is_rigid=False)
    if not frame.is_sp3_carbon(b):
        return from_table("HF 4J allylic", "HF vicinal", is_rigid=False)
    if frame.ring_size(a, b) and not frame.conformers.is_empty:
        return _in_ring(frame, (hydrogen, a, b, fluorine_atom))
    count = sum(frame.element(n) == 9 for n in frame.others(b))
    key = {1: "HF 3J chain", 2: "HF 3J CF2"}.get(count, "HF 3J CF3")
    return from_table(key, "HF vicinal", is_rigid=False)


def _in_ring(frame: Frame, path: tuple[int, ...]) -> Estimate:
    """Leading terms of the published HCCF equation, halfway damped.

    The substituent terms of the equation lower it by a quarter in common
    rings, which the factor 0.75 stands for (from memory).
    """
    cosine = np.cos(np.radians(frame.dihedral_deg(*path)))
    mean, spread = frame.mean_and_spread(
        0.75 * (40.61 * cosine**2 - 4.22 * cosine + 5.88)
    )
    return Estimate(
        j_hz=mean,
        j_sd_hz=float(np.hypot(5.0, 0.4 * spread)),
        kind="HF vicinal",
        is_rigid=True,
        source="HCCF equation, leading terms [thibaudeau1998]",
    )


def _vinyl(frame: Frame, hydrogen: int, a: int, b: int, fluorine_atom: int) -> Estimate:
    if frame.conformers.is_empty:
        return from_table("HF 3J ring", "HF vinyl", is_rigid=False)
    angle = abs(frame.dihedral_deg(hydrogen, a, b, fluorine_atom)[0])
    side = "cis" if angle < 90 else "trans"
    return from_table(f"HF 3J {side} vinyl", "HF vinyl", is_rigid=True)


def _four_bonds(frame: Frame, a: int, b: int) -> Estimate | None:
    middle = next(path[1] for path in frame.paths(a, b))
    orders = (frame.bond_order(a, middle), frame.bond_order(middle, b))
    if 2 in orders and frame.element(middle) == 6:
        return from_table("HF 4J allylic", "HF allylic", is_rigid=False)
    if frame.is_sp3_carbon(a) and frame.is_sp3_carbon(b):
        return from_table("HF 4J sp3", "HF four bonds", is_rigid=False)
    return None
