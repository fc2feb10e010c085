"""Several spectra of one sample: tabs, roles, ghosts, stepping, the shake pair."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import invented
import numpy as np
import pytest
from PySide6.QtCore import QMimeData, QPointF, Qt, QUrl
from PySide6.QtGui import QDropEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QMenu
from stage import settle
from test_texts import look_for_faults

from spinledger.project.spectra import spectra
from spinledger.project.storage import load_project, save_project
from spinledger_app import tasks
from spinledger_app.application import Parts
from spinledger_app.presenters.ledger import ledger_text


def another(name: str, solvent: str | None = None) -> tasks.ReadSpectrum:
    """The invented spectrum under another name, as other data."""
    acquired = invented.maker_spectrum()
    seen = invented.evidence()
    metadata = replace(
        acquired.metadata,
        source_name=name,
        sha256=f"{sum(map(ord, name)):064x}",
        solvent=solvent or acquired.metadata.solvent,
    )
    return tasks.ReadSpectrum(
        acquired=replace(acquired, metadata=metadata),
        evidence=replace(seen, metadata=metadata),
    )


def add(parts: Parts, name: str) -> None:
    parts.desk.spectra._take(Path(name), another(name))
    parts.bench._timer.stop()
    settle()


def shown_name(parts: Parts) -> str | None:
    return parts.bench.project.source_name


def press(parts: Parts, key: Qt.Key, *, shift: bool = False) -> None:
    modifier = (
        Qt.KeyboardModifier.ShiftModifier if shift else Qt.KeyboardModifier.NoModifier
    )
    parts.window.activateWindow()
    parts.window.lanes.setFocus()
    settle()
    QTest.keyClick(parts.window.lanes, key, modifier)
    parts.bench._timer.stop()
    settle()


def test_one_spectrum_has_no_tabs(parts: Parts) -> None:
    assert not parts.window.spectrum_tabs.isVisible()
    assert not parts.window.actions_by_name["next_spectrum"].isEnabled()


def test_an_added_spectrum_is_a_tab_with_its_role_and_can_be_undone(
    parts: Parts,
) -> None:
    add(parts, "batch-117 D2O shake")
    row = parts.window.spectrum_tabs
    assert row.isVisible()
    assert row.count() == 2
    assert row.currentIndex() == 0
    assert row.tabText(1).startswith("D₂O shake, ")
    assert "MHz" in row.tabText(1)
    assert row.accessibleTabName(1).startswith("batch-117 D2O shake, D₂O shake")
    assert shown_name(parts) == "batch-117"
    assert look_for_faults(parts) == []
    parts.desk.do("undo")
    settle()
    assert not row.isVisible()
    parts.desk.do("redo")
    settle()
    assert row.count() == 2


def test_the_same_data_are_not_taken_twice(parts: Parts) -> None:
    add(parts, "again")
    add(parts, "again")
    assert parts.window.spectrum_tabs.count() == 2


def test_a_click_and_a_key_go_to_another_spectrum(parts: Parts) -> None:
    add(parts, "crude")
    row = parts.window.spectrum_tabs
    QTest.mouseClick(row, Qt.MouseButton.LeftButton, pos=row.tabRect(1).center())
    parts.bench._timer.stop()
    settle()
    assert shown_name(parts) == "crude"
    press(parts, Qt.Key.Key_T)
    assert shown_name(parts) == "batch-117"
    assert row.currentIndex() == 0
    assert parts.bench.project.ledger is not None
    press(parts, Qt.Key.Key_T, shift=True)
    assert shown_name(parts) == "crude"
    parts.desk.do("undo")
    assert shown_name(parts) == "batch-117"


def test_the_menu_of_a_tab_sets_its_role_and_delete_takes_it_out(parts: Parts) -> None:
    add(parts, "crude")
    row = parts.window.spectrum_tabs
    key = row.shown_tabs[1].key
    parts.desk.spectra.open_menu(key, row.mapToGlobal(row.rect().center()))
    menu = next(one for one in parts.window.findChildren(QMenu) if one.isVisible())
    ticked = [one.text() for one in menu.actions() if one.isChecked()]
    assert ticked == ["Crude"]
    next(one for one in menu.actions() if one.text() == "Reference").trigger()
    menu.close()
    settle()
    assert row.tabText(1).startswith("Reference, ")
    row.setCurrentIndex(1)
    settle()
    QTest.keyClick(row, Qt.Key.Key_Delete)
    parts.bench._timer.stop()
    settle()
    assert not row.isVisible()
    assert shown_name(parts) == "batch-117"


def test_ghosts_are_drawn_while_the_toggle_is_on(parts: Parts) -> None:
    other = another("other")
    spectrum = other.evidence.spectrum
    moved = replace(spectrum, first_point_ppm=spectrum.first_point_ppm + 0.3)
    other = replace(other, evidence=replace(other.evidence, spectrum=moved))
    parts.desk.spectra._take(Path("other"), other)
    settle()
    lanes = parts.window.lanes
    before = lanes.grab().toImage()
    press(parts, Qt.Key.Key_O)
    assert len(lanes.ghosts) == 1
    assert lanes.grab().toImage() != before
    press(parts, Qt.Key.Key_O)
    assert lanes.ghosts == ()


def test_data_dropped_on_an_open_sample_are_offered_to_it(
    parts: Parts, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    place = tmp_path / "second.jdx"
    place.write_text("##TITLE= second\n", encoding="utf-8")
    added: list[list[Path]] = []
    monkeypatch.setattr(parts.desk.spectra, "add", added.append)
    data = QMimeData()
    data.setUrls([QUrl.fromLocalFile(str(place))])
    parts.window.dropEvent(
        QDropEvent(
            QPointF(500, 300),
            Qt.DropAction.CopyAction,
            data,
            Qt.MouseButton.LeftButton,
            Qt.KeyboardModifier.NoModifier,
        )
    )
    menu = next(one for one in parts.window.findChildren(QMenu) if one.isVisible())
    menu.actions()[0].trigger()
    menu.close()
    assert added == [[place]]


def test_the_project_file_keeps_the_spectra(parts: Parts, tmp_path: Path) -> None:
    add(parts, "crude")
    path = tmp_path / "two.sledger"
    save_project(parts.bench.project, path)
    opened = load_project(path)
    assert [one.role for one in spectra(opened)] == ["main", "crude"]
    parts.bench.session.replace(opened, path)
    parts.bench._timer.stop()
    settle()
    assert parts.window.spectrum_tabs.count() == 2


def test_the_rows_say_what_exchanged_in_a_shake(parts: Parts) -> None:
    other = another("batch-117 D2O shake")
    spectrum = other.evidence.spectrum
    shifts = spectrum.first_point_ppm - spectrum.step_ppm * np.arange(spectrum.n_points)
    is_oh = (shifts > 2.75) & (shifts < 3.17)
    halved = np.where(is_oh, 0.5, 1.0) * spectrum.intensities
    shaken = replace(other.evidence, spectrum=replace(spectrum, intensities=halved))
    handlers = parts.desk.spectra
    handlers._take(Path("shake"), replace(other, evidence=shaken))
    settle()
    asked = handlers._pair
    assert asked is not None
    shake = tasks.shake(lambda _stage, _part: None, lambda: False, *asked)
    handlers._take_shake(asked, shake)
    settle()
    ledger = parts.bench.project.ledger
    assert ledger is not None
    text = handlers.ledger_text(ledger_text(ledger))
    told = {row.claim: row.sentences for row in text.rows}
    assert "OH exchanged in part (0.5" in told["OH"][-1]
    assert not any("exchanged" in one for one in told["4-H"])
    assert "OH exchanged in part" in parts.window.status.accessibleName()
