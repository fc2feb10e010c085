"""One tag a claim over the structure: pointed at, clicked, walked with arrows."""

from __future__ import annotations

import math

from PySide6.QtCore import (
    QEvent,
    QObject,
    QPoint,
    QPointF,
    QRect,
    QRectF,
    Qt,
    QTimer,
    Signal,
)
from PySide6.QtGui import (
    QContextMenuEvent,
    QHelpEvent,
    QKeyEvent,
    QMouseEvent,
    QPainter,
    QPaintEvent,
)
from PySide6.QtWidgets import QToolTip, QWidget

from spinledger_app.painting.ink import SECOND_STRONG, Ink, label_width
from spinledger_app.painting.marks import paint_mark
from spinledger_app.painting.molecule import atom_text_width
from spinledger_app.presenters.structure import PlacedTag, TagWish, place_tags
from spinledger_app.presenters.tags import Tag
from spinledger_app.presenters.wording import say
from spinledger_app.selection import Marks
from spinledger_app.sketch.canvas import SketchCanvas
from spinledger_app.sketch.gestures import Tool
from spinledger_app.sketch.painting import Shown, presented

_MANY_TAGS = 8
_BARE_MARGINS = (36.0, 36.0, 36.0)
_TAG_MARGINS = (40.0, 40.0, 40.0)
_MANY_TAG_MARGINS = (54.0, 44.0, 44.0)
_CLICK_PX = 5.0
_STEPS = {
    Qt.Key.Key_Left: -1,
    Qt.Key.Key_Up: -1,
    Qt.Key.Key_Right: 1,
    Qt.Key.Key_Down: 1,
}


class TagLayer(QWidget):
    """Lies over the drawing surface and takes the mouse where there is a tag.

    With the tool that selects, an atom that has a claim stands for its tag: pointing
    at it lights the claim, a click selects it; Shift and a click, or a band about
    it, select the atom itself. With any other tool the surface is for drawing alone,
    and the tags give way while the mouse is on it.

    Signals
    -------
    claim_clicked : str
    claim_hovered : str or None
    menu_wanted : str claim, QPoint on the screen
    """

    claim_clicked = Signal(str)
    claim_hovered = Signal(object)
    menu_wanted = Signal(str, object)

    def __init__(self, canvas: SketchCanvas, parent: QWidget) -> None:
        # Not a child of the surface: keys that no tag takes must not reach it.
        super().__init__(parent)
        self._ground = parent
        self.look = canvas.look
        self.canvas = canvas
        self.placed: tuple[PlacedTag, ...] = ()
        self._wishes: tuple[Tag, ...] = ()
        self._tips: dict[str, str] = {}
        self._marks = Marks()
        self._partners: tuple[str, ...] = ()
        self._pressed: tuple[str, QPointF] | None = None
        self.setAttribute(Qt.WidgetAttribute.WA_TransparentForMouseEvents)
        self.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self.setProperty("focusInside", True)
        # Once a turn of the event loop, however often the view changes in it.
        self._later = QTimer(self)
        self._later.setSingleShot(True)
        self._later.setInterval(0)
        self._later.timeout.connect(self._lay_out)
        self._laid: object = None
        canvas.installEventFilter(self)
        canvas.view_changed.connect(self.lay_out)

    def show_tags(self, tags: tuple[Tag, ...], tips: dict[str, str]) -> None:
        """Show tags; each is (claim, state, atoms of the structure)."""
        self._tips = tips
        if tags == self._wishes:
            return
        self._wishes = tags
        name = say("Structure, {0} claims").replace("{0}", str(len(tags)))
        self.setAccessibleName(name)
        self._make_room()
        self.lay_out()

    def _make_room(self) -> None:
        n_tags = len(self._wishes)
        margins = _MANY_TAG_MARGINS if n_tags >= _MANY_TAGS else _TAG_MARGINS
        margins = margins if n_tags else _BARE_MARGINS
        if margins != self.canvas.margins_px:
            self.canvas.margins_px = margins
            self.canvas.fit()

    def show_marks(self, marks: Marks, partners: tuple[str, ...]) -> None:
        """Set off what is hovered and selected, and its coupling partners."""
        if (marks, partners) != (self._marks, self._partners):
            self._marks, self._partners = marks, partners
            self.update()

    @property
    def is_active(self) -> bool:
        """Whether tags take the mouse: there are some, and the tool selects."""
        return bool(self._wishes) and self.canvas.kit.tool is Tool.PICK

    @property
    def is_shown(self) -> bool:
        """Whether tags show; while one draws they give way."""
        is_drawing = self.canvas.kit.tool is not Tool.PICK and self.canvas.underMouse()
        return bool(self._wishes) and not is_drawing

    def heavy_atoms(self) -> list[int]:
        """Atoms of the drawing that are atoms of the structure, in its order."""
        atoms = self.canvas.drawing.atoms
        return [i for i, one in enumerate(atoms) if one.element != "H" or one.isotope]

    def lay_out(self) -> None:
        """Place the tags anew, at the end of this turn of the event loop."""
        self.canvas.shows_stereo = not self._wishes  # letters and tags would meet
        self._later.start()

    def _lay_out(self) -> None:
        canvas, px = self.canvas, self.look.px
        self._cover()
        self.setVisible(self.is_shown)
        state = (
            canvas.drawing, canvas.view, self._wishes, canvas.size(),
            self.look.text_scale,
        )  # fmt: skip
        if state == self._laid:
            return
        self._laid = state
        self.placed = ()
        heavy = self.heavy_atoms()
        is_same = all(i < len(heavy) for _, _, atoms in self._wishes for i in atoms)
        if self._wishes and canvas.drawing.atoms and is_same:
            drawing = presented(
                Shown(drawing=canvas.drawing, hydrogens=canvas.meaning.hydrogens)
            )
            places = [canvas.view.to_screen(one.place) for one in canvas.drawing.atoms]
            wishes = [
                TagWish(
                    claim=claim, state=state, atoms=tuple(heavy[i] for i in atoms),
                    width=label_width(self.look, claim, SECOND_STRONG) + px(28),
                )
                for claim, state, atoms in self._wishes
            ]  # fmt: skip
            self.placed = place_tags(
                drawing,
                places,
                wishes,
                size=(canvas.width(), canvas.height()),
                height=px(20),
                label_width=lambda atom: atom_text_width(self.look, atom),
            )
        self.update()

    def _cover(self) -> None:
        corner = self.canvas.mapTo(self._ground, QPoint(0, 0))
        self.setGeometry(QRect(corner, self.canvas.size()))
        self.raise_()

    def tag_at(self, x: float, y: float) -> PlacedTag | None:
        """Tag under a place, 24 px high at least."""
        for tag in reversed(self.placed):
            in_x = tag.left - 1 <= x <= tag.left + tag.width + 1
            if in_x and tag.top - 2 <= y <= tag.top + tag.height + 2:
                return tag
        return None

    def claim_at(self, point: QPointF) -> str | None:
        """Claim of the tag, else of the atom under a place."""
        tag = self.tag_at(point.x(), point.y())
        if tag is not None:
            return tag.claim
        atom = self.canvas.spot.atom
        return None if atom is None else self.claim_of_atom(atom)

    def claim_of_atom(self, atom: int) -> str | None:
        """Claim that an atom of the drawing stands for; the selected one goes on."""
        heavy = self.heavy_atoms()
        if atom not in heavy:
            return None
        index = heavy.index(atom)
        mine = [claim for claim, _, atoms in self._wishes if index in atoms]
        if not mine:
            return None
        if self._marks.selected in mine[:-1]:
            return mine[mine.index(self._marks.selected) + 1]
        return mine[0]

    # -- mouse, taken from the drawing surface ----------------------------------------

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Take what belongs to a tag; everything else goes on to the drawing."""
        if event.type() in (QEvent.Type.Resize, QEvent.Type.Move):
            self._cover()
        if event.type() in (QEvent.Type.Enter, QEvent.Type.Leave):
            self.setVisible(self.is_shown)
        if not self.is_active:
            return False
        match event:
            case QMouseEvent():
                return self._take_mouse(event)
            case QHelpEvent() if event.type() == QEvent.Type.ToolTip:
                return self._show_tip(event)
            case QContextMenuEvent():
                return self._ask_menu(event)
            case _ if event.type() == QEvent.Type.Leave:
                self.claim_hovered.emit(None)
        return False

    def _take_mouse(self, event: QMouseEvent) -> bool:
        place = event.position()
        tag = self.tag_at(place.x(), place.y())
        match event.type():
            case QEvent.Type.MouseMove if not self.canvas.is_dragging:
                return self._point_at(place, tag)
            case QEvent.Type.MouseButtonPress:
                return self._press(event, tag)
            case QEvent.Type.MouseButtonDblClick:
                return tag is not None
            case QEvent.Type.MouseButtonRelease:
                return self._release(place)
        return False

    def _point_at(self, place: QPointF, tag: PlacedTag | None) -> bool:
        if tag is not None:
            self.canvas.setCursor(Qt.CursorShape.PointingHandCursor)
            self.claim_hovered.emit(tag.claim)
            return True
        reached = self.canvas.spot_at((place.x(), place.y()))
        claim = None if reached.atom is None else self.claim_of_atom(reached.atom)
        if claim != self._marks.hovered:
            self.claim_hovered.emit(claim)
        return False

    def _press(self, event: QMouseEvent, tag: PlacedTag | None) -> bool:
        self._pressed = None
        if event.button() != Qt.MouseButton.LeftButton:
            return False
        place = event.position()
        if tag is not None:
            self._pressed = (tag.claim, place)
            return True
        spot = self.canvas.spot_at((place.x(), place.y()))
        claim = None if spot.atom is None else self.claim_of_atom(spot.atom)
        if claim is not None and not event.modifiers():
            self._pressed = (claim, place)
        return False  # a drag from here moves the atom

    def _release(self, place: QPointF) -> bool:
        pressed, self._pressed = self._pressed, None
        if pressed is None:
            return False
        claim, start = pressed
        if math.hypot(place.x() - start.x(), place.y() - start.y()) >= _CLICK_PX:
            return False
        if self.canvas.is_dragging:
            self.canvas.rest()
        # The keys of the drawing must not meet what is meant for the claim.
        self.setFocus(Qt.FocusReason.MouseFocusReason)
        self.claim_clicked.emit(claim)
        return True

    def _show_tip(self, event: QHelpEvent) -> bool:
        claim = self.claim_at(QPointF(event.pos()))
        tip = "" if claim is None else self._tips.get(claim, "")
        QToolTip.showText(event.globalPos(), tip, self.canvas)
        return True

    def _ask_menu(self, event: QContextMenuEvent) -> bool:
        claim = self.claim_at(QPointF(event.pos()))
        if claim is None:
            return False
        self.menu_wanted.emit(claim, event.globalPos())
        return True

    # -- keys ----------------------------------------------------------------------------

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Arrows go from tag to tag, Enter selects."""
        claims = [tag.claim for tag in self.placed]
        key = Qt.Key(event.key())
        if claims and key in _STEPS:
            now = self._marks.hovered
            index = claims.index(now) + _STEPS[key] if now in claims else 0
            claim = claims[index % len(claims)]
            self.setAccessibleDescription(self._tips.get(claim, claim))
            self.claim_hovered.emit(claim)
        elif key in (Qt.Key.Key_Return, Qt.Key.Key_Enter) and self._marks.hovered:
            self.claim_clicked.emit(self._marks.hovered)
        else:
            super().keyPressEvent(event)

    # -- painting ------------------------------------------------------------------------

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint leaders and tags."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        for tag in self.placed:
            if tag.is_led:
                x, y = self.canvas.view.to_screen(
                    self.canvas.drawing.atoms[tag.atom].place
                )
                near_x = min(max(x, tag.left), tag.left + tag.width)
                near_y = tag.top if tag.centre[1] > y else tag.top + tag.height
                ink.line((x, y), (near_x, near_y), "rule", 1.0)
        for tag in self.placed:
            self._paint_tag(ink, tag)
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
