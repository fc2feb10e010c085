"""What the shift model counts around a proton: typed atoms by distance, rings, faces."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cached_property
from typing import Final

import numpy as np
import numpy.typing as npt
from rdkit import Chem
from rdkit.Chem import rdPartialCharges

from spinledger.prediction.shifts_faces import face_counts
from spinledger.prediction.shifts_types import (
    ATOM_TYPES,
    ELECTRONEGATIVITY,
    TYPE_INDEX,
    atom_type,
    proton_count,
)

Floats = npt.NDArray[np.float64]

FURTHEST_BONDS: Final = 6
_N_TYPES: Final = len(ATOM_TYPES)
_CARBON: Final = ELECTRONEGATIVITY[6]


class Surroundings:
    """Arrays over the atoms of one molecule that every feature is read from.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit, chiral tags and double-bond stereo as known.
    """

    def __init__(self, mol: Chem.Mol) -> None:
        self.mol = mol
        self.atoms: list[Chem.Atom] = list(mol.GetAtoms())
        n_atoms = len(self.atoms)
        self.types = np.array([TYPE_INDEX[atom_type(a)] for a in self.atoms])
        self.one_hot = np.zeros((n_atoms, _N_TYPES))
        self.one_hot[np.arange(n_atoms), self.types] = 1.0
        self.distances = np.asarray(Chem.GetDistanceMatrix(mol))
        self.rings = [tuple(ring) for ring in mol.GetRingInfo().AtomRings()]
        self.is_aromatic = np.array([a.GetIsAromatic() for a in self.atoms], bool)
        self.n_protons = np.array([proton_count(a) for a in self.atoms], float)

    @cached_property
    def aromatic_rings(self) -> list[tuple[int, ...]]:
        """Rings whose atoms are all aromatic."""
        return [r for r in self.rings if all(self.is_aromatic[i] for i in r)]

    @cached_property
    def smallest_rings(self) -> Floats:
        """Size of the smallest ring of every atom, 0 outside rings, 9 for larger."""
        info = self.mol.GetRingInfo()
        return np.array(
            [min(info.MinAtomRingSize(i), 9) for i in range(len(self.atoms))], float
        )

    @cached_property
    def n_rings(self) -> Floats:
        """Number of smallest rings that each atom is in."""
        info = self.mol.GetRingInfo()
        return np.array([info.NumAtomRings(i) for i in range(len(self.atoms))], float)

    @cached_property
    def excess_electronegativity(self) -> Floats:
        """Pauling electronegativity of every atom, less that of carbon."""
        return np.array(
            [ELECTRONEGATIVITY.get(a.GetAtomicNum(), 2.2) - _CARBON for a in self.atoms]
        )

    @cached_property
    def conjugation(self) -> Floats:
        """Adjacency over conjugated, aromatic and multiple bonds."""
        matrix = np.zeros((len(self.atoms), len(self.atoms)))
        for bond in self.mol.GetBonds():
            if bond.GetIsConjugated() or bond.GetBondTypeAsDouble() > 1:
                begin, end = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
                matrix[begin, end] = matrix[end, begin] = 1.0
        return matrix

    @cached_property
    def partial_charges(self) -> tuple[Floats, Floats]:
        """Gasteiger charges of the heavy atoms and of one of their hydrogens."""
        copy = Chem.Mol(self.mol)
        rdPartialCharges.ComputeGasteigerCharges(copy)
        heavy = [a.GetDoubleProp("_GasteigerCharge") for a in copy.GetAtoms()]
        light = [a.GetDoubleProp("_GasteigerHCharge") for a in copy.GetAtoms()]
        per_proton = np.array(light) / np.maximum(self.n_protons, 1.0)
        return _finite(np.array(heavy)), _finite(per_proton)


def feature_matrix(
    around: Surroundings, atoms: Sequence[int]
) -> npt.NDArray[np.float32]:
    """Features of the protons on some atoms.

    Parameters
    ----------
    around : Surroundings
    atoms : sequence of int
        Heavy atoms that carry protons.

    Returns
    -------
    numpy.ndarray of float32, shape (len(atoms), n_features)
    """
    chosen = np.array(atoms, dtype=np.int64)
    blocks = [
        _counts_by_distance(around, chosen),
        _counts_by_conjugation(around, chosen),
        _ring_positions(around, chosen),
        _alkene_positions(around, chosen),
        face_counts(around.mol, around.rings, atoms),
        _atom_scalars(around, chosen),
        _shell_scalars(around, chosen),
        _ring_scalars(around, chosen),
    ]
    return np.hstack(blocks).astype(np.float32)


def _finite(values: Floats) -> Floats:
    return np.nan_to_num(values, nan=0.0, posinf=0.0, neginf=0.0)


def _counts_by_distance(around: Surroundings, chosen: npt.NDArray[np.int64]) -> Floats:
    rows = around.distances[chosen]
    shells = [(rows == k) @ around.one_hot for k in range(1, FURTHEST_BONDS + 1)]
    return np.hstack(shells)


def _counts_by_conjugation(
    around: Surroundings, chosen: npt.NDArray[np.int64]
) -> Floats:
    """Typed atoms by distance over conjugated bonds only.

    The walk starts at the atom itself, or at its conjugated neighbours where
    it is saturated.
    """
    conjugation = around.conjugation
    linked: npt.NDArray[np.bool_] = np.any(conjugation > 0, axis=1)
    start = np.zeros((chosen.size, linked.size), bool)
    start[np.arange(chosen.size), chosen] = True
    bonded = (around.distances[chosen] == 1) & linked
    is_inside = linked[chosen][:, None]
    seen = start.copy()
    shells = []
    frontier = np.where(is_inside, start, False)
    for k in range(1, FURTHEST_BONDS + 1):
        frontier = (frontier.astype(float) @ conjugation > 0) & ~seen
        if k == 1:
            frontier |= bonded & ~is_inside
        seen |= frontier
        shells.append(frontier @ around.one_hot)
    return np.hstack(shells)


def _ring_positions(around: Surroundings, chosen: npt.NDArray[np.int64]) -> Floats:
    """Substituents at ring distance 0 to 3 in the aromatic rings of each atom."""
    out = np.zeros((chosen.size, 4, _N_TYPES))
    for row, index in enumerate(chosen):
        for ring in around.aromatic_rings:
            if index not in ring:
                continue
            place = ring.index(index)
            for offset, member in enumerate(ring):
                step = min((offset - place) % len(ring), (place - offset) % len(ring))
                for neighbour in around.atoms[member].GetNeighbors():
                    if neighbour.GetIdx() not in ring and step <= 3:
                        out[row, step] += around.one_hot[neighbour.GetIdx()]
    return out.reshape(chosen.size, -1)


def _alkene_positions(around: Surroundings, chosen: npt.NDArray[np.int64]) -> Floats:
    """Substituents of a C=C or C=N carbon: geminal, cis, trans, side unknown."""
    out = np.zeros((chosen.size, 4, _N_TYPES))
    for row, index in enumerate(chosen):
        bond = _double_bond(around.atoms[index])
        if bond is None:
            continue
        partner = bond.GetOtherAtom(around.atoms[index])
        geminal = _substituents(around.atoms[index], partner)
        for substituent in geminal:
            out[row, 0] += around.one_hot[substituent]
        for substituent in _substituents(partner, around.atoms[index]):
            side = _side_of_proton(bond, geminal, substituent)
            out[row, side] += around.one_hot[substituent]
    return out.reshape(chosen.size, -1)


def _double_bond(atom: Chem.Atom) -> Chem.Bond | None:
    if atom.GetIsAromatic():
        return None
    for bond in atom.GetBonds():
        if bond.GetBondType() == Chem.BondType.DOUBLE:
            found: Chem.Bond = bond
            return found
    return None


def _substituents(atom: Chem.Atom, partner: Chem.Atom) -> list[int]:
    return [
        n.GetIdx()
        for n in atom.GetNeighbors()
        if n.GetIdx() != partner.GetIdx() and n.GetAtomicNum() > 1
    ]


def _side_of_proton(bond: Chem.Bond, geminal: list[int], substituent: int) -> int:
    """1 where the substituent is cis to the proton, 2 trans, 3 unknown."""
    stereo = bond.GetStereo()
    is_cis = stereo in (Chem.BondStereo.STEREOZ, Chem.BondStereo.STEREOCIS)
    is_trans = stereo in (Chem.BondStereo.STEREOE, Chem.BondStereo.STEREOTRANS)
    if len(geminal) != 1 or not (is_cis or is_trans):
        return 3
    reference = set(bond.GetStereoAtoms())
    if geminal[0] not in reference:
        return 3
    # The stereo atoms are cis (Z) or trans (E); the proton faces the other way.
    cis_to_proton = is_trans == (substituent in reference)
    return 1 if cis_to_proton else 2


def _atom_scalars(around: Surroundings, chosen: npt.NDArray[np.int64]) -> Floats:
    charges, proton_charges = around.partial_charges
    atoms = [around.atoms[i] for i in chosen]
    return np.column_stack(
        [
            around.n_protons[chosen],
            around.types[chosen].astype(float),
            np.array([a.GetDegree() for a in atoms], float),
            around.smallest_rings[chosen],
            around.n_rings[chosen],
            around.is_aromatic[chosen].astype(float),
            np.array([a.GetFormalCharge() for a in atoms], float),
            proton_charges[chosen],
            charges[chosen],
            np.full(chosen.size, float(len(around.atoms))),
            np.full(chosen.size, float(np.mean(around.n_rings > 0))),
            np.full(chosen.size, float(sum(a.GetFormalCharge() for a in around.atoms))),
            _sorted_neighbours(around, chosen, charges, 3),
            _sorted_neighbours(around, chosen, around.types.astype(float), 3),
            _sorted_neighbours(around, chosen, around.smallest_rings, 3),
        ]
    )


def _sorted_neighbours(
    around: Surroundings, chosen: npt.NDArray[np.int64], values: Floats, count: int
) -> Floats:
    """Values of the bonded atoms, largest first, padded with NaN."""
    bonded = around.distances[chosen] == 1
    padded = np.where(bonded, values, -np.inf)
    ordered = -np.sort(-padded, axis=1)[:, :count]
    out = np.full((chosen.size, count), np.nan)
    out[:, : ordered.shape[1]] = np.where(np.isfinite(ordered), ordered, np.nan)
    return out


def _shell_scalars(around: Surroundings, chosen: npt.NDArray[np.int64]) -> Floats:
    """Sums over the shells at one to five bonds."""
    charges, _ = around.partial_charges
    per_atom = np.column_stack(
        [
            around.excess_electronegativity,
            around.n_protons,
            np.ones(len(around.atoms)),
            around.is_aromatic.astype(float),
            (around.n_rings > 0).astype(float),
            charges,
            np.array([a.GetFormalCharge() for a in around.atoms], float),
        ]
    )
    rows = around.distances[chosen]
    return np.hstack([(rows == k) @ per_atom for k in range(1, 6)])


def _ring_scalars(around: Surroundings, chosen: npt.NDArray[np.int64]) -> Floats:
    """Ring sizes around each atom and aromatic rings by distance."""
    rows = around.distances[chosen]
    nearest = [rows[:, list(r)].min(axis=1) for r in around.aromatic_rings]
    aromatic = np.array(nearest).reshape(len(nearest), chosen.size)
    by_distance = [(aromatic == k).sum(axis=0) for k in range(6)]
    own, bonded = np.zeros((chosen.size, 5)), np.zeros((chosen.size, 5))
    for ring in around.rings:
        if 3 <= len(ring) <= 7:
            closest = rows[:, list(ring)].min(axis=1)
            own[:, len(ring) - 3] += closest == 0
            bonded[:, len(ring) - 3] += closest == 1
    return np.hstack([np.column_stack(by_distance), own, bonded])
