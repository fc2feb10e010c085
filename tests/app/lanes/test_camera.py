"""Going about the axis: home, folding, ranges, the view before."""

from __future__ import annotations

import invented
import pytest

from spinledger_app.lanes.camera import Camera
from spinledger_app.lanes.scene import LaneScene
from spinledger_app.presenters.lanes import lane_scene


@pytest.fixture(scope="module")
def scene() -> LaneScene:
    ledger = invented.ledger()
    return lane_scene(ledger.evidence, ledger)


@pytest.fixture
def camera(scene: LaneScene) -> Camera:
    return Camera.opened(scene, 88.0, 718.0, is_folded=False)


def test_opens_on_the_continuous_axis_and_folds(camera: Camera) -> None:
    assert not camera.map.is_folded
    assert camera.is_at_home
    folded = camera.with_folding(True)
    assert folded.map.is_folded
    assert folded.is_at_home


def test_the_view_before_comes_back(camera: Camera, scene: LaneScene) -> None:
    close = camera.on_range(2.4, 2.5, scene.frequency_mhz)
    assert not close.is_at_home
    assert close.back().map == camera.map
    assert close.back().back().map == camera.map


def test_a_range_is_shown_with_a_margin(camera: Camera, scene: LaneScene) -> None:
    close = camera.on_range(2.40, 2.50, scene.frequency_mhz)
    for shift in (2.40, 2.50):
        place = close.map.x_of(shift)
        assert place is not None
        assert 88.0 < place < 718.0


def test_an_opened_fold_joins_its_neighbours(camera: Camera) -> None:
    folded = camera.with_folding(True)
    before = folded.map.stretches
    opened = folded.fold_opened(1)
    assert len(opened.map.stretches) == len(before) - 1
    between = (before[1].low_ppm + before[2].high_ppm) / 2
    assert folded.map.x_of(between) is None
    assert opened.map.x_of(between) is not None


def test_another_ledger_keeps_the_place(camera: Camera, scene: LaneScene) -> None:
    close = camera.on_range(2.4, 2.5, scene.frequency_mhz)
    other = invented.disputed()
    assert close.with_scene(lane_scene(other.evidence, other)).map == close.map


def test_resizing_keeps_the_whole_axis_in_the_window(camera: Camera) -> None:
    wider = camera.resized(100.0, 1500.0)
    assert wider.is_at_home
    assert wider.map.x_of(camera.whole.low_ppm) == pytest.approx(1500.0)
