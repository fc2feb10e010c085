"""What is told beside the spectrum: sample fields, side evidence, further advice."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from PySide6.QtCore import Qt, QTimer
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication
from stage import put_on, settle

from spinledger.report.tables import sample_rows
from spinledger_app.application import Parts
from spinledger_app.painting.ink import SECOND, wrap
from spinledger_app.views.dialogs import SampleDialog, SideDialog
from spinledger_app.views.ledger_rows import AdviceRow
from spinledger_app.views.published_list import PublishedListDialog

RETURN = Qt.Key.Key_Return


def answer(parts: Parts, name: str, act: Callable[[object], None]) -> None:
    """Open a dialog by its action, and act in it as it stands open."""
    QTimer.singleShot(0, lambda: act(QApplication.activeModalWidget()))
    parts.desk.do(name)
    parts.bench._timer.stop()


def test_operator_and_project_are_kept_and_reported(parts: Parts) -> None:
    def fill(dialog: object) -> None:
        assert isinstance(dialog, SampleDialog)
        QTest.keyClicks(dialog._fields["project"], "Esters")
        QTest.keyClicks(dialog._fields["operator"], "R. Roe")
        QTest.keyClick(dialog._fields["operator"], RETURN)

    answer(parts, "sample", fill)
    rows = dict(sample_rows(parts.bench.report_context().sample))
    assert (rows["Project"], rows["Operator"]) == ("Esters", "R. Roe")
    parts.desk.do("undo")
    assert parts.bench.project.sample.operator == ""


def test_side_evidence_is_checked_in_place_and_undone(parts: Parts) -> None:
    faults: list[str] = []

    def fill(dialog: object) -> None:
        assert isinstance(dialog, SideDialog)
        QTest.keyClicks(dialog.box, "HSQC: here and there")
        dialog.accept()
        faults.append(dialog.fault.text())
        dialog.box.selectAll()
        QTest.keyClicks(dialog.box, "carbons: 6")
        dialog.accept()

    answer(parts, "side_evidence", fill)
    assert faults[0] != ""
    assert parts.bench.project.options.side_text == "carbons: 6"
    assert parts.bench.project.needs_ledger
    parts.desk.do("undo")
    parts.bench._timer.stop()
    assert parts.bench.project.options.side_text == ""


def test_advice_is_shown_whole(parts: Parts) -> None:
    ledger = parts.bench.project.ledger
    assert ledger is not None
    long = " ".join(["which of the two lines goes when the tube is shaken"] * 4)
    advice = (replace(ledger.advice[0], look_for=long), *ledger.advice[1:])
    put_on(parts, replace(ledger, advice=advice))
    settle()
    row = parts.window.findChildren(AdviceRow)[0]
    width = row.width() - 32
    n_lines = len(wrap(parts.look, long, width, SECOND))
    assert n_lines > 1
    # The last baseline, from the row's own measures, lies inside the row.
    assert row.sizeHint().height() >= parts.look.px(19) + parts.look.px(17) * n_lines
    assert "3.1" in row.accessibleName()


def test_published_list_is_compared_as_it_is_pasted(parts: Parts) -> None:
    ledger = parts.bench.project.ledger
    assert ledger is not None
    shifts = sorted(
        (e.shift_ppm for e in ledger.entries if e.shift_ppm is not None), reverse=True
    )
    parts.desk.do("published_list")
    settle()
    dialog = parts.window.findChild(PublishedListDialog)
    assert dialog is not None
    QTest.keyClicks(dialog.box, "no shifts in this")
    assert dialog.words.text() != ""
    assert dialog.table.rowCount() == 0
    # The ledger's own shifts, all 0.02 ppm lower: one offset, no differences left.
    dialog.box.setPlainText(
        "1H NMR (400 MHz, CDCl3) δ "
        + ", ".join(f"{shift - 0.02:.3f} (m, 1H)" for shift in shifts)
    )
    assert "0.02" in dialog.words.text()
    pairs = [
        float(dialog.table.item(row, 2).text().replace("−", "-"))
        for row in range(dialog.table.rowCount())
        if dialog.table.item(row, 2).text()
    ]
    assert pairs
    assert max(abs(one) for one in pairs) <= 0.011
    dialog._copy.click()
    copied = QApplication.clipboard().text().splitlines()
    assert len(copied) == dialog.table.rowCount() + 1
    dialog.close()
