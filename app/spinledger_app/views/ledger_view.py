"""The ledger panel: verdict, balance, rows, strays, next measurement, tally."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QPoint, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import (
    QAbstractButton,
    QHBoxLayout,
    QSizePolicy,
    QVBoxLayout,
    QWidget,
)

from spinledger_app.painting.ink import SECOND, STRONG, Face, Ink, label_width
from spinledger_app.painting.marks import paint_mark
from spinledger_app.presenters.ledger import STATES, LedgerText, RowText
from spinledger_app.presenters.wording import say
from spinledger_app.selection import Marks
from spinledger_app.theme import Look
from spinledger_app.views.controls import OverlayScroll
from spinledger_app.views.gauge import paint_gauge_key
from spinledger_app.views.ledger_empty import LedgerEmpty
from spinledger_app.views.ledger_rows import (
    MARGIN,
    AdviceRow,
    Columns,
    LedgerRow,
    StrayRow,
    columns_for,
)
from spinledger_app.views.verdict_view import BalanceView, VerdictView

_FULL_PX, _WIDE_PX, _DENSE_PX = 44, 56, 28
_ADVICE_ROOM_PX = 100
_SORTS = ("given", "shift", "state")


class HeadRow(QWidget):
    """Names of the columns; a click sorts."""

    sort_wanted = Signal(str)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.columns: Columns | None = None
        self.sort = "given"
        self.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Fixed)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setToolTip(say("Click to sort: Entry by state, Found by shift"))

    def sizeHint(self) -> QSize:
        """One line."""
        return QSize(340, self.look.px(28))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint names and the rule below."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        baseline = self.look.px(19)
        if self.columns is not None:
            c = self.columns
            marks = {"state": "  ↓" if self.sort == "state" else "", "shift": ""}
            marks["shift"] = "  ↓" if self.sort == "shift" else ""
            ink.text(MARGIN, baseline, say("Entry") + marks["state"], SECOND)
            ink.text(c.claimed, baseline, say("Claimed"), SECOND)
            ink.text(c.found, baseline, say("Found") + marks["shift"], SECOND)
            ink.text(c.right, baseline, say("residual, ±2 sd"), SECOND, align="right")
        ink.hline(0, self.width(), self.height() - 1, "rule")
        painter.end()

    def mouseReleaseEvent(self, event: object) -> None:
        """Sort by what was clicked, or as given when clicked again."""
        if self.columns is None:
            return
        x = event.position().x()  # type: ignore[attr-defined]
        wanted = "shift" if x >= self.columns.found else "state"
        self.sort_wanted.emit("given" if wanted == self.sort else wanted)


class TotalRow(QWidget):
    """Sum of both sides, closed by a double rule; explains the gauge's glyphs."""

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.columns: Columns | None = None
        self._claimed = self._found = ""
        self.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Fixed)

    def show_totals(self, claimed: str, found: str, tip: str) -> None:
        """Show both sums."""
        self._claimed, self._found = claimed, found
        self.setToolTip(tip)
        self.update()

    def sizeHint(self) -> QSize:
        """One line and the double rule."""
        return QSize(340, self.look.px(36))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the sums."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        left, right = MARGIN, self.width() - MARGIN
        ink.hline(left, right, 0, "rule")
        if self.columns is not None:
            baseline = px(21)
            ink.text(left, baseline, say("Balance"), STRONG)
            ink.text(self.columns.claimed, baseline, self._claimed, STRONG)
            ink.text(self.columns.found, baseline, self._found, STRONG)
            paint_gauge_key(ink, right, baseline)
        ink.hline(left, right, px(30), "rule")
        ink.hline(left, right, px(30) + 3, "rule")
        painter.end()


class Heading(QWidget):
    """Name of a section with a remark beside or at the right."""

    def __init__(
        self, look: Look, *, is_ruled: bool = False, parent: QWidget | None = None
    ) -> None:
        super().__init__(parent)
        self.look = look
        self._name = self._remark = ""
        self._is_ruled = is_ruled
        self._is_right = is_ruled
        self.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Fixed)

    def show_words(self, name: str, remark: str) -> None:
        """Show name and remark."""
        self._name, self._remark = name, remark
        self.update()

    def sizeHint(self) -> QSize:
        """One line, more room above where it is ruled off."""
        return QSize(340, self.look.px(40 if self._is_ruled else 30))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint name and remark."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        right = self.width() - MARGIN
        baseline = self.height() - self.look.px(8)
        if self._is_ruled:
            ink.hline(MARGIN, right, self.look.px(8))
        width = ink.text(MARGIN, baseline, self._name, STRONG)
        if self._is_right:
            ink.text(right, baseline, self._remark, SECOND, align="right")
        else:
            left = MARGIN + max(width + 12, self.look.px(64))
            ink.text(left, baseline, self._remark, SECOND, max_width=right - left)
        painter.end()


class TallyButton(QAbstractButton):
    """Mark, count and name of one state; checked, it filters the rows."""

    def __init__(self, look: Look, state: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.state = state
        self.count = 0
        self.setCheckable(True)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setSizePolicy(QSizePolicy.Policy.Fixed, QSizePolicy.Policy.Fixed)

    def show_count(self, count: int) -> None:
        """Show how many there are."""
        self.count = count
        words = f"{count} {say(self.state)}"
        self.setText(words)
        self.setAccessibleName(words)
        self.setToolTip(say("Show only these: {0}").replace("{0}", say(self.state)))
        self.updateGeometry()
        self.update()

    def sizeHint(self) -> QSize:
        """Mark and words."""
        width = 15 + self.look.width(self.text(), 13) + 3
        return QSize(round(width) + 1, self.look.px(24))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint mark and words."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        if self.isChecked():
            ink.box(QRectF(self.rect()), fill="selected", edge="accent")
        elif self.underMouse():
            ink.fill(QRectF(self.rect()), "hover", 4)
        middle = self.height() / 2
        paint_mark(ink, 7, middle, self.state, size=11)
        face = Face(size=13, colour="ink" if self.count else "muted")
        baseline = middle + self.look.metrics(13).capHeight() / 2
        ink.text(16, baseline, self.text(), face)
        painter.end()


class LedgerView(QWidget):
    """Shows a :class:`LedgerText`; tells clicks, hovers and wishes."""

    claim_clicked = Signal(str)
    claim_hovered = Signal(object)
    stray_clicked = Signal(str)
    stray_hovered = Signal(object)
    action_wanted = Signal(str, str)
    couplings_typed = Signal(str, str)
    shift_typed = Signal(str, str)
    menu_wanted = Signal(str, QPoint)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.text: LedgerText | None = None
        self.rows: list[LedgerRow] = []
        self.verdict = VerdictView(look)
        self.balance = BalanceView(look)
        self.head = HeadRow(look)
        self.total = TotalRow(look)
        self.stray_heading = Heading(look)
        self.advice_heading = Heading(look, is_ruled=True)
        self.tally = {state: TallyButton(look, state) for state in STATES}
        self.empty = LedgerEmpty(look)
        self._marks = Marks()
        self._sort = "given"
        self._unfolded: str | None = None
        self._actions: dict[str, list[tuple[str, str]]] = {}
        self._stray_rows: list[StrayRow] = []
        self._advice_rows: list[AdviceRow] = []
        self._build()

    def _build(self) -> None:
        self.setMinimumWidth(self.look.px(360))
        self.setAccessibleName(say("Ledger"))
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        self._full = QWidget()
        full = QVBoxLayout(self._full)
        full.setContentsMargins(0, 0, 0, 0)
        full.setSpacing(0)
        full.addWidget(self.verdict)
        full.addWidget(self.balance)
        full.addWidget(self.head)
        full.addWidget(self._scroll_area(), 1)
        full.addWidget(self._tally_bar())
        column.addWidget(self.empty, 1)
        column.addWidget(self._full, 1)
        self._full.hide()
        self.head.sort_wanted.connect(self._take_sort)
        self.balance.claim_hovered.connect(self.claim_hovered)
        self.balance.claim_clicked.connect(self.claim_clicked)

    def _scroll_area(self) -> OverlayScroll:
        self._list = QWidget()
        self._list_layout = QVBoxLayout(self._list)
        self._list_layout.setContentsMargins(0, 0, 0, 0)
        self._list_layout.setSpacing(0)
        self._list_layout.addWidget(self.total)
        self._list_layout.addWidget(self.stray_heading)
        self._list_layout.addWidget(self.advice_heading)
        self._list_layout.addStretch(1)
        self.area = OverlayScroll()
        self.area.setWidget(self._list)
        return self.area

    def _tally_bar(self) -> QWidget:
        bar = QWidget()
        row = QHBoxLayout(bar)
        row.setContentsMargins(MARGIN - 2, 3, MARGIN - 2, 4)
        row.setSpacing(0)
        for index, button in enumerate(self.tally.values()):
            if index:
                row.addStretch(1)
            row.addWidget(button)
            button.toggled.connect(lambda _: self._filter())
        return bar

    # -- what is shown ---------------------------------------------------------------

    def show_empty(self) -> None:
        """Nothing to show yet: say what the ledger is."""
        self.text = None
        self._full.hide()
        self.empty.show()

    def show_ledger(
        self, text: LedgerText, actions: dict[str, list[tuple[str, str]]]
    ) -> None:
        """Show a ledger; ``actions`` are (id, word) pairs for every claim."""
        if (text, actions) == (self.text, self._actions):
            return
        self.text, self._actions = text, actions
        self.empty.hide()
        self._full.show()
        self.verdict.show_verdict(text.verdict)
        self.balance.show_balance(text.balance)
        self.total.show_totals(
            text.balance.claimed, text.balance.found, text.balance.tip
        )
        self.stray_heading.show_words(say("Strays"), text.stray_head)
        self.advice_heading.show_words(say("Next measurement"), say("separates by, sd"))
        for state, button in self.tally.items():
            button.show_count(text.tally[state])
        self._fill_rows()
        self._fill_others()
        self._lay_out_rows()
        self._filter()

    def _fill_rows(self) -> None:
        assert self.text is not None
        while len(self.rows) > len(self.text.rows):
            row = self.rows.pop()
            self._list_layout.removeWidget(row)
            row.hide()
            row.deleteLater()
        while len(self.rows) < len(self.text.rows):
            row = LedgerRow(self.look)
            row.clicked.connect(self.claim_clicked)
            row.hovered.connect(self.claim_hovered)
            row.action_wanted.connect(self.action_wanted)
            row.couplings_typed.connect(self.couplings_typed)
            row.shift_typed.connect(self.shift_typed)
            row.menu_wanted.connect(self.menu_wanted)
            row.step_wanted.connect(self._step)
            self._list_layout.insertWidget(len(self.rows), row)
            self.rows.append(row)
        self._chain_tabs()

    def _chain_tabs(self) -> None:
        previous: QWidget = self.verdict
        for row in self.rows:
            QWidget.setTabOrder(previous, row)
            previous = row

    def _fill_others(self) -> None:
        assert self.text is not None
        for old in (*self._stray_rows, *self._advice_rows):
            self._list_layout.removeWidget(old)
            old.hide()
            old.deleteLater()
        self._stray_rows, self._advice_rows = [], []
        at = self._list_layout.indexOf(self.stray_heading) + 1
        for stray in self.text.strays:
            row = StrayRow(self.look, stray)
            row.clicked.connect(self.stray_clicked)
            row.hovered.connect(self.stray_hovered)
            self._list_layout.insertWidget(at, row)
            self._stray_rows.append(row)
            at += 1
        at = self._list_layout.indexOf(self.advice_heading) + 1
        for advice in self.text.advice:
            advice_row = AdviceRow(self.look, advice)
            self._list_layout.insertWidget(at, advice_row)
            self._advice_rows.append(advice_row)
            at += 1

    def _ordered(self) -> list[RowText]:
        assert self.text is not None
        rows = list(self.text.rows)
        if self._sort == "shift":
            rows.sort(key=lambda row: -row.shift_ppm)
        elif self._sort == "state":
            order = ("disputed", "open", "settled", "silent")
            rows.sort(key=lambda row: order.index(row.state))
        return rows

    def _columns(self) -> Columns:
        assert self.text is not None
        widest = max(
            (label_width(self.look, row.claim) for row in self.text.rows), default=0.0
        )
        return columns_for(self.look, self.area.viewport().width(), widest)

    def _row_height(self) -> int:
        px = self.look.px
        n_rows = len(self.rows)
        room = self.height() - self.verdict.height() - px(60 + 28 + 36 + 32)
        if self.width() >= px(430) and n_rows * px(_WIDE_PX) < room:
            return px(_WIDE_PX)
        if n_rows * px(_FULL_PX) < room * 1.25:
            return px(_FULL_PX)
        return px(_DENSE_PX)

    def _lay_out_rows(self) -> None:
        if self.text is None:
            return
        columns = self._columns()
        self.head.columns = self.total.columns = columns
        full = self._row_height()
        has_body = self._unfolded is not None and any(
            row.claim == self._unfolded for row in self.text.rows
        )
        dense = self.look.px(_DENSE_PX)
        for widget, row in zip(self.rows, self._ordered(), strict=True):
            is_open = has_body and row.claim == self._unfolded
            others = dense if has_body and full < self.look.px(_WIDE_PX) else full
            height = max(full, self.look.px(_FULL_PX)) if is_open else others
            widget.show_row(row, columns, height)
            if is_open:
                sentences = row.sentences or ((row.flag,) if row.flag else ())
                widget.unfold(sentences, self._actions.get(row.claim, []))
            else:
                widget.fold()
        self.head.update()
        self.total.update()
        self._make_room()
        self._mark_rows()

    def _make_room(self) -> None:
        """Show the next measurement only where 150 px are free under the strays."""
        has_advice = self.text is not None and bool(self.text.advice)
        used = sum(row.sizeHint().height() for row in self.rows)
        used += self.total.sizeHint().height()
        used += self.stray_heading.sizeHint().height()
        used += sum(row.sizeHint().height() for row in self._stray_rows)
        is_free = self.area.height() - used >= self.look.px(_ADVICE_ROOM_PX)
        self.advice_heading.setVisible(has_advice and is_free)
        for row in self._advice_rows:
            row.setVisible(is_free)

    def _take_sort(self, sort: str) -> None:
        self._sort = self.head.sort = sort
        self._lay_out_rows()
        self._filter()

    def _filter(self) -> None:
        wanted = {state for state, button in self.tally.items() if button.isChecked()}
        for row in self.rows:
            state = row.row.state if row.row is not None else ""
            row.setVisible(not wanted or state in wanted)
        shows_strays = not wanted or "stray" in wanted
        self.stray_heading.setVisible(shows_strays)
        for stray in self._stray_rows:
            stray.setVisible(shows_strays)

    def show_marks(self, marks: Marks) -> None:
        """Set off what is hovered and selected; the selected row unfolds."""
        was = self._marks
        self._marks = marks
        self.balance.show_marks(marks.hovered, marks.selected)
        if marks.selected != was.selected:
            self._unfolded = marks.selected
            self._lay_out_rows()
            self._bring_up(marks.selected)
        else:
            self._mark_rows()
        for stray in self._stray_rows:
            stray.show_marks(marks.hovered_signal)

    def _mark_rows(self) -> None:
        for row in self.rows:
            row.show_marks(
                is_hovered=row.claim == self._marks.hovered,
                is_selected=row.claim == self._marks.selected,
            )

    def _bring_up(self, claim: str | None) -> None:
        for row in self.rows:
            if row.claim == claim:
                self._list_layout.activate()
                self.area.ensureWidgetVisible(row, 0, 8)

    def row_of(self, claim: str) -> LedgerRow | None:
        """Row of a claim."""
        return next((row for row in self.rows if row.claim == claim), None)

    def _step(self, by: int) -> None:
        shown = [row for row in self.rows if row.isVisible()]
        focused = next((i for i, row in enumerate(shown) if row.hasFocus()), None)
        if focused is not None and 0 <= focused + by < len(shown):
            shown[focused + by].setFocus(Qt.FocusReason.TabFocusReason)
            self.area.ensureWidgetVisible(shown[focused + by], 0, 8)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Lay the columns out again."""
        super().resizeEvent(event)
        self._lay_out_rows()

    def changeEvent(self, event: QEvent) -> None:
        """Follow another text size."""
        if event.type() == QEvent.Type.FontChange:
            self.setMinimumWidth(self.look.px(360))
            self._lay_out_rows()
        super().changeEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the panel's ground and the line over the tally."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        ink.fill(QRectF(self.rect()), "panel")
        if self.text is not None:
            top = self.tally["settled"].parentWidget()
            if top is not None:
                y = top.mapTo(self, QPoint(0, 0)).y()
                ink.hline(0, self.width(), y - 1)
        painter.end()
