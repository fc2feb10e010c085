"""The three lanes on one axis: one widget, painted as a whole, then overlaid."""

from __future__ import annotations

from dataclasses import replace

from PySide6.QtCore import QEvent, QPointF, QRectF, QSize, Qt, QTimer, Signal
from PySide6.QtGui import (
    QKeyEvent,
    QMouseEvent,
    QPainter,
    QPaintEvent,
    QPixmap,
    QResizeEvent,
    QWheelEvent,
)
from PySide6.QtWidgets import QSizePolicy, QWidget

from spinledger_app.lanes.axis_layer import (
    paint_axis,
    paint_folds,
    paint_grid,
)
from spinledger_app.lanes.camera import Camera
from spinledger_app.lanes.claims_layer import BranchHandle, ClaimsPainter
from spinledger_app.lanes.evidence_layer import paint_brackets, paint_evidence
from spinledger_app.lanes.grove import LARGE_LEAVES_FROM, Grove, plant
from spinledger_app.lanes.layout import DEFAULT_SHARES, LaneLayout, lane_layout
from spinledger_app.lanes.overlay_layer import Ghost, paint_ghosts, paint_overlay
from spinledger_app.lanes.residue_layer import paint_residue, paint_residue_ticks
from spinledger_app.lanes.scene import LaneScene, Trace, TreeShape
from spinledger_app.lanes.shift_map import ShiftMap
from spinledger_app.lanes.targets import NOTHING, Target, target_at
from spinledger_app.painting.ink import SECOND, Ink, label_width
from spinledger_app.presenters.wording import say
from spinledger_app.selection import Marks
from spinledger_app.theme import Look
from spinledger_app.views.gutter import paint_gutter
from spinledger_app.views.lane_gestures import LaneGestures
from spinledger_app.views.lanes_over import LanesOver

EASE_MS = 120
_FRAME_MS = 8
_GAIN_STEP = 1.25


class LanesView(QWidget):
    """Evidence, Claims and Residue; shows a scene, tells gestures.

    Signals
    -------
    target_hovered : Target, float or None (ppm), QPointF
    signal_clicked : str key
    claim_clicked : str
    root_dropped : str claim, float ppm
    branch_dropped : str claim, int level, float J in Hz
    region_marked : float low_ppm, float high_ppm
    menu_wanted : Target, float or None (ppm), QPoint on the screen
    folding_changed : bool
    view_changed : none
    """

    target_hovered = Signal(object, object, object)
    signal_clicked = Signal(str)
    claim_clicked = Signal(str)
    root_dropped = Signal(str, float)
    branch_dropped = Signal(str, int, float)
    region_marked = Signal(float, float)
    menu_wanted = Signal(object, object, object)
    folding_changed = Signal(bool)
    view_changed = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.scene: LaneScene | None = None
        self.camera: Camera | None = None
        self.layout_now = lane_layout(640, 600)
        self.grove = Grove(trees=(), labels=(), px_per_hz=1.0)
        self.handles: list[BranchHandle] = []
        self.marks = Marks()
        self.gain = 1.0
        self.has_own_gains = False
        self.shows_integrals = True
        self.is_wide = False
        self.region_ppm: tuple[float, float] | None = None
        self.trial: Trace | None = None
        self.pivot_ppm: float | None = None
        self.overlays: tuple[Trace, ...] = ()
        self.ghosts: tuple[Ghost, ...] = ()
        self.cursor_x: float | None = None
        self.lit_fold: int | None = None
        self.lit_level: tuple[str, int] | None = None
        self._is_folded = False
        self._shares = DEFAULT_SHARES
        self._base: QPixmap | None = None
        self._ease_from: ShiftMap | None = None
        self._eased: ShiftMap | None = None
        self._ease_ms = 0
        self._timer = QTimer(self)
        self._timer.setInterval(_FRAME_MS)
        self._timer.timeout.connect(self._ease)
        self._gestures = LaneGestures(self)
        self.over = LanesOver(self, self._gestures)
        self._build()

    def _build(self) -> None:
        self.setMouseTracking(True)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setProperty("focusInside", True)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setMinimumSize(480, 420)
        self.setAccessibleName(say("Lanes: evidence, claims and residue"))
        self.setAttribute(Qt.WidgetAttribute.WA_OpaquePaintEvent)

    # -- what is shown -------------------------------------------------------

    def show_scene(self, scene: LaneScene | None) -> None:
        """Show another scene; the place on the axis is kept where one was zoomed."""
        is_other_axis = (
            self.scene is None
            or scene is None
            or (scene.measured is not self.scene.measured)
        )
        self.scene = scene
        self.region_ppm = None
        if scene is None:
            self.camera = None
        elif self.camera is None or is_other_axis:
            self.gain = 1.0
            self.camera = Camera.opened(
                scene,
                self.layout_now.left,
                self.layout_now.right,
                is_folded=self._is_folded and len(scene.folds) > 0,
            )
        else:
            self.camera = self.camera.with_scene(scene)
        self._stop_easing()
        self.refresh()
        self.view_changed.emit()

    def show_trial(self, trial: Trace | None, pivot_ppm: float | None) -> None:
        """Show the measured trace as it would be; None shows it as it is."""
        self.trial, self.pivot_ppm = trial, pivot_ppm
        self.refresh()

    def show_overlays(self, *overlays: Trace) -> None:
        """Lay other spectra over the evidence; none takes them away."""
        if overlays != self.overlays:
            self.overlays = overlays
            self.refresh()

    def show_ghosts(self, ghosts: tuple[Ghost, ...]) -> None:
        """Draw the sample's other spectra behind the evidence."""
        if ghosts != self.ghosts:
            self.ghosts = ghosts
            self.refresh()

    def show_marks(self, marks: Marks) -> None:
        """Show what is hovered, selected and chosen in any panel."""
        needs_base = marks.selected != self.marks.selected
        self.marks = marks
        if needs_base:
            self.refresh()
        else:
            self.update()

    def set_folded(self, is_folded: bool) -> None:
        """Fold empty stretches away, or show the continuous axis."""
        self._is_folded = is_folded
        if self.camera is not None and self.camera.is_folded != is_folded:
            self.go_to(self.camera.with_folding(is_folded))
        self.folding_changed.emit(is_folded)

    @property
    def is_folded(self) -> bool:
        """Whether Home means the folded axis."""
        return self._is_folded

    def set_integrals(self, is_shown: bool) -> None:
        """Show or hide the integral curves."""
        self.shows_integrals = is_shown
        self.refresh()

    def set_own_gains(self, is_on: bool) -> None:
        """Give every stretch its own gain, or all the same."""
        self.has_own_gains = is_on
        self.refresh()

    def set_gain(self, gain: float) -> None:
        """Make the evidence this many times taller."""
        self.gain = min(max(gain, 0.05), 5000.0)
        self.refresh()

    def multiply_gain(self, steps: float) -> None:
        """Taller by whole steps, smaller for negative ones."""
        self.set_gain(self.gain * _GAIN_STEP**steps)

    def set_shares(self, shares: tuple[float, float, float]) -> None:
        """Heights of the three lanes, as shares."""
        self._shares = shares
        self._lay_out()

    @property
    def shares(self) -> tuple[float, float, float]:
        """Heights of the three lanes, as shares."""
        return self._shares

    def refresh(self) -> None:
        """Paint everything anew at the next chance."""
        self._base = None
        self.update()

    # -- moving about ----------------------------------------------------------

    @property
    def map(self) -> ShiftMap | None:
        """The mapping that is on screen now."""
        if self._eased is not None:
            return self._eased
        return None if self.camera is None else self.camera.map

    def go_to(self, camera: Camera, *, is_eased: bool = True) -> None:
        """Move to another view."""
        start = self.map
        self.camera = camera
        can_ease = (
            is_eased
            and not self.look.reduced_motion
            and start is not None
            and start.stretches == camera.map.stretches
            and self.isVisible()
        )
        if can_ease:
            self._ease_from, self._ease_ms = start, 0
            self._eased = start
            self._timer.start()
        else:
            self._stop_easing()
        self.refresh()
        self.view_changed.emit()

    def _ease(self) -> None:
        self._ease_ms += _FRAME_MS
        if self._ease_from is None or self.camera is None or self._ease_ms >= EASE_MS:
            self._stop_easing()
        else:
            share = self._ease_ms / EASE_MS
            smooth = share * share * (3 - 2 * share)
            self._eased = self._ease_from.between(self.camera.map, smooth)
        self.refresh()

    def finish_easing(self) -> None:
        """Be where the view is going, at once."""
        self._stop_easing()
        self.refresh()

    def _stop_easing(self) -> None:
        self._timer.stop()
        self._ease_from = self._eased = None

    def go_home(self) -> None:
        """All of the axis at gain 1."""
        if self.camera is not None:
            self.gain = 1.0
            self.go_to(self.camera.home())

    def go_back(self) -> None:
        """The view before this one."""
        if self.camera is not None:
            self.go_to(self.camera.back())

    def zoom_to(self, low_ppm: float, high_ppm: float) -> None:
        """Look at one range; the evidence is made as tall as fits."""
        if self.camera is None or self.scene is None:
            return
        self.fit_gain(low_ppm, high_ppm)
        self.go_to(self.camera.on_range(low_ppm, high_ppm, self.scene.frequency_mhz))

    def fit_gain(self, low_ppm: float, high_ppm: float) -> None:
        """Gain at which the tallest line of a range fills the lane."""
        if self.scene is None:
            return
        highest = self.scene.measured.highest(high_ppm, low_ppm)
        if highest > 6 * self.scene.noise_sd:
            self.gain = self.scene.full_height / highest

    def open_fold(self, index: int) -> None:
        """Lay a fold open."""
        if self.camera is not None:
            self.go_to(self.camera.fold_opened(index))

    # -- geometry --------------------------------------------------------------

    def target(self, x: float, y: float) -> Target:
        """What lies under a place of the widget."""
        if self.scene is None or self.map is None:
            return NOTHING
        return target_at(
            x,
            y,
            scene=self.scene,
            shift_map=self.map,
            layout=self.layout_now,
            grove=self.grove,
            handles=self.handles,
        )

    def point_of(self, shift_ppm: float, lane: str = "evidence") -> QPointF | None:
        """Place of a shift in the middle of a lane, for tests and pop-ups."""
        x = None if self.map is None else self.map.x_of(shift_ppm)
        if x is None:
            return None
        layout = self.layout_now
        y = {
            "evidence": (layout.evidence_top + layout.seam) / 2,
            "claims": (layout.seam + layout.soil) / 2,
            "soil": layout.soil,
            "residue": (layout.claims_bottom + layout.axis_top) / 2,
        }[lane]
        return QPointF(x, y)

    def _lay_out(self) -> None:
        self.layout_now = lane_layout(
            self.width(),
            self.height(),
            shares=self._shares,
            is_wide=self.is_wide,
            scale=self.look.text_scale,
        )
        if self.camera is not None:
            self._stop_easing()
            self.camera = self.camera.resized(
                self.layout_now.left, self.layout_now.right
            )
        self.refresh()

    def sizeHint(self) -> QSize:
        """Preferred size."""
        return QSize(700, 600)

    # -- painting ----------------------------------------------------------------

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the kept picture, then what moves over it."""
        painter = QPainter(self)
        if self._base is None:
            self._base = self._painted_base()
        painter.drawPixmap(0, 0, self._base)
        if self.scene is not None and self.map is not None:
            self.over.paint(Ink(painter, self.look, self), self.scene, self.map)
        painter.end()

    def _painted_base(self) -> QPixmap:
        ratio = self.devicePixelRatioF()
        size = self.size() * ratio
        base = QPixmap(size)
        base.setDevicePixelRatio(ratio)
        painter = QPainter(base)
        ink = Ink(painter, self.look, self)
        layout = self.layout_now
        ink.fill(QRectF(self.rect()), "lane")
        if self.scene is not None and self.map is not None:
            self._paint_lanes(ink, self.scene, self.map, layout)
        paint_gutter(ink, layout, self.scene, self.grove, shows_zoom=self._is_close)
        ink.hline(0, layout.width, layout.claims_bottom, "rule")
        ink.hline(0, layout.gutter, layout.seam, "rule")
        if self.scene is not None and self.map is not None:
            if self.scene.residue is not None:
                paint_residue_ticks(ink, self.scene, self.map, layout)
            paint_axis(ink, self.map, layout, self.scene.frequency_mhz)
        painter.end()
        return base

    @property
    def _is_close(self) -> bool:
        return self.scene is not None and self.grove.px_per_hz >= 2.5

    def _paint_lanes(
        self, ink: Ink, scene: LaneScene, shift_map: ShiftMap, layout: LaneLayout
    ) -> None:
        if self.trial is not None:
            scene = replace(scene, measured=self.trial, model=None, residue=None)
        paint_grid(ink, shift_map, layout)
        self._paint_selected_band(ink, scene, shift_map)
        if scene.residue is not None:
            paint_residue(ink, scene, shift_map, layout)
        paint_ghosts(
            ink,
            self.ghosts,
            scene,
            shift_map,
            layout,
            gain=self.gain,
            own_gains=self.has_own_gains,
        )
        paint_evidence(
            ink,
            scene,
            shift_map,
            layout,
            gain=self.gain,
            own_gains=self.has_own_gains,
            show_integrals=self.shows_integrals
            and not shift_map.is_folded
            and shift_map.px_per_hz(scene.frequency_mhz) < LARGE_LEAVES_FROM,
        )
        for rank, overlay in enumerate(self.overlays):
            paint_overlay(
                ink,
                overlay,
                rank,
                scene,
                shift_map,
                layout,
                gain=self.gain,
                own_gains=self.has_own_gains,
            )
        paint_folds(ink, shift_map, layout)
        paint_brackets(ink, scene, shift_map, layout)
        first = [m for m in (self.marks.selected,) if m is not None]
        first += [t.claim for t in scene.trees if t.state in ("disputed", "open")]
        self.grove = plant(scene, shift_map, layout, self._label_width, first=first)
        claims = ClaimsPainter(
            ink,
            scene,
            shift_map,
            layout,
            self.grove,
            selected=self.marks.selected,
            lit_level=self.lit_level,
        )
        claims.paint()
        self.handles = claims.handles
        self.over.paint_excluded(ink, scene, shift_map)
        if self.trial is None:
            self._paint_waiting(ink, scene, layout)
        pivot_x = None if self.pivot_ppm is None else shift_map.x_of(self.pivot_ppm)
        if pivot_x is not None:
            ink.vline(round(pivot_x), layout.evidence_top, layout.seam, "accent")

    def _paint_waiting(self, ink: Ink, scene: LaneScene, layout: LaneLayout) -> None:
        """Say what will stand in the lanes that are still empty."""
        middle = (layout.left + layout.right) / 2
        if not scene.trees:
            words = say("Claims will stand here and reach up to the lines they own.")
            y = layout.soil + self.look.px(26)
            ink.text(middle, y, words, SECOND, align="centre")
        if scene.residue is None:
            words = say("What the model leaves over is shown here, in noise sd.")
            y = (layout.claims_bottom + layout.axis_top) / 2 + 5
            ink.text(middle, y, words, SECOND, align="centre")

    def _label_width(self, tree: TreeShape) -> float:
        count = self.look.width(f"{tree.n_protons} H", 12)
        return max(label_width(self.look, tree.claim), count)

    def _paint_selected_band(
        self, ink: Ink, scene: LaneScene, shift_map: ShiftMap
    ) -> None:
        if self.marks.selected is not None:
            self.over.tint_claim(ink, scene, shift_map, self.marks.selected)

    # -- events --------------------------------------------------------------------

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Lay the lanes out again."""
        self._lay_out()
        super().resizeEvent(event)

    def changeEvent(self, event: QEvent) -> None:
        """Paint anew in other colours, fonts or languages."""
        if event.type() in (
            QEvent.Type.PaletteChange,
            QEvent.Type.FontChange,
            QEvent.Type.LanguageChange,
            QEvent.Type.DevicePixelRatioChange,
        ):
            self._lay_out()
        super().changeEvent(event)

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Zoom about the cursor; Shift pans, Ctrl changes the gain."""
        self._gestures.wheel(event)

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Start a click or a drag."""
        self._gestures.press(event)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Point at something, or go on dragging."""
        self._gestures.move(event)

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """End a click or a drag."""
        self._gestures.release(event)

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        """Look at the signal under the cursor; on a lane border, default heights."""
        self._gestures.double_click(event)

    def leaveEvent(self, event: QEvent) -> None:
        """Point at nothing."""
        self._gestures.leave()
        super().leaveEvent(event)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Arrows go from item to item; see the keyboard help for the rest."""
        if not self._gestures.key(event):
            super().keyPressEvent(event)
