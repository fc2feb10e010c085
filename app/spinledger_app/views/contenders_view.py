"""Contenders: other structures that could own the same spectrum, one card each."""

from __future__ import annotations

from PySide6.QtCore import QRectF, QSize, Qt, Signal
from PySide6.QtGui import (
    QKeyEvent,
    QMouseEvent,
    QPainter,
    QPaintEvent,
    QResizeEvent,
)
from PySide6.QtWidgets import QCheckBox, QSizePolicy, QVBoxLayout, QWidget

from spinledger_app.painting.ink import (
    CAPTION,
    SECOND,
    SECOND_STRONG,
    STRONG,
    Face,
    Ink,
    wrap,
)
from spinledger_app.painting.molecule import paint_molecule
from spinledger_app.presenters.contenders import CardText, ContendersText
from spinledger_app.presenters.structure import Drawing, fitted
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look
from spinledger_app.views.controls import OverlayScroll, TextLink

_MARGIN = 16
_HEAD_PX = 40
_CARD_PX = 82


class Card(QWidget):
    """Thumbnail, name, whether it stands, and why."""

    activated = Signal(str)
    ticked = Signal(str, bool)

    def __init__(
        self, look: Look, text: CardText, parent: QWidget | None = None
    ) -> None:
        super().__init__(parent)
        self.look = look
        self.text = text
        self.drawing: Drawing | None = None
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setProperty("focusInside", True)
        self.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Fixed)
        self.setToolTip(text.tip)
        self.setAccessibleName(f"{text.name}, {text.word}. {text.why}")
        self.tick = QCheckBox(self)
        self.tick.setToolTip(
            say("List it in the report; with none ticked, all are listed")
        )
        name = say("List {0} in the report").replace("{0}", text.name)
        self.tick.setAccessibleName(name)
        self.tick.clicked.connect(lambda on: self.ticked.emit(text.smiles, on))

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep the tick in the upper right corner."""
        hint = self.tick.sizeHint()
        left = self.width() - 10 - hint.width()
        self.tick.setGeometry(left, self.look.px(6), hint.width(), hint.height())
        super().resizeEvent(event)

    def sizeHint(self) -> QSize:
        """One card."""
        return QSize(240, self.look.px(_CARD_PX))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the card."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        text = self.text
        height = self.height()
        if self.underMouse():
            ink.fill(QRectF(self.rect()), "hover")
        ink.hline(_MARGIN, self.width() - _MARGIN, 0)
        thumb = px(76 if self.width() < px(300) else 96)
        if self.drawing is not None:
            room = (_MARGIN + 8.0, 14.0, thumb - 26.0, height - 28.0)
            places, scale = fitted(self.drawing, room, longest_px=17)
            colour = "ink" if text.stands else "muted"
            paint_molecule(
                ink, self.drawing, places, scale, colour=colour, size=11, width=1.15
            )
        if text.stands:
            ink.fill(QRectF(0, 1, 4, height - 1), "accent")
        else:
            start, end = (_MARGIN, height - 14), (_MARGIN + thumb - 12, 16)
            ink.line(start, end, "muted", 1.5)
        left = _MARGIN + thumb + 8
        room_px = self.tick.x() - left - 6
        n_lines = min(2, len(wrap(self.look, text.name, room_px, SECOND_STRONG)))
        y = ink.wrapped(
            left, px(20), room_px, text.name, SECOND_STRONG, max_lines=n_lines
        )
        colour = "accent" if text.stands else "muted"
        face = Face(size=13, weight=600, colour=colour)
        ink.text(left, y, text.word, face, max_width=room_px)
        room_px = self.width() - left - 10
        ink.wrapped(left, y + px(16), room_px, text.why, CAPTION, max_lines=3 - n_lines)
        painter.end()

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Open the contender's menu."""
        self.activated.emit(self.text.smiles)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Open the contender's menu with Enter."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter, Qt.Key.Key_Space):
            self.activated.emit(self.text.smiles)
        else:
            super().keyPressEvent(event)

    def enterEvent(self, event: object) -> None:
        """Paint the hover fill."""
        self.update()

    def leaveEvent(self, event: object) -> None:
        """Paint without it."""
        self.update()


class ContendersView(QWidget):
    """Heading over a column of cards."""

    card_activated = Signal(str)
    ticked = Signal(str, bool)
    add_wanted = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.cards: list[Card] = []
        self._text = ContendersText(remark="", cards=())
        self._column = QVBoxLayout()
        self.add = TextLink(look, say("Add…"), self)
        self.add.setToolTip(say("Test another structure beside the claimed one"))
        self.add.clicked.connect(lambda _=False: self.add_wanted.emit())
        self.add.hide()
        self._build()

    def show_can_add(self, can_add: bool) -> None:
        """Offer to add a contender, once there is a structure."""
        self.add.setVisible(can_add)
        self.update()

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep the link at the right of the heading."""
        self._place_link()
        super().resizeEvent(event)

    def _place_link(self) -> None:
        hint = self.add.sizeHint()
        left = self.width() - _MARGIN - hint.width()
        self.add.setGeometry(left, self.look.px(8), hint.width(), hint.height())

    def _build(self) -> None:
        self.setMinimumSize(self.look.px(240), self.look.px(120))
        self.setAccessibleName(say("Contenders"))
        inner = QWidget()
        self._column = QVBoxLayout(inner)
        self._column.setContentsMargins(0, 0, 0, 0)
        self._column.setSpacing(0)
        self._column.addStretch(1)
        self.area = OverlayScroll(self)
        self.area.setWidget(inner)
        self._outer = outer = QVBoxLayout(self)
        outer.setContentsMargins(0, self.look.px(_HEAD_PX), 0, 0)
        outer.addWidget(self.area)

    def show_contenders(self, text: ContendersText) -> None:
        """Show other contenders; thumbnails come by :meth:`show_thumbnails`."""
        if text == self._text:
            return
        self._text = text
        for card in self.cards:
            self._column.removeWidget(card)
            card.hide()
            card.deleteLater()
        self.cards = []
        for index, one in enumerate(text.cards):
            card = Card(self.look, one)
            card.activated.connect(self.card_activated)
            card.ticked.connect(self.ticked)
            self._column.insertWidget(index, card)
            self.cards.append(card)
        self.area.setVisible(bool(text.cards))
        self.update()

    def show_ticks(self, ticked: tuple[str, ...]) -> None:
        """Contenders that the report lists, by SMILES."""
        for card in self.cards:
            card.tick.setChecked(card.text.smiles in ticked)

    def show_thumbnails(self, drawings: dict[str, Drawing]) -> None:
        """Drawings by SMILES."""
        for card in self.cards:
            card.drawing = drawings.get(card.text.smiles)
            card.update()

    def retune(self) -> None:
        """Take the look's text size again."""
        self._outer.setContentsMargins(0, self.look.px(_HEAD_PX), 0, 0)
        self.setMinimumSize(self.look.px(240), self.look.px(120))
        self._place_link()

    def sizeHint(self) -> QSize:
        """Room for three cards."""
        return QSize(256, 292)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint heading and, where there is no card, the sentence."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        ink.fill(QRectF(self.rect()), "panel")
        name = ink.text(_MARGIN, px(25), say("Contenders"), STRONG)
        right = self.add.x() - 12 if self.add.isVisible() else self.width() - _MARGIN
        room = right - _MARGIN - name - 12
        ink.text(
            right, px(25), self._text.remark, SECOND, align="right", max_width=room
        )
        if not self._text.cards:
            width = self.width() - 2 * _MARGIN
            ink.wrapped(_MARGIN, px(52), width, self._text.sentence, SECOND)
        painter.end()
