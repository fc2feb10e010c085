"""The ribbon: the whole spectrum, unfolded, with the shown stretches marked."""

from __future__ import annotations

import numpy as np
from PySide6.QtCore import QRectF, Qt, Signal
from PySide6.QtGui import QMouseEvent, QPainter, QPaintEvent, QPen, QPixmap
from PySide6.QtWidgets import QWidget

from spinledger_app.lanes.polygons import polygon
from spinledger_app.lanes.scene import LaneScene
from spinledger_app.lanes.shift_map import ShiftMap, Stretch
from spinledger_app.painting.ink import CAPTION, SECOND, Ink
from spinledger_app.presenters.wording import number, say
from spinledger_app.theme import Look

HEIGHT_PX = 44
_LEFT = 16
_RIGHT = 16
_CURVE_PX = 22.0
_EMPTY_AXIS = Stretch(high_ppm=9.0, low_ppm=-0.5)
_CLICK_PX = 3.0


class RibbonView(QWidget):
    """Whole spectrum in 44 px; a click or drag there goes elsewhere."""

    place_wanted = Signal(float)
    window_wanted = Signal(float, float)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.gutter = 88
        self._scene: LaneScene | None = None
        self._map: ShiftMap | None = None
        self._curve: QPixmap | None = None
        self._press_x: float | None = None
        self._drag_x: float | None = None
        self.setFixedHeight(look.px(HEIGHT_PX) + 1)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setAccessibleName(say("Whole spectrum"))
        self.setToolTip(
            say("Whole spectrum: click to go there, drag to look at a part")
        )

    def show_scene(self, scene: LaneScene | None) -> None:
        """Show another spectrum."""
        self._scene = scene
        self.refresh()

    def show_map(self, shift_map: ShiftMap | None) -> None:
        """Mark the stretches that are on screen."""
        self._map = shift_map
        self.update()

    def retune(self) -> None:
        """Take the look's text size again."""
        self.setFixedHeight(self.look.px(HEIGHT_PX) + 1)
        self.refresh()

    def refresh(self) -> None:
        """Paint everything anew."""
        self._curve = None
        self.update()

    @property
    def _axis(self) -> Stretch:
        return _EMPTY_AXIS if self._scene is None else self._scene.whole

    def _x(self, shift_ppm: float) -> float:
        axis = self._axis
        room = self.width() - _RIGHT - self.gutter
        return self.gutter + (axis.high_ppm - shift_ppm) / axis.width_ppm * room

    def _ppm(self, x: float) -> float:
        axis = self._axis
        room = max(self.width() - _RIGHT - self.gutter, 1)
        share = min(max((x - self.gutter) / room, 0.0), 1.0)
        return axis.high_ppm - share * axis.width_ppm

    def resizeEvent(self, event: object) -> None:
        """Make the picture anew."""
        self.refresh()
        super().resizeEvent(event)  # type: ignore[arg-type]

    def changeEvent(self, event: object) -> None:
        """Follow other colours."""
        self.refresh()
        super().changeEvent(event)  # type: ignore[arg-type]

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint marks, curve and axis."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        ink.fill(QRectF(self.rect()), "panel")
        ink.text(_LEFT, self.look.px(27), say("Whole"), SECOND)
        self._paint_marks(ink)
        if self._scene is not None:
            if self._curve is None:
                self._curve = self._painted_curve(self._scene)
            painter.drawPixmap(0, 0, self._curve)
        self._paint_axis(ink)
        if self._press_x is not None and self._drag_x is not None:
            left, right = sorted((self._press_x, self._drag_x))
            ink.fill(QRectF(left, 2, right - left, 28), self.look.tint)
        ink.hline(0, self.width(), self.height() - 1)
        painter.end()

    def _paint_marks(self, ink: Ink) -> None:
        shift_map = self._map
        if shift_map is None:
            return
        for index in shift_map.visible():
            window = shift_map.window_ppm(index)
            if window is None:
                continue
            left = max(self._x(window[0]) - 2, self.gutter - 2)
            right = min(self._x(window[1]) + 2, self.width() - _RIGHT + 2)
            if right > left:
                ink.fill(QRectF(left, 4, right - left, 26), "selected")
                ink.fill(QRectF(left, 2, right - left, 2), "accent")

    def _painted_curve(self, scene: LaneScene) -> QPixmap:
        ratio = self.devicePixelRatioF()
        picture = QPixmap(self.size() * ratio)
        picture.setDevicePixelRatio(ratio)
        picture.fill(Qt.GlobalColor.transparent)
        painter = QPainter(picture)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        axis = scene.whole
        start, stop = scene.measured.indices(axis.high_ppm, axis.low_ppm)
        n_columns = max(2, round((self.width() - _RIGHT - self.gutter) * 2))
        if stop - start > 2:
            columns = scene.measured.pyramid.columns(start, stop, n_columns)
            high = scene.measured.first_point_ppm - start * scene.measured.step_ppm
            low = scene.measured.first_point_ppm - stop * scene.measured.step_ppm
            xs = np.linspace(self._x(high), self._x(low), n_columns)
            # Root scale: weak signals must show in 22 px.
            shares = np.sqrt(np.clip(columns.highs / scene.full_height, 0, 1))
            painter.setPen(QPen(self.look.colour("trace"), 1))
            painter.drawPolyline(polygon(xs, 29.5 - _CURVE_PX * shares))
        painter.end()
        return picture

    def _paint_axis(self, ink: Ink) -> None:
        axis = self._axis
        baseline = self.look.px(42)
        ink.hline(self.gutter, self.width() - _RIGHT, 30, "rule")
        step = 2 if axis.width_ppm > 6 else 1
        first = int(np.ceil(axis.low_ppm))
        taken = float("inf")
        for shift in range(first, int(np.floor(axis.high_ppm)) + 1):
            x = self._x(shift)
            ink.vline(round(x), 30, 33, "rule")
            text = number(shift, 0)
            half = ink.look.width(text, 12) / 2
            held = min(max(x, self.gutter + half), self.width() - _RIGHT - half)
            if shift % step == 0 and held + half < taken - 6:
                ink.text(held, baseline, text, CAPTION, align="centre")
                taken = held - half

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Start a drag."""
        if event.button() == Qt.MouseButton.LeftButton:
            self._press_x = event.position().x()

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Show the part that is dragged over."""
        if self._press_x is not None:
            self._drag_x = event.position().x()
            self.update()

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Go to a place, or look at a part."""
        if self._press_x is None:
            return
        start, end = self._press_x, event.position().x()
        self._press_x = self._drag_x = None
        self.update()
        if self._scene is None:
            return
        if abs(end - start) < _CLICK_PX:
            self.place_wanted.emit(self._ppm(end))
        else:
            low, high = sorted((self._ppm(start), self._ppm(end)))
            self.window_wanted.emit(low, high)
