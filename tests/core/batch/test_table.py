"""Tables as they come out of spreadsheets and editors."""

from pathlib import Path

import pytest

from spinledger.batch.table import BatchTableError, Row, read_table

ROWS = ("id,data,structure,solvent", "one,a.dx,CCO,CDCl3", "zwei µ,b é.dx,CC=O,")


def table(folder: Path, content: bytes) -> tuple[Row, ...]:
    path = folder / "table.csv"
    path.write_bytes(content)
    return read_table(path)


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("code", ["utf-8", "utf-8-sig", "utf-16", "cp1252"])
def test_line_ends_and_encodings(tmp_path: Path, end: str, code: str) -> None:
    rows = table(tmp_path, (end.join(ROWS) + end).encode(code))
    assert [row.data for row in rows] == ["a.dx", "b é.dx"]
    assert [row.fault for row in rows] == ["", ""]
    assert rows[1].name == "zwei_µ"


@pytest.mark.parametrize("mark", [";", "\t"])
def test_other_separators(tmp_path: Path, mark: str) -> None:
    text = "\n".join(ROWS).replace(",", mark)
    assert len(table(tmp_path, text.encode())) == 2
    said = f"sep={mark}\r\n{text}"
    assert table(tmp_path, said.encode()) == table(tmp_path, text.encode())


def test_rows_that_a_spreadsheet_left_blank_are_no_rows(tmp_path: Path) -> None:
    rows = table(tmp_path, ("\n".join(ROWS) + "\n,,,\n , ,,\n\n").encode())
    assert len(rows) == 2


def test_a_cell_may_hold_a_line_end(tmp_path: Path) -> None:
    rows = table(
        tmp_path, b'id,data,structure,note\n1,a.dx,CCO,"two\nlines"\n2,b.dx,CC,\n'
    )
    assert [row.name for row in rows] == ["1", "2"]


def test_ids_that_differ_only_in_case_or_are_repeated_are_faults(
    tmp_path: Path,
) -> None:
    rows = table(tmp_path, b"id,data,structure\nA,a.dx,C\na,b.dx,C\nB,c.dx,C\n")
    assert [bool(row.fault) for row in rows] == [False, True, False]
    assert "ids must differ" in rows[1].fault


def test_missing_cells_are_the_rows_own_fault(tmp_path: Path) -> None:
    rows = table(tmp_path, b"id,data,structure\n1,,C\n2,a.dx\n,b.dx,C\n")
    assert "column data is empty" in rows[0].fault
    assert "column structure is empty" in rows[1].fault
    assert rows[2].name == "row-0003"


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "empty"),
        (b"\n\n", "empty"),
        (b"id,data\n1,a.dx\n", "column structure is missing"),
        (b'id,data,structure\n1,"' + b"x" * 200_000 + b'",C\n', "cannot be read"),
    ],
)
def test_what_is_no_table_is_one_sentence(
    tmp_path: Path, content: bytes, words: str
) -> None:
    with pytest.raises(BatchTableError, match=words):
        table(tmp_path, content)


def test_no_name_leads_out_of_the_folder(tmp_path: Path) -> None:
    rows = table(tmp_path, b"id,data,structure\n../../x,a.dx,C\n..,b.dx,C\n")
    assert rows[0].name == "x"
    assert rows[1].name == "row-0002"
