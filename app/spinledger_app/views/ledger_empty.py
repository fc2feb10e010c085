"""The ledger before there is one: what it will hold, what the marks mean."""

from __future__ import annotations

from PySide6.QtCore import QRectF
from PySide6.QtGui import QPainter, QPaintEvent
from PySide6.QtWidgets import QWidget

from spinledger_app.painting.ink import SECOND, SECOND_STRONG, STRONG, Face, Ink
from spinledger_app.painting.marks import paint_mark
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look

_MARGIN = 16


class LedgerEmpty(QWidget):
    """Empty state of the ledger panel."""

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.setAccessibleName(f"{self._title()}. {self._words()}")

    def _title(self) -> str:
        return say("No entries yet")

    def _words(self) -> str:
        return say(
            "The ledger opens when a spectrum and a structure are both here. Each "
            "claim of the structure gets one row: what it claims, what was found, "
            "and how far apart the two are."
        )

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint words and the five marks."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        ink.fill(QRectF(self.rect()), "panel")
        ink.text(_MARGIN, px(24), say("Ledger"), STRONG)
        ink.hline(0, self.width(), px(36))
        ink.text(_MARGIN, px(68), self._title(), Face(size=16, weight=600))
        y = ink.wrapped(
            _MARGIN, px(92), self.width() - 2 * _MARGIN, self._words(),
            Face(size=14, colour="muted"),
        )  # fmt: skip
        y += px(16)
        ink.text(_MARGIN, y, say("What the marks mean"), SECOND_STRONG)
        y += px(8)
        for state, meaning in (
            ("settled", say("claim and signal agree")),
            ("disputed", say("put together, but a residual is too large")),
            ("open", say("nothing found for this claim")),
            ("silent", say("not expected to show here")),
            ("stray", say("a signal that no claim owns")),
        ):
            y += px(28)
            paint_mark(ink, _MARGIN + 6, y - px(4.5), state)
            ink.text(_MARGIN + px(24), y, say(state), STRONG)
            left = _MARGIN + px(92)
            ink.text(left, y, meaning, SECOND, max_width=self.width() - 12 - left)
        painter.end()
