"""``spinledger batch``: every row of a table, resumable."""

from __future__ import annotations

import argparse
import sys
import time

from spinledger.batch.row import RowResult
from spinledger.batch.run import run_table
from spinledger.cli.progress import ProgressLine
from spinledger.reconcile.options import ReconcileOptions


def run(arguments: argparse.Namespace) -> int:
    """Run the command; 1 if any row failed."""
    start = time.monotonic()
    with ProgressLine() as line:

        def progress(stage: str, fraction: float) -> None:
            line(f"{stage}, {_time_left(start, fraction)}", fraction)

        results = run_table(
            arguments.table,
            arguments.out,
            workers=arguments.workers,
            cluster=arguments.cluster,
            options=ReconcileOptions(quick=arguments.quick),
            progress=progress,
        )
    failed = [one for one in results if one.has_failed]
    for one in failed:
        sys.stdout.write(f"failed: {_named(one)}: {one.cells['error']}\n")
    sys.stdout.write(
        f"{len(results) - len(failed)} of {len(results)} rows done: "
        f"{arguments.out / 'summary.csv'}\n"
    )
    return 1 if failed else 0


def _named(result: RowResult) -> str:
    return f"row {result.row.number} ({result.row.name})"


def _time_left(start: float, fraction: float) -> str:
    if fraction <= 0:
        return "time left unknown"
    seconds = (time.monotonic() - start) * (1 - fraction) / fraction
    return (
        f"about {seconds / 60:.0f} min left"
        if seconds > 90
        else f"{seconds:.0f} s left"
    )
