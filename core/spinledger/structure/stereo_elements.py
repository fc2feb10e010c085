"""Centres, planes and axes: every place where the arrangement in space is fixed.

A position is a neighbour's atom index, FIRST_H or SECOND_H for the two hydrogens
of an XH2 group (in the order in which AddHs appends them), or LONE for a single
hydrogen or a lone pair.
"""

from __future__ import annotations

import functools
from dataclasses import dataclass
from typing import Final

from rdkit import Chem

from spinledger.structure.mobility import slow_bonds

FIRST_H: Final = -1
SECOND_H: Final = -2
LONE: Final = -3

# How much an ortho substituent hinders an aryl-aryl axis (from memory, after
# apparent van der Waals sizes; a methyl group is 1). From a sum of 2 on, with
# both rings taking part, rotation is slow on the time scale of shifts.
_LOCKING_SIZE: Final = 2.0
_LEAST_SIZE: Final = 0.6
# Substituents on a five-ring point away from the axis.
_FIVE_RING_FACTOR: Final = 0.7
_SIZES: Final = {9: 0.3, 8: 0.6, 7: 0.8, 6: 1.0, 16: 1.0, 17: 1.0, 35: 1.2, 53: 1.4}
_ARYL_AXES: Final = "[$([c,n]),$([NX3](C=O)[#6])]-!@[$([c,n]);r]"
# Double bonds that turn easily although drawn as double: cationic amidines.
_TURNING: Final = "[$([NX3+]=C[NX3]),$([NX2,NX3]=C([NX3])[NX3]),$([NX2H]=C[NX3])]=C"


@dataclass(frozen=True, slots=True, kw_only=True)
class Centre:
    """A tetrahedral arrangement.

    ``sign`` is +1 if, seen from the first position, the other three run
    counter-clockwise.
    """

    positions: tuple[int, ...]
    sign: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Link:
    """A plane (alkene, slow amide) or an axis (allene, hindered biaryl).

    Attributes
    ----------
    ends : (int, int)
        The two atoms; of a cumulene the outer ones.
    positions : (tuple of int, tuple of int)
        The two positions at each end.
    sign : int
        Plane: +1 if the first positions of both ends are cis. Axis: handedness.
    is_axis : bool
        An axis changes its sign in the mirror, a plane does not.
    kind : str
    """

    ends: tuple[int, int]
    positions: tuple[tuple[int, int], tuple[int, int]]
    sign: int
    is_axis: bool
    kind: str


@dataclass(frozen=True, slots=True, kw_only=True)
class StereoElements:
    """All centres, by atom, and links of a molecule."""

    centres: dict[int, Centre]
    links: tuple[Link, ...]


def stereo_elements(
    mol: Chem.Mol, temperature_k: float | None = None
) -> StereoElements:
    """Find every stereo element, stereogenic or not.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit, chiral tags and double-bond stereo where known.
    temperature_k : float, K, optional
        Decides which amide bonds are slow.

    Notes
    -----
    Centres that are not stereogenic get an arbitrary sign, which only says
    which of two like neighbours is which. The same holds for open
    stereocentres: one of the possible configurations is taken.
    """
    centres = {
        atom.GetIdx(): centre
        for atom in mol.GetAtoms()
        if (centre := _centre(mol, atom)) is not None
    }
    return StereoElements(
        centres=centres,
        links=(
            *_double_bonds(mol),
            *_slow_planes(mol, temperature_k),
            *_hindered_axes(mol),
        ),
    )


def _centre(mol: Chem.Mol, atom: Chem.Atom) -> Centre | None:
    positions = [bond.GetOtherAtomIdx(atom.GetIdx()) for bond in atom.GetBonds()]
    if not _is_tetrahedral(atom):
        return None
    hydrogens = atom.GetTotalNumHs()
    if len(positions) == 2 and hydrogens == 2:
        positions += [FIRST_H, SECOND_H]
    elif len(positions) == 3:
        positions.append(LONE)
    if len(positions) != 4 or _is_rotor(mol, atom, positions):
        return None
    is_clockwise = atom.GetChiralTag() == Chem.ChiralType.CHI_TETRAHEDRAL_CW
    return Centre(positions=tuple(positions), sign=-1 if is_clockwise else 1)


def _is_tetrahedral(atom: Chem.Atom) -> bool:
    """Whether the arrangement about an atom is kept on this time scale."""
    number, total = atom.GetAtomicNum(), atom.GetTotalDegree()
    if atom.GetIsAromatic():
        return False
    is_tagged = atom.GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED
    if number in (6, 14, 32, 50):
        return bool(total == 4)
    if number == 15:
        return total in (3, 4)
    if number in (16, 34, 52):
        return total == 4 or (total == 3 and atom.GetTotalValence() != 2)
    if number == 7:
        # Quaternary nitrogen keeps its form; amines invert unless drawn fixed.
        return bool((total == 4 and atom.GetTotalNumHs() == 0) or is_tagged)
    return bool(number == 5 and total == 4)


def _is_rotor(mol: Chem.Mol, atom: Chem.Atom, positions: list[int]) -> bool:
    """Whether this is a CH2D group, whose hydrogens rotation makes alike."""
    if atom.GetTotalNumHs() != 2:
        return False
    heavy = [p for p in positions if p >= 0 and _is_heavy(mol, p)]
    return len(heavy) <= 1


def _is_heavy(mol: Chem.Mol, index: int) -> bool:
    return bool(mol.GetAtomWithIdx(index).GetAtomicNum() > 1)


def _side_positions(atom: Chem.Atom, excluded: int) -> tuple[int, int] | None:
    """The two positions of a trigonal end besides the bond itself."""
    found = [n.GetIdx() for n in atom.GetNeighbors() if n.GetIdx() != excluded]
    hydrogens = atom.GetTotalNumHs()
    if not found and hydrogens == 2:
        return (FIRST_H, SECOND_H)
    if len(found) == 1:
        return (found[0], LONE)
    return (found[0], found[1]) if len(found) == 2 and not hydrogens else None


def _double_bonds(mol: Chem.Mol) -> list[Link]:
    turning = {
        frozenset(match) for match in mol.GetSubstructMatches(_pattern(_TURNING))
    }
    links = []
    for bond in mol.GetBonds():
        if bond.GetBondType() != Chem.BondType.DOUBLE or _in_small_ring(mol, bond):
            continue
        ends = (bond.GetBeginAtomIdx(), bond.GetEndAtomIdx())
        if frozenset(ends) in turning:
            continue
        chain = _cumulene(mol, *ends)
        if chain is None or chain[0] > chain[-1]:
            continue
        link = _along_chain(mol, chain, bond)
        if link is not None and link not in links:
            links.append(link)
    return links


def _in_small_ring(mol: Chem.Mol, bond: Chem.Bond) -> bool:
    size = mol.GetRingInfo().MinBondRingSize(bond.GetIdx())
    return 0 < size < 8


def _cumulene(mol: Chem.Mol, begin: int, end: int) -> list[int] | None:
    """Atoms of the whole cumulated chain through a double bond."""
    chain = [begin, end]
    for side in (-1, 0):
        while True:
            inner, tip = (chain[-2], chain[-1]) if side else (chain[1], chain[0])
            following = _next_cumulated(mol.GetAtomWithIdx(tip), inner)
            if following is None or following in chain:
                break
            chain.insert(len(chain) if side else 0, following)
    return chain if chain[0] < chain[-1] else chain[::-1]


def _next_cumulated(atom: Chem.Atom, inner: int) -> int | None:
    if atom.GetAtomicNum() != 6:
        return None
    for bond in atom.GetBonds():
        other = bond.GetOtherAtomIdx(atom.GetIdx())
        if other != inner and bond.GetBondType() == Chem.BondType.DOUBLE:
            return int(other)
    return None


def _along_chain(mol: Chem.Mol, chain: list[int], bond: Chem.Bond) -> Link | None:
    first, last = chain[0], chain[-1]
    sides = (
        _side_positions(mol.GetAtomWithIdx(first), chain[1]),
        _side_positions(mol.GetAtomWithIdx(last), chain[-2]),
    )
    if sides[0] is None or sides[1] is None:
        return None
    is_axis = len(chain) % 2 == 1
    sign = 1 if len(chain) > 2 else _bond_sign(bond, first, (sides[0], sides[1]))
    return Link(
        ends=(first, last),
        positions=(sides[0], sides[1]),
        sign=sign,
        is_axis=is_axis,
        kind="cumulene" if len(chain) > 2 else "alkene",
    )


def _bond_sign(
    bond: Chem.Bond, first: int, sides: tuple[tuple[int, int], tuple[int, int]]
) -> int:
    """Return +1 if the first positions of both sides are cis, or that is open."""
    stereo = bond.GetStereo()
    cis = (Chem.BondStereo.STEREOZ, Chem.BondStereo.STEREOCIS)
    trans = (Chem.BondStereo.STEREOE, Chem.BondStereo.STEREOTRANS)
    if stereo not in (*cis, *trans):
        return 1
    references = list(bond.GetStereoAtoms())
    if bond.GetBeginAtomIdx() != first:
        references.reverse()
    sign = 1 if stereo in cis else -1
    for reference, side in zip(references, sides, strict=True):
        if reference != side[0]:
            sign = -sign
    return sign


def _slow_planes(mol: Chem.Mol, temperature_k: float | None) -> list[Link]:
    links = []
    for slow in slow_bonds(mol, temperature_k):
        carbon, nitrogen = slow.atoms
        sides = (
            _side_positions(mol.GetAtomWithIdx(carbon), nitrogen),
            _side_positions(mol.GetAtomWithIdx(nitrogen), carbon),
        )
        if sides[0] is None or sides[1] is None:
            continue
        links.append(
            Link(
                ends=slow.atoms,
                positions=(sides[0], sides[1]),
                sign=1,
                is_axis=False,
                kind=slow.kind,
            )
        )
    return links


def _hindered_axes(mol: Chem.Mol) -> list[Link]:
    links = []
    for first, last in mol.GetSubstructMatches(_pattern(_ARYL_AXES)):
        left = _side_positions(mol.GetAtomWithIdx(first), last)
        right = _side_positions(mol.GetAtomWithIdx(last), first)
        if left is None or right is None:
            continue
        sizes = (
            sum(_ortho_size(mol, first, i) for i in left),
            sum(_ortho_size(mol, last, i) for i in right),
        )
        if min(sizes) >= _LEAST_SIZE and sum(sizes) >= _LOCKING_SIZE:
            links.append(
                Link(
                    ends=(first, last),
                    positions=(left, right),
                    sign=1,
                    is_axis=True,
                    kind="hindered axis",
                )
            )
    return links


def _ortho_size(mol: Chem.Mol, end: int, position: int) -> float:
    """Size of what stands next to the axis on the atom at one position."""
    if position < 0:
        return 0.0
    atom = mol.GetAtomWithIdx(position)
    if mol.GetAtomWithIdx(end).GetAtomicNum() == 7 and not atom.GetIsAromatic():
        return 1.0  # the acyl and alkyl groups of an anilide
    ring = mol.GetRingInfo()
    outside = [
        n
        for n in atom.GetNeighbors()
        if n.GetIdx() != end and not ring.AreAtomsInSameRing(n.GetIdx(), end)
    ]
    if not outside:
        return 0.0
    size = max(_SIZES.get(n.GetAtomicNum(), 1.2) for n in outside)
    return size * (_FIVE_RING_FACTOR if ring.IsAtomInRingOfSize(end, 5) else 1.0)


@functools.cache
def _pattern(smarts: str) -> Chem.Mol:
    return Chem.MolFromSmarts(smarts)


@dataclass(frozen=True, slots=True, kw_only=True)
class TerminalAlkene:
    """A C=CH2 end: what stands cis and trans to its first hydrogen.

    ``cis`` and ``trans`` are None for a hydrogen.
    """

    outer: int
    inner: int
    cis: int | None
    trans: int | None


def terminal_alkenes(mol: Chem.Mol) -> tuple[TerminalAlkene, ...]:
    """All C=CH2 and N=CH2 groups whose two hydrogens have unlike sides."""
    found = []
    for link in _double_bonds(mol):
        if link.kind != "alkene":
            continue
        for outer, inner, own, other in (
            (*link.ends, *link.positions),
            (*link.ends[::-1], *link.positions[::-1]),
        ):
            if FIRST_H in own and FIRST_H not in other:
                cis, trans = other if link.sign > 0 else other[::-1]
                found.append(
                    TerminalAlkene(
                        outer=outer,
                        inner=inner,
                        cis=cis if cis >= 0 else None,
                        trans=trans if trans >= 0 else None,
                    )
                )
    return tuple(found)
