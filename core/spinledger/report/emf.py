"""Windows Enhanced Metafile from the report's own SVG: vector figures for Word.

Only what the report draws is understood (paths, rectangles, circles, lines, text,
rectangular clips); anything else raises ``ValueError``, so that nothing is lost
unseen. Lengths in CSS pixels; the file counts in twentieths of a pixel.

References
----------
.. [1] [MS-EMF] Enhanced Metafile Format, record types and layouts, from memory.
"""

from __future__ import annotations

import re
import struct
import xml.etree.ElementTree as ET
from collections.abc import Iterator
from dataclasses import dataclass, replace

from spinledger.report.palette import INK
from spinledger.report.svg_path import Segment, segments, segments_of_circle

_UNITS = 20.0
_PX_PER_MM = 96 / 25.4
_FACE = "Arial"
_NAMESPACE = re.compile(r"^\{[^}]*\}")
_STYLE = re.compile(r"([\w-]+)\s*:\s*([^;]+)")
_CLIP = re.compile(r"url\(#([^)]+)\)")
_PAINT = (
    "fill", "stroke", "stroke-width", "fill-opacity", "opacity", "font-size",
    "font-weight", "text-anchor", "stroke-opacity",
)  # fmt: skip
# Record numbers of [1], section 2.1.1.
_HEADER, _EOF = 1, 14
_SETWINDOWEXT, _SETWINDOWORG, _SETVIEWPORTEXT, _SETVIEWPORTORG = 9, 10, 11, 12
_SETMAPMODE, _SETBKMODE, _SETPOLYFILLMODE = 17, 18, 19
_SETTEXTALIGN, _SETTEXTCOLOR = 22, 24
_MOVETO, _INTERSECTCLIP, _SAVEDC, _RESTOREDC = 27, 30, 33, 34
_SELECT, _CREATEBRUSH, _DELETE = 37, 39, 40
_LINETO, _BEGINPATH, _ENDPATH, _CLOSE = 54, 59, 60, 61
_FILLPATH, _STROKEANDFILL, _STROKEPATH = 62, 63, 64
_FONT, _TEXT, _BEZIERTO, _PEN = 82, 84, 5, 95
_NULL_BRUSH, _NULL_PEN = 0x80000005, 0x80000008
_ANISOTROPIC, _TRANSPARENT, _WINDING = 8, 1, 2
_ALIGN = {"start": 0, "end": 2, "middle": 6}
_BASELINE = 24
_OBJECT = 1


def emf_of_svg(svg: str) -> bytes:
    """The drawing of some SVG text of this program as an enhanced metafile.

    Parameters
    ----------
    svg : str

    Returns
    -------
    bytes

    Raises
    ------
    ValueError
        If the drawing holds an element or a path command that is not known here.
    """
    root = ET.fromstring(svg)
    width, height = float(root.attrib["width"]), float(root.attrib["height"])
    writer = _Writer()
    writer.set_up(width, height)
    _draw(root, _Style(), _clips(root), writer)
    return writer.finish(width, height)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Style:
    """What a shape inherits and sets."""

    fill: str = "#000000"
    stroke: str = "none"
    stroke_width: float = 1.0
    fill_opacity: float = 1.0
    opacity: float = 1.0
    stroke_opacity: float = 1.0
    font_size: float = 11.0
    font_weight: int = 400
    text_anchor: str = "start"

    def over(self, element: ET.Element) -> _Style:
        """Style of an element inside one of this style."""
        found = {k: v for k, v in element.attrib.items() if k in _PAINT}
        for name, value in _STYLE.findall(element.attrib.get("style", "")):
            if name in _PAINT:
                found[name] = value.strip()
        changes: dict[str, object] = {}
        for name, value in found.items():
            field = name.replace("-", "_")
            kind = type(getattr(self, field))
            text = value.removesuffix("px")
            changes[field] = kind(text) if kind is not str else value
        return replace(self, **changes)  # type: ignore[arg-type]

    @property
    def paper_fill(self) -> tuple[int, int, int] | None:
        """Fill on white paper; metafiles know no half transparent brush."""
        return _mixed(self.fill, self.fill_opacity * self.opacity)

    @property
    def paper_stroke(self) -> tuple[int, int, int] | None:
        """Stroke on white paper."""
        return _mixed(self.stroke, self.stroke_opacity * self.opacity)


def _mixed(colour: str, opacity: float) -> tuple[int, int, int] | None:
    if colour == "none" or opacity == 0:
        return None
    name = INK if colour == "currentColor" else colour
    if not re.fullmatch(r"#[0-9A-Fa-f]{6}", name):
        raise ValueError(f"svg: a colour is not #RRGGBB but {colour!r}")
    parts = [int(name[i : i + 2], 16) for i in (1, 3, 5)]
    red, green, blue = (round(255 - opacity * (255 - one)) for one in parts)
    return red, green, blue


def _clips(root: ET.Element) -> dict[str, tuple[float, float, float, float]]:
    """Clip rectangles by name: left, top, right, bottom."""
    found = {}
    for element in root.iter():
        if _tag(element) == "clipPath":
            x, y, wide, high = _numbers(element[0], "x", "y", "width", "height")
            found[element.attrib["id"]] = (x, y, x + wide, y + high)
    return found


def _draw(
    element: ET.Element,
    style: _Style,
    clips: dict[str, tuple[float, float, float, float]],
    writer: _Writer,
) -> None:
    for child in element:
        tag = _tag(child)
        own = style.over(child)
        if tag in ("title", "desc", "clipPath", "metadata"):
            continue
        if tag in ("g", "svg"):
            clip = _CLIP.fullmatch(child.attrib.get("clip-path", ""))
            if clip:
                writer.open_clip(clips[clip[1]])
            _draw(child, own, clips, writer)
            if clip:
                writer.close_clip()
        elif tag == "text":
            x, y = _numbers(child, "x", "y")
            writer.text((x, y), "".join(child.itertext()), own)
        else:
            writer.shape(list(_shape(child, tag)), own)


def _shape(element: ET.Element, tag: str) -> Iterator[Segment]:
    if tag == "path":
        yield from segments(element.attrib.get("d", ""))
    elif tag == "rect":
        x, y, wide, high = _numbers(element, "x", "y", "width", "height")
        yield from segments(f"M{x} {y}h{wide}v{high}h{-wide}Z")
    elif tag in ("circle", "ellipse"):
        x, y = _numbers(element, "cx", "cy")
        names = ("r", "r") if tag == "circle" else ("rx", "ry")
        yield from segments_of_circle((x, y), tuple(_numbers(element, *names)))
    elif tag == "line":
        x0, y0, x1, y1 = _numbers(element, "x1", "y1", "x2", "y2")
        yield from segments(f"M{x0} {y0}L{x1} {y1}")
    elif tag == "polygon":
        yield from segments(f"M{element.attrib['points']}Z")
    else:
        raise ValueError(f"svg: the element {tag} is not known")


def _numbers(element: ET.Element, *names: str) -> list[float]:
    return [float(element.attrib.get(name, "0").removesuffix("px")) for name in names]


def _tag(element: ET.Element) -> str:
    return _NAMESPACE.sub("", element.tag)


class _Writer:
    """Gathers records; finish puts the header in front."""

    def __init__(self) -> None:
        self._records: list[bytes] = []

    def _add(self, kind: int, content: bytes = b"") -> None:
        padded = content + b"\0" * (-len(content) % 4)
        self._records.append(struct.pack("<II", kind, 8 + len(padded)) + padded)

    def set_up(self, width: float, height: float) -> None:
        """Axes in twentieths of a pixel, text on the baseline, no background."""
        self._add(_SETMAPMODE, struct.pack("<I", _ANISOTROPIC))
        self._add(_SETWINDOWORG, struct.pack("<ii", 0, 0))
        extent = struct.pack("<ii", _unit(width), _unit(height))
        self._add(_SETWINDOWEXT, extent)
        self._add(_SETVIEWPORTORG, struct.pack("<ii", 0, 0))
        self._add(_SETVIEWPORTEXT, struct.pack("<ii", round(width), round(height)))
        self._add(_SETBKMODE, struct.pack("<I", _TRANSPARENT))
        self._add(_SETPOLYFILLMODE, struct.pack("<I", _WINDING))

    def open_clip(self, box: tuple[float, float, float, float]) -> None:
        """Show only what lies inside a rectangle, until it is closed."""
        self._add(_SAVEDC)
        self._add(_INTERSECTCLIP, struct.pack("<iiii", *(_unit(one) for one in box)))

    def close_clip(self) -> None:
        """End of a clip."""
        self._add(_RESTOREDC, struct.pack("<i", -1))

    def shape(self, parts: list[Segment], style: _Style) -> None:
        """A path, filled, stroked, or both."""
        fill, stroke = style.paper_fill, style.paper_stroke
        has_area = any(one.kind == "Z" for one in parts) or fill is not None
        fill = fill if has_area else None
        if not parts or (fill is None and stroke is None):
            return
        self._brush(fill)
        self._pen(stroke, style.stroke_width)
        self._add(_BEGINPATH)
        for part in parts:
            self._segment(part)
        self._add(_ENDPATH)
        kind = _STROKEPATH if fill is None else _FILLPATH
        if fill is not None and stroke is not None:
            kind = _STROKEANDFILL
        self._add(kind, struct.pack("<iiii", 0, 0, -1, -1))
        for number in (_OBJECT, _OBJECT + 1):
            self._release(number)

    def _segment(self, part: Segment) -> None:
        if part.kind == "Z":
            self._add(_CLOSE)
            return
        points = b"".join(
            struct.pack("<ii", _unit(x), _unit(y)) for x, y in part.points
        )
        if part.kind == "C":
            bounds = struct.pack("<iiiiI", 0, 0, -1, -1, len(part.points))
            self._add(_BEZIERTO, bounds + points)
        else:
            self._add(_MOVETO if part.kind == "M" else _LINETO, points)

    def _brush(self, colour: tuple[int, int, int] | None) -> None:
        if colour is None:
            self._add(_SELECT, struct.pack("<I", _NULL_BRUSH))
            return
        self._add(_CREATEBRUSH, struct.pack("<IIII", _OBJECT, 0, _colour(colour), 0))
        self._add(_SELECT, struct.pack("<I", _OBJECT))

    def _pen(self, colour: tuple[int, int, int] | None, width: float) -> None:
        if colour is None:
            self._add(_SELECT, struct.pack("<I", _NULL_PEN))
            return
        # Geometric, solid, round ends and joins.
        pen = struct.pack(
            "<IIIIIIIIIII", _OBJECT + 1, 0, 0, 0, 0,
            0x10000, max(1, _unit(width)), 0, _colour(colour), 0, 0,
        )  # fmt: skip
        self._add(_PEN, pen)
        self._add(_SELECT, struct.pack("<I", _OBJECT + 1))

    def _release(self, number: int) -> None:
        stock = _NULL_BRUSH if number == _OBJECT else _NULL_PEN
        self._add(_SELECT, struct.pack("<I", stock))
        self._add(_DELETE, struct.pack("<I", number))

    def text(self, at: tuple[float, float], words: str, style: _Style) -> None:
        """A line of text on its baseline."""
        colour = style.paper_fill
        if colour is None or not words:
            return
        face = _FACE.encode("utf-16-le").ljust(64, b"\0")
        font = struct.pack(
            "<Iiiiii8B", _OBJECT + 2, -_unit(style.font_size), 0, 0, 0,
            style.font_weight, 0, 0, 0, 1, 0, 0, 0, 0,
        )  # fmt: skip
        self._add(_FONT, font + face + b"\0" * 228)
        self._add(_SELECT, struct.pack("<I", _OBJECT + 2))
        align = _ALIGN[style.text_anchor] | _BASELINE
        self._add(_SETTEXTALIGN, struct.pack("<I", align))
        self._add(_SETTEXTCOLOR, struct.pack("<I", _colour(colour)))
        encoded = words.encode("utf-16-le")
        head = struct.pack(
            "<iiiiIffiiIIIiiiiI", 0, 0, -1, -1, 2, 1.0, 1.0,
            _unit(at[0]), _unit(at[1]), len(encoded) // 2, 76, 0, 0, 0, -1, -1, 0,
        )  # fmt: skip
        self._add(_TEXT, head + encoded)
        self._add(_SELECT, struct.pack("<I", 0x8000000D))  # the stock system font
        self._add(_DELETE, struct.pack("<I", _OBJECT + 2))

    def finish(self, width: float, height: float) -> bytes:
        """All records behind their header."""
        self._add(_EOF, struct.pack("<III", 0, 16, 20))
        body = b"".join(self._records)
        pixels = (round(width), round(height))
        hundredths_mm = [round(100 * one / _PX_PER_MM) for one in (width, height)]
        # The reference device has 96 pixels an inch, 100 of them each way.
        device_mm = [round(1000 / _PX_PER_MM)] * 2
        header = struct.pack(
            "<IIiiiiiiiiIIIIHHIIIiiiiIIIii", _HEADER, 108,
            0, 0, pixels[0] - 1, pixels[1] - 1, 0, 0, *hundredths_mm,
            0x464D4520, 0x10000, 108 + len(body), len(self._records) + 1,
            _OBJECT + 3, 0, 0, 0, 0, 1000, 1000, *device_mm,
            0, 0, 0, *(1000 * one for one in device_mm),
        )  # fmt: skip
        return header + body


def _unit(value: float) -> int:
    return round(value * _UNITS)


def _colour(parts: tuple[int, int, int]) -> int:
    red, green, blue = parts
    return red | green << 8 | blue << 16
