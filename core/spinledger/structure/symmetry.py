"""Symmetry of a molecule in motion: which protons, and pairs of protons, are alike.

The test is the substitution test done without a canonical name: a labelled
proton gives the same compound as another one if the graph can be laid over
itself, one labelled proton on the other, so that every centre, plane and axis
keeps its sense (homotopic), or so that every centre and axis changes it
(enantiotopic). Bonds that turn fast carry no sense, rings count as flat on
average.
"""

from __future__ import annotations

import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from itertools import pairwise, permutations, product
from typing import Final, Literal

from rdkit import Chem

from spinledger.structure.mobility import averaged_colours
from spinledger.structure.stereo_elements import (
    FIRST_H,
    LONE,
    SECOND_H,
    Centre,
    Link,
    stereo_elements,
)

Sense = Literal[-1, 0, 1]
Site = tuple[int, int]
"""A heavy atom and FIRST_H or SECOND_H, or LONE where its hydrogens are alike."""

Bond = frozenset[int]
Branches = tuple[int, int, int, int]
"""Parent and root of a branch, then of the branch it is laid over."""

# A branch calls the next one through a handful of functions.
_CALLS_PER_ATOM: Final = 10


class Symmetry:
    """Questions about the symmetry of one molecule.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit; chiral tags on every centre whose sense matters.
    temperature_k : float, K, optional
        Decides which amide bonds are slow; 298 K where unknown.
    flipped : sequence of int
        Centres to be taken the other way round than drawn.
    """

    def __init__(
        self,
        mol: Chem.Mol,
        *,
        temperature_k: float | None = None,
        flipped: Sequence[int] = (),
    ) -> None:
        elements = stereo_elements(mol, temperature_k)
        self.mol = mol
        averaging = averaged_colours(mol)
        self.links = tuple(
            link
            for link in elements.links
            if link.kind != "alkene" or averaging.is_fixed_double(link.ends)
        )
        self.centres = {
            index: Centre(
                positions=centre.positions,
                sign=-centre.sign if index in flipped else centre.sign,
            )
            for index, centre in elements.centres.items()
        }
        self.bond_colours = averaging.bonds
        self.neighbours = [
            [n.GetIdx() for n in atom.GetNeighbors()] for atom in mol.GetAtoms()
        ]
        self.colours = _refined(averaging.atoms, averaging.bonds, self.neighbours)
        self.link_of = {frozenset(link.ends): link for link in self.links}
        self.turning = self._turning_bonds()
        self.slotted = self._slotted_atoms()
        self._beyond: dict[tuple[int, int], frozenset[int]] = {}
        # Answers on branches in which no site is given: the same in every search.
        self.known: dict[tuple[Sense, Branches], bool] = {}

    def beyond(self, parent: int, atom: int) -> frozenset[int]:
        """Atoms of the branch that hangs on a bond; all for a parent of -1."""
        if (parent, atom) not in self._beyond:
            seen, order = {atom}, [atom]
            for index in order:
                for other in self.neighbours[index]:
                    if other not in seen and (index, other) != (atom, parent):
                        seen.add(other)
                        order.append(other)
            self._beyond[parent, atom] = frozenset(seen)
        return self._beyond[parent, atom]

    def sites(self) -> list[Site]:
        """All proton sites: one an atom, or two where geminal ones may differ."""
        found: list[Site] = []
        for atom in self.mol.GetAtoms():
            if not atom.GetTotalNumHs():
                continue
            slots = (FIRST_H, SECOND_H) if atom.GetIdx() in self.slotted else (LONE,)
            found.extend((atom.GetIdx(), slot) for slot in slots)
        return found

    def relation(self, first: Site, second: Site) -> str:
        """How two sites are related.

        Returns
        -------
        str
            "homotopic", "enantiotopic", "diastereotopic" or "different".
        """
        if self.maps([(first, second)], 1):
            return "homotopic"
        if self.maps([(first, second)], -1):
            return "enantiotopic"
        if self.maps([(first, second)], 0):
            return "diastereotopic"
        return "different"

    def are_equivalent(self, first: Site, second: Site) -> bool:
        """Whether two sites have one shift in an achiral solvent."""
        return self.are_pairs_equivalent((first,), (second,))

    def are_pairs_equivalent(
        self, first: Sequence[Site], second: Sequence[Site]
    ) -> bool:
        """Whether one operation takes the first sites to the second, in order."""
        pairs = list(zip(first, second, strict=True))
        return self.maps(pairs, 1) or self.maps(pairs, -1)

    def rotamers(self) -> tuple[str, ...]:
        """Kinds of slow bonds to nitrogen with two unlike sides at both ends.

        Such a bond makes two rotamers, which may show as two sets of signals.
        """
        found = set()
        for link in self.links:
            if link.kind in ("alkene", "cumulene", "hindered axis"):
                continue
            unlike = all(
                min(side) < 0 or self.colours[side[0]] != self.colours[side[1]]
                for side in link.positions
            )
            if unlike and min(link.positions[1]) >= 0:
                found.add(link.kind)
        return tuple(sorted(found))

    def maps(self, pairs: Sequence[tuple[Site, Site]], sense: Sense) -> bool:
        """Whether the molecule can be laid over itself with some sites given.

        Parameters
        ----------
        pairs : sequence of (Site, Site)
            Each first site must come to lie on its second one. All in one
            fragment.
        sense : {1, -1, 0}
            Keep every sense, reverse every sense, or do not look at it.
        """
        forced: dict[int, int] = {}
        flips: dict[int, int] = {}
        for (atom, slot), (image, image_slot) in pairs:
            if forced.setdefault(atom, image) != image:
                return False
            if (slot == LONE) != (image_slot == LONE):
                return False
            if slot != LONE:
                flip = 1 if slot == image_slot else -1
                if flips.setdefault(atom, flip) != flip:
                    return False
        if len(set(forced.values())) != len(forced):
            return False
        start = next(iter(forced))
        search = _Search(self, forced, flips, sense)
        with _room_for(self.mol.GetNumAtoms()):
            return search.branch(-1, start, -1, forced[start])

    def _turning_bonds(self) -> set[Bond]:
        """Bonds outside rings and links, about which the molecule turns freely."""
        held: set[Bond] = set()
        for link in self.links:
            path = Chem.GetShortestPath(self.mol, *link.ends)
            held.update(frozenset(step) for step in pairwise(path))
        free = set()
        for bond in self.mol.GetBonds():
            ends = frozenset((bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()))
            if not bond.IsInRing() and ends not in held:
                free.add(ends)
        return free

    def _slotted_atoms(self) -> frozenset[int]:
        """Atoms whose two hydrogens may differ."""
        slotted = {i for i, c in self.centres.items() if FIRST_H in c.positions}
        for link in self.links:
            for end, side in zip(link.ends, link.positions, strict=True):
                if FIRST_H in side:
                    slotted.add(end)
        return frozenset(slotted)


@contextmanager
def _room_for(n_atoms: int) -> Iterator[None]:
    """Allow calls as deep as the longest chain of so many atoms asks for."""
    usual = sys.getrecursionlimit()
    sys.setrecursionlimit(usual + _CALLS_PER_ATOM * n_atoms)
    try:
        yield
    finally:
        sys.setrecursionlimit(usual)


def _refined(
    colours: Sequence[str],
    bonds: dict[Bond, str],
    neighbours: Sequence[Sequence[int]],
) -> list[int]:
    """Colours refined by those of the neighbours until nothing changes."""
    numbers = {text: i for i, text in enumerate(sorted(set(colours)))}
    current = [numbers[text] for text in colours]
    while True:
        keys = [
            (
                current[i],
                tuple(sorted((bonds[frozenset((i, j))], current[j]) for j in around)),
            )
            for i, around in enumerate(neighbours)
        ]
        places = {key: i for i, key in enumerate(sorted(set(keys)))}
        following = [places[key] for key in keys]
        if len(places) == len(set(current)):
            return following
        current = following


class _Option:
    """One way in which the surroundings of an atom come to lie on those of its image."""

    __slots__ = ("flip", "images")

    def __init__(self, images: dict[int, int], flip: int) -> None:
        self.images = images
        self.flip = flip

    def of(self, position: int) -> int:
        """Image of a position."""
        if position in (FIRST_H, SECOND_H):
            other = SECOND_H if position == FIRST_H else FIRST_H
            return position if self.flip == 1 else other
        return LONE if position == LONE else self.images[position]


class _Search:
    """One search for an operation.

    The graph falls into rigid blocks joined by turning bonds. Blocks are laid
    over each other atom by atom; what hangs on a turning bond is an
    independent question, asked once for each pair of branches.
    """

    def __init__(
        self,
        symmetry: Symmetry,
        forced: dict[int, int],
        flips: dict[int, int],
        sense: Sense,
    ) -> None:
        self.symmetry = symmetry
        self.sense = sense
        self.flips = flips
        self.source_marks = forced
        self.image_marks = {image: atom for atom, image in forced.items()}
        self.answers: dict[Branches, bool] = {}

    def branch(self, parent: int, atom: int, image_parent: int, image: int) -> bool:
        """Whether a branch can be laid over another one, roots on each other.

        ``parent`` is the atom that the branch hangs on, -1 for the whole.
        """
        key = (parent, atom, image_parent, image)
        if key in self.answers:
            return self.answers[key]
        is_free = self._is_free(key)
        if is_free and (self.sense, key) in self.symmetry.known:
            return self.symmetry.known[self.sense, key]
        answer = self._look_alike(atom, image) and any(
            self._surroundings_fit(mapping, parent, image_parent)
            for mapping in self._block_mappings(atom, image)
        )
        self.answers[key] = answer
        if is_free:
            self.symmetry.known[self.sense, key] = answer
        return answer

    def _is_free(self, key: Branches) -> bool:
        """Whether no given site lies in the two branches."""
        parent, atom, image_parent, image = key
        return self.source_marks.keys().isdisjoint(
            self.symmetry.beyond(parent, atom)
        ) and self.image_marks.keys().isdisjoint(
            self.symmetry.beyond(image_parent, image)
        )

    def _look_alike(self, atom: int, image: int) -> bool:
        colours = self.symmetry.colours
        if colours[atom] != colours[image]:
            return False
        if atom in self.source_marks:
            return self.source_marks[atom] == image
        return image not in self.image_marks

    def _block_order(self, root: int) -> list[tuple[int, int]]:
        """Atoms of a rigid block, breadth first, each with the one before it."""
        order, seen = [(root, -1)], {root}
        for atom, _ in order:
            for other in self.symmetry.neighbours[atom]:
                if other not in seen and not self._turns(atom, other):
                    seen.add(other)
                    order.append((other, atom))
        return order

    def _turns(self, first: int, second: int) -> bool:
        return frozenset((first, second)) in self.symmetry.turning

    def _block_mappings(self, root: int, image: int) -> Iterator[dict[int, int]]:
        order = self._block_order(root)
        yield from self._extended({root: image}, order, 1)

    def _extended(
        self, mapping: dict[int, int], order: list[tuple[int, int]], place: int
    ) -> Iterator[dict[int, int]]:
        if place == len(order):
            yield mapping
            return
        atom, before = order[place]
        taken = set(mapping.values())
        for image in self.symmetry.neighbours[mapping[before]]:
            if image in taken or self._turns(mapping[before], image):
                continue
            if self._look_alike(atom, image) and self._bonds_fit(mapping, atom, image):
                yield from self._extended({**mapping, atom: image}, order, place + 1)

    def _bonds_fit(self, mapping: dict[int, int], atom: int, image: int) -> bool:
        colours = self.symmetry.bond_colours
        for other in self.symmetry.neighbours[atom]:
            if other in mapping:
                wanted = colours[frozenset((atom, other))]
                if colours.get(frozenset((image, mapping[other]))) != wanted:
                    return False
        return True

    def _surroundings_fit(
        self, mapping: dict[int, int], parent: int, image_parent: int
    ) -> bool:
        """Whether branches, centres and links all fit one mapping of a block."""
        root = next(iter(mapping))
        options: dict[int, list[_Option]] = {}
        for atom, image in mapping.items():
            fixed = dict(mapping)
            if atom == root and parent >= 0:
                fixed[parent] = image_parent
            found = [
                option
                for option in self._options(atom, image, fixed)
                if self._centre_fits(atom, image, option)
            ]
            if not found:
                return False
            options[atom] = found
        return self._links_fit(mapping, options)

    def _options(
        self, atom: int, image: int, fixed: dict[int, int]
    ) -> Iterator[_Option]:
        neighbours = self.symmetry.neighbours
        hanging = [n for n in neighbours[atom] if n not in fixed]
        used = {fixed[n] for n in neighbours[atom] if n in fixed}
        targets = [n for n in neighbours[image] if n not in used]
        if len(hanging) != len(targets):
            return
        known = {n: fixed[n] for n in neighbours[atom] if n in fixed}
        flips = (1, -1) if atom in self.symmetry.slotted else (1,)
        if atom in self.flips:
            flips = (self.flips[atom],)
        for chosen in permutations(targets):
            if all(
                self._hangs_alike(atom, child, image, target)
                for child, target in zip(hanging, chosen, strict=True)
            ):
                images = {**known, **dict(zip(hanging, chosen, strict=True))}
                for flip in flips:
                    yield _Option(images, flip)

    def _hangs_alike(self, atom: int, child: int, image: int, target: int) -> bool:
        colours = self.symmetry.bond_colours
        return colours[frozenset((atom, child))] == colours[
            frozenset((image, target))
        ] and self.branch(atom, child, image, target)

    def _centre_fits(self, atom: int, image: int, option: _Option) -> bool:
        centre = self.symmetry.centres.get(atom)
        other = self.symmetry.centres.get(image)
        if self.sense == 0 or centre is None or other is None:
            return True
        images = [option.of(position) for position in centre.positions]
        if sorted(images) != sorted(other.positions):
            return False
        sign = _parity(images, other.positions)
        return sign * centre.sign * other.sign == self.sense

    def _links_fit(
        self, mapping: dict[int, int], options: dict[int, list[_Option]]
    ) -> bool:
        if self.sense == 0:
            return True
        inside = [
            link for link in self.symmetry.links if all(e in mapping for e in link.ends)
        ]
        if not inside:
            return True
        ends = sorted({end for link in inside for end in link.ends})
        for chosen in product(*(options[end] for end in ends)):
            by_end = dict(zip(ends, chosen, strict=True))
            if all(self._link_fits(link, mapping, by_end) for link in inside):
                return True
        return False

    def _link_fits(
        self, link: Link, mapping: dict[int, int], chosen: dict[int, _Option]
    ) -> bool:
        image_ends = tuple(mapping[end] for end in link.ends)
        other = self.symmetry.link_of.get(frozenset(image_ends))
        if other is None:
            return False
        sides = other.positions
        if other.ends[0] != image_ends[0]:
            sides = sides[::-1]
        sign = link.sign * other.sign
        for end, side, image_side in zip(link.ends, link.positions, sides, strict=True):
            image = chosen[end].of(side[0])
            if image not in image_side:
                return False
            sign *= 1 if image == image_side[0] else -1
        return sign == (self.sense if link.is_axis else 1)


def _parity(first: Sequence[int], second: Sequence[int]) -> int:
    """Sign of the permutation that turns one order into the other."""
    places = [first.index(item) for item in second]
    swaps = sum(
        places[i] > places[j]
        for i in range(len(places))
        for j in range(i + 1, len(places))
    )
    return -1 if swaps % 2 else 1
