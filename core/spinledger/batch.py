"""One job from raw data to written reports, and tables of such jobs.

A table has the columns data, structure, solvent and id; every row becomes a
folder of results. Rows that are finished are not done again.
"""

from __future__ import annotations

import csv
import hashlib
import io
import json
import re
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ProcessPoolExecutor, wait
from dataclasses import dataclass, field
from importlib.util import find_spec
from multiprocessing import get_context
from pathlib import Path
from typing import Any

from spinledger.detection.evidence import gather_evidence
from spinledger.errors import SpinLedgerError, UsageError
from spinledger.io.read import read_acquired
from spinledger.processing.solvents import canonical_solvent
from spinledger.project.audit import versions
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.run import reconcile
from spinledger.report.context import ReportContext
from spinledger.report.files import check_writable, write_file
from spinledger.report.write import DEFAULT_FORMATS, write_reports
from spinledger.structure.read import read_structure
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import Ledger

Progress = Callable[[str, float], None]
_COLUMNS = ("data", "structure")
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


class BatchTableError(SpinLedgerError, ValueError):
    """The table of a batch cannot be read at all.

    Attributes
    ----------
    path : pathlib.Path
    reason : str
        One sentence for the user, without the path.
    """

    def __init__(self, path: Path, reason: str) -> None:
        super().__init__(path, reason)
        self.path = path
        self.reason = reason

    def __str__(self) -> str:
        return f"{self.path}: {self.reason}"


class ClusterError(SpinLedgerError):
    """The cluster cannot be reached, or its library is not installed."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Job:
    """One spectrum, one structure, one folder.

    Attributes
    ----------
    data : pathlib.Path
    structure : str
        SMILES or file.
    folder : pathlib.Path
        Where the reports go.
    solvent : str or None
        Canonical name.
    prefer_processed : bool
    options : ReconcileOptions
    formats : tuple of str
    context : ReportContext
    """

    data: Path
    structure: str
    folder: Path
    solvent: str | None = None
    prefer_processed: bool = False
    options: ReconcileOptions = field(default_factory=ReconcileOptions)
    formats: tuple[str, ...] = DEFAULT_FORMATS
    context: ReportContext = field(default_factory=ReportContext)


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """One line of a table, and what is wrong with it before it even starts."""

    number: int
    name: str
    data: str
    structure: str
    solvent: str
    fault: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class RowResult:
    """How one row ended."""

    row: Row
    cells: dict[str, str]
    has_failed: bool


def run_job(job: Job, *, progress: Progress | None = None) -> Ledger:
    """Read, process, reconcile and write one job.

    Everything that can be wrong with the input is found before the long work.

    Parameters
    ----------
    job : Job
    progress : callable, optional
        Called with a stage in words and a fraction from 0 to 1.

    Returns
    -------
    Ledger

    Raises
    ------
    SpinLedgerError
        A child that says in one sentence what is wrong.
    """
    report = progress or _silent
    check_writable(job.folder)
    structure = read_structure(job.structure)
    evidence = read_evidence(job, report)
    ledger = reconcile(
        evidence, structure, options=job.options, progress=_part(report, 0.15, 0.9)
    )
    write_reports(
        ledger,
        job.folder,
        formats=job.formats,
        context=job.context,
        progress=_part(report, 0.9, 1.0),
    )
    return ledger


def read_evidence(job: Job, report: Progress) -> Evidence:
    """Evidence of a job's spectrum."""
    acquired = read_acquired(job.data, prefer_processed=job.prefer_processed)
    report("processing the spectrum", 0.05)
    return gather_evidence(
        acquired, solvent=job.solvent, temperature_k=job.options.temperature_k
    )


def read_table(path: Path) -> tuple[Row, ...]:
    """Rows of a batch table.

    Comma, semicolon or tab; UTF-8 (with or without mark), UTF-16 or Latin-1;
    any line ends. A faulty row is kept with its fault.

    Raises
    ------
    BatchTableError
        If the table is missing, empty, or has no column data or structure.
    """
    text = _text_of(path)
    lines = [line for line in text.splitlines() if line.strip()]
    if not lines:
        raise BatchTableError(path, "the table is empty")
    delimiter = max(",;\t", key=lines[0].count)
    reader = csv.reader(io.StringIO("\n".join(lines)), delimiter=delimiter)
    head = [name.strip().lower() for name in next(reader)]
    missing = [name for name in _COLUMNS if name not in head]
    if missing:
        raise BatchTableError(
            path,
            f"the column {missing[0]} is missing; the first line must name the "
            "columns data, structure, solvent and id",
        )
    return _rows(head, reader)


def run_table(
    path: Path,
    folder: Path,
    *,
    workers: int = 1,
    cluster: str | None = None,
    options: ReconcileOptions | None = None,
    progress: Progress | None = None,
) -> tuple[RowResult, ...]:
    """Run every row of a table; finished rows of an earlier run are kept.

    Parameters
    ----------
    path : pathlib.Path
        The table; paths in it are relative to its folder.
    folder : pathlib.Path
        Gets one folder a row, and summary.csv.
    workers : int
        Processes; 1 works in this one.
    cluster : str, optional
        Address of a dask.distributed scheduler that does the work instead.
    options : ReconcileOptions, optional
    progress : callable, optional
        Called after every row with the count and a fraction from 0 to 1.

    Returns
    -------
    tuple of RowResult
        In the order of the table.

    Raises
    ------
    BatchTableError
        If the table itself cannot be read.
    ClusterError
        If the cluster cannot be used.
    OutputError
        If results cannot be written.
    """
    if workers < 1:
        raise ValueError(f"workers must be >= 1, got {workers!r}")
    rows = read_table(path)
    check_writable(folder)
    folder.mkdir(parents=True, exist_ok=True)
    chosen = options or ReconcileOptions()
    tasks = [
        _Task(row=row, base=path.parent, folder=folder, options=chosen) for row in rows
    ]
    results: dict[int, RowResult] = {}
    finished = _run_all(tasks, workers) if cluster is None else _run_on(tasks, cluster)
    for result in finished:
        results[result.row.number] = result
        if progress is not None:
            words = f"{len(results)} of {len(rows)} rows, last {result.row.name}"
            progress(words, len(results) / len(rows))
    ordered = tuple(results[row.number] for row in rows)
    write_file(folder / "summary.csv", summary_csv(ordered).encode("utf-8"))
    return ordered


def summary_csv(results: Sequence[RowResult]) -> str:
    """summary.csv: one line a row of the table, in its order."""
    stream = io.StringIO(newline="")
    writer = csv.DictWriter(stream, fieldnames=_SUMMARY_COLUMNS)
    writer.writeheader()
    for result in results:
        writer.writerow(result.cells)
    return stream.getvalue()


@dataclass(frozen=True, slots=True, kw_only=True)
class _Task:
    """What a worker process needs for one row."""

    row: Row
    base: Path
    folder: Path
    options: ReconcileOptions

    @property
    def place(self) -> Path:
        """Folder of the row's results."""
        return self.folder / self.row.name


def _run_all(tasks: Sequence[_Task], workers: int) -> Iterator[RowResult]:
    if workers == 1:
        for task in tasks:
            yield _run_row(task)
        return
    # Spawned, not forked: the libraries hold threads that must not be copied.
    with ProcessPoolExecutor(workers, mp_context=get_context("spawn")) as pool:
        waiting: set[Future[RowResult]] = {pool.submit(_run_row, one) for one in tasks}
        while waiting:
            done, waiting = wait(waiting, return_when=FIRST_COMPLETED)
            for future in done:
                yield future.result()


def _run_on(tasks: Sequence[_Task], address: str) -> Iterator[RowResult]:
    """Rows done by the workers of a cluster, as they finish."""
    if find_spec("distributed") is None:
        raise ClusterError(
            'A cluster needs dask.distributed; install it with "pip install '
            'spinledger[cluster]", or use --workers.'
        )
    from distributed import Client, as_completed  # noqa: PLC0415 - an extra

    try:
        client = Client(address, timeout=20)
    except (OSError, ValueError) as error:
        raise ClusterError(
            f"{address}: no scheduler answers there ({error}); check the address."
        ) from error
    with client:
        futures = [client.submit(_run_row, task, pure=False) for task in tasks]
        for future in as_completed(futures):
            yield future.result()


def _run_row(task: _Task) -> RowResult:
    """One row; whatever is wrong with it becomes its own error text."""
    row = task.row
    if row.fault:
        return _failed(row, row.fault)
    fingerprint = _fingerprint(task)
    if _is_finished(task.place, fingerprint):
        return _succeeded(row, _stored(task.place), "kept")
    try:
        solvent = _solvent(row.solvent)
        job = Job(
            data=_located(task.base, row.data),
            structure=_structure_text(task.base, row.structure),
            folder=task.place,
            solvent=solvent,
            options=task.options,
        )
        run_job(job)
    except SpinLedgerError as error:
        return _failed(row, str(error))
    except Exception as error:  # noqa: BLE001 - one row must never stop the rest
        return _failed(row, f"internal fault, {type(error).__name__}: {error}")
    write_file(task.place / _JOB_FILE, json.dumps(fingerprint, indent=1).encode())
    return _succeeded(row, _stored(task.place), "done")


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


def _fingerprint(task: _Task) -> dict[str, Any]:
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


def _is_finished(place: Path, fingerprint: dict[str, Any]) -> bool:
    path = place / _JOB_FILE
    if not path.is_file() or not (place / "ledger.json").is_file():
        return False
    try:
        return bool(json.loads(path.read_text(encoding="utf-8")) == fingerprint)
    except ValueError:
        return False


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


def _failed(row: Row, error: str) -> RowResult:
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


def _rows(head: Sequence[str], reader: Iterator[list[str]]) -> tuple[Row, ...]:
    rows: list[Row] = []
    taken: set[str] = set()
    for number, cells in enumerate(reader, start=1):
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
        return content.decode("latin-1")


def _part(report: Progress, start: float, end: float) -> Progress:
    """Progress of a part within the whole."""

    def scaled(stage: str, fraction: float) -> None:
        report(stage, start + (end - start) * fraction)

    return scaled


def _silent(_stage: str, _fraction: float) -> None:
    return None
