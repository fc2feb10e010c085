"""Tables of jobs: columns data, structure, solvent and id, in any dress."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from spinledger.errors import FileError

_COLUMNS = ("data", "structure")
_SEPARATOR = re.compile(r"\ufeff?sep=(.)\r?\n?", re.IGNORECASE)


class BatchTableError(FileError, ValueError):
    """The table of a batch cannot be read at all."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """One line of a table, and what is wrong with it before it even starts."""

    number: int
    name: str
    data: str
    structure: str
    solvent: str
    fault: str = ""


def read_table(path: Path) -> tuple[Row, ...]:
    """Rows of a batch table.

    Comma, semicolon or tab; UTF-8 (with or without mark), UTF-16 or
    Windows Latin; any line ends. Blank rows are left out, a faulty one is kept
    with its fault.

    Raises
    ------
    BatchTableError
        If the table is missing, empty, or has no column data or structure.
    """
    text = _text_of(path)
    lines = [line for line in text.splitlines() if line.strip()]
    if not lines:
        raise BatchTableError(path, "the table is empty")
    named = _SEPARATOR.match(text)  # a spreadsheet's own first line
    delimiter = named[1] if named else max(",;\t", key=lines[0].count)
    body = io.StringIO(text[named.end() :] if named else text, newline="")
    reader = csv.reader(body, delimiter=delimiter)
    try:
        cells = [row for row in reader if any(cell.strip() for cell in row)]
    except csv.Error as error:
        raise BatchTableError(
            path, f"line {reader.line_num} cannot be read as a table ({error})"
        ) from error
    head = [name.strip().lower() for name in cells[0]] if cells else []
    missing = [name for name in _COLUMNS if name not in head]
    if missing:
        raise BatchTableError(
            path,
            f"the column {missing[0]} is missing; the first line must name the "
            "columns data, structure, solvent and id",
        )
    return _rows(head, cells[1:])


def _rows(
    head: Sequence[str], rows_of_cells: Sequence[Sequence[str]]
) -> tuple[Row, ...]:
    rows: list[Row] = []
    taken: set[str] = set()
    for number, cells in enumerate(rows_of_cells, start=1):
        row = _row(
            number, dict(zip(head, (cell.strip() for cell in cells), strict=False))
        )
        if row.name.lower() in taken:
            row = Row(
                number=number,
                name=row.name,
                data=row.data,
                structure=row.structure,
                solvent=row.solvent,
                fault=f"The id {row.name!r} stands in the table before; ids must differ.",
            )
        taken.add(row.name.lower())
        rows.append(row)
    return tuple(rows)


def _row(number: int, cells: dict[str, str]) -> Row:
    given = cells.get("id", "")
    name = re.sub(r"[^\w.+-]+", "_", given).strip("._") or f"row-{number:04d}"
    fault = ""
    for column in _COLUMNS:
        if not cells.get(column):
            fault = f"The column {column} is empty in row {number}."
    return Row(
        number=number,
        name=name,
        data=cells.get("data", ""),
        structure=cells.get("structure", ""),
        solvent=cells.get("solvent", ""),
        fault=fault,
    )


def _text_of(path: Path) -> str:
    try:
        content = path.read_bytes()
    except FileNotFoundError as error:
        raise BatchTableError(path, "there is no such file") from error
    except OSError as error:
        reason = error.strerror or "it cannot be read"
        raise BatchTableError(path, f"it could not be read ({reason})") from error
    if content[:2] in (b"\xff\xfe", b"\xfe\xff"):
        return content.decode("utf-16", errors="replace")
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError:
        return content.decode("cp1252", errors="replace")
