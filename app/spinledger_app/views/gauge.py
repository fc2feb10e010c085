"""Residual gauge: shift as a tick, J as a triangle, integral as a dot, in sd."""

from __future__ import annotations

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QPainterPath

from spinledger_app.painting.ink import SECOND, Ink
from spinledger_app.presenters.ledger import Gauge

_LIMIT_SD = 4.0
_BAND_SD = 2.0


def paint_gauge(ink: Ink, gauge: Gauge, rect: QRectF, ground: str = "panel") -> None:
    """Paint three tracks over the ±2 sd band; beyond 4 sd pinned at the edge."""
    middle = round(rect.center().x())
    unit = rect.width() / 2 / _LIMIT_SD
    track = 11.0 if rect.height() > 30 else 7.0
    centre = rect.center().y()
    reach = track + 5
    band = QRectF(
        middle - _BAND_SD * unit, centre - reach, 2 * _BAND_SD * unit, 2 * reach
    )
    ink.fill(band, "band", 2)
    ink.vline(middle, centre - reach, centre + reach, "edge")
    values = (gauge.shift, gauge.coupling, gauge.integral)
    for index, value in enumerate(values):
        y = centre + (index - 1) * track
        if value is None:
            ink.hline(middle - 3, middle + 4, round(y), "edge")
            continue
        held = min(max(value, -_LIMIT_SD), _LIMIT_SD)
        x = middle + 0.5 + held * unit
        x = min(max(x, rect.left() + 4.5), rect.right() - 4.5)
        is_off = abs(value) > _BAND_SD
        colour = "tone:disputed" if is_off else "ink"
        if abs(x - middle) > 2:
            left, width = min(middle + 0.5, x), abs(x - middle - 0.5)
            ink.fill(QRectF(left, y - 0.6, width, 1.2), colour)
        hollow = not is_off or gauge.is_booked_elsewhere
        _glyph(ink, index, x, y, (colour, ground if hollow else "fill:disputed"))


def _glyph(ink: Ink, index: int, x: float, y: float, colours: tuple[str, str]) -> None:
    colour, fill = colours
    if index == 0:
        ink.fill(QRectF(round(x) - 1, y - 4, 2.5, 8), colour)
    elif index == 1:
        path = QPainterPath(QPointF(x, y - 4))
        path.lineTo(x + 4.2, y + 3.4)
        path.lineTo(x - 4.2, y + 3.4)
        path.closeSubpath()
        ink.stroke(path, colour, 1.3, fill=fill, mitred=True)
    else:
        painter = ink.painter
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(ink.colour(colour))
        painter.drawEllipse(QPointF(x, y), 3, 3)
        painter.setBrush(Qt.BrushStyle.NoBrush)


def paint_gauge_key(ink: Ink, right: float, baseline: float) -> None:
    """The three glyphs with what they stand for, ending at ``right``."""
    px = ink.look.px
    left = right - px(74)
    ink.fill(QRectF(left, baseline - 10, 2, 11), "ink")
    ink.text(left + px(7), baseline, "δ", SECOND)
    _glyph(ink, 1, left + px(28), baseline - 5, ("ink", "panel"))
    ink.text(left + px(36), baseline, "J", SECOND)
    _glyph(ink, 2, left + px(57), baseline - 5, ("ink", "ink"))
    ink.text(left + px(65), baseline, "∫", SECOND)
