"""Menu row: menus left, title in the middle, undo, redo, Refine and Report right."""

from __future__ import annotations

from PySide6.QtCore import QRectF, Qt
from PySide6.QtGui import QPainter, QPaintEvent
from PySide6.QtWidgets import QHBoxLayout, QMenuBar, QWidget

from spinledger_app.painting.ink import BODY_MUTED, Ink
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look
from spinledger_app.views.controls import BenchButton, IconButton

HEIGHT_PX = 36


class MenuRow(QWidget):
    """The row over the panels; its buttons are wired by the window."""

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self._title = ""
        self._right_px = 0
        self.menus = QMenuBar(self)
        self.menus.setNativeMenuBar(False)
        self.undo = IconButton(look, "undo", say("Undo (Ctrl+Z)"))
        self.redo = IconButton(look, "redo", say("Redo (Ctrl+Shift+Z)"))
        self.refine = BenchButton(look, say("Refine"), key="R")
        self.report = BenchButton(look, say("Report…"), key="Ctrl+R", is_primary=True)
        self._build()

    def _build(self) -> None:
        self.setFixedHeight(self.look.px(HEIGHT_PX))
        self.menus.setFont(self.look.font())
        row = QHBoxLayout(self)
        row.setContentsMargins(6, 0, 16, 1)
        row.setSpacing(8)
        row.addWidget(self.menus, 0, Qt.AlignmentFlag.AlignVCenter)
        row.addStretch(1)
        row.addWidget(self.undo)
        row.addWidget(self.redo)
        row.addWidget(self.refine)
        row.addWidget(self.report)
        self.refine.setToolTip(
            say("Solve the ledger again with the hand edits that were made (R)")
        )
        self.report.setToolTip(say("Write the report into a folder (Ctrl+R)"))

    def show_title(self, title: str, *, can_work: bool) -> None:
        """Show the project's title; the buttons hide while there is nothing."""
        self._title = title
        for button in (self.undo, self.redo, self.refine, self.report):
            button.setVisible(can_work)
        self.update()

    def retune(self) -> None:
        """Take the look's text size again."""
        self.setFixedHeight(self.look.px(HEIGHT_PX))
        self.menus.setFont(self.look.font())
        for button in (self.undo, self.redo):
            button.retune()
        self.updateGeometry()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint ground, hairline and the title between menus and buttons."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        ink.fill(QRectF(self.rect()), "chrome")
        ink.hline(0, self.width(), self.height() - 1)
        left = self.menus.geometry().right() + 16
        right = (
            self.undo.geometry().left() - 16
            if self.undo.isVisible()
            else (self.width() - 16)
        )
        width = self.look.width(self._title)
        middle = min(max(self.width() / 2, left + width / 2), right - width / 2)
        if right - left > 60:
            if width > right - left:
                middle = (left + right) / 2
            ink.text(
                middle,
                self.look.px(23),
                self._title,
                BODY_MUTED,
                align="centre",
                max_width=right - left,
            )
        painter.end()
