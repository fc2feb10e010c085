"""Recipe strip: one chip a processing step, scrolling sideways, never wrapping."""

from __future__ import annotations

from PySide6.QtCore import QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import (
    QKeyEvent,
    QPainter,
    QPainterPath,
    QPaintEvent,
    QResizeEvent,
    QWheelEvent,
)
from PySide6.QtWidgets import QAbstractButton, QWidget

from spinledger_app.painting.ink import CAPTION, SECOND, SECOND_INK, STRONG, Ink
from spinledger_app.presenters.recipe import ChipText
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look

HEIGHT_PX = 52
_CHIP_PX = 40
_LEFT = 16
_THREAD_PX = 16


class Chip(QAbstractButton):
    """Name over value; a corner where it was set by hand, a line while it runs."""

    def __init__(
        self, look: Look, text: ChipText, parent: QWidget | None = None
    ) -> None:
        super().__init__(parent)
        self.look = look
        self.chip = text
        self.progress: float | None = None
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setToolTip(f"{text.name}: {text.value}\n{text.tip}".strip())
        self.setAccessibleName(f"{text.name}, {text.value}")
        self.resize(self.sizeHint())

    def sizeHint(self) -> QSize:
        """As wide as its words."""
        name = self.look.width(self.chip.name, 12)
        value = self.look.width(self.chip.value, 13)
        return QSize(round(max(name, value)) + 17, self.look.px(_CHIP_PX))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the chip."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        rect = QRectF(self.rect())
        fill = "hover" if self.underMouse() else "panel"
        ink.box(rect, fill=fill, edge="hairline", dashed=self.chip.is_off)
        if self.chip.is_by_hand:
            corner = QPainterPath(QPointF(rect.right() - 9, 0.5))
            corner.lineTo(rect.right() - 0.5, 0.5)
            corner.lineTo(rect.right() - 0.5, 9)
            corner.closeSubpath()
            ink.area(corner, "accent")
        ink.text(8, px(16), self.chip.name, CAPTION)
        ink.text(8, px(32), self.chip.value, SECOND_INK)
        if self.progress is not None:
            bar = QRectF(1, rect.bottom() - 2, (rect.width() - 2) * self.progress, 2)
            ink.fill(bar, "accent")
        painter.end()


class RecipeView(QWidget):
    """The strip with its chips."""

    chip_clicked = Signal(int)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.gutter = 88
        self.chips: list[Chip] = []
        self._scroll = 0
        self._texts: tuple[ChipText, ...] = ()
        self._room = QWidget(self)
        self.setFixedHeight(look.px(HEIGHT_PX) + 1)
        self.setAccessibleName(say("Recipe"))

    def show_chips(self, texts: tuple[ChipText, ...]) -> None:
        """Show other steps."""
        if texts == self._texts:
            return
        self._texts = texts
        for chip in self.chips:
            chip.hide()
            chip.deleteLater()
        self.chips = []
        for text in texts:
            chip = Chip(self.look, text, self._room)
            chip.clicked.connect(
                lambda _=False, step=text.step: self.chip_clicked.emit(step)
            )
            chip.show()
            self.chips.append(chip)
        self._scroll = 0
        self._lay_out()

    def show_progress(self, fraction: float | None) -> None:
        """Let the last chip show how far processing is; None when it is done."""
        for chip in self.chips:
            chip.progress = None
        if self.chips and fraction is not None:
            self.chips[-1].progress = fraction
        for chip in self.chips:
            chip.update()

    def retune(self) -> None:
        """Take the look's text size again."""
        self.setFixedHeight(self.look.px(HEIGHT_PX) + 1)
        for chip in self.chips:
            chip.resize(chip.sizeHint())
        self._lay_out()

    def _lay_out(self) -> None:
        px = self.look.px
        self._room.setGeometry(
            self.gutter, 0, max(self.width() - self.gutter - 8, 10), self.height() - 1
        )
        widths = [chip.sizeHint().width() for chip in self.chips]
        room = self._room.width()
        n_gaps = max(len(widths) - 1, 1)
        gap = min(_THREAD_PX, max(4, (room - sum(widths)) // n_gaps))
        overflow = max(0, sum(widths) + gap * (len(widths) - 1) - room)
        self._scroll = min(max(self._scroll, 0), overflow)
        x = -self._scroll
        for chip, width in zip(self.chips, widths, strict=True):
            chip.setGeometry(x, px(6), width, px(_CHIP_PX))
            x += width + gap
        self.update()

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Lay the chips out again."""
        self._lay_out()
        super().resizeEvent(event)

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Scroll sideways."""
        delta = event.angleDelta().y() or event.angleDelta().x()
        self._scroll -= delta // 2
        self._lay_out()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Arrows go from chip to chip."""
        arrows = {Qt.Key.Key_Left: -1, Qt.Key.Key_Right: 1}
        by = arrows.get(Qt.Key(event.key()))
        focused = next((i for i, c in enumerate(self.chips) if c.hasFocus()), None)
        if by is None or focused is None:
            super().keyPressEvent(event)
            return
        chip = self.chips[(focused + by) % len(self.chips)]
        chip.setFocus(Qt.FocusReason.TabFocusReason)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint ground, name and the thread between the chips."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        ink.fill(QRectF(self.rect()), "chrome")
        ink.text(_LEFT, px(31), say("Recipe"), STRONG)
        if not self.chips:
            words = say(
                "Each processing step will appear here, in order, and can be opened "
                "and changed."
            )
            room = self.width() - self.gutter - 8
            ink.text(self.gutter, px(31), words, SECOND, max_width=room)
        for before, after in zip(self.chips, self.chips[1:], strict=False):
            x0 = self.gutter + before.geometry().right() + 1
            x1 = self.gutter + after.geometry().left()
            if x1 > self.gutter and x0 < self.width():
                ink.hline(max(x0, self.gutter), x1, px(26), "edge")
        ink.hline(0, self.width(), self.height() - 1)
        painter.end()
