"""Files: all of them or none, beside what is there already."""

import csv
import io
import os
import re
import zipfile
from pathlib import Path

import pytest
from docx import Document
from openpyxl import load_workbook

from invented_ledger import invented_ledger, overlapped_ledger
from spinledger.errors import OutputError
from spinledger.io.read import read_acquired
from spinledger.report import write as write_module
from spinledger.report.csv import COLUMNS, assignment_csv
from spinledger.report.files import check_writable, write_file, write_files
from spinledger.report.write import (
    DEFAULT_FORMATS,
    FILE_NAMES,
    MissingExtraError,
    write_reports,
)
from spinledger.values.acquisition import MakerSpectrum


def names(folder: Path) -> list[str]:
    return sorted(one.name for one in folder.iterdir())


def test_every_format_is_written_into_a_new_folder(tmp_path: Path) -> None:
    target = tmp_path / "deep" / "result"
    written = write_reports(invented_ledger(), target, formats=tuple(FILE_NAMES))
    assert names(target) == sorted(FILE_NAMES.values())
    assert {one.name for one in written} == set(FILE_NAMES.values())
    assert names(tmp_path) == ["deep"]
    assert names(tmp_path / "deep") == ["result"]  # nothing hidden is left


def test_an_existing_folder_keeps_its_other_files(tmp_path: Path) -> None:
    (tmp_path / "notes.txt").write_text("mine")
    (tmp_path / "ledger.json").write_text("old")
    write_reports(invented_ledger(), tmp_path)
    assert (tmp_path / "notes.txt").read_text() == "mine"
    assert (tmp_path / "ledger.json").read_text("utf-8").startswith("{")
    expected = {FILE_NAMES[one] for one in DEFAULT_FORMATS} | {"notes.txt"}
    assert set(names(tmp_path)) == expected


def test_a_fault_in_one_format_leaves_nothing_behind(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def broken(*_: object) -> str:
        raise RuntimeError("no drawing")

    monkeypatch.setattr(write_module, "report_html", broken)
    with pytest.raises(RuntimeError, match="no drawing"):
        write_reports(invented_ledger(), tmp_path / "result")
    assert names(tmp_path) == []


def test_a_file_in_place_of_the_folder_is_one_sentence(tmp_path: Path) -> None:
    (tmp_path / "result").write_text("a file")
    with pytest.raises(OutputError, match="this is a file; give a folder"):
        write_reports(invented_ledger(), tmp_path / "result")
    with pytest.raises(OutputError, match="is a file; give another folder"):
        write_reports(invented_ledger(), tmp_path / "result" / "inner")


def test_a_full_or_closed_disk_changes_nothing(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "a.txt").write_text("old")

    def full(_handle: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(OutputError, match="No space left on device"):
        write_files(tmp_path, {"a.txt": b"new", "b.txt": b"new"})
    with pytest.raises(OutputError, match="No space left on device"):
        write_files(tmp_path / "new" / "folder", {"a.txt": b"new"})
    with pytest.raises(OutputError, match="No space left on device"):
        write_file(tmp_path / "a.txt", b"new")
    assert names(tmp_path) == ["a.txt"]
    assert (tmp_path / "a.txt").read_text() == "old"


def test_a_folder_in_place_of_a_file_is_found_before_anything_moves(
    tmp_path: Path,
) -> None:
    (tmp_path / "report.html").mkdir()
    with pytest.raises(OutputError, match="a folder stands where this file belongs"):
        write_reports(invented_ledger(), tmp_path)
    assert names(tmp_path) == ["report.html"]


def test_checking_a_folder_does_not_make_it(tmp_path: Path) -> None:
    check_writable(tmp_path / "a" / "b")
    assert names(tmp_path) == []


@pytest.mark.skipif(
    getattr(os, "getuid", lambda: 0)() == 0,
    reason="this user may write everywhere",
)
def test_a_folder_without_write_right_is_one_sentence(tmp_path: Path) -> None:
    tmp_path.chmod(0o500)
    try:
        with pytest.raises(OutputError, match="cannot be written there"):
            check_writable(tmp_path / "result")
    finally:
        tmp_path.chmod(0o700)


def test_unknown_format_and_missing_extra_are_said(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    with pytest.raises(ValueError, match="no such format 'poem'"):
        write_reports(invented_ledger(), tmp_path, formats=("poem",))
    monkeypatch.setattr(write_module, "find_spec", lambda _name: None)
    with pytest.raises(MissingExtraError, match=r"docx needs python-docx; install"):
        write_reports(invented_ledger(), tmp_path / "x", formats=("docx", "json"))
    assert names(tmp_path) == []


def test_assignment_csv_has_one_row_a_claim() -> None:
    text = assignment_csv(overlapped_ledger())
    rows = list(csv.DictReader(io.StringIO(text)))
    assert tuple(rows[0]) == COLUMNS
    assert [row["claim"] for row in rows] == [
        "3-H",
        "1'-H",
        "3-OH",
        "2-HA",
        "2-HB",
        "2'-H",
        "4-H",
    ]
    first = rows[0]
    assert first["state"] == "assigned"
    assert first["atoms"] == "7"  # counted from 1 on paper
    assert float(first["shift_ppm"]) == 4.1903
    assert first["couplings_hz"] == "8.60(2) 2-HB; 6.31(2) 4-H; 3.41(2) 2-HA"
    assert first["group"] == "shared with 1'-H"
    assert rows[2]["shift_ppm"] == ""
    assert rows[2]["state"] == "exchanged"


def test_docx_holds_table_text_and_italic_j(tmp_path: Path) -> None:
    write_reports(invented_ledger(), tmp_path / "r", formats=("docx",))
    document = Document(str(tmp_path / "r" / "report.docx"))
    table = document.tables[0]
    assert [cell.text for cell in table.rows[0].cells][:2] == ["Claim", "δ, ppm"]
    assert [row.cells[0].text for row in table.rows[1:]] == [
        "3-H",
        "1′-H",
        "3-OH",
        "2-HA",
        "2-HB",
        "2′-H",
        "4-H",
        "Balance",
    ]  # by falling shift, as the ledger has them
    runs = [run for one in document.paragraphs for run in one.runs if run.italic]
    assert {run.text for run in runs} == {"J"}
    # The head row stands again on every page.
    with zipfile.ZipFile(tmp_path / "r" / "report.docx") as archive:
        assert b"w:tblHeader" in archive.read("word/document.xml")


def test_xlsx_keeps_numbers_as_numbers(tmp_path: Path) -> None:
    write_reports(invented_ledger(), tmp_path / "r", formats=("xlsx",))
    book = load_workbook(tmp_path / "r" / "report.xlsx")
    sheet = book["Assignment"]
    head = [cell.value for cell in sheet[1]]
    column = head.index("shift_ppm") + 1
    assert sheet.cell(row=2, column=column).value == 4.1903
    last = sheet.max_row
    assert sheet.cell(row=last, column=1).value == "balance"
    assert sheet.cell(row=last, column=1).border.bottom.style == "double"
    couplings = list(book["Couplings"].iter_rows(min_row=2, values_only=True))
    assert ("2-HA", "2-HB", -16.5, 0.02, "yes", None, -16, 1, "geminal") in couplings


def test_jcamp_comes_back_as_it_was(tmp_path: Path) -> None:
    ledger = invented_ledger()
    write_reports(ledger, tmp_path / "r", formats=("jcamp",))
    back = read_acquired(tmp_path / "r" / "spectrum.jdx")
    assert isinstance(back, MakerSpectrum)
    before = ledger.evidence.spectrum
    assert back.spectrum.n_points == before.n_points
    # The writer keeps 2**30 steps of the largest point.
    scale = float(abs(before.intensities).max())
    assert abs(back.spectrum.intensities - before.intensities).max() < 2e-9 * scale
    assert back.spectrum.first_point_ppm == pytest.approx(
        before.first_point_ppm, abs=1e-6
    )


def test_figure_file_is_the_one_in_the_page(tmp_path: Path) -> None:
    write_reports(invented_ledger(), tmp_path / "r")
    figure = (tmp_path / "r" / "figure.svg").read_text("utf-8").strip()
    assert figure in (tmp_path / "r" / "report.html").read_text("utf-8")
    text = (tmp_path / "r" / "experimental.txt").read_text("utf-8")
    assert re.match(r"¹H\s+NMR \(400", text)
