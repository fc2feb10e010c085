"""Rail, ruler, line list, contenders by hand, print: with real events."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import invented
import pytest
from PySide6.QtCore import QEvent, QPoint, QPointF, QSettings, Qt
from PySide6.QtGui import QGuiApplication, QMouseEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication
from stage import put_on, settle, stage, take_down

from spinledger.report.context import ReportContext
from spinledger.report.html import report_html
from spinledger.structure.read import read_structure
from spinledger_app import tasks
from spinledger_app.application import Parts, build
from spinledger_app.presenters.drawing import drawing_of
from spinledger_app.presenters.line_list import line_rows, ruler_text
from spinledger_app.settings import BenchSettings
from spinledger_app.views import dialogs
from spinledger_app.views.lanes_view import LanesView
from spinledger_app.views.line_list import LineListDialog

LEFT = Qt.MouseButton.LeftButton


@pytest.fixture
def parts(qapp: object, tmp_path: Path) -> Iterator[Parts]:
    made = stage(tmp_path)
    yield made
    take_down(made)


def drag(lanes: LanesView, start: QPoint, end: QPoint) -> None:
    QTest.mousePress(lanes, LEFT, pos=start)
    for share in (0.3, 0.7, 1.0):
        at = QPointF(start) + (QPointF(end) - QPointF(start)) * share
        event = QMouseEvent(
            QEvent.Type.MouseMove, at, lanes.mapToGlobal(at),
            Qt.MouseButton.NoButton, LEFT, Qt.KeyboardModifier.AltModifier,
        )  # fmt: skip
        QApplication.sendEvent(lanes, event)


def test_left_panels_fold_to_a_rail_and_come_back(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    column = parts.window.left_column
    before = parts.window.lanes.width()
    QTest.keyClick(parts.window, Qt.Key.Key_F9)
    settle()
    assert column.width() == 44
    assert parts.window.lanes.width() > before + 150
    assert not parts.window.sketch.isVisible()
    QTest.mouseClick(column.rail.sketch, LEFT)
    settle()
    assert parts.window.sketch.isVisible()
    assert abs(parts.window.lanes.width() - before) <= 2


def test_folding_and_sizes_are_remembered(parts: Parts, tmp_path: Path) -> None:
    parts.window.take_sizes([300, 640, 420], [380, 300])
    sizes = parts.window.sizes_by_hand
    assert sizes is not None
    parts.settings.panel_sizes = sizes
    store = QSettings(str(tmp_path / "settings.ini"), QSettings.Format.IniFormat)
    parts.settings.folds_left = True
    store.sync()
    again = build(store)
    assert again.window.left_column.is_folded
    assert BenchSettings(store).panel_sizes == sizes
    take_down(again)


def test_a_drag_over_the_lanes_measures_in_hz(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    lanes = parts.window.lanes
    lanes.zoom_to(2.36, 2.56)
    lanes.finish_easing()
    settle()
    first, second = lanes.point_of(2.53), lanes.point_of(2.40)
    assert first is not None
    assert second is not None
    drag(lanes, first.toPoint(), second.toPoint())
    lanes.grab()  # the flag is painted while the button is down
    QTest.mouseRelease(lanes, LEFT, pos=second.toPoint())
    settle()
    # 0.13 ppm at 400 MHz are 52 Hz; a pixel is about 0.15 Hz here.
    assert lanes.region_ppm is not None
    low, high = lanes.region_ppm
    assert parts.bench.scene is not None
    frequency = parts.bench.scene.frequency_mhz
    assert (high - low) * frequency == pytest.approx(52, abs=0.5)
    assert ruler_text(low, high, frequency) in parts.window.status.words


def test_line_list_opens_before_any_structure_and_is_copied(parts: Parts) -> None:
    put_on(parts, None, has_structure=False)
    evidence = parts.bench.project.evidence
    assert evidence is not None
    n_lines = sum(len(one.lines) for one in evidence.signals)
    parts.desk.do("line_list")
    settle()
    dialog = parts.window.findChild(LineListDialog)
    assert dialog is not None
    assert dialog.isVisible()
    assert dialog.table.rowCount() == n_lines
    dialog.close()
    parts.desk.do("copy_lines")
    assert len(QGuiApplication.clipboard().text().splitlines()) == n_lines + 1


def test_line_list_gives_distances_of_neighbours_in_hz() -> None:
    evidence = invented.evidence()
    frequency = evidence.spectrum.spectrometer_frequency_mhz
    for row, after in zip(line_rows(evidence), line_rows(evidence)[1:], strict=False):
        if row[0] == after[0]:
            # Both are rounded to 0.0001 ppm, which is 0.04 Hz at 400 MHz.
            gap = (float(row[1]) - float(after[1])) * frequency
            assert float(row[6]) == pytest.approx(gap, abs=0.05)


def test_a_contender_is_added_and_dropped_by_hand(
    parts: Parts, monkeypatch: pytest.MonkeyPatch
) -> None:
    put_on(parts, invented.ledger())
    assert parts.window.contenders.add.isVisible()

    def read_now(_task: object, text: str, **hands: object) -> None:
        structure = read_structure(text)
        done = hands["done"]
        assert callable(done)
        done(tasks.ReadClaim(structure=structure, drawing=drawing_of(structure)))

    monkeypatch.setattr(parts.pool, "run", read_now)
    parts.bench.add_contender("CC(C)OC(=O)CCO")
    parts.bench._timer.stop()
    added = [one.smiles for one in parts.bench.project.options.contenders]
    assert added == ["CC(C)OC(=O)CCO"]
    assert parts.bench.project.needs_ledger
    parts.bench.drop_contender(added[0])
    parts.bench._timer.stop()
    assert parts.bench.project.options.contenders == ()
    parts.desk.do("undo")
    parts.bench._timer.stop()
    assert len(parts.bench.project.options.contenders) == 1


def contenders_only(parts: Parts) -> ReportContext:
    return replace(parts.bench.report_context(), sections=("contenders",))


def test_a_ticked_contender_alone_is_listed_in_the_report(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    card = parts.window.contenders.cards[1]
    smiles = card.text.smiles
    QTest.mouseClick(card.tick, LEFT, pos=card.tick.rect().center())
    settle()
    assert parts.bench.project.ticked == (smiles,)
    ledger = parts.bench.project.ledger
    assert ledger is not None
    page = report_html(ledger, contenders_only(parts))
    listed = page.split("<h3>Contenders</h3>")[1].split("</section>")[0]
    assert card.text.name in listed
    assert parts.window.contenders.cards[2].text.name not in listed
    # What was tested and is not listed is still counted, with its outcome.
    assert "Tested and not listed: 2, of which 1 excluded and 1 not" in listed
    parts.desk.do("undo")
    settle()
    assert parts.bench.project.ticked == ()
    assert not parts.window.contenders.cards[1].tick.isChecked()
    page = report_html(ledger, contenders_only(parts))
    assert "Tested and not listed" not in page


def shown_integral(parts: Parts, key: str) -> str:
    scene = parts.bench.scene
    mark = None if scene is None else scene.signal(key)
    return "" if mark is None else mark.text


def test_the_integral_of_a_signal_is_set_before_any_structure(
    parts: Parts, monkeypatch: pytest.MonkeyPatch
) -> None:
    put_on(parts, None, has_structure=False)
    scene = parts.bench.scene
    assert scene is not None
    mark = next(one for one in scene.signals if one.stray is None)
    parts.bench.selection.hover(None, mark.key)
    monkeypatch.setattr(dialogs, "ask_text", lambda *_: "6")
    parts.desk.do("integral")
    assert shown_integral(parts, mark.key) == "6.00"
    parts.desk.do("undo")
    assert shown_integral(parts, mark.key) == mark.text != "6.00"
