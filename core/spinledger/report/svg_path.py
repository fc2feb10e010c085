"""SVG path commands as straight lines and cubic curves; lengths in user units."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

Point = tuple[float, float]
_TOKEN = re.compile(r"[A-Za-z]|-?\d*\.?\d+(?:[eE][-+]?\d+)?")
_COUNTS = {"M": 2, "L": 2, "H": 1, "V": 1, "C": 6, "Q": 4, "Z": 0}
# A quarter circle by one cubic curve, exact to 0.03 % of the radius.
_QUARTER = 0.5522847498


@dataclass(frozen=True, slots=True, kw_only=True)
class Segment:
    """Move, line, cubic curve (two controls and an end), or end of an outline."""

    kind: Literal["M", "L", "C", "Z"]
    points: tuple[Point, ...] = ()


def segments(commands: str) -> Iterator[Segment]:
    """Segments of path commands M, L, H, V, C, Q, Z, absolute or relative.

    Raises
    ------
    ValueError
        If there is another command, or a number too few.
    """
    tokens = _TOKEN.findall(commands)
    at: Point = (0.0, 0.0)
    start = at
    letter, index = "", 0
    while index < len(tokens):
        if tokens[index].isalpha():
            letter = tokens[index]
            index += 1
        elif letter in "Mm":  # further pairs after a move are lines
            letter = "L" if letter == "M" else "l"
        count = _COUNTS.get(letter.upper())
        if count is None or index + count > len(tokens):
            raise ValueError(f"path: {letter!r} is not known or lacks numbers")
        values = [float(one) for one in tokens[index : index + count]]
        index += count
        segment = _segment(letter, values, at)
        if segment.kind == "Z":
            at = start
        else:
            at = segment.points[-1]
            start = at if segment.kind == "M" else start
        yield segment


def segments_of_circle(centre: Point, radii: tuple[float, ...]) -> Iterator[Segment]:
    """Four cubic curves about a centre, with a radius across and one upright."""
    (x, y), (across, upright) = centre, radii
    dx, dy = _QUARTER * across, _QUARTER * upright
    left, right, top, low = x - across, x + across, y - upright, y + upright
    yield Segment(kind="M", points=((right, y),))
    yield Segment(kind="C", points=((right, y + dy), (x + dx, low), (x, low)))
    yield Segment(kind="C", points=((x - dx, low), (left, y + dy), (left, y)))
    yield Segment(kind="C", points=((left, y - dy), (x - dx, top), (x, top)))
    yield Segment(kind="C", points=((x + dx, top), (right, y - dy), (right, y)))
    yield Segment(kind="Z")


def _segment(letter: str, values: list[float], at: Point) -> Segment:
    kind = letter.upper()
    base = at if letter.islower() else (0.0, 0.0)
    if kind == "Z":
        return Segment(kind="Z")
    if kind == "H":
        return Segment(kind="L", points=((base[0] + values[0], at[1]),))
    if kind == "V":
        return Segment(kind="L", points=((at[0], base[1] + values[0]),))
    points = [
        (base[0] + x, base[1] + y)
        for x, y in zip(values[::2], values[1::2], strict=True)
    ]
    if kind == "Q":
        return Segment(kind="C", points=_raised(at, points[0], points[1]))
    return Segment(kind="M" if kind == "M" else "L" if kind == "L" else "C",
                   points=tuple(points))  # fmt: skip


def _raised(start: Point, control: Point, end: Point) -> tuple[Point, Point, Point]:
    """A quadratic curve as the same cubic one."""
    first = tuple(a + 2 / 3 * (c - a) for a, c in zip(start, control, strict=True))
    second = tuple(b + 2 / 3 * (c - b) for b, c in zip(end, control, strict=True))
    return (first[0], first[1]), (second[0], second[1]), end
