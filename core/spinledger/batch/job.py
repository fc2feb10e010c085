"""One job from raw data to written reports."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

from spinledger.detection.evidence import gather_evidence
from spinledger.io.read import read_acquired
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.run import reconcile
from spinledger.report.context import ReportContext
from spinledger.report.files import check_writable
from spinledger.report.write import DEFAULT_FORMATS, write_reports
from spinledger.structure.read import read_structure
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import Ledger

Progress = Callable[[str, float], None]


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


def _part(report: Progress, start: float, end: float) -> Progress:
    """Progress of a part within the whole."""

    def scaled(stage: str, fraction: float) -> None:
        report(stage, start + (end - start) * fraction)

    return scaled


def _silent(_stage: str, _fraction: float) -> None:
    return None
