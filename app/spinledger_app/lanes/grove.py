"""Where every claim's tree stands: storeys, crowns, roots and labels; px."""

from __future__ import annotations

import itertools
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from math import inf
from typing import Literal

from spinledger_app.lanes.layout import LaneLayout
from spinledger_app.lanes.scene import LaneScene, TreeShape
from spinledger_app.lanes.shift_map import FOLD_WIDTH_PX, ShiftMap

Style = Literal["stem", "branches", "hedge", "broad", "stump"]

STEM_ONLY_BELOW = 0.5  # px per Hz
LARGE_LEAVES_FROM = 2.5
GAPS_FROM = 5.0
HEDGE_LEAVES = 5
HEDGE_SPACING_PX = 3.0
OPEN_SHORT_PX = 10.0
LABEL_GAP_PX = 10.0
_MOST_STOREYS = 3
_STOREY_TOPS = {1: (0.0,), 2: (0.0, 0.6), 3: (0.0, 0.45, 0.72)}


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacedTree:
    """A tree with its place on the screen.

    Attributes
    ----------
    tree : TreeShape
    stretch : int
    style : Style
    root_x : float
    soil_y : float
    fork_y : float
        Where the stem ends and the first branches begin.
    crown_y : float
        Where the last branches end.
    leaf_y : float
        Foot of the leaves.
    tip_y : float
        Where leaves end: at the measured feet, or short of them.
    is_low : bool
        Not in the uppermost storey: leaf stalks rise through other crowns.
    span : (float, float)
        Left and right end of the crown.
    has_j_labels : bool
    """

    tree: TreeShape
    stretch: int
    style: Style
    root_x: float
    soil_y: float
    fork_y: float
    crown_y: float
    leaf_y: float
    tip_y: float
    is_low: bool
    span: tuple[float, float]
    has_j_labels: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class RootLabel:
    """Words under one root, or a "+n" tag for those that found no room."""

    claims: tuple[str, ...]
    text: str
    caption: str
    x: float
    root_x: float
    width: float

    @property
    def is_tag(self) -> bool:
        """Whether it stands for claims without a label of their own."""
        return not self.caption


@dataclass(frozen=True, slots=True, kw_only=True)
class Grove:
    """All trees and labels of one view."""

    trees: tuple[PlacedTree, ...]
    labels: tuple[RootLabel, ...]
    px_per_hz: float

    def placed(self, claim: str) -> PlacedTree | None:
        """A claim's tree, None where it is not in view."""
        return next((one for one in self.trees if one.tree.claim == claim), None)


def leaf_height(px_per_hz: float) -> float:
    """Length of a leaf: large from 2.5 px/Hz on."""
    return 40.0 if px_per_hz >= LARGE_LEAVES_FROM else 18.0


def leaf_width(px_per_hz: float) -> float:
    """Half-width of the largest leaf."""
    if px_per_hz > GAPS_FROM:
        return 7.0
    return 5.0 if px_per_hz >= LARGE_LEAVES_FROM else 3.6


def plant(
    scene: LaneScene,
    shift_map: ShiftMap,
    layout: LaneLayout,
    label_width: Callable[[TreeShape], float],
    *,
    first: Sequence[str] = (),
) -> Grove:
    """Place the trees of a scene.

    Parameters
    ----------
    label_width : callable
        Width of a tree's label under its root, px.
    first : sequence of str
        Claims whose labels are kept where not all have room.
    """
    px_per_hz = shift_map.px_per_hz(scene.frequency_mhz)
    rough = [
        placed
        for tree in scene.trees
        if (placed := _rough(tree, shift_map, layout, px_per_hz)) is not None
    ]
    storeys, heights = _storeys(rough)
    trees = tuple(
        _settle(one, storeys[i], heights[i], layout, px_per_hz)
        for i, one in enumerate(rough)
    )
    labels = _labels(trees, shift_map, layout, label_width, first)
    return Grove(trees=trees, labels=labels, px_per_hz=px_per_hz)


def _rough(
    tree: TreeShape, shift_map: ShiftMap, layout: LaneLayout, px_per_hz: float
) -> PlacedTree | None:
    stretch = shift_map.stretch_of(tree.root_ppm)
    if stretch is None:
        return None
    root_x = shift_map.x_of(tree.root_ppm, stretch)
    if root_x is None:
        return None
    xs = [shift_map.x_of(leaf.base_ppm, stretch) or 0.0 for leaf in tree.leaves]
    xs += [shift_map.x_of(leaf.tip_ppm, stretch) or 0.0 for leaf in tree.leaves]
    style = _style(tree, sorted(xs[: len(tree.leaves)]), px_per_hz)
    if style in ("stem", "stump"):
        xs = [root_x]
    if style == "broad" and tree.width_hz is not None:
        half = 0.42 * tree.width_hz * px_per_hz
        xs = [root_x - half, root_x + half]
    span = (min([root_x, *xs]) - 3, max([root_x, *xs]) + 3)
    if span[1] < layout.left or span[0] > layout.right:
        return None
    return PlacedTree(
        tree=tree,
        stretch=stretch,
        style=style,
        root_x=root_x,
        soil_y=layout.soil,
        fork_y=layout.soil,
        crown_y=layout.tip,
        leaf_y=layout.tip,
        tip_y=layout.tip,
        is_low=False,
        span=span,
        has_j_labels=px_per_hz >= LARGE_LEAVES_FROM and style == "branches",
    )


def _style(tree: TreeShape, xs: Sequence[float], px_per_hz: float) -> Style:
    if tree.state == "silent":
        return "stump"
    if tree.width_hz is not None and tree.state != "open":
        return "broad"
    if px_per_hz < STEM_ONLY_BELOW:
        return "stem"
    closest = min((b - a for a, b in itertools.pairwise(xs)), default=99.0)
    if len(xs) > HEDGE_LEAVES and closest < HEDGE_SPACING_PX:
        return "hedge"
    return "branches"


def _storeys(placed: Sequence[PlacedTree]) -> tuple[list[int], list[int]]:
    """Storey of every tree (0 is the top), and how many its neighbourhood has."""
    order = sorted(
        range(len(placed)),
        key=lambda i: (-len(placed[i].tree.leaves), placed[i].root_x),
    )
    storeys = [0] * len(placed)
    done: list[int] = []
    for i in order:
        if placed[i].style in ("stem", "stump"):
            continue
        used = {storeys[j] for j in done if _overlap(placed[i], placed[j])}
        storeys[i] = next(s for s in range(len(placed) + 1) if s not in used)
        done.append(i)
    heights = [storey + 1 for storey in storeys]
    for _ in placed:  # a neighbourhood is as high as its highest member
        changed = False
        for i in done:
            for j in done:
                if heights[i] < heights[j] and _overlap(placed[i], placed[j]):
                    heights[i], changed = heights[j], True
        if not changed:
            break
    return storeys, heights


def _overlap(one: PlacedTree, other: PlacedTree) -> bool:
    return one.span[0] < other.span[1] and other.span[0] < one.span[1]


def _settle(
    placed: PlacedTree,
    storey: int,
    n_storeys: int,
    layout: LaneLayout,
    px_per_hz: float,
) -> PlacedTree:
    is_open = placed.tree.state == "open"
    tip = layout.tip + (OPEN_SHORT_PX if is_open else 0.0)
    height = leaf_height(px_per_hz)
    if placed.style == "broad":
        height = 18.0
    leaf_y = tip + height
    if storey >= _MOST_STOREYS:
        return replace(
            placed,
            style="stem",
            fork_y=leaf_y,
            crown_y=leaf_y,
            leaf_y=leaf_y,
            tip_y=tip,
        )
    tops = _STOREY_TOPS[min(n_storeys, _MOST_STOREYS)]
    room = layout.soil - layout.tip
    is_low = storey > 0
    top = layout.tip + tops[storey] * room
    is_last = storey == len(tops) - 1
    bottom = layout.soil if is_last else layout.tip + tops[storey + 1] * room - 10
    stem = 26.0 if placed.has_j_labels else 14.0
    stem = min(stem, 0.35 * (bottom - top))
    crown_y = top + 6 if is_low else leaf_y + (6 if placed.has_j_labels else 2)
    return replace(
        placed,
        fork_y=bottom - stem,
        crown_y=min(crown_y, bottom - stem - 4),
        leaf_y=leaf_y,
        tip_y=tip,
        is_low=is_low,
    )


def _labels(
    trees: Sequence[PlacedTree],
    shift_map: ShiftMap,
    layout: LaneLayout,
    label_width: Callable[[TreeShape], float],
    first: Sequence[str],
) -> tuple[RootLabel, ...]:
    labels: list[RootLabel] = []
    for index in shift_map.visible():
        start, end = shift_map.span(index)
        left, right = max(start, layout.left), min(end, layout.right)
        here = [
            _label(one, label_width)
            for one in trees
            if one.stretch == index and left - 1 <= one.root_x <= right + 1
        ]
        here.sort(key=lambda label: label.root_x)
        over = FOLD_WIDTH_PX / 2 if shift_map.is_folded else 0.0
        labels += _in_room(here, left - over, right + over, first)
    return tuple(labels)


def _label(placed: PlacedTree, width_of: Callable[[TreeShape], float]) -> RootLabel:
    tree = placed.tree
    return RootLabel(
        claims=(tree.claim,),
        text=tree.claim,
        caption=f"{tree.n_protons} H",
        x=placed.root_x,
        root_x=placed.root_x,
        width=width_of(tree),
    )


def _in_room(
    labels: list[RootLabel], left: float, right: float, first: Sequence[str]
) -> list[RootLabel]:
    """Labels side by side; those without room go together into one tag."""
    kept = list(labels)
    dropped: list[RootLabel] = []
    tag_width = 26.0
    while kept and _needed(kept, tag_width if dropped else 0.0) > right - left:
        rooms = _elbow_rooms(kept)
        index = min(
            range(len(kept)), key=lambda i: (kept[i].claims[0] in first, rooms[i])
        )
        dropped.append(kept.pop(index))
    if dropped:
        kept.append(_tag(dropped, tag_width))
        kept.sort(key=lambda label: label.root_x)
    return _spread(kept, left, right)


def _needed(labels: Sequence[RootLabel], tag_width: float) -> float:
    gaps = LABEL_GAP_PX * (len(labels) - (0 if tag_width else 1))
    return sum(one.width for one in labels) + gaps + tag_width


def _elbow_rooms(labels: Sequence[RootLabel]) -> list[float]:
    """Distance of each root from its nearest neighbour; labels in order of roots."""
    xs = [one.root_x for one in labels]
    gaps = [inf, *(b - a for a, b in itertools.pairwise(xs)), inf]
    return [min(pair) for pair in itertools.pairwise(gaps)]


def _tag(dropped: Sequence[RootLabel], width: float) -> RootLabel:
    middle = sum(one.root_x for one in dropped) / len(dropped)
    return RootLabel(
        claims=tuple(claim for one in dropped for claim in one.claims),
        text=f"+{len(dropped)}",
        caption="",
        x=middle,
        root_x=middle,
        width=width,
    )


def _spread(labels: Sequence[RootLabel], left: float, right: float) -> list[RootLabel]:
    """Labels moved apart as little as needed, in order, inside left to right.

    Notes
    -----
    Least squares under an order: with the wanted gaps taken off, the places must
    not fall, and neighbours that would are put to their mean (pool adjacent
    violators); bounds are met by clipping. Ayer et al., Ann. Math. Statist. 26
    (1955) 641-647, doi:10.1214/aoms/1177728423.
    """
    if not labels:
        return []
    offsets = [0.0]
    for one, after in itertools.pairwise(labels):
        offsets.append(offsets[-1] + (one.width + after.width) / 2 + LABEL_GAP_PX)
    blocks: list[tuple[float, int]] = []
    for label, offset in zip(labels, offsets, strict=True):
        mean, count = label.x - offset, 1
        while blocks and blocks[-1][0] > mean:
            before, n_before = blocks.pop()
            mean = (before * n_before + mean * count) / (n_before + count)
            count += n_before
        blocks.append((mean, count))
    low = left + labels[0].width / 2
    high = right - labels[-1].width / 2 - offsets[-1]
    places = [min(max(mean, low), high) for mean, count in blocks for _ in range(count)]
    return [
        replace(label, x=place + offset)
        for label, place, offset in zip(labels, places, offsets, strict=True)
    ]
