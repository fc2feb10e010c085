"""What a press of the mouse is for, and the edit a drag makes; places in px."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from spinledger_app.sketch import gestures
from spinledger_app.sketch.drawing import Drawing, Point, centre, rotated
from spinledger_app.sketch.gestures import NOWHERE, Edit, Kit, Spot, Tool
from spinledger_app.sketch.view import View, handle_px

PressKind = Literal["tool", "move", "turn", "band", "pan"]

_TURN_RAD = math.pi / 12
_HANDLE_REACH_PX = 12.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Press:
    """Where the mouse went down, on what, and what the drag is for."""

    kind: PressKind
    spot: Spot
    at_px: Point
    view: View


@dataclass(frozen=True, slots=True, kw_only=True)
class Held:
    """What the mouse works on: drawing, selection, and where they show."""

    drawing: Drawing
    selected: frozenset[int]
    view: View


def kind_of_press(held: Held, tool: Tool, spot: Spot, at_px: Point) -> PressKind:
    """What a press of the left button begins."""
    if tool is not Tool.PICK:
        return "tool"
    knob = handle_px(held.drawing, held.view, held.selected)
    if knob is not None and math.dist(knob, at_px) <= _HANDLE_REACH_PX:
        return "turn"
    return "band" if spot == NOWHERE else "move"


def atoms_of(drawing: Drawing, spot: Spot) -> frozenset[int]:
    """The atom, or both atoms of the bond, at a spot."""
    if spot.atom is not None:
        return frozenset((spot.atom,))
    return frozenset() if spot.bond is None else drawing.bonds[spot.bond].ends


def moving_atoms(held: Held, press: Press) -> frozenset[int]:
    """Atoms that a drag moves: the selection, if it was taken hold of."""
    atoms = atoms_of(held.drawing, press.spot)
    if press.kind == "turn" or (press.kind == "move" and atoms & held.selected):
        return held.selected
    return atoms if press.kind == "move" else frozenset()


def edit_of_drag(
    held: Held, kit: Kit, press: Press, to_px: Point, *, is_free: bool
) -> Edit | None:
    """Edit that a drag up to a point makes; None if none.

    Parameters
    ----------
    is_free : bool
        Whether turning goes without steps of 15°.
    """
    start, end = held.view.to_drawing(press.at_px), held.view.to_drawing(to_px)
    if press.kind == "tool":
        return gestures.drag(held.drawing, kit, press.spot, start, end)
    if press.kind == "move":
        by = end[0] - start[0], end[1] - start[1]
        return gestures.drop(held.drawing, moving_atoms(held, press), by)
    if press.kind == "turn":
        about = centre(held.drawing, held.selected)
        angle = _angle_rad(about, end) - _angle_rad(about, start)
        if not is_free:
            angle = round(angle / _TURN_RAD) * _TURN_RAD
        turned = rotated(held.drawing, held.selected, angle, about)
        return Edit(label="Turn", drawing=turned)
    return None


def atoms_between(held: Held, first_px: Point, second_px: Point) -> frozenset[int]:
    """Atoms inside the rectangle between two corners."""
    x0, x1 = sorted((first_px[0], second_px[0]))
    y0, y1 = sorted((first_px[1], second_px[1]))
    found = set()
    for index, atom in enumerate(held.drawing.atoms):
        x, y = held.view.to_screen(atom.place)
        if x0 <= x <= x1 and y0 <= y <= y1:
            found.add(index)
    return frozenset(found)


def _angle_rad(about: Point, place: Point) -> float:
    return math.atan2(place[1] - about[1], place[0] - about[0])
