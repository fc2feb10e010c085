"""The whole story on the sample data, with real events and working processes."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtPrintSupport import QPrinter
from PySide6.QtWidgets import QWidget
from pytestqt.qtbot import QtBot
from stage import settle, stage, take_down

from spinledger.project.document import Project
from spinledger_app import tasks
from spinledger_app.application import Parts
from spinledger_app.places import example_place
from spinledger_app.views.controls import BenchButton

SMILES = "CCOC(=O)C[C@@H](C)O"
PATIENCE_MS = 150_000


@pytest.fixture(scope="module")
def parts(qapp: object, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Parts]:
    made = stage(tmp_path_factory.mktemp("bench"))
    options = replace(Project().options, is_quick=True)  # contenders take long
    made.bench.session.replace(Project(options=options), None)
    made.pool.start(tasks.WARM_UPS)
    yield made
    take_down(made)


def until_solved(qtbot: QtBot, parts: Parts) -> None:
    bench = parts.bench

    def is_solved() -> bool:
        assert not parts.window.status.is_error, parts.window.status.words
        project = bench.project
        return (
            project.ledger is not None
            and not project.needs_ledger
            and not bench.pool.is_busy
        )

    qtbot.waitUntil(is_solved, timeout=PATIENCE_MS)
    settle()


def click(qtbot: QtBot, widget: QWidget, at: QPoint | None = None) -> None:
    place = widget.rect().center() if at is None else at
    qtbot.mouseClick(widget, Qt.MouseButton.LeftButton, pos=place)
    settle()


def shift_of(parts: Parts, claim: str) -> float:
    ledger = parts.bench.project.ledger
    assert ledger is not None
    entry = next(one for one in ledger.entries if one.claim == claim)
    assert entry.shift_ppm is not None
    return entry.shift_ppm


def test_first_table_in_two_actions(qtbot: QtBot, parts: Parts) -> None:
    example = example_place()
    assert example is not None
    # One: the spectrum is dropped on the window.
    parts.window.places_dropped.emit([str(example.data)])
    # Two: the structure is pasted.
    QGuiApplication.clipboard().setText(SMILES)
    qtbot.keyClick(parts.window, Qt.Key.Key_V, Qt.KeyboardModifier.ControlModifier)
    until_solved(qtbot, parts)
    ledger = parts.bench.project.ledger
    assert ledger is not None
    rows = [row for row in parts.window.ledger.rows if row.isVisible()]
    assert len(rows) == len(ledger.entries)
    assert parts.window.lanes.is_folded  # folds by itself once it is solved
    assert all(tag.claim for tag in parts.window.sketch.tags.placed)
    assert len(parts.window.sketch.tags.placed) == len(ledger.entries)
    # The invented tube was made with the CH2 protons at 2.491 and 2.419 ppm;
    # 0.003 ppm is three line widths.
    found = sorted((shift_of(parts, "2-HA"), shift_of(parts, "2-HB")))
    assert found == pytest.approx([2.419, 2.491], abs=0.003)


def test_a_swapped_pair_is_corrected_in_two_clicks(qtbot: QtBot, parts: Parts) -> None:
    before = shift_of(parts, "2-HA"), shift_of(parts, "2-HB")
    row = parts.window.ledger.row_of("2-HA")
    assert row is not None
    click(qtbot, row, QPoint(40, 10))  # one
    swap = next(
        button
        for button in row.findChildren(BenchButton)
        if button.text().startswith("Swap")
    )
    assert swap.height() >= 24
    click(qtbot, swap)  # two
    assert len(parts.bench.project.edits) == 1
    until_solved(qtbot, parts)
    after = shift_of(parts, "2-HA"), shift_of(parts, "2-HB")
    assert after == pytest.approx((before[1], before[0]), abs=0.002)


def test_undo_and_redo_bring_both_ledgers_back(qtbot: QtBot, parts: Parts) -> None:
    swapped = parts.bench.project.ledger
    control = Qt.KeyboardModifier.ControlModifier
    qtbot.keyClick(parts.window, Qt.Key.Key_Z, control)
    settle()
    assert parts.bench.project.ledger is not swapped
    assert parts.bench.project.edits == ()
    shift = Qt.KeyboardModifier.ShiftModifier
    qtbot.keyClick(parts.window, Qt.Key.Key_Z, control | shift)
    settle()
    assert parts.bench.project.ledger is swapped  # without solving again
    qtbot.keyClick(parts.window, Qt.Key.Key_Z, control)
    settle()


def test_signal_and_proton_are_put_together(qtbot: QtBot, parts: Parts) -> None:
    lanes = parts.window.lanes
    scene = parts.bench.scene
    assert scene is not None
    place = lanes.point_of(shift_of(parts, "3-OH"))
    assert place is not None
    click(qtbot, lanes, place.toPoint())
    chosen = parts.bench.selection.marks.chosen_signal
    assert chosen is not None
    mark = scene.signal(chosen)
    assert mark is not None
    tag = next(t for t in parts.window.sketch.tags.placed if t.claim == "3-H")
    x, y = tag.centre
    click(qtbot, parts.window.sketch.canvas, QPoint(round(x), round(y)))
    edit = parts.bench.project.edits[-1]
    assert edit.description.startswith("3-H put to the signal")
    assert parts.bench.session.undo_stack.count() >= 1
    until_solved(qtbot, parts)
    assert mark.low_ppm <= shift_of(parts, "3-H") <= mark.high_ppm
    parts.desk.do("undo")
    settle()


def test_report_and_pdf_are_written(qtbot: QtBot, parts: Parts, tmp_path: Path) -> None:
    until_solved(qtbot, parts)
    written: list[object] = []
    parts.bench.reported.connect(written.append)
    parts.bench.write_report(tmp_path / "out", ("html", "csv", "json"))
    qtbot.waitUntil(lambda: len(written) == 1, timeout=PATIENCE_MS)
    parts.bench.write_pdf(tmp_path / "report.pdf")
    qtbot.waitUntil(lambda: len(written) == 2, timeout=PATIENCE_MS)
    printer = QPrinter(QPrinter.PrinterMode.HighResolution)
    printer.setOutputFormat(QPrinter.OutputFormat.PdfFormat)
    printer.setOutputFileName(str(tmp_path / "printed.pdf"))
    parts.desk.files.print_on(printer)
    assert (tmp_path / "printed.pdf").stat().st_size > 20_000
    assert (tmp_path / "out" / "ledger.json").stat().st_size > 1000
    assert (tmp_path / "report.pdf").read_bytes().startswith(b"%PDF-")


def test_saving_and_reopening_shows_the_same(
    qtbot: QtBot, parts: Parts, tmp_path: Path
) -> None:
    path = tmp_path / "tube.sledger"
    ledger = parts.bench.project.ledger
    assert ledger is not None
    assert parts.bench.session.is_unsaved
    parts.bench.save(path)
    qtbot.waitUntil(lambda: not parts.bench.session.is_unsaved, timeout=PATIENCE_MS)
    parts.bench.new_project()
    settle()
    assert parts.bench.scene is None
    parts.desk.files.open_places([str(path)])
    qtbot.waitUntil(lambda: parts.bench.project.ledger is not None, timeout=PATIENCE_MS)
    settle()
    again = parts.bench.project.ledger
    assert again is not None
    assert again.entries == ledger.entries
    assert again.verdict == ledger.verdict
    assert parts.window.lanes.scene is not None
    assert "tube.sledger" in parts.window.windowTitle()


def test_unreadable_data_are_told_in_place(
    qtbot: QtBot, parts: Parts, tmp_path: Path
) -> None:
    parts.bench.new_project()
    empty = tmp_path / "empty"
    empty.mkdir()
    parts.window.places_dropped.emit([str(empty)])
    view = parts.window.lanes_empty
    qtbot.waitUntil(view.list_button.isVisible, timeout=PATIENCE_MS)
    assert "empty" in parts.window.status.words
    assert parts.bench.project.acquired is None


def test_a_wrong_structure_is_told_and_changes_nothing(
    qtbot: QtBot, parts: Parts
) -> None:
    parts.bench.take_structure("C1CC(")
    qtbot.waitUntil(lambda: "C1CC(" in parts.window.status.words, timeout=PATIENCE_MS)
    assert parts.bench.project.structure is None
