"""The spectrum that a claim set predicts, with its trees, as a table and as SVG.

Shifts in ppm, couplings in Hz, fields in MHz.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from spinledger.report.figure import PAGE_WIDTH
from spinledger.report.folds import FoldedAxis, Range, Stretch, fold_axis
from spinledger.report.lanes import (
    Curves,
    draw_axis,
    draw_evidence,
    draw_feet,
    draw_fold,
    tallest,
)
from spinledger.report.palette import BARK, MUTED
from spinledger.report.roots import RootLabel, draw_roots
from spinledger.report.svg import Canvas
from spinledger.report.trees import Tree, draw_tree, storeys
from spinledger.report.words import label_glyphs
from spinledger.spins.network import ClaimNetwork
from spinledger.spins.tree import Tree as ExactTree
from spinledger.spins.tree import splitting_tree
from spinledger.values.claim import Claim, ClaimSet
from spinledger.values.spectrum import Spectrum

_WIDTH_HZ = 1.0
_TOP, _GROUND, _SOIL, _AXIS, _HEIGHT = 14.0, 170.0, 296.0, 332.0, 352.0
_STEP_HZ = 0.1
_MARGIN_HZ = 100.0
_REACH_HZ = 8.0


@dataclass(frozen=True, slots=True, kw_only=True)
class PredictedClaim:
    """A claim with its pattern and couplings at one field.

    Attributes
    ----------
    claim : Claim
    tree : ExactTree or None
        None for silent claims.
    couplings : tuple of (partner, J in Hz, sd in Hz, kind, source)
    """

    claim: Claim
    tree: ExactTree | None
    couplings: tuple[tuple[str, float, float, str, str], ...]


def predicted_claims(
    claims: ClaimSet, *, field_mhz: float
) -> tuple[PredictedClaim, ...]:
    """Claims with their exact lines and patterns at a field.

    Parameters
    ----------
    claims : ClaimSet
    field_mhz : float, MHz
    """
    network = ClaimNetwork(claims)
    shifts_hz = np.array([one.shift_ppm * field_mhz for one in claims.claims])
    couplings_hz = np.array([one.j_hz for one in claims.couplings])
    shown = {one.claim for one in claims.particles}
    return tuple(
        PredictedClaim(
            claim=claim,
            tree=splitting_tree(network, index, shifts_hz, couplings_hz)
            if index in shown
            else None,
            couplings=_couplings_of(claims, index),
        )
        for index, claim in enumerate(claims.claims)
    )


def simulated_svg(
    claims: ClaimSet, *, field_mhz: float, width: float = PAGE_WIDTH
) -> str:
    """Simulated spectrum with trees on a folded axis, as SVG text.

    Parameters
    ----------
    claims : ClaimSet
    field_mhz : float, MHz
    width : float
        Width of the drawing.

    Raises
    ------
    ValueError
        If no claim is visible.
    """
    visible = [
        (one.claim, one.tree)
        for one in predicted_claims(claims, field_mhz=field_mhz)
        if one.tree is not None
    ]
    trees = [_drawn_tree(claim, exact, field_mhz) for claim, exact in visible]
    if not trees:
        raise ValueError("claims: nothing in this structure is visible here")
    canvas = Canvas(
        width,
        _HEIGHT,
        title=f"Simulated spectrum at {field_mhz:.0f} MHz",
        scope="simulated",
    )
    regions: list[Range] = [tree.span_ppm for tree in trees]
    axis = fold_axis(regions, left=30, right=width, gap=12)
    curves = _curves([exact for _, exact in visible], field_mhz)
    per_unit = tallest(curves, regions) / (_GROUND - _TOP)
    _draw_ground(canvas, axis, curves, per_unit)
    counts = {one.label: one.n_protons for one in claims.claims}
    labels: list[RootLabel] = []
    for stretch in axis.stretches:
        here = [tree for tree in trees if axis.find(tree.root_ppm) is stretch]
        labels += _draw_crowns(canvas, here, stretch, field_mhz, counts)
    draw_roots(canvas, labels, soil=_SOIL)
    canvas.text((0, _AXIS + 15), "ppm", size=10, fill=MUTED)
    return canvas.svg()


def _draw_ground(
    canvas: Canvas, axis: FoldedAxis, curves: Curves, per_unit: float
) -> None:
    stretches = axis.stretches
    for left, right in pairwise(stretches):
        draw_fold(canvas, left.right, right.left, 8, _AXIS)
    for stretch in stretches:
        draw_evidence(
            canvas, curves, stretch, top=_TOP, ground=_GROUND, per_unit=per_unit
        )
        canvas.line((stretch.left, _SOIL), (stretch.right, _SOIL), stroke=BARK)
        draw_axis(canvas, stretch, _AXIS)


def _draw_crowns(
    canvas: Canvas,
    trees: Sequence[Tree],
    stretch: Stretch,
    field_mhz: float,
    counts: dict[str, int],
) -> list[RootLabel]:
    tip = _GROUND + 8
    labels = []
    rooms = storeys(trees, tip, _SOIL, stretch.x)
    for tree, room in sorted(
        zip(trees, rooms, strict=True), key=lambda pair: -pair[1].crown
    ):
        draw_tree(canvas, tree, room, x_of=stretch.x, field_mhz=field_mhz)
        xs = [stretch.x(shift) for shift in tree.tips_ppm]
        draw_feet(canvas, xs, top=_GROUND, bottom=tip)
        labels.append(
            RootLabel.of(
                x=stretch.x(tree.root_ppm),
                words=label_glyphs(tree.claim),
                n_protons=counts[tree.claim],
                state=tree.state,
            )
        )
    return labels


def _couplings_of(
    claims: ClaimSet, index: int
) -> tuple[tuple[str, float, float, str, str], ...]:
    found: dict[tuple[str, int], tuple[str, float, float, str, str]] = {}
    for number, coupling in enumerate(claims.couplings):
        for pair in coupling.pairs:
            ends = [claims.particles[one] for one in pair]
            for mine, other in (ends, ends[::-1]):
                if mine.claim != index or other.claim == index:
                    continue
                name = (
                    other.nucleus
                    if other.claim is None
                    else claims.claims[other.claim].label
                )
                found[name, number] = (
                    name,
                    coupling.j_hz,
                    coupling.j_sd_hz,
                    coupling.kind,
                    coupling.source,
                )
    return tuple(sorted(found.values(), key=lambda one: -abs(one[1])))


def _drawn_tree(claim: Claim, exact: ExactTree, field_mhz: float) -> Tree:
    """Tree to draw: lines that can be seen, near where first order has them."""
    near = (exact.lines_hz >= exact.leaves_hz.min() - _REACH_HZ) & (
        exact.lines_hz <= exact.leaves_hz.max() + _REACH_HZ
    )
    strong = near & (exact.line_protons >= 0.02 * exact.line_protons.max())
    return Tree(
        claim=claim.label,
        state="settled" if claim.visibility == "seen" else "silent",
        root_ppm=claim.shift_ppm,
        levels=tuple(
            level for level in exact.levels if level.coupling_hz >= 0.3 * _WIDTH_HZ
        ),
        tips_ppm=tuple((exact.lines_hz[strong] / field_mhz).tolist()),
        weights=tuple(exact.line_protons[strong].tolist()),
        width_ppm=_WIDTH_HZ / field_mhz,
    )


def _curves(trees: Sequence[ExactTree], field_mhz: float) -> Curves:
    """Lorentz lines of one width on an axis that holds them all."""
    low_hz = min(float(tree.lines_hz.min()) for tree in trees) - _MARGIN_HZ
    high_hz = max(float(tree.lines_hz.max()) for tree in trees) + _MARGIN_HZ
    n_points = int((high_hz - low_hz) / _STEP_HZ)
    axis_hz = high_hz - _STEP_HZ * np.arange(n_points)
    intensities: npt.NDArray[np.float64] = np.zeros(n_points)
    half = _WIDTH_HZ / 2
    for tree in trees:
        for line_hz, protons in zip(tree.lines_hz, tree.line_protons, strict=True):
            intensities += protons * half / np.pi / ((axis_hz - line_hz) ** 2 + half**2)
    spectrum = Spectrum(
        intensities=intensities,
        first_point_ppm=high_hz / field_mhz,
        spectral_width_hz=n_points * _STEP_HZ,
        spectrometer_frequency_mhz=field_mhz,
    )
    noise = float(intensities.max()) * 1e-6
    return Curves(spectrum=spectrum, model=intensities, noise_sd=noise)
