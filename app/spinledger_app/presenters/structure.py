"""The drawn structure as plain values: atoms, bonds, and where claims' tags go.

Coordinates of a drawing are in bond lengths, y upwards; of tags in logical px.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

_Floats = npt.NDArray[np.float64]
_Box = tuple[float, float, float, float]

_ANGLES = 24
_RADII_PX = (24.0, 34.0, 46.0, 60.0, 78.0, 98.0)
_TAG_HEIGHT_PX = 20.0
_STACK_PX = 24.0
_EDGE_PX = 4.0
_IN_RING_COST = 30.0
_POINTS_ON_BOND = 13
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
        _box(x, y, max(label_width(atom), 6.0) + 6, 20.0)
        for (x, y), atom in zip(places, drawing.atoms, strict=True)
        if atom.symbol
    ]
    segments = [(places[b.start], places[b.end]) for b in drawing.bonds]
    rings = [[places[i] for i in ring] for ring in _rings(drawing)]
    blocked = _Blocked(texts, segments, rings)
    placed: list[PlacedTag] = []
    for wish in wishes:
        tag = _best_place(
            drawing, places, wish, size=size, height=height, blocked=blocked
        )
        right, bottom = tag.left + tag.width, tag.top + tag.height
        blocked.add((tag.left, tag.top, right, bottom), tag.atom)
        placed.append(tag)
    return tuple(placed)


class _Blocked:
    """What a tag must not lie over: texts, bonds, rings and the tags before it."""

    def __init__(
        self,
        texts: Sequence[_Box],
        segments: Sequence[tuple[tuple[float, float], tuple[float, float]]],
        rings: Sequence[Sequence[tuple[float, float]]],
    ) -> None:
        self.texts = np.array(texts, dtype=np.float64).reshape(-1, 4)
        ends = np.array(segments, dtype=np.float64).reshape(-1, 2, 2)
        shares = np.linspace(0.0, 1.0, _POINTS_ON_BOND)[None, :, None]
        points = ends[:, :1] + (ends[:, 1:] - ends[:, :1]) * shares
        self.bond_points = points.reshape(-1, 2)
        self.rings = [np.array(ring, dtype=np.float64) for ring in rings]
        self.tags = np.empty((0, 4))
        self.atoms: list[int] = []

    def add(self, box: _Box, atom: int) -> None:
        """Count a tag that was placed as blocked."""
        self.tags = np.vstack([self.tags, box])
        self.atoms.append(atom)

    def costs(self, boxes: _Floats, size: tuple[float, float]) -> _Floats:
        """Cost of every box, shape (n, 4) -> (n,): what it covers, what sticks out."""
        left, top, right, bottom = boxes.T
        outside = (
            np.maximum(0.0, _EDGE_PX - left)
            + np.maximum(0.0, _EDGE_PX - top)
            + np.maximum(0.0, right - size[0] + _EDGE_PX)
            + np.maximum(0.0, bottom - size[1] + _EDGE_PX)
        )
        grown = boxes + np.array([-3.0, -3.0, 3.0, 3.0])
        cost: _Floats = 60.0 * outside
        cost += 2.0 * _overlaps(boxes, self.texts)
        cost += 4.0 * _overlaps(grown, self.tags)
        cost += 40.0 * _n_inside(grown, self.bond_points)
        middles = np.column_stack([(left + right) / 2, (top + bottom) / 2])
        for ring in self.rings:
            cost += _IN_RING_COST * _are_inside(middles, ring)
        return cost


def _box(x: float, y: float, width: float, height: float) -> _Box:
    """Left, top, right and bottom about a middle."""
    return x - width / 2, y - height / 2, x + width / 2, y + height / 2


def _overlaps(boxes: _Floats, others: _Floats) -> _Floats:
    """Area that each box shares with all others together, px²."""
    wide = np.minimum(boxes[:, None, 2], others[None, :, 2]) - np.maximum(
        boxes[:, None, 0], others[None, :, 0]
    )
    high = np.minimum(boxes[:, None, 3], others[None, :, 3]) - np.maximum(
        boxes[:, None, 1], others[None, :, 1]
    )
    shared = np.where((wide > 0) & (high > 0), wide * high, 0.0)
    return np.asarray(shared.sum(axis=1))


def _n_inside(boxes: _Floats, points: _Floats) -> _Floats:
    """How many of the points lie in each box."""
    x, y = points[None, :, 0], points[None, :, 1]
    inside = (boxes[:, None, 0] < x) & (x < boxes[:, None, 2])
    inside &= (boxes[:, None, 1] < y) & (y < boxes[:, None, 3])
    return np.asarray(inside.sum(axis=1), dtype=np.float64)


def _are_inside(points: _Floats, ring: _Floats) -> _Floats:
    """1 for each point in a polygon, else 0 (even-odd rule)."""
    x, y = points[:, None, 0], points[:, None, 1]
    x0, y0 = ring[None, :, 0], ring[None, :, 1]
    after = np.roll(ring, -1, axis=0)
    x1, y1 = after[None, :, 0], after[None, :, 1]
    crosses = (y0 > y) != (y1 > y)
    rise = np.where(y1 == y0, 1.0, y1 - y0)
    is_left = x < x0 + (y - y0) / rise * (x1 - x0)
    return np.asarray((crosses & is_left).sum(axis=1) % 2, dtype=np.float64)


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
        stacked = blocked.atoms.count(atom)
        offsets = np.array(_offsets(free, wish.width, height, stacked))
        reach = np.hypot(offsets[:, 0], offsets[:, 1])
        middles = offsets + np.array([x, y])
        half = np.array([wish.width / 2, height / 2])
        boxes = np.hstack([middles - half, middles + half])
        boxes, moved = _inside(boxes, size)
        cost: _Floats = 0.9 * np.arange(len(boxes)) + 0.25 * reach + 0.5 * moved
        cost += blocked.costs(boxes, size)
        index = int(np.argmin(cost))
        if best is None or cost[index] < best[0]:
            best = float(cost[index]), PlacedTag(
                claim=wish.claim, state=wish.state, left=round(boxes[index, 0]),
                top=round(boxes[index, 1]), width=wish.width, height=height, atom=atom,
                is_led=bool(reach[index] > 46 + wish.width / 3),
            )  # fmt: skip
    if best is None:
        raise ValueError(f"atoms: {wish.claim} names no atom of the drawing")
    return best[1]


def _inside(boxes: _Floats, size: tuple[float, float]) -> tuple[_Floats, _Floats]:
    """Boxes pushed into the panel, and how far each was pushed."""
    left, top, right, bottom = boxes.T
    over_right = np.minimum(0.0, size[0] - _EDGE_PX - right)
    aside = np.where(left < _EDGE_PX, _EDGE_PX - left, over_right)
    over_bottom = np.minimum(0.0, size[1] - _EDGE_PX - bottom)
    down = np.where(top < _EDGE_PX, _EDGE_PX - top, over_bottom)
    pushed = boxes + np.column_stack([aside, down, aside, down])
    return pushed, np.abs(aside) + np.abs(down)


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
