"""The shift of a line set by a click and a number typed in place."""

from __future__ import annotations

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtTest import QTest
from stage import settle

from spinledger.project.edits import SetReference
from spinledger_app.application import Parts
from spinledger_app.handlers.reference import suggested_ppm

LEFT = Qt.MouseButton.LeftButton


def click_line(parts: Parts) -> float:
    """Click a pixel beside a line's place; the line's shift."""
    lanes, scene = parts.window.lanes, parts.bench.scene
    assert scene is not None
    assert lanes.map is not None
    line = scene.feet[0].shift_ppm
    x = lanes.map.x_of(line)
    assert x is not None
    parts.desk.do("reference")
    y = (lanes.layout_now.curve_top + lanes.layout_now.baseline) / 2
    QTest.mouseClick(lanes, LEFT, pos=QPoint(round(x), round(y)))
    return line


def test_click_a_line_type_its_shift_and_undo(parts: Parts) -> None:
    hand = parts.desk.process.reference.hand
    lines = {foot.shift_ppm for foot in parts.bench.scene.feet}  # type: ignore[union-attr]
    click_line(parts)
    assert hand.field is not None
    QTest.keyClicks(hand.field, "7,260")  # the suggestion is selected: it goes
    QTest.keyClick(hand.field, Qt.Key.Key_Return)
    parts.bench._timer.stop()
    (edit,) = parts.bench.project.edits
    assert isinstance(edit, SetReference)
    assert edit.line_ppm in lines
    assert edit.to_ppm == 7.26
    assert hand.field is None
    parts.desk.do("undo")
    parts.bench._timer.stop()
    assert parts.bench.project.edits == ()


def test_escape_leaves_the_field_then_the_waiting(parts: Parts) -> None:
    hand = parts.desk.process.reference.hand
    click_line(parts)
    assert hand.field is not None
    QTest.keyClick(hand.field, Qt.Key.Key_Escape)
    assert not hand.is_active
    parts.desk.do("reference")
    assert hand.is_waiting
    QTest.keyClick(parts.window, Qt.Key.Key_Escape)
    settle()
    assert not hand.is_active
    assert parts.bench.project.edits == ()


def test_the_known_shift_nearby_is_suggested() -> None:
    # Residual CHCl3 at 7.26 and TMS at 0 (Fulmer 2010, doi:10.1021/om100106e).
    assert suggested_ppm(7.31, "CDCl3") == pytest.approx(7.26)
    assert suggested_ppm(0.04, "CDCl3") == 0.0
    assert suggested_ppm(4.1, "CDCl3") == 4.1
