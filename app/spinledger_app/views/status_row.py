"""Status row: what happens at the left, the cursor in the middle, the view right."""

from __future__ import annotations

from PySide6.QtCore import QRectF, Signal
from PySide6.QtGui import QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QWidget

from spinledger_app.painting.ink import SECOND, SECOND_INK, Face, Ink
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look
from spinledger_app.views.controls import TextLink

HEIGHT_PX = 28
_MARGIN = 16


class StatusRow(QWidget):
    """Three texts, a progress line, and a word to cancel with."""

    cancel_wanted = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.middle_left = 272
        self._left = self._middle = self._right = ""
        self._is_error = False
        self._progress: float | None = None
        self.cancel = TextLink(look, say("Cancel"), self)
        self.cancel.hide()
        self.cancel.clicked.connect(self.cancel_wanted)
        self.setFixedHeight(look.px(HEIGHT_PX))

    @property
    def is_error(self) -> bool:
        """Whether what it says is that something is the matter."""
        return self._is_error

    @property
    def words(self) -> str:
        """What the row says at the left."""
        return self._left

    def show_message(self, text: str, *, is_error: bool = False) -> None:
        """Say what happened, or what is the matter."""
        self._left, self._is_error = text, is_error
        self.setAccessibleName(text)
        self.setToolTip(text)
        self.update()

    def show_cursor(self, text: str) -> None:
        """Say what is under the cursor."""
        if text != self._middle:
            self._middle = text
            self.update()

    def show_view(self, text: str) -> None:
        """Say what part of the axis is looked at."""
        self._right = text
        self.update()

    def show_progress(self, fraction: float | None) -> None:
        """Show how far the work is; None when nothing runs."""
        self._progress = fraction
        self.cancel.setVisible(fraction is not None)
        self._lay_out()
        self.update()

    def retune(self) -> None:
        """Take the look's text size again."""
        self.setFixedHeight(self.look.px(HEIGHT_PX))
        self._lay_out()

    def _lay_out(self) -> None:
        hint = self.cancel.sizeHint()
        top = (self.height() - hint.height()) // 2
        x = max(self.middle_left - hint.width() - 8, _MARGIN)
        self.cancel.setGeometry(x, top, hint.width(), hint.height())

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep the word to cancel with in its place."""
        self._lay_out()
        super().resizeEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the row."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        ink.fill(QRectF(self.rect()), "chrome")
        ink.hline(0, self.width(), 0)
        baseline = self.height() - self.look.px(9)
        right = self.width() - _MARGIN
        width = ink.text(right, baseline, self._right, SECOND, align="right")
        end = right - width - 24
        # A message may have the room that the cursor does not use.
        is_long = self._is_error or not self._middle
        left_room = (end if is_long else self.middle_left - 16) - _MARGIN
        if self.cancel.isVisible():
            left_room = self.cancel.x() - _MARGIN - 6
        face = Face(size=13, colour="tone:disputed") if self._is_error else SECOND
        used = ink.text(_MARGIN, baseline, self._left, face, max_width=left_room)
        start = max(self.middle_left, _MARGIN + used + 24)
        if end - start > 60:
            ink.text(start, baseline, self._middle, SECOND_INK, max_width=end - start)
        if self._progress is not None:
            ink.fill(QRectF(0, 0, self.width() * self._progress, 2), "accent")
        painter.end()
