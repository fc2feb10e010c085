"""Drawings of the PDF: evidence with trees on the folded axis, and the structure."""

from __future__ import annotations

from dataclasses import replace

from PySide6.QtCore import QRectF, Qt

from spinledger.values.ledger import Ledger
from spinledger_app.lanes.axis_layer import paint_axis, paint_folds
from spinledger_app.lanes.claims_layer import ClaimsPainter
from spinledger_app.lanes.evidence_layer import paint_brackets, paint_evidence
from spinledger_app.lanes.grove import plant
from spinledger_app.lanes.layout import LaneLayout
from spinledger_app.lanes.residue_layer import paint_residue
from spinledger_app.lanes.scene import LaneScene, TreeShape
from spinledger_app.lanes.shift_map import ShiftMap
from spinledger_app.painting.ink import CAPTION, SECOND_STRONG, Ink, label_width
from spinledger_app.painting.marks import paint_mark
from spinledger_app.painting.molecule import atom_text_width, paint_molecule
from spinledger_app.presenters.structure import (
    Drawing,
    TagWish,
    fitted,
    place_tags,
)

FIGURE_HEIGHT = 430.0
_EVIDENCE, _CLAIMS, _RESIDUE = 190.0, 150.0, 62.0


def figure_layout(left: float, right: float, top: float) -> LaneLayout:
    """Lanes of the figure between two margins."""
    seam = top + _EVIDENCE
    claims = seam + _CLAIMS
    axis = claims + _RESIDUE
    return LaneLayout(
        left=left,
        right=right,
        gutter=left,
        width=right,
        evidence_top=top,
        seam=seam,
        claims_bottom=claims,
        axis_top=axis,
        bottom=axis + 28,
    )


def paint_figure(
    ink: Ink, scene: LaneScene, left: float, right: float, top: float
) -> None:
    """Paint evidence, claims and residue with its top at ``top``."""
    layout = figure_layout(left, right, top)
    painter = ink.painter
    painter.save()
    painter.setClipRect(
        QRectF(left, top, right - left, layout.bottom - top),
        Qt.ClipOperation.IntersectClip,
    )
    shift_map = ShiftMap.fitted(scene.folds or (scene.whole,), left, right)
    paint_residue(ink, scene, shift_map, layout)
    paint_evidence(
        ink,
        scene,
        shift_map,
        layout,
        gain=1.0,
        own_gains=False,
        show_integrals=False,
    )
    paint_folds(ink, shift_map, layout)
    paint_brackets(ink, scene, shift_map, layout)

    def width_of(tree: TreeShape) -> float:
        return max(label_width(ink.look, tree.claim), 24.0)

    grove = plant(scene, shift_map, layout, width_of)
    ClaimsPainter(ink, scene, shift_map, layout, grove).paint()
    paint_axis(ink, shift_map, replace(layout, width=right), scene.frequency_mhz)
    painter.restore()
    ink.text(right, layout.bottom + 8, "δ, ppm", CAPTION, align="right")


def paint_sketch(
    ink: Ink,
    ledger: Ledger,
    drawing: Drawing,
    room: tuple[float, float, float, float],
) -> None:
    """Paint the structure with a mark and label a claim into (left, top, w, h)."""
    left, top, width, height = room
    inner = (40.0, 30.0, width - 80, height - 64)
    places, scale = fitted(drawing, inner, longest_px=34)
    wishes = [
        TagWish(
            claim=entry.claim,
            state=entry.state,
            atoms=entry.atoms,
            width=label_width(ink.look, entry.claim, SECOND_STRONG) + 18,
        )
        for entry in ledger.entries
    ]
    tags = place_tags(
        drawing,
        places,
        wishes,
        size=(width, height),
        height=18,
        label_width=lambda atom: atom_text_width(ink.look, atom, 13),
    )
    moved = [(x + left, y + top) for x, y in places]
    paint_molecule(ink, drawing, moved, scale, size=13, width=1.5)
    for tag in tags:
        middle = top + tag.top + tag.height / 2
        if tag.is_led:
            x, y = moved[tag.atom]
            ink.line((x, y), (left + tag.left, middle), "rule", 0.8)
        paint_mark(ink, left + tag.left + 6, middle, tag.state, size=9)
        ink.label(left + tag.left + 14, middle + 4.5, tag.claim, SECOND_STRONG)
