"""What lies under the mouse in the lanes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from spinledger_app.lanes.claims_layer import BranchHandle
from spinledger_app.lanes.grove import Grove, PlacedTree
from spinledger_app.lanes.layout import LaneLayout
from spinledger_app.lanes.scene import LaneScene
from spinledger_app.lanes.shift_map import ShiftMap

Kind = Literal["empty", "signal", "root", "branch", "tree", "fold", "border"]

_HANDLE_PX = 12.0
_BRANCH_REACH_PX = 5.0
_TREE_REACH_PX = 6.0
_BORDER_PX = 4.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Target:
    """One thing under the mouse: a claim's root, a branch, a signal, a fold.

    ``claim`` and ``level`` for trees, ``signal`` for signals and strays,
    ``index`` for folds and lane borders, ``fold_ppm`` (low, high) for what a
    fold hides.
    """

    kind: Kind
    claim: str | None = None
    level: int = -1
    signal: str | None = None
    index: int = -1
    fold_ppm: tuple[float, float] | None = None


NOTHING = Target(kind="empty")


def border_at(y: float, layout: LaneLayout) -> int | None:
    """Lane border under a place: 0 below Evidence, 1 below Claims."""
    for index, edge in enumerate((layout.seam + 4, layout.claims_bottom)):
        if abs(y - edge) <= _BORDER_PX:
            return index
    return None


def target_at(  # noqa: PLR0913 - a place and the whole view
    x: float,
    y: float,
    *,
    scene: LaneScene,
    shift_map: ShiftMap,
    layout: LaneLayout,
    grove: Grove,
    handles: Sequence[BranchHandle],
) -> Target:
    """What is under (x, y); roots come before branches, branches before crowns."""
    if x < layout.left - 2 or x > layout.right + 2:
        border = border_at(y, layout)
        if border is not None and x < layout.left:
            return Target(kind="border", index=border)
        return NOTHING
    fold = shift_map.fold_at(x)
    if fold is not None:
        hidden = (
            shift_map.stretches[fold + 1].high_ppm,
            shift_map.stretches[fold].low_ppm,
        )
        return Target(kind="fold", index=fold, fold_ppm=hidden)
    if layout.seam - 2 < y < layout.claims_bottom:
        return _in_claims(x, y, layout, grove, handles)
    if y <= layout.seam - 2:
        return _in_evidence(x, scene, shift_map)
    return NOTHING


def _in_evidence(x: float, scene: LaneScene, shift_map: ShiftMap) -> Target:
    shift = shift_map.ppm_at(x)
    mark = None if shift is None else scene.signal_at(shift)
    if mark is None:
        return NOTHING
    claim = mark.claims[0] if len(mark.claims) == 1 else None
    return Target(kind="signal", signal=mark.key, claim=claim)


def _in_claims(
    x: float,
    y: float,
    layout: LaneLayout,
    grove: Grove,
    handles: Sequence[BranchHandle],
) -> Target:
    for label in grove.labels:
        is_beside = abs(x - label.x) <= max(label.width / 2 + 4, _HANDLE_PX)
        if not label.is_tag and is_beside and y > layout.soil + 8:
            return Target(kind="tree", claim=label.claims[0])
    if abs(y - layout.soil) <= _HANDLE_PX:
        near = [one for one in grove.trees if abs(one.root_x - x) <= _HANDLE_PX]
        if near:
            closest = min(near, key=lambda one: abs(one.root_x - x))
            return Target(kind="root", claim=closest.tree.claim)
    for handle in handles:
        if handle.upper_y < y < handle.lower_y and _on_branch(x, y, handle):
            return Target(kind="branch", claim=handle.claim, level=handle.level)
    crowns = [one for one in grove.trees if _in_crown(x, y, one)]
    if crowns:
        closest = min(crowns, key=lambda one: one.span[1] - one.span[0])
        return Target(kind="tree", claim=closest.tree.claim)
    return NOTHING


def _on_branch(x: float, y: float, handle: BranchHandle) -> bool:
    share = (handle.lower_y - y) / max(handle.lower_y - handle.upper_y, 1.0)
    # The branches' cubic is close to this smooth step between its upright ends.
    bend = share * share * (3 - 2 * share)
    for node, half in zip(handle.nodes, handle.half_px, strict=True):
        for side in (-1, 1):
            if abs(node + side * half * bend - x) <= _BRANCH_REACH_PX:
                return True
    return False


def _in_crown(x: float, y: float, placed: PlacedTree) -> bool:
    if abs(x - placed.root_x) <= _TREE_REACH_PX and y <= placed.soil_y:
        return True
    left, right = placed.span
    is_across = left - 3 <= x <= right + 3
    return is_across and y <= placed.leaf_y + 4
