"""The drawing surface: mouse and keys become edits, the view redraws from them."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from types import MappingProxyType

from PySide6.QtCore import QEvent, QPointF, QRectF, Qt, Signal
from PySide6.QtGui import (
    QFocusEvent,
    QKeyEvent,
    QKeySequence,
    QMouseEvent,
    QPainter,
    QPaintEvent,
    QResizeEvent,
    QWheelEvent,
)
from PySide6.QtWidgets import QWidget

from spinledger_app.painting.ink import Ink
from spinledger_app.presenters.wording import say
from spinledger_app.sketch import gestures
from spinledger_app.sketch.chemistry import Meaning, cleaned_up, meaning
from spinledger_app.sketch.drawing import Drawing, Point, centre, moved, rotated
from spinledger_app.sketch.gestures import NOWHERE, Edit, Kit, Spot, Tool
from spinledger_app.sketch.history import History, recorded, redone, undone
from spinledger_app.sketch.painting import (
    Shown,
    paint_band,
    paint_cursor,
    paint_drawing,
    paint_empty,
    paint_halo,
    paint_handle,
)
from spinledger_app.sketch.pointer import (
    Held,
    Press,
    PressKind,
    atoms_between,
    atoms_of,
    edit_of_drag,
    kind_of_press,
    moving_atoms,
)
from spinledger_app.sketch.typing_keys import chosen_kit, is_typed_key
from spinledger_app.sketch.view import (
    View,
    fitted,
    handle_px,
    is_inside,
    next_spot,
    panned,
    zoomed,
)
from spinledger_app.sketch.words import described
from spinledger_app.theme import Look

_REACH_PX = 12.0
_MARGIN_PX = 36.0
_EDGE_PX = 14.0
_CLICK_PX = 5.0
_NUDGE = 0.1
_TURN_RAD = math.pi / 12

_STANDARD_KEYS = (
    QKeySequence.StandardKey.Undo,
    QKeySequence.StandardKey.Redo,
    QKeySequence.StandardKey.Copy,
    QKeySequence.StandardKey.Cut,
    QKeySequence.StandardKey.Paste,
    QKeySequence.StandardKey.SelectAll,
)
_ARROWS: Mapping[int, Point] = MappingProxyType(
    {
        int(Qt.Key.Key_Left): (-1.0, 0.0),
        int(Qt.Key.Key_Right): (1.0, 0.0),
        int(Qt.Key.Key_Up): (0.0, 1.0),
        int(Qt.Key.Key_Down): (0.0, -1.0),
    }
)


class SketchCanvas(QWidget):
    """Draws with mouse or keys; every change is one step of its history."""

    drawing_changed = Signal()
    kit_wanted = Signal(object)
    view_changed = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.kit = Kit()
        self.history = History()
        self.meaning = Meaning()
        self.selected: frozenset[int] = frozenset()
        self.spot: Spot = NOWHERE
        self.shows_stereo = True
        # Kept free about the drawing when all of it is shown: px at the sides, over
        # and under it.
        self.margins_px: tuple[float, float, float] = (_MARGIN_PX,) * 3
        self._view = View()
        self._press: Press | None = None
        self._mouse_px: Point = (0.0, 0.0)
        self._preview: tuple[Drawing, Meaning] | None = None
        self.setMouseTracking(True)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setProperty("focusInside", True)
        self.setMinimumHeight(140)
        self.setAccessibleName(say("Structure editor"))

    @property
    def drawing(self) -> Drawing:
        """The drawing as it stands."""
        return self.history.present

    @property
    def view(self) -> View:
        """How the drawing lies on the screen."""
        return self._view

    @view.setter
    def view(self, view: View) -> None:
        self._view = view
        self.view_changed.emit()
        self.update()

    @property
    def is_dragging(self) -> bool:
        """Whether a button is down on the drawing."""
        return self._press is not None

    def show_drawing(self, drawing: Drawing) -> None:
        """Take a drawing from outside, without a way back to the one before."""
        self.history = History(present=drawing)
        self._take_changes(Spot(), frozenset())
        self.fit()

    def apply(self, edit: Edit | None, *, select: frozenset[int] | None = None) -> None:
        """Make one edit, as one step to undo; one without effect leaves no step."""
        if edit is None or edit.drawing == self.drawing:
            self.update()
            return
        n_before = len(self.drawing.atoms)
        self.history = recorded(self.history, edit.label, edit.drawing)
        if select is None:
            is_kept = len(edit.drawing.atoms) >= n_before
            select = self.selected if is_kept else frozenset()
        spot = self._spot_under_mouse() if edit.atom is None else Spot(atom=edit.atom)
        self._take_changes(spot, select)
        self.drawing_changed.emit()

    def undo(self) -> None:
        """Take the last edit back."""
        self._go(undone(self.history))

    def redo(self) -> None:
        """Make the edit again that was taken back."""
        self._go(redone(self.history))

    def clean_up(self) -> None:
        """Lay the structure out anew."""
        self.apply(Edit(label="Clean up", drawing=cleaned_up(self.drawing)))
        self.fit()

    def delete(self) -> None:
        """Delete the selection, or what the cursor is on."""
        atoms: tuple[int, ...] = tuple(self.selected)
        bonds: tuple[int, ...] = ()
        if not atoms:
            atoms = () if self.spot.atom is None else (self.spot.atom,)
            bonds = () if self.spot.bond is None else (self.spot.bond,)
        self.apply(gestures.erase(self.drawing, atoms, bonds), select=frozenset())

    def select(self, atoms: frozenset[int]) -> None:
        """Select some atoms."""
        self.selected = atoms
        self.update()

    def fit(self) -> None:
        """Show the whole drawing in the middle."""
        side, over, under = (self.look.px(one) for one in self.margins_px)
        self.view = fitted(
            self.drawing, (self.width(), self.height()), (side, over, under)
        )

    def _go(self, history: History) -> None:
        if history == self.history:
            return
        self.history = history
        self._take_changes(self._spot_under_mouse(), frozenset())
        self.drawing_changed.emit()

    def _take_changes(self, spot: Spot, selected: frozenset[int]) -> None:
        self.meaning = meaning(self.drawing)
        self._preview = None
        self.spot, self.selected = spot, selected
        size = (float(self.width()), float(self.height()))
        if not is_inside(self.drawing, self.view, size, _EDGE_PX):
            self.fit()
        self._tell_place()
        self.update()

    def _tell_place(self) -> None:
        self.setAccessibleDescription(described(self.drawing, self.meaning, self.spot))

    def _spot_under_mouse(self) -> Spot:
        return self.spot_at(self._mouse_px) if self.underMouse() else NOWHERE

    def spot_at(self, point_px: Point) -> Spot:
        """Atom or bond under a point of the screen."""
        reach = min(_REACH_PX / self.view.scale_px, 0.45)
        return gestures.spot_at(self.drawing, self.view.to_drawing(point_px), reach)

    # Mouse

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Begin a click or a drag."""
        self.setFocus(Qt.FocusReason.MouseFocusReason)
        self._mouse_px = _point(event.position())
        self.spot = self.spot_at(self._mouse_px)
        kind: PressKind
        if event.button() == Qt.MouseButton.MiddleButton:
            kind = "pan"
        elif event.button() == Qt.MouseButton.LeftButton:
            kind = kind_of_press(self._held(), self.kit.tool, self.spot, self._mouse_px)
        else:
            return
        self._press = Press(
            kind=kind, spot=self.spot, at_px=self._mouse_px, view=self.view
        )

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Point at something, or go on with a drag and show what it would give."""
        self._mouse_px = _point(event.position())
        press = self._press
        if press is None:
            self.spot = self.spot_at(self._mouse_px)
            is_near = self.spot != NOWHERE
            self.setCursor(
                Qt.CursorShape.PointingHandCursor
                if is_near
                else Qt.CursorShape.CrossCursor
            )
            self._tell_place()
        elif press.kind == "pan":
            x, y = press.at_px
            by = self._mouse_px[0] - x, self._mouse_px[1] - y
            self.view = panned(press.view, by)
        else:
            is_free = bool(event.modifiers() & Qt.KeyboardModifier.AltModifier)
            edit = self._edit_of_drag(press, is_free=is_free)
            self._preview = None
            if edit is not None:
                self._preview = edit.drawing, self._meaning_of(edit.drawing)
        self.update()

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """End a click or a drag."""
        press, self._press = self._press, None
        if press is None or press.kind == "pan":
            return
        self._mouse_px = _point(event.position())
        self._preview = None
        is_more = bool(event.modifiers() & Qt.KeyboardModifier.ShiftModifier)
        is_free = bool(event.modifiers() & Qt.KeyboardModifier.AltModifier)
        if math.dist(press.at_px, self._mouse_px) < _CLICK_PX:
            self._click(press, is_more)
        elif press.kind == "band":
            banded = atoms_between(self._held(), press.at_px, self._mouse_px)
            self.select(banded | (self.selected if is_more else frozenset()))
        else:
            moving = moving_atoms(self._held(), press)
            edit = self._edit_of_drag(press, is_free=is_free)
            keeps = edit is not None and len(edit.drawing.atoms) >= len(
                self.drawing.atoms
            )
            self.apply(edit, select=moving if keeps else frozenset())
            self.spot = self.spot_at(self._mouse_px)

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        """Select all that hangs together; another click with the other tools."""
        if self.kit.tool is Tool.PICK and self.spot.atom is not None:
            self.select(self.drawing.fragment(self.spot.atom))
            return
        self.mousePressEvent(event)

    def _click(self, press: Press, is_more: bool) -> None:
        if self.kit.tool is Tool.PICK:
            self._pick(press.spot, is_more=is_more)
            return
        place = self.view.to_drawing(press.at_px)
        self.apply(gestures.click(self.drawing, self.kit, press.spot, place))
        self.spot = self.spot_at(self._mouse_px)
        self.update()

    def _pick(self, spot: Spot, *, is_more: bool) -> None:
        atoms = atoms_of(self.drawing, spot)
        if is_more:
            atoms = self.selected ^ atoms
        self.select(atoms)

    def _held(self) -> Held:
        return Held(drawing=self.drawing, selected=self.selected, view=self.view)

    def _edit_of_drag(self, press: Press, *, is_free: bool) -> Edit | None:
        return edit_of_drag(
            self._held(), self.kit, press, self._mouse_px, is_free=is_free
        )

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Zoom about the mouse."""
        factor = 1.0015 ** event.angleDelta().y()
        self.view = zoomed(self.view, _point(event.position()), factor)
        self.update()

    def leaveEvent(self, event: QEvent) -> None:
        """Point at nothing."""
        if self._press is None:
            self.spot = NOWHERE
            self.update()

    # Keys

    def event(self, event: QEvent) -> bool:
        """Keep the keys of the editor from the window's shortcuts."""
        if event.type() == QEvent.Type.ShortcutOverride:
            assert isinstance(event, QKeyEvent)
            if self._is_own_key(event):
                event.accept()
                return True
        return super().event(event)

    def _is_own_key(self, event: QKeyEvent) -> bool:
        if any(event.matches(standard) for standard in _STANDARD_KEYS):
            return True
        modifiers = event.modifiers()
        if modifiers & Qt.KeyboardModifier.AltModifier:
            return False
        if modifiers & Qt.KeyboardModifier.ControlModifier:
            return event.key() in _ARROWS or event.key() == Qt.Key.Key_L
        return event.key() in _ACTS or is_typed_key(event.text().lower())

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Draw, change, choose a tool, or walk over the drawing."""
        if event.key() in _ARROWS:
            self._arrow(_ARROWS[event.key()], event.modifiers())
        elif event.modifiers() & Qt.KeyboardModifier.ControlModifier:
            super().keyPressEvent(event)
        elif event.key() in _ACTS:
            _ACTS[event.key()](self)
        elif not self._type(event.text().lower()):
            super().keyPressEvent(event)

    def _type(self, text: str) -> bool:
        edit = gestures.key(self.drawing, text, self.spot, (0.0, 0.0))
        if self.spot != NOWHERE and edit is not None:
            self.apply(edit)
            if edit.atom is None and self.spot == NOWHERE:
                self.spot = self.spot_at(self._mouse_px)
            return True
        kit = chosen_kit(self.kit, text)
        if kit is None:
            return False
        self.kit_wanted.emit(kit)
        return True

    def _arrow(self, towards: Point, modifiers: Qt.KeyboardModifier) -> None:
        atoms = self.selected or atoms_of(self.drawing, self.spot)
        if modifiers & Qt.KeyboardModifier.ShiftModifier and atoms:
            by = towards[0] * _NUDGE, towards[1] * _NUDGE
            drawn = moved(self.drawing, atoms, by)
            self._keep_spot(Edit(label="Move", drawing=drawn))
        elif modifiers & Qt.KeyboardModifier.ControlModifier and len(atoms) > 1:
            angle = -_TURN_RAD * (towards[0] or -towards[1])
            about = centre(self.drawing, atoms)
            drawn = rotated(self.drawing, atoms, angle, about)
            self._keep_spot(Edit(label="Turn", drawing=drawn))
        else:
            self.spot = next_spot(self.drawing, self.spot, towards)
            self._tell_place()
            self.update()

    def _keep_spot(self, edit: Edit) -> None:
        spot = self.spot
        self.apply(edit)
        self.spot = spot

    def grow(self) -> None:
        """Draw one bond more where the cursor is, and go to its end."""
        self.apply(gestures.grow(self.drawing, self.spot, self._free_place()))

    def act(self) -> None:
        """Do with the chosen tool what a click would do where the cursor is."""
        if self.kit.tool is Tool.PICK:
            self._pick(self.spot, is_more=True)
            return
        spot = self.spot
        edit = gestures.click(self.drawing, self.kit, spot, self._free_place())
        self.apply(edit)
        is_same = len(self.drawing.bonds) > (spot.bond or 0)
        if spot.bond is not None and is_same and self.kit.tool is not Tool.ERASE:
            self.spot = spot
        self.update()

    def rest(self) -> None:
        """Give up a drag, the selection, or the cursor."""
        if self._press is not None:
            self._press, self._preview = None, None
        elif self.selected:
            self.selected = frozenset()
        else:
            self.spot = NOWHERE
        self.update()

    def _free_place(self) -> Point:
        """Where something new goes that the keyboard draws: beside what is there."""
        if not self.drawing.atoms:
            return self.view.to_drawing((self.width() / 2, self.height() / 2))
        _, low, right, high = self.drawing.bounds
        return right + 2.0, (low + high) / 2

    def focusOutEvent(self, event: QFocusEvent) -> None:
        """End a drag that the window took away."""
        self._press, self._preview = None, None
        self.update()
        super().focusOutEvent(event)

    # Painting

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep the drawing in the middle."""
        self.fit()
        super().resizeEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint selection, drawing, cursor, and what is being dragged."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        ink.fill(QRectF(self.rect()), "lane")
        drawing, known = self._preview or (self.drawing, self.meaning)
        if not drawing.atoms:
            paint_empty(ink, (self.width(), self.height()))
        is_same = len(drawing.atoms) == len(self.drawing.atoms)
        if is_same:
            paint_halo(ink, drawing, self.view, self.selected)
        is_plain = self._preview is None and self.shows_stereo
        shown = Shown(
            drawing=drawing,
            hydrogens=known.hydrogens,
            labels=known.labels if is_plain else (),
            faulty={fault.atom for fault in known.faults},
        )
        paint_drawing(ink, shown, self.view)
        if self._preview is None:
            paint_cursor(ink, drawing, self.view, self.spot)
        knob = handle_px(drawing, self.view, self.selected) if is_same else None
        if knob is not None and self.kit.tool is Tool.PICK:
            paint_handle(ink, knob)
        if self._press is not None and self._press.kind == "band":
            paint_band(ink, self._press.at_px, self._mouse_px)
        painter.end()

    def _meaning_of(self, drawing: Drawing) -> Meaning:
        """Meaning of a preview; that of the present while only places change."""
        is_moved = drawing.bonds == self.drawing.bonds and len(drawing.atoms) == len(
            self.drawing.atoms
        )
        return self.meaning if is_moved else meaning(drawing)


_ACTS: Mapping[int, Callable[[SketchCanvas], None]] = MappingProxyType(
    {
        int(Qt.Key.Key_Space): SketchCanvas.grow,
        int(Qt.Key.Key_Return): SketchCanvas.act,
        int(Qt.Key.Key_Enter): SketchCanvas.act,
        int(Qt.Key.Key_Escape): SketchCanvas.rest,
        int(Qt.Key.Key_Delete): SketchCanvas.delete,
        int(Qt.Key.Key_Backspace): SketchCanvas.delete,
        int(Qt.Key.Key_Home): SketchCanvas.fit,
    }
)


def _point(point: QPointF) -> Point:
    return point.x(), point.y()
