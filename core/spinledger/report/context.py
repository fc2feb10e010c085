"""What a report needs beside the ledger: date, sample, records, choices."""

from __future__ import annotations

from dataclasses import dataclass, field

from spinledger.project.document import AuditLine, Project, Sample
from spinledger.quantity.result import Quantity
from spinledger.report.compare import ListComparison
from spinledger.report.text import TextOptions
from spinledger.values.ledger import Verdict

SECTIONS = (
    "evidence",
    "assignment",
    "text",
    "cautions",
    "expansions",
    "strays",
    "quantity",
    "contenders",
    "geometry",
    "comparison",
    "advice",
    "audit",
    "signatures",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class ReportContext:
    """Choices and records of one report.

    Attributes
    ----------
    date : str
        As printed, "1 December 2026"; empty leaves it out.
    sample : Sample
    audit : tuple of AuditLine
        Steps in order, with times; empty on the command line.
    verdict_before_edits : Verdict or None
        Shown beside the verdict where hand edits changed it.
    text : TextOptions
        Journal form of the experimental sentence.
    quantity : Quantity or None
        Content that was asked for; None lets the report say what the strays tell.
    comparison : ListComparison or None
        A published list that was held against the ledger.
    contenders : tuple of str
        SMILES of the contenders to list; none, or none that was tested, for all.
    sections : tuple of str
        Parts to print, any of ``SECTIONS``; title and verdict always stand.
    """

    date: str = ""
    sample: Sample = field(default_factory=Sample)
    audit: tuple[AuditLine, ...] = ()
    verdict_before_edits: Verdict | None = None
    text: TextOptions = field(default_factory=TextOptions)
    quantity: Quantity | None = None
    comparison: ListComparison | None = None
    contenders: tuple[str, ...] = ()
    sections: tuple[str, ...] = SECTIONS

    def __post_init__(self) -> None:
        unknown = [name for name in self.sections if name not in SECTIONS]
        if unknown:
            raise ValueError(f"sections: no such part {unknown[0]!r}")


def context_of(project: Project, *, date: str) -> ReportContext:
    """Context with the records of an open project."""
    return ReportContext(
        date=date,
        sample=project.sample,
        audit=project.audit,
        verdict_before_edits=project.verdict_before_edits if project.edits else None,
        contenders=project.ticked,
    )
