"""Names, legends and units in the gutter beside the lanes."""

from __future__ import annotations

from PySide6.QtCore import QPointF, QRectF
from PySide6.QtGui import QPainterPath

from spinledger_app.lanes.grove import Grove
from spinledger_app.lanes.layout import LaneLayout
from spinledger_app.lanes.leaves import leaf_path
from spinledger_app.lanes.scene import LaneScene
from spinledger_app.painting.ink import CAPTION, STRONG, Ink
from spinledger_app.presenters.wording import say

_LEFT = 16.0


def paint_gutter(
    ink: Ink,
    layout: LaneLayout,
    scene: LaneScene | None,
    grove: Grove,
    *,
    shows_zoom: bool,
) -> None:
    """Paint the gutter: lane names always, legends once there is a spectrum."""
    px = ink.look.px
    ink.fill(QRectF(0, 0, layout.gutter, layout.axis_top), "panel")
    ink.vline(layout.gutter, 0, layout.axis_top)
    for name, top, drop in (
        (say("Evidence"), layout.evidence_top, 24),
        (say("Claims"), layout.seam, 24),
        (say("Residue"), layout.claims_bottom, 18),
    ):
        ink.text(_LEFT, top + px(drop), name, STRONG)
    if scene is None:
        return
    _evidence_legend(ink, layout, has_model=scene.model is not None)
    if shows_zoom and grove.trees:
        _claims_legend(ink, layout, grove)
    if scene.residue is not None:
        ink.text(_LEFT, layout.axis_top - px(9), say("noise sd"), CAPTION)


def _evidence_legend(ink: Ink, layout: LaneLayout, *, has_model: bool) -> None:
    px = ink.look.px
    top = layout.evidence_top
    ink.line((_LEFT, top + px(40)), (_LEFT + 20, top + px(40)), "trace", 1.2)
    ink.text(_LEFT, top + px(58), say("measured"), CAPTION)
    y = top + px(72)
    if has_model:
        colour = ink.colour("model_fill")
        colour.setAlpha(ink.look.tokens.model_fill_alpha)
        ink.fill(QRectF(_LEFT, y, 20, 8), colour)
        ink.line((_LEFT, y), (_LEFT + 20, y), "model_edge", 1.2)
        ink.text(_LEFT, y + px(22), say("modelled"), CAPTION)
        y += px(38)
    ink.hline(_LEFT, _LEFT + 20, y, "edge")
    ink.vline(_LEFT, y, y + 4, "edge")
    ink.vline(_LEFT + 19, y, y + 4, "edge")
    ink.text(_LEFT, y + px(20), say("protons"), CAPTION)


def _claims_legend(ink: Ink, layout: LaneLayout, grove: Grove) -> None:
    px = ink.look.px
    y = layout.seam + px(36)
    leaf = leaf_path((_LEFT + 10, y + 22), (_LEFT + 6, y), 5)
    ink.stroke(leaf, "tone:settled", 0.9, fill="fill:settled")
    ink.text(_LEFT + 24, y + px(16), say("fitted"), CAPTION)
    y += px(32)
    levels = [level for one in grove.trees for level in one.tree.levels]
    if any(level.is_disputed for level in levels):
        ghost = leaf_path((_LEFT + 10, y + 22), (_LEFT + 6, y), 5)
        ink.stroke(ghost, "tone:disputed", 1.2, fill="panel", dashes=[2.5, 2])
        ink.text(_LEFT + 24, y + px(16), say("predicted"), CAPTION)
        y += px(32)
    if any(leaf.is_off for one in grove.trees for leaf in one.tree.leaves):
        ink.fill(QRectF(_LEFT, y + 5, 20, 3), "fill:disputed")
        ink.text(_LEFT + 24, y + px(10), say("gap"), CAPTION)
    ink.text(_LEFT, layout.soil + px(24), say("J in Hz"), CAPTION)


def paint_bare_tree(ink: Ink, layout: LaneLayout) -> None:
    """One tree without leaves' colour, waiting for a structure."""
    middle = (layout.left + layout.right) / 2
    soil, seam = layout.soil, layout.seam
    ink.hline(layout.left, layout.right, soil)
    ink.hline(layout.left, layout.right, seam)
    height = soil - seam - 30
    fork, crotch, foot = soil - height * 0.28, soil - height * 0.62, seam + 26
    ink.line((middle, soil), (middle, fork), "rule", 2)
    for side in (-1, 1):
        _bare_branch(ink, (middle, fork), (middle + side * 84, crotch), 1.5)
        for twig in (-1, 1):
            x = middle + side * 84 + twig * 34
            _bare_branch(ink, (middle + side * 84, crotch), (x, foot), 1.2)
            leaf = QPainterPath(QPointF(x, foot))
            leaf.cubicTo(
                QPointF(x - 7, foot - 9),
                QPointF(x - 4, foot - 15),
                QPointF(x, seam + 2),
            )
            leaf.cubicTo(
                QPointF(x + 4, foot - 15), QPointF(x + 7, foot - 9), QPointF(x, foot)
            )
            ink.stroke(leaf, "rule", 1.2, fill="lane", dashes=[3, 2.5])


def _bare_branch(
    ink: Ink, start: tuple[float, float], end: tuple[float, float], width: float
) -> None:
    rise = start[1] - end[1]
    path = QPainterPath(QPointF(*start))
    path.cubicTo(
        QPointF(start[0], start[1] - rise * 0.45),
        QPointF(end[0], end[1] + rise * 0.5),
        QPointF(*end),
    )
    ink.stroke(path, "rule", width)
