"""Shift axis: ticks, numbers, grid, and the strips of what is folded away."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator

from PySide6.QtCore import QRectF

from spinledger_app.lanes.layout import LaneLayout
from spinledger_app.lanes.shift_map import FOLD_WIDTH_PX, ShiftMap
from spinledger_app.painting.ink import SECOND, SECOND_INK, Ink
from spinledger_app.presenters.wording import number, say

_STEPS_PPM = tuple(m * 10.0**e for e in range(-5, 2) for m in (1, 2, 5))
_LABEL_ROOM_PX = 22.0


def tick_step_ppm(px_per_ppm: float, width_of: Callable[[str], float]) -> float:
    """Distance of numbered ticks: 1, 2 or 5 times a power of ten, ppm."""
    for step in _STEPS_PPM:
        widest = width_of("10." + "0" * places(step))
        if step * px_per_ppm >= widest + _LABEL_ROOM_PX:
            return step
    return _STEPS_PPM[-1]


def places(step_ppm: float) -> int:
    """Decimal places that tell neighbouring ticks apart, one at least."""
    return max(1, math.ceil(-math.log10(step_ppm) - 1e-9))


def ticks(low_ppm: float, high_ppm: float, step_ppm: float) -> Iterator[float]:
    """Multiples of a step between two shifts."""
    first = math.ceil(low_ppm / step_ppm - 1e-9)
    last = math.floor(high_ppm / step_ppm + 1e-9)
    for count in range(first, last + 1):
        yield count * step_ppm


def minor_step_ppm(step_ppm: float, px_per_hz: float) -> float:
    """Distance of unnumbered ticks: every fifth when zoomed in, else every half."""
    return step_ppm / (5 if px_per_hz > 5 else 2)


def paint_grid(ink: Ink, shift_map: ShiftMap, layout: LaneLayout) -> None:
    """Faint verticals at the numbered ticks, through all lanes."""
    step = _step(ink, shift_map)
    for index in shift_map.visible():
        window = shift_map.window_ppm(index)
        if window is None:
            continue
        for shift in ticks(window[1], window[0], step):
            x = shift_map.x_of(shift, index)
            if x is not None:
                ink.vline(round(x), layout.evidence_top, layout.axis_top, "grid")


def paint_axis(
    ink: Ink, shift_map: ShiftMap, layout: LaneLayout, frequency_mhz: float
) -> None:
    """Axis row with its numbers; painted after everything but the folds."""
    top = layout.axis_top
    ink.fill(QRectF(0, top, layout.width, layout.bottom - top), "panel")
    ink.hline(0, layout.width, top, "rule")
    baseline = top + ink.look.px(19)
    ink.text(16, baseline, say("δ, ppm"), SECOND)
    step = _step(ink, shift_map)
    minor = minor_step_ppm(step, shift_map.px_per_hz(frequency_mhz))
    taken = layout.left - 2.0
    for index in shift_map.visible():
        window = shift_map.window_ppm(index)
        if window is None:
            continue
        for shift in ticks(window[1], window[0], minor):
            x = shift_map.x_of(shift, index)
            if x is not None:
                ink.vline(round(x), top + 1, top + 4, "rule")
        taken = _paint_numbers(ink, shift_map, layout, index, (step, taken))


def _paint_numbers(
    ink: Ink,
    shift_map: ShiftMap,
    layout: LaneLayout,
    index: int,
    step_and_taken: tuple[float, float],
) -> float:
    step, taken = step_and_taken
    high, low = shift_map.window_ppm(index) or (0.0, 0.0)
    start, end = shift_map.span(index)
    left, right = max(start, layout.left), min(end, layout.right)
    shifts = list(ticks(low, high, step))
    inside = [s for s in shifts if left + 8 < _x(shift_map, s, index) < right - 8]
    decimals = places(step)
    if not inside and shift_map.is_folded:
        inside, decimals = [round((high + low) / 2, 2)], 2
    for shift in sorted(inside or shifts, reverse=True):
        x = _x(shift_map, shift, index)
        text = number(shift, decimals)
        half = ink.look.width(text, 13) / 2
        ink.vline(round(x), layout.axis_top + 1, layout.axis_top + 6, "edge")
        held = min(max(x, layout.left + half), layout.width - half - 3)
        # A number may reach over half a fold, never into the next stretch.
        over = FOLD_WIDTH_PX / 2 if shift_map.is_folded else half
        is_out = held - half < left - over or held + half > right + over
        if is_out or held - half < taken + 4:
            continue
        taken = held + half
        baseline = layout.axis_top + ink.look.px(20)
        ink.text(held, baseline, text, SECOND_INK, align="centre")
    return taken


def _x(shift_map: ShiftMap, shift_ppm: float, index: int) -> float:
    x = shift_map.x_of(shift_ppm, index)
    return x if x is not None else 0.0


def _step(ink: Ink, shift_map: ShiftMap) -> float:
    return tick_step_ppm(shift_map.px_per_ppm, lambda text: ink.look.width(text, 13))


def fold_rects(shift_map: ShiftMap, layout: LaneLayout) -> list[tuple[int, QRectF]]:
    """Folds that are on screen: index of the stretch before, and the strip."""
    strips = []
    for index in range(len(shift_map.stretches) - 1):
        end = shift_map.span(index)[1]
        left = max(end, layout.left)
        right = min(end + FOLD_WIDTH_PX, layout.right)
        if right > left:
            height = layout.bottom - layout.evidence_top
            strips.append(
                (index, QRectF(left, layout.evidence_top, right - left, height))
            )
    return strips


def paint_folds(
    ink: Ink, shift_map: ShiftMap, layout: LaneLayout, lit: int | None = None
) -> None:
    """Strips over everything that is folded away; the lit one has accent lines."""
    for index, strip in fold_rects(shift_map, layout):
        colour = "accent" if index == lit else "hairline"
        ink.fill(strip, "fold")
        middle = round(strip.center().x())
        for x in (round(strip.left()), middle, round(strip.right()) - 1):
            ink.vline(x, layout.evidence_top, layout.axis_top, colour)
