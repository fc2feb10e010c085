"""Free sugars: the anomer that is not drawn, and how much of each water holds."""

from __future__ import annotations

import functools
from collections.abc import Collection
from dataclasses import dataclass
from typing import Final

from rdkit import Chem

_CW: Final = Chem.ChiralType.CHI_TETRAHEDRAL_CW
_CCW: Final = Chem.ChiralType.CHI_TETRAHEDRAL_CCW

# Share of the alpha-pyranose among the two pyranoses in D2O at 25-31 degC
# (S. J. Angyal, Adv. Carbohydr. Chem. Biochem. 42 (1984) 15-68, from memory).
_GLUCO_ALPHA: Final = (0.36, 0.05)
_MANNO_ALPHA: Final = (0.67, 0.06)
_OTHER_SHARE: Final = (0.45, 0.20)


@dataclass(frozen=True, slots=True, kw_only=True)
class Anomer:
    """One anomer with its expected share."""

    mol: Chem.Mol
    name: str
    share: float
    share_sd: float


def anomers(mol: Chem.Mol) -> tuple[Anomer, Anomer] | None:
    """Drawn anomer and the other one; None if there is no free sugar.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.

    Notes
    -----
    A free sugar is a ring hemiacetal with two or more further oxygens on its
    ring. If its configuration at the anomeric carbon is open, one is taken as
    drawn.
    """
    centre = _anomeric_carbon(mol)
    if centre is None:
        return None
    drawn = Chem.Mol(mol)
    atom = drawn.GetAtomWithIdx(centre)
    if atom.GetChiralTag() not in (_CW, _CCW):
        atom.SetChiralTag(_CCW)
    other = Chem.Mol(drawn)
    other.GetAtomWithIdx(centre).InvertChirality()
    names, shares, sd = _shares(drawn, centre)
    return (
        Anomer(mol=drawn, name=names[0], share=shares[0], share_sd=sd),
        Anomer(mol=other, name=names[1], share=shares[1], share_sd=sd),
    )


def _anomeric_carbon(mol: Chem.Mol) -> int | None:
    for match in mol.GetSubstructMatches(_pattern("[CX4;R]([OX2;R])[OX2H1;!R]")):
        ring = _sugar_ring(mol, match[0], match[1])
        if ring is None:
            continue
        oxygens = sum(
            any(
                n.GetAtomicNum() in (7, 8) and n.GetIdx() not in ring
                for n in mol.GetAtomWithIdx(i).GetNeighbors()
            )
            for i in ring
            if i != match[0]
        )
        if oxygens >= 2:
            return int(match[0])
    return None


def is_sugar_ring(mol: Chem.Mol, ring: Collection[int]) -> bool:
    """Whether a ring is a furanose or pyranose: one oxygen, and oxygens on it.

    Glycosides and nucleosides count; the anomeric carbon bears O, N or S.
    """
    members = set(ring)
    if len(members) not in (5, 6):
        return False
    atoms = [mol.GetAtomWithIdx(i) for i in members]
    if sorted(a.GetAtomicNum() for a in atoms) != [6] * (len(members) - 1) + [8]:
        return False
    if any(a.GetHybridization() != Chem.HybridizationType.SP3 for a in atoms):
        return False
    bearing = [i for i in members if _bears_hetero_atom(mol, i, members)]
    oxygen = next(a for a in atoms if a.GetAtomicNum() == 8)
    beside = {n.GetIdx() for n in oxygen.GetNeighbors()}
    return len(bearing) >= 2 and bool(beside & set(bearing))


def sugar_numbers(mol: Chem.Mol, ring: Collection[int]) -> dict[int, str]:
    """Locants of a sugar: from the anomeric end along the carbons, tail included.

    Parameters
    ----------
    mol : Chem.Mol
    ring : collection of int
        As :func:`is_sugar_ring` accepts.
    """
    members = set(ring)
    oxygen = next(i for i in members if mol.GetAtomWithIdx(i).GetAtomicNum() == 8)
    ends = [
        n.GetIdx()
        for n in mol.GetAtomWithIdx(oxygen).GetNeighbors()
        if n.GetIdx() in members
    ]
    anomeric = min(
        ends, key=lambda i: (not _bears_hetero_atom(mol, i, members), i)
    )
    order = [anomeric]
    while len(order) < len(members) - 1:
        order.append(
            next(
                n.GetIdx()
                for n in mol.GetAtomWithIdx(order[-1]).GetNeighbors()
                if n.GetIdx() in members - {oxygen, *order}
            )
        )
    head = _carbons_outside(mol, order[0], members)[::-1]
    whole = [*head, *order, *_carbons_outside(mol, order[-1], members)]
    return {index: str(place + 1) for place, index in enumerate(whole)}


def _carbons_outside(mol: Chem.Mol, start: int, ring: set[int]) -> list[int]:
    """Open chain of carbons on a ring atom, outwards."""
    chain: list[int] = []
    here, before = start, -1
    while True:
        following = [
            n.GetIdx()
            for n in mol.GetAtomWithIdx(here).GetNeighbors()
            if n.GetAtomicNum() == 6
            and n.GetIdx() not in ring
            and n.GetIdx() != before
            and not n.IsInRing()
        ]
        if len(following) != 1:
            return chain
        before, here = here, following[0]
        chain.append(here)


def _bears_hetero_atom(mol: Chem.Mol, index: int, ring: set[int]) -> bool:
    return any(
        n.GetIdx() not in ring and n.GetAtomicNum() in (7, 8, 9, 16)
        for n in mol.GetAtomWithIdx(index).GetNeighbors()
    )


def _sugar_ring(mol: Chem.Mol, carbon: int, oxygen: int) -> tuple[int, ...] | None:
    for ring in mol.GetRingInfo().AtomRings():
        if carbon in ring and oxygen in ring and len(ring) in (5, 6):
            numbers = [mol.GetAtomWithIdx(i).GetAtomicNum() for i in ring]
            if sorted(numbers) == [6] * (len(ring) - 1) + [8] and all(
                mol.GetAtomWithIdx(i).GetHybridization() == Chem.HybridizationType.SP3
                for i in ring
            ):
                return tuple(ring)
    return None


def _shares(
    mol: Chem.Mol, centre: int
) -> tuple[tuple[str, str], tuple[float, float], float]:
    """Names and shares of the drawn and the other anomer."""
    oxygen = next(
        n.GetIdx()
        for n in mol.GetAtomWithIdx(centre).GetNeighbors()
        if n.GetAtomicNum() == 8 and n.IsInRing()
    )
    ring = _sugar_ring(mol, centre, oxygen)
    faces = _ring_faces(mol, ring, centre) if ring and len(ring) == 6 else None
    if faces is None or faces["tail"] is None or faces["own"] is None:
        share, sd = _OTHER_SHARE
        return ("anomer 1", "anomer 2"), (1 - share, share), sd
    is_manno = faces["second"] is not None and faces["second"] == faces["tail"]
    alpha, sd = _MANNO_ALPHA if is_manno else _GLUCO_ALPHA
    if faces["own"] == faces["tail"]:
        return ("beta", "alpha"), (1 - alpha, alpha), sd
    return ("alpha", "beta"), (alpha, 1 - alpha), sd


def _ring_faces(
    mol: Chem.Mol, ring: tuple[int, ...], centre: int
) -> dict[str, int | None]:
    """Faces of the anomeric OH, the OH next to it and the exocyclic carbon."""
    place = ring.index(centre)
    size = len(ring)
    order = [ring[(place + k) % size] for k in range(size)]
    if mol.GetAtomWithIdx(order[1]).GetAtomicNum() == 8:
        order = [order[0], *order[:0:-1]]
    return {
        "own": _face(mol, order, 0, 8),
        "second": _face(mol, order, 1, 8),
        "tail": _face(mol, order, size - 2, 6),
    }


def _face(mol: Chem.Mol, order: list[int], place: int, element: int) -> int | None:
    """Face of a substituent of one element on a ring atom."""
    size = len(order)
    atom = mol.GetAtomWithIdx(order[place])
    sign = {_CCW: 1, _CW: -1}.get(atom.GetChiralTag())
    if sign is None:
        return None
    before, after = order[place - 1], order[(place + 1) % size]
    around = [bond.GetOtherAtomIdx(atom.GetIdx()) for bond in atom.GetBonds()]
    if len(around) == 3:
        around.append(-1)
    outside = [i for i in around if i not in (before, after)]
    wanted = [
        i for i in outside if i >= 0 and mol.GetAtomWithIdx(i).GetAtomicNum() == element
    ]
    if len(outside) != 2 or len(wanted) != 1:
        return None
    last = next(i for i in outside if i != wanted[0])
    return sign * _parity(around, [before, after, wanted[0], last])


def _parity(first: list[int], second: list[int]) -> int:
    places = [first.index(item) for item in second]
    swaps = sum(
        places[i] > places[j]
        for i in range(len(places))
        for j in range(i + 1, len(places))
    )
    return -1 if swaps % 2 else 1


@functools.cache
def _pattern(smarts: str) -> Chem.Mol:
    return Chem.MolFromSmarts(smarts)
