"""What is painted over the lanes' kept picture: marks, region, cursor, flags."""

from __future__ import annotations

from typing import TYPE_CHECKING

from PySide6.QtCore import QRectF
from PySide6.QtGui import QPen

from spinledger_app.lanes.axis_layer import fold_rects
from spinledger_app.lanes.scene import LaneScene
from spinledger_app.lanes.shift_map import ShiftMap
from spinledger_app.painting.ink import Face, Ink
from spinledger_app.presenters.line_list import ruler_text
from spinledger_app.presenters.wording import say
from spinledger_app.views.lane_gestures import LaneGestures

if TYPE_CHECKING:
    from spinledger_app.views.lanes_view import LanesView


class LanesOver:
    """Paints what changes with the mouse, so that the lanes need not be painted."""

    def __init__(self, view: LanesView, gestures: LaneGestures) -> None:
        self._view = view
        self._gestures = gestures

    def tint_claim(
        self, ink: Ink, scene: LaneScene, shift_map: ShiftMap, claim: str
    ) -> None:
        """Tint the place of a claim in all lanes."""
        tree = scene.tree_of(claim)
        if tree is None:
            return
        tips = [leaf.tip_ppm for leaf in tree.leaves] or [tree.root_ppm]
        margin = max((tree.width_hz or 0.0) * 1.2, 8.0) / scene.frequency_mhz
        self._tint(ink, shift_map, min(tips) - margin, max(tips) + margin)

    def _tint(
        self, ink: Ink, shift_map: ShiftMap, low_ppm: float, high_ppm: float
    ) -> None:
        rect = self._range_rect(shift_map, low_ppm, high_ppm)
        if rect is not None:
            ink.fill(rect, self._view.look.tint)

    def _range_rect(
        self, shift_map: ShiftMap, low_ppm: float, high_ppm: float
    ) -> QRectF | None:
        index = shift_map.stretch_of((low_ppm + high_ppm) / 2)
        if index is None:
            return None
        start, end = shift_map.span(index)
        layout = self._view.layout_now
        x0 = max(shift_map.x_of(high_ppm, index) or 0.0, start, layout.left)
        x1 = min(shift_map.x_of(low_ppm, index) or 0.0, end, layout.right)
        if x1 <= x0:
            return None
        x1 = max(x1, x0 + 3)
        return QRectF(x0, layout.evidence_top, x1 - x0, layout.axis_top)

    def paint_excluded(self, ink: Ink, scene: LaneScene, shift_map: ShiftMap) -> None:
        """Veil the stretches that were left out by hand."""
        for low, high in scene.excluded_ppm:
            rect = self._range_rect(shift_map, low, high)
            if rect is None:
                continue
            veil = ink.colour("fold")
            veil.setAlpha(190)
            rect.setBottom(self._view.layout_now.seam)
            ink.fill(rect, veil)
            text = say("left out")
            if ink.look.width(text, 12) < rect.width() - 6:
                y = self._view.layout_now.curve_top + ink.look.px(24)
                face = Face(size=12, colour="muted")
                ink.text(rect.center().x(), y, text, face, align="centre")

    def paint(self, ink: Ink, scene: LaneScene, shift_map: ShiftMap) -> None:
        """Paint all that moves: hover, choice, region, fold, cursor, drag."""
        marks = self._view.marks
        layout = self._view.layout_now
        self._paint_hovered(ink, scene, shift_map)
        if marks.chosen_signal is not None:
            self._paint_chosen(ink, scene, shift_map, marks.chosen_signal)
        if self._view.region_ppm is not None:
            self._paint_region(ink, scene, shift_map, self._view.region_ppm)
        for index, strip in fold_rects(shift_map, layout):
            if index == self._view.lit_fold:
                for x in (strip.left(), strip.center().x(), strip.right() - 1):
                    ink.vline(round(x), layout.evidence_top, layout.axis_top, "accent")
        if self._view.cursor_x is not None and self._gestures.is_idle:
            x = round(self._view.cursor_x)
            ink.vline(x, layout.evidence_top, layout.axis_top, "accent")
        self._gestures.paint(ink)

    def _paint_hovered(self, ink: Ink, scene: LaneScene, shift_map: ShiftMap) -> None:
        marks = self._view.marks
        if marks.hovered is not None:
            if marks.hovered != marks.selected:
                self.tint_claim(ink, scene, shift_map, marks.hovered)
        elif marks.hovered_signal is not None:
            mark = scene.signal(marks.hovered_signal)
            if mark is not None:
                self._tint(ink, shift_map, mark.low_ppm, mark.high_ppm)

    def _paint_chosen(
        self, ink: Ink, scene: LaneScene, shift_map: ShiftMap, key: str
    ) -> None:
        mark = scene.signal(key)
        rect = mark and self._range_rect(shift_map, mark.low_ppm, mark.high_ppm)
        if not rect:
            return
        rect.setBottom(self._view.layout_now.seam)
        ink.painter.setPen(QPen(ink.colour("accent"), 2))
        ink.painter.drawRect(rect.adjusted(1, 1, -1, -1))
        text = say("Now click the proton that owns it. Esc lets go.")
        self.paint_flag(
            ink, rect.center().x(), self._view.layout_now.bracket + 14, text
        )

    def _paint_region(
        self,
        ink: Ink,
        scene: LaneScene,
        shift_map: ShiftMap,
        region_ppm: tuple[float, float],
    ) -> None:
        low, high = region_ppm
        rect = self._range_rect(shift_map, low, high)
        if rect is None:
            return
        ink.fill(rect, self._view.look.tint)
        for x in (rect.left(), rect.right() - 1):
            ink.vline(round(x), rect.top(), rect.bottom(), "accent")
        text = ruler_text(low, high, scene.frequency_mhz)
        self.paint_flag(ink, rect.center().x(), self._view.layout_now.seam - 40, text)

    def paint_flag(self, ink: Ink, x: float, y: float, text: str) -> None:
        """Small label in accent about a place, kept inside the widget."""
        width = ink.look.width(text, 13, 600) + 16
        height = ink.look.px(22)
        left = min(
            max(x - width / 2, self._view.layout_now.left),
            self._view.width() - width - 4,
        )
        ink.fill(QRectF(left, y, width, height), "accent", 4)
        face = Face(size=13, weight=600, colour="on_accent")
        ink.text(left + 8, y + height * 0.72, text, face)
