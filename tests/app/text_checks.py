"""Checks of painted and labelled text: contrast, clipping, overlap."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

from PySide6.QtCore import QPoint, QRect, QRectF
from PySide6.QtGui import QColor, QImage
from PySide6.QtWidgets import QLabel, QWidget

from spinledger_app.theme import TextRect

# WCAG 2.1, success criterion 1.4.3: 4.5 : 1 for ordinary text.
LEAST_CONTRAST = 4.5


def luminance(colour: QColor) -> float:
    """Relative luminance of WCAG 2.1."""

    def linear(value: float) -> float:
        return value / 12.92 if value <= 0.03928 else ((value + 0.055) / 1.055) ** 2.4

    return (
        0.2126 * linear(colour.redF())
        + 0.7152 * linear(colour.greenF())
        + 0.0722 * linear(colour.blueF())
    )


def contrast(one: QColor, other: QColor) -> float:
    """Contrast ratio of WCAG 2.1."""
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


@dataclass(frozen=True)
class Shown:
    """A text on the window: what it says and where."""

    text: str
    rect: QRectF
    colour: QColor
    is_clipped: bool


def texts_of(window: QWidget, log: list[TextRect]) -> list[Shown]:
    """All texts of a window, painted ones from the log and those of labels."""
    shown = []
    for one in log:
        owner = one.owner
        assert isinstance(owner, QWidget)
        if not owner.isVisible():
            continue
        corner = owner.mapTo(window, QPoint(0, 0))
        rect = QRectF(*one.rect)
        room = QRectF(*one.room).adjusted(-0.6, -0.6, 0.6, 0.6)
        visible = _visible_part(owner, window)
        placed = rect.translated(QRectF(corner, corner).topLeft())
        if not visible.intersects(placed):
            continue  # scrolled away
        is_clipped = not room.contains(rect)
        shown.append(Shown(one.text, placed, QColor(one.colour), is_clipped))
    for label in window.findChildren(QLabel):
        if label.isVisible() and label.text() and label.wordWrap():
            needed = label.heightForWidth(label.width())
            corner = label.mapTo(window, QPoint(0, 0))
            rect = QRectF(QRect(corner, label.size()))
            colour = label.palette().windowText().color()
            is_clipped = needed > label.height() + 1
            shown.append(Shown(label.text(), rect, colour, is_clipped))
    return shown


def _visible_part(owner: QWidget, window: QWidget) -> QRectF:
    region = owner.visibleRegion().boundingRect()
    return QRectF(QRect(owner.mapTo(window, region.topLeft()), region.size()))


def ground_of(image: QImage, rect: QRectF, ratio: float) -> QColor:
    """Commonest colour in and around a text: what it stands on."""
    counts: Counter[int] = Counter()
    left, right = int((rect.left() - 2) * ratio), int((rect.right() + 2) * ratio)
    top, bottom = int((rect.top() - 2) * ratio), int((rect.bottom() + 2) * ratio)
    step = max(1, int(ratio))
    for y in range(max(top, 0), min(bottom, image.height() - 1) + 1, step):
        for x in range(max(left, 0), min(right, image.width() - 1) + 1, step):
            counts[image.pixel(x, y)] += 1
    return QColor.fromRgb(counts.most_common(1)[0][0])


def faults(window: QWidget, log: list[TextRect], image: QImage) -> list[str]:
    """Everything that is wrong with the texts of a window, in words."""
    ratio = image.width() / window.width()
    shown = texts_of(window, log)
    found = []
    for index, one in enumerate(shown):
        if one.is_clipped:
            found.append(f"clipped: {one.text!r} at {_at(one)}")
        ground = ground_of(image, one.rect, ratio)
        ratio_found = contrast(one.colour, ground)
        if ratio_found < LEAST_CONTRAST:
            found.append(
                f"contrast {ratio_found:.1f}: {one.text!r} at {_at(one)}, "
                f"{one.colour.name()} on {ground.name()}"
            )
        for other in shown[index + 1 :]:
            overlap = one.rect.intersected(other.rect)
            if overlap.width() > 0.5 and overlap.height() > 0.5:
                found.append(f"overlap: {one.text!r} and {other.text!r} at {_at(one)}")
    return found


def _at(one: Shown) -> str:
    return f"({one.rect.x():.0f}, {one.rect.y():.0f})"
