"""A painter that knows the look: text, rules and paths by token; logical px."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QBrush, QColor, QPainter, QPainterPath, QPen
from PySide6.QtWidgets import QWidget

from spinledger_app.theme import Look, TextRect

Align = Literal["left", "right", "centre"]
_SUBSCRIPT_LABEL = re.compile(r"^(.*H)([A-D])(′*)$")
_SUBSCRIPT_SIZE = 0.8
_COUNT = re.compile(r"H(\d+)(?![-,\d′])")
_SUBSCRIPTS = str.maketrans("0123456789", "₀₁₂₃₄₅₆₇₈₉")
_ELLIPSIS = "…"


@dataclass(frozen=True, slots=True, kw_only=True)
class Face:
    """How one text is set: size in px, weight 400 or 600, colour token, slant."""

    size: float = 14
    weight: int = 400
    colour: str = "ink"
    italic: bool = False


BODY = Face()
BODY_MUTED = Face(colour="muted")
STRONG = Face(weight=600)
SECOND = Face(size=13, colour="muted")
SECOND_INK = Face(size=13)
SECOND_STRONG = Face(size=13, weight=600)
CAPTION = Face(size=12, colour="muted")
CAPTION_INK = Face(size=12)


class Ink:
    """Paints with a look's tokens on one painter; notes texts where asked to.

    Parameters
    ----------
    painter : QPainter
    look : Look
    owner : QWidget or None
        The widget that is painted, for the text log.

    Attributes
    ----------
    columns_per_px : float
        How finely curves are drawn: the device's pixels, more for paper.
    """

    def __init__(
        self, painter: QPainter, look: Look, owner: QWidget | None = None
    ) -> None:
        self.painter = painter
        self.look = look
        self._owner = owner
        self.columns_per_px = painter.device().devicePixelRatioF()
        painter.setRenderHints(
            QPainter.RenderHint.Antialiasing | QPainter.RenderHint.TextAntialiasing
        )

    def colour(self, token: str | QColor) -> QColor:
        """Colour by token; colours pass through."""
        return token if isinstance(token, QColor) else self.look.colour(token)

    def text(
        self,
        x: float,
        baseline: float,
        text: str,
        face: Face = BODY,
        *,
        align: Align = "left",
        max_width: float | None = None,
    ) -> float:
        """Paint one line of text on a baseline; gives its width.

        A text wider than ``max_width`` ends in an ellipsis.
        """
        metrics = self.look.metrics(face.size, face.weight, face.italic)
        shown = text
        width = self.look.width(text, face.size, face.weight, face.italic)
        if max_width is not None and width > max_width:
            shown = elided(metrics.horizontalAdvance, text, max_width)
            width = metrics.horizontalAdvance(shown)
        left = x - {"left": 0.0, "centre": width / 2, "right": width}[align]
        colour = self.colour(face.colour)
        self.painter.setFont(self.look.font(face.size, face.weight, face.italic))
        self.painter.setPen(colour)
        self.painter.drawText(QPointF(round(left), round(baseline)), shown)
        cap = metrics.capHeight()
        self._note(shown, QRectF(left, baseline - cap, width, cap), colour)
        return width

    def label(
        self,
        x: float,
        baseline: float,
        label: str,
        face: Face = STRONG,
        *,
        align: Align = "left",
        max_width: float | None = None,
    ) -> float:
        """Paint a claim's label, its A or B lowered; gives its width."""
        label = shown_label(label)
        width = label_width(self.look, label, face)
        match = _SUBSCRIPT_LABEL.match(label)
        if match is None or (max_width is not None and width > max_width):
            return self.text(x, baseline, label, face, align=align, max_width=max_width)
        left = x - {"left": 0.0, "centre": width / 2, "right": width}[align]
        small = Face(
            size=face.size * _SUBSCRIPT_SIZE,
            weight=face.weight,
            colour=face.colour,
            italic=face.italic,
        )
        stem, lowered, primes = match.groups()
        metrics = self.look.metrics(face.size, face.weight)
        log, self.look.text_log = self.look.text_log, None
        end = left + self.text(left, baseline, stem, face)
        end += self.text(end, baseline + face.size * 0.16, lowered, small)
        if primes:
            self.text(end, baseline, primes, face)
        self.look.text_log = log
        cap = metrics.capHeight()
        self._note(
            label, QRectF(left, baseline - cap, width, cap), self.colour(face.colour)
        )
        return width

    def wrapped(
        self,
        x: float,
        baseline: float,
        width: float,
        text: str,
        face: Face = SECOND,
        *,
        max_lines: int | None = None,
    ) -> float:
        """Paint text over several lines; gives the baseline after the last."""
        lines = wrap(self.look, text, width, face)
        if max_lines is not None and len(lines) > max_lines:
            rest = " ".join(lines[max_lines - 1 :])
            lines = [*lines[: max_lines - 1], rest]
        step = self.look.px(face.size + 4)
        for line in lines:
            self.text(x, baseline, line, face, max_width=width)
            baseline += step
        return baseline

    def fill(self, rect: QRectF, colour: str | QColor, radius: float = 0.0) -> None:
        """Fill a rectangle without an edge."""
        if not radius:
            self.painter.fillRect(rect, self.colour(colour))
            return
        self.painter.setPen(Qt.PenStyle.NoPen)
        self.painter.setBrush(self.colour(colour))
        self.painter.drawRoundedRect(rect, radius, radius)
        self.painter.setBrush(Qt.BrushStyle.NoBrush)

    def box(
        self,
        rect: QRectF,
        *,
        fill: str | QColor | None = None,
        edge: str | QColor = "edge",
        radius: float = 4.0,
        width: float = 1.0,
        dashed: bool = False,
    ) -> None:
        """Rounded box whose edge lies wholly inside the rectangle."""
        pen = QPen(self.colour(edge), width)
        if dashed:
            pen.setDashPattern([3.0, 3.0])
        self.painter.setPen(pen)
        self.painter.setBrush(
            QBrush(self.colour(fill)) if fill is not None else QBrush()
        )
        half = width / 2
        inner = rect.adjusted(half, half, -half, -half)
        self.painter.drawRoundedRect(inner, radius, radius)
        self.painter.setBrush(Qt.BrushStyle.NoBrush)

    def hline(
        self, x0: float, x1: float, y: float, colour: str | QColor = "hairline"
    ) -> None:
        """Horizontal rule of 1 px whose upper side is at ``y``."""
        self.painter.fillRect(QRectF(x0, y, x1 - x0, 1), self.colour(colour))

    def vline(
        self, x: float, y0: float, y1: float, colour: str | QColor = "hairline"
    ) -> None:
        """Vertical rule of 1 px whose left side is at ``x``."""
        self.painter.fillRect(QRectF(x, y0, 1, y1 - y0), self.colour(colour))

    def line(
        self,
        start: tuple[float, float],
        end: tuple[float, float],
        colour: str | QColor,
        width: float = 1.0,
        cap: Qt.PenCapStyle = Qt.PenCapStyle.FlatCap,
    ) -> None:
        """Straight stroke."""
        pen = QPen(self.colour(colour), width)
        pen.setCapStyle(cap)
        self.painter.setPen(pen)
        self.painter.drawLine(QPointF(*start), QPointF(*end))

    def stroke(
        self,
        path: QPainterPath,
        colour: str | QColor,
        width: float = 1.0,
        *,
        fill: str | QColor | None = None,
        dashes: list[float] | None = None,
        mitred: bool = False,
    ) -> None:
        """Stroke a path, filled where asked."""
        pen = QPen(self.colour(colour), width)
        pen.setCapStyle(Qt.PenCapStyle.RoundCap)
        pen.setJoinStyle(
            Qt.PenJoinStyle.MiterJoin if mitred else Qt.PenJoinStyle.RoundJoin
        )
        if dashes is not None:
            pen.setDashPattern(dashes)
        self.painter.setPen(pen)
        self.painter.setBrush(
            QBrush(self.colour(fill)) if fill is not None else QBrush()
        )
        self.painter.drawPath(path)
        self.painter.setBrush(Qt.BrushStyle.NoBrush)

    def area(self, path: QPainterPath, colour: str | QColor) -> None:
        """Fill a path without an edge."""
        self.painter.setPen(Qt.PenStyle.NoPen)
        self.painter.setBrush(self.colour(colour))
        self.painter.drawPath(path)
        self.painter.setBrush(Qt.BrushStyle.NoBrush)

    def _note(self, text: str, rect: QRectF, colour: QColor) -> None:
        if self.look.text_log is None or not text.strip():
            return
        room = QRectF(rect) if self._owner is None else QRectF(self._owner.rect())
        if self.painter.hasClipping():
            room = room.intersected(self.painter.clipBoundingRect())
        self.look.text_log.append(
            TextRect(
                owner=self._owner,
                text=text,
                rect=(rect.x(), rect.y(), rect.width(), rect.height()),
                room=(room.x(), room.y(), room.width(), room.height()),
                colour=colour.name(),
            )
        )


def elided(measure: Callable[[str], float], text: str, max_width: float) -> str:
    """Longest beginning of a text that fits with an ellipsis."""
    for end in range(len(text) - 1, 0, -1):
        shown = text[:end].rstrip() + _ELLIPSIS
        if measure(shown) <= max_width:
            return shown
    return _ELLIPSIS


def shown_label(label: str) -> str:
    """Label with real glyphs: primes, subscript counts, raised charge."""
    text = label.replace("'", "′")
    text = _COUNT.sub(lambda m: "H" + m.group(1).translate(_SUBSCRIPTS), text)
    return text[:-1] + "⁺" if text.endswith("+") else text


def label_width(look: Look, label: str, face: Face = STRONG) -> float:
    """Width of a claim's label as :meth:`Ink.label` paints it, px."""
    label = shown_label(label)
    match = _SUBSCRIPT_LABEL.match(label)
    if match is None:
        return look.width(label, face.size, face.weight)
    stem, lowered, primes = match.groups()
    return look.width(stem + primes, face.size, face.weight) + look.width(
        lowered, face.size * _SUBSCRIPT_SIZE, face.weight
    )


def wrap(look: Look, text: str, width: float, face: Face = SECOND) -> list[str]:
    """Text cut at spaces into lines no wider than ``width``."""
    metrics = look.metrics(face.size, face.weight, face.italic)
    lines: list[str] = []
    current = ""
    for word in text.split(" "):
        longer = f"{current} {word}".strip()
        if current and metrics.horizontalAdvance(longer) > width:
            lines.append(current)
            current = word
        else:
            current = longer
    return [*lines, current] if current else lines
