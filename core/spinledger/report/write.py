"""All result files of one ledger, rendered first and written together."""

from __future__ import annotations

import tempfile
from collections.abc import Callable, Mapping, Sequence
from importlib.util import find_spec
from pathlib import Path

from spinledger.errors import SpinLedgerError
from spinledger.io.write import write_jcamp
from spinledger.report.context import ReportContext
from spinledger.report.csv import assignment_csv
from spinledger.report.figure import overview_svg
from spinledger.report.files import write_files
from spinledger.report.html import report_html
from spinledger.report.json_ledger import ledger_text
from spinledger.report.nmredata import nmredata_record
from spinledger.report.text import (
    experimental_text,
    reference_sentence,
    standing_sentence,
)
from spinledger.values.ledger import Ledger

Progress = Callable[[str, float], None]
DEFAULT_FORMATS = ("csv", "text", "svg", "html", "json")
FILE_NAMES: Mapping[str, str] = {
    "csv": "assignment.csv",
    "text": "experimental.txt",
    "svg": "figure.svg",
    "html": "report.html",
    "docx": "report.docx",
    "xlsx": "report.xlsx",
    "nmredata": "assignment.nmredata.sdf",
    "jcamp": "spectrum.jdx",
    # Last, so that a ledger.json always has its companions beside it.
    "json": "ledger.json",
}
_EXTRAS: Mapping[str, tuple[str, str]] = {
    "docx": ("docx", "python-docx"),
    "xlsx": ("openpyxl", "openpyxl"),
}


class MissingExtraError(SpinLedgerError):
    """A report format needs a package that is not installed."""


def write_reports(
    ledger: Ledger,
    folder: Path,
    *,
    formats: Sequence[str] = DEFAULT_FORMATS,
    context: ReportContext | None = None,
    progress: Progress | None = None,
) -> tuple[Path, ...]:
    """Render every asked-for format, then write all files or none.

    Parameters
    ----------
    ledger : Ledger
    folder : pathlib.Path
        Made if it is not there; other files in it stay.
    formats : sequence of str
        Any of ``FILE_NAMES``.
    context : ReportContext, optional
        Date, sample, records and choices of the report.
    progress : callable, optional
        Called with what is being written and a fraction from 0 to 1.

    Returns
    -------
    tuple of pathlib.Path
        The files written.

    Raises
    ------
    ValueError
        If a format is not known.
    MissingExtraError
        If python-docx or openpyxl is asked for and not installed.
    OutputError
        If the folder cannot be written to; then nothing has changed.
    """
    chosen = context or ReportContext()
    wanted = [name for name in FILE_NAMES if name in formats]
    unknown = [name for name in formats if name not in FILE_NAMES]
    if unknown:
        raise ValueError(f"formats: no such format {unknown[0]!r}")
    check_extras(wanted)
    contents: dict[str, bytes] = {}
    for rank, name in enumerate(wanted):
        if progress is not None:
            progress(f"writing {FILE_NAMES[name]}", rank / len(wanted))
        contents[FILE_NAMES[name]] = _render(name, ledger, chosen)
    write_files(folder, contents)
    return tuple(folder / name for name in contents)


def check_extras(formats: Sequence[str]) -> None:
    """Make sure that the packages which some formats need are installed.

    Raises
    ------
    MissingExtraError
        One sentence that names the package and how to install it.
    """
    for name in formats:
        module, package = _EXTRAS.get(name, ("", ""))
        if module and find_spec(module) is None:
            raise MissingExtraError(
                f"The format {name} needs {package}; install it with "
                '"pip install spinledger[report]", or leave the format out.'
            )


def _render(name: str, ledger: Ledger, context: ReportContext) -> bytes:
    if name == "jcamp":
        return _jcamp(ledger)
    makers: Mapping[str, Callable[[], str | bytes]] = {
        "csv": lambda: assignment_csv(ledger),
        "text": lambda: _experimental(ledger, context),
        "svg": lambda: overview_svg(ledger) + "\n",
        "html": lambda: report_html(ledger, context),
        "json": lambda: ledger_text(ledger),
        "docx": lambda: _docx(ledger, context),
        "xlsx": lambda: _xlsx(ledger, context),
        "nmredata": lambda: nmredata_record(ledger),
    }
    made = makers[name]()
    return made if isinstance(made, bytes) else made.encode("utf-8")


def _experimental(ledger: Ledger, context: ReportContext) -> str:
    sentences = (
        experimental_text(ledger, context.text),
        standing_sentence(ledger),
        reference_sentence(ledger),
    )
    return "".join(f"{sentence}\n" for sentence in sentences if sentence)


def _docx(ledger: Ledger, context: ReportContext) -> bytes:
    from spinledger.report.docx import report_docx  # noqa: PLC0415 - an extra

    return report_docx(ledger, context)


def _xlsx(ledger: Ledger, context: ReportContext) -> bytes:
    from spinledger.report.xlsx import report_xlsx  # noqa: PLC0415 - an extra

    return report_xlsx(ledger, context)


def _jcamp(ledger: Ledger) -> bytes:
    evidence = ledger.evidence
    with tempfile.TemporaryDirectory() as place:
        path = Path(place, "spectrum.jdx")
        write_jcamp(evidence.spectrum, evidence.metadata, path)
        return path.read_bytes()
