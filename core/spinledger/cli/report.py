"""``spinledger report``: make the reports of a project file again."""

from __future__ import annotations

import argparse
import datetime
import sys
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path

from spinledger.cli.progress import ProgressLine
from spinledger.cli.reconcile import context_from, formats_of
from spinledger.errors import SpinLedgerError
from spinledger.project.audit import differences_when_remade
from spinledger.project.solve import solve
from spinledger.project.storage import load_project
from spinledger.report.compare import compare_lists, list_of_ledger
from spinledger.report.context import context_of
from spinledger.report.files import check_writable
from spinledger.report.json_ledger import read_ledger_json
from spinledger.report.published import read_published
from spinledger.report.write import check_extras, write_reports


class UnfinishedProjectError(SpinLedgerError):
    """A project lacks the spectrum or the structure that a report needs."""


def run(arguments: argparse.Namespace) -> int:
    """Run the command; say first why the result may differ from the one before.

    Raises
    ------
    UnfinishedProjectError
        If there is no spectrum or no structure in the project.
    """
    formats = formats_of(arguments.formats)
    check_extras(formats)
    check_writable(arguments.out)
    template = context_from(arguments)
    published = read_published(arguments.published) if arguments.published else None
    project = load_project(arguments.project)
    for sentence in differences_when_remade(project, _versions(arguments.out)):
        sys.stdout.write(f"may differ: {sentence}\n")
    now = datetime.datetime.now().astimezone().isoformat(timespec="seconds")
    with ProgressLine() as progress:
        solved = solve(project, when=now, progress=progress)
        if solved.ledger is None:
            raise UnfinishedProjectError(
                f"{arguments.project}: the project has no spectrum or no structure; "
                "open it on the bench and add what is missing"
            )
        write_reports(
            solved.ledger,
            arguments.out,
            formats=formats,
            context=replace(
                context_of(solved, date=template.date),
                text=template.text,
                sections=template.sections,
                comparison=None
                if published is None
                else compare_lists(list_of_ledger(solved.ledger), published),
            ),
            progress=progress,
        )
    sys.stdout.write(f"{solved.ledger.verdict.state}: {arguments.out}\n")
    return 0


def _versions(folder: Path) -> Mapping[str, str]:
    """Versions that the reports in a folder were made with; none if there are none."""
    if not (folder / "ledger.json").is_file():
        return {}
    versions = read_ledger_json(folder).get("versions")
    return versions if isinstance(versions, dict) else {}
