"""report.docx: the tables and the journal text as an editable document.

Drawings are vector in the HTML and PDF forms; Word's own format takes no SVG
from here, so the document names figure.svg instead of embedding a raster image.
"""

from __future__ import annotations

import io
from collections.abc import Iterable, Sequence
from typing import Any

from docx import Document
from docx.enum.text import WD_ALIGN_PARAGRAPH
from docx.oxml import OxmlElement
from docx.oxml.ns import qn
from docx.shared import Mm, Pt, RGBColor

from spinledger.project.audit import versions
from spinledger.report.cautions import accuracy_ppm, printed_cautions
from spinledger.report.context import ReportContext
from spinledger.report.html import report_subtitle, report_title
from spinledger.report.tables import (
    ASSIGNMENT_HEAD,
    CONTENDER_HEAD,
    STRAY_HEAD,
    advice_rows,
    assignment_rows,
    audit_rows,
    balance_cells,
    contender_rows,
    probability_words,
    recipe_lines,
    stray_rows,
    verdict_title,
)
from spinledger.report.text import (
    experimental_runs,
    reference_sentence,
    standing_sentence,
)
from spinledger.report.words import fixed, outgoing
from spinledger.values.ledger import Ledger

_INK = RGBColor(0x1D, 0x22, 0x26)
_MUTED = RGBColor(0x57, 0x5D, 0x62)
# Millimetres of the 178 between the margins of an A4 page.
_ASSIGNMENT_WIDTHS = (18, 20, 15, 15, 48, 23, 18, 21)
_LISTING_WIDTHS = (45, 25, 33, 75)


def report_docx(ledger: Ledger, context: ReportContext | None = None) -> bytes:
    """The report as a Word document, A4, tables with repeating heads.

    Parameters
    ----------
    ledger : Ledger
    context : ReportContext, optional

    Returns
    -------
    bytes
        Content of a .docx file.
    """
    chosen = context or ReportContext()
    document = Document()
    _page(document)
    _opening(document, ledger, chosen)
    _assignment(document, ledger)
    _text(document, ledger, chosen)
    _bullets(document, "Cautions", printed_cautions(ledger))
    _listing(document, "Strays", STRAY_HEAD, stray_rows(ledger))
    _listing(document, "Contenders", CONTENDER_HEAD, contender_rows(ledger))
    _bullets(
        document,
        "Next measurement",
        [f"{what}: {look_for}" for what, look_for in advice_rows(ledger)],
    )
    _audit(document, ledger, chosen)
    stream = io.BytesIO()
    document.save(stream)
    return stream.getvalue()


def _page(document: Any) -> None:
    section = document.sections[0]
    section.page_width, section.page_height = Mm(210), Mm(297)
    for side in ("left_margin", "right_margin", "top_margin", "bottom_margin"):
        setattr(section, side, Mm(16))
    style = document.styles["Normal"]
    style.font.size = Pt(9)
    style.paragraph_format.space_after = Pt(4)
    for name in ("Title", "Heading 1", "Heading 2"):
        document.styles[name].font.color.rgb = _INK


def _opening(document: Any, ledger: Ledger, context: ReportContext) -> None:
    head = document.add_paragraph()
    _muted(head, f"Reconciliation report   {context.date}".rstrip())
    title = document.add_heading(report_title(ledger), level=0)
    title.alignment = WD_ALIGN_PARAGRAPH.LEFT
    _muted(document.add_paragraph(), report_subtitle(ledger, context))
    document.add_heading(verdict_title(ledger), level=1)
    if probability_words(ledger):
        _muted(document.add_paragraph(), probability_words(ledger))
    reasons = " ".join(outgoing(one) for one in ledger.verdict.reasons)
    if reasons:
        document.add_paragraph(reasons)
    _muted(document.add_paragraph(), "The figure stands in figure.svg and report.html.")


def _assignment(document: Any, ledger: Ledger) -> None:
    document.add_heading("Assignment", level=2)
    rows = [row.cells for row in assignment_rows(ledger)]
    table = _table(
        document,
        ASSIGNMENT_HEAD,
        [*rows, balance_cells(ledger)],
        widths_mm=_ASSIGNMENT_WIDTHS,
    )
    _double_rule(table.rows[-1])
    doubt = fixed(accuracy_ppm(ledger), 3)
    _muted(
        document.add_paragraph(),
        "In brackets: sd of the fit in units of the last digit. Reference, "
        f"concentration and temperature add ±{doubt}\u00a0ppm to every shift.",
    )
    notes = [
        f"{row.cells[0]}: {' '.join(row.notes)}"
        for row in assignment_rows(ledger)
        if row.notes
    ]
    for note in notes:
        _muted(document.add_paragraph(), note)


def _text(document: Any, ledger: Ledger, context: ReportContext) -> None:
    document.add_heading("For the experimental section", level=2)
    paragraph = document.add_paragraph()
    for run in experimental_runs(ledger, context.text):
        paragraph.add_run(run.text).italic = run.is_italic
    if standing_sentence(ledger):
        document.add_paragraph().add_run(standing_sentence(ledger)).bold = True
    _muted(document.add_paragraph(), reference_sentence(ledger))


def _listing(
    document: Any, title: str, head: Sequence[str], rows: Sequence[Sequence[str]]
) -> None:
    document.add_heading(title, level=2)
    if rows:
        _table(document, head, rows, widths_mm=_LISTING_WIDTHS)
    else:
        document.add_paragraph("None.")


def _bullets(document: Any, title: str, sentences: Iterable[str]) -> None:
    listed = list(sentences)
    if not listed:
        return
    document.add_heading(title, level=2)
    for sentence in listed:
        document.add_paragraph(sentence, style="List Bullet")


def _audit(document: Any, ledger: Ledger, context: ReportContext) -> None:
    document.add_heading("Audit trail", level=2)
    _table(document, ("What", "Value"), audit_rows(ledger), widths_mm=(38, 140))
    for line in recipe_lines(ledger):
        document.add_paragraph(line, style="List Number")
    for edit in ledger.edits:
        document.add_paragraph(f"By hand: {edit}.", style="List Bullet")
    for one in context.audit:
        document.add_paragraph(f"{one.when}  {one.what}", style="List Bullet")
    made_with = ", ".join(f"{name} {number}" for name, number in versions().items())
    _muted(document.add_paragraph(), f"Made with {made_with}.")


def _table(
    document: Any,
    head: Sequence[str],
    rows: Sequence[Sequence[str]],
    *,
    widths_mm: Sequence[float],
) -> Any:
    table = document.add_table(rows=1, cols=len(head))
    table.autofit = False
    for cell, name in zip(table.rows[0].cells, head, strict=True):
        _fill(cell, name, is_muted=True)
    _repeat(table.rows[0])
    for values in rows:
        cells = table.add_row().cells
        for rank, (cell, value) in enumerate(zip(cells, values, strict=True)):
            _fill(cell, value, is_bold=rank == 0)
    for column, width in zip(table.columns, widths_mm, strict=True):
        column.width = Mm(width)
        for cell in column.cells:
            cell.width = Mm(width)
    return table


def _fill(
    cell: Any, text: str, *, is_muted: bool = False, is_bold: bool = False
) -> None:
    paragraph = cell.paragraphs[0]
    paragraph.paragraph_format.space_after = Pt(1)
    run = paragraph.add_run(text)
    run.font.size = Pt(8)
    run.bold = is_bold
    if is_muted:
        run.font.color.rgb = _MUTED


def _muted(paragraph: Any, text: str) -> None:
    run = paragraph.add_run(text)
    run.font.color.rgb = _MUTED
    run.font.size = Pt(8.5)


def _repeat(row: Any) -> None:
    """Let the head stand again on every page."""
    mark = OxmlElement("w:tblHeader")
    mark.set(qn("w:val"), "true")
    row._tr.get_or_add_trPr().append(mark)


def _double_rule(row: Any) -> None:
    """Close the account: a double line under the last row."""
    for cell in row.cells:
        borders = OxmlElement("w:tcBorders")
        line = OxmlElement("w:bottom")
        line.set(qn("w:val"), "double")
        line.set(qn("w:sz"), "4")
        borders.append(line)
        cell._tc.get_or_add_tcPr().append(borders)
