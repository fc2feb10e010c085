"""Ring couplings of beta-ribofuranosides, whose pucker force fields get wrong."""

from __future__ import annotations

import numpy as np

from spinledger.prediction.couplings.frame import Frame


def ribose_key(frame: Frame, a: int, b: int) -> str | None:
    """Row of the rule table for a bond of a ribonucleoside ring.

    Parameters
    ----------
    frame : Frame
    a, b : int
        Neighbouring saturated carbons.

    Returns
    -------
    str or None
        None unless the ring is a furanose with nitrogen at C1, oxygen at C2
        and C3, carbon at C4, and H1 trans to H2, H2 cis to H3, H3 trans to H4.
    """
    ring = frame.ring_with(a, b)
    carbons = None if ring is None else _numbered(frame, ring)
    if carbons is None or not _is_ribo(frame, carbons):
        return None
    places = sorted((carbons.index(a), carbons.index(b)))
    return f"ribose {places[0] + 1}-{places[1] + 1}"


def _numbered(frame: Frame, ring: tuple[int, ...]) -> list[int] | None:
    """C1 to C4 of a ribonucleoside ring."""
    oxygens = [i for i in ring if frame.element(i) == 8]
    if len(ring) != 5 or len(oxygens) != 1:
        return None
    start = ring.index(oxygens[0])
    carbons = [ring[(start + k) % 5] for k in range(1, 5)]
    wanted = [7, 8, 8, 6]
    for numbered in (carbons, carbons[::-1]):
        if _elements_outside(frame, ring, numbered) == wanted:
            return numbered
    return None


def _elements_outside(
    frame: Frame, ring: tuple[int, ...], carbons: list[int]
) -> list[int]:
    found = []
    for carbon in carbons:
        outside = frame.others(carbon, *ring)
        is_plain = len(outside) == 1 and frame.n_hydrogens(carbon) == 1
        found.append(frame.element(outside[0]) if is_plain else 0)
    return found


def _is_ribo(frame: Frame, carbons: list[int]) -> bool:
    if frame.conformers.is_empty:
        return False
    hydrogens = [frame.hydrogens(carbon)[0] for carbon in carbons]
    sides = []
    for k in range(3):
        angle = frame.dihedral_deg(
            hydrogens[k], carbons[k], carbons[k + 1], hydrogens[k + 1]
        )
        # Cis protons of a five-ring stay within 45 degrees of each other;
        # trans ones lie between 75 and 165.
        sides.append(float(np.median(np.abs(angle))) < 60)
    return sides == [False, True, False]
