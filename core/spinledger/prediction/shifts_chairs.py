"""What stands axial and equatorial about the protons of a saturated six-ring."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
import numpy.typing as npt
from rdkit import Chem

from spinledger.structure.chairs import ChairRing, chair_rings
from spinledger.structure.stereo_elements import FIRST_H, LONE, SECOND_H

_HYDROGENS: Final = (FIRST_H, SECOND_H, LONE)
N_CHAIR_FEATURES: Final = 16
_ANY: Final = 0
_PREFERENCE: Final = 1
_SYN: Final = 2
_ALPHA: Final = 4
_BETA: Final = 8


def chair_features(mol: Chem.Mol, atoms: Sequence[int]) -> npt.NDArray[np.float64]:
    """Surroundings of ring protons in the chairs of their ring.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    atoms : sequence of int

    Returns
    -------
    numpy.ndarray, shape (len(atoms), 16)
        Number of chairs; excess of the axial over the equatorial place, of the
        more axial proton where there are two; carbon and other groups syn-axial
        to it; groups one bond along the ring by (proton axial or equatorial,
        group axial or equatorial) for carbon, then others (8 numbers); of
        groups two bonds along that are equatorial, the number for carbon and
        others by the proton's place (4). Zero outside such rings. Weighed by
        the shares of the chairs.
    """
    out = np.zeros((len(atoms), N_CHAIR_FEATURES))
    rows: dict[int, list[int]] = {}
    for row, index in enumerate(atoms):
        rows.setdefault(index, []).append(row)
    for ring in chair_rings(mol):
        for place, index in enumerate(ring.atoms):
            if index in rows and (proton := _proton(ring, place)) is not None:
                out[rows[index]] += _seen_from(mol, ring, place, proton)
    return out


def _proton(ring: ChairRing, place: int) -> int | None:
    """The proton of a ring atom that is the more axial one."""
    protons = [p for p in ring.faces[place] if p in _HYDROGENS]
    return max(protons, key=lambda p: (ring.axial_share(place, p), p), default=None)


def _seen_from(
    mol: Chem.Mol, ring: ChairRing, place: int, proton: int
) -> npt.NDArray[np.float64]:
    out = np.zeros(N_CHAIR_FEATURES)
    out[_ANY] = 1.0
    out[_PREFERENCE] = 2.0 * ring.axial_share(place, proton) - 1.0
    size = len(ring.atoms)
    for chair, share in enumerate(ring.shares):
        is_equatorial = not ring.is_axial(place, proton, chair)
        for other in range(size):
            step = min((other - place) % size, (place - other) % size)
            for group in ring.faces[other]:
                if group < 0 or step not in (1, 2):
                    continue
                kind = int(mol.GetAtomWithIdx(group).GetAtomicNum() != 6)
                group_axial = ring.is_axial(other, group, chair)
                slot = _slot(step, is_equatorial, group_axial, kind)
                if slot is not None:
                    out[slot] += share
    return out


def _slot(step: int, is_equatorial: bool, group_axial: bool, kind: int) -> int | None:
    if step == 1:
        return _ALPHA + 4 * kind + 2 * int(is_equatorial) + int(not group_axial)
    if group_axial:
        # An equatorial proton does not see the axial groups two bonds along.
        return None if is_equatorial else _SYN + kind
    return _ALPHA + _BETA + 2 * kind + int(is_equatorial)
