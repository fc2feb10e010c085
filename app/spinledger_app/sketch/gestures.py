"""What a click, a drag or a key does to a drawing; no widget is needed for it."""

from __future__ import annotations

import math
from collections.abc import Callable, Collection, Mapping
from dataclasses import dataclass
from enum import StrEnum
from types import MappingProxyType

from spinledger_app.sketch.drawing import (
    Atom,
    Drawing,
    Point,
    fused,
    moved,
    turned_round,
    with_atom,
    with_charge,
    with_element,
    with_next_isotope,
    with_next_order,
    with_next_wedge,
    with_order,
    without,
)
from spinledger_app.sketch.growth import (
    Grown,
    first_bond,
    joined,
    ring_at,
    ring_on_atom,
    ring_on_bond,
    snapped_rad,
    sprouted,
    wedged_between,
)

# A drag this short is a click; bond lengths.
SHORTEST_DRAG = 0.3


class Tool(StrEnum):
    """What the mouse does."""

    PICK = "pick"
    BOND = "bond"
    WEDGE = "wedge"
    RING = "ring"
    ELEMENT = "element"
    CHARGE = "charge"
    ERASE = "erase"


@dataclass(frozen=True, slots=True, kw_only=True)
class Kit:
    """The chosen tool and what it is set to.

    Attributes
    ----------
    ring_size : int
        3 to 8.
    is_aromatic : bool
        Whether the ring tool draws alternating double bonds.
    element : str
        Of the element tool.
    charge_step : int
        +1 or −1, of the charge tool.
    """

    tool: Tool = Tool.BOND
    ring_size: int = 6
    is_aromatic: bool = True
    element: str = "O"
    charge_step: int = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class Spot:
    """What is under the mouse or the keyboard's cursor: an atom, a bond, or neither."""

    atom: int | None = None
    bond: int | None = None


NOWHERE = Spot()


@dataclass(frozen=True, slots=True, kw_only=True)
class Edit:
    """A named change, and the atom at which the next key acts."""

    label: str
    drawing: Drawing
    atom: int | None = None


def spot_at(drawing: Drawing, place: Point, reach: float) -> Spot:
    """Atom, else bond, within reach of a place."""
    atom = drawing.atom_at(place, reach)
    if atom is not None:
        return Spot(atom=atom)
    return Spot(bond=drawing.bond_at(place, reach))


def click(drawing: Drawing, kit: Kit, spot: Spot, place: Point) -> Edit | None:
    """Change that a click makes; None if it makes none."""
    if kit.tool is Tool.RING:
        return _ring(drawing, spot, place, (kit.ring_size, kit.is_aromatic))
    if spot.atom is not None:
        return _click_atom(drawing, kit, spot.atom)
    if spot.bond is not None:
        return _click_bond(drawing, kit, spot.bond)
    return _click_empty(drawing, kit, place)


def drag(
    drawing: Drawing, kit: Kit, spot: Spot, start: Point, end: Point
) -> Edit | None:
    """Change that a drag with the bond or wedge tool makes; None if none."""
    if kit.tool not in (Tool.BOND, Tool.WEDGE) or spot.bond is not None:
        return None
    if math.dist(start, end) < SHORTEST_DRAG:
        return None
    grown = _drawn_out(drawing, spot, start, end)
    if grown is None:
        return None
    drawn, first = grown.drawing, len(drawing.atoms)
    if kit.tool is Tool.WEDGE:
        origin = first if spot.atom is None else spot.atom
        drawn = wedged_between(drawn, origin, grown.atom)
        return Edit(label="Draw wedge", drawing=drawn, atom=grown.atom)
    return Edit(label="Draw bond", drawing=drawn, atom=grown.atom)


def drop(drawing: Drawing, atoms: Collection[int], by: Point) -> Edit:
    """Atoms moved, and made one with those they were dropped on."""
    return Edit(
        label="Move",
        drawing=fused(moved(drawing, atoms, by), frozenset(atoms)),
    )


def erase(drawing: Drawing, atoms: Collection[int], bonds: Collection[int]) -> Edit:
    """Atoms and bonds deleted."""
    return Edit(label="Delete", drawing=without(drawing, atoms=atoms, bonds=bonds))


def grow(drawing: Drawing, spot: Spot, place: Point) -> Edit:
    """One bond more at the spot; the way to draw chains by keys alone."""
    if spot.atom is not None:
        grown = sprouted(drawing, spot.atom)
    else:
        grown = first_bond(drawing, place)
    return Edit(label="Draw bond", drawing=grown.drawing, atom=grown.atom)


ELEMENT_KEYS: Mapping[str, str] = MappingProxyType(
    {
        "c": "C",
        "n": "N",
        "o": "O",
        "s": "S",
        "f": "F",
        "l": "Cl",
        "b": "Br",
        "i": "I",
        "p": "P",
        "h": "H",
        "d": "D",
    }
)


def key(drawing: Drawing, text: str, spot: Spot, place: Point) -> Edit | None:
    """Change that a key makes at a spot; None if the key has no meaning there.

    Parameters
    ----------
    text : str
        What the key types.
    place : tuple of float
        Where a ring goes if the spot is empty.
    """
    text = text.lower()
    if text == "a":
        return _ring(drawing, spot, place, (6, True))
    if text in ("3", "4", "5", "6", "7", "8"):
        return _ring(drawing, spot, place, (int(text), False))
    if spot.atom is not None:
        return _key_on_atom(drawing, text, spot.atom)
    if spot.bond is not None and text in _BOND_KEYS:
        label, change = _BOND_KEYS[text]
        return Edit(label=label, drawing=change(drawing, spot.bond))
    return None


_BOND_KEYS: Mapping[str, tuple[str, Callable[[Drawing, int], Drawing]]] = (
    MappingProxyType(
        {
            "-": ("Change bond", lambda d, i: with_order(d, i, 1)),
            "=": ("Change bond", lambda d, i: with_order(d, i, 2)),
            "#": ("Change bond", lambda d, i: with_order(d, i, 3)),
            "w": ("Change wedge", with_next_wedge),
            "t": ("Turn wedge", turned_round),
        }
    )
)


def _key_on_atom(drawing: Drawing, text: str, atom: int) -> Edit | None:
    if text in ELEMENT_KEYS:
        drawn = with_element(drawing, atom, ELEMENT_KEYS[text])
        return Edit(label="Change element", drawing=drawn, atom=atom)
    if text in ("+", "-"):
        drawn = with_charge(drawing, atom, 1 if text == "+" else -1)
        return Edit(label="Change charge", drawing=drawn, atom=atom)
    if text == "m":
        drawn = with_next_isotope(drawing, atom)
        return Edit(label="Change isotope", drawing=drawn, atom=atom)
    return None


def _click_atom(drawing: Drawing, kit: Kit, atom: int) -> Edit | None:
    if kit.tool in (Tool.BOND, Tool.WEDGE):
        grown = sprouted(drawing, atom)
        drawn = grown.drawing
        if kit.tool is Tool.WEDGE:
            drawn = wedged_between(drawn, atom, grown.atom)
        return Edit(label="Draw bond", drawing=drawn, atom=grown.atom)
    if kit.tool is Tool.ELEMENT:
        drawn = with_element(drawing, atom, kit.element)
        return Edit(label="Change element", drawing=drawn, atom=atom)
    if kit.tool is Tool.CHARGE:
        drawn = with_charge(drawing, atom, kit.charge_step)
        return Edit(label="Change charge", drawing=drawn, atom=atom)
    if kit.tool is Tool.ERASE:
        return erase(drawing, (atom,), ())
    return None


def _click_bond(drawing: Drawing, kit: Kit, bond: int) -> Edit | None:
    if kit.tool is Tool.BOND:
        return Edit(label="Change bond", drawing=with_next_order(drawing, bond))
    if kit.tool is Tool.WEDGE:
        return Edit(label="Change wedge", drawing=with_next_wedge(drawing, bond))
    if kit.tool is Tool.ERASE:
        return erase(drawing, (), (bond,))
    return None


def _click_empty(drawing: Drawing, kit: Kit, place: Point) -> Edit | None:
    if kit.tool is Tool.BOND:
        return grow(drawing, NOWHERE, place)
    if kit.tool is Tool.ELEMENT:
        isotope = {"D": 2, "T": 3}.get(kit.element, 0)
        element = "H" if isotope else kit.element
        atom = Atom(element=element, isotope=isotope, x=place[0], y=place[1])
        return Edit(
            label="Draw atom",
            drawing=with_atom(drawing, atom),
            atom=len(drawing.atoms),
        )
    return None


def _ring(
    drawing: Drawing, spot: Spot, place: Point, kind: tuple[int, bool]
) -> Edit | None:
    size, is_aromatic = kind
    if spot.atom is not None:
        drawn = ring_on_atom(drawing, spot.atom, size, is_aromatic=is_aromatic)
    elif spot.bond is not None:
        drawn = ring_on_bond(drawing, spot.bond, size, is_aromatic=is_aromatic)
    else:
        drawn = ring_at(drawing, place, size, is_aromatic=is_aromatic)
    return Edit(label="Draw ring", drawing=drawn, atom=spot.atom)


def _drawn_out(drawing: Drawing, spot: Spot, start: Point, end: Point) -> Grown | None:
    """Bond from a spot towards a place, onto the atom that is there if any."""
    there = drawing.atom_at(end, 0.35)
    if spot.atom is None:
        if there is None:
            return first_bond(drawing, start, angle_rad=snapped_rad(start, end))
        begun = with_atom(drawing, Atom(x=start[0], y=start[1]))
        return joined(begun, len(drawing.atoms), there)
    if there == spot.atom:
        return None
    if there is not None:
        return joined(drawing, spot.atom, there)
    angle = snapped_rad(drawing.atoms[spot.atom].place, end)
    return sprouted(drawing, spot.atom, angle_rad=angle)
