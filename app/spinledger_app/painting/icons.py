"""Icons in a 16 px box, drawn as strokes of 1.5 px in one colour."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from types import MappingProxyType

from PySide6.QtCore import QPointF, Qt
from PySide6.QtGui import QPainterPath, QPen

from spinledger_app.painting.ink import Ink

_STROKE = 1.5


def _polyline(*points: tuple[float, float], closed: bool = False) -> QPainterPath:
    path = QPainterPath(QPointF(*points[0]))
    for point in points[1:]:
        path.lineTo(*point)
    if closed:
        path.closeSubpath()
    return path


def _joined(*paths: QPainterPath) -> QPainterPath:
    whole = QPainterPath()
    for path in paths:
        whole.addPath(path)
    return whole


def _undo(*, mirrored: bool = False) -> QPainterPath:
    def at(x: float) -> float:
        return 16 - x if mirrored else x

    arc = QPainterPath(QPointF(at(3), 6))
    arc.cubicTo(QPointF(at(10), 4), QPointF(at(15), 8), QPointF(at(11), 13))
    return _joined(arc, _polyline((at(7), 2), (at(3), 6), (at(7), 10)))


def _pick() -> QPainterPath:
    return _polyline((4, 2), (4, 13), (7, 10.2), (11.5, 10.2), closed=True)


def _ring() -> QPainterPath:
    corners = [
        (8 + 6 * math.cos(math.radians(a)), 8 + 6 * math.sin(math.radians(a)))
        for a in range(30, 390, 60)
    ]
    return _polyline(*corners, closed=True)


def _paste() -> QPainterPath:
    board = _polyline((3, 3), (13, 3), (13, 14), (3, 14), closed=True)
    return _joined(
        board, _polyline((6, 1.5), (10, 1.5), (10, 4.5), (6, 4.5), closed=True)
    )


def _copy() -> QPainterPath:
    back = _polyline((5, 11), (2, 11), (2, 2), (11, 2), (11, 5))
    return _joined(back, _polyline((5, 5), (14, 5), (14, 14), (5, 14), closed=True))


def _save() -> QPainterPath:
    return _joined(
        _polyline((8, 2), (8, 10)),
        _polyline((4.5, 6.5), (8, 10), (11.5, 6.5)),
        _polyline((2.5, 10), (2.5, 14), (13.5, 14), (13.5, 10)),
    )


def _ledger() -> QPainterPath:
    return _joined(
        _polyline((2, 3), (14, 3)),
        _polyline((2, 7), (14, 7)),
        _polyline((2, 11), (14, 11)),
        _polyline((2, 13.5), (14, 13.5)),
        _polyline((8, 3), (8, 11)),
    )


def _cross() -> QPainterPath:
    return _joined(_polyline((3, 3), (13, 13)), _polyline((13, 3), (3, 13)))


_PATHS: Mapping[str, Callable[[], QPainterPath]] = MappingProxyType(
    {
        "undo": _undo,
        "redo": lambda: _undo(mirrored=True),
        "pick": _pick,
        "ring": _ring,
        "paste": _paste,
        "copy": _copy,
        "save": _save,
        "ledger": _ledger,
        "cross": _cross,
    }
)


def paint_icon(ink: Ink, name: str, x: float, y: float, colour: str) -> None:
    """Paint an icon with its box at (x, y).

    Raises
    ------
    KeyError
        If there is no such icon.
    """
    path = _PATHS[name]()
    path.translate(x, y)
    pen = QPen(ink.colour(colour), _STROKE)
    pen.setCapStyle(Qt.PenCapStyle.SquareCap)
    pen.setJoinStyle(Qt.PenJoinStyle.MiterJoin)
    ink.painter.setPen(pen)
    ink.painter.setBrush(Qt.BrushStyle.NoBrush)
    ink.painter.drawPath(path)
