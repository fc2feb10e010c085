"""What is left of the left column when it is folded: one icon a panel."""

from __future__ import annotations

from PySide6.QtCore import QRectF, QSize, Qt, Signal
from PySide6.QtGui import QPainter, QPaintEvent
from PySide6.QtWidgets import QHBoxLayout, QVBoxLayout, QWidget

from spinledger_app.painting.ink import Ink
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look
from spinledger_app.views.controls import IconButton

_RAIL_PX = 44
_LEAST_PX = 240
_MOST_PX = 16777215  # Qt's own: no limit


class Rail(QWidget):
    """A strip 44 px wide with the icons of Sketch and Contenders.

    Signals
    -------
    opened : none
        One of the icons was clicked.
    """

    opened = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.sketch = IconButton(look, "ring", say("Open Sketch (F9)"), parent=self)
        self.contenders = IconButton(
            look, "ledger", say("Open Contenders (F9)"), parent=self
        )
        column = QVBoxLayout(self)
        column.setContentsMargins(8, 8, 8, 8)
        column.setSpacing(8)
        for button in (self.sketch, self.contenders):
            column.addWidget(button, 0, Qt.AlignmentFlag.AlignHCenter)
            button.clicked.connect(lambda _=False: self.opened.emit())
        column.addStretch(1)
        self.setAccessibleName(say("Folded panels"))
        self.retune()

    def retune(self) -> None:
        """Take the look's text size again."""
        self.setFixedWidth(self.look.px(_RAIL_PX))
        for button in (self.sketch, self.contenders):
            button.retune()

    def sizeHint(self) -> QSize:
        """As wide as its icons want."""
        return QSize(self.look.px(_RAIL_PX), 200)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the ground."""
        painter = QPainter(self)
        Ink(painter, self.look, self).fill(QRectF(self.rect()), "panel")
        painter.end()


class LeftColumn(QWidget):
    """The panels of the left side, or the rail in their place."""

    def __init__(self, look: Look, panels: QWidget) -> None:
        super().__init__()
        self.look = look
        self._panels = panels
        self.rail = Rail(look)
        self.rail.hide()
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(0)
        row.addWidget(self.rail)
        row.addWidget(panels, 1)
        self.retune()

    @property
    def is_folded(self) -> bool:
        """Whether only the rail shows."""
        return self._panels.isHidden()

    def set_folded(self, is_folded: bool) -> None:
        """Show the rail or the panels."""
        had_focus = self.isAncestorOf(self.focusWidget() or self)
        self._panels.setHidden(is_folded)
        self.rail.setVisible(is_folded)
        self.retune()
        if is_folded and had_focus:
            self.rail.sketch.setFocus(Qt.FocusReason.OtherFocusReason)

    def retune(self) -> None:
        """Take the look's text size again."""
        self.rail.retune()
        least = _RAIL_PX if self.is_folded else _LEAST_PX
        self.setMinimumWidth(self.look.px(least))
        self.setMaximumWidth(self.look.px(_RAIL_PX) if self.is_folded else _MOST_PX)
