"""State marks: five shapes that stay apart in grey and under colour blindness."""

from __future__ import annotations

import math

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QPainterPath, QPen, QPolygonF

from spinledger_app.painting.ink import Ink

_EDGE = 1.25


def paint_mark(
    ink: Ink, x: float, y: float, state: str, *, size: float = 12, known: bool = False
) -> None:
    """Paint a state's mark centred at (x, y).

    Parameters
    ----------
    ink : Ink
    x, y : float
    state : str
        settled, disputed, open, silent, stray, or "unsolved" before the ledger.
    size : float
        12 in rows, 10 in tags.
    known : bool
        A stray whose kind is known: outline only.
    """
    painter = ink.painter
    half = size / 2
    if state == "unsolved":
        painter.setPen(QPen(ink.colour("edge"), _EDGE))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.drawEllipse(QPointF(x, y), half - 2, half - 2)
        return
    painter.setPen(QPen(ink.colour(f"tone:{state}"), _EDGE))
    painter.setBrush(ink.colour(f"fill:{state}"))
    if state == "settled":
        painter.drawEllipse(QPointF(x, y), half - 0.8, half - 0.8)
    elif state == "disputed":
        _lozenge(ink, x, y, half)
    elif state == "open":
        _ring(ink, x, y, half)
    elif state == "silent":
        painter.drawRoundedRect(QRectF(x - half, y - 2, size, 4), 2, 2)
    elif state == "stray":
        _triangle(ink, x, y, half, known=known)
    painter.setBrush(Qt.BrushStyle.NoBrush)


def _lozenge(ink: Ink, x: float, y: float, half: float) -> None:
    for side in (-1, 1):
        path = QPainterPath(QPointF(x + side * 1.5, y - half))
        path.lineTo(x + side * (half + 0.6), y)
        path.lineTo(x + side * 1.5, y + half)
        path.closeSubpath()
        ink.painter.drawPath(path)


def _ring(ink: Ink, x: float, y: float, half: float) -> None:
    painter = ink.painter
    painter.setBrush(ink.colour("lane"))
    painter.setPen(QPen(ink.colour("tone:open"), 4))
    painter.drawEllipse(QPointF(x, y), half - 2, half - 2)
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.setPen(QPen(ink.colour("fill:open"), 1.6))
    painter.drawEllipse(QPointF(x, y), half - 2, half - 2)


def _triangle(ink: Ink, x: float, y: float, half: float, *, known: bool) -> None:
    if known:
        ink.painter.setBrush(Qt.BrushStyle.NoBrush)
        ink.painter.setPen(QPen(ink.colour("tone:stray"), 1.5))
    corners = [
        QPointF(x, y - half + 0.4),
        QPointF(x + half - 0.2, y + half - 1.4),
        QPointF(x - half + 0.2, y + half - 1.4),
    ]
    ink.painter.drawPolygon(QPolygonF(corners))


def paint_balance(ink: Ink, x: float, y: float, tilt_deg: float, colour: str) -> None:
    """Paint the scales whose beam tells the verdict; 32 px wide from (x, y)."""
    painter = ink.painter
    middle, top = x + 16, y + 5
    round_cap = Qt.PenCapStyle.RoundCap
    ink.line((middle, top - 2), (middle, top + 15), colour, 2)
    ink.line((middle - 7, top + 16), (middle + 7, top + 16), colour, 2)
    angle = math.radians(tilt_deg)
    dx, dy = 13 * math.cos(angle), 13 * math.sin(angle)
    ink.line((middle - dx, top - dy), (middle + dx, top + dy), colour, 2, round_cap)
    for side in (-1, 1):
        hook_x, hook_y = middle + side * dx, top + side * dy
        for foot in (-4.5, 4.5):
            ink.line((hook_x, hook_y), (hook_x + foot, hook_y + 7), colour, 1)
        pan = QPainterPath(QPointF(hook_x - 5.5, hook_y + 7))
        pan.cubicTo(
            QPointF(hook_x - 4, hook_y + 11.5),
            QPointF(hook_x + 4, hook_y + 11.5),
            QPointF(hook_x + 5.5, hook_y + 7),
        )
        pan.closeSubpath()
        ink.area(pan, colour)
    painter.setBrush(Qt.BrushStyle.NoBrush)
