"""What the coupling rules ask about a molecule: bonds between nuclei, rings, geometry."""

from __future__ import annotations

from collections.abc import Iterator
from functools import cached_property

import numpy as np
import numpy.typing as npt
from rdkit import Chem

from spinledger.structure.conformers import Ensemble, ensemble
from spinledger.structure.dihedrals import dihedrals_deg

Floats = npt.NDArray[np.float64]


class Frame:
    """One molecule with explicit hydrogens, and its conformers made on demand.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        With explicit hydrogens.
    is_aqueous : bool
    conformers : Ensemble, optional
        Made when a rule first asks for geometry if not given.
    """

    def __init__(
        self, mol: Chem.Mol, *, is_aqueous: bool, conformers: Ensemble | None = None
    ) -> None:
        self.mol = mol
        self.is_aqueous = is_aqueous
        self._given = conformers
        self.rings: tuple[tuple[int, ...], ...] = tuple(
            tuple(ring) for ring in mol.GetRingInfo().AtomRings()
        )
        self._bond_counts = np.asarray(Chem.GetDistanceMatrix(mol))

    @cached_property
    def conformers(self) -> Ensemble:
        """Conformers of the molecule; may be empty."""
        if self._given is not None:
            return self._given
        return ensemble(self.mol, is_aqueous=self.is_aqueous)

    @cached_property
    def constitutional_ranks(self) -> tuple[int, ...]:
        """Symmetry class of every atom without regard to stereo."""
        return tuple(
            Chem.CanonicalRankAtoms(self.mol, breakTies=False, includeChirality=False)
        )

    @cached_property
    def open_rings(self) -> frozenset[tuple[int, ...]]:
        """Rings whose relative configuration the structure leaves open.

        A ring with an unspecified stereocentre and another one, specified or
        not: the conformers show one choice among several.
        """
        centres: dict[int, bool] = {}
        for info in Chem.FindPotentialStereo(self.mol):
            if info.type == Chem.StereoType.Atom_Tetrahedral:
                atom = int(info.centeredOn)
                is_open = info.specified == Chem.StereoSpecified.Unspecified
                centres[atom] = is_open and not self._is_bridgehead(atom)
        return frozenset(
            ring
            for ring in self.rings
            if sum(i in centres for i in ring) > 1
            and any(centres.get(i, False) for i in ring)
        )

    def atom(self, index: int) -> Chem.Atom:
        """RDKit atom of an index."""
        return self.mol.GetAtomWithIdx(index)

    def n_bonds(self, first: int, second: int) -> int:
        """Bonds between two atoms; 0 where they are not connected."""
        count = self._bond_counts[first, second]
        return int(count) if count < 1000 else 0

    def carrier(self, terminal: int) -> int:
        """Atom that a hydrogen or fluorine sits on."""
        return int(self.atom(terminal).GetNeighbors()[0].GetIdx())

    def element(self, index: int) -> int:
        """Atomic number."""
        return int(self.atom(index).GetAtomicNum())

    def n_hydrogens(self, index: int) -> int:
        """Explicit hydrogens (any isotope) on an atom."""
        return len(self.hydrogens(index))

    def hydrogens(self, index: int) -> tuple[int, ...]:
        """Hydrogens on an atom."""
        return tuple(
            int(n.GetIdx())
            for n in self.atom(index).GetNeighbors()
            if n.GetAtomicNum() == 1
        )

    def others(self, index: int, *excluded: int) -> tuple[int, ...]:
        """Neighbours of an atom without the excluded ones and without hydrogens."""
        return tuple(
            int(n.GetIdx())
            for n in self.atom(index).GetNeighbors()
            if n.GetIdx() not in excluded and n.GetAtomicNum() > 1
        )

    def is_sp3_carbon(self, index: int) -> bool:
        """Saturated carbon."""
        atom = self.atom(index)
        return atom.GetAtomicNum() == 6 and atom.GetTotalDegree() == 4

    def is_sp2_carbon(self, index: int) -> bool:
        """Trigonal carbon, aromatic or not."""
        atom = self.atom(index)
        return atom.GetAtomicNum() == 6 and atom.GetTotalDegree() == 3

    def is_aromatic(self, index: int) -> bool:
        """Aromatic by RDKit's model."""
        return bool(self.atom(index).GetIsAromatic())

    def bond_order(self, first: int, second: int) -> float:
        """Bond order, 1.5 for aromatic bonds, 0 where there is no bond."""
        bond = self.mol.GetBondBetweenAtoms(first, second)
        return 0.0 if bond is None else float(bond.GetBondTypeAsDouble())

    def is_carbonyl(self, index: int) -> bool:
        """Carbon doubly bound to oxygen."""
        return self.element(index) == 6 and any(
            self.element(n) == 8 and self.bond_order(index, n) == 2
            for n in self.others(index)
        )

    def ring_with(self, *atoms: int) -> tuple[int, ...] | None:
        """Smallest ring that holds all the atoms."""
        found = [ring for ring in self.rings if all(i in ring for i in atoms)]
        return min(found, key=len) if found else None

    def ring_size(self, *atoms: int) -> int:
        """Size of the smallest ring that holds all the atoms, 0 for none."""
        ring = self.ring_with(*atoms)
        return 0 if ring is None else len(ring)

    def aromatic_ring_with(self, *atoms: int) -> tuple[int, ...] | None:
        """Smallest fully aromatic ring that holds all the atoms."""
        found = [
            ring
            for ring in self.rings
            if all(i in ring for i in atoms) and all(map(self.is_aromatic, ring))
        ]
        return min(found, key=len) if found else None

    def is_bridged(self, ring: tuple[int, ...]) -> bool:
        """Whether a five-ring shares three or more atoms with another small ring."""
        return len(ring) == 5 and any(
            len(set(ring) & set(other)) >= 3
            for other in self.rings
            if set(other) != set(ring) and len(other) <= 6
        )

    def _is_bridgehead(self, atom: int) -> bool:
        """Whether rings that share three atoms or more hold the atom in place."""
        mine = [set(ring) for ring in self.rings if atom in ring]
        return any(
            len(first & second) >= 3
            for index, first in enumerate(mine)
            for second in mine[:index]
        )

    def paths(self, start: int, end: int) -> Iterator[tuple[int, ...]]:
        """All shortest paths between two atoms, ends included."""
        if start == end:
            yield (start,)
            return
        for neighbour in self.atom(start).GetNeighbors():
            index = int(neighbour.GetIdx())
            if self.n_bonds(index, end) == self.n_bonds(start, end) - 1:
                for rest in self.paths(index, end):
                    yield (start, *rest)

    def dihedral_deg(self, *atoms: int) -> Floats:
        """Dihedral of four atoms in every conformer, shape (n_conformers,), degrees."""
        return dihedrals_deg(self.conformers.positions, atoms)

    def mean_and_spread(self, values: Floats) -> tuple[float, float]:
        """Weighted mean and sd over the conformers.

        Parameters
        ----------
        values : numpy.ndarray, shape (n_conformers,)
        """
        weights = self.conformers.weights
        mean = float(weights @ values)
        return mean, float(np.sqrt(weights @ (values - mean) ** 2))
