"""``spinledger sample``: several spectra of one tube against one structure."""

from __future__ import annotations

import argparse
import datetime
import re
import sys
from dataclasses import replace
from pathlib import Path

from spinledger.batch.job import Job, run_job
from spinledger.cli.inputs import options_of, solvent_of
from spinledger.cli.progress import ProgressLine
from spinledger.cli.reconcile import today
from spinledger.errors import EvidenceError, UsageError
from spinledger.io.read import read_acquired
from spinledger.project.document import Project, open_structure, with_ledger
from spinledger.project.spectra import add_spectrum, show_spectrum, spectra
from spinledger.project.storage import save_project
from spinledger.report.context import ReportContext
from spinledger.report.files import check_writable, write_files
from spinledger.report.joint import couplings_csv, joint_csv, joint_json
from spinledger.report.sample_html import sample_html
from spinledger.sample.batch_reference import BatchLimits
from spinledger.sample.joint_values import Witness
from spinledger.sample.put_together import put_together
from spinledger.sample.roles import ROLES, Role
from spinledger.structure.read import read_structure
from spinledger.values.ledger import Ledger


def run(arguments: argparse.Namespace) -> int:
    """Run the command: a folder of reports for each spectrum, and the joint result."""
    solvent = solvent_of(arguments.solvent)
    options = options_of(arguments)
    roles = roles_of(arguments.roles, len(arguments.data))
    check_writable(arguments.out)
    structure = read_structure(arguments.structure)
    when = datetime.datetime.now().astimezone().isoformat(timespec="seconds")
    project = Project(name=arguments.out.name)
    for path, role in zip(arguments.data, roles, strict=True):
        acquired = read_acquired(path, prefer_processed=arguments.processed)
        project = add_spectrum(
            project, acquired, source_path=str(path), when=when, role=role, again=True
        )
    project = open_structure(project, structure, when=when)
    folders = [_folder(rank, path) for rank, path in enumerate(arguments.data, start=1)]
    names = _names(arguments.data)
    witnesses: list[Witness] = []
    kept: list[str] = []
    notes: list[str] = []
    with ProgressLine() as progress:
        for one, path, folder, name in zip(
            spectra(project), arguments.data, folders, names, strict=True
        ):
            job = Job(
                data=path,
                structure=arguments.structure,
                folder=arguments.out / folder,
                solvent=solvent,
                prefer_processed=arguments.processed,
                options=options,
                context=ReportContext(date=today()),
            )
            try:
                ledger = run_job(job, progress=progress)
            except EvidenceError as error:
                notes.append(f"{name} is left out: {error.reason}.")
                continue
            witnesses.append(Witness(name=name, role=one.role, ledger=ledger))
            kept.append(folder)
            project = _with_ledger(project, one.key, ledger, when)
        if not witnesses:
            raise EvidenceError(", ".join(names), "none of the spectra can be used")
        progress("putting the spectra together", 0.99)
        outcome = put_together(
            witnesses,
            limits=_limits(arguments),
            notes=notes,
            again=not options.quick,
        )
    joint = outcome.joint
    write_files(
        arguments.out,
        {
            "sample.csv": joint_csv(joint, witnesses).encode("utf-8"),
            "couplings.csv": couplings_csv(joint).encode("utf-8"),
            "sample.html": sample_html(
                joint, witnesses, outcome.comparisons, date=today()
            ).encode("utf-8"),
            "sample.json": joint_json(
                joint, witnesses, kept, outcome.comparisons
            ).encode("utf-8"),
        },
    )
    if arguments.project is not None:
        save_project(replace(project, name=arguments.project.stem), arguments.project)
    sys.stdout.write(f"{joint.state}: {arguments.out}\n")
    for reason in joint.reasons:
        sys.stdout.write(f"  {reason}\n")
    for comparison in outcome.comparisons:
        for sentence in comparison.sentences():
            sys.stdout.write(f"  {sentence}\n")
    return 0


def roles_of(words: str | None, n_spectra: int) -> tuple[Role | None, ...]:
    """Roles from a comma list; None where they are to be guessed.

    Raises
    ------
    UsageError
        If one is not known, or there are more or fewer than spectra.
    """
    if words is None:
        return (None,) * n_spectra
    known: dict[str, Role | None] = {one.lower(): one for one in ROLES}
    known |= {"shake": "D2O shake", "guess": None, "": None}
    given = [one.strip().lower() for one in words.split(",")]
    for one in given:
        if one not in known:
            raise UsageError(
                f"--roles: {one!r} is not known; known are {', '.join(ROLES)} and guess"
            )
    if len(given) != n_spectra:
        raise UsageError(
            f"--roles: {len(given)} roles for {n_spectra} spectra; give one each"
        )
    return tuple(known[one] for one in given)


def _limits(arguments: argparse.Namespace) -> BatchLimits:
    return BatchLimits(
        line_mol_percent=arguments.line_limit,
        integral_percent=arguments.integral_limit,
        shift_ppm=arguments.shift_limit,
    )


def _with_ledger(project: Project, key: int, ledger: Ledger, when: str) -> Project:
    shown = project.key
    solved = with_ledger(show_spectrum(project, key), ledger, when=when)
    return show_spectrum(solved, shown)


def _folder(rank: int, path: Path) -> str:
    """Name of a spectrum's folder: its place in the call, and what it is called."""
    stem = re.sub(r"[^\w.+-]+", "_", path.resolve().name).strip("._")
    return f"{rank}-{stem}" if stem else str(rank)


def _names(paths: list[Path]) -> list[str]:
    """What the spectra are called in sentences: each name once."""
    names = [path.resolve().name for path in paths]
    return [
        name if names.count(name) == 1 else f"{name} ({rank})"
        for rank, name in enumerate(names, start=1)
    ]
