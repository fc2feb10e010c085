"""A structure being drawn, as a frozen value; lengths in bond lengths, y upwards.

Every edit is a function from drawing to drawing. Aromatic rings are drawn with
alternating double bonds; hydrogens are implied by the usual valences.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass, field, replace
from types import MappingProxyType
from typing import Literal

Wedge = Literal["", "wedge", "hash", "either"]
Point = tuple[float, float]

# What a bond goes through when it is clicked again and again.
_NEXT_ORDER: Mapping[int, int] = MappingProxyType({1: 2, 2: 3, 3: 1})
_NEXT_WEDGE: Mapping[Wedge, Wedge] = MappingProxyType(
    {"": "wedge", "wedge": "hash", "hash": "either", "either": ""}
)
# Isotopes met in labelled compounds; 0 is the natural mixture.
_ISOTOPES: Mapping[str, tuple[int, ...]] = MappingProxyType(
    {
        "H": (0, 2, 3),
        "C": (0, 13, 14),
        "N": (0, 15),
        "O": (0, 17, 18),
        "F": (0, 18),
        "P": (0, 32, 33),
        "S": (0, 33, 34, 35),
    }
)
_MOST_CHARGE = 4
SAME_PLACE = 0.25


@dataclass(frozen=True, slots=True, kw_only=True)
class Atom:
    """An atom that is drawn.

    Attributes
    ----------
    element : str
        Symbol, such as ``"C"``.
    x, y : float, bond lengths
    charge : int, elementary charges
    isotope : int
        Mass number; 0 for the natural mixture.
    locant : int
        Number the user's file gave to the atom; 0 for none.
    """

    element: str = "C"
    x: float
    y: float
    charge: int = 0
    isotope: int = 0
    locant: int = 0

    @property
    def place(self) -> Point:
        """Where the atom stands."""
        return self.x, self.y


@dataclass(frozen=True, slots=True, kw_only=True)
class Bond:
    """A bond between two atoms, by index.

    Attributes
    ----------
    start, end : int
        A wedge has its narrow end at ``start``.
    order : int
        1, 2 or 3.
    wedge : str
        ``""``, ``"wedge"``, ``"hash"``, or ``"either"`` where the side is not
        known: a wavy single bond, a double bond that is neither E nor Z.
    """

    start: int
    end: int
    order: int = 1
    wedge: Wedge = ""

    def __post_init__(self) -> None:
        if self.start == self.end:
            raise ValueError(f"start, end: a bond needs two atoms, got {self.start}")
        if self.order not in _NEXT_ORDER:
            raise ValueError(f"order must be 1, 2 or 3, got {self.order}")
        if self.wedge in ("wedge", "hash") and self.order != 1:
            raise ValueError(f"wedge: only single bonds have one, got {self.wedge}")

    @property
    def ends(self) -> frozenset[int]:
        """Both atoms."""
        return frozenset((self.start, self.end))

    def other(self, atom: int) -> int:
        """The atom at the other end."""
        return self.end if atom == self.start else self.start


@dataclass(frozen=True, slots=True, kw_only=True)
class Drawing:
    """Atoms and bonds; at most one bond between any two atoms.

    Raises
    ------
    ValueError
        If a bond names an atom that is not there, or two bonds join one pair.
    """

    atoms: tuple[Atom, ...] = ()
    bonds: tuple[Bond, ...] = ()
    _neighbours: tuple[tuple[int, ...], ...] = field(
        init=False, repr=False, compare=False
    )

    def __post_init__(self) -> None:
        found: list[list[int]] = [[] for _ in self.atoms]
        for index, bond in enumerate(self.bonds):
            for atom in (bond.start, bond.end):
                if not 0 <= atom < len(self.atoms):
                    raise ValueError(f"bonds: bond {index} names atom {atom}")
                found[atom].append(index)
        if len({bond.ends for bond in self.bonds}) != len(self.bonds):
            raise ValueError("bonds: two bonds join the same atoms")
        object.__setattr__(self, "_neighbours", tuple(tuple(one) for one in found))

    def bonds_of(self, atom: int) -> tuple[int, ...]:
        """Bonds at an atom, by index."""
        return self._neighbours[atom]

    def neighbours(self, atom: int) -> tuple[int, ...]:
        """Atoms bound to an atom."""
        return tuple(self.bonds[i].other(atom) for i in self._neighbours[atom])

    def bond_between(self, first: int, second: int) -> int | None:
        """Bond that joins two atoms."""
        for index in self._neighbours[first]:
            if self.bonds[index].other(first) == second:
                return index
        return None

    def middle(self, bond: int) -> Point:
        """Middle of a bond."""
        a, b = self.atoms[self.bonds[bond].start], self.atoms[self.bonds[bond].end]
        return (a.x + b.x) / 2, (a.y + b.y) / 2

    def atom_at(self, place: Point, reach: float = SAME_PLACE) -> int | None:
        """Nearest atom within reach of a place."""
        best, found = reach, None
        for index, atom in enumerate(self.atoms):
            away = math.dist(place, atom.place)
            if away <= best:
                best, found = away, index
        return found

    def bond_at(self, place: Point, reach: float = SAME_PLACE) -> int | None:
        """Nearest bond within reach of a place, its outer fifths left to the atoms."""
        best, found = reach, None
        for index, bond in enumerate(self.bonds):
            a, b = self.atoms[bond.start].place, self.atoms[bond.end].place
            dx, dy = b[0] - a[0], b[1] - a[1]
            squared = dx * dx + dy * dy
            if squared == 0:
                continue
            along = ((place[0] - a[0]) * dx + (place[1] - a[1]) * dy) / squared
            away = math.dist(place, (a[0] + along * dx, a[1] + along * dy))
            if 0.2 <= along <= 0.8 and away <= best:
                best, found = away, index
        return found

    @property
    def bounds(self) -> tuple[float, float, float, float]:
        """Smallest x and y, largest x and y; zeros where nothing is drawn."""
        xs = [atom.x for atom in self.atoms] or [0.0]
        ys = [atom.y for atom in self.atoms] or [0.0]
        return min(xs), min(ys), max(xs), max(ys)

    def fragment(self, atom: int) -> frozenset[int]:
        """All atoms that hang together with one."""
        seen, todo = {atom}, [atom]
        while todo:
            for other in self.neighbours(todo.pop()):
                if other not in seen:
                    seen.add(other)
                    todo.append(other)
        return frozenset(seen)


EMPTY = Drawing()


def with_atom(drawing: Drawing, atom: Atom) -> Drawing:
    """Drawing with one more atom, the last."""
    return replace(drawing, atoms=(*drawing.atoms, atom))


def with_bond(drawing: Drawing, bond: Bond) -> Drawing:
    """Drawing with one more bond; the same drawing if the atoms are joined."""
    if drawing.bond_between(bond.start, bond.end) is not None:
        return drawing
    return replace(drawing, bonds=(*drawing.bonds, bond))


def with_element(drawing: Drawing, index: int, element: str) -> Drawing:
    """Drawing with another element at an atom; ``D`` and ``T`` are isotopes of H.

    The charge goes with the old element; wedges stay.
    """
    isotope = {"D": 2, "T": 3}.get(element, 0)
    symbol = "H" if isotope else element
    old = drawing.atoms[index]
    if (old.element, old.isotope) == (symbol, isotope):
        return drawing
    return _with_atoms(
        drawing, {index: replace(old, element=symbol, isotope=isotope, charge=0)}
    )


def with_charge(drawing: Drawing, index: int, step: int) -> Drawing:
    """Drawing with a charge raised or lowered, held between −4 and +4."""
    old = drawing.atoms[index]
    charge = min(max(old.charge + step, -_MOST_CHARGE), _MOST_CHARGE)
    return _with_atoms(drawing, {index: replace(old, charge=charge)})


def with_isotope(drawing: Drawing, index: int, isotope: int) -> Drawing:
    """Drawing with an atom's mass number; 0 for the natural mixture."""
    return _with_atoms(drawing, {index: replace(drawing.atoms[index], isotope=isotope)})


def with_next_isotope(drawing: Drawing, index: int) -> Drawing:
    """Drawing with the next isotope used for labels; the same where none is known."""
    atom = drawing.atoms[index]
    known = _ISOTOPES.get(atom.element, (0,))
    at = known.index(atom.isotope) if atom.isotope in known else -1
    return with_isotope(drawing, index, known[(at + 1) % len(known)])


def with_order(drawing: Drawing, index: int, order: int) -> Drawing:
    """Drawing with a bond's order; a multiple bond loses its wedge."""
    return _with_one_bond(
        drawing, index, replace(drawing.bonds[index], order=order, wedge="")
    )


def with_next_order(drawing: Drawing, index: int) -> Drawing:
    """Drawing with a bond gone from single to double to triple to single."""
    return with_order(drawing, index, _NEXT_ORDER[drawing.bonds[index].order])


def with_wedge(
    drawing: Drawing, index: int, wedge: Wedge, *, narrow_end: int | None = None
) -> Drawing:
    """Drawing with a wedge at a bond; a triple bond is left as it is.

    A wedge or hash makes a double bond single. "either" on a double bond says
    that it is neither E nor Z.

    Parameters
    ----------
    narrow_end : int, optional
        Atom at the narrow end; the present start if not given.
    """
    old = drawing.bonds[index]
    if old.order == 3 and wedge:
        return drawing
    order = 1 if wedge in ("wedge", "hash") else old.order
    start = old.start if narrow_end is None else narrow_end
    bond = Bond(start=start, end=old.other(start), order=order, wedge=wedge)
    return _with_one_bond(drawing, index, bond)


def with_next_wedge(drawing: Drawing, index: int) -> Drawing:
    """Drawing with a bond's next mark: wedge, hash, either, plain.

    The narrow end is put at the atom that can be a stereocentre: the one with
    more neighbours. A double bond goes between plain and "either".
    """
    old = drawing.bonds[index]
    if old.order == 2:
        return with_wedge(drawing, index, "" if old.wedge else "either")
    if old.wedge:
        return with_wedge(drawing, index, _NEXT_WEDGE[old.wedge])
    degrees = {atom: len(drawing.bonds_of(atom)) for atom in (old.start, old.end)}
    narrow = old.end if degrees[old.end] > degrees[old.start] else old.start
    return with_wedge(drawing, index, "wedge", narrow_end=narrow)


def turned_round(drawing: Drawing, index: int) -> Drawing:
    """Drawing with a wedge's narrow end at the other atom."""
    old = drawing.bonds[index]
    return _with_one_bond(drawing, index, replace(old, start=old.end, end=old.start))


def without(
    drawing: Drawing, *, atoms: Collection[int] = (), bonds: Collection[int] = ()
) -> Drawing:
    """Drawing without some atoms, their bonds, and some bonds more."""
    gone = frozenset(atoms)
    kept = [i for i in range(len(drawing.atoms)) if i not in gone]
    new = {old: i for i, old in enumerate(kept)}
    return Drawing(
        atoms=tuple(drawing.atoms[i] for i in kept),
        bonds=tuple(
            replace(bond, start=new[bond.start], end=new[bond.end])
            for index, bond in enumerate(drawing.bonds)
            if index not in bonds and not bond.ends & gone
        ),
    )


def moved(drawing: Drawing, atoms: Iterable[int], by: Point) -> Drawing:
    """Drawing with some atoms moved."""
    return _with_atoms(
        drawing,
        {
            i: replace(
                drawing.atoms[i],
                x=drawing.atoms[i].x + by[0],
                y=drawing.atoms[i].y + by[1],
            )
            for i in atoms
        },
    )


def centre(drawing: Drawing, atoms: Collection[int]) -> Point:
    """Mean place of some atoms.

    Raises
    ------
    ValueError
        If there are none.
    """
    if not atoms:
        raise ValueError("atoms: need at least one")
    xs = [drawing.atoms[i].x for i in atoms]
    ys = [drawing.atoms[i].y for i in atoms]
    return sum(xs) / len(xs), sum(ys) / len(ys)


def rotated(
    drawing: Drawing, atoms: Collection[int], angle_rad: float, about: Point
) -> Drawing:
    """Drawing with some atoms turned about a place, counter-clockwise."""
    cos, sin = math.cos(angle_rad), math.sin(angle_rad)
    places = {}
    for i in atoms:
        dx, dy = drawing.atoms[i].x - about[0], drawing.atoms[i].y - about[1]
        places[i] = replace(
            drawing.atoms[i],
            x=about[0] + cos * dx - sin * dy,
            y=about[1] + sin * dx + cos * dy,
        )
    return _with_atoms(drawing, places)


def fused(drawing: Drawing, atoms: Collection[int]) -> Drawing:
    """Drawing with moved atoms made one with the atoms they were dropped on.

    An atom of ``atoms`` that stands where one outside stands becomes that one;
    bonds that then join the same pair become one, of the higher order.
    """
    into: dict[int, int] = {}
    taken: set[int] = set()
    for i in sorted(atoms):
        for j, other in enumerate(drawing.atoms):
            is_free = j not in atoms and j not in taken
            if is_free and math.dist(drawing.atoms[i].place, other.place) <= SAME_PLACE:
                into[i] = j
                taken.add(j)
                break
    if not into:
        return drawing
    bonds: dict[frozenset[int], Bond] = {}
    for bond in drawing.bonds:
        start, end = into.get(bond.start, bond.start), into.get(bond.end, bond.end)
        if start == end:
            continue
        one = replace(bond, start=start, end=end)
        before = bonds.get(one.ends)
        if before is None or one.order > before.order:
            bonds[one.ends] = one
    return without(replace(drawing, bonds=tuple(bonds.values())), atoms=into)


def merged(drawing: Drawing, other: Drawing) -> Drawing:
    """Drawing with another one put at its right; the other's atoms come last."""
    if not drawing.atoms:
        return other
    _, low, right, high = drawing.bounds
    left, other_low, _, other_high = other.bounds
    by = (right + 1.5 - left, (low + high - other_low - other_high) / 2)
    beside = moved(other, range(len(other.atoms)), by)
    shift = len(drawing.atoms)
    return Drawing(
        atoms=(*drawing.atoms, *beside.atoms),
        bonds=(
            *drawing.bonds,
            *(
                replace(bond, start=bond.start + shift, end=bond.end + shift)
                for bond in beside.bonds
            ),
        ),
    )


def part(drawing: Drawing, atoms: Collection[int]) -> Drawing:
    """Only some atoms and the bonds between them."""
    return without(
        drawing, atoms=[i for i in range(len(drawing.atoms)) if i not in atoms]
    )


def _with_atoms(drawing: Drawing, new: Mapping[int, Atom]) -> Drawing:
    atoms = tuple(new.get(i, atom) for i, atom in enumerate(drawing.atoms))
    return replace(drawing, atoms=atoms)


def _with_one_bond(drawing: Drawing, index: int, bond: Bond) -> Drawing:
    bonds = list(drawing.bonds)
    bonds[index] = bond
    return replace(drawing, bonds=tuple(bonds))
