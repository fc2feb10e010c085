"""One row of a table: run it, or keep it, and say how it ended."""

from __future__ import annotations

import csv
import hashlib
import io
import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from spinledger.batch.job import Job, run_job
from spinledger.batch.table import Row
from spinledger.errors import SpinLedgerError, UsageError
from spinledger.processing.solvents import canonical_solvent
from spinledger.project.audit import versions
from spinledger.reconcile.options import ReconcileOptions
from spinledger.report.files import write_file

_JOB_FILE = "job.json"
_SUMMARY_COLUMNS = (
    "id",
    "data",
    "structure",
    "solvent",
    "result",
    "verdict",
    "probability",
    "claimed_protons",
    "found_protons",
    "inconsistent",
    "not_observed",
    "unexplained",
    "error",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class RowResult:
    """How one row ended."""

    row: Row
    cells: dict[str, str]
    has_failed: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class RowTask:
    """What a worker process needs for one row."""

    row: Row
    base: Path
    folder: Path
    options: ReconcileOptions

    @property
    def place(self) -> Path:
        """Folder of the row's results."""
        return self.folder / self.row.name


def settled_row(task: RowTask) -> RowResult | None:
    """Result of a row that needs no work: faulty, or finished before."""
    if task.row.fault:
        return failed_row(task.row, task.row.fault)
    if _mark_of(task.place) != _fingerprint(task):
        return None
    try:
        return _succeeded(task.row, _stored(task.place), "kept")
    except (OSError, ValueError, KeyError):  # lost or damaged since: do it again
        return None


def run_row(task: RowTask) -> RowResult:
    """Result of one row; whatever is wrong with it becomes its own error text."""
    row = task.row
    try:
        job = Job(
            data=_located(task.base, row.data),
            structure=_structure_text(task.base, row.structure),
            folder=task.place,
            solvent=_solvent(row.solvent),
            options=task.options,
        )
        run_job(job)
        # The mark comes last: a row that was killed half-way has none.
        mark = json.dumps(_fingerprint(task), indent=1)
        write_file(task.place / _JOB_FILE, mark.encode())
        return _succeeded(row, _stored(task.place), "done")
    except SpinLedgerError as error:
        return failed_row(row, str(error))
    except Exception as error:  # noqa: BLE001 - one row must never stop the rest
        return failed_row(row, f"internal fault, {type(error).__name__}: {error}")


def _solvent(name: str) -> str | None:
    if not name:
        return None
    known = canonical_solvent(name)
    if known is None:
        raise UsageError(f"The solvent {name!r} is not known.")
    return known


def _located(base: Path, text: str) -> Path:
    path = Path(text)
    return path if path.is_absolute() else base / path


def _structure_text(base: Path, text: str) -> str:
    """Path of a structure file beside the table, or the SMILES itself."""
    path = base / text
    try:
        return str(path) if path.is_file() else text
    except (OSError, ValueError):  # a SMILES that cannot be a file name
        return text


def _fingerprint(task: RowTask) -> dict[str, Any]:
    """What the result depends on beside the data's own bytes."""
    row = task.row
    return {
        "data": row.data,
        "structure": row.structure,
        "solvent": row.solvent,
        "stamp": _stamp(_located(task.base, row.data)),
        "options": hashlib.sha256(repr(task.options).encode()).hexdigest(),
        "versions": versions(),
    }


def _stamp(path: Path) -> list[int]:
    """Number of files, bytes, and newest change of some data."""
    files = (
        [one for one in path.rglob("*") if one.is_file()] if path.is_dir() else [path]
    )
    facts = [one.stat() for one in files if one.is_file()]
    newest = max((fact.st_mtime_ns for fact in facts), default=0)
    return [len(facts), sum(fact.st_size for fact in facts), newest]


def _mark_of(place: Path) -> dict[str, Any] | None:
    try:
        tree = json.loads((place / _JOB_FILE).read_text(encoding="utf-8"))
    except (OSError, ValueError):  # never finished, or damaged
        return None
    return tree if isinstance(tree, dict) else None


def _stored(place: Path) -> dict[str, Any]:
    tree: dict[str, Any] = json.loads((place / "ledger.json").read_text("utf-8"))
    return tree


def _succeeded(row: Row, tree: dict[str, Any], result: str) -> RowResult:
    states = [entry["state"] for entry in tree["entries"]]
    verdict = tree["verdict"]
    cells = {
        **_row_cells(row),
        "result": result,
        "verdict": verdict["state"],
        "probability": _cell(verdict["probability"]),
        "claimed_protons": _cell(tree["balance"]["claimed"]),
        "found_protons": _cell(tree["balance"]["found"]),
        "inconsistent": str(states.count("disputed")),
        "not_observed": str(states.count("open")),
        "unexplained": str(
            sum(stray["kind"] == "unexplained" for stray in tree["strays"])
        ),
        "error": "",
    }
    return RowResult(row=row, cells=cells, has_failed=False)


def failed_row(row: Row, error: str) -> RowResult:
    """Result of a row that could not be done, its error in one line."""
    cells = dict.fromkeys(_SUMMARY_COLUMNS, "")
    cells |= {**_row_cells(row), "result": "failed", "error": " ".join(error.split())}
    return RowResult(row=row, cells=cells, has_failed=True)


def _row_cells(row: Row) -> dict[str, str]:
    return {
        "id": row.name,
        "data": row.data,
        "structure": row.structure,
        "solvent": row.solvent,
    }


def _cell(value: float | None) -> str:
    return "" if value is None else f"{value:.4g}"


def summary_csv(results: Sequence[RowResult]) -> str:
    """summary.csv: one line a row of the table, in its order."""
    stream = io.StringIO(newline="")
    writer = csv.DictWriter(stream, fieldnames=_SUMMARY_COLUMNS)
    writer.writeheader()
    for result in results:
        writer.writerow(result.cells)
    return stream.getvalue()
