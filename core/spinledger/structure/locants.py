"""Locants: numbers for atoms as a chemist would give them, never file positions.

The structure falls into parts (ring systems and carbon chains). The part with
the principal group has plain numbers, the next one primes, and so on. Single
carbons outside rings keep no number of their own and are called by formula.
"""

from __future__ import annotations

import functools
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Final

from rdkit import Chem

from spinledger.structure.ring_templates import RING_TEMPLATES
from spinledger.structure.sugars import is_sugar_ring, sugar_numbers

# Principal groups, highest first, with the carbon that bears them (order of
# seniority as in systematic nomenclature).
_PRINCIPAL: Final = (
    "[CX3](=O)[OX2H1,OX1-]",
    "[CX3](=O)[OX2,NX3,F,Cl,Br,I,SX2]",
    "[CX2]#N",
    "[CX3H1,CX3H2]=O",
    "[CX3](=[OX1])([#6])[#6]",
    "[c;$(c=O)]",
    "[#6][OX2H1,OX1-]",
    "[#6][SX2H1]",
    "[#6][NX3;!$(N-C=O),NX4]",
)
_MOST_PRIMES: Final = 9
# A sugar has primes beside anything else (nucleosides, glycosides).
_SUGAR_RANK: Final = 99


@dataclass(frozen=True, slots=True, kw_only=True)
class _Part:
    """Atoms of a ring system or chain in the order of their numbers."""

    numbers: dict[int, str]
    is_ring: bool
    seniority: int


def locants(mol: Chem.Mol) -> tuple[str | None, ...]:
    """Locant of every heavy atom, None for those that are called by formula.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.

    Returns
    -------
    tuple of (str or None), one an atom
        Unique within a fragment; fragments are told apart by the caller.
    """
    found: list[str | None] = [None] * mol.GetNumAtoms()
    for fragment in Chem.GetMolFrags(mol):
        parts = sorted(_parts(mol, fragment), key=_part_order)
        for rank, part in enumerate(parts):
            prime = "'" * min(rank, _MOST_PRIMES)
            for index, number in part.numbers.items():
                found[index] = f"{number}{prime}"
    return tuple(found)


def _angular_methyls(mol: Chem.Mol, numbers: dict[int, str]) -> dict[int, str]:
    """Methyls on C13 and C10 of a steroid are 18 and 19."""
    smarts = next(text for name, text, _ in RING_TEMPLATES if name == "steroid")
    matches = mol.GetSubstructMatches(_pattern(smarts), maxMatches=16)
    if not any(set(match) == set(numbers) for match in matches):
        return {}
    by_number = {text: index for index, text in numbers.items()}
    found = {}
    for anchor, own in (("13", "18"), ("10", "19")):
        atom = mol.GetAtomWithIdx(by_number[anchor])
        for neighbour in atom.GetNeighbors():
            if neighbour.GetDegree() == 1 and neighbour.GetAtomicNum() == 6:
                found[neighbour.GetIdx()] = own
    return found


def _part_order(part: _Part) -> tuple[int, bool, int, int]:
    return (
        part.seniority,
        not part.is_ring,
        -len(part.numbers),
        min(part.numbers),
    )


def _parts(mol: Chem.Mol, fragment: Sequence[int]) -> Iterator[_Part]:
    senior = _seniorities(mol)
    inside = set(fragment)
    for system in _ring_systems(mol):
        if not system <= inside:
            continue
        if is_sugar_ring(mol, system):
            numbers, rank = sugar_numbers(mol, system), _SUGAR_RANK
        else:
            numbers = _ring_numbers(mol, system, senior)
            rank = _of_part(mol, system, senior)
        numbers |= _angular_methyls(mol, numbers)
        inside -= set(numbers)
        yield _Part(numbers=numbers, is_ring=True, seniority=rank)
    for chain in _chains(mol, inside):
        for numbers in _chain_numbers(mol, chain, senior):
            yield _Part(
                numbers=numbers,
                is_ring=False,
                seniority=_of_part(mol, set(numbers), senior),
            )


def _seniorities(mol: Chem.Mol) -> dict[int, int]:
    """Rank of the principal group on each carbon that bears one."""
    found: dict[int, int] = {}
    for rank, smarts in enumerate(_PRINCIPAL):
        for match in mol.GetSubstructMatches(_pattern(smarts)):
            found.setdefault(match[0], rank)
    return found


def _of_part(mol: Chem.Mol, part: set[int], senior: dict[int, int]) -> int:
    """Best rank in a part; a carboxyl carbon on a ring counts for the ring."""
    ranks = [senior.get(i, len(_PRINCIPAL)) for i in part]
    for index in part:
        atom = mol.GetAtomWithIdx(index)
        if atom.IsInRing():
            ranks.extend(
                senior.get(n.GetIdx(), len(_PRINCIPAL))
                for n in atom.GetNeighbors()
                if n.GetAtomicNum() == 6 and _is_single(n)
            )
    return min(ranks)


def _is_single(atom: Chem.Atom) -> bool:
    """Whether a carbon outside rings has at most one carbon neighbour."""
    carbons = sum(n.GetAtomicNum() == 6 for n in atom.GetNeighbors())
    return not atom.IsInRing() and carbons <= 1


def _ring_systems(mol: Chem.Mol) -> list[set[int]]:
    systems: list[set[int]] = []
    for ring in mol.GetRingInfo().AtomRings():
        joined = set(ring)
        rest = []
        for system in systems:
            if system & joined:
                joined |= system
            else:
                rest.append(system)
        systems = [*rest, joined]
    return systems


def _ring_numbers(
    mol: Chem.Mol, system: set[int], senior: dict[int, int]
) -> dict[int, str]:
    choices = list(_template_numberings(mol, system))
    if not choices and _is_one_ring(mol, system):
        choices = list(_single_ring_numberings(mol, system))
    if not choices:
        return {index: str(i + 1) for i, index in enumerate(sorted(system))}
    return min(choices, key=lambda numbers: _ring_key(mol, numbers, senior))


def _is_one_ring(mol: Chem.Mol, system: set[int]) -> bool:
    return any(len(r) == len(system) for r in mol.GetRingInfo().AtomRings())


def _template_numberings(mol: Chem.Mol, system: set[int]) -> Iterator[dict[int, str]]:
    for _, smarts, numbers in RING_TEMPLATES:
        pattern = _pattern(smarts)
        if pattern.GetNumAtoms() != len(system):
            continue
        for match in mol.GetSubstructMatches(pattern, uniquify=False, maxMatches=64):
            if set(match) == system:
                yield dict(zip(match, numbers.split(), strict=True))


def _single_ring_numberings(
    mol: Chem.Mol, system: set[int]
) -> Iterator[dict[int, str]]:
    ring = next(list(r) for r in mol.GetRingInfo().AtomRings() if len(r) == len(system))
    for order in (ring, ring[::-1]):
        for start in range(len(order)):
            turned = order[start:] + order[:start]
            yield {index: str(i + 1) for i, index in enumerate(turned)}


def _ring_key(
    mol: Chem.Mol, numbers: dict[int, str], senior: dict[int, int]
) -> tuple[object, ...]:
    """Lowest numbers for hetero atoms, then the principal group, then substituents."""
    hetero, principal, substituted = [], [], []
    best = _of_part(mol, set(numbers), senior)
    for index, text in numbers.items():
        place = int("".join(c for c in text if c.isdigit()))
        atom = mol.GetAtomWithIdx(index)
        if atom.GetAtomicNum() != 6:
            hetero.append((_hetero_rank(atom), place))
        outside = [n for n in atom.GetNeighbors() if n.GetIdx() not in numbers]
        if outside:
            substituted.append(place)
        ranks = [senior.get(index), *(senior.get(n.GetIdx()) for n in outside)]
        if best in ranks:
            principal.append(place)
    return (
        sorted(place for _, place in hetero),
        [place for _, place in sorted(hetero)],
        sorted(principal),
        sorted(substituted),
        min(numbers, key=lambda i: int("".join(filter(str.isdigit, numbers[i])))),
    )


def _neighbours(mol: Chem.Mol, index: int) -> list[int]:
    return [n.GetIdx() for n in mol.GetAtomWithIdx(index).GetNeighbors()]


def _hetero_rank(atom: Chem.Atom) -> int:
    return {8: 0, 16: 1, 7: 2}.get(atom.GetAtomicNum(), 3)


def _chains(mol: Chem.Mol, inside: set[int]) -> Iterator[set[int]]:
    """Connected carbons outside rings, two or more."""
    left = {
        i
        for i in inside
        if mol.GetAtomWithIdx(i).GetAtomicNum() == 6
        and not mol.GetAtomWithIdx(i).IsInRing()
    }
    while left:
        start = left.pop()
        chain, frontier = {start}, [start]
        while frontier:
            for neighbour in _neighbours(mol, frontier.pop()):
                if neighbour in left:
                    left.remove(neighbour)
                    chain.add(neighbour)
                    frontier.append(neighbour)
        if len(chain) > 1:
            yield chain


def _chain_numbers(
    mol: Chem.Mol, chain: set[int], senior: dict[int, int]
) -> Iterator[dict[int, str]]:
    """Number the main chain; longer branches become parts of their own."""
    main = _main_chain(mol, chain, senior)
    yield {index: str(i + 1) for i, index in enumerate(main)}
    rest = chain - set(main)
    for branch in _connected(mol, rest):
        if len(branch) > 1:
            yield from _chain_numbers(mol, branch, senior)


def _connected(mol: Chem.Mol, atoms: set[int]) -> list[set[int]]:
    left, found = set(atoms), []
    while left:
        start = left.pop()
        part, frontier = {start}, [start]
        while frontier:
            for neighbour in _neighbours(mol, frontier.pop()):
                if neighbour in left:
                    left.remove(neighbour)
                    part.add(neighbour)
                    frontier.append(neighbour)
        found.append(part)
    return found


def _main_chain(mol: Chem.Mol, chain: set[int], senior: dict[int, int]) -> list[int]:
    best = min((senior.get(i, len(_PRINCIPAL)) for i in chain), default=0)
    ends = [
        i for i in chain if sum(n in chain for n in _neighbours(mol, i)) <= 1
    ] or sorted(chain)
    paths = [path for end in sorted(ends) for path in _paths_from(mol, end, chain)]
    return min(paths, key=lambda path: _path_key(mol, path, senior, best))


def _paths_from(mol: Chem.Mol, start: int, chain: set[int]) -> Iterator[list[int]]:
    """Longest ways from one end to every other end (chains have no rings)."""
    stack = [[start]]
    while stack:
        path = stack.pop()
        following = [
            n for n in _neighbours(mol, path[-1]) if n in chain and n not in path
        ]
        if not following:
            yield path
        stack.extend([*path, n] for n in following)


def _path_key(
    mol: Chem.Mol, path: list[int], senior: dict[int, int], best: int
) -> tuple[object, ...]:
    bearing = [i + 1 for i, a in enumerate(path) if senior.get(a) == best]
    inside = set(path)
    substituted = [
        place + 1
        for place, index in enumerate(path)
        for n in _neighbours(mol, index)
        if n not in inside
    ]
    return (-len(bearing), -len(path), bearing, sorted(substituted), path)


@functools.cache
def _pattern(smarts: str) -> Chem.Mol:
    return Chem.MolFromSmarts(smarts)
