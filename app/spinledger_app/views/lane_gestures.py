"""Mouse, wheel and keys of the lanes: what a movement means."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Literal

from PySide6.QtCore import QPointF, Qt
from PySide6.QtGui import QKeyEvent, QMouseEvent, QPen, QWheelEvent

from spinledger_app.lanes.layout import DEFAULT_SHARES
from spinledger_app.lanes.targets import NOTHING, Target
from spinledger_app.painting.ink import Ink
from spinledger_app.presenters.wording import number, say

if TYPE_CHECKING:
    from spinledger_app.views.lanes_view import LanesView

Manner = Literal["none", "root", "branch", "region", "pan", "border"]

_DRAG_FROM_PX = 4.0
_SNAP_PX = 4.0
_ZOOM_PER_NOTCH = 1.25
_PAN_PER_NOTCH_PX = 90.0
_KEY_PAN_PX = 80.0
_NOTCH = 120.0

_CURSORS = {
    "empty": Qt.CursorShape.CrossCursor,
    "signal": Qt.CursorShape.PointingHandCursor,
    "tree": Qt.CursorShape.PointingHandCursor,
    "root": Qt.CursorShape.OpenHandCursor,
    "branch": Qt.CursorShape.SizeHorCursor,
    "fold": Qt.CursorShape.SplitHCursor,
    "border": Qt.CursorShape.SplitVCursor,
}


@dataclass(slots=True)
class _Drag:
    """A press that may become a drag."""

    target: Target = NOTHING
    manner: Manner = "none"
    start: QPointF = field(default_factory=QPointF)
    last: QPointF = field(default_factory=QPointF)
    start_ppm: float | None = None
    value: float | None = None
    is_pressed: bool = False


class LaneGestures:
    """Turns events of the lanes into the view's signals."""

    def __init__(self, view: LanesView) -> None:
        self._view = view
        self._drag = _Drag()

    @property
    def is_idle(self) -> bool:
        """Whether nothing is dragged."""
        return self._drag.manner == "none"

    # -- mouse -------------------------------------------------------------------

    def press(self, event: QMouseEvent) -> None:
        """Remember where and on what the button went down."""
        view = self._view
        place = event.position()
        target = view.target(place.x(), place.y())
        ppm = None if view.map is None else view.map.ppm_at(place.x())
        if event.button() == Qt.MouseButton.RightButton:
            view.menu_wanted.emit(target, ppm, event.globalPosition().toPoint())
            return
        is_middle = event.button() == Qt.MouseButton.MiddleButton
        self._drag = _Drag(
            target=target,
            manner="pan" if is_middle else "none",
            start=place,
            last=place,
            start_ppm=self._snapped(place.x()),
            is_pressed=True,
        )
        if target.kind == "root":
            view.setCursor(Qt.CursorShape.ClosedHandCursor)

    def move(self, event: QMouseEvent) -> None:
        """Drag on, or point at what lies under the mouse."""
        drag, place = self._drag, event.position()
        if not drag.is_pressed:
            self._point(place)
            return
        far = (place - drag.start).manhattanLength() >= _DRAG_FROM_PX
        if drag.manner == "none" and far:
            drag.manner = self._manner_of(drag.target)
        self._drag_to(
            place, free=bool(event.modifiers() & Qt.KeyboardModifier.AltModifier)
        )
        drag.last = place

    def _manner_of(self, target: Target) -> Manner:
        if target.kind == "root":
            return "root"
        if target.kind == "branch":
            return "branch"
        if target.kind == "border":
            return "border"
        return "region"

    def _drag_to(self, place: QPointF, *, free: bool) -> None:
        view, drag = self._view, self._drag
        if view.map is None or view.camera is None:
            return
        if drag.manner == "root":
            drag.value = self._ppm(place.x(), free=free)
        elif drag.manner == "branch":
            drag.value = self._dragged_j(place, free=free)
        elif drag.manner == "region" and drag.start_ppm is not None:
            here = self._ppm(place.x(), free=free)
            low, high = min(here, drag.start_ppm), max(here, drag.start_ppm)
            view.region_ppm = (low, high) if high - low > 1e-6 else None
        elif drag.manner == "pan":
            view.go_to(view.camera.panned(drag.last.x() - place.x()), is_eased=False)
        elif drag.manner == "border":
            self._drag_border(place.y())
        view.update()

    def _drag_border(self, y: float) -> None:
        view, layout = self._view, self._view.layout_now
        edges = [layout.seam, layout.claims_bottom]
        edges[self._drag.target.index] = y
        heights = (edges[0], edges[1] - edges[0], layout.axis_top - edges[1])
        if min(heights) > 40:
            view.set_shares(heights)

    def _dragged_j(self, place: QPointF, *, free: bool) -> float | None:
        view, target = self._view, self._drag.target
        handles = [
            h
            for h in view.handles
            if (h.claim, h.level) == (target.claim, target.level)
        ]
        tree = None if view.scene is None else view.scene.tree_of(target.claim or "")
        if not handles or tree is None or view.map is None or view.scene is None:
            return self._drag.value
        x = place.x()
        snapped = None if free else view.map.x_of(self._snapped(x))
        x = snapped if snapped is not None else x
        node = min(handles[0].nodes, key=lambda one: abs(one - self._drag.start.x()))
        half = tree.levels[target.level].n_partners / 2
        px_per_hz = view.map.px_per_hz(view.scene.frequency_mhz)
        return max(0.1, abs(x - node) / half / px_per_hz)

    def release(self, event: QMouseEvent) -> None:
        """A click, or the end of a drag."""
        view, drag = self._view, self._drag
        self._drag = _Drag()
        if not drag.is_pressed:
            return
        if drag.manner == "none":
            self._click(drag.target)
        elif drag.manner == "root" and drag.value is not None:
            view.root_dropped.emit(drag.target.claim, drag.value)
        elif drag.manner == "branch" and drag.value is not None:
            view.branch_dropped.emit(drag.target.claim, drag.target.level, drag.value)
        elif drag.manner == "region" and view.region_ppm is not None:
            view.region_marked.emit(*view.region_ppm)
        self._point(event.position())
        view.update()

    def _click(self, target: Target) -> None:
        view = self._view
        view.region_ppm = None
        if target.kind == "fold":
            view.open_fold(target.index)
        elif target.kind == "signal" and target.signal is not None:
            view.signal_clicked.emit(target.signal)
        elif target.claim is not None:
            view.claim_clicked.emit(target.claim)
        else:
            view.signal_clicked.emit("")

    def double_click(self, event: QMouseEvent) -> None:
        """Look at the signal under the cursor, or give lanes their own heights."""
        view = self._view
        self._drag = _Drag()
        place = event.position()
        target = view.target(place.x(), place.y())
        if target.kind == "border":
            view.set_shares(DEFAULT_SHARES)
            return
        self.look_at(target, place.x())

    def look_at(self, target: Target, x: float) -> None:
        """Zoom to a target's signal, or in about a place where there is none."""
        view = self._view
        if view.scene is None or view.map is None or view.camera is None:
            return
        mark = view.scene.signal(target.signal) if target.signal else None
        if mark is not None:
            view.zoom_to(mark.low_ppm, mark.high_ppm)
            return
        tree = view.scene.tree_of(target.claim) if target.claim else None
        if tree is not None:
            tips = [leaf.tip_ppm for leaf in tree.leaves] or [tree.root_ppm]
            view.zoom_to(min(tips), max(tips))
            return
        view.go_to(view.camera.zoomed(4.0, x))

    def leave(self) -> None:
        """The mouse went away."""
        self._view.cursor_x = None
        self._view.lit_fold = None
        self._view.target_hovered.emit(NOTHING, None, QPointF())
        self._light(None)

    def _point(self, place: QPointF) -> None:
        view = self._view
        target = view.target(place.x(), place.y())
        layout = view.layout_now
        is_over_lanes = layout.left <= place.x() <= layout.right
        view.cursor_x = place.x() if is_over_lanes and target.kind != "fold" else None
        view.lit_fold = target.index if target.kind == "fold" else None
        shape = (
            _CURSORS[target.kind]
            if is_over_lanes or target.kind == "border"
            else (Qt.CursorShape.ArrowCursor)
        )
        view.setCursor(shape)
        is_branch = target.kind == "branch" and target.claim is not None
        self._light((target.claim, target.level) if is_branch else None)  # type: ignore[arg-type]
        ppm = None if view.map is None else view.map.ppm_at(place.x())
        view.target_hovered.emit(target, ppm, place)
        view.update()

    def _light(self, level: tuple[str, int] | None) -> None:
        view = self._view
        if view.lit_level != level:
            view.lit_level = level
            view.refresh()

    def _ppm(self, x: float, *, free: bool) -> float:
        view = self._view
        assert view.map is not None
        return view.map.nearest_ppm(x) if free else self._snapped(x)

    def _snapped(self, x: float) -> float:
        """Shift under a place, or that of a line within 4 px."""
        view = self._view
        if view.map is None or view.scene is None:
            return 0.0
        best, reach = view.map.nearest_ppm(x), _SNAP_PX
        for foot in view.scene.feet:
            line_x = view.map.x_of(foot.shift_ppm)
            if line_x is not None and abs(line_x - x) <= reach:
                best, reach = foot.shift_ppm, abs(line_x - x)
        return best

    # -- what is painted while dragging ----------------------------------------

    def paint(self, ink: Ink) -> None:
        """Ring and flag of what is dragged."""
        view, drag = self._view, self._drag
        if drag.value is None or view.map is None:
            return
        layout = view.layout_now
        if drag.manner == "root":
            x = view.map.x_of(drag.value)
            if x is None:
                return
            ink.painter.setPen(QPen(ink.colour("accent"), 2))
            ink.painter.drawEllipse(QPointF(x, layout.soil), 11, 11)
            ink.vline(round(x), layout.evidence_top, layout.soil, "accent")
            width = ink.look.width("0.0000", 13, 600)
            flag_x = x + 26 + width / 2
            view.over.paint_flag(ink, flag_x, layout.soil - 12, number(drag.value, 4))
        elif drag.manner == "branch":
            x = drag.last.x()
            text = say("J {0} Hz").replace("{0}", number(drag.value, 2))
            ink.vline(round(x), layout.seam, layout.soil, "accent")
            view.over.paint_flag(ink, x, drag.last.y() - 30, text)

    # -- wheel and keys ----------------------------------------------------------

    def wheel(self, event: QWheelEvent) -> None:
        """Zoom about the cursor; Shift pans, Ctrl changes the gain."""
        view = self._view
        if view.camera is None:
            return
        angle = event.angleDelta()
        notches = (angle.y() or angle.x()) / _NOTCH
        modifiers = event.modifiers()
        if modifiers & Qt.KeyboardModifier.ControlModifier:
            view.multiply_gain(notches)
        elif modifiers & Qt.KeyboardModifier.ShiftModifier or (
            abs(angle.x()) > abs(angle.y())
        ):
            view.go_to(view.camera.panned(-notches * _PAN_PER_NOTCH_PX), is_eased=False)
        else:
            at = event.position().x()
            view.go_to(view.camera.zoomed(_ZOOM_PER_NOTCH**notches, at))
        event.accept()

    def key(self, event: QKeyEvent) -> bool:
        """Handle a key; False where it is not ours."""
        view = self._view
        if view.camera is None or view.scene is None:
            return False
        layout = view.layout_now
        middle = (layout.left + layout.right) / 2
        has_alt = bool(event.modifiers() & Qt.KeyboardModifier.AltModifier)
        if event.modifiers() & Qt.KeyboardModifier.ControlModifier:
            return False
        keys = Qt.Key
        actions = {
            keys.Key_Plus: lambda: view.go_to(view.camera.zoomed(1.5, middle)),  # type: ignore[union-attr]
            keys.Key_Equal: lambda: view.go_to(view.camera.zoomed(1.5, middle)),  # type: ignore[union-attr]
            keys.Key_Minus: lambda: view.go_to(view.camera.zoomed(1 / 1.5, middle)),  # type: ignore[union-attr]
            keys.Key_Home: view.go_home,
            keys.Key_Backspace: view.go_back,
            keys.Key_PageUp: lambda: view.multiply_gain(2),
            keys.Key_PageDown: lambda: view.multiply_gain(-2),
            keys.Key_Left: lambda: self._step(-1, is_pan=has_alt),
            keys.Key_Right: lambda: self._step(1, is_pan=has_alt),
            keys.Key_Return: self._enter,
            keys.Key_Enter: self._enter,
            keys.Key_Space: self._zoom_on_hovered,
            keys.Key_Menu: self._menu,
        }
        action = actions.get(Qt.Key(event.key()))
        if action is None:
            return False
        action()
        return True

    def _step(self, by: int, *, is_pan: bool) -> None:
        """To the next signal, or along the axis."""
        view = self._view
        assert view.camera is not None
        assert view.scene is not None
        if is_pan:
            view.go_to(view.camera.panned(by * _KEY_PAN_PX))
            return
        marks = view.scene.signals
        if not marks:
            return
        keys = [mark.key for mark in marks]
        now = view.marks.hovered_signal
        index = keys.index(now) + by if now in keys else (0 if by > 0 else -1)
        mark = marks[index % len(marks)]
        target = Target(
            kind="signal",
            signal=mark.key,
            claim=mark.claims[0] if len(mark.claims) == 1 else None,
        )
        if view.map is not None and view.map.x_of(mark.centre_ppm) is not None:
            view.go_to(view.camera.panned(self._out_of_sight_px(mark.centre_ppm)))
        view.setAccessibleDescription(mark.tip)
        view.target_hovered.emit(target, mark.centre_ppm, QPointF())

    def _out_of_sight_px(self, shift_ppm: float) -> float:
        view = self._view
        assert view.map is not None
        x = view.map.x_of(shift_ppm) or 0.0
        if x < view.layout_now.left + 20:
            return x - view.layout_now.left - 60
        if x > view.layout_now.right - 20:
            return x - view.layout_now.right + 60
        return 0.0

    def _enter(self) -> None:
        key = self._view.marks.hovered_signal
        if key is not None:
            self._view.signal_clicked.emit(key)

    def _zoom_on_hovered(self) -> None:
        target = self._hovered_target()
        self.look_at(
            target, (self._view.layout_now.left + self._view.layout_now.right) / 2
        )

    def _hovered_target(self) -> Target:
        marks = self._view.marks
        if marks.hovered_signal is not None:
            return Target(kind="signal", signal=marks.hovered_signal)
        return NOTHING

    def _menu(self) -> None:
        view = self._view
        target = self._hovered_target()
        mark = (
            view.scene.signal(target.signal) if view.scene and target.signal else None
        )
        ppm = None if mark is None else mark.centre_ppm
        place = view.point_of(ppm) if ppm is not None else None
        where = place.toPoint() if place is not None else view.rect().center()
        view.menu_wanted.emit(target, ppm, view.mapToGlobal(where))
