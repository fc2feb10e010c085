"""report.docx: figures, tables and the journal text as an editable document."""

from __future__ import annotations

import io
from collections.abc import Callable, Iterable, Mapping, Sequence
from typing import Any

from docx import Document
from docx.enum.text import WD_ALIGN_PARAGRAPH
from docx.oxml import OxmlElement
from docx.oxml.ns import qn
from docx.shared import Mm, Pt, RGBColor

from spinledger.project.audit import versions
from spinledger.report.cautions import accuracy_ppm, printed_cautions
from spinledger.report.context import ReportContext
from spinledger.report.docx_figure import add_figure
from spinledger.report.figure import FIGURE_LEGEND, expansion_svgs, overview_svg
from spinledger.report.html import report_subtitle, report_title
from spinledger.report.quantity_rows import (
    BUDGET_HEAD,
    CONTENT_HEAD,
    budget_rows,
    content_rows,
    quantity_of,
    quantity_sentences,
)
from spinledger.report.sketch import sketch_svg
from spinledger.report.tables import (
    ASSIGNMENT_HEAD,
    COMPARISON_HEAD,
    CONTENDER_HEAD,
    SIGNATURE_HEAD,
    STRAY_HEAD,
    advice_rows,
    assignment_rows,
    audit_rows,
    balance_cells,
    comparison_rows,
    comparison_sentence,
    contender_note,
    contender_rows,
    geometry_rows,
    probability_words,
    recipe_lines,
    sample_rows,
    signature_rows,
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
_FACE = "Arial"
_MUTED = RGBColor(0x57, 0x5D, 0x62)
# Millimetres of the 178 between the margins of an A4 page.
_ASSIGNMENT_WIDTHS = (17, 20, 17, 15, 46, 24, 18, 21)
_WIDTH_MM = 178.0
_COMPARISON_WIDTHS = (30, 25, 28, 22, 35, 38)
_BUDGET_WIDTHS = (52, 26, 28, 18, 14, 40)
_CONTENT_WIDTHS = (58, 30, 20, 40, 30)
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
    makers: Mapping[str, Callable[[Any, Ledger, ReportContext], None]] = {
        "evidence": _evidence,
        "assignment": _assignment,
        "text": _text,
        "cautions": _cautions,
        "expansions": _expansions,
        "strays": _strays,
        "quantity": _quantity,
        "contenders": _contenders,
        "geometry": _geometry,
        "comparison": _comparison,
        "advice": _advice,
        "audit": _audit,
        "signatures": _signatures,
    }
    for name in chosen.sections:
        makers[name](document, ledger, chosen)
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
    style.font.name = _FACE
    style.paragraph_format.space_after = Pt(4)
    for name in ("Title", "Heading 1", "Heading 2"):
        heading = document.styles[name]
        heading.font.color.rgb = _INK
        heading.font.name = _FACE
        # A theme's own face would win over the name.
        fonts = heading.element.rPr.rFonts
        for mark in [key for key in fonts.attrib if key.endswith("Theme")]:
            del fonts.attrib[mark]


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
    add_figure(document, sketch_svg(ledger))


def _evidence(document: Any, ledger: Ledger, _context: ReportContext) -> None:
    document.add_heading("Evidence and claims", level=2)
    add_figure(document, overview_svg(ledger), width_mm=_WIDTH_MM)
    _muted(document.add_paragraph(), FIGURE_LEGEND)


def _assignment(document: Any, ledger: Ledger, _context: ReportContext) -> None:
    document.add_heading("Assignment", level=2)
    rows = [row.cells for row in assignment_rows(ledger)]
    table = _table(
        document,
        ASSIGNMENT_HEAD,
        [*rows, balance_cells(ledger)],
        widths_mm=_ASSIGNMENT_WIDTHS,
    )
    _rule(table.rows[-1], "double")
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


def _cautions(document: Any, ledger: Ledger, _context: ReportContext) -> None:
    _bullets(document, "Cautions", printed_cautions(ledger))


def _expansions(document: Any, ledger: Ledger, _context: ReportContext) -> None:
    drawings = expansion_svgs(ledger)
    if not drawings:
        return
    document.add_heading("Expansions", level=2)
    table = document.add_table(rows=0, cols=2)
    for rank in range(0, len(drawings), 2):
        row = table.add_row()
        _unbroken(row)
        for cell, (_, drawing) in zip(
            row.cells, drawings[rank : rank + 2], strict=False
        ):
            add_figure(
                document, drawing, width_mm=_WIDTH_MM / 2 - 6, where=cell.paragraphs[0]
            )


def _strays(document: Any, ledger: Ledger, _context: ReportContext) -> None:
    _listing(document, "Strays", STRAY_HEAD, stray_rows(ledger))


def _quantity(document: Any, ledger: Ledger, context: ReportContext) -> None:
    quantity = quantity_of(ledger, context)
    document.add_heading("Amounts", level=2)
    for sentence in quantity_sentences(quantity):
        document.add_paragraph(sentence)
    purity = quantity.purity
    if purity is not None and purity.budget is not None:
        rows = budget_rows(purity.budget)
        _table(document, BUDGET_HEAD, rows, widths_mm=_BUDGET_WIDTHS)
        document.add_paragraph()
    rows = content_rows(quantity.content)
    if rows:
        _table(document, CONTENT_HEAD, rows, widths_mm=_CONTENT_WIDTHS)


def _contenders(document: Any, ledger: Ledger, context: ReportContext) -> None:
    rows = contender_rows(ledger, context.contenders)
    _listing(document, "Contenders", CONTENDER_HEAD, rows)
    note = contender_note(ledger, context.contenders)
    if note:
        document.add_paragraph(note)


def _comparison(document: Any, _ledger: Ledger, context: ReportContext) -> None:
    comparison = context.comparison
    if comparison is None:
        return
    document.add_heading("Published list", level=2)
    document.add_paragraph(comparison_sentence(comparison))
    for remark in comparison.remarks:
        document.add_paragraph(remark, style="List Bullet")
    _table(
        document,
        COMPARISON_HEAD,
        comparison_rows(comparison),
        widths_mm=_COMPARISON_WIDTHS,
    )


def _geometry(document: Any, ledger: Ledger, _context: ReportContext) -> None:
    _bullets(document, "Geometry by the couplings", geometry_rows(ledger))


def _advice(document: Any, ledger: Ledger, _context: ReportContext) -> None:
    listed = [f"{what}: {look_for}" for what, look_for in advice_rows(ledger)]
    _bullets(document, "Next measurement", listed)


def _signatures(document: Any, _ledger: Ledger, context: ReportContext) -> None:
    document.add_heading("Signatures", level=2)
    _table(
        document,
        SIGNATURE_HEAD,
        signature_rows(context.sample),
        widths_mm=(30, 55, 38, 55),
    )


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
    facts = (*sample_rows(context.sample), *audit_rows(ledger))
    _table(document, ("What", "Value"), facts, widths_mm=(38, 140))
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
    _rule(table.rows[0], "single")
    for values in rows:
        row = table.add_row()
        _unbroken(row)
        cells = row.cells
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
    paragraph.paragraph_format.space_before = Pt(1.5)
    paragraph.paragraph_format.space_after = Pt(1.5)
    run = paragraph.add_run(text)
    run.font.size = Pt(8)
    run.bold = is_bold
    if is_muted:
        run.font.color.rgb = _MUTED


def _muted(paragraph: Any, text: str) -> None:
    paragraph.paragraph_format.space_before = Pt(2)
    run = paragraph.add_run(text)
    run.font.color.rgb = _MUTED
    run.font.size = Pt(8.5)


def _unbroken(row: Any) -> None:
    """Keep a row on one page."""
    row._tr.get_or_add_trPr().append(OxmlElement("w:cantSplit"))


def _repeat(row: Any) -> None:
    """Let the head stand again on every page."""
    mark = OxmlElement("w:tblHeader")
    mark.set(qn("w:val"), "true")
    row._tr.get_or_add_trPr().append(mark)


def _rule(row: Any, kind: str) -> None:
    """A line under a row; the account is closed by a double one."""
    for cell in row.cells:
        borders = OxmlElement("w:tcBorders")
        line = OxmlElement("w:bottom")
        line.set(qn("w:val"), kind)
        line.set(qn("w:sz"), "4")
        borders.append(line)
        cell._tc.get_or_add_tcPr().append(borders)
