"""Head of the ledger: verdict with reasons, and the balance bar."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QHelpEvent, QMouseEvent, QPainter, QPaintEvent
from PySide6.QtWidgets import QSizePolicy, QToolTip, QWidget

from spinledger_app.painting.ink import (
    CAPTION_INK,
    SECOND,
    Face,
    Ink,
    label_width,
    wrap,
)
from spinledger_app.painting.marks import paint_balance
from spinledger_app.presenters.ledger import BalanceCell, BalanceText, VerdictText
from spinledger_app.presenters.wording import protons, say
from spinledger_app.theme import Look

_MARGIN = 16
_BAR_LEFT = 78
_MOST_LINES = 2
_CELL_GAP = 2.0


class VerdictView(QWidget):
    """Scales, verdict word, probability and two lines of reasons; a click unfolds."""

    unfolded = Signal(bool)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self._text: VerdictText | None = None
        self._is_unfolded = False
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setProperty("focusInside", True)
        self.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Fixed)

    def show_verdict(self, text: VerdictText) -> None:
        """Show another verdict."""
        self._text = text
        spoken = f"{text.word}, {say('probability')} {text.probability}. {text.reasons}"
        self.setAccessibleName(spoken)
        tip = "\n".join(p for p in (text.detail or text.reasons, text.ratio) if p)
        self.setToolTip(tip)
        self.updateGeometry()
        self.update()

    def sizeHint(self) -> QSize:
        """Two lines of reasons, or all of them when unfolded."""
        px = self.look.px
        n_lines = self._lines() if self._is_unfolded else _MOST_LINES
        extra = px(17) if self._is_unfolded and self._text and self._text.ratio else 0
        return QSize(360, px(58) + px(17) * (n_lines - 1) + px(13) + extra)

    def _lines(self) -> int:
        if self._text is None:
            return _MOST_LINES
        width = self.width() - 2 * _MARGIN
        return max(_MOST_LINES, len(wrap(self.look, self._text.reasons, width, SECOND)))

    def toggle(self) -> None:
        """Show all reasons, or only two lines of them."""
        self._is_unfolded = not self._is_unfolded
        self.updateGeometry()
        self.update()
        self.unfolded.emit(self._is_unfolded)

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Unfold or fold."""
        if event.button() == Qt.MouseButton.LeftButton:
            self.toggle()

    def keyPressEvent(self, event: object) -> None:
        """Unfold with Enter or Space."""
        key = getattr(event, "key", lambda: 0)()
        if key in (Qt.Key.Key_Return, Qt.Key.Key_Enter, Qt.Key.Key_Space):
            self.toggle()
        else:
            super().keyPressEvent(event)  # type: ignore[arg-type]

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the head."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        text = self._text
        if text is not None:
            right = self.width() - _MARGIN
            paint_balance(ink, _MARGIN, px(16), text.tilt_deg, "ink")
            baseline = px(34)
            width = ink.text(
                right, baseline, text.probability, Face(size=22), align="right"
            )
            word = say("probability")
            x = right - width - 8
            x -= ink.text(x, baseline, word, SECOND, align="right")
            room = x - 8 - _MARGIN - 44
            used = ink.text(
                _MARGIN + 44,
                baseline,
                text.word,
                Face(size=22, weight=600),
                max_width=room,
            )
            if text.before and room - used > 40:
                ink.text(
                    _MARGIN + 44 + used + 10, baseline, text.before, Face(size=12, colour="muted"),
                    max_width=room - used - 14,
                )  # fmt: skip
            n_lines = None if self._is_unfolded else _MOST_LINES
            y = ink.wrapped(
                _MARGIN,
                px(58),
                right - _MARGIN,
                text.reasons,
                SECOND,
                max_lines=n_lines,
            )
            if self._is_unfolded and text.ratio:
                ink.text(_MARGIN, y, text.ratio, SECOND)
        ink.hline(0, self.width(), self.height() - 1)
        painter.end()


def short_label(label: str) -> str:
    """Label without its H, for narrow cells: 2-HA is 2A, 3-H is 3."""
    head, dash, tail = label.rpartition("-H")
    return head + tail if dash and head else label


class BalanceView(QWidget):
    """Claimed cells over found cells on one proton scale."""

    claim_hovered = Signal(object)
    claim_clicked = Signal(str)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self._text: BalanceText | None = None
        self._hovered: str | None = None
        self._selected: str | None = None
        self.setMouseTracking(True)
        self.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Fixed)

    def show_balance(self, text: BalanceText) -> None:
        """Show another balance."""
        self._text = text
        spoken = say("Balance: {0} claimed, {1} found")
        self.setAccessibleName(
            spoken.replace("{0}", text.claimed).replace("{1}", text.found)
        )
        self.update()

    def show_marks(self, hovered: str | None, selected: str | None) -> None:
        """Set off the claim that is pointed at anywhere."""
        if (hovered, selected) != (self._hovered, self._selected):
            self._hovered, self._selected = hovered, selected
            self.update()

    def sizeHint(self) -> QSize:
        """Two rows of cells."""
        return QSize(360, self.look.px(60))

    def _unit(self) -> float:
        text = self._text
        if text is None:
            return 1.0
        left = self.look.px(_BAR_LEFT)
        claimed = sum(cell.claimed for cell in text.cells)
        found = sum(cell.found for cell in text.cells) + sum(text.stray_protons)
        room = self.width() - _MARGIN - left - 3 * len(text.stray_protons)
        return float(room / max(claimed, found, 1.0) * 0.985)

    def _spans(self) -> list[tuple[BalanceCell, float, float]]:
        """Every cell with the left and right end of its claimed half."""
        if self._text is None:
            return []
        x = float(self.look.px(_BAR_LEFT))
        unit = self._unit()
        spans = []
        for cell in self._text.cells:
            spans.append((cell, x, x + cell.claimed * unit))
            x += cell.claimed * unit
        return spans

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint names and cells."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        ink.text(_MARGIN, px(24), say("Claimed"), SECOND)
        ink.text(_MARGIN, px(45), say("Found"), SECOND)
        for cell, left, right in self._spans():
            self._paint_claimed(ink, cell, left, right)
        self._paint_found(ink)
        ink.hline(0, self.width(), self.height() - 1)
        painter.end()

    def _paint_claimed(
        self, ink: Ink, cell: BalanceCell, left: float, right: float
    ) -> None:
        px = self.look.px
        is_lit = cell.claim in (self._hovered, self._selected)
        width = max(right - left - _CELL_GAP, 1.5)
        rect = QRectF(left, px(11), width, px(18))
        ink.box(
            rect,
            fill="selected" if is_lit else "field",
            edge="accent" if is_lit else "edge",
            radius=2,
        )
        for text in (cell.claim, short_label(cell.claim)):
            if label_width(self.look, text, CAPTION_INK) <= rect.width() - 5:
                middle = rect.center().x()
                ink.label(middle, px(24.5), text, CAPTION_INK, align="centre")
                return

    def _paint_found(self, ink: Ink) -> None:
        text = self._text
        if text is None:
            return
        px = self.look.px
        unit = self._unit()
        x = float(px(_BAR_LEFT))
        for cell in text.cells:
            width = cell.found * unit
            if width > _CELL_GAP:
                rect = QRectF(x, px(33), width - _CELL_GAP, px(15))
                tone = f"tone:{cell.state}"
                ink.box(rect, fill=f"fill:{cell.state}", edge=tone, radius=2)
            x += width
        for amount in text.stray_protons:
            rect = QRectF(x, px(33), max(amount * unit, 3.0), px(15))
            ink.box(rect, fill="fill:stray", edge="tone:stray", radius=1)
            x += rect.width() + 2

    def _claim_at(self, x: float) -> BalanceCell | None:
        for cell, left, right in self._spans():
            if left <= x <= right:
                return cell
        return None

    def event(self, event: QEvent) -> bool:
        """Tool tip of the cell under the mouse."""
        if event.type() == QEvent.Type.ToolTip and self._text is not None:
            assert isinstance(event, QHelpEvent)
            cell = self._claim_at(event.pos().x())
            tip = self._text.tip
            if cell is not None:
                tip = say("{0}: {1} H claimed, {2} found").replace("{0}", cell.claim)
                tip = tip.replace("{1}", f"{cell.claimed:g}")
                tip = tip.replace("{2}", protons(cell.found)) + "\n" + self._text.tip
            QToolTip.showText(event.globalPos(), tip, self)
            return True
        return super().event(event)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Point at a claim."""
        cell = self._claim_at(event.position().x())
        self.claim_hovered.emit(None if cell is None else cell.claim)

    def leaveEvent(self, event: QEvent) -> None:
        """Point at nothing."""
        self.claim_hovered.emit(None)

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Select a claim."""
        cell = self._claim_at(event.position().x())
        if cell is not None:
            self.claim_clicked.emit(cell.claim)
