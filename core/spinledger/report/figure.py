"""The figure: evidence over claims over residue, on one folded axis, as SVG.

Shifts in ppm, positions in user units (one CSS pixel at 100 %).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from spinledger.report.folds import (
    FoldedAxis,
    Range,
    Stretch,
    entry_region,
    fold_axis,
    shown_regions,
)
from spinledger.report.lanes import (
    Curves,
    curves_of,
    draw_axis,
    draw_bracket,
    draw_evidence,
    draw_feet,
    draw_fold,
    draw_residue,
    draw_stray,
    residue_height,
    tallest,
)
from spinledger.report.palette import BARK, MUTED
from spinledger.report.roots import RootLabel, draw_roots
from spinledger.report.svg import Canvas
from spinledger.report.trees import Tree, claim_tree, draw_tree, storeys
from spinledger.report.words import fixed, label_glyphs, solvent_glyphs
from spinledger.values.evidence import Stray
from spinledger.values.ledger import Entry, Ledger

# Content of an A4 page with 16 mm margins at 96 px an inch.
PAGE_WIDTH = 673.0
FIGURE_LEGEND = (
    "Ink is measured, blue is modelled; empty stretches of the axis are folded away. "
    "One gain for all stretches. Under the trees: measured minus modelled in noise "
    "sd, linear to 3 and logarithmic beyond."
)
_FOOT = 8.0
# Room on the left for the residue's scale and the axis name.
_GUTTER = 30.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Lanes:
    """Heights of a drawing, from top to bottom.

    Attributes
    ----------
    top : float
        Upper edge of the evidence lane, over it brackets.
    ground : float
        Where the measured line stands.
    soil : float
        Line on which the trees root.
    residue_top, residue_bottom : float
    axis : float
    height : float
    """

    top: float
    ground: float
    soil: float
    residue_top: float
    residue_bottom: float
    axis: float
    height: float


@dataclass(frozen=True, slots=True, kw_only=True)
class _Scene:
    """What every part of one drawing needs."""

    canvas: Canvas
    ledger: Ledger
    curves: Curves
    axis: FoldedAxis
    lanes: Lanes

    @property
    def field_mhz(self) -> float:
        """Hz of one ppm."""
        return self.curves.spectrum.spectrometer_frequency_mhz


OVERVIEW = Lanes(
    top=30,
    ground=190,
    soil=312,
    residue_top=348,
    residue_bottom=400,
    axis=406,
    height=424,
)
EXPANSION = Lanes(
    top=24,
    ground=120,
    soil=214,
    residue_top=246,
    residue_bottom=276,
    axis=281,
    height=302,
)


def overview_svg(ledger: Ledger, *, width: float = PAGE_WIDTH) -> str:
    """The whole spectrum on a folded axis at one gain, as SVG text.

    Parameters
    ----------
    ledger : Ledger
    width : float
        Width of the drawing.

    Returns
    -------
    str
    """
    canvas = Canvas(
        width, OVERVIEW.height, title=_description(ledger), scope="overview"
    )
    axis = fold_axis(shown_regions(ledger), left=_GUTTER, right=width, gap=12)
    scene = _Scene(
        canvas=canvas,
        ledger=ledger,
        curves=curves_of(ledger),
        axis=axis,
        lanes=OVERVIEW,
    )
    _draw(scene, _claimed_regions(ledger))
    return canvas.svg()


def expansion_svgs(
    ledger: Ledger, *, width: float = (PAGE_WIDTH - 17) / 2
) -> tuple[tuple[str, str], ...]:
    """One drawing for each stretch that holds claims, each at its own gain.

    Parameters
    ----------
    ledger : Ledger
    width : float

    Returns
    -------
    tuple of (caption, SVG text)
        By falling shift.
    """
    drawings: list[tuple[str, str]] = []
    for rank, (region, names) in enumerate(_signal_regions(ledger)):
        caption = ", ".join(label_glyphs(name) for name in names)
        canvas = Canvas(
            width, EXPANSION.height, title=f"Expansion: {caption}", scope=f"part{rank}"
        )
        stretch = Stretch(
            low_ppm=region[0], high_ppm=region[1], left=_GUTTER, right=width
        )
        scene = _Scene(
            canvas=canvas,
            ledger=ledger,
            curves=curves_of(ledger),
            axis=FoldedAxis(stretches=(stretch,)),
            lanes=EXPANSION,
        )
        _draw(scene, (region,))
        drawings.append((caption, canvas.svg()))
    return tuple(drawings)


def _draw(scene: _Scene, gain_regions: Sequence[Range]) -> None:
    lanes, canvas = scene.lanes, scene.canvas
    highest = tallest(scene.curves, gain_regions)
    per_unit = highest / (lanes.ground - lanes.top - 4)
    _draw_folds(scene)
    for stretch in scene.axis.stretches:
        draw_evidence(
            canvas,
            scene.curves,
            stretch,
            top=lanes.top,
            ground=lanes.ground,
            per_unit=per_unit,
        )
        draw_residue(
            canvas,
            scene.curves,
            stretch,
            top=lanes.residue_top,
            bottom=lanes.residue_bottom,
        )
        canvas.line(
            (stretch.left, lanes.soil), (stretch.right, lanes.soil), stroke=BARK
        )
        draw_axis(canvas, stretch, lanes.axis)
    _draw_brackets(scene)
    _draw_trees(scene)
    _draw_strays(scene)
    _draw_residue_scale(scene)


def _draw_folds(scene: _Scene) -> None:
    stretches = scene.axis.stretches
    for left, right in pairwise(stretches):
        draw_fold(scene.canvas, left.right, right.left, 8, scene.lanes.axis)


def _draw_residue_scale(scene: _Scene) -> None:
    lanes = scene.lanes
    middle = (lanes.residue_top + lanes.residue_bottom) / 2
    half = (lanes.residue_bottom - lanes.residue_top) / 2
    x = _GUTTER
    for residue, words in ((30.0, "30"), (3.0, "3 sd"), (-3.0, "−3"), (-30.0, "−30")):
        y = middle - half * residue_height(residue)
        scene.canvas.line((x - 4, y), (x, y), stroke=MUTED, width=0.8)
        if half > 20 or residue in (3.0, -30.0):
            scene.canvas.text((x - 6, y + 3), words, size=8, fill=MUTED, anchor="end")
    scene.canvas.text((0, lanes.axis + 15), "ppm", size=10, fill=MUTED)


def _draw_brackets(scene: _Scene) -> None:
    """Found protons over every signal; what is shared has one bracket."""
    y = scene.lanes.top - 8
    for region, protons in _integrals(scene.ledger):
        stretch = scene.axis.find((region[0] + region[1]) / 2)
        if stretch is not None:
            draw_bracket(scene.canvas, stretch, region, y, fixed(protons, 2))


def _integrals(ledger: Ledger) -> tuple[tuple[Range, float], ...]:
    """Ranges and found protons; what overlaps is one range, summed.

    The parts of an overlap come from the fit and are printed in the table.
    """
    found: list[tuple[Range, float]] = []
    measured = [
        (entry.range_ppm, entry.integral_protons)
        for entry in ledger.entries
        if entry.range_ppm is not None and entry.integral_protons is not None
    ]
    for (low, high), protons in sorted(measured):
        if found and low < found[-1][0][1]:
            (before, reach), so_far = found[-1]
            found[-1] = ((before, max(reach, high)), so_far + protons)
        else:
            found.append(((low, high), protons))
    return tuple(found)


def _draw_trees(scene: _Scene) -> None:
    shown: list[tuple[Entry, Tree, Stretch]] = []
    for entry in scene.ledger.entries:
        tree = claim_tree(scene.ledger, entry)
        stretch = None if tree is None else scene.axis.find(tree.root_ppm)
        if tree is not None and stretch is not None:
            shown.append((entry, tree, stretch))
    tip = scene.lanes.ground + _FOOT
    labels: list[RootLabel] = []
    for stretch in scene.axis.stretches:
        here = [one for one in shown if one[2] is stretch]
        trees = [tree for _, tree, _ in here]
        rooms = storeys(trees, tip, scene.lanes.soil, stretch.x)
        # Lower storeys first, so that stalks pass behind the upper crowns.
        order = sorted(range(len(here)), key=lambda index: -rooms[index].crown)
        for index in order:
            entry, tree, _ = here[index]
            draw_tree(
                scene.canvas,
                tree,
                rooms[index],
                x_of=stretch.x,
                field_mhz=scene.field_mhz,
            )
            if tree.state != "open":
                xs = [stretch.x(shift) for shift in tree.tips_ppm]
                draw_feet(scene.canvas, xs, top=scene.lanes.ground, bottom=tip)
            labels.append(
                RootLabel.of(
                    x=stretch.x(tree.root_ppm),
                    words=label_glyphs(entry.claim),
                    n_protons=entry.protons,
                    state=entry.state,
                )
            )
    draw_roots(scene.canvas, labels, soil=scene.lanes.soil)


def _draw_strays(scene: _Scene) -> None:
    """Triangles under the strays' lines; among trees over them, without a name."""
    names = {
        "solvent": solvent_glyphs(scene.ledger.evidence.solvent or "solvent"),
        "reference": scene.ledger.evidence.reference.by,
        "unexplained": "?",
    }
    covered = _tree_spans(scene)
    taken: list[float] = []
    for stray in _by_size(scene.ledger.strays):
        middle = (stray.low_ppm + stray.high_ppm) / 2
        stretch = scene.axis.find(middle)
        if stretch is None or stray.kind in ("satellite", "sideband"):
            continue
        x = stretch.x(middle)
        is_known = stray.kind != "unexplained"
        if any(left - 8 < x < right + 8 for left, right in covered):
            scene.canvas.mark((x, 5), "stray", size=8, known=is_known)
            continue
        is_free = all(abs(x - other) > 34 for other in taken)
        taken.append(x)
        draw_stray(
            scene.canvas,
            x,
            scene.lanes.ground + _FOOT + 6,
            names.get(stray.kind, _compound(stray)) if is_free else "",
            known=is_known,
        )


def _compound(stray: Stray) -> str:
    """Name of a recognised compound where it is short, else the kind of stray."""
    name, colon, _ = stray.why.partition(":")
    return name if colon and len(name) <= 14 else stray.kind


def _tree_spans(scene: _Scene) -> list[Range]:
    """Stretches of the drawing that trees take up."""
    spans = []
    for entry in scene.ledger.entries:
        tree = claim_tree(scene.ledger, entry)
        stretch = None if tree is None else scene.axis.find(tree.root_ppm)
        if tree is not None and stretch is not None:
            low, high = tree.span_ppm
            spans.append((stretch.x(high), stretch.x(low)))
    return spans


def _by_size(strays: Sequence[Stray]) -> list[Stray]:
    return sorted(
        strays, key=lambda stray: (stray.kind == "unexplained", -(stray.protons or 0))
    )


def _claimed_regions(ledger: Ledger) -> tuple[Range, ...]:
    field_mhz = ledger.evidence.spectrum.spectrometer_frequency_mhz
    regions = tuple(
        region
        for entry in ledger.entries
        if entry.state != "open"
        and (region := entry_region(entry, field_mhz)) is not None
    )
    return regions or shown_regions(ledger)


def _signal_regions(ledger: Ledger) -> tuple[tuple[Range, tuple[str, ...]], ...]:
    """Stretches with the claims in them, by falling shift, with margins."""
    field_mhz = ledger.evidence.spectrum.spectrometer_frequency_mhz
    placed = [
        (region, entry.claim)
        for entry in ledger.entries
        if entry.shift_ppm is not None
        and (region := entry_region(entry, field_mhz)) is not None
    ]
    margin = 10.0 / field_mhz
    merged: list[tuple[Range, tuple[str, ...]]] = []
    for region, name in sorted(placed):
        low, high = region[0] - margin, region[1] + margin
        if merged and low <= merged[-1][0][1]:
            (before, reach), names = merged[-1]
            merged[-1] = ((before, max(reach, high)), (*names, name))
        else:
            merged.append(((low, high), (name,)))
    return tuple(((low, high), names[::-1]) for (low, high), names in reversed(merged))


def _description(ledger: Ledger) -> str:
    placed = sum(entry.shift_ppm is not None for entry in ledger.entries)
    return (
        f"Measured spectrum of {ledger.evidence.metadata.source_name} with the "
        f"modelled lines of {placed} placed claims, their splitting trees, and "
        "measured minus modelled in noise sd."
    )
