"""How a drawing grows: new bonds at free angles, rings fused on; bond lengths."""

from __future__ import annotations

import math
from dataclasses import dataclass

from spinledger_app.sketch.drawing import (
    SAME_PLACE,
    Atom,
    Bond,
    Drawing,
    Point,
    Wedge,
    with_atom,
    with_bond,
    with_wedge,
)

_STEP_RAD = math.pi / 12
_RING_SIZES = range(3, 9)
_FIRST_ANGLE_RAD = math.pi / 6


@dataclass(frozen=True, slots=True, kw_only=True)
class Grown:
    """A drawing and the atom that was reached last."""

    drawing: Drawing
    atom: int


def free_angle_rad(drawing: Drawing, atom: int) -> float:
    """Direction in which a new bond at an atom has most room, radians.

    120° from a single neighbour, so that chains go in zigzag, and straight on from
    a triple bond; else the middle of the widest gap.
    """
    x, y = drawing.atoms[atom].place
    angles = sorted(
        math.atan2(drawing.atoms[n].y - y, drawing.atoms[n].x - x)
        for n in drawing.neighbours(atom)
    )
    if not angles:
        return _FIRST_ANGLE_RAD
    if len(angles) == 1:
        return _beyond_one(drawing, atom, angles[0])
    gaps = [
        (after - before, before)
        for before, after in zip(
            angles, [*angles[1:], angles[0] + 2 * math.pi], strict=True
        )
    ]
    # The first of equal gaps, whatever the last digits say.
    width, start = max(gaps, key=lambda gap: round(gap[0], 6))
    return start + width / 2


def _beyond_one(drawing: Drawing, atom: int, angle_rad: float) -> float:
    bond = drawing.bonds[drawing.bonds_of(atom)[0]]
    if bond.order == 3:
        return angle_rad + math.pi
    choices = [angle_rad + 2 * math.pi / 3, angle_rad - 2 * math.pi / 3]
    x, y = drawing.atoms[atom].place
    others = [
        one.place
        for i, one in enumerate(drawing.atoms)
        if i not in (atom, bond.other(atom))
    ]

    def room(angle: float) -> tuple[float, float]:
        place = (x + math.cos(angle), y + math.sin(angle))
        nearest = min((math.dist(place, other) for other in others), default=9.0)
        # Level chains: of two free sides the one that goes more sideways.
        return round(min(nearest, 1.1), 3), -round(abs(math.sin(angle)), 6)

    return max(choices, key=room)


def snapped_rad(start: Point, end: Point) -> float:
    """Direction from one place to another, to the next 15°, radians."""
    angle = math.atan2(end[1] - start[1], end[0] - start[0])
    return round(angle / _STEP_RAD) * _STEP_RAD


def sprouted(drawing: Drawing, atom: int, *, angle_rad: float | None = None) -> Grown:
    """Drawing with a bond grown from an atom, onto an atom that stands there.

    Parameters
    ----------
    angle_rad : float, optional
        Direction; that with most room if not given.
    """
    angle = free_angle_rad(drawing, atom) if angle_rad is None else angle_rad
    x, y = drawing.atoms[atom].place
    place = (x + math.cos(angle), y + math.sin(angle))
    there = drawing.atom_at(place)
    if there is None or there == atom:
        new = Atom(x=place[0], y=place[1])
        drawing, there = with_atom(drawing, new), len(drawing.atoms)
    return joined(drawing, atom, there)


def joined(drawing: Drawing, first: int, second: int) -> Grown:
    """Drawing with a bond between two atoms, unless they are joined already."""
    bond = Bond(start=first, end=second)
    return Grown(drawing=with_bond(drawing, bond), atom=second)


def wedged_between(
    drawing: Drawing, start: int, end: int, wedge: Wedge = "wedge"
) -> Drawing:
    """Drawing with a wedge from one atom to a neighbour."""
    bond = drawing.bond_between(start, end)
    if bond is None:
        return drawing
    return with_wedge(drawing, bond, wedge, narrow_end=start)


def first_bond(
    drawing: Drawing, place: Point, *, angle_rad: float | None = None
) -> Grown:
    """Drawing with a new bond that begins at an empty place."""
    begun = with_atom(drawing, Atom(x=place[0], y=place[1]))
    return sprouted(begun, len(drawing.atoms), angle_rad=angle_rad)


def ring_at(
    drawing: Drawing, place: Point, size: int, *, is_aromatic: bool = False
) -> Drawing:
    """Drawing with a ring about an empty place, one side level at the bottom."""
    radius = _radius(size)
    start = -math.pi / 2 + math.pi / size if size % 2 else math.pi / 2
    if size % 4 == 0:
        start = math.pi / size
    return _ring(drawing, place, radius, start, (size, is_aromatic))


def ring_on_atom(
    drawing: Drawing, atom: int, size: int, *, is_aromatic: bool = False
) -> Drawing:
    """Drawing with a ring that has an atom as a corner.

    Where the atom's bonds leave no room for two more, the ring hangs on a new
    bond.
    """
    if sum(drawing.bonds[i].order for i in drawing.bonds_of(atom)) > 2:
        grown = sprouted(drawing, atom)
        drawing, atom = grown.drawing, grown.atom
    angle, radius = free_angle_rad(drawing, atom), _radius(size)
    if len(drawing.bonds_of(atom)) == 1:
        other = drawing.atoms[drawing.neighbours(atom)[0]]
        here = drawing.atoms[atom]
        angle = math.atan2(here.y - other.y, here.x - other.x)
    x, y = drawing.atoms[atom].place
    middle = (x + radius * math.cos(angle), y + radius * math.sin(angle))
    return _ring(drawing, middle, radius, angle + math.pi, (size, is_aromatic))


def ring_on_bond(
    drawing: Drawing, bond: int, size: int, *, is_aromatic: bool = False
) -> Drawing:
    """Drawing with a ring fused to a bond, on its emptier side."""
    one = drawing.bonds[bond]
    a, b = drawing.atoms[one.start].place, drawing.atoms[one.end].place
    length = math.dist(a, b)
    if length == 0:
        return drawing
    radius = _radius(size) * length
    height = radius * math.cos(math.pi / size)
    nx, ny = -(b[1] - a[1]) / length, (b[0] - a[0]) / length
    mx, my = drawing.middle(bond)
    others = [atom.place for i, atom in enumerate(drawing.atoms) if i not in one.ends]

    def crowd(side: int) -> float:
        middle = (mx + side * nx * height, my + side * ny * height)
        return sum(1 / (0.1 + math.dist(place, middle) ** 2) for place in others)

    side = min((1, -1), key=crowd)
    middle = (mx + side * nx * height, my + side * ny * height)
    start = math.atan2(a[1] - middle[1], a[0] - middle[0])
    # Counter-clockwise from a, b must be the last corner or the first after a.
    return _ring(drawing, middle, radius, start, (size, is_aromatic))


def _radius(size: int) -> float:
    """Distance of corners from the middle for sides of one bond length.

    Raises
    ------
    ValueError
        If the ring is not of 3 to 8 atoms.
    """
    if size not in _RING_SIZES:
        raise ValueError(f"size must be 3 to 8, got {size}")
    return 1 / (2 * math.sin(math.pi / size))


def _ring(
    drawing: Drawing,
    middle: Point,
    radius: float,
    start_rad: float,
    kind: tuple[int, bool],
) -> Drawing:
    size, is_aromatic = kind
    corners: list[int] = []
    for k in range(size):
        angle = start_rad + 2 * math.pi * k / size
        place = (
            middle[0] + radius * math.cos(angle),
            middle[1] + radius * math.sin(angle),
        )
        there = drawing.atom_at(place, SAME_PLACE)
        if there is None or there in corners:
            drawing = with_atom(drawing, Atom(x=place[0], y=place[1]))
            there = len(drawing.atoms) - 1
        corners.append(there)
    sides = list(zip(corners, [*corners[1:], corners[0]], strict=True))
    orders = _alternating(drawing, sides) if is_aromatic else [1] * size
    for (first, second), order in zip(sides, orders, strict=True):
        drawing = with_bond(drawing, Bond(start=first, end=second, order=order))
    return drawing


def _alternating(drawing: Drawing, sides: list[tuple[int, int]]) -> list[int]:
    """Orders of a ring's sides: as many double bonds as its atoms have room for.

    An atom has none where it takes part in a double bond already, has two more
    bonds beside those of the ring, or is not a carbon or an uncharged nitrogen
    without other bonds. Old sides keep their order.
    """
    corners = {a for a, _ in sides}
    full = {a for a in corners if not _has_room(drawing, a, corners)}
    first = next((k for k, (a, _) in enumerate(sides) if a in full), 0)
    orders = [1] * len(sides)
    # Beginning behind a full atom, every free stretch is a path, on which taking
    # each double bond as it comes gives the most there can be.
    for k in (*range(first, len(sides)), *range(first)):
        a, b = sides[k]
        if a not in full and b not in full and drawing.bond_between(a, b) is None:
            orders[k] = 2
            full |= {a, b}
    return orders


def _has_room(drawing: Drawing, atom: int, corners: set[int]) -> bool:
    here = drawing.atoms[atom]
    bonds = [drawing.bonds[i] for i in drawing.bonds_of(atom)]
    n_outside = sum(bond.other(atom) not in corners for bond in bonds)
    most_outside = {"C": 1, "N": 1 if here.charge == 1 else 0}.get(here.element, -1)
    return n_outside <= most_outside and all(bond.order == 1 for bond in bonds)
