"""Paints a structure: bonds of 1.7 px, wedges filled, atom labels 15/600."""

from __future__ import annotations

import math
from collections.abc import Sequence

from PySide6.QtCore import QPointF, Qt
from PySide6.QtGui import QPainterPath

from spinledger_app.painting.ink import Face, Ink
from spinledger_app.presenters.structure import Drawing, DrawnAtom, DrawnBond
from spinledger_app.presenters.wording import formula
from spinledger_app.theme import Look

_Point = tuple[float, float]


def atom_text_width(look: Look, atom: DrawnAtom, size: float = 15) -> float:
    """Width of an atom's text with its hydrogens, px."""
    text = atom.symbol + formula(atom.hydrogens) + atom.charge
    return look.width(text, size, 600)


def paint_molecule(  # noqa: PLR0913 - what, where and how large
    ink: Ink,
    drawing: Drawing,
    places: Sequence[_Point],
    scale: float,
    *,
    colour: str = "ink",
    size: float = 15,
    width: float = 1.7,
) -> None:
    """Paint a drawing with its atoms at given places.

    Parameters
    ----------
    scale : float
        Px per bond length.
    size : float
        Of the atom labels, px.
    width : float
        Of the bonds, px.
    """
    gap = size * 0.62
    for bond in drawing.bonds:
        _paint_bond(ink, drawing, places, bond, (scale, gap, width), colour)
    face = Face(size=size, weight=600, colour=colour)
    for index, atom in enumerate(drawing.atoms):
        if atom.symbol:
            _paint_atom(ink, drawing, places, index, face)


def _paint_bond(
    ink: Ink,
    drawing: Drawing,
    places: Sequence[_Point],
    bond: DrawnBond,
    measures: tuple[float, float, float],
    colour: str,
) -> None:
    scale, gap, width = measures
    (ax, ay), (bx, by) = places[bond.start], places[bond.end]
    length = math.hypot(bx - ax, by - ay)
    if length < 1e-6:
        return
    ux, uy = (bx - ax) / length, (by - ay) / length
    if drawing.atoms[bond.start].symbol:
        ax, ay = ax + ux * gap, ay + uy * gap
    if drawing.atoms[bond.end].symbol:
        bx, by = bx - ux * gap, by - uy * gap
    nx, ny = -uy, ux
    if bond.wedge:
        _paint_wedge(
            ink, bond.wedge, ((ax, ay), (bx, by), (nx, ny)), scale, width, colour
        )
        return
    cap = Qt.PenCapStyle.RoundCap
    spread = max(2.4, 0.085 * scale)
    if bond.order == 2 and bond.inward:
        ink.line((ax, ay), (bx, by), colour, width, cap)
        # On the screen y points down: left of the bond is against the normal.
        side = -bond.inward * 2 * spread
        trim = 0.12 * length
        ink.line(
            (ax + nx * side + ux * trim, ay + ny * side + uy * trim),
            (bx + nx * side - ux * trim, by + ny * side - uy * trim),
            colour,
            width,
            cap,
        )
        return
    shifts = {1: (0.0,), 2: (-spread, spread), 3: (-1.8 * spread, 0.0, 1.8 * spread)}
    for shift in shifts[bond.order]:
        ink.line(
            (ax + nx * shift, ay + ny * shift),
            (bx + nx * shift, by + ny * shift),
            colour,
            width,
            cap,
        )


def _paint_wedge(
    ink: Ink,
    kind: str,
    frame: tuple[_Point, _Point, _Point],
    scale: float,
    width: float,
    colour: str,
) -> None:
    (ax, ay), (bx, by), (nx, ny) = frame
    half = max(2.6, 0.11 * scale)
    if kind == "wedge":
        path = QPainterPath(QPointF(ax, ay))
        path.lineTo(bx + nx * half, by + ny * half)
        path.lineTo(bx - nx * half, by - ny * half)
        path.closeSubpath()
        ink.stroke(path, colour, 0.8, fill=colour)
        return
    n_bars = max(4, round(math.hypot(bx - ax, by - ay) / 4.5))
    for k in range(1, n_bars + 1):
        t = k / n_bars
        x, y, w = ax + (bx - ax) * t, ay + (by - ay) * t, half * t
        ink.line(
            (x + nx * w, y + ny * w), (x - nx * w, y - ny * w), colour, width * 0.8
        )


def _paint_atom(
    ink: Ink,
    drawing: Drawing,
    places: Sequence[_Point],
    index: int,
    face: Face,
) -> None:
    x, y = places[index]
    atom, size = drawing.atoms[index], face.size
    look = ink.look
    hydrogens = formula(atom.hydrogens)
    own = look.width(atom.symbol, size, 600)
    baseline = y + look.metrics(size, 600).capHeight() / 2
    if hydrogens and _is_bound_on_right(drawing, places, index):
        text, left = (
            hydrogens + atom.symbol + atom.charge,
            (x - own / 2 - look.width(hydrogens, size, 600)),
        )
    else:
        text, left = atom.symbol + hydrogens + atom.charge, x - own / 2
    ink.text(left, baseline, text, face)


def _is_bound_on_right(drawing: Drawing, places: Sequence[_Point], index: int) -> bool:
    """Whether the hydrogens have to stand at the left of the atom."""
    pull = 0.0
    for bond in drawing.bonds:
        if index in (bond.start, bond.end):
            other = bond.end if bond.start == index else bond.start
            pull += places[other][0] - places[index][0]
    return pull > 3.0
