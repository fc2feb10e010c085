"""Rows of the ledger: entries that unfold, strays, further measurements."""

from __future__ import annotations

from dataclasses import dataclass

from PySide6.QtCore import QEvent, QPoint, QRectF, QSize, Qt, Signal
from PySide6.QtGui import (
    QContextMenuEvent,
    QKeyEvent,
    QMouseEvent,
    QPainter,
    QPaintEvent,
    QResizeEvent,
)
from PySide6.QtWidgets import (
    QHBoxLayout,
    QLabel,
    QLineEdit,
    QSizePolicy,
    QVBoxLayout,
    QWidget,
)

from spinledger_app.painting.ink import (
    BODY,
    SECOND,
    SECOND_INK,
    SECOND_STRONG,
    STRONG,
    Face,
    Ink,
    wrap,
)
from spinledger_app.painting.marks import paint_mark
from spinledger_app.presenters.ledger import AdviceText, RowText, StrayText
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look
from spinledger_app.views.controls import BenchButton
from spinledger_app.views.gauge import paint_gauge

MARGIN = 16


@dataclass(frozen=True, slots=True, kw_only=True)
class Columns:
    """Left ends of the ledger's columns, and the gauge's width, px."""

    label: float
    claimed: float
    found: float
    protons: float
    gauge: float
    right: float


def columns_for(look: Look, width: float, widest_label: float) -> Columns:
    """Columns of a ledger of this width; long labels take from the gauge first."""
    px = look.px
    is_wide = width >= px(430)
    label = float(MARGIN + px(24 if is_wide else 20))
    label_room = min(max(widest_label, px(40)), px(84))
    claimed = label + label_room + px(10 if is_wide else 6)
    right = width - MARGIN
    gauge_width = px(92) if is_wide else max(px(56), px(78) - (label_room - px(40)))
    gauge = right - gauge_width
    found = claimed + (gauge - claimed) * 0.51
    return Columns(
        label=label,
        claimed=claimed,
        found=found,
        protons=found + px(60 if is_wide else 48),
        gauge=gauge,
        right=right,
    )


class LedgerRow(QWidget):
    """One entry: claimed left, found right, gauge; unfolds to its reasons."""

    clicked = Signal(str)
    hovered = Signal(object)
    action_wanted = Signal(str, str)
    couplings_typed = Signal(str, str)
    shift_typed = Signal(str, str)
    menu_wanted = Signal(str, QPoint)
    step_wanted = Signal(int)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.row: RowText | None = None
        self.columns: Columns | None = None
        self.height_px = 44
        self._is_lit = False
        self._is_selected = False
        self._body: QWidget | None = None
        self._editor: QLineEdit | None = None
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setProperty("focusInside", True)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Fixed)
        self._layout = QVBoxLayout(self)
        self._layout.setContentsMargins(MARGIN, 0, MARGIN, 0)
        self._layout.setSpacing(0)

    @property
    def claim(self) -> str:
        """Label of the row's claim."""
        return "" if self.row is None else self.row.claim

    @property
    def is_unfolded(self) -> bool:
        """Whether the reasons and actions show."""
        return self._body is not None

    def show_row(self, row: RowText, columns: Columns, height_px: int) -> None:
        """Show an entry at a height."""
        self.row, self.columns, self.height_px = row, columns, height_px
        self._layout.setContentsMargins(MARGIN, height_px, MARGIN, 0)
        self.setAccessibleName(row.spoken)
        tip = [row.spoken.replace("; ", "\n")]
        tip += row.sentences
        self.setToolTip("\n".join(tip))
        self.updateGeometry()
        self.update()

    def show_marks(self, *, is_hovered: bool, is_selected: bool) -> None:
        """Set the row off where its claim is pointed at or selected."""
        if (is_hovered, is_selected) != (self._is_lit, self._is_selected):
            self._is_lit, self._is_selected = is_hovered, is_selected
            self.update()

    def unfold(
        self, sentences: tuple[str, ...], actions: list[tuple[str, str]]
    ) -> None:
        """Show reasons and a button an action; pairs of (id, word)."""
        self.fold()
        body = QWidget(self)
        column = QVBoxLayout(body)
        column.setContentsMargins(0, 0, 0, 10)
        column.setSpacing(6)
        for sentence in sentences:
            label = QLabel(sentence, body)
            label.setFont(self.look.font(13))
            label.setWordWrap(True)
            label.setTextFormat(Qt.TextFormat.PlainText)
            column.addWidget(label)
        buttons = QHBoxLayout()
        buttons.setSpacing(8)
        used = 0
        for name, word in actions:
            button = BenchButton(self.look, word, parent=body)
            if used and used + button.sizeHint().width() > self.width() - 2 * MARGIN:
                buttons.addStretch(1)
                column.addLayout(buttons)
                buttons = QHBoxLayout()
                buttons.setSpacing(8)
                used = 0
            used += button.sizeHint().width() + 8
            button.clicked.connect(
                lambda _=False, name=name: self.action_wanted.emit(name, self.claim)
            )
            buttons.addWidget(button)
        buttons.addStretch(1)
        column.addLayout(buttons)
        self._body = body
        self._layout.addWidget(body)
        self.updateGeometry()

    def fold(self) -> None:
        """Hide reasons and actions."""
        if self._body is not None:
            self._layout.removeWidget(self._body)
            self._body.hide()
            self._body.deleteLater()
            self._body = None
            self.updateGeometry()

    def sizeHint(self) -> QSize:
        """The row's height, and that of the body where it is unfolded."""
        height = self.height_px
        if self._body is not None:
            room = max(self.width() - 2 * MARGIN, 100)
            layout = self._body.layout()
            if layout is not None and layout.hasHeightForWidth():
                height += layout.totalHeightForWidth(room)
            elif layout is not None:
                height += layout.totalSizeHint().height()
        return QSize(340, height)

    def minimumSizeHint(self) -> QSize:
        """Never lower than it needs."""
        return QSize(300, self.sizeHint().height())

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the row."""
        row, columns = self.row, self.columns
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        if row is not None and columns is not None:
            self._paint_ground(ink)
            self._paint_words(ink, row, columns)
            ground = "selected" if self._is_selected else "panel"
            gauge = QRectF(
                columns.gauge, 0, columns.right - columns.gauge, self.height_px
            )
            paint_gauge(ink, row.gauge, gauge, ground)
        ink.hline(MARGIN, self.width() - MARGIN, self.height() - 1)
        painter.end()

    def _paint_ground(self, ink: Ink) -> None:
        if self._is_selected:
            rect = QRectF(self.rect()).adjusted(2, 1, -2, -2)
            ink.box(rect, fill="selected", edge="accent", radius=3, width=2)
        elif self._is_lit:
            ink.fill(QRectF(self.rect()).adjusted(0, 0, 0, -1), self.look.tint)

    def _paint_words(self, ink: Ink, row: RowText, columns: Columns) -> None:
        px = self.look.px
        is_full = self.height_px >= px(40)
        first = px(24 if self.height_px > px(50) else 19)
        second = px(44 if self.height_px > px(50) else 36)
        paint_mark(ink, MARGIN + 6, first - px(4.5), row.state)
        room = columns.claimed - columns.label - 4
        used = ink.label(columns.label, first, row.claim, STRONG, max_width=room)
        if row.is_pinned and used + 8 < room:
            ink.fill(QRectF(columns.label + used + 4, first - px(7), 4, 4), "accent", 2)
        claimed_room = columns.found - columns.claimed - 6
        ink.text(
            columns.claimed, first, row.claimed_shift, BODY, max_width=claimed_room
        )
        if is_full:
            ink.text(columns.label, second, row.count, SECOND)
            ink.text(
                columns.claimed,
                second,
                row.claimed_pattern,
                SECOND,
                max_width=claimed_room,
            )
        found_room = columns.gauge - columns.found - 4
        if not row.found_shift:
            word = say("nothing found") if row.state == "open" else say("not expected")
            face = Face(colour=f"tone:{row.state}")
            ink.text(columns.found, first, word, face, max_width=found_room)
            return
        ink.text(columns.found, first, row.found_shift, BODY)
        room = columns.gauge - columns.protons - 2
        ink.text(columns.protons, first, row.found_protons, BODY, max_width=room)
        if is_full:
            ink.text(
                columns.found, second, row.found_couplings, SECOND, max_width=found_room
            )

    # -- editing -----------------------------------------------------------------

    def edit_couplings(self) -> None:
        """Open a field over the found J values."""
        if self.row is None or self.columns is None or not self.row.found_shift:
            return
        text = self.row.found_couplings
        self._open_editor(text if text[:1].isdigit() else "", self.couplings_typed)

    def edit_shift(self) -> None:
        """Open a field over the found shift."""
        if self.row is not None:
            self._open_editor(self.row.found_shift, self.shift_typed)

    def _open_editor(self, text: str, done: object) -> None:
        assert self.columns is not None
        editor = QLineEdit(text, self)
        editor.setFont(self.look.font(13))
        editor.setAccessibleName(say("New value, Enter to take it"))
        width = round(self.columns.right - self.columns.found)
        height = self.look.px(24)
        top = max(0, (self.height_px - height) // 2)
        editor.setGeometry(round(self.columns.found) - 4, top, width, height)
        editor.selectAll()
        editor.show()
        editor.setFocus()
        claim = self.claim

        def finish() -> None:
            typed = editor.text().strip()
            if self._editor is editor:
                self._editor = None
                editor.deleteLater()
                if typed and typed != text:
                    done.emit(claim, typed)  # type: ignore[attr-defined]

        editor.editingFinished.connect(finish)
        self._editor = editor

    # -- events ------------------------------------------------------------------

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Select, or put a chosen signal to this claim."""
        if event.button() == Qt.MouseButton.LeftButton:
            self.clicked.emit(self.claim)

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        """Type another shift or other J values where one clicked."""
        if self.columns is None or event.position().x() < self.columns.found:
            return
        if event.position().y() > self.height_px / 2:
            self.edit_couplings()
        else:
            self.edit_shift()

    def contextMenuEvent(self, event: QContextMenuEvent) -> None:
        """Ask for the claim's menu."""
        self.menu_wanted.emit(self.claim, event.globalPos())

    def enterEvent(self, event: object) -> None:
        """Point at the claim."""
        self.hovered.emit(self.claim)

    def leaveEvent(self, event: QEvent) -> None:
        """Point at nothing."""
        self.hovered.emit(None)

    def focusInEvent(self, event: object) -> None:
        """Point at the claim with the keyboard too."""
        self.hovered.emit(self.claim)
        super().focusInEvent(event)  # type: ignore[arg-type]

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Enter selects, arrows go to the neighbours, F2 edits J."""
        key = event.key()
        if key in (Qt.Key.Key_Return, Qt.Key.Key_Enter, Qt.Key.Key_Space):
            self.clicked.emit(self.claim)
        elif key in (Qt.Key.Key_Up, Qt.Key.Key_Down):
            self.step_wanted.emit(-1 if key == Qt.Key.Key_Up else 1)
        elif key == Qt.Key.Key_F2:
            self.edit_couplings()
        elif key == Qt.Key.Key_Menu:
            self.menu_wanted.emit(self.claim, self.mapToGlobal(self.rect().center()))
        else:
            super().keyPressEvent(event)


class StrayRow(QWidget):
    """One stray: shift, what it is, its kind."""

    clicked = Signal(str)
    hovered = Signal(object)

    def __init__(
        self, look: Look, stray: StrayText, parent: QWidget | None = None
    ) -> None:
        super().__init__(parent)
        self.look = look
        self.stray = stray
        self.columns: Columns | None = None
        self._is_lit = False
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setProperty("focusInside", True)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Fixed)
        spoken = f"{say('stray')}, {stray.shift} ppm, {stray.name}, {stray.kind}"
        self.setAccessibleName(spoken)
        self.setToolTip(f"{stray.shift} ppm, {stray.kind}\n{stray.tip}")

    def show_marks(self, hovered_signal: str | None) -> None:
        """Set the row off where its signal is pointed at."""
        is_lit = hovered_signal == self.stray.key
        if is_lit != self._is_lit:
            self._is_lit = is_lit
            self.update()

    def sizeHint(self) -> QSize:
        """One line."""
        return QSize(340, self.look.px(20))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the row."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        stray = self.stray
        if self._is_lit:
            ink.fill(QRectF(self.rect()), self.look.tint)
        baseline = px(15)
        paint_mark(
            ink, MARGIN + 6, baseline - px(4.5), "stray", size=11, known=stray.is_known
        )
        face = SECOND_INK if stray.is_known else SECOND_STRONG
        left = MARGIN + px(20)
        ink.text(left, baseline, stray.shift, face)
        right = self.width() - MARGIN
        width = ink.text(right, baseline, stray.kind, SECOND, align="right")
        name_left = left + px(60)
        face = SECOND_INK if stray.is_known else Face(size=13, colour="tone:stray")
        room = right - width - 10 - name_left
        ink.text(name_left, baseline, stray.name, face, max_width=room)
        painter.end()

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Look at the stray."""
        if event.button() == Qt.MouseButton.LeftButton:
            self.clicked.emit(self.stray.key)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Look at the stray with Enter."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter, Qt.Key.Key_Space):
            self.clicked.emit(self.stray.key)
        else:
            super().keyPressEvent(event)

    def enterEvent(self, event: object) -> None:
        """Point at the stray."""
        self.hovered.emit(self.stray.key)

    def leaveEvent(self, event: QEvent) -> None:
        """Point at nothing."""
        self.hovered.emit(None)


class AdviceRow(QWidget):
    """A further measurement with what it would show and how well it separates."""

    def __init__(
        self, look: Look, advice: AdviceText, parent: QWidget | None = None
    ) -> None:
        super().__init__(parent)
        self.look = look
        self.advice = advice
        self.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Fixed)
        policy = self.sizePolicy()
        policy.setHeightForWidth(True)
        self.setSizePolicy(policy)
        spoken = f"{advice.measurement}: {advice.look_for}, {advice.value} sd"
        self.setAccessibleName(spoken)
        self.setToolTip(f"{advice.measurement}\n{advice.look_for}")

    def sizeHint(self) -> QSize:
        """Measurement and bar, and the whole sentence below."""
        return QSize(340, self.heightForWidth(self.width()))

    def heightForWidth(self, width: int) -> int:
        """Height with the sentence wrapped."""
        lines = wrap(self.look, self.advice.look_for, width - 2 * MARGIN, SECOND)
        return self.look.px(28) + self.look.px(17) * len(lines)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Take the height that the sentence needs at this width."""
        self.updateGeometry()
        super().resizeEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint words and bar."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        baseline = px(19)
        right = self.width() - MARGIN
        ink.text(right, baseline, self.advice.value, SECOND_INK, align="right")
        bar = QRectF(right - px(84), baseline - px(9), px(52), px(8))
        ink.fill(bar, "band", 2)
        if self.advice.share > 0:
            bar.setWidth(bar.width() * self.advice.share)
            ink.fill(bar, "accent", 2)
        room = right - px(94) - MARGIN
        ink.text(
            MARGIN, baseline, self.advice.measurement, SECOND_STRONG, max_width=room
        )
        width = right - MARGIN
        ink.wrapped(MARGIN, baseline + px(18), width, self.advice.look_for, SECOND)
        painter.end()
