"""Trees in their places: storeys where they overlap, labels that do not."""

from __future__ import annotations

from itertools import combinations

import invented
import pytest

from spinledger_app.lanes.grove import LABEL_GAP_PX, Grove, plant
from spinledger_app.lanes.layout import lane_layout
from spinledger_app.lanes.scene import LaneScene, Leaf, TreeShape
from spinledger_app.lanes.shift_map import ShiftMap, Stretch
from spinledger_app.presenters.lanes import lane_scene

LAYOUT = lane_layout(733, 607)


def width_of(tree: TreeShape) -> float:
    return 8.0 * len(tree.claim)


def planted(scene: LaneScene, shift_map: ShiftMap) -> Grove:
    return plant(scene, shift_map, LAYOUT, width_of)


@pytest.fixture(scope="module")
def scene() -> LaneScene:
    ledger = invented.ledger()
    return lane_scene(ledger.evidence, ledger)


def test_overlapping_crowns_stand_in_storeys(scene: LaneScene) -> None:
    shift_map = ShiftMap.fitted(scene.folds, LAYOUT.left, LAYOUT.right)
    grove = planted(scene, shift_map)
    upper, lower = grove.placed("3-H"), grove.placed("1′-H")
    assert upper is not None
    assert lower is not None
    assert not upper.is_low  # most leaves on top
    assert lower.is_low
    assert upper.fork_y < lower.crown_y + 20
    assert upper.style == "hedge"  # sixteen leaves closer than 3 px


def test_far_out_trees_are_stems(scene: LaneScene) -> None:
    shift_map = ShiftMap.fitted((scene.whole,), LAYOUT.left, LAYOUT.right)
    grove = planted(scene, shift_map)
    styles = {one.tree.claim: one.style for one in grove.trees}
    assert styles["2-HA"] == "stem"
    assert styles["OH"] == "broad"


@pytest.mark.parametrize("is_folded", [False, True])
def test_labels_never_overlap(scene: LaneScene, is_folded: bool) -> None:
    stretches = scene.folds if is_folded else (scene.whole,)
    shift_map = ShiftMap.fitted(stretches, LAYOUT.left, LAYOUT.right)
    labels = planted(scene, shift_map).labels
    for one, other in combinations(labels, 2):
        need = (one.width + other.width) / 2
        # 9: the gap of 10 px less rounding where a stretch is just wide enough.
        assert abs(one.x - other.x) >= need + LABEL_GAP_PX - 1


def crowd(n: int) -> LaneScene:
    ledger = invented.ledger()
    base = lane_scene(ledger.evidence, ledger)
    made = tuple(
        TreeShape(
            claim=f"{k}-H",
            state="disputed" if k == 3 else "settled",
            n_protons=1,
            root_ppm=1.2 + 0.001 * k,
            levels=(),
            leaves=(Leaf(base_ppm=1.2, tip_ppm=1.2, weight=1.0),),
        )
        for k in range(n)
    )
    values = {name: getattr(base, name) for name in base.__slots__}
    return LaneScene(**(values | {"trees": made}))


def test_a_crowd_goes_into_a_tag_and_keeps_the_important() -> None:
    scene = crowd(60)
    stretch = Stretch(high_ppm=1.4, low_ppm=1.1)
    shift_map = ShiftMap.fitted((stretch,), LAYOUT.left, LAYOUT.right)
    grove = plant(scene, shift_map, LAYOUT, width_of, first=("3-H",))
    tags = [label for label in grove.labels if len(label.claims) > 1]
    single = [label for label in grove.labels if len(label.claims) == 1]
    assert len(tags) == 1
    assert tags[0].text == f"+{len(tags[0].claims)}"
    assert len(single) + len(tags[0].claims) == 60
    assert "3-H" in {label.text for label in single}
    assert all(LAYOUT.left - 7 <= label.x <= LAYOUT.right + 7 for label in grove.labels)
