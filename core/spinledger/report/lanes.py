"""Lanes of the figure: measured and modelled curves, residue, axis, brackets.

Shifts in ppm, intensities in the spectrum's own units, positions in user units.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.report.folds import Stretch
from spinledger.report.palette import (
    BAND,
    FOLD,
    HAIRLINE,
    INK,
    MODEL_EDGE,
    MODEL_FILL,
    MODEL_FILL_OPACITY,
    MUTED,
    RULE,
    STATE_TONE,
)
from spinledger.report.svg import Canvas, envelope, number, polyline
from spinledger.report.words import fixed
from spinledger.values.ledger import Ledger
from spinledger.values.spectrum import Spectrum

Floats = npt.NDArray[np.float64]
_LINEAR_SD = 3.0
_OUTER_SD = 300.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Curves:
    """What the lanes draw, on one axis.

    Attributes
    ----------
    spectrum : Spectrum
        Measured.
    model : numpy.ndarray or None, shape (n_points,)
    noise_sd : float
    """

    spectrum: Spectrum
    model: Floats | None
    noise_sd: float


def curves_of(ledger: Ledger) -> Curves:
    """Curves of a ledger."""
    return Curves(
        spectrum=ledger.evidence.spectrum,
        model=None if ledger.model is None else ledger.model.intensities,
        noise_sd=ledger.evidence.noise_sd,
    )


def tallest(curves: Curves, regions: Sequence[tuple[float, float]]) -> float:
    """Highest measured point in some regions, at least six noise sd."""
    spectrum = curves.spectrum
    heights = [
        float(spectrum.intensities[spectrum.window(low, high)].max())
        for low, high in regions
    ]
    return max([6 * curves.noise_sd, *heights])


def draw_evidence(
    canvas: Canvas,
    curves: Curves,
    stretch: Stretch,
    *,
    top: float,
    ground: float,
    per_unit: float,
) -> None:
    """Modelled area under the measured line in one stretch.

    Parameters
    ----------
    canvas : Canvas
    curves : Curves
    stretch : Stretch
    top, ground : float
        Edges of the lane; the curve is cut off at the top.
    per_unit : float
        Intensity of one user unit: the gain.
    """
    window = curves.spectrum.window(stretch.low_ppm, stretch.high_ppm)
    xs = _positions(curves.spectrum, window, stretch)
    canvas.open_clip(
        (stretch.left, top),
        (stretch.right - stretch.left, ground - top + 4),
    )
    if curves.model is not None:
        shown_x, shown = envelope(xs, ground - curves.model[window] / per_unit)
        outline = polyline(shown_x.tolist(), _limited(shown, top))
        area = (
            f"M{number(float(shown_x[0]))} {number(ground)}L{outline[1:]}"
            f"L{number(float(shown_x[-1]))} {number(ground)}Z"
        )
        canvas.path(area, fill=MODEL_FILL, opacity=MODEL_FILL_OPACITY)
        canvas.path(outline, stroke=MODEL_EDGE, width=1.0)
    measured = ground - curves.spectrum.intensities[window] / per_unit
    shown_x, shown = envelope(xs, measured)
    canvas.path(
        polyline(shown_x.tolist(), _limited(shown, top)), stroke=INK, width=0.75
    )
    canvas.close_group()
    if float(measured.min()) < top:
        _cut_mark(canvas, xs[int(measured.argmin())], top)


def draw_residue(
    canvas: Canvas,
    curves: Curves,
    stretch: Stretch,
    *,
    top: float,
    bottom: float,
) -> None:
    """Measured minus modelled in noise sd, linear to 3 and logarithmic beyond."""
    middle, half = (top + bottom) / 2, (bottom - top) / 2
    band = half * residue_height(_LINEAR_SD)
    canvas.rectangle(
        (stretch.left, middle - band),
        (stretch.right - stretch.left, 2 * band),
        fill=BAND,
    )
    if curves.model is None:
        return
    window = curves.spectrum.window(stretch.low_ppm, stretch.high_ppm)
    xs = _positions(curves.spectrum, window, stretch)
    left_over = curves.spectrum.intensities[window] - curves.model[window]
    heights = residue_heights(left_over / curves.noise_sd)
    shown_x, shown = envelope(xs, middle - half * heights)
    canvas.open_clip(
        (stretch.left, top),
        (stretch.right - stretch.left, bottom - top),
    )
    canvas.path(polyline(shown_x.tolist(), shown.tolist()), stroke=INK, width=0.6)
    canvas.close_group()


def residue_height(residue_sd: float) -> float:
    """Height of a residue on the mixed scale, 1 at 300 sd."""
    return float(residue_heights(np.array([residue_sd]))[0])


def residue_heights(residues_sd: Floats) -> Floats:
    """Heights on a scale that is linear to 3 sd and logarithmic to 300 sd.

    Half of the height belongs to the linear part, a quarter to each decade.
    """
    size = np.abs(residues_sd)
    decades = np.log10(np.maximum(size, _LINEAR_SD) / _LINEAR_SD)
    linear = 0.5 * np.minimum(size, _LINEAR_SD) / _LINEAR_SD
    outer = np.log10(_OUTER_SD / _LINEAR_SD)
    return np.asarray(
        np.sign(residues_sd) * np.minimum(linear + 0.5 * decades / outer, 1)
    )


def draw_axis(
    canvas: Canvas, stretch: Stretch, y: float, *, size: float = 10.0
) -> None:
    """Axis of one stretch with a few round shifts."""
    canvas.line((stretch.left, y), (stretch.right, y), stroke=RULE)
    for shift, label in ticks(stretch, size=size):
        x = stretch.x(shift)
        canvas.line((x, y), (x, y + 4), stroke=MUTED)
        canvas.text((x, y + 5 + size), label, size=size, anchor="middle")


def ticks(stretch: Stretch, *, size: float = 10.0) -> tuple[tuple[float, str], ...]:
    """Round shifts that fit into a stretch with room for their labels.

    Parameters
    ----------
    stretch : Stretch
    size : float
        Size of the labels.

    Returns
    -------
    tuple of (shift in ppm, label)
        The middle of the stretch where no round shift has room.
    """
    scale = (stretch.right - stretch.left) / (stretch.high_ppm - stretch.low_ppm)
    steps = (0.01, 0.02, 0.05, 0.1, 0.2, 0.5, 1.0, 2.0)
    fits = [step for step in steps if step * scale >= 3.2 * size]
    step = fits[0] if fits else steps[-1]
    margin = 1.0 * size / scale
    first = np.ceil((stretch.low_ppm + margin) / step - 1e-9)
    last = np.floor((stretch.high_ppm - margin) / step + 1e-9)
    found = [float(k * step) for k in np.arange(first, last + 1)]
    if not found:
        middle = (stretch.low_ppm + stretch.high_ppm) / 2
        return ((round(middle, 2), fixed(middle, 2)),)
    digits = 2 if step < 0.1 else 1
    return tuple((shift, fixed(shift, digits)) for shift in found)


def draw_bracket(
    canvas: Canvas, stretch: Stretch, region: tuple[float, float], y: float, words: str
) -> None:
    """Bracket over a region with the found protons above it."""
    left = max(stretch.x(region[1]), stretch.left)
    right = min(stretch.x(region[0]), stretch.right)
    canvas.path(
        f"M{number(left)} {number(y + 4)}V{number(y)}H{number(right)}V{number(y + 4)}",
        stroke=MUTED,
        width=0.8,
    )
    canvas.text(((left + right) / 2, y - 4), words, size=10, anchor="middle")


def draw_feet(
    canvas: Canvas, xs: Sequence[float], *, top: float, bottom: float
) -> None:
    """Short feet under measured lines, where the leaves touch."""
    feet = "".join(f"M{number(x)} {number(top)}V{number(bottom)}" for x in xs)
    if feet:
        canvas.path(feet, stroke=INK, width=0.8)


def draw_stray(canvas: Canvas, x: float, y: float, words: str, *, known: bool) -> None:
    """Triangle with its name underneath."""
    canvas.mark((x, y), "stray", size=9, known=known)
    canvas.text((x, y + 16), words, size=10, fill=STATE_TONE["stray"], anchor="middle")


def draw_fold(
    canvas: Canvas, left: float, right: float, top: float, bottom: float
) -> None:
    """Strip where the axis is folded."""
    canvas.rectangle((left + 2, top), (right - left - 4, bottom - top), fill=FOLD)
    middle = (left + right) / 2
    canvas.line((middle, top), (middle, bottom), stroke=HAIRLINE, width=0.8)


def _positions(spectrum: Spectrum, window: slice, stretch: Stretch) -> Floats:
    indices = np.arange(window.start, window.stop, dtype=np.float64)
    shifts = spectrum.first_point_ppm - spectrum.step_ppm * indices
    scale = (stretch.right - stretch.left) / (stretch.high_ppm - stretch.low_ppm)
    return stretch.left + (stretch.high_ppm - shifts) * scale


def _limited(ys: Floats, top: float) -> list[float]:
    """Heights kept within sight of the lane, so that no number grows long."""
    limited: list[float] = np.maximum(ys, top - 20).tolist()
    return limited


def _cut_mark(canvas: Canvas, x: float, y: float) -> None:
    """Two short strokes where a tall line is cut off."""
    for shift in (0, 3):
        canvas.line((x - 4, y + 3 + shift), (x + 4, y + shift), stroke=INK, width=0.8)
