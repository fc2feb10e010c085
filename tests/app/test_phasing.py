"""The phase by hand: what is dragged is what the recipe gives, as one undo step."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from PySide6.QtCore import QEvent, QPoint, QPointF, Qt
from PySide6.QtGui import QMouseEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication
from stage import settle, stage, take_down

from spinledger.processing.recipe import run_recipe
from spinledger.project.document import Project, open_spectrum, with_evidence
from spinledger.values.recipe import Baseline, Phase, Recipe
from spinledger_app import tasks
from spinledger_app.application import Parts
from spinledger_app.places import example_place
from spinledger_app.presenters.phasing import PhaseTrial, with_setting

LEFT = Qt.MouseButton.LeftButton


@pytest.fixture(scope="module")
def read() -> tasks.ReadSpectrum:
    place = example_place()
    assert place is not None
    return tasks.read_spectrum(
        lambda _stage, _fraction: None, lambda: False, place.data, Project().options
    )


@pytest.fixture
def parts(qapp: object, tmp_path: Path, read: tasks.ReadSpectrum) -> Iterator[Parts]:
    made = stage(tmp_path)
    project = open_spectrum(Project(), read.acquired, source_path="x", when="now")
    made.bench.session.replace(with_evidence(project, read.evidence), None)
    settle()
    yield made
    take_down(made)


def drag_up(parts: Parts, by_px: int, modifier: Qt.KeyboardModifier) -> None:
    lanes = parts.window.lanes
    start = QPoint(500, 300)
    QTest.mousePress(lanes, LEFT, modifier, start)
    for share in (0.5, 1.0):
        at = QPointF(start) - QPointF(0, by_px * share)
        event = QMouseEvent(
            QEvent.Type.MouseMove, at, lanes.mapToGlobal(at),
            Qt.MouseButton.NoButton, LEFT, modifier,
        )  # fmt: skip
        QApplication.sendEvent(lanes, event)
    QTest.mouseRelease(lanes, LEFT, modifier, start - QPoint(0, by_px))


def test_what_is_shown_is_what_the_recipe_gives(read: tasks.ReadSpectrum) -> None:
    # Without baseline correction, which the preview cannot know, on both sides.
    steps = tuple(
        replace(step, method="none") if isinstance(step, Baseline) else step
        for step in read.evidence.recipe.steps
    )
    recipe = Recipe(steps=steps)
    plain = replace(
        read.evidence, recipe=recipe, spectrum=run_recipe(read.acquired, recipe)
    )
    trial = PhaseTrial(plain)
    setting = trial.start.pivoted(0.2).turned(25.0, 40.0)
    shown = trial.trace(setting).pyramid.values
    made = run_recipe(read.acquired, with_setting(recipe, setting)).intensities
    # The FID is filled to four times its length, so the halves determine each other
    # but for its middle point: 1e-3 of the tallest line.
    np.testing.assert_allclose(shown, made, atol=1e-3 * np.abs(made).max())


def test_moving_the_pivot_changes_nothing_that_is_shown(
    read: tasks.ReadSpectrum,
) -> None:
    trial = PhaseTrial(read.evidence)
    setting = trial.start.turned(10.0, 60.0)
    before = trial.trace(setting).pyramid.values
    after = trial.trace(setting.pivoted(0.3)).pyramid.values
    np.testing.assert_allclose(after, before, atol=1e-9 * np.abs(before).max())


def test_drags_turn_the_phase_live_and_one_step_takes_it(parts: Parts) -> None:
    lanes, strip = parts.window.lanes, parts.window.phase_strip
    parts.desk.do("phase")
    settle()
    assert strip.isVisible()
    before = lanes.grab().toImage()
    start = strip.phase0.value()
    drag_up(parts, 60, Qt.KeyboardModifier.NoModifier)
    settle()
    assert strip.phase0.value() == pytest.approx(start + 30.0, abs=0.11)
    assert lanes.grab().toImage() != before
    drag_up(parts, 20, Qt.KeyboardModifier.ShiftModifier)
    settle()
    assert strip.phase1.value() == pytest.approx(20.0, abs=0.2)
    assert parts.bench.session.undo_stack.count() == 0
    QTest.mouseClick(strip.take, LEFT)
    parts.bench._timer.stop()
    assert not strip.isVisible()
    assert parts.bench.session.undo_stack.count() == 1
    recipe = parts.bench.project.recipe
    assert recipe is not None
    step = recipe.find(Phase)
    assert isinstance(step, Phase)
    assert not step.automatic
    assert parts.bench.project.needs_evidence
    parts.desk.do("undo")
    parts.bench._timer.stop()
    assert not parts.bench.project.needs_evidence


def test_a_click_sets_the_pivot_and_escape_leaves_all_as_it_was(parts: Parts) -> None:
    parts.desk.do("phase")
    settle()
    lanes, strip = parts.window.lanes, parts.window.phase_strip
    before = strip.pivot.text()
    QTest.mouseClick(lanes, LEFT, pos=QPoint(300, 300))
    settle()
    assert strip.pivot.text() != before
    drag_up(parts, 40, Qt.KeyboardModifier.NoModifier)
    QTest.keyClick(strip, Qt.Key.Key_Escape)
    settle()
    assert not strip.isVisible()
    assert lanes.trial is None
    assert parts.bench.session.undo_stack.count() == 0
