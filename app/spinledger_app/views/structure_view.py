"""The structure with one tag a claim, read only; paste and clicks are told."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QRectF, QSize, Qt, Signal
from PySide6.QtGui import (
    QContextMenuEvent,
    QHelpEvent,
    QKeyEvent,
    QMouseEvent,
    QPainter,
    QPaintEvent,
    QResizeEvent,
)
from PySide6.QtWidgets import QToolTip, QVBoxLayout, QWidget

from spinledger_app.painting.ink import (
    SECOND,
    SECOND_STRONG,
    STRONG,
    Face,
    Ink,
    label_width,
)
from spinledger_app.painting.marks import paint_mark
from spinledger_app.painting.molecule import atom_text_width, paint_molecule
from spinledger_app.presenters.structure import (
    Drawing,
    PlacedTag,
    TagWish,
    fitted,
    place_tags,
)
from spinledger_app.presenters.wording import formula, say
from spinledger_app.selection import Marks
from spinledger_app.theme import Look
from spinledger_app.views.controls import BenchButton, IconButton

_MARGIN = 16
_HEAD_PX = 36
_FOOT_PX = 28
_MANY_TAGS = 8


class StructureCanvas(QWidget):
    """Skeleton and tags; every tag can be clicked, and reached with the arrows."""

    claim_clicked = Signal(str)
    claim_hovered = Signal(object)
    menu_wanted = Signal(str, object)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.tags: tuple[PlacedTag, ...] = ()
        self._drawing: Drawing | None = None
        self._wishes: tuple[tuple[str, str, tuple[int, ...]], ...] = ()
        self._tips: dict[str, str] = {}
        self._marks = Marks()
        self._places: list[tuple[float, float]] = []
        self._scale = 1.0
        self._foot = ("", "")
        self._partners: tuple[str, ...] = ()
        self.setMouseTracking(True)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setProperty("focusInside", True)
        self.setMinimumHeight(140)

    def show_drawing(
        self,
        drawing: Drawing | None,
        tags: tuple[tuple[str, str, tuple[int, ...]], ...],
        tips: dict[str, str],
        foot: tuple[str, str],
    ) -> None:
        """Show a structure; ``tags`` are (claim, state, atoms)."""
        is_same = (drawing, tags) == (self._drawing, self._wishes)
        self._drawing, self._wishes, self._tips = drawing, tags, tips
        if is_same and foot == self._foot:
            return
        self._foot = foot
        name = say("Structure, {0} claims").replace("{0}", str(len(tags)))
        self.setAccessibleName(name)
        self._lay_out()

    def show_marks(self, marks: Marks, partners: tuple[str, ...]) -> None:
        """Set off what is hovered and selected, and its coupling partners."""
        if (marks, partners) != (self._marks, self._partners):
            self._marks, self._partners = marks, partners
            self.update()

    def _lay_out(self) -> None:
        self.tags = ()
        drawing = self._drawing
        if drawing is not None and drawing.atoms:
            px = self.look.px
            side = px(36 if len(self._wishes) < _MANY_TAGS else 52)
            room = (
                float(side),
                float(px(34)),
                max(self.width() - 2 * side, 40.0),
                max(self.height() - px(34 + 58), 40.0),
            )
            self._places, self._scale = fitted(drawing, room)
            wishes = [
                TagWish(
                    claim=claim, state=state, atoms=atoms,
                    width=label_width(self.look, claim, SECOND_STRONG) + px(28),
                )
                for claim, state, atoms in self._wishes
            ]  # fmt: skip
            self.tags = place_tags(
                drawing,
                self._places,
                wishes,
                size=(self.width(), self.height() - px(_FOOT_PX)),
                height=px(20),
                label_width=lambda atom: atom_text_width(self.look, atom),
            )
        self.update()

    def relay(self) -> None:
        """Place drawing and tags anew, for another text size."""
        self._lay_out()

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Place drawing and tags anew."""
        self._lay_out()
        super().resizeEvent(event)

    def changeEvent(self, event: QEvent) -> None:
        """Follow another text size."""
        if event.type() == QEvent.Type.FontChange:
            self._lay_out()
        super().changeEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint skeleton, leaders and tags."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        ink.fill(QRectF(self.rect()), "lane")
        if self._drawing is not None:
            size = 15.0 if self._scale > 24 else 12.0
            paint_molecule(ink, self._drawing, self._places, self._scale, size=size)
            for tag in self.tags:
                if tag.is_led:
                    x, y = self._places[tag.atom]
                    _, cy = tag.centre
                    near_x = min(max(x, tag.left), tag.left + tag.width)
                    near_y = tag.top if cy > y else tag.top + tag.height
                    ink.line((x, y), (near_x, near_y), "rule", 1.0)
            for tag in self.tags:
                self._paint_tag(ink, tag)
            baseline = self.height() - self.look.px(12)
            left = ink.text(_MARGIN, baseline, self._foot[0], SECOND)
            room = self.width() - 2 * _MARGIN - left - 10
            right = self.width() - _MARGIN
            ink.text(
                right, baseline, self._foot[1], SECOND, align="right", max_width=room
            )
        painter.end()

    def _paint_tag(self, ink: Ink, tag: PlacedTag) -> None:
        marks = self._marks
        rect = QRectF(tag.left, tag.top, tag.width, tag.height)
        is_selected = tag.claim == marks.selected
        fill, edge = ("selected", "accent") if is_selected else ("panel", "hairline")
        ink.box(rect, fill=fill, edge=edge)
        if tag.claim == marks.hovered or tag.claim in self._partners:
            ink.fill(rect, self.look.tint, 4)
            if tag.claim == marks.hovered:
                ink.box(rect, edge="accent")
        middle = tag.top + tag.height / 2
        paint_mark(ink, tag.left + self.look.px(12), middle, tag.state, size=10)
        baseline = middle + self.look.metrics(13, 600).capHeight() / 2
        ink.label(tag.left + self.look.px(21), baseline, tag.claim, SECOND_STRONG)

    def tag_at(self, x: float, y: float) -> PlacedTag | None:
        """Tag under a place, 24 px high at least."""
        for tag in reversed(self.tags):
            in_x = tag.left - 1 <= x <= tag.left + tag.width + 1
            if in_x and tag.top - 2 <= y <= tag.top + tag.height + 2:
                return tag
        return None

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Point at a claim."""
        tag = self.tag_at(event.position().x(), event.position().y())
        self.setCursor(
            Qt.CursorShape.PointingHandCursor if tag else Qt.CursorShape.ArrowCursor
        )
        self.claim_hovered.emit(None if tag is None else tag.claim)

    def leaveEvent(self, event: QEvent) -> None:
        """Point at nothing."""
        self.claim_hovered.emit(None)

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Select a claim, or put a chosen signal to it."""
        tag = self.tag_at(event.position().x(), event.position().y())
        if tag is not None and event.button() == Qt.MouseButton.LeftButton:
            self.claim_clicked.emit(tag.claim)

    def contextMenuEvent(self, event: QContextMenuEvent) -> None:
        """Ask for the claim's menu."""
        tag = self.tag_at(event.pos().x(), event.pos().y())
        self.menu_wanted.emit("" if tag is None else tag.claim, event.globalPos())

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Arrows go from tag to tag, Enter selects."""
        claims = [tag.claim for tag in self.tags]
        key = event.key()
        arrows = {
            Qt.Key.Key_Left: -1,
            Qt.Key.Key_Up: -1,
            Qt.Key.Key_Right: 1,
            Qt.Key.Key_Down: 1,
        }
        if claims and key in arrows:
            now = self._marks.hovered
            by = arrows[Qt.Key(key)]
            index = claims.index(now) + by if now in claims else 0
            claim = claims[index % len(claims)]
            self.setAccessibleDescription(self._tips.get(claim, claim))
            self.claim_hovered.emit(claim)
        elif key in (Qt.Key.Key_Return, Qt.Key.Key_Enter) and self._marks.hovered:
            self.claim_clicked.emit(self._marks.hovered)
        else:
            super().keyPressEvent(event)

    def event(self, event: QEvent) -> bool:
        """Tool tip of the tag under the mouse."""
        if event.type() == QEvent.Type.ToolTip:
            assert isinstance(event, QHelpEvent)
            tag = self.tag_at(event.pos().x(), event.pos().y())
            tip = "" if tag is None else self._tips.get(tag.claim, "")
            QToolTip.showText(event.globalPos(), tip, self)
            return True
        return super().event(event)


class SketchEmpty(QWidget):
    """What to do while there is no structure."""

    paste_wanted = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.button = BenchButton(look, say("Paste structure"), parent=self)
        self.button.setToolTip(
            say("Take SMILES, InChI or a molfile from the clipboard")
        )
        self.button.clicked.connect(self.paste_wanted)
        self.setAccessibleName(say("No structure yet"))

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep the button in the middle."""
        hint = self.button.sizeHint()
        x = (self.width() - hint.width()) // 2
        self.button.setGeometry(
            x, self.height() // 2 + self.look.px(32), hint.width(), hint.height()
        )
        super().resizeEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the words."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        ink.fill(QRectF(self.rect()), "lane")
        x, y = self.width() / 2, self.height() / 2
        title = Face(size=16, weight=600)
        ink.text(x, y - px(28), say("No structure yet"), title, align="centre")
        first = say("Draw here, or paste SMILES")
        ink.text(x, y - px(4), first, SECOND, align="centre")
        second = say("or a molfile with Ctrl+V.")
        ink.text(x, y + px(14), second, SECOND, align="centre")
        painter.end()


class SketchPanel(QWidget):
    """Heading with formula and mass over the drawing or its empty state."""

    paste_wanted = Signal()
    copy_wanted = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self._remark = ""
        self.canvas = StructureCanvas(look)
        self.empty = SketchEmpty(look)
        self.paste = IconButton(
            look, "paste", say("Paste structure (Ctrl+V)"), parent=self
        )
        self.copy = IconButton(
            look, "copy", say("Copy structure as SMILES"), parent=self
        )
        self._column = column = QVBoxLayout(self)
        column.setContentsMargins(0, look.px(_HEAD_PX) + 1, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.empty, 1)
        column.addWidget(self.canvas, 1)
        self.canvas.hide()
        self.empty.paste_wanted.connect(self.paste_wanted)
        self.paste.clicked.connect(self.paste_wanted)
        self.copy.clicked.connect(self.copy_wanted)
        self.setMinimumSize(look.px(240), look.px(180))

    def show_structure(
        self,
        drawing: Drawing | None,
        tags: tuple[tuple[str, str, tuple[int, ...]], ...] = (),
        tips: dict[str, str] | None = None,
        foot: tuple[str, str] = ("", ""),
    ) -> None:
        """Show a structure, or the empty state."""
        self.empty.setVisible(drawing is None)
        self.canvas.setVisible(drawing is not None)
        self.copy.setVisible(drawing is not None)
        self._remark = ""
        if drawing is not None:
            self._remark = f"{formula(drawing.formula)}  {drawing.mass}"
        self.canvas.show_drawing(drawing, tags, tips or {}, foot)
        self.update()

    def retune(self) -> None:
        """Take the look's text size again."""
        for button in (self.paste, self.copy):
            button.retune()
        self._column.setContentsMargins(0, self.look.px(_HEAD_PX) + 1, 0, 0)
        self.setMinimumSize(self.look.px(240), self.look.px(180))
        self._place_icons()
        self.canvas.relay()

    def sizeHint(self) -> QSize:
        """As tall as there is room."""
        return QSize(256, 400)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep the icons at the right of the heading."""
        self._place_icons()
        super().resizeEvent(event)

    def _place_icons(self) -> None:
        px = self.look.px
        self.paste.move(self.width() - px(28) - 8, px(4))
        self.copy.move(self.width() - px(56) - 12, px(4))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the heading."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        ink.fill(QRectF(self.rect()), "panel")
        width = ink.text(_MARGIN, px(24), say("Sketch"), STRONG)
        left = _MARGIN + width + 12
        right = self.copy.x() - 6 if self.copy.isVisible() else self.paste.x() - 6
        ink.text(left, px(24), self._remark, SECOND, max_width=right - left)
        ink.hline(0, self.width(), px(_HEAD_PX))
        painter.end()
