"""The sketch in the window: what is drawn is claimed, with real mouse and keys."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import invented
import pytest
from PySide6.QtCore import QEvent, QMimeData, QPoint, QPointF, Qt
from PySide6.QtGui import QGuiApplication, QMouseEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication
from stage import put_on, settle, stage, take_down

from spinledger_app.application import Parts
from spinledger_app.clipboard import OwnData, leave_plain_text
from spinledger_app.presenters.structure import PlacedTag
from spinledger_app.sketch.canvas import SketchCanvas
from spinledger_app.sketch.gestures import Tool
from spinledger_app.theme import DARK

LEFT = Qt.MouseButton.LeftButton
CTRL = Qt.KeyboardModifier.ControlModifier


@pytest.fixture
def parts(qapp: object, tmp_path: Path) -> Iterator[Parts]:
    made = stage(tmp_path)
    yield made
    leave_plain_text()
    take_down(made)


def canvas_of(parts: Parts) -> SketchCanvas:
    return parts.window.sketch.canvas


def use(parts: Parts, tool: Tool) -> None:
    QTest.mouseClick(parts.window.sketch.editor.toolbar.buttons[tool], LEFT)


def move(canvas: SketchCanvas, at: QPoint) -> None:
    place = QPointF(at)
    event = QMouseEvent(
        QEvent.Type.MouseMove, place, canvas.mapToGlobal(place),
        Qt.MouseButton.NoButton, Qt.MouseButton.NoButton,
        Qt.KeyboardModifier.NoModifier,
    )  # fmt: skip
    QApplication.sendEvent(canvas, event)


def atom(canvas: SketchCanvas, index: int) -> QPoint:
    place = canvas.drawing.atoms[index].place
    return QPointF(*canvas.view.to_screen(place)).toPoint()


def middle(tag: PlacedTag) -> QPoint:
    return QPointF(*tag.centre).toPoint()


def smiles_of(parts: Parts) -> str | None:
    structure = parts.bench.project.structure
    return None if structure is None else structure.smiles


def test_drawing_becomes_the_claimed_structure_step_by_step(parts: Parts) -> None:
    canvas = canvas_of(parts)
    use(parts, Tool.RING)
    QTest.mouseClick(canvas, LEFT, pos=canvas.rect().center())
    settle()
    assert smiles_of(parts) == "c1ccccc1"
    use(parts, Tool.BOND)
    QTest.mouseClick(canvas, LEFT, pos=atom(canvas, 0))
    settle()
    assert smiles_of(parts) == "Cc1ccccc1"
    assert parts.bench.session.undo_stack.count() == 2
    # Undo and redo are those of the project, wherever the keys go.
    QTest.keyClick(canvas, Qt.Key.Key_Z, CTRL)
    settle()
    assert smiles_of(parts) == "c1ccccc1"
    assert canvas.meaning.smiles == "c1ccccc1"
    QTest.keyClick(canvas, Qt.Key.Key_Y, CTRL)
    settle()
    assert smiles_of(parts) == canvas.meaning.smiles == "Cc1ccccc1"
    QTest.keyClick(parts.window, Qt.Key.Key_Z, CTRL)
    settle()
    assert canvas.meaning.smiles == "c1ccccc1"


def test_deleting_all_removes_the_structure_and_undo_brings_it_back(
    parts: Parts,
) -> None:
    put_on(parts, invented.ledger())
    canvas = canvas_of(parts)
    assert canvas.meaning.smiles == smiles_of(parts)
    canvas.setFocus()
    QTest.keyClick(canvas, Qt.Key.Key_A, CTRL)
    QTest.keyClick(canvas, Qt.Key.Key_Delete)
    settle()
    assert smiles_of(parts) is None
    assert parts.bench.project.ledger is None
    assert parts.window.sketch.first.isVisible()
    assert parts.window.sketch.tags.placed == ()
    parts.desk.do("undo")
    settle()
    assert parts.bench.project.ledger is not None
    assert canvas.meaning.smiles == smiles_of(parts)
    tags = parts.window.sketch.tags.placed
    assert len(tags) == len(parts.bench.project.ledger.entries)


def test_a_fault_is_not_claimed_and_has_its_own_way_back(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    canvas, before = canvas_of(parts), smiles_of(parts)
    use(parts, Tool.BOND)
    oxygen = next(i for i, one in enumerate(canvas.drawing.atoms) if one.element == "O")
    for _ in range(2):
        QTest.mouseClick(canvas, LEFT, pos=atom(canvas, oxygen))
    settle()
    assert canvas.meaning.faults
    n_steps = parts.bench.session.undo_stack.count()
    while canvas.meaning.faults:
        QTest.keyClick(canvas, Qt.Key.Key_Z, CTRL)
    settle()
    assert parts.bench.session.undo_stack.count() >= n_steps - 1
    while parts.bench.session.undo_stack.canUndo():
        parts.desk.do("undo")
    settle()
    assert smiles_of(parts) == canvas.meaning.smiles == before


def test_moving_an_atom_keeps_the_ledger(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    canvas = canvas_of(parts)
    ledger = parts.bench.project.ledger
    place = canvas.drawing.atoms[0].place
    start = atom(canvas, 0)
    QTest.mousePress(canvas, LEFT, pos=start)
    for step in (4, 9, 14):
        at = QPointF(start + QPoint(0, step))
        event = QMouseEvent(
            QEvent.Type.MouseMove, at, canvas.mapToGlobal(at),
            Qt.MouseButton.NoButton, LEFT, Qt.KeyboardModifier.NoModifier,
        )  # fmt: skip
        QApplication.sendEvent(canvas, event)
    QTest.mouseRelease(canvas, LEFT, pos=start + QPoint(0, 14))
    settle()
    assert canvas.drawing.atoms[0].place != place
    assert parts.bench.project.ledger is ledger
    assert parts.bench.session.undo_stack.undoText() == "move atoms"
    parts.desk.do("undo")
    settle()
    assert parts.bench.project.ledger is ledger


def test_tags_and_atoms_light_and_select_their_claim(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    canvas, layer = canvas_of(parts), parts.window.sketch.tags
    marks = parts.bench.selection
    tag = next(one for one in layer.placed if one.claim == "3-H")
    move(canvas, middle(tag))
    assert marks.marks.hovered == "3-H"
    move(canvas, QPoint(3, 3))
    assert marks.marks.hovered is None
    move(canvas, atom(canvas, tag.atom))  # the proton's own place in the skeleton
    assert marks.marks.hovered == "3-H"
    QTest.mouseClick(canvas, LEFT, pos=atom(canvas, tag.atom))
    settle()
    assert marks.marks.selected == "3-H"
    assert canvas.selected == frozenset()
    # Keys of the drawing must not change the atom that was clicked as a claim.
    before = smiles_of(parts)
    QTest.keyClick(parts.window.focusWidget(), Qt.Key.Key_Backspace)
    QTest.keyClick(parts.window.focusWidget(), Qt.Key.Key_N)
    settle()
    assert smiles_of(parts) == canvas.meaning.smiles == before


def test_tags_are_walked_with_the_arrows(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    layer = parts.window.sketch.tags
    layer.setFocus(Qt.FocusReason.TabFocusReason)
    QTest.keyClick(layer, Qt.Key.Key_Right)
    QTest.keyClick(layer, Qt.Key.Key_Right)
    claims = [one.claim for one in layer.placed]
    assert parts.bench.selection.marks.hovered == claims[1]
    QTest.keyClick(layer, Qt.Key.Key_Return)
    assert parts.bench.selection.marks.selected == claims[1]


def test_a_signal_and_an_atom_are_put_together(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    canvas, layer = canvas_of(parts), parts.window.sketch.tags
    scene = parts.bench.scene
    assert scene is not None
    mark = next(one for one in scene.signals if one.claims == ("4-H",))
    parts.bench.selection.choose(mark.key)
    tag = next(one for one in layer.placed if one.claim == "3-H")
    QTest.mouseClick(canvas, LEFT, pos=atom(canvas, tag.atom))
    settle()
    assert parts.bench.project.edits[-1].description.startswith("3-H put to")


def test_tags_give_way_while_one_draws(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    layer = parts.window.sketch.tags
    assert layer.isVisible()
    tag = layer.placed[0]
    use(parts, Tool.BOND)
    n_before = len(canvas_of(parts).drawing.atoms)
    QTest.mouseClick(canvas_of(parts), LEFT, pos=middle(tag))
    settle()
    assert len(canvas_of(parts).drawing.atoms) > n_before


def test_a_refused_text_is_told_in_the_status_line(parts: Parts) -> None:
    canvas = canvas_of(parts)
    QGuiApplication.clipboard().setText("no structure at all ((")
    canvas.setFocus()
    QTest.keyClick(canvas, Qt.Key.Key_V, CTRL)
    settle()
    assert parts.window.status.is_error
    assert smiles_of(parts) is None


CDXML = """<?xml version="1.0" encoding="UTF-8" ?>
<CDXML BondLength="14.4"><page id="1"><fragment id="2">
<n id="3" p="100 100"/><n id="4" p="112.5 92.8"/>
<n id="5" p="125 100" Element="8" NumHydrogens="1"/>
<b id="6" B="3" E="4"/><b id="7" B="4" E="5"/>
</fragment></page></CDXML>
"""


def test_cdxml_on_the_clipboard_is_taken(parts: Parts) -> None:
    data = OwnData()
    data.setData("chemical/x-cdxml", CDXML.encode())
    QGuiApplication.clipboard().setMimeData(data)
    canvas_of(parts).setFocus()
    QTest.keyClick(canvas_of(parts), Qt.Key.Key_V, CTRL)
    settle()
    assert smiles_of(parts) == "CCO"


def test_the_table_is_copied_as_text_and_as_a_table(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    parts.desk.do("copy_table")
    data: QMimeData = QGuiApplication.clipboard().mimeData()
    assert isinstance(data, OwnData)  # what is made safe when the program ends
    assert data.text().startswith("Claim\t")
    assert "<table>" in data.html()


def test_the_sketch_follows_another_theme(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    parts.desk.view.take_theme("dark")
    settle()
    image = parts.window.sketch.canvas.grab().toImage()
    assert image.pixelColor(2, 2).name() == DARK.lane.lower()
