"""Other spectra on the evidence: a model laid over it, the sample's others behind."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from PySide6.QtCore import QRectF, Qt
from PySide6.QtGui import QPen

from spinledger_app.lanes.evidence_layer import curve, stretch_gains
from spinledger_app.lanes.layout import LaneLayout
from spinledger_app.lanes.polygons import polygon
from spinledger_app.lanes.scene import LaneScene, Trace
from spinledger_app.lanes.shift_map import ShiftMap
from spinledger_app.painting.ink import Ink

# By rank: colour, width in px, and dashes, so that no colour need be told apart.
_MANNERS: tuple[tuple[str, float, tuple[float, ...]], ...] = (
    ("accent", 1.0, ()),
    ("ink", 1.6, (7.0, 4.0)),
    ("rule", 1.0, ()),  # the sample's others, behind the evidence
)
_GHOST = len(_MANNERS) - 1
N_OVERLAYS = _GHOST


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Ghost:
    """Another spectrum of the sample; ``full_height`` fills the lane at gain 1."""

    trace: Trace
    full_height: float


def paint_ghosts(  # noqa: PLR0913 - traces, place and two choices
    ink: Ink,
    ghosts: Sequence[Ghost],
    scene: LaneScene,
    shift_map: ShiftMap,
    layout: LaneLayout,
    *,
    gain: float,
    own_gains: bool,
) -> None:
    """Paint other spectra faintly, each as tall as the shown one."""
    for ghost in ghosts:
        paint_overlay(
            ink,
            ghost.trace,
            _GHOST,
            scene,
            shift_map,
            layout,
            gain=gain * scene.full_height / ghost.full_height,
            own_gains=own_gains,
        )


def paint_overlay(  # noqa: PLR0913 - trace, place and choices
    ink: Ink,
    trace: Trace,
    rank: int,
    scene: LaneScene,
    shift_map: ShiftMap,
    layout: LaneLayout,
    *,
    gain: float,
    own_gains: bool,
) -> None:
    """Paint a trace at the scale of the evidence: the first solid, the second dashed."""
    colour, width, dashes = _MANNERS[rank]
    pen = QPen(ink.colour(colour), width)
    if dashes:
        pen.setDashPattern(dashes)
    gains = stretch_gains(scene, shift_map, own_gains=own_gains)
    height = layout.baseline - layout.curve_top
    painter = ink.painter
    for index in shift_map.visible():
        unit = gains[index] * gain * height / scene.full_height

        def to_y(
            values: npt.NDArray[np.float64], unit: float = unit
        ) -> npt.NDArray[np.float64]:
            ys = layout.baseline - values * unit
            return np.clip(ys, layout.evidence_top - 50, layout.baseline + 400)

        start, end = shift_map.span(index)
        left, right = max(start, layout.left), min(end, layout.right)
        painter.save()
        top, room = layout.bracket + 6, layout.seam - layout.bracket - 6
        painter.setClipRect(
            QRectF(left, top, right - left, room), Qt.ClipOperation.IntersectClip
        )
        drawn = curve(trace, shift_map, index, to_y, ink.columns_per_px)
        if drawn is not None:
            painter.setPen(pen)
            painter.drawPolyline(polygon(drawn.upper_xs, drawn.upper_ys))
        painter.restore()
