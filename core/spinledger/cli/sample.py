"""``spinledger sample``: several spectra of one tube against one structure."""

from __future__ import annotations

import argparse
import re
import sys
from pathlib import Path

from spinledger.batch.job import Job, run_job
from spinledger.cli.inputs import options_of, solvent_of
from spinledger.cli.progress import ProgressLine
from spinledger.cli.reconcile import today
from spinledger.io.read import read_acquired
from spinledger.report.context import ReportContext
from spinledger.report.files import check_writable, write_files
from spinledger.report.joint import joint_csv, joint_json, joint_verdict


def run(arguments: argparse.Namespace) -> int:
    """Run the command: a folder of reports for each spectrum, and the joint result."""
    solvent = solvent_of(arguments.solvent)
    options = options_of(arguments)
    check_writable(arguments.out)
    for path in arguments.data:  # what cannot be read is said before the long work
        read_acquired(path, prefer_processed=arguments.processed)
    names = [_folder(rank, path) for rank, path in enumerate(arguments.data, start=1)]
    ledgers = []
    with ProgressLine() as progress:
        for path, name in zip(arguments.data, names, strict=True):
            job = Job(
                data=path,
                structure=arguments.structure,
                folder=arguments.out / name,
                solvent=solvent,
                prefer_processed=arguments.processed,
                options=options,
                context=ReportContext(date=today()),
            )
            ledgers.append(run_job(job, progress=progress))
    write_files(
        arguments.out,
        {
            "sample.csv": joint_csv(ledgers).encode("utf-8"),
            "sample.json": joint_json(ledgers, names).encode("utf-8"),
        },
    )
    verdict = joint_verdict(ledgers)
    sys.stdout.write(f"{verdict.state}: {arguments.out}\n")
    for reason in verdict.reasons:
        sys.stdout.write(f"  {reason}\n")
    return 0


def _folder(rank: int, path: Path) -> str:
    """Name of a spectrum's folder: its place in the call, and what it is called."""
    stem = re.sub(r"[^\w.+-]+", "_", path.resolve().name).strip("._")
    return f"{rank}-{stem}" if stem else str(rank)
