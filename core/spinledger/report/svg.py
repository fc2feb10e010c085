"""A small writer of SVG: shapes go in as numbers, clean text comes out.

All lengths are in user units, one of which is a CSS pixel at 100 %.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from html import escape

import numpy as np
import numpy.typing as npt

from spinledger.report.palette import (
    FONT_STACK,
    INK,
    PAPER,
    STATE_FILL,
    STATE_TONE,
)

Point = tuple[float, float]


class Canvas:
    """Gathers shapes in drawing order.

    Parameters
    ----------
    width, height : float
        Size of the drawing.
    title : str
        What it shows, for readers that cannot see it.
    scope : str
        Prefix of the names inside; differs between drawings of one page.
    """

    def __init__(self, width: float, height: float, *, title: str, scope: str) -> None:
        self.width = width
        self.height = height
        self._title = title
        self._scope = scope
        self._parts: list[str] = []
        self._n_clips = 0

    def add(self, markup: str) -> None:
        """Append finished markup."""
        self._parts.append(markup)

    def line(
        self,
        start: Point,
        end: Point,
        *,
        stroke: str = INK,
        width: float = 1.0,
        dash: str = "",
    ) -> None:
        """A straight line."""
        dashes = f' stroke-dasharray="{dash}"' if dash else ""
        self.add(
            f'<path d="M{number(start[0])} {number(start[1])}L{number(end[0])} '
            f'{number(end[1])}" stroke="{stroke}" '
            f'stroke-width="{number(width)}"{dashes} fill="none"/>'
        )

    def path(
        self,
        commands: str,
        *,
        stroke: str | None = None,
        width: float = 1.0,
        fill: str | None = None,
        opacity: float = 1.0,
        dash: str = "",
    ) -> None:
        """A path from SVG path commands."""
        drawn = (
            f' stroke="{stroke}" stroke-width="{number(width)}" '
            'stroke-linejoin="round" stroke-linecap="round"'
            if stroke
            else ""
        )
        see_through = (
            f' fill-opacity="{number(opacity)}"' if fill and opacity < 1 else ""
        )
        dashes = f' stroke-dasharray="{dash}"' if dash else ""
        self.add(
            f'<path d="{commands}" fill="{fill or "none"}"{see_through}{drawn}{dashes}/>'
        )

    def rectangle(
        self, corner: Point, size: Point, *, fill: str, radius: float = 0.0
    ) -> None:
        """A filled rectangle."""
        rounded = f' rx="{number(radius)}"' if radius else ""
        self.add(
            f'<rect x="{number(corner[0])}" y="{number(corner[1])}" '
            f'width="{number(size[0])}" height="{number(size[1])}" '
            f'fill="{fill}"{rounded}/>'
        )

    def text(
        self,
        at: Point,
        words: str,
        *,
        size: float = 11.0,
        fill: str = INK,
        weight: int = 400,
        anchor: str = "start",
    ) -> None:
        """A line of text whose baseline starts, is centred, or ends at a point."""
        heavy = f' font-weight="{weight}"' if weight != 400 else ""
        placed = f' text-anchor="{anchor}"' if anchor != "start" else ""
        self.add(
            f'<text x="{number(at[0])}" y="{number(at[1])}" '
            f'font-size="{number(size)}" fill="{fill}"{heavy}{placed}>'
            f"{escape(words)}</text>"
        )

    def mark(
        self, at: Point, state: str, *, size: float = 9.0, known: bool = True
    ) -> None:
        """State mark: disc, split lozenge, ring, bar, or triangle."""
        self.add(state_mark(at, state, size=size, known=known))

    def open_clip(self, corner: Point, size: Point) -> None:
        """Start a group that shows only what lies inside a rectangle."""
        self._n_clips += 1
        name = f"{self._scope}-{self._n_clips}"
        self.add(
            f'<clipPath id="{name}"><rect x="{number(corner[0])}" '
            f'y="{number(corner[1])}" width="{number(size[0])}" '
            f'height="{number(size[1])}"/></clipPath><g clip-path="url(#{name})">'
        )

    def close_group(self) -> None:
        """End a group."""
        self.add("</g>")

    def svg(self) -> str:
        """The whole drawing as SVG text."""
        return (
            f'<svg xmlns="http://www.w3.org/2000/svg" role="img" '
            f'viewBox="0 0 {number(self.width)} {number(self.height)}" '
            f'width="{number(self.width)}" height="{number(self.height)}" '
            f'font-family="{escape(FONT_STACK)}">'
            f"<title>{escape(self._title)}</title>{''.join(self._parts)}</svg>"
        )


def state_mark(at: Point, state: str, *, size: float = 9.0, known: bool = True) -> str:
    """Markup of a state mark centred at a point; shapes tell the states in grey."""
    x, y = at
    half = size / 2
    fill, tone = STATE_FILL[state], STATE_TONE[state]
    edge = f'stroke="{tone}" stroke-width="1"'
    if state == "settled":
        return _circle(x, y, half - 0.5, f'fill="{fill}" {edge}')
    if state == "open":
        ring = f'fill="{PAPER}" stroke="{tone}" stroke-width="2"'
        return _circle(x, y, half - 1.0, ring)
    if state == "silent":
        return (
            f'<rect x="{number(x - half)}" y="{number(y - 1.5)}" '
            f'width="{number(size)}" height="3" rx="1.5" fill="{fill}" {edge}/>'
        )
    if state == "disputed":
        halves = "".join(
            f"M{number(x + side * 1.1)} {number(y - half)}"
            f"L{number(x + side * (half + 0.6))} {number(y)}"
            f"L{number(x + side * 1.1)} {number(y + half)}Z"
            for side in (-1, 1)
        )
        return f'<path d="{halves}" fill="{fill}" {edge}/>'
    corners = (
        f"M{number(x)} {number(y - half)}L{number(x + half)} {number(y + half - 1)}"
        f"L{number(x - half)} {number(y + half - 1)}Z"
    )
    return f'<path d="{corners}" fill="{"none" if known else fill}" {edge}/>'


def polyline(xs: Sequence[float], ys: Sequence[float]) -> str:
    """Path commands through points; one number in two hundredths of a pixel."""
    pairs = zip(xs, ys, strict=True)
    return "M" + "L".join(f"{number(x)} {number(y)}" for x, y in pairs)


def envelope(
    xs: npt.NDArray[np.float64], ys: npt.NDArray[np.float64], *, per_unit: float = 2.0
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """Curve thinned to its lowest and highest point in every narrow column.

    Nothing that could be seen is lost: a column is half a pixel wide, and both
    extremes stay, in the order in which they came.

    Parameters
    ----------
    xs, ys : numpy.ndarray, shape (n_points,)
        ``xs`` rises or falls steadily.
    per_unit : float
        Columns in one user unit.

    Returns
    -------
    tuple of numpy.ndarray
        Thinned xs and ys; the input itself where it is thin already.
    """
    columns = np.floor(xs * per_unit).astype(np.int64)
    starts = np.concatenate([[0], np.flatnonzero(np.diff(columns)) + 1])
    if xs.size <= 2 * starts.size:
        return xs, ys
    keep: set[int] = {0, xs.size - 1}
    ends = np.concatenate([starts[1:], [xs.size]])
    for start, end in zip(starts.tolist(), ends.tolist(), strict=True):
        piece = ys[start:end]
        keep.update((start + int(piece.argmin()), start + int(piece.argmax())))
    chosen = np.array(sorted(keep))
    return xs[chosen], ys[chosen]


def number(value: float) -> str:
    """Number with at most two decimals, without trailing zeros."""
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def text_width(words: str, size: float) -> float:
    """About how wide a line of text is, on the safe side for sans faces."""
    return size * sum(_advance(character) for character in words)


def _advance(character: str) -> float:
    """Width of a character as a share of the size (common sans metrics)."""
    if character in "ilj.,;:'|()[]′-\u00a0 ":
        return 0.33
    if character in "mwMW@—":
        return 0.90
    return 0.70 if character.isupper() else 0.56


def joined(parts: Iterable[str]) -> str:
    """Path commands joined without blanks."""
    return "".join(parts)


def _circle(x: float, y: float, radius: float, style: str) -> str:
    return f'<circle cx="{number(x)}" cy="{number(y)}" r="{number(radius)}" {style}/>'
