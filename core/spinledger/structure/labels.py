"""Unique labels of proton groups: "3-HA", "2,6-H", "4-OCH3", "NH"."""

from __future__ import annotations

import re
from collections import Counter, defaultdict
from collections.abc import Sequence

from rdkit import Chem

from spinledger.structure.locants import locants
from spinledger.structure.topicity import ProtonGroup

_LETTERS = "ABCDEFGH"


def group_labels(
    mol: Chem.Mol,
    groups: Sequence[ProtonGroup],
    given: Sequence[str | None] = (),
) -> tuple[str, ...]:
    """One label for each group, all different.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    groups : sequence of ProtonGroup
    given : sequence of (str or None)
        Locants from the file or from clicks, one an atom; may be empty.

    Returns
    -------
    tuple of str

    Notes
    -----
    Given locants win; else templates and chain rules number the carbons.
    Diastereotopic partners, and like groups of one constitution that differ in
    space only, get the letters A and B.
    """
    numbers = [
        (given[i] if i < len(given) else None) or number
        for i, number in enumerate(locants(mol))
    ]
    several = len(Chem.GetMolFrags(mol)) > 1
    raw = [_label(mol, group, numbers) for group in groups]
    if several:
        raw = _told_apart_by_fragment(mol, groups, raw)
    return _unique(_with_letters(_alike(mol, groups, raw), raw))


def _label(mol: Chem.Mol, group: ProtonGroup, numbers: Sequence[str | None]) -> str:
    first = mol.GetAtomWithIdx(group.carriers[0])
    own = [numbers[i] for i in group.carriers]
    if all(own):
        return f"{_joined(own)}-{_proton(first)}"
    formula = _formula(mol, group)
    anchors = sorted(
        {a for i in group.carriers if (a := _anchor(mol, i, numbers)) is not None},
        key=_sort_key,
    )
    return f"{','.join(anchors)}-{formula}" if anchors else formula


def _proton(atom: Chem.Atom) -> str:
    symbol = atom.GetSymbol()
    return "H" if symbol == "C" else f"{symbol}H"


def _joined(locants_: Sequence[str | None]) -> str:
    return ",".join(sorted({text for text in locants_ if text}, key=_sort_key))


def _sort_key(text: str) -> tuple[int, int, str]:
    digits = re.match(r"\d+", text)
    return (text.count("'"), int(digits[0]) if digits else 0, text)


def _anchor(mol: Chem.Mol, index: int, numbers: Sequence[str | None]) -> str | None:
    """Locant of the atom that an unnumbered group hangs on, hetero links included."""
    seen, frontier = {index}, [index]
    for _ in range(2):
        following = []
        for place in frontier:
            for neighbour in mol.GetAtomWithIdx(place).GetNeighbors():
                other = int(neighbour.GetIdx())
                if other in seen:
                    continue
                if (number := numbers[other]) is not None:
                    return number
                seen.add(other)
                following.append(other)
        frontier = following
    return None


def _formula(mol: Chem.Mol, group: ProtonGroup) -> str:
    atom = mol.GetAtomWithIdx(group.carriers[0])
    if atom.GetAtomicNum() != 6:
        return _hetero_formula(atom)
    count = atom.GetTotalNumHs()
    own = {1: "CH", 2: "CH2", 3: "CH3"}.get(count, "CH4")
    if len(group.carriers) > 1 and _share_a_carbon(mol, group.carriers):
        return f"C({own}){len(group.carriers)}"
    hetero = [n for n in atom.GetNeighbors() if n.GetAtomicNum() not in (1, 6)]
    if len(hetero) == 1 and atom.GetDegree() == 1:
        return f"{hetero[0].GetSymbol()}{own}"
    if any(
        b.GetBondType() == Chem.BondType.DOUBLE
        and b.GetOtherAtom(atom).GetAtomicNum() == 8
        for b in atom.GetBonds()
    ):
        return "CHO"
    return own


def _share_a_carbon(mol: Chem.Mol, carriers: Sequence[int]) -> bool:
    around = [
        {n.GetIdx() for n in mol.GetAtomWithIdx(i).GetNeighbors()} for i in carriers
    ]
    return all(len(found) == 1 and found == around[0] for found in around) and all(
        mol.GetAtomWithIdx(i).GetAtomicNum() == 6 for i in around[0]
    )


def _hetero_formula(atom: Chem.Atom) -> str:
    count = atom.GetTotalNumHs()
    charge = "+" if atom.GetFormalCharge() > 0 else ""
    if atom.GetAtomicNum() == 8 and count == 1:
        for neighbour in atom.GetNeighbors():
            if _is_carboxyl(neighbour):
                return "COOH"
    return f"{atom.GetSymbol()}H{count if count > 1 else ''}{charge}"


def _is_carboxyl(atom: Chem.Atom) -> bool:
    return atom.GetAtomicNum() == 6 and any(
        b.GetBondType() == Chem.BondType.DOUBLE
        and b.GetOtherAtom(atom).GetAtomicNum() == 8
        for b in atom.GetBonds()
    )


def _told_apart_by_fragment(
    mol: Chem.Mol, groups: Sequence[ProtonGroup], labels: Sequence[str]
) -> list[str]:
    """Mark the labels of the smaller components with their formula or number."""
    fragments = sorted(Chem.GetMolFrags(mol), key=lambda f: (-len(f), f))
    rank = {index: place for place, f in enumerate(fragments) for index in f}
    out = []
    for group, label in zip(groups, labels, strict=True):
        places = {rank[i] for i in group.carriers}
        out.append(label if 0 in places else f"{label} (component {min(places) + 1})")
    return out


def _alike(
    mol: Chem.Mol, groups: Sequence[ProtonGroup], labels: Sequence[str]
) -> list[list[int]]:
    """Groups of one constitution with one label."""
    ranks = list(Chem.CanonicalRankAtoms(mol, breakTies=False, includeChirality=False))
    sets: dict[tuple[str, frozenset[int]], list[int]] = defaultdict(list)
    for index, group in enumerate(groups):
        constitution = frozenset(ranks[i] for i in group.carriers)
        sets[labels[index], constitution].append(index)
    return [members for members in sets.values() if len(members) > 1]


def _with_letters(alike: Sequence[Sequence[int]], labels: Sequence[str]) -> list[str]:
    """Give the members of each set the letters A, B, ..."""
    out = list(labels)
    for members in alike:
        for letter, member in zip(_LETTERS, members, strict=False):
            out[member] = _lettered(labels[member], letter)
    return out


def _lettered(label: str, letter: str) -> str:
    head, separator, tail = label.partition(" ")
    return f"{head}{letter}{separator}{tail}"


def _unique(labels: Sequence[str]) -> tuple[str, ...]:
    """Number what is still equal: "NH", "NH (2)", ..."""
    counts = Counter(labels)
    used: Counter[str] = Counter()
    taken = {label for label, count in counts.items() if count == 1}
    out = []
    for label in labels:
        candidate = label
        while counts[label] > 1:
            used[label] += 1
            number = used[label]
            candidate = label if number == 1 else f"{label} ({number})"
            if candidate not in taken:
                break
        taken.add(candidate)
        out.append(candidate)
    return tuple(out)
