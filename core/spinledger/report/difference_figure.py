"""Two spectra on one axis and their difference, as SVG; ppm."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from spinledger.report.lanes import residue_heights
from spinledger.report.palette import BAND, INK, MODEL_EDGE, MUTED, RULE
from spinledger.report.svg import Canvas, envelope, polyline
from spinledger.sample.difference import Difference

Floats = npt.NDArray[np.float64]

WIDTH, HEIGHT = 670.0, 250.0
LEFT, RIGHT = 8.0, 662.0
SPECTRUM_TOP, SPECTRUM_BOTTOM = 18.0, 140.0
DIFFERENCE_TOP, DIFFERENCE_BOTTOM = 150.0, 222.0
MARGIN_PPM = 0.3
# A line that stands this far over the third highest column is cut.
HEADROOM = 1.15
LINEAR_SD = 3.0


def difference_svg(difference: Difference, *, names: tuple[str, str]) -> str:
    """Main spectrum over the ghost of the other, and the difference in noise sd.

    Parameters
    ----------
    difference : Difference
    names : (str, str)
        Of the main spectrum and of the other.
    """
    low, high = _span(difference)
    window = difference.main.points(low, high)
    shifts = difference.shifts_ppm[window]
    xs = LEFT + (high - shifts) / (high - low) * (RIGHT - LEFT)
    title = f"{names[0]} over {names[1]}, and their difference in noise sd"
    canvas = Canvas(WIDTH, HEIGHT, title=title, scope="difference")
    tallest = float(difference.main.intensities[window].max()) * HEADROOM
    for trace, stroke in (
        (difference.other.intensities[window], MODEL_EDGE),
        (difference.main.intensities[window], INK),
    ):
        room = SPECTRUM_BOTTOM - SPECTRUM_TOP
        _curve(canvas, xs, SPECTRUM_BOTTOM - trace / tallest * room, stroke)
    middle = (DIFFERENCE_TOP + DIFFERENCE_BOTTOM) / 2.0
    half = (DIFFERENCE_BOTTOM - DIFFERENCE_TOP) / 2.0
    band = half * float(residue_heights(np.array([LINEAR_SD]))[0])
    canvas.rectangle((LEFT, middle - band), (RIGHT - LEFT, 2.0 * band), fill=BAND)
    heights = residue_heights(difference.in_noise_sd[window])
    _curve(canvas, xs, middle - half * heights, INK)
    canvas.text((LEFT, 12.0), names[0], size=9.0)
    canvas.text((RIGHT, 12.0), names[1], size=9.0, fill=MODEL_EDGE, anchor="end")
    _axis(canvas, low, high)
    return canvas.svg()


def _span(difference: Difference) -> tuple[float, float]:
    """Stretch that holds all signals of both."""
    busy = np.flatnonzero(~difference.main.is_empty & (difference.intensities != 0.0))
    tall = np.flatnonzero(
        np.abs(difference.main.intensities) > 20.0 * difference.noise_sd
    )
    chosen = tall if tall.size else busy
    if not chosen.size:
        return float(difference.shifts_ppm[-1]), float(difference.shifts_ppm[0])
    high = float(difference.shifts_ppm[chosen[0]]) + MARGIN_PPM
    low = float(difference.shifts_ppm[chosen[-1]]) - MARGIN_PPM
    return low, high


def _curve(canvas: Canvas, xs: Floats, ys: Floats, stroke: str) -> None:
    shown_x, shown_y = envelope(xs, ys)
    canvas.path(polyline(shown_x.tolist(), shown_y.tolist()), stroke=stroke, width=0.7)


def _axis(canvas: Canvas, low: float, high: float) -> None:
    y = DIFFERENCE_BOTTOM + 4.0
    canvas.line((LEFT, y), (RIGHT, y), stroke=RULE)
    step = 1.0 if high - low > 3.0 else 0.5
    first = np.ceil(low / step) * step
    for at in np.arange(first, high, step):
        x = LEFT + (high - float(at)) / (high - low) * (RIGHT - LEFT)
        canvas.line((x, y), (x, y + 4.0), stroke=RULE)
        words = f"{at:.0f}" if step == 1.0 else f"{at:.1f}"
        canvas.text((x, y + 15.0), words, size=9.0, fill=MUTED, anchor="middle")
