"""Free sugars: rings and anomers that water holds besides the drawn one."""

from __future__ import annotations

import functools
from collections.abc import Collection, Iterator
from dataclasses import dataclass
from typing import Final

from rdkit import Chem

_CW: Final = Chem.ChiralType.CHI_TETRAHEDRAL_CW
_CCW: Final = Chem.ChiralType.CHI_TETRAHEDRAL_CCW

# Composition in D2O at about 30 degC: S. J. Angyal, Adv. Carbohydr. Chem.
# Biochem. 42 (1984) 15-68, doi:10.1016/S0065-2318(08)60122-5 (from memory).
# Share of alpha among the pyranoses of aldohexoses, by the faces of O2, O3, O4
# against the exocyclic carbon (+1 cis): gluco, manno, galacto, allo, gulo, altro,
# ido, talo.
_ALPHA_SHARES: Final = {
    (-1, 1, -1): 0.37,
    (1, 1, -1): 0.66,
    (-1, 1, 1): 0.32,
    (-1, -1, -1): 0.15,
    (-1, -1, 1): 0.17,
    (1, -1, -1): 0.40,
    (1, -1, 1): 0.52,
    (1, 1, 1): 0.54,
}
_ALPHA_SD: Final = 0.06
_AMINO_ALPHA: Final = (0.60, 0.08)  # 2-amino and 2-acetamido sugars
# Forms as (ring size, anomeric O cis (+1) or trans (-1) to the O beside it), with
# shares: ribose, fructose, other aldopentoses, anything else.
_RIBO: Final = {(6, -1): 0.585, (6, 1): 0.215, (5, -1): 0.135, (5, 1): 0.065}
_FRUCTO: Final = {(6, 1): 0.68, (5, 1): 0.25, (5, -1): 0.07}
_PENTO: Final = {(6, -1): 0.66, (6, 1): 0.34}
_OTHER: Final = {(6, -1): 0.55, (6, 1): 0.45}
_TABLE_SD: Final = 0.06
_GUESS_SD: Final = 0.15
_LEAST_SHARE: Final = 0.05


@dataclass(frozen=True, slots=True, kw_only=True)
class SugarForm:
    """One ring form with its expected share."""

    mol: Chem.Mol
    name: str
    share: float
    share_sd: float


@dataclass(frozen=True, slots=True, kw_only=True)
class _Sugar:
    """Parts of a free sugar.

    Attributes
    ----------
    chain : tuple of int
        Carbons from the anomeric one on.
    head : int
        Carbons before the anomeric one (0 for aldoses, 1 for ketoses).
    hydroxyl : int
        Free oxygen on the anomeric carbon.
    bridge : int or None
        Ring oxygen as drawn; None for an open chain.
    """

    chain: tuple[int, ...]
    head: int
    hydroxyl: int
    bridge: int | None


def sugar_forms(mol: Chem.Mol) -> tuple[SugarForm, ...]:
    """Forms of a free sugar in water, the drawn one first; empty if it is none.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.

    Returns
    -------
    tuple of SugarForm
        Same heavy atoms in the same order; shares sum to 1.

    Notes
    -----
    A free sugar is a hemiacetal in a five- or six-ring with two or more further
    oxygens on it, or an open polyhydroxy aldehyde or ketone. Anomers are the two
    configurations at the hemiacetal carbon; ribose and fructose also change ring
    size. Forms below 5 % are left out.
    """
    sugar = _ring_sugar(mol) or _open_sugar(mol)
    if sugar is None:
        return ()
    made = {
        (size, beside): (form, named)
        for size in (6, 5)
        for form, beside, named in _ring_forms(mol, sugar, size)
    }
    shares, sd = _shares(mol, sugar, made)
    known = {
        key: share
        for key, share in shares.items()
        if key in made and share > _LEAST_SHARE
    }
    total = sum(known.values())
    if len(known) < 2:
        return ()
    drawn = _drawn_key(mol, sugar, made)
    order = sorted(known, key=lambda key: (key != drawn, -known[key]))
    return tuple(
        SugarForm(
            mol=made[key][0],
            name=made[key][1],
            share=known[key] / total,
            share_sd=sd,
        )
        for key in order
    )


_Key = tuple[int, int]
_Made = dict[_Key, tuple[Chem.Mol, str]]


def _ring_sugar(mol: Chem.Mol) -> _Sugar | None:
    for match in mol.GetSubstructMatches(_pattern("[CX4;R]([OX2;R])[OX2H1;!R]")):
        carbon, bridge, hydroxyl = match
        for ring in mol.GetRingInfo().AtomRings():
            if not {carbon, bridge} <= set(ring) or not is_sugar_ring(mol, ring):
                continue
            numbers = sugar_numbers(mol, ring)
            if _n_oxygens(mol, set(ring)) < 3:
                continue
            chain = sorted(numbers, key=lambda i: int(numbers[i]))
            head = chain.index(carbon)
            return _Sugar(
                chain=tuple(chain[head:]), head=head, hydroxyl=hydroxyl, bridge=bridge
            )
    return None


def _n_oxygens(mol: Chem.Mol, ring: set[int]) -> int:
    return sum(_bears_hetero_atom(mol, index, ring) for index in ring)


_OPEN: Final = (
    ("[CX3H1](=O)[CX4]([OX2H1])[CX4]([OX2H1])[CX4]([OX2H1])[CX4][OX2H1]", 0),
    (
        "[CX3](=O)([CH2][OX2H1])[CX4]([OX2H1])[CX4]([OX2H1])[CX4]([OX2H1])[CX4][OX2H1]",
        1,
    ),
)


def _open_sugar(mol: Chem.Mol) -> _Sugar | None:
    for smarts, head in _OPEN:
        match = mol.GetSubstructMatch(_pattern(smarts))
        if not match:
            continue
        carbons = [i for i in match if mol.GetAtomWithIdx(i).GetAtomicNum() == 6]
        chain = [carbons[0], *carbons[1 + head :]]
        while True:
            following = [
                n.GetIdx()
                for n in mol.GetAtomWithIdx(chain[-1]).GetNeighbors()
                if n.GetAtomicNum() == 6 and n.GetIdx() not in chain
            ]
            if len(following) != 1:
                break
            chain.append(following[0])
        return _Sugar(chain=tuple(chain), head=head, hydroxyl=match[1], bridge=None)
    return None


def _ring_forms(
    mol: Chem.Mol, sugar: _Sugar, size: int
) -> Iterator[tuple[Chem.Mol, int, str]]:
    """Both anomers of one ring size: molecule, cis or trans, name."""
    if len(sugar.chain) < size - 1:
        return
    closing = sugar.chain[size - 2]
    oxygen = next(
        (
            n.GetIdx()
            for n in mol.GetAtomWithIdx(closing).GetNeighbors()
            if n.GetAtomicNum() == 8
            and (n.GetTotalNumHs() or n.GetIdx() == sugar.bridge)
        ),
        None,
    )
    if oxygen is None:
        return
    closed = _closed(mol, sugar, oxygen)
    ring = [*sugar.chain[: size - 1], oxygen]
    for tag in (_CCW, _CW):
        form = Chem.Mol(closed)
        form.GetAtomWithIdx(ring[0]).SetChiralTag(tag)
        own = _face(form, ring, 0, {8})
        second = _face(form, ring, 1, {7, 8})
        beside = 0 if own is None or second is None else own * second
        if beside == 0:
            # Without known neighbours the two anomers are told by their tags.
            beside = 1 if tag == _CCW else -1
        yield form, beside, _name(form, ring, sugar, beside)


def _closed(mol: Chem.Mol, sugar: _Sugar, oxygen: int) -> Chem.Mol:
    """The molecule with its hemiacetal ring closed over another oxygen."""
    if oxygen == sugar.bridge:
        return mol
    copy = Chem.RWMol(mol)
    anomeric = sugar.chain[0]
    if sugar.bridge is None:
        copy.GetBondBetweenAtoms(anomeric, sugar.hydroxyl).SetBondType(
            Chem.BondType.SINGLE
        )
    else:
        copy.RemoveBond(anomeric, sugar.bridge)
    copy.AddBond(anomeric, oxygen, Chem.BondType.SINGLE)
    for index in (anomeric, sugar.hydroxyl, oxygen, sugar.bridge):
        if index is not None:
            atom = copy.GetAtomWithIdx(index)
            atom.SetNoImplicit(False)
            atom.SetNumExplicitHs(0)
    plain = copy.GetMol()
    Chem.SanitizeMol(plain)
    return plain


def _name(form: Chem.Mol, ring: list[int], sugar: _Sugar, beside: int) -> str:
    own = _face(form, ring, 0, {8})
    tail = _face(form, ring, len(ring) - 2, {6})
    if sugar.head == 0 and len(ring) == 6 and own is not None and tail is not None:
        return "beta" if own == tail else "alpha"
    kind = "pyranose" if len(ring) == 6 else "furanose"
    first = sugar.head + 1
    side = "cis" if beside > 0 else "trans"
    return f"{kind}, {first},{first + 1}-{side}"


def _shares(
    mol: Chem.Mol, sugar: _Sugar, made: _Made
) -> tuple[dict[_Key, float], float]:
    """Expected share of every form, and its sd."""
    named = {name: key for key, (_, name) in made.items()}
    faces = _pyranose_faces(made, sugar)
    if {"alpha", "beta"} <= set(named):
        alpha, sd = _alpha_share(mol, sugar, faces)
        return {named["alpha"]: alpha, named["beta"]: 1 - alpha}, sd
    if faces is None:
        return _OTHER, _GUESS_SD
    if sugar.head == 0 and len(sugar.chain) == 5:
        is_ribo = faces[0] == faces[1] == faces[2]
        return (_RIBO, _TABLE_SD) if is_ribo else (_PENTO, 0.08)
    if sugar.head == 1 and faces[0] != faces[1] and faces[1] == faces[2]:
        return _FRUCTO, _TABLE_SD
    return _OTHER, _GUESS_SD


def _alpha_share(
    mol: Chem.Mol, sugar: _Sugar, faces: tuple[int, int, int] | None
) -> tuple[float, float]:
    second = mol.GetAtomWithIdx(sugar.chain[1])
    if any(n.GetAtomicNum() == 7 for n in second.GetNeighbors()):
        return _AMINO_ALPHA
    if faces is None:
        return 0.45, _GUESS_SD
    return _ALPHA_SHARES[faces], _ALPHA_SD


def _pyranose_faces(made: _Made, sugar: _Sugar) -> tuple[int, int, int] | None:
    """Faces of the three oxygens after the anomeric carbon, against the tail if any."""
    form = next((form for (size, _), (form, _) in made.items() if size == 6), None)
    if form is None:
        return None
    oxygen = next(
        n.GetIdx()
        for n in form.GetAtomWithIdx(sugar.chain[4]).GetNeighbors()
        if n.GetAtomicNum() == 8 and n.IsInRingSize(6)
    )
    ring = [*sugar.chain[:5], oxygen]
    tail = _face(form, ring, 4, {6}) or 1
    faces = [_face(form, ring, place, {7, 8}) for place in (1, 2, 3)]
    if any(face is None for face in faces):
        return None
    first, second, third = (tail * face for face in faces if face is not None)
    return (first, second, third)


def _drawn_key(mol: Chem.Mol, sugar: _Sugar, made: _Made) -> _Key | None:
    """Form that is drawn, if the drawing is a ring of known configuration."""
    if sugar.bridge is None:
        return None
    text = Chem.MolToSmiles(mol)
    return next(
        (key for key, (form, _) in made.items() if Chem.MolToSmiles(form) == text), None
    )


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
    anomeric = min(ends, key=lambda i: (not _bears_hetero_atom(mol, i, members), i))
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


def _face(
    mol: Chem.Mol, order: list[int], place: int, elements: Collection[int]
) -> int | None:
    """Face of a substituent of one of some elements on a ring atom."""
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
        i
        for i in outside
        if i >= 0 and mol.GetAtomWithIdx(i).GetAtomicNum() in elements
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
