"""``spinledger reconcile``: one spectrum, one structure, one folder of reports."""

from __future__ import annotations

import argparse
import datetime
import sys

from spinledger.batch.job import Job, run_job
from spinledger.cli.inputs import options_of, solvent_of
from spinledger.cli.progress import ProgressLine
from spinledger.errors import UsageError
from spinledger.report.context import SECTIONS, ReportContext
from spinledger.report.text import TextOptions
from spinledger.report.write import DEFAULT_FORMATS, FILE_NAMES, check_extras


def run(arguments: argparse.Namespace) -> int:
    """Run the command; the verdict is in the files, so 0 is returned."""
    formats = formats_of(arguments.formats)
    check_extras(formats)
    job = Job(
        data=arguments.data,
        structure=arguments.structure,
        folder=arguments.out,
        solvent=solvent_of(arguments.solvent),
        prefer_processed=arguments.processed,
        options=options_of(arguments),
        formats=formats,
        context=context_from(arguments),
    )
    with ProgressLine() as progress:
        ledger = run_job(job, progress=progress)
    verdict = ledger.verdict
    chance = (
        ""
        if verdict.probability is None
        else f", probability {verdict.probability:.2f}"
    )
    sys.stdout.write(f"{verdict.state}{chance}: {arguments.out}\n")
    for reason in verdict.reasons:
        sys.stdout.write(f"  {reason}\n")
    return 0


def context_from(arguments: argparse.Namespace) -> ReportContext:
    """Date and template choices of a report from the words of a command.

    Raises
    ------
    UsageError
        If a part of the report is not known.
    """
    return ReportContext(
        date=today(),
        text=TextOptions(style=arguments.journal),
        sections=sections_of(arguments.sections),
    )


def sections_of(words: str | None) -> tuple[str, ...]:
    """Parts of the report from a comma list; a minus leaves one out.

    Raises
    ------
    UsageError
        If one is not known.

    Examples
    --------
    >>> sections_of("text,assignment"), "audit" in sections_of("-audit")
    (('text', 'assignment'), False)
    """
    listed = [one.strip() for one in (words or "").split(",") if one.strip()]
    unknown = [one for one in listed if one.removeprefix("-") not in SECTIONS]
    if unknown:
        raise UsageError(
            f"--sections: {unknown[0]!r} is not known; known are {', '.join(SECTIONS)}"
        )
    wanted = [one for one in listed if not one.startswith("-")]
    left_out = {one[1:] for one in listed if one.startswith("-")}
    return tuple(one for one in (wanted or SECTIONS) if one not in left_out)


def today() -> str:
    """Date as printed in a report: 1 December 2026."""
    date = datetime.datetime.now().astimezone().date()
    return f"{date.day} {date:%B %Y}"


def formats_of(words: str | None) -> tuple[str, ...]:
    """Report formats from a comma list.

    Raises
    ------
    UsageError
        If one is not known.
    """
    if words is None:
        return DEFAULT_FORMATS
    if words.strip() == "all":
        return tuple(FILE_NAMES)
    chosen = tuple(word.strip() for word in words.split(",") if word.strip())
    unknown = [word for word in chosen if word not in FILE_NAMES]
    if unknown or not chosen:
        raise UsageError(
            f"--formats: {unknown[0] if unknown else 'nothing'!r} is not known; known "
            f"are {', '.join(FILE_NAMES)} and all"
        )
    return chosen
