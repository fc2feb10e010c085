"""The drawn structure as plain values: atoms, bonds, and where claims' tags go.

Coordinates of a drawing are in bond lengths, y upwards; of tags in logical px.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

_ANGLES = 24
_RADII_PX = (24.0, 34.0, 46.0, 60.0, 78.0, 98.0)
_TAG_HEIGHT_PX = 20.0
_STACK_PX = 24.0
_EDGE_PX = 4.0
_IN_RING_COST = 30.0
_LARGEST_RING = 9


@dataclass(frozen=True, slots=True, kw_only=True)
class DrawnAtom:
    """A heavy atom: place, and the text where it is not a bare carbon.

    ``hydrogens`` is what stands at its free side: "H", "H2", or "".
    """

    x: float
    y: float
    symbol: str = ""
    hydrogens: str = ""
    charge: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class DrawnBond:
    """A bond: 1 to 3 lines, or a wedge from its narrow end at ``start``.

    ``inward`` is the side (+1 left, -1 right of start to end) on which the
    second line of a ring's double bond lies, 0 for both sides alike.
    """

    start: int
    end: int
    order: int = 1
    wedge: str = ""
    inward: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Drawing:
    """A structure ready to be painted."""

    atoms: tuple[DrawnAtom, ...]
    bonds: tuple[DrawnBond, ...]
    formula: str = ""
    mass: str = ""
    stereo: str = ""

    @property
    def bounds(self) -> tuple[float, float, float, float]:
        """Smallest x and y, largest x and y; bond lengths."""
        xs = [atom.x for atom in self.atoms] or [0.0]
        ys = [atom.y for atom in self.atoms] or [0.0]
        return min(xs), min(ys), max(xs), max(ys)


@dataclass(frozen=True, slots=True, kw_only=True)
class TagWish:
    """A claim's tag that wants to stand near one of its atoms."""

    claim: str
    state: str
    atoms: tuple[int, ...]
    width: float


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacedTag:
    """A tag at its place, with a leader where it stands far from its atom."""

    claim: str
    state: str
    left: float
    top: float
    width: float
    height: float
    atom: int
    is_led: bool

    @property
    def centre(self) -> tuple[float, float]:
        """Middle of the tag."""
        return self.left + self.width / 2, self.top + self.height / 2


def fitted(
    drawing: Drawing,
    room: tuple[float, float, float, float],
    *,
    longest_px: float = 42.0,
) -> tuple[list[tuple[float, float]], float]:
    """Places of the atoms in a rectangle (left, top, width, height), and the scale.

    The longest bond is at most ``longest_px``.
    """
    left, top, width, height = room
    x0, y0, x1, y1 = drawing.bounds
    scale = min(
        longest_px,
        width / max(x1 - x0, 1e-6),
        height / max(y1 - y0, 1e-6),
    )
    cx, cy = (x0 + x1) / 2, (y0 + y1) / 2
    middle_x, middle_y = left + width / 2, top + height / 2
    places = [
        (middle_x + (atom.x - cx) * scale, middle_y - (atom.y - cy) * scale)
        for atom in drawing.atoms
    ]
    return places, scale


def place_tags(
    drawing: Drawing,
    places: Sequence[tuple[float, float]],
    wishes: Sequence[TagWish],
    *,
    size: tuple[float, float],
    height: float = _TAG_HEIGHT_PX,
    label_width: Callable[[DrawnAtom], float],
) -> tuple[PlacedTag, ...]:
    """Tags outside the skeleton, none over a bond, an atom's text or another tag.

    Each tag tries the widest free angle of its atom first, then other angles,
    then further out; several tags of one atom stack downwards.

    Parameters
    ----------
    places : sequence of (x, y)
        Of the atoms, px.
    size : (width, height)
        Of the panel.
    label_width : callable
        Width of an atom's text, px.
    """
    texts = [
        _Box.about(x, y, max(label_width(atom), 6.0) + 6, 20.0)
        for (x, y), atom in zip(places, drawing.atoms, strict=True)
        if atom.symbol
    ]
    segments = [(places[b.start], places[b.end]) for b in drawing.bonds]
    rings = [[places[i] for i in ring] for ring in _rings(drawing)]
    placed: list[PlacedTag] = []
    for wish in wishes:
        tag = _best_place(
            drawing, places, wish, size=size, height=height,
            blocked=(texts, segments, placed, rings),
        )  # fmt: skip
        placed.append(tag)
    return tuple(placed)


@dataclass(frozen=True, slots=True)
class _Box:
    left: float
    top: float
    right: float
    bottom: float

    @classmethod
    def about(cls, x: float, y: float, width: float, height: float) -> _Box:
        return cls(x - width / 2, y - height / 2, x + width / 2, y + height / 2)

    def overlap(self, other: _Box) -> float:
        wide = min(self.right, other.right) - max(self.left, other.left)
        high = min(self.bottom, other.bottom) - max(self.top, other.top)
        return wide * high if wide > 0 and high > 0 else 0.0


_Blocked = tuple[
    list[_Box],
    list[tuple[tuple[float, float], tuple[float, float]]],
    list[PlacedTag],
    list[list[tuple[float, float]]],
]


def _best_place(
    drawing: Drawing,
    places: Sequence[tuple[float, float]],
    wish: TagWish,
    *,
    size: tuple[float, float],
    height: float,
    blocked: _Blocked,
) -> PlacedTag:
    best: tuple[float, PlacedTag] | None = None
    for atom in wish.atoms or (0,):
        if atom >= len(places):
            continue
        x, y = places[atom]
        free = _widest_free_angle(drawing, places, atom)
        stacked = sum(one.atom == atom for one in blocked[2])
        for rank, (dx, dy) in enumerate(_offsets(free, wish.width, height, stacked)):
            least = 0.9 * rank + 0.25 * math.hypot(dx, dy)
            if best is not None and least >= best[0]:
                if 0.9 * rank >= best[0]:
                    break  # whatever comes is worse, however free its place is
                continue
            box, moved = _inside(_Box.about(x + dx, y + dy, wish.width, height), size)
            cost = least + 0.5 * moved + _cost(box, size, blocked)
            if best is None or cost < best[0]:
                is_led = math.hypot(dx, dy) > 46 + wish.width / 3
                best = cost, PlacedTag(
                    claim=wish.claim, state=wish.state, left=round(box.left),
                    top=round(box.top), width=wish.width, height=height, atom=atom,
                    is_led=is_led,
                )  # fmt: skip
    if best is None:
        raise ValueError(f"atoms: {wish.claim} names no atom of the drawing")
    return best[1]


def _inside(box: _Box, size: tuple[float, float]) -> tuple[_Box, float]:
    """Box pushed into the panel, and how far it was pushed."""
    right, down = 0.0, 0.0
    if box.left < _EDGE_PX:
        right = _EDGE_PX - box.left
    elif box.right > size[0] - _EDGE_PX:
        right = size[0] - _EDGE_PX - box.right
    if box.top < _EDGE_PX:
        down = _EDGE_PX - box.top
    elif box.bottom > size[1] - _EDGE_PX:
        down = size[1] - _EDGE_PX - box.bottom
    pushed = _Box(
        box.left + right, box.top + down, box.right + right, box.bottom + down
    )
    return pushed, abs(right) + abs(down)


def _offsets(
    free: float, width: float, height: float, stacked: int
) -> list[tuple[float, float]]:
    """Centres to try, nearest wish first, relative to the atom."""
    offsets = []
    for radius in _RADII_PX:
        for step in range(_ANGLES):
            turn = (step + 1) // 2 * (1 if step % 2 else -1)
            angle = free + turn * 2 * math.pi / _ANGLES
            # The tag's own size is added along the direction, so that it clears.
            reach_x = radius * 0.85 + width / 2 * abs(math.cos(angle))
            dx = math.cos(angle) * reach_x
            dy = -math.sin(angle) * (radius + (height - 20) / 2)
            offsets.append((dx, dy))
    if stacked:
        down = offsets[0][1] + _STACK_PX * stacked
        offsets.insert(0, (offsets[0][0], down))
    return offsets


def _widest_free_angle(
    drawing: Drawing, places: Sequence[tuple[float, float]], atom: int
) -> float:
    """Middle of the widest gap between the bonds of an atom, radians, y upwards."""
    x, y = places[atom]
    angles = []
    for bond in drawing.bonds:
        if atom in (bond.start, bond.end):
            other = bond.end if bond.start == atom else bond.start
            angles.append(math.atan2(-(places[other][1] - y), places[other][0] - x))
    if not angles:
        return math.pi / 2
    angles.sort()
    gaps = [
        (after - before, before)
        for before, after in zip(
            angles, [*angles[1:], angles[0] + 2 * math.pi], strict=True
        )
    ]
    width, start = max(gaps)
    return start + width / 2


def _cost(box: _Box, size: tuple[float, float], blocked: _Blocked) -> float:
    texts, segments, placed, rings = blocked
    outside = (
        max(0.0, 4 - box.left)
        + max(0.0, 4 - box.top)
        + max(0.0, box.right - size[0] + 4)
        + max(0.0, box.bottom - size[1] + 4)
    )
    cost = 60.0 * outside
    for text in texts:
        cost += 2.0 * box.overlap(text)
    grown = _Box(box.left - 3, box.top - 3, box.right + 3, box.bottom + 3)
    for tag in placed:
        other = _Box(tag.left, tag.top, tag.left + tag.width, tag.top + tag.height)
        cost += 4.0 * grown.overlap(other)
    for (x0, y0), (x1, y1) in segments:
        hits = 0
        for i in range(13):
            x, y = x0 + (x1 - x0) * i / 12, y0 + (y1 - y0) * i / 12
            if grown.left < x < grown.right and grown.top < y < grown.bottom:
                hits += 1
        cost += 40.0 * hits
    middle = ((box.left + box.right) / 2, (box.top + box.bottom) / 2)
    cost += _IN_RING_COST * sum(_is_inside(middle, ring) for ring in rings)
    return cost


def _rings(drawing: Drawing) -> list[list[int]]:
    """Shortest ring through every bond, as atoms in order; chains give none."""
    neighbours: dict[int, list[int]] = {}
    for bond in drawing.bonds:
        neighbours.setdefault(bond.start, []).append(bond.end)
        neighbours.setdefault(bond.end, []).append(bond.start)
    rings: dict[frozenset[int], list[int]] = {}
    for bond in drawing.bonds:
        path = _way_round(neighbours, bond.start, bond.end)
        if path:
            rings[frozenset(path)] = path
    return list(rings.values())


def _way_round(
    neighbours: dict[int, list[int]], start: int, end: int
) -> list[int] | None:
    """Shortest path from one end of a bond to the other without the bond."""
    paths = [[start]]
    seen = {start}
    for _ in range(_LARGEST_RING):
        longer = []
        for path in paths:
            for atom in neighbours[path[-1]]:
                if atom == end and len(path) > 1:
                    return [*path, end]
                if atom not in seen and atom != end:
                    seen.add(atom)
                    longer.append([*path, atom])
        paths = longer
    return None


def _is_inside(point: tuple[float, float], ring: Sequence[tuple[float, float]]) -> bool:
    """Whether a point lies in a polygon (even-odd rule)."""
    x, y = point
    inside = False
    for (x0, y0), (x1, y1) in zip(ring, [*ring[1:], ring[0]], strict=True):
        crosses = (y0 > y) != (y1 > y)
        if crosses and x < x0 + (y - y0) / (y1 - y0) * (x1 - x0):
            inside = not inside
    return inside
