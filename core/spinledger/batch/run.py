"""All rows of a table, over processes or a cluster; finished rows are kept."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from concurrent.futures import BrokenExecutor, ProcessPoolExecutor, as_completed
from importlib.util import find_spec
from multiprocessing import get_context
from pathlib import Path

from spinledger.batch.job import Progress
from spinledger.batch.row import (
    RowResult,
    RowTask,
    failed_row,
    run_row,
    settled_row,
    summary_csv,
)
from spinledger.batch.table import read_table
from spinledger.errors import SpinLedgerError
from spinledger.reconcile.options import ReconcileOptions
from spinledger.report.files import check_writable, write_file
from spinledger.report.overview import overview_html


class ClusterError(SpinLedgerError):
    """The cluster cannot be reached, or its library is not installed."""


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
        Gets one folder a row, summary.csv and overview.html.
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
        RowTask(
            row=row,
            base=path.resolve().parent,  # workers elsewhere stand in other folders
            folder=folder.resolve(),
            options=chosen,
        )
        for row in rows
    ]
    results: dict[int, RowResult] = {}
    for result in _results(tasks, workers, cluster):
        results[result.row.number] = result
        if progress is not None:
            words = f"{len(results)} of {len(rows)} rows, last {result.row.name}"
            progress(words, len(results) / len(rows))
    ordered = tuple(results[row.number] for row in rows)
    write_file(folder / "summary.csv", summary_csv(ordered).encode("utf-8"))
    page = overview_html([result.cells for result in ordered], title=path.name)
    write_file(folder / "overview.html", page.encode("utf-8"))
    return ordered


def _results(
    tasks: Sequence[RowTask], workers: int, cluster: str | None
) -> Iterator[RowResult]:
    """Results as they come: first the rows that need no work."""
    waiting: list[RowTask] = []
    for task in tasks:
        settled = settled_row(task)
        if settled is None:
            waiting.append(task)
        else:
            yield settled
    if not waiting:
        return
    if cluster is None:
        yield from _run_all(waiting, workers)
    else:
        yield from _run_on(waiting, cluster)


def _run_all(tasks: Sequence[RowTask], workers: int) -> Iterator[RowResult]:
    if workers == 1:
        for task in tasks:
            yield run_row(task)
        return
    lost: list[RowTask] = []
    # Spawned, not forked: the libraries hold threads that must not be copied.
    with ProcessPoolExecutor(workers, mp_context=get_context("spawn")) as pool:
        futures = {pool.submit(run_row, task): task for task in tasks}
        for future in as_completed(futures):
            try:
                yield future.result()
            except BrokenExecutor:  # one worker died and took the pool with it
                lost.append(futures[future])
    for task in lost:
        yield _run_alone(task)


def _run_alone(task: RowTask) -> RowResult:
    """A row in a process of its own, so that only the guilty one fails."""
    with ProcessPoolExecutor(1, mp_context=get_context("spawn")) as pool:
        try:
            return pool.submit(run_row, task).result()
        except BrokenExecutor:
            return failed_row(
                task.row, "The worker process died (out of memory, or killed)."
            )


def _run_on(tasks: Sequence[RowTask], address: str) -> Iterator[RowResult]:
    """Rows done by the workers of a cluster, as they finish."""
    if find_spec("distributed") is None:
        raise ClusterError(
            'A cluster needs dask.distributed; install it with "pip install '
            'spinledger[cluster]", or use --workers.'
        )
    from distributed import Client  # noqa: PLC0415 - an extra
    from distributed import as_completed as finished  # noqa: PLC0415 - an extra

    try:
        client = Client(address, timeout=20)
    except (OSError, ValueError) as error:
        raise ClusterError(
            f"{address}: no scheduler answers there ({error}); check the address."
        ) from error
    with client:
        futures = [client.submit(run_row, task, pure=False) for task in tasks]
        for future in finished(futures):
            yield future.result()
