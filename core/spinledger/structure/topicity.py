"""Proton groups: what has one shift, and inside it what acts as one particle."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Collection, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Final

from rdkit import Chem

from spinledger.structure.symmetry import Site, Symmetry

_FURTHEST_COUPLING_BONDS: Final = 3
_FURTHEST_PI_COUPLING_BONDS: Final = 5
_HETERO_SPINS: Final = (9, 15)


@dataclass(frozen=True, slots=True, kw_only=True)
class ProtonGroup:
    """Chemically equivalent protons.

    Attributes
    ----------
    hydrogens : tuple of int
        Indices in the molecule with hydrogens appended.
    carriers : tuple of int
        Heavy atoms that carry them.
    particles : tuple of tuple of int
        Magnetically equivalent parts of ``hydrogens``.
    partners : tuple of int
        Other groups on the same atoms (diastereotopic, or the two sides of an
        alkene or amide).
    relation : str
        How the two hydrogens of one carrier are related: "homotopic",
        "enantiotopic", "diastereotopic", or "" where there are not two.
    """

    hydrogens: tuple[int, ...]
    carriers: tuple[int, ...]
    particles: tuple[tuple[int, ...], ...]
    partners: tuple[int, ...]
    relation: str


def proton_groups(
    mol: Chem.Mol, *, temperature_k: float | None = None
) -> tuple[ProtonGroup, ...]:
    """Groups of chemically equivalent protons, by carrier.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit, every centre settled
        (:func:`spinledger.structure.settled.settled`).
    temperature_k : float, K, optional
        Decides which amide bonds turn slowly; 298 K where it is not known.

    Returns
    -------
    tuple of ProtonGroup
        In the order of the first carrier.

    Notes
    -----
    Substitution test over the average of fast motion: homotopic and
    enantiotopic protons share a shift, diastereotopic ones do not. Magnetic
    equivalence asks the same of pairs: two protons are one particle if each
    has, by symmetry or fast rotation, the same coupling to every other spin.
    """
    symmetry = Symmetry(mol, temperature_k=temperature_k)
    classes = site_classes(symmetry)
    hydrogens = site_hydrogens(mol, symmetry)
    members = [tuple(h for site in group for h in hydrogens[site]) for group in classes]
    carriers = [tuple(sorted({atom for atom, _ in group})) for group in classes]
    parts = _Particles(mol, symmetry, hydrogens)
    return tuple(
        ProtonGroup(
            hydrogens=members[index],
            carriers=carriers[index],
            particles=parts.of(group),
            partners=tuple(
                other
                for other, atoms in enumerate(carriers)
                if other != index and set(atoms) & set(carriers[index])
            ),
            relation=_geminal_relation(symmetry, group[0]),
        )
        for index, group in enumerate(classes)
    )


def site_hydrogens(mol: Chem.Mol, symmetry: Symmetry) -> dict[Site, tuple[int, ...]]:
    """Indices of the hydrogens of every site once AddHs has appended them."""
    place = mol.GetNumAtoms()
    by_atom: dict[int, tuple[int, ...]] = {}
    for atom in mol.GetAtoms():
        count = atom.GetTotalNumHs()
        by_atom[atom.GetIdx()] = tuple(range(place, place + count))
        place += count
    split: dict[int, int] = defaultdict(int)
    found: dict[Site, tuple[int, ...]] = {}
    for atom_index, slot in symmetry.sites():
        if atom_index in symmetry.slotted:
            found[atom_index, slot] = (by_atom[atom_index][split[atom_index]],)
            split[atom_index] += 1
        else:
            found[atom_index, slot] = by_atom[atom_index]
    return found


def site_classes(symmetry: Symmetry) -> list[list[Site]]:
    """Proton sites, parted into sets of equal shift."""
    classes: list[list[Site]] = []
    for site in symmetry.sites():
        for known in classes:
            if symmetry.are_equivalent(known[0], site):
                known.append(site)
                break
        else:
            classes.append([site])
    return classes


def _geminal_relation(symmetry: Symmetry, site: Site) -> str:
    same = [other for other in symmetry.sites() if other[0] == site[0]]
    return symmetry.relation(*same) if len(same) == 2 else ""


class _Particles:
    """Magnetic equivalence inside the groups of one molecule."""

    def __init__(
        self,
        mol: Chem.Mol,
        symmetry: Symmetry,
        hydrogens: dict[Site, tuple[int, ...]],
    ) -> None:
        self.mol = mol
        self.symmetry = symmetry
        self.hydrogens = hydrogens
        self.distances = Chem.GetDistanceMatrix(mol)
        self.spins = [*symmetry.sites(), *_hetero_sites(mol)]

    def of(self, group: Sequence[Site]) -> tuple[tuple[int, ...], ...]:
        """Hydrogens of a group, parted into particles."""
        parts: list[list[Site]] = [list(group)]
        while True:
            finer = [piece for part in parts for piece in self._split(part)]
            if len(finer) == len(parts):
                break
            parts = finer
        return tuple(
            tuple(h for site in part for h in self.hydrogens[site]) for part in parts
        )

    def _split(self, part: Sequence[Site]) -> list[list[Site]]:
        pieces: list[list[Site]] = []
        outside = [spin for spin in self.spins if spin not in part]
        for site in part:
            for piece in pieces:
                if self._couple_alike(piece[0], site, outside):
                    piece.append(site)
                    break
            else:
                pieces.append([site])
        return pieces

    def _couple_alike(self, first: Site, second: Site, outside: Sequence[Site]) -> bool:
        return all(
            self._pairs_alike(first, second, spin)
            for spin in outside
            if self._may_couple(first, spin) or self._may_couple(second, spin)
        )

    def _pairs_alike(self, first: Site, second: Site, spin: Site) -> bool:
        return self.symmetry.are_pairs_equivalent((first, spin), (second, spin))

    def _may_couple(self, first: Site, second: Site) -> bool:
        between = int(self.distances[first[0]][second[0]])
        hetero = self._is_hetero(first) + self._is_hetero(second)
        bonds = between + 2 - hetero
        if bonds > _FURTHEST_PI_COUPLING_BONDS:
            return False
        if bonds <= _FURTHEST_COUPLING_BONDS or hetero:
            return True
        return self._path_is_rigid(first[0], second[0], bonds)

    def _is_hetero(self, spin: Site) -> bool:
        return bool(
            self.mol.GetAtomWithIdx(spin[0]).GetAtomicNum() in _HETERO_SPINS
            and spin not in self.hydrogens
        )

    def _path_is_rigid(self, first: int, second: int, bonds: int) -> bool:
        """Whether a coupling over four or five bonds is to be reckoned with.

        Through a pi system, or along a zigzag in a ring (four bonds).
        """
        path = Chem.GetShortestPath(self.mol, first, second)
        steps = [self.mol.GetBondBetweenAtoms(*ends) for ends in pairwise(path)]
        if any(bond.GetBondTypeAsDouble() > 1 for bond in steps):
            return True
        return bonds == 4 and all(bond.IsInRing() for bond in steps)


def _hetero_sites(mol: Chem.Mol) -> list[Site]:
    return [(atom.GetIdx(), 0) for atom in mol.GetAtoms() if is_hetero_spin(atom)]


def is_hetero_spin(atom: Chem.Atom) -> bool:
    """Whether an atom is 19F or 31P, which couple to protons."""
    return atom.GetAtomicNum() in _HETERO_SPINS


def hetero_particles(
    mol: Chem.Mol, carriers: Collection[int]
) -> tuple[tuple[str, tuple[int, ...]], ...]:
    """Fluorine and phosphorus near protons, parted into like sets.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit, settled.
    carriers : collection of int
        Atoms whose protons are looked at.

    Returns
    -------
    tuple of (str, tuple of int)
        Nucleus ("19F", "31P") and the atoms that act as one particle.
    """
    symmetry = Symmetry(mol)
    distances = Chem.GetDistanceMatrix(mol)
    near = [
        site
        for site in _hetero_sites(mol)
        if any(
            distances[site[0]][c] + 1 <= _FURTHEST_PI_COUPLING_BONDS for c in carriers
        )
    ]
    protons = [site for site in symmetry.sites() if site[0] in carriers]
    parts: list[list[Site]] = []
    for site in near:
        for part in parts:
            if all(
                symmetry.are_pairs_equivalent((part[0], p), (site, p)) for p in protons
            ):
                part.append(site)
                break
        else:
            parts.append([site])
    return tuple(
        (
            "19F" if mol.GetAtomWithIdx(part[0][0]).GetAtomicNum() == 9 else "31P",
            tuple(index for index, _ in part),
        )
        for part in parts
    )
