"""The lanes before there is a spectrum: what to do first."""

from __future__ import annotations

from PySide6.QtCore import QRectF, Signal
from PySide6.QtGui import QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QWidget

from spinledger_app.lanes.axis_layer import paint_axis
from spinledger_app.lanes.grove import Grove
from spinledger_app.lanes.layout import LaneLayout, lane_layout
from spinledger_app.lanes.shift_map import ShiftMap, Stretch
from spinledger_app.painting.ink import BODY_MUTED, SECOND, Face, Ink, wrap
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look
from spinledger_app.views.controls import BenchButton
from spinledger_app.views.gutter import paint_bare_tree, paint_gutter

_NO_GROVE = Grove(trees=(), labels=(), px_per_hz=1.0)
_AXIS = Stretch(high_ppm=9.0, low_ppm=-0.5)


class EvidenceEmpty(QWidget):
    """Drop area with two buttons, a bare tree and the lanes' names.

    After data that could not be read it says what was found and what to do.
    """

    open_wanted = Signal()
    example_wanted = Signal()
    list_wanted = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.is_wide = False
        self._fault = ""
        self._is_dragged_over = False
        self.open_button = BenchButton(
            look,
            say("Open data…"),
            key="Ctrl+O",
            is_primary=True,
            height=32,
            parent=self,
        )
        self.example_button = BenchButton(
            look, say("Try the example"), height=32, parent=self
        )
        self.list_button = BenchButton(
            look, say("Show the file list"), height=32, parent=self
        )
        self.list_button.hide()
        self.open_button.clicked.connect(self.open_wanted)
        self.example_button.clicked.connect(self.example_wanted)
        self.list_button.clicked.connect(self.list_wanted)
        self.setMinimumSize(480, 420)

    def show_fault(self, sentence: str) -> None:
        """Say why data could not be read; an empty sentence takes it back."""
        self._fault = sentence
        self.list_button.setVisible(bool(sentence))
        self.example_button.setVisible(not sentence)
        self._lay_out()
        self.update()

    def show_drag(self, is_over: bool) -> None:
        """Light the drop area while something is dragged over the window."""
        self._is_dragged_over = is_over
        self.update()

    def _lay_out(self) -> None:
        layout = self._lanes()
        px = self.look.px
        second = self.list_button if self._fault else self.example_button
        first_hint, hint = self.open_button.sizeHint(), second.sizeHint()
        middle = (layout.left + layout.right) / 2
        total = first_hint.width() + 12 + hint.width()
        x = round(middle - total / 2)
        y = round(layout.seam / 2 - px(36)) + px(52)
        self.open_button.setGeometry(x, y, first_hint.width(), first_hint.height())
        second.setGeometry(x + first_hint.width() + 12, y, hint.width(), hint.height())

    def _lanes(self) -> LaneLayout:
        return lane_layout(
            self.width(),
            self.height(),
            is_wide=self.is_wide,
            scale=self.look.text_scale,
        )

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep the buttons in the middle."""
        self._lay_out()
        super().resizeEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint lanes, words and the bare tree."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        layout = self._lanes()
        ink.fill(QRectF(self.rect()), "lane")
        paint_gutter(ink, layout, None, _NO_GROVE, shows_zoom=False)
        ink.hline(0, layout.width, layout.claims_bottom, "rule")
        ink.hline(0, layout.gutter, layout.seam, "rule")
        paint_bare_tree(ink, layout)
        middle = (layout.left + layout.right) / 2
        area = QRectF(
            layout.left + 12, 16, layout.right - layout.left - 24, layout.seam - 32
        )
        edge = "accent" if self._is_dragged_over else "edge"
        ink.box(area, edge=edge, radius=8, dashed=True)
        self._paint_words(ink, middle, layout.seam / 2 - px(36), area.width() - 32)
        waiting = say("Claims will stand here and reach up to the lines they own.")
        ink.text(middle, layout.soil + px(26), waiting, SECOND, align="centre")
        rest = say("What the model leaves over is shown here, in noise sd.")
        y = (layout.claims_bottom + layout.axis_top) / 2 + 5
        ink.text(middle, y, rest, SECOND, align="centre")
        shift_map = ShiftMap.fitted((_AXIS,), layout.left, layout.right)
        paint_axis(ink, shift_map, layout, 400.0)
        painter.end()

    def _paint_words(self, ink: Ink, x: float, y: float, width: float) -> None:
        px = self.look.px
        title = Face(size=22, weight=600)
        if not self._fault:
            ink.text(x, y, say("Start with a spectrum"), title, align="centre")
            words = say(
                "Drop a data folder, a zip or a file here. Nothing in it is changed."
            )
            ink.text(x, y + px(28), words, BODY_MUTED, align="centre", max_width=width)
            return
        head = say("This could not be read")
        ink.text(x, y - px(24), head, title, align="centre")
        for i, line in enumerate(wrap(self.look, self._fault, width, BODY_MUTED)[:3]):
            ink.text(x, y + px(4 + 18 * i), line, BODY_MUTED, align="centre")
