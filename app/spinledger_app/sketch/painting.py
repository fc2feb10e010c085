"""Paints a drawing in the making: skeleton, cursor, selection, faults; px."""

from __future__ import annotations

import math
from collections.abc import Collection, Sequence
from dataclasses import dataclass

from PySide6.QtCore import QPointF, QRectF
from PySide6.QtGui import QColor, QPainterPath

from spinledger_app.painting.ink import CAPTION, SECOND, Face, Ink
from spinledger_app.painting.molecule import paint_molecule
from spinledger_app.presenters import structure
from spinledger_app.presenters.wording import say
from spinledger_app.sketch.drawing import Bond, Drawing, Point
from spinledger_app.sketch.gestures import Spot
from spinledger_app.sketch.growth import free_angle_rad
from spinledger_app.sketch.view import View

_LARGEST_RING = 8
_CURSOR_PX = 11.0
_FAULT_PX = 14.0
_HALO_PX = 13.0
_BOND_PX = 1.7
_SUPERSCRIPTS = str.maketrans("0123456789", "⁰¹²³⁴⁵⁶⁷⁸⁹")
_HYDROGEN_MARKS = {2: "D", 3: "T"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Shown:
    """A drawing with what is known about it, ready to be painted.

    Attributes
    ----------
    hydrogens : sequence of int
        Implied hydrogens of every atom.
    labels : sequence of str
        R or S at stereocentres, else empty.
    faulty : collection of int
        Atoms that break a valence rule.
    """

    drawing: Drawing
    hydrogens: Sequence[int] = ()
    labels: Sequence[str] = ()
    faulty: Collection[int] = ()


def paint_drawing(ink: Ink, shown: Shown, view: View) -> None:
    """Paint skeleton, atom texts, stereo labels and rings about faults."""
    drawing = shown.drawing
    places = [view.to_screen(atom.place) for atom in drawing.atoms]
    size = 15.0 if view.scale_px > 24 else 12.0
    paint_molecule(ink, presented(shown), places, view.scale_px, size=size)
    for bond in drawing.bonds:
        if bond.wedge == "either":
            _paint_either(ink, bond, (places[bond.start], places[bond.end]), view)
    for atom, label in enumerate(shown.labels):
        if label:
            angle = free_angle_rad(drawing, atom)
            x, y = places[atom]
            x, y = x + 13 * math.cos(angle), y - 13 * math.sin(angle)
            ink.text(x, y + 4, label, CAPTION, align="centre")
    for atom in shown.faulty:
        ink.stroke(_circle(places[atom], _FAULT_PX), "ink", 1.5, dashes=[2.0, 2.0])


def paint_halo(
    ink: Ink, drawing: Drawing, view: View, selected: Collection[int]
) -> None:
    """Paint the ground under selected atoms and the bonds between them."""
    inner = [bond for bond in drawing.bonds if bond.ends <= frozenset(selected)]
    # First all edges, then all fills, so that only the outline of the whole shows.
    for grow, colour in ((1.0, "accent"), (0.0, "selected")):
        for bond in inner:
            path = QPainterPath(_point(drawing, view, bond.start))
            path.lineTo(_point(drawing, view, bond.end))
            ink.stroke(path, colour, _HALO_PX + 2 * grow)
        for atom in selected:
            centre = view.to_screen(drawing.atoms[atom].place)
            ink.area(_circle(centre, _CURSOR_PX + grow), colour)


def paint_cursor(ink: Ink, drawing: Drawing, view: View, spot: Spot) -> None:
    """Paint the ring about the atom, or the bar along the bond, that keys act on."""
    if spot.atom is not None:
        centre = view.to_screen(drawing.atoms[spot.atom].place)
        ink.stroke(_circle(centre, _CURSOR_PX), "accent", 2.0)
    elif spot.bond is not None:
        bond = drawing.bonds[spot.bond]
        start, end = _point(drawing, view, bond.start), _point(drawing, view, bond.end)
        length = math.hypot(end.x() - start.x(), end.y() - start.y())
        painter = ink.painter
        painter.save()
        painter.translate((start + end) / 2)
        painter.rotate(
            math.degrees(math.atan2(end.y() - start.y(), end.x() - start.x()))
        )
        half = length * 0.32
        path = QPainterPath()
        path.addRoundedRect(QRectF(-half, -8, 2 * half, 16), 8, 8)
        ink.stroke(path, "accent", 2.0)
        painter.restore()


def paint_band(ink: Ink, start_px: Point, end_px: Point) -> None:
    """Paint the rectangle that is being drawn about atoms."""
    path = QPainterPath()
    path.addRect(QRectF(QPointF(*start_px), QPointF(*end_px)).normalized())
    ink.stroke(path, "accent", 1.0, fill=ink.look.tint)


def paint_handle(ink: Ink, handle_px: Point) -> None:
    """Paint the knob that turns the selection."""
    ink.stroke(_circle(handle_px, 6), "accent", 1.5, fill="lane")
    x, y = handle_px
    arc = QPainterPath()
    arc.arcMoveTo(x - 2.6, y - 2.6, 5.2, 5.2, 40)
    arc.arcTo(x - 2.6, y - 2.6, 5.2, 5.2, 40, 260)
    ink.stroke(arc, "accent", 1.2)


def paint_empty(ink: Ink, size_px: Point) -> None:
    """Paint what to do while nothing is drawn."""
    x, y = size_px[0] / 2, size_px[1] / 2
    px = ink.look.px
    title = Face(size=16, weight=600)
    ink.text(x, y - px(28), say("No structure yet"), title, align="centre")
    first = say("Draw here, or paste SMILES")
    ink.text(x, y - px(4), first, SECOND, align="centre")
    second = say("or a molfile with Ctrl+V.")
    ink.text(x, y + px(14), second, SECOND, align="centre")


def presented(shown: Shown) -> structure.Drawing:
    """The drawing as the bench's painter of molecules takes it.

    Bonds of unknown side are left out; they are painted here.
    """
    drawing = shown.drawing
    return structure.Drawing(
        atoms=tuple(
            _drawn_atom(
                drawing, i, shown.hydrogens[i] if i < len(shown.hydrogens) else 0
            )
            for i in range(len(drawing.atoms))
        ),
        bonds=tuple(
            structure.DrawnBond(
                start=bond.start,
                end=bond.end,
                order=bond.order,
                wedge=bond.wedge,
                inward=_ring_side(drawing, bond) if bond.order == 2 else 0,
            )
            for bond in drawing.bonds
            if bond.wedge != "either"
        ),
    )


def _drawn_atom(drawing: Drawing, index: int, n_hydrogens: int) -> structure.DrawnAtom:
    atom = drawing.atoms[index]
    is_bare = (
        atom.element == "C"
        and not atom.charge
        and not atom.isotope
        and bool(drawing.bonds_of(index))
    )
    text = atom.element
    if atom.isotope:
        text = f"{atom.isotope}".translate(_SUPERSCRIPTS) + atom.element
        if atom.element == "H":
            text = _HYDROGEN_MARKS.get(atom.isotope, text)
    sign = "" if not atom.charge else ("⁺" if atom.charge > 0 else "⁻")
    count = "" if n_hydrogens == 1 else str(n_hydrogens)
    return structure.DrawnAtom(
        x=atom.x,
        y=atom.y,
        symbol="" if is_bare else text,
        hydrogens="" if is_bare or not n_hydrogens else f"H{count}",
        charge=sign
        if abs(atom.charge) < 2
        else f"{abs(atom.charge)}".translate(_SUPERSCRIPTS) + sign,
    )


def _ring_side(drawing: Drawing, bond: Bond) -> int:
    """Side of a double bond on which its smallest ring lies, 0 outside rings."""
    ring = _ring_through(drawing, bond)
    if not ring:
        return 0
    a, b = drawing.atoms[bond.start], drawing.atoms[bond.end]
    cx = sum(drawing.atoms[i].x for i in ring) / len(ring)
    cy = sum(drawing.atoms[i].y for i in ring) / len(ring)
    cross = (b.x - a.x) * (cy - a.y) - (b.y - a.y) * (cx - a.x)
    return 1 if cross > 0 else -1


def _ring_through(drawing: Drawing, bond: Bond) -> list[int]:
    paths = [[bond.start]]
    seen = {bond.start}
    for _ in range(_LARGEST_RING):
        longer = []
        for path in paths:
            for atom in drawing.neighbours(path[-1]):
                if atom == bond.end and len(path) > 1:
                    return [*path, atom]
                if atom not in seen and atom != bond.end:
                    seen.add(atom)
                    longer.append([*path, atom])
        paths = longer
    return []


def _paint_either(ink: Ink, bond: Bond, ends: tuple[Point, Point], view: View) -> None:
    (ax, ay), (bx, by) = ends
    length = math.dist((ax, ay), (bx, by))
    if length < 1e-6:
        return
    ux, uy = (bx - ax) / length, (by - ay) / length
    nx, ny = -uy, ux
    half = max(2.4, 0.085 * view.scale_px)
    if bond.order == 2:
        for side in (half, -half):
            start = ax + nx * side + ux * 2, ay + ny * side + uy * 2
            end = bx - nx * side - ux * 2, by - ny * side - uy * 2
            ink.line(start, end, "ink", _BOND_PX)
        return
    path = QPainterPath(QPointF(ax, ay))
    n_waves = max(2, round(length / 7))
    for k in range(n_waves):
        side = half * 1.6 * (1 if k % 2 else -1)
        t0, t1 = (k + 0.5) / n_waves * length, (k + 1) / n_waves * length
        path.quadTo(
            QPointF(ax + ux * t0 + nx * side, ay + uy * t0 + ny * side),
            QPointF(ax + ux * t1, ay + uy * t1),
        )
    ink.stroke(path, QColor(ink.colour("ink")), 1.4)


def _circle(centre: Point, radius: float) -> QPainterPath:
    path = QPainterPath()
    path.addEllipse(QPointF(*centre), radius, radius)
    return path


def _point(drawing: Drawing, view: View, atom: int) -> QPointF:
    return QPointF(*view.to_screen(drawing.atoms[atom].place))
