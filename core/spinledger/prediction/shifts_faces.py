"""On which face of a ring the substituents stand, seen from a ring proton."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
import numpy.typing as npt
from rdkit import Chem

_KINDS: Final = ("carbon", "oxygen", "other")
_LARGEST_RING: Final = 7
_FURTHEST_STEP: Final = 3


def face_counts(
    mol: Chem.Mol, rings: Sequence[tuple[int, ...]], atoms: Sequence[int]
) -> npt.NDArray[np.float64]:
    """Ring substituents cis and trans to the proton of each atom.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    rings : sequence of tuple of int
        Smallest rings, atoms in ring order.
    atoms : sequence of int

    Returns
    -------
    numpy.ndarray, shape (len(atoms), 18)
        For one, two and three bonds along the ring: number of carbon, oxygen
        and other substituents cis, then trans. Zero where a configuration is
        not known.
    """
    out = np.zeros((len(atoms), _FURTHEST_STEP, len(_KINDS), 2))
    rows: dict[int, list[int]] = {}
    for row, index in enumerate(atoms):
        rows.setdefault(index, []).append(row)
    for ring in rings:
        if len(ring) > _LARGEST_RING:
            continue
        faces = _faces(mol, ring)
        for place, index in enumerate(ring):
            if index in rows and (own := _proton_face(faces[place])) is not None:
                for row in rows[index]:
                    _count(mol, ring, faces, place, own, out[row])
    return out.reshape(len(atoms), -1)


def _count(
    mol: Chem.Mol,
    ring: tuple[int, ...],
    faces: Sequence[dict[int, int]],
    place: int,
    own: int,
    counts: npt.NDArray[np.float64],
) -> None:
    size = len(ring)
    for other in range(size):
        step = min((other - place) % size, (place - other) % size)
        if not 1 <= step <= _FURTHEST_STEP:
            continue
        for substituent, face in faces[other].items():
            if substituent >= 0:
                kind = _kind(mol.GetAtomWithIdx(substituent))
                counts[step - 1, kind, 0 if face == own else 1] += 1


def _kind(atom: Chem.Atom) -> int:
    return {6: 0, 8: 1}.get(atom.GetAtomicNum(), 2)


def _proton_face(faces: dict[int, int]) -> int | None:
    return faces.get(-1)


def _faces(mol: Chem.Mol, ring: tuple[int, ...]) -> list[dict[int, int]]:
    """Face (+1 or -1) of every substituent of every ring atom; -1 is a lone H."""
    size = len(ring)
    return [
        substituent_faces(
            mol.GetAtomWithIdx(ring[place]), ring[place - 1], ring[(place + 1) % size]
        )
        for place in range(size)
    ]


def substituent_faces(atom: Chem.Atom, before: int, after: int) -> dict[int, int]:
    """Face of the two substituents of a ring atom, for one sense of going round.

    Parameters
    ----------
    atom : Chem.Atom
    before, after : int
        Its ring neighbours.

    Returns
    -------
    dict of int to int
        Atom index (-1 for an implicit hydrogen) to +1 or -1; empty where the
        atom has no chiral tag. Only differences between atoms of one ring,
        gone round in one sense, mean anything.
    """
    tag = {
        Chem.ChiralType.CHI_TETRAHEDRAL_CCW: 1,
        Chem.ChiralType.CHI_TETRAHEDRAL_CW: -1,
    }.get(atom.GetChiralTag())
    if tag is None:
        return {}
    order = [bond.GetOtherAtomIdx(atom.GetIdx()) for bond in atom.GetBonds()]
    if len(order) == 3:
        order.append(-1)
    outside = [index for index in order if index not in (before, after)]
    if len(order) != 4 or len(outside) != 2:
        return {}
    sign = tag * _parity(order, [before, after, *outside])
    return {outside[0]: sign, outside[1]: -sign}


def _parity(first: Sequence[int], second: Sequence[int]) -> int:
    """Sign of the permutation that turns one order into the other."""
    places = [first.index(item) for item in second]
    swaps = sum(
        places[i] > places[j]
        for i in range(len(places))
        for j in range(i + 1, len(places))
    )
    return -1 if swaps % 2 else 1
