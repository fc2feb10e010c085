"""The editor driven by real mouse and key events, without a display."""

from __future__ import annotations

import math
import os
import subprocess
import sys
from collections.abc import Iterator
from functools import partial
from pathlib import Path
from xml.etree import ElementTree as ET

import pytest
from PySide6.QtCore import QEvent, QMimeData, QPoint, QPointF, Qt, QUrl
from PySide6.QtGui import (
    QDropEvent,
    QGuiApplication,
    QMouseEvent,
    QShortcut,
    QWheelEvent,
)
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QLineEdit, QVBoxLayout, QWidget
from pytestqt.qtbot import QtBot

from spinledger.errors import OutputError
from spinledger.structure.read import read_structure
from spinledger_app.clipboard import leave_plain_text
from spinledger_app.sketch.chemistry import meaning, smiles
from spinledger_app.sketch.drawing import Point
from spinledger_app.sketch.editor import StructureEditor
from spinledger_app.sketch.gestures import NOWHERE, Kit, Spot, Tool
from spinledger_app.sketch.painting import Shown, presented
from spinledger_app.sketch.view import handle_px
from spinledger_app.theme import DARK, LIGHT, Look, TextRect, load_fonts

LEFT = Qt.MouseButton.LeftButton
CTRL = Qt.KeyboardModifier.ControlModifier
SHIFT = Qt.KeyboardModifier.ShiftModifier
ALT = Qt.KeyboardModifier.AltModifier


def key_of(what: str | Qt.Key) -> Qt.Key:
    """Key that types a character; characters of ASCII have their code as key."""
    return Qt.Key(ord(what.upper())) if isinstance(what, str) else what


class Hand:
    """Moves the mouse in the drawing's own coordinates and presses keys."""

    def __init__(self, editor: StructureEditor) -> None:
        self.editor = editor
        self.canvas = editor.canvas
        self.told: list[str] = []
        self.refused: list[str] = []
        editor.structure_changed.connect(self.told.append)
        editor.structure_text_rejected.connect(self.refused.append)

    @property
    def smiles(self) -> str:
        return smiles(self.editor.drawing)

    def use(self, tool: Tool) -> None:
        QTest.mouseClick(self.editor.toolbar.buttons[tool], LEFT)

    def point(self, place: Point) -> QPoint:
        return QPointF(*self.canvas.view.to_screen(place)).toPoint()

    def atom(self, index: int) -> QPoint:
        return self.point(self.editor.drawing.atoms[index].place)

    def bond(self, first: int, second: int) -> QPoint:
        index = self.editor.drawing.bond_between(first, second)
        assert index is not None
        return self.point(self.editor.drawing.middle(index))

    def hover(self, at: QPoint) -> None:
        self._move(at, Qt.MouseButton.NoButton)

    def click(self, at: QPoint, modifiers: Qt.KeyboardModifier | None = None) -> None:
        self.hover(at)
        QTest.mouseClick(
            self.canvas, LEFT, modifiers or Qt.KeyboardModifier.NoModifier, at
        )

    def drag(
        self, start: QPoint, end: QPoint, modifiers: Qt.KeyboardModifier | None = None
    ) -> None:
        held = modifiers or Qt.KeyboardModifier.NoModifier
        self.hover(start)
        QTest.mousePress(self.canvas, LEFT, held, start)
        for share in (0.4, 0.8, 1.0):
            between = start + (end - start) * share
            self._move(between, LEFT, held)
        QTest.mouseRelease(self.canvas, LEFT, held, end)

    def key(
        self, what: str | Qt.Key, modifiers: Qt.KeyboardModifier | None = None
    ) -> None:
        held = modifiers or Qt.KeyboardModifier.NoModifier
        QTest.keyClick(self.canvas, key_of(what), held)

    def keys(self, text: str) -> None:
        for one in text:
            self.key(one)

    def _move(
        self,
        at: QPoint,
        buttons: Qt.MouseButton,
        modifiers: Qt.KeyboardModifier = Qt.KeyboardModifier.NoModifier,
    ) -> None:
        event = QMouseEvent(
            QEvent.Type.MouseMove,
            QPointF(at),
            QPointF(self.canvas.mapToGlobal(at)),
            Qt.MouseButton.NoButton,
            buttons,
            modifiers,
        )
        QApplication.sendEvent(self.canvas, event)


@pytest.fixture
def hand(qtbot: QtBot) -> Iterator[Hand]:
    load_fonts()
    editor = StructureEditor(Look(tokens=LIGHT))
    qtbot.addWidget(editor)
    editor.resize(400, 440)
    with qtbot.waitExposed(editor):
        editor.show()
    editor.activateWindow()
    editor.canvas.setFocus()
    yield Hand(editor)
    leave_plain_text()


MIDDLE = (0.0, 0.0)


def test_click_draws_a_bond_and_clicks_on_it_change_its_order(hand: Hand) -> None:
    hand.use(Tool.BOND)
    hand.click(QPoint(200, 180))
    assert hand.smiles == "CC"
    seen = []
    for _ in range(3):
        hand.click(hand.bond(0, 1))
        seen.append(hand.smiles)
    assert seen == ["C=C", "C#C", "CC"]
    hand.click(hand.atom(1))
    hand.click(hand.atom(1))
    assert hand.smiles == "CC(C)C"


def test_drag_draws_in_steps_of_15_degrees_and_joins_what_it_meets(hand: Hand) -> None:
    hand.use(Tool.BOND)
    hand.drag(QPoint(150, 180), QPoint(250, 186))
    first, second = hand.editor.drawing.atoms
    # The drag went 3° downwards; the bond lies level.
    assert second.y == pytest.approx(first.y)
    hand.drag(hand.atom(1), hand.atom(1) + QPoint(-10, -40))
    angle = math.degrees(
        math.atan2(
            hand.editor.drawing.atoms[2].y - second.y,
            hand.editor.drawing.atoms[2].x - second.x,
        )
    )
    assert angle == pytest.approx(105)
    hand.drag(hand.atom(2), hand.atom(0))
    assert hand.smiles == "C1CC1"


def test_rings_are_drawn_fused_and_chosen_by_digits(hand: Hand) -> None:
    hand.use(Tool.RING)
    hand.click(QPoint(200, 180))
    assert hand.smiles == "c1ccccc1"
    hand.click(hand.bond(0, 1))
    assert hand.smiles == "c1ccc2ccccc2c1"
    hand.hover(QPoint(8, 8))
    hand.key("5")
    assert hand.editor.canvas.kit == Kit(tool=Tool.RING, ring_size=5, is_aromatic=False)
    hand.editor.show_structure("")
    hand.click(QPoint(200, 180))
    assert hand.smiles == "C1CCCC1"


def test_keys_act_on_what_is_under_the_mouse(hand: Hand) -> None:
    hand.editor.show_structure("CCC")
    hand.hover(hand.atom(2))
    hand.key("o")
    assert hand.smiles == "CCO"
    hand.key("-")
    assert hand.smiles == "CC[O-]"
    hand.hover(hand.atom(0))
    hand.key("m")
    assert hand.smiles == "[13CH3]C[O-]"
    hand.hover(hand.bond(0, 1))
    hand.key("=")
    assert hand.smiles == "[13CH2]=C[O-]"


@pytest.mark.parametrize(
    ("key", "expected"),
    [
        ("n", "CN"),
        ("o", "CO"),
        ("s", "CS"),
        ("f", "CF"),
        ("l", "CCl"),
        ("b", "CBr"),
        ("i", "CI"),
        ("p", "CP"),
        ("h", "C"),
        ("d", "[2H]C"),
    ],
)
def test_element_keys(hand: Hand, key: str, expected: str) -> None:
    hand.editor.show_structure("CC")
    hand.hover(hand.atom(1))
    hand.key(key)
    assert hand.smiles == expected


def test_wedge_tool_sets_the_stereocentre_of_alanine(hand: Hand) -> None:
    hand.editor.show_structure("CC(N)C(=O)O")
    hand.use(Tool.WEDGE)
    found = []
    for _ in range(4):
        hand.click(hand.bond(1, 0))
        found.append(hand.smiles)
    assert set(found[:2]) == {"C[C@H](N)C(=O)O", "C[C@@H](N)C(=O)O"}
    assert found[2:] == ["CC(N)C(=O)O"] * 2


def test_charge_element_and_delete_tools(hand: Hand) -> None:
    hand.editor.show_structure("CCC")
    hand.use(Tool.ELEMENT)
    hand.click(hand.atom(2))
    assert hand.smiles == "CCO"
    hand.use(Tool.CHARGE)
    hand.use(Tool.CHARGE)
    hand.click(hand.atom(2))
    assert hand.smiles == "CC[O-]"
    hand.use(Tool.ERASE)
    hand.click(hand.bond(0, 1))
    assert hand.smiles == "C.C[O-]"
    hand.click(hand.atom(0))
    assert hand.smiles == "C[O-]"


def test_hover_follows_undo_and_deleting(hand: Hand) -> None:
    hand.editor.show_structure("CCCC")
    hand.hover(hand.atom(3))
    assert hand.canvas.spot == Spot(atom=3)
    hand.key(Qt.Key.Key_Delete)
    assert hand.smiles == "CCC"
    assert hand.canvas.spot == NOWHERE
    hand.key("z", CTRL)
    assert hand.smiles == "CCCC"
    hand.hover(hand.atom(3))
    assert hand.canvas.spot == Spot(atom=3)


def test_undo_and_redo_walk_through_every_gesture(hand: Hand) -> None:
    hand.use(Tool.RING)
    hand.click(QPoint(200, 180))
    hand.use(Tool.BOND)
    hand.click(hand.atom(0))
    hand.hover(hand.atom(6))
    hand.key("o")
    assert hand.smiles == "Oc1ccccc1"
    assert hand.editor.undo_label == "Change element"
    seen = []
    for _ in range(3):
        hand.key("z", CTRL)
        seen.append(hand.smiles)
    assert seen == ["Cc1ccccc1", "c1ccccc1", ""]
    for _ in range(2):
        hand.key("y", CTRL)
    hand.key("z", CTRL | SHIFT)
    assert hand.smiles == "Oc1ccccc1"
    assert read_structure(hand.told[-1]).smiles == "Oc1ccccc1"


def test_select_move_and_drop_onto_another_atom(hand: Hand) -> None:
    hand.editor.show_structure("C1CCCCC1.CO")
    hand.use(Tool.PICK)
    QTest.mouseDClick(hand.canvas, LEFT, pos=hand.atom(6))
    hand.hover(hand.atom(6))
    QTest.mouseDClick(hand.canvas, LEFT, pos=hand.atom(6))
    assert hand.canvas.selected == {6, 7}
    hand.drag(hand.atom(6), hand.atom(0))
    assert hand.smiles == "OC1CCCCC1"


def test_band_selects_and_knob_turns_in_steps_of_15_degrees(hand: Hand) -> None:
    hand.editor.show_structure("C1CCCCC1")
    before = [one.place for one in hand.editor.drawing.atoms]
    hand.use(Tool.PICK)
    hand.drag(QPoint(4, 4), QPoint(hand.canvas.width() - 4, hand.canvas.height() - 4))
    assert hand.canvas.selected == frozenset(range(6))
    knob = handle_px(hand.editor.drawing, hand.canvas.view, hand.canvas.selected)
    assert knob is not None
    start = QPointF(*knob).toPoint()
    middle = hand.point((sum(x for x, _ in before) / 6, sum(y for _, y in before) / 6))
    away = start.y() - middle.y()
    # A quarter turn clockwise on the screen, 2° short.
    short = math.radians(88)
    end = middle + QPoint(round(-away * math.sin(short)), round(away * math.cos(short)))
    hand.drag(start, end)
    turned = hand.editor.drawing.atoms[0].place
    mx, my = sum(x for x, _ in before) / 6, sum(y for _, y in before) / 6
    dx, dy = before[0][0] - mx, before[0][1] - my
    assert turned == pytest.approx((mx + dy, my - dx))
    assert hand.smiles == "C1CCCCC1"


def test_shift_click_adds_and_takes_away(hand: Hand) -> None:
    hand.editor.show_structure("CCCO")
    hand.use(Tool.PICK)
    hand.click(hand.atom(0))
    hand.click(hand.atom(3), SHIFT)
    assert hand.canvas.selected == {0, 3}
    hand.click(hand.atom(0), SHIFT)
    assert hand.canvas.selected == {3}
    hand.key(Qt.Key.Key_Backspace)
    assert hand.smiles == "CCC"


def test_molecule_can_be_drawn_by_keys_alone(hand: Hand) -> None:
    hand.keys("  ")
    hand.key("o")
    hand.key(Qt.Key.Key_Left)
    assert hand.canvas.spot.bond is not None
    hand.key(Qt.Key.Key_Left)
    hand.keys(" ")
    hand.key("f")
    assert hand.smiles == "CC(O)F"
    hand.key(Qt.Key.Key_Escape)
    hand.key("r")
    assert hand.canvas.kit.tool is Tool.RING
    hand.key(Qt.Key.Key_Return)
    assert hand.smiles == "CC(O)F.c1ccccc1"


def test_arrow_keys_reach_every_atom_of_a_fused_ring(hand: Hand) -> None:
    hand.editor.show_structure("c1ccc2ccccc2c1")
    arrows = (Qt.Key.Key_Left, Qt.Key.Key_Right, Qt.Key.Key_Up, Qt.Key.Key_Down)
    reached: set[int | None] = set()
    todo = [NOWHERE]
    seen = {NOWHERE}
    while todo:
        spot = todo.pop()
        for arrow in arrows:
            hand.canvas.spot = spot
            hand.key(arrow)
            if hand.canvas.spot not in seen:
                seen.add(hand.canvas.spot)
                todo.append(hand.canvas.spot)
                reached.add(hand.canvas.spot.atom)
    assert reached >= set(range(10))
    assert hand.canvas.accessibleDescription()


def test_keyboard_place_is_seen(hand: Hand) -> None:
    hand.editor.show_structure("CCO")
    plain = hand.canvas.grab().toImage()
    hand.key(Qt.Key.Key_Right)
    x, y = hand.canvas.view.to_screen(hand.editor.drawing.atoms[0].place)
    shown = hand.canvas.grab().toImage()
    ring = QPoint(round(x), round(y - 11))
    accent = hand.editor.look.colour("accent")
    assert plain.pixelColor(ring) != accent
    # 40 of 255: the ring's edge is smoothed over half a pixel.
    assert abs(shown.pixelColor(ring).red() - accent.red()) < 40
    assert abs(shown.pixelColor(ring).blue() - accent.blue()) < 40


def test_paste_adds_beside_and_selects_what_came(hand: Hand) -> None:
    QGuiApplication.clipboard().setText("CCO")
    hand.key("v", CTRL)
    assert hand.smiles == "CCO"
    QGuiApplication.clipboard().setText("InChI=1S/C3H6O/c1-3(2)4/h1-2H3")
    hand.key("v", CTRL)
    assert hand.smiles == "CC(C)=O.CCO"
    assert hand.canvas.selected == {3, 4, 5, 6}
    assert hand.refused == []


def test_text_that_is_no_structure_changes_nothing_and_is_told(hand: Hand) -> None:
    hand.editor.show_structure("CCO")
    QGuiApplication.clipboard().setText("shopping list")
    hand.key("v", CTRL)
    assert hand.smiles == "CCO"
    assert hand.refused == ["This is neither a file nor a SMILES that can be read."]
    assert hand.editor.foot() == hand.refused[0]
    hand.hover(hand.atom(0))
    hand.key("n")
    assert hand.editor.foot() != hand.refused[0]


def test_copy_gives_smiles_molfile_and_picture_of_the_selection(hand: Hand) -> None:
    hand.editor.show_structure("C[C@@H](O)CC.CN")
    hand.key("c", CTRL)
    data = QGuiApplication.clipboard().mimeData()
    assert data.text() == "CC[C@@H](C)O.CN"
    block = bytes(data.data("chemical/x-mdl-molfile").data()).decode()
    assert read_structure(block).smiles == "CC[C@@H](C)O.CN"
    assert bytes(data.data("image/svg+xml").data()).startswith(b"<?xml")
    hand.canvas.select(frozenset({5, 6}))
    hand.key("x", CTRL)
    assert QGuiApplication.clipboard().text() == "CN"
    assert hand.smiles == "CC[C@@H](C)O"


def test_dropped_file_is_read(hand: Hand, tmp_path: Path) -> None:
    path = tmp_path / "alcohol.smi"
    path.write_text("CC(C)O isopropanol\n")
    data = QMimeData()
    data.setUrls([QUrl.fromLocalFile(str(path))])
    event = QDropEvent(
        QPointF(50, 90), Qt.DropAction.CopyAction, data, LEFT,
        Qt.KeyboardModifier.NoModifier,
    )  # fmt: skip
    hand.editor.dropEvent(event)
    assert hand.smiles == "CC(C)O"
    path.unlink()
    hand.editor.dropEvent(event)
    assert len(hand.refused) == 1
    assert "cannot be read" in hand.refused[0]


def test_picture_is_vector_with_one_path_a_bond_at_least(
    hand: Hand, tmp_path: Path
) -> None:
    hand.editor.show_structure("C[C@@H](O)CC(=O)OCC")
    hand.editor.save_svg(tmp_path / "picture.svg")
    root = ET.parse(tmp_path / "picture.svg").getroot()
    tags = [one.tag.rpartition("}")[2] for one in root.iter()]
    assert "image" not in tags
    drawn = sum(tag in ("path", "polyline", "line", "polygon") for tag in tags)
    assert drawn >= len(hand.editor.drawing.bonds)
    with pytest.raises(OutputError, match="cannot be written"):
        hand.editor.save_svg(tmp_path / "none" / "picture.svg")


def test_faulty_drawing_is_marked_and_not_told(hand: Hand) -> None:
    hand.editor.show_structure("CN(C)C")
    hand.use(Tool.BOND)
    hand.click(hand.atom(1))
    assert hand.editor.foot().startswith("N has 4 bonds")
    assert hand.told == []
    hand.hover(hand.atom(1))
    hand.key("+")
    assert hand.smiles == "C[N+](C)(C)C"
    assert [read_structure(one).smiles for one in hand.told] == ["C[N+](C)(C)C"]


def test_showing_what_was_told_keeps_the_way_back(hand: Hand) -> None:
    hand.use(Tool.BOND)
    hand.click(QPoint(200, 180))
    hand.editor.show_structure(hand.told[-1])
    assert hand.editor.undo_label == "Draw bond"
    hand.editor.show_structure(read_structure(hand.told[-1]).molblock)
    assert hand.editor.undo_label == "Draw bond"
    hand.editor.show_structure("CCO")
    assert hand.editor.undo_label == ""
    assert len(hand.told) == 1


def test_half_drawn_fault_stays_when_the_last_sound_structure_is_shown(
    hand: Hand,
) -> None:
    hand.editor.show_structure("CN(C)C")
    hand.use(Tool.BOND)
    hand.click(hand.atom(0))
    known = read_structure(hand.told[-1]).molblock
    hand.editor.show_structure(known)
    hand.click(hand.atom(1))
    assert hand.canvas.meaning.faults
    hand.editor.show_structure(known)
    assert hand.canvas.meaning.faults


def test_clean_up_key_keeps_the_structure(hand: Hand) -> None:
    hand.editor.show_structure("C[C@@H](O)c1ccccc1")
    hand.use(Tool.PICK)
    hand.drag(hand.atom(0), hand.atom(0) + QPoint(35, 30))
    changed = hand.smiles
    hand.key("l", CTRL)
    assert hand.smiles == changed
    drawing = hand.editor.drawing
    lengths = [
        math.dist(drawing.atoms[one.start].place, drawing.atoms[one.end].place)
        for one in drawing.bonds
    ]
    # 0.05: layouts keep nearly equal bonds.
    assert lengths == pytest.approx([1.0] * len(lengths), abs=0.05)


def test_keys_do_not_reach_the_windows_shortcuts(qtbot: QtBot) -> None:
    window = QWidget()
    column = QVBoxLayout(window)
    editor = StructureEditor(Look(tokens=LIGHT))
    column.addWidget(editor)
    field = QLineEdit()
    column.addWidget(field)
    fired: list[str] = []
    for keys in ("R", "F", "Ctrl+Z"):
        shortcut = QShortcut(keys, window)
        shortcut.activated.connect(partial(fired.append, keys))
    qtbot.addWidget(window)
    with qtbot.waitActive(window):
        window.show()
        window.activateWindow()
    editor.setFocus()
    QTest.keyClick(editor.canvas, Qt.Key.Key_R)
    QTest.keyClick(editor.canvas, Qt.Key.Key_Z, CTRL)
    assert fired == []
    assert editor.canvas.kit.tool is Tool.RING
    editor.toolbar.buttons[Tool.BOND].setFocus()
    QTest.keyClick(editor.toolbar.buttons[Tool.BOND], Qt.Key.Key_Right)
    assert editor.toolbar.buttons[Tool.WEDGE].hasFocus()


def test_wheel_zooms_about_the_mouse_and_home_fits(hand: Hand) -> None:
    hand.editor.show_structure("CCO")
    at = QPointF(hand.atom(2))
    before = hand.canvas.view.to_drawing((at.x(), at.y()))
    event = QWheelEvent(
        at, at, QPoint(), QPoint(0, 240), Qt.MouseButton.NoButton,
        Qt.KeyboardModifier.NoModifier, Qt.ScrollPhase.NoScrollPhase, False,
    )  # fmt: skip
    fitted = hand.canvas.view
    QApplication.sendEvent(hand.canvas, event)
    assert hand.canvas.view.scale_px > 1.3 * fitted.scale_px
    assert hand.canvas.view.to_drawing((at.x(), at.y())) == pytest.approx(before)
    hand.key(Qt.Key.Key_Home)
    assert hand.canvas.view == fitted


@pytest.mark.parametrize("tokens", [LIGHT, DARK], ids=["light", "dark"])
def test_words_and_atoms_are_inked_in_the_themes_colours(
    hand: Hand, tokens: object
) -> None:
    look = hand.editor.look
    look.tokens = DARK if tokens is DARK else LIGHT
    log: list[TextRect] = []
    look.text_log = log
    hand.editor.show_structure("OCC[N+](C)(C)C")
    hand.editor.retune()
    image = hand.editor.grab().toImage()
    look.text_log = None
    ground = image.pixelColor(hand.canvas.mapTo(hand.editor, QPoint(3, 3)))
    assert ground == look.colour("lane")
    atoms = {one.text: one.colour for one in log if one.text in ("HO", "OH", "N⁺")}
    assert set(atoms) >= {"N⁺"}
    assert set(atoms.values()) == {look.colour("ink").name()}
    for one in log:
        x, y, width, height = one.rect
        left, top, wide, tall = one.room
        assert left <= x <= left + wide - width, one.text
        assert top <= y <= top + tall - height, one.text


def test_presented_drawing_has_the_texts_of_the_atoms(hand: Hand) -> None:
    hand.editor.show_structure("[2H]C([13CH3])C[NH3+]")
    drawing = hand.editor.drawing
    shown = presented(Shown(drawing=drawing, hydrogens=meaning(drawing).hydrogens))
    texts = {one.symbol + one.hydrogens + one.charge for one in shown.atoms}
    assert texts == {"D", "", "¹³CH3", "NH3⁺"}


def test_editor_has_names_for_screen_readers(hand: Hand) -> None:
    assert hand.canvas.accessibleName() == "Structure editor"
    for button in hand.editor.toolbar.buttons.values():
        assert button.accessibleName()
        assert button.toolTip()
    # One stop of Tab for the row, at the chosen tool; arrows go on from there.
    chosen = hand.editor.toolbar.buttons[hand.canvas.kit.tool]
    assert chosen.focusPolicy() == Qt.FocusPolicy.StrongFocus
    hand.canvas.setFocus()
    QTest.keyClick(hand.canvas, Qt.Key.Key_Backtab)
    assert chosen.hasFocus()
    QTest.keyClick(chosen, Qt.Key.Key_Right)
    assert hand.canvas.kit.tool is Tool.WEDGE
    assert hand.editor.toolbar.buttons[Tool.WEDGE].hasFocus()


def test_menu_does_what_it_says_and_greys_what_it_cannot(hand: Hand) -> None:
    entries = {
        one.text().partition("\t")[0]: one.isEnabled()
        for one in hand.editor.menu().actions()
    }
    assert entries["Paste"]
    assert not entries["Undo"]
    assert not entries["Clean up"]
    hand.editor.show_structure("CCO")
    menu = hand.editor.menu()
    clear = next(one for one in menu.actions() if one.text().startswith("Clear"))
    clear.trigger()
    assert hand.smiles == ""
    assert hand.told == [""]
    hand.editor.undo()
    assert hand.smiles == "CCO"


def test_program_ends_well_after_copying() -> None:
    # In a process of its own: what is checked is how the process ends.
    script = """
from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QApplication
app = QApplication([])
from spinledger_app.sketch.editor import StructureEditor
from spinledger_app.theme import Look
editor = StructureEditor(Look())
editor.show_structure("CCO")
editor.copy()
QTimer.singleShot(0, app.quit)
app.exec()
assert app.clipboard().text() == "CCO"
"""
    ended = subprocess.run(
        [sys.executable, "-c", script],
        env={**os.environ, "QT_QPA_PLATFORM": "offscreen"},
        capture_output=True,
        check=False,
        text=True,
        timeout=60,
    )
    assert (ended.returncode, ended.stderr) == (0, "")
