"""Everything by keyboard: Tab reaches every panel, focus shows, names are said."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import invented
import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QAbstractButton, QAbstractSpinBox, QWidget
from stage import put_on, settle, stage, take_down

from spinledger_app.application import Parts
from spinledger_app.sketch.gestures import Tool

_MOST_TABS = 120


@pytest.fixture
def parts(qapp: object, tmp_path: Path) -> Iterator[Parts]:
    made = stage(tmp_path)
    made.window.activateWindow()
    put_on(made, invented.ledger())
    made.window.lanes.set_folded(True)
    settle()
    yield made
    take_down(made)


def walk(parts: Parts) -> list[QWidget]:
    """Widgets that Tab reaches, from the first one until it comes round."""
    parts.window.menu_row.setFocus()
    QTest.keyClick(parts.window, Qt.Key.Key_Tab)
    reached: list[QWidget] = []
    for _ in range(_MOST_TABS):
        now = parts.window.focusWidget()
        if now is None or now in reached:
            break
        reached.append(now)
        QTest.keyClick(now, Qt.Key.Key_Tab)
    return reached


def test_tab_reaches_every_panel_and_comes_round(parts: Parts) -> None:
    reached = walk(parts)
    assert len(reached) < _MOST_TABS
    window = parts.window
    for panel in (window.sketch, window.contenders, window.recipe, window.ledger):
        assert any(panel.isAncestorOf(one) for one in reached), panel
    assert window.lanes in reached
    assert window.sketch.tags in reached


def test_whatever_has_focus_has_a_name_and_shows_it(parts: Parts) -> None:
    for widget in walk(parts):
        name = widget.accessibleName() or getattr(widget, "text", str)()
        assert name, type(widget).__name__
        widget.setFocus(Qt.FocusReason.TabFocusReason)
        QTest.keyClick(widget, Qt.Key.Key_Shift)  # the ring shows once keys are used
        settle()
        before = parts.window.grab().toImage()
        parts.window.ring.rest()
        settle()
        after = parts.window.grab().toImage()
        if widget.isVisible() and widget.visibleRegion().boundingRect().height() > 8:
            assert before != after, f"{type(widget).__name__} {name}"


def test_every_control_has_a_name_for_screen_readers(parts: Parts) -> None:
    kinds = (QAbstractButton, QAbstractSpinBox)
    for kind in kinds:
        for control in parts.window.findChildren(kind):
            if control.isVisible():
                text = control.text() if isinstance(control, QAbstractButton) else ""
                assert control.accessibleName() or text, type(control).__name__


def test_a_claim_is_taken_up_and_put_elsewhere_by_keys_alone(parts: Parts) -> None:
    window, selection = parts.window, parts.bench.selection
    window.lanes.setFocus()
    ledger = parts.bench.project.ledger
    assert ledger is not None
    QTest.keyClick(window, Qt.Key.Key_N)
    settle()
    first = selection.marks.selected
    assert first == window.ledger.rows[0].claim
    QTest.keyClick(window, Qt.Key.Key_P)  # put elsewhere: waits for a signal
    settle()
    assert selection.marks.waiting_claim == first
    assert window.lanes.hasFocus()
    mine = next(entry for entry in ledger.entries if entry.claim == first)
    for _ in range(12):
        QTest.keyClick(window.lanes, Qt.Key.Key_Right)
        hovered = selection.marks.hovered_signal
        mark = parts.bench.scene.signal(hovered) if parts.bench.scene else None
        if mark is not None and first not in mark.claims:
            break
    QTest.keyClick(window.lanes, Qt.Key.Key_Return)
    parts.bench._timer.stop()
    settle()
    assert mine.claim in parts.bench.project.edits[-1].description
    QTest.keyClick(window, Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    parts.bench._timer.stop()
    settle()
    assert parts.bench.project.edits == ()


def test_a_molecule_is_drawn_by_keys_alone(parts: Parts) -> None:
    parts.bench.new_project()
    settle()
    canvas = parts.window.sketch.canvas
    canvas.setFocus()
    assert canvas.kit.tool is Tool.BOND
    for key in (Qt.Key.Key_Space, Qt.Key.Key_Space, Qt.Key.Key_O):
        QTest.keyClick(canvas, key)
    settle()
    structure = parts.bench.project.structure
    assert structure is not None
    assert structure.smiles == "CCO"
