"""Residue: measured minus modelled in noise sd, linear to 3, logarithmic beyond."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from PySide6.QtCore import QRectF, Qt
from PySide6.QtGui import QPen

from spinledger_app.lanes.evidence_layer import curve
from spinledger_app.lanes.layout import LaneLayout
from spinledger_app.lanes.polygons import polygon
from spinledger_app.lanes.scene import LaneScene
from spinledger_app.lanes.shift_map import ShiftMap
from spinledger_app.painting.ink import CAPTION, Ink
from spinledger_app.presenters.wording import say, signed

LINEAR_SD = 3.0
_DECADES = (3.0, 30.0, 300.0, 3000.0)
_LEAST_TICK_PX = 15.0
_CROWDED_ALPHA = 0.6


@dataclass(frozen=True, slots=True, kw_only=True)
class ResidueScale:
    """Sd to screen: ``limit`` bent units above and below the middle."""

    middle: float
    px_per_unit: float
    limit: float

    def y(self, values: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
        """Screen place of residues in sd, kept within the lane."""
        held = np.clip(bent(values), -self.limit, self.limit)
        return np.asarray(self.middle - held * self.px_per_unit)


def bent(values: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """Residue in sd, linear to 3, then 3 more for every factor of ten."""
    size = np.maximum(np.abs(values), LINEAR_SD)
    beyond = np.sign(values) * LINEAR_SD * (1 + np.log10(size / LINEAR_SD))
    return np.where(np.abs(values) <= LINEAR_SD, values, beyond)


def residue_scale(
    scene: LaneScene, shift_map: ShiftMap, layout: LaneLayout
) -> ResidueScale:
    """Scale that holds what is on screen: ±4.5 sd, or ±30, ±300, ±3000."""
    largest = 0.0
    if scene.residue is not None:
        for index in shift_map.visible():
            window = shift_map.window_ppm(index)
            if window is None:
                continue
            start, stop = scene.residue.indices(*window)
            if stop - start < 1:
                continue
            low, high = scene.residue.pyramid.extremes(int(start), int(stop))
            largest = max(largest, abs(low), abs(high))
    limit = 4.5
    for decade in _DECADES[1:]:
        if largest > (5.5 if limit == 4.5 else decade / 10 * 1.2):
            limit = float(bent(np.array([decade]))[0]) + 1.5
    room = layout.axis_top - layout.claims_bottom - 20
    return ResidueScale(
        middle=round((layout.claims_bottom + layout.axis_top) / 2),
        px_per_unit=room / 2 / limit,
        limit=limit,
    )


def paint_residue(
    ink: Ink, scene: LaneScene, shift_map: ShiftMap, layout: LaneLayout
) -> None:
    """Paint the residue lane with its ticks; nothing but the band before a model."""
    scale = residue_scale(scene, shift_map, layout)
    band = LINEAR_SD * scale.px_per_unit
    ratio = ink.columns_per_px
    for index in shift_map.visible():
        start, end = shift_map.span(index)
        left, right = max(start, layout.left), min(end, layout.right)
        ink.fill(QRectF(left, scale.middle - band, right - left, 2 * band), "band")
        _paint_lines_beyond(ink, scale, left, right)
        ink.hline(left, right, scale.middle, "rule")
        if scene.residue is None:
            continue
        drawn = curve(scene.residue, shift_map, index, scale.y, ratio)
        if drawn is None:
            continue
        ink.painter.save()
        top, bottom = layout.claims_bottom + 1, layout.axis_top
        ink.painter.setClipRect(
            QRectF(left, top, right - left, bottom - top),
            Qt.ClipOperation.IntersectClip,
        )
        pen = ink.colour("trace")
        if drawn.xs.size > drawn.upper_xs.size:  # many points in every column
            pen.setAlphaF(_CROWDED_ALPHA)
        ink.painter.setPen(QPen(pen, 1.0))
        ink.painter.drawPolyline(polygon(drawn.xs, drawn.ys))
        ink.painter.restore()


def _paint_lines_beyond(
    ink: Ink, scale: ResidueScale, left: float, right: float
) -> None:
    for decade in _DECADES[1:]:
        for value in (decade, -decade):
            unit = float(bent(np.array([value]))[0])
            if abs(unit) < scale.limit:
                y = round(scale.middle - unit * scale.px_per_unit)
                ink.hline(left, right, y, "grid")


def paint_residue_ticks(
    ink: Ink, scene: LaneScene, shift_map: ShiftMap, layout: LaneLayout
) -> None:
    """Ticks and numbers in the gutter; painted after it."""
    scale = residue_scale(scene, shift_map, layout)
    # The lane's name and unit stand in the same gutter.
    look = ink.look
    px = look.px
    name_right = 16 + look.width(say("Residue"), 14, 600) + 4
    unit_right = 16 + look.width(say("noise sd"), 12) + 4
    name_bottom = layout.claims_bottom + px(21)
    unit_top = layout.axis_top - px(19)
    shown: list[float] = []
    for value in (0.0, 3.0, -3.0, 30.0, -30.0, 300.0, -300.0, 3000.0, -3000.0):
        unit = float(bent(np.array([value]))[0])
        if abs(unit) > scale.limit:
            continue
        y = scale.middle - unit * scale.px_per_unit
        ink.hline(layout.gutter - 4, layout.gutter, round(y), "edge")
        text = signed(value, 0)
        right = layout.gutter - px(6)
        left = right - look.width(text, 12)
        half = px(5)
        hits_name = y - half < name_bottom and left < name_right
        hits_unit = y + half > unit_top and left < unit_right
        closest = min((abs(y - other) for other in shown), default=float("inf"))
        if hits_name or hits_unit or closest < px(_LEAST_TICK_PX) - 1:
            continue
        shown.append(y)
        ink.text(right, y + px(4.5), text, CAPTION, align="right")
