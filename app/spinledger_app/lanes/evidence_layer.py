"""Evidence: modelled area under the measured line, brackets, integral curves."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from PySide6.QtCore import QRectF, Qt
from PySide6.QtGui import QColor, QImage, QPen, QPixmap

from spinledger_app.lanes.layout import LaneLayout
from spinledger_app.lanes.polygons import polygon
from spinledger_app.lanes.scene import LaneScene, SignalMark, Trace
from spinledger_app.lanes.shift_map import ShiftMap
from spinledger_app.painting.ink import CAPTION, SECOND_INK, Ink
from spinledger_app.painting.marks import paint_mark

# With fewer points than this in a column the points themselves are joined.
_POINTS_PER_COLUMN = 2.0
_TEXT_GAP_PX = 3.0
_EDGE_PX = 1.3
_UNDER_BRACKET_PX = 6
# Curves lower than this share of the tallest would be a flat dash.
_LEAST_INTEGRAL = 0.02


ToY = Callable[[npt.NDArray[np.float64]], npt.NDArray[np.float64]]


@dataclass(frozen=True, slots=True, kw_only=True)
class Curve:
    """A stretch of a trace on the screen: what to stroke, and its upper side."""

    xs: npt.NDArray[np.float64]
    ys: npt.NDArray[np.float64]
    upper_xs: npt.NDArray[np.float64]
    upper_ys: npt.NDArray[np.float64]


def curve(
    trace: Trace,
    shift_map: ShiftMap,
    stretch: int,
    to_y: ToY,
    device_ratio: float,
) -> Curve | None:
    """Trace in one stretch; extremes per device column where points crowd.

    Parameters
    ----------
    to_y : callable
        Value to screen, monotone.
    """
    window = shift_map.window_ppm(stretch)
    if window is None:
        return None
    start, stop = trace.indices(*window)
    if stop - start < 1:
        return None
    high = trace.first_point_ppm - start * trace.step_ppm
    low = trace.first_point_ppm - stop * trace.step_ppm
    x0 = shift_map.x_of(high, stretch) or 0.0
    x1 = shift_map.x_of(low, stretch) or 0.0
    n_columns = max(1, round((x1 - x0) * device_ratio))
    if (stop - start) / n_columns < _POINTS_PER_COLUMN:
        return _joined_points(trace, shift_map, stretch, (start, stop), to_y)
    columns = trace.pyramid.columns(start, stop, n_columns)
    centres = x0 + (np.arange(n_columns) + 0.5) * (x1 - x0) / n_columns
    low_ys, high_ys = to_y(columns.lows), to_y(columns.highs)
    ys = np.empty(2 * n_columns)
    # Up and down by turns, so that neighbouring columns share an end.
    ys[0::4], ys[1::4] = low_ys[0::2], high_ys[0::2]
    ys[2::4], ys[3::4] = high_ys[1::2], low_ys[1::2]
    return Curve(xs=np.repeat(centres, 2), ys=ys, upper_xs=centres, upper_ys=high_ys)


def _joined_points(
    trace: Trace,
    shift_map: ShiftMap,
    stretch: int,
    bounds: tuple[float, float],
    to_y: ToY,
) -> Curve:
    first = max(0, int(bounds[0]) - 1)
    last = min(trace.pyramid.n_points, int(np.ceil(bounds[1])) + 2)
    shifts = trace.first_point_ppm - trace.step_ppm * np.arange(
        first, last, dtype=np.float64
    )
    xs = shift_map.xs_of(shifts, stretch)
    ys = to_y(trace.pyramid.values[first:last])
    return Curve(xs=xs, ys=ys, upper_xs=xs, upper_ys=ys)


def stretch_gains(
    scene: LaneScene, shift_map: ShiftMap, *, own_gains: bool
) -> list[float]:
    """Gain of every stretch: 1, or the power of two that fills the lane."""
    if not own_gains or not shift_map.is_folded:
        return [1.0] * len(shift_map.stretches)
    gains = []
    for stretch in shift_map.stretches:
        highest = scene.measured.highest(stretch.high_ppm, stretch.low_ppm)
        gain = 1.0
        while gain < 1024 and highest * gain * 2 <= scene.full_height:
            gain *= 2
        gains.append(gain)
    return gains


def paint_evidence(  # noqa: PLR0913 - scene, place and three choices
    ink: Ink,
    scene: LaneScene,
    shift_map: ShiftMap,
    layout: LaneLayout,
    *,
    gain: float,
    own_gains: bool,
    show_integrals: bool,
) -> None:
    """Paint the evidence lane without its gutter."""
    gains = stretch_gains(scene, shift_map, own_gains=own_gains)
    height = layout.baseline - layout.curve_top
    ratio = ink.columns_per_px
    for index in shift_map.visible():
        unit = gains[index] * gain * height / scene.full_height

        def to_y(
            values: npt.NDArray[np.float64], unit: float = unit
        ) -> npt.NDArray[np.float64]:
            above = layout.evidence_top - 50
            below = layout.baseline + 400
            return np.clip(layout.baseline - values * unit, above, below)

        start, end = shift_map.span(index)
        left, right = max(start, layout.left), min(end, layout.right)
        ink.hline(left, right, layout.baseline)
        ink.painter.save()
        # Numbers and triangles over the brackets stay free of tall lines.
        top = layout.bracket + ink.look.px(_UNDER_BRACKET_PX)
        _clip(ink, shift_map, index, top, layout.seam, layout)
        if scene.model is not None:
            modelled = curve(scene.model, shift_map, index, to_y, ratio)
            if modelled is not None:
                _paint_model(ink, modelled, layout)
        drawn = curve(scene.measured, shift_map, index, to_y, ratio)
        if drawn is not None:
            ink.painter.setPen(QPen(ink.colour("trace"), 1.0))
            ink.painter.drawPolyline(polygon(drawn.xs, drawn.ys))
        if show_integrals:
            _paint_integrals(ink, scene, shift_map, index, layout)
        ink.painter.restore()
        if own_gains and shift_map.is_folded:
            text = f"×{gains[index]:g}"
            ink.text(left + 4, layout.bracket + ink.look.px(20), text, CAPTION)


def _clip(
    ink: Ink,
    shift_map: ShiftMap,
    index: int,
    top: float,
    bottom: float,
    layout: LaneLayout,
) -> None:
    start, end = shift_map.span(index)
    left, right = max(start, layout.left), min(end, layout.right)
    ink.painter.setClipRect(
        QRectF(left, top, right - left, bottom - top), Qt.ClipOperation.IntersectClip
    )


def _paint_model(ink: Ink, drawn: Curve, layout: LaneLayout) -> None:
    colour = ink.colour("model_fill")
    colour.setAlpha(ink.look.tokens.model_fill_alpha)
    painter = ink.painter
    is_crowded = drawn.xs.size > drawn.upper_xs.size
    if is_crowded and isinstance(painter.device(), QPixmap):
        _fill_columns(ink, drawn, layout, colour)
    else:
        xs = np.concatenate(([drawn.upper_xs[0]], drawn.upper_xs, [drawn.upper_xs[-1]]))
        ys = np.concatenate(([layout.baseline], drawn.upper_ys, [layout.baseline]))
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(colour)
        painter.drawPolygon(polygon(xs, ys))
        painter.setBrush(Qt.BrushStyle.NoBrush)
    # Two strokes of 1 px, 0.3 px apart: Qt draws wider pens ten times slower.
    painter.setPen(QPen(ink.colour("model_edge"), 1.0))
    for drop in (0.0, _EDGE_PX - 1.0):
        painter.drawPolyline(polygon(drawn.upper_xs, drawn.upper_ys + drop))


def _fill_columns(ink: Ink, drawn: Curve, layout: LaneLayout, colour: QColor) -> None:
    """Fill under a curve of one value a device column, as a picture.

    A polygon with a thousand spikes takes Qt tens of milliseconds.
    """
    ratio = ink.columns_per_px
    top = layout.evidence_top
    n_rows = max(1, round((layout.baseline - top) * ratio))
    edges = (drawn.upper_ys - top) * ratio
    n_columns = edges.size
    alpha = colour.alpha()
    red, green, blue = (
        round(value * alpha / 255)
        for value in (colour.red(), colour.green(), colour.blue())
    )
    pixel = np.uint32(alpha << 24 | red << 16 | green << 8 | blue)
    is_under = np.arange(n_rows)[:, None] >= edges[None, :]
    pixels = np.where(is_under, pixel, np.uint32(0))
    image = QImage(
        pixels.data,
        n_columns,
        n_rows,
        4 * n_columns,
        QImage.Format.Format_ARGB32_Premultiplied,
    )
    # Columns stand about their centres.
    step = 1.0 / ratio
    left = float(drawn.upper_xs[0]) - step / 2
    width = float(drawn.upper_xs[-1] - drawn.upper_xs[0]) + step
    target = QRectF(left, top, width, n_rows / ratio)
    ink.painter.drawImage(target, image)


def _paint_integrals(
    ink: Ink, scene: LaneScene, shift_map: ShiftMap, index: int, layout: LaneLayout
) -> None:
    largest = max((one.amount for one in scene.integrals), default=0.0)
    if largest <= 0:
        return
    room = (layout.baseline - layout.curve_top) * 0.55
    for one in scene.integrals:
        if shift_map.stretch_of((one.low_ppm + one.high_ppm) / 2) != index:
            continue
        x0 = shift_map.x_of(one.high_ppm, index)
        x1 = shift_map.x_of(one.low_ppm, index)
        if x0 is None or x1 is None or x1 < layout.left or x0 > layout.right:
            continue
        if one.amount < _LEAST_INTEGRAL * largest:
            continue
        rise = room * one.amount / largest
        xs = np.linspace(x0, x1, one.shares.size)
        ys = layout.baseline - 14 - rise * one.shares
        ink.painter.setPen(QPen(ink.colour("bark"), 1.0))
        ink.painter.drawPolyline(polygon(xs, ys))


def paint_brackets(
    ink: Ink, scene: LaneScene, shift_map: ShiftMap, layout: LaneLayout
) -> list[tuple[SignalMark, QRectF]]:
    """Paint signal brackets with proton counts; gives where each can be hit.

    Where brackets crowd, claimed and unexplained signals keep their text, the
    others only the bracket; the whole text stands in the tool tip.
    """
    placed: list[tuple[SignalMark, QRectF]] = []
    taken: list[tuple[float, float]] = []
    for mark in sorted(scene.signals, key=_importance):
        index = shift_map.stretch_of(mark.centre_ppm)
        if index is None:
            continue
        x0 = shift_map.x_of(mark.high_ppm, index)
        x1 = shift_map.x_of(mark.low_ppm, index)
        if x0 is None or x1 is None or x1 < layout.left or x0 > layout.right:
            continue
        start, end = shift_map.span(index)
        left = max(x0, start, layout.left)
        right = min(x1, end, layout.right)
        placed.append((mark, QRectF(left, layout.evidence_top, right - left, 10)))
        _paint_bracket(ink, left, max(right, left + 2), layout.bracket)
        _paint_bracket_text(ink, mark, (left + right) / 2, layout, taken)
    return placed


def _importance(mark: SignalMark) -> tuple[int, float]:
    order = 0 if mark.claims else 1 if mark.stray == "unexplained" else 2
    return order, mark.low_ppm - mark.high_ppm


def _paint_bracket(ink: Ink, left: float, right: float, y: float) -> None:
    ink.hline(left, right, y, "edge")
    ink.vline(left, y, y + 4, "edge")
    ink.vline(right - 1, y, y + 4, "edge")


def _paint_bracket_text(
    ink: Ink,
    mark: SignalMark,
    middle: float,
    layout: LaneLayout,
    taken: list[tuple[float, float]],
) -> None:
    is_stray = mark.stray is not None
    if not is_stray and not mark.text:
        return
    width = 12.0 if is_stray else ink.look.width(mark.text, 13)
    middle = min(max(middle, layout.left + width / 2), layout.right - width / 2)
    left, right = middle - width / 2, middle + width / 2
    if any(left < b + _TEXT_GAP_PX and right > a - _TEXT_GAP_PX for a, b in taken):
        return
    taken.append((left, right))
    if is_stray:
        y = layout.bracket - ink.look.px(12)
        paint_mark(ink, middle, y, "stray", size=11, known=mark.stray == "known")
    else:
        baseline = layout.bracket - ink.look.px(6)
        ink.text(middle, baseline, mark.text, SECOND_INK, align="centre")
