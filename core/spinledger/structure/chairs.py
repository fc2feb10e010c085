"""Which groups of a saturated six-ring stand axial, from A values; kcal/mol.

No model in space is made: the two chairs of a ring are weighed by what stands
axial in each.
"""

from __future__ import annotations

import functools
import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from rdkit import Chem

from spinledger.structure.settled import open_centres
from spinledger.structure.stereo_elements import FIRST_H, LONE, SECOND_H

_RT_KCAL: Final = 0.593  # 298 K
_SIZE: Final = 6
# Two groups on one carbon or two syn-axial groups: from memory, 3.7 kcal/mol for
# two methyls less their two A values.
_SYN_AXIAL_KCAL: Final = 1.9
# Both bonds of a trans-fused ring cannot be axial.
_IMPOSSIBLE_KCAL: Final = 10.0
# Preference of electronegative groups beside a ring oxygen for the axial place
# (anomeric effect): E. Juaristi, G. Cuevas, Tetrahedron 48 (1992) 5019,
# doi:10.1016/S0040-4020(01)90118-8; rounded.
_ANOMERIC_KCAL: Final = {7: 0.5, 8: 1.0, 9: 2.0, 17: 2.0, 35: 2.0, 53: 2.0}
# A values: E. L. Eliel, S. H. Wilen, L. N. Mander, Stereochemistry of Organic
# Compounds, Wiley 1994, table 11.7 (from memory, rounded). First match wins.
_A_VALUES_KCAL: Final = (
    ("[CX4](C)(C)C", 4.7),
    ("[CX4;H3]", 1.74),
    ("[CX4;H2]", 1.8),
    ("[CX4]", 2.1),
    ("c", 2.8),
    ("[CX2]#N", 0.2),
    ("[CX2]", 0.5),
    ("[CX3](=O)", 1.3),
    ("[CX3]", 1.6),
    ("[OX2H1]", 0.9),
    ("[#8]", 0.7),
    ("[NX3+](=O)", 1.1),
    ("[#7]", 1.5),
    ("[F]", 0.25),
    ("[Cl,Br,I]", 0.5),
    ("[#16]", 1.1),
    ("[#14,#15,#50]", 2.2),
)
_OTHER_KCAL: Final = 1.5


@dataclass(frozen=True, slots=True, kw_only=True)
class ChairRing:
    """A six-ring with its two chairs.

    Attributes
    ----------
    atoms : tuple of int
        In ring order.
    shares : (float, float)
        Of the first and the second chair.
    faces : tuple of dict
        For each ring atom, position (neighbour's index, FIRST_H, SECOND_H or
        LONE) to +1 or -1, the face of the ring on which it stands.
    """

    atoms: tuple[int, ...]
    shares: tuple[float, float]
    faces: tuple[dict[int, int], ...]

    def is_axial(self, place: int, position: int, chair: int) -> bool:
        """Whether a position is axial in one of the chairs."""
        up = 1 if (place + chair) % 2 == 0 else -1
        return self.faces[place].get(position) == up

    def axial_share(self, place: int, position: int) -> float:
        """Share of the time that a position is axial."""
        return sum(
            share
            for chair, share in enumerate(self.shares)
            if self.is_axial(place, position, chair)
        )


def chair_rings(mol: Chem.Mol) -> tuple[ChairRing, ...]:
    """Six-rings that turn between two chairs, or are held in one.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit. Relative configurations that are not known, or are
        only taken (:func:`spinledger.structure.settled.open_centres`), leave a
        ring out.

    Returns
    -------
    tuple of ChairRing
        Rings of at least five tetrahedral atoms that share at most a bond with
        any other ring.
    """
    rings = [tuple(ring) for ring in mol.GetRingInfo().AtomRings()]
    unknown = open_centres(mol)
    found = []
    for ring in rings:
        if not _is_chair_like(mol, ring, rings):
            continue
        faces = _faces(mol, ring, frozenset(unknown))
        if faces is not None:
            found.append(
                ChairRing(atoms=ring, faces=faces, shares=_shares(mol, ring, faces))
            )
    return tuple(found)


def _is_chair_like(
    mol: Chem.Mol, ring: tuple[int, ...], rings: Sequence[tuple[int, ...]]
) -> bool:
    if len(ring) != _SIZE:
        return False
    if sum(not _is_tetrahedral(mol.GetAtomWithIdx(i)) for i in ring) > 1:
        return False
    return all(other == ring or len(set(other) & set(ring)) <= 2 for other in rings)


def _is_tetrahedral(atom: Chem.Atom) -> bool:
    return bool(atom.GetHybridization() == Chem.HybridizationType.SP3)


def _faces(
    mol: Chem.Mol, ring: tuple[int, ...], unknown: frozenset[int]
) -> tuple[dict[int, int], ...] | None:
    """Faces of all positions; None where the configuration is not known."""
    single = [i for i in ring if _n_outside(mol, ring, i) == 1]
    faces: list[dict[int, int]] = []
    for place, index in enumerate(ring):
        before, after = ring[place - 1], ring[(place + 1) % _SIZE]
        atom = mol.GetAtomWithIdx(index)
        if not _is_tetrahedral(atom):
            faces.append({})
            continue
        seen = _tagged_faces(atom, before, after)
        if seen and index not in unknown:
            faces.append(seen)
        elif _n_outside(mol, ring, index) == 1 and single != [index]:
            return None
        else:
            faces.append(seen or _any_faces(atom, before, after))
    return tuple(faces)


def _n_outside(mol: Chem.Mol, ring: tuple[int, ...], index: int) -> int:
    """Groups outside the ring on a tetrahedral carbon of it."""
    atom = mol.GetAtomWithIdx(index)
    if not _is_tetrahedral(atom) or atom.GetAtomicNum() != 6:
        return 0
    return sum(n.GetIdx() not in ring for n in atom.GetNeighbors())


def _positions(atom: Chem.Atom) -> list[int]:
    order = [bond.GetOtherAtomIdx(atom.GetIdx()) for bond in atom.GetBonds()]
    if len(order) == 2:
        return [*order, FIRST_H, SECOND_H]
    return [*order, LONE] if len(order) == 3 else order


def _any_faces(atom: Chem.Atom, before: int, after: int) -> dict[int, int]:
    outside = [i for i in _positions(atom) if i not in (before, after)]
    return dict(zip(outside, (1, -1), strict=False))


def _tagged_faces(atom: Chem.Atom, before: int, after: int) -> dict[int, int]:
    """Faces by the chiral tag; empty where there is none."""
    sign = {
        Chem.ChiralType.CHI_TETRAHEDRAL_CCW: 1,
        Chem.ChiralType.CHI_TETRAHEDRAL_CW: -1,
    }.get(atom.GetChiralTag())
    order = _positions(atom)
    outside = [i for i in order if i not in (before, after)]
    if sign is None or len(outside) != 2:
        return {}
    places = [order.index(i) for i in (before, after, *outside)]
    swaps = sum(places[i] > places[j] for i in range(4) for j in range(i + 1, 4))
    face = sign if swaps % 2 == 0 else -sign
    return {outside[0]: face, outside[1]: -face}


def _shares(
    mol: Chem.Mol, ring: tuple[int, ...], faces: tuple[dict[int, int], ...]
) -> tuple[float, float]:
    """Boltzmann shares of the two chairs."""
    bare = ChairRing(atoms=ring, shares=(0.5, 0.5), faces=faces)
    first, second = (_energy_kcal(mol, bare, chair) for chair in (0, 1))
    weight = 1.0 / (1.0 + math.exp((first - second) / _RT_KCAL))
    return weight, 1.0 - weight


def _energy_kcal(mol: Chem.Mol, ring: ChairRing, chair: int) -> float:
    axial = [
        (place, position)
        for place, faces in enumerate(ring.faces)
        for position in faces
        if position >= 0 and ring.is_axial(place, position, chair)
    ]
    energy = sum(_axial_kcal(mol, ring.atoms, *item) for item in axial)
    for i, (place, position) in enumerate(axial):
        for other, opposite in axial[i + 1 :]:
            step = min((place - other) % _SIZE, (other - place) % _SIZE)
            if step == 2:
                energy += _SYN_AXIAL_KCAL
            elif step == 1 and _are_in_one_ring(mol, position, opposite):
                energy += _IMPOSSIBLE_KCAL
    return energy


def _axial_kcal(
    mol: Chem.Mol, ring: tuple[int, ...], place: int, position: int
) -> float:
    """What one axial group costs."""
    group = mol.GetAtomWithIdx(position)
    value = _a_values(mol).get(position, _OTHER_KCAL)
    neighbours = (ring[place - 1], ring[(place + 1) % _SIZE])
    if any(mol.GetAtomWithIdx(i).GetAtomicNum() == 8 for i in neighbours):
        value -= _ANOMERIC_KCAL.get(group.GetAtomicNum(), 0.0)
    return value


def _are_in_one_ring(mol: Chem.Mol, first: int, second: int) -> bool:
    return any(
        first in ring and second in ring for ring in mol.GetRingInfo().AtomRings()
    )


def _a_values(mol: Chem.Mol) -> dict[int, float]:
    """A value of every atom as the first one of a group."""
    found: dict[int, float] = {}
    for smarts, value in _A_VALUES_KCAL:
        for match in mol.GetSubstructMatches(_pattern(smarts)):
            found.setdefault(match[0], value)
    return found


@functools.cache
def _pattern(smarts: str) -> Chem.Mol:
    return Chem.MolFromSmarts(smarts)
