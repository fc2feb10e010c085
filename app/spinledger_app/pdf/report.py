"""The report on A4 pages: title, verdict, figure, assignment, text, cautions."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Callable, Mapping
from pathlib import Path

from PySide6.QtCore import QMarginsF
from PySide6.QtGui import (
    QGuiApplication,
    QPagedPaintDevice,
    QPageSize,
    QPainter,
    QPdfWriter,
)

from spinledger.errors import OutputError
from spinledger.report.cautions import accuracy_ppm, printed_cautions
from spinledger.report.context import ReportContext
from spinledger.report.html import report_subtitle, report_title
from spinledger.report.tables import (
    CONTENDER_HEAD,
    STRAY_HEAD,
    assignment_rows,
    audit_rows,
    balance_cells,
    contender_note,
    contender_rows,
    probability_words,
    recipe_lines,
    sample_rows,
    stray_rows,
    verdict_title,
)
from spinledger.report.text import (
    experimental_text,
    reference_sentence,
    standing_sentence,
)
from spinledger.report.words import fixed, outgoing
from spinledger.values.ledger import Ledger
from spinledger_app.painting.ink import SECOND, Face, Ink, wrap
from spinledger_app.painting.marks import paint_balance
from spinledger_app.pdf.figures import FIGURE_HEIGHT, paint_figure, paint_sketch
from spinledger_app.pdf.flow import (
    CELL_MUTED,
    FOOTER,
    MARGIN,
    PAGE_HEIGHT,
    TEXT,
    TEXT_MUTED,
    TITLE,
    Column,
    Flow,
    add_double_rule,
    add_table,
)
from spinledger_app.pdf.sections import (
    add_advice,
    add_amounts,
    add_comparison,
    add_expansions,
    add_geometry,
    add_listing,
    add_signatures,
)
from spinledger_app.presenters.drawing import drawing_of
from spinledger_app.presenters.lanes import lane_scene
from spinledger_app.theme import LIGHT, Look, Tokens, load_fonts

_TILTS = {
    "reconciled": 0.0,
    "undecided": 9.0,
    "not reconciled": 20.0,
    "not judged": 5.0,
}
_ASSIGNMENT = (
    Column(head="Claim", share=11),
    Column(head="δ, ppm", share=12),
    Column(head="Found", share=9),
    Column(head="Pattern", share=8),
    Column(head="J, Hz (partner)", share=28),
    Column(head="Predicted δ", share=14),
    Column(head="Largest", share=10),
    Column(head="State", share=13),
)
_SKETCH_WIDTH = 300.0
_ANSWER_HEIGHT = 190.0
_DPI = 600
_CSS_DPI = 96.0
_COLUMNS_PER_PX = 4.0


def write_pdf_report(ledger: Ledger, path: Path, context: ReportContext) -> Path:
    """Write the report as PDF, beside its target and then moved into place.

    Raises
    ------
    OutputError
        If the file cannot be written there.
    """
    app = QGuiApplication.instance() or QGuiApplication(
        ["report", "-platform", "offscreen"]
    )
    load_fonts()
    look = Look(tokens=_on_white())
    flow = _flow(ledger, context, look)
    try:
        handle, name = tempfile.mkstemp(
            dir=path.parent, prefix=f".{path.name}.", suffix=".part"
        )
        os.close(handle)
        _print(flow, Path(name), ledger, look)
        Path(name).replace(path)
    except OSError as error:
        reason = error.strerror or "it cannot be written"
        raise OutputError(
            path, f"the report could not be written ({reason}); choose another place"
        ) from error
    del app
    return path


def print_report(
    ledger: Ledger, device: QPagedPaintDevice, context: ReportContext
) -> None:
    """Paint the report's pages on a printer.

    Raises
    ------
    OSError
        If no page can be begun on it.
    """
    look = Look(tokens=_on_white())
    device.setPageSize(QPageSize(QPageSize.PageSizeId.A4))
    device.setPageMargins(QMarginsF(0, 0, 0, 0))
    _paint_pages(_flow(ledger, context, look), device, ledger, look)


def _on_white() -> Tokens:
    values = {name: getattr(LIGHT, name) for name in LIGHT.__slots__}
    values |= {"lane": "#FFFFFF", "panel": "#FFFFFF", "fold": "#F3F1EB"}
    return Tokens(**values)


def _print(flow: Flow, path: Path, ledger: Ledger, look: Look) -> None:
    writer = QPdfWriter(str(path))
    writer.setPageSize(QPageSize(QPageSize.PageSizeId.A4))
    writer.setPageMargins(QMarginsF(0, 0, 0, 0))
    writer.setResolution(_DPI)
    writer.setTitle(report_title(ledger))
    writer.setCreator("Spin Ledger")
    _paint_pages(flow, writer, ledger, look)


def _paint_pages(
    flow: Flow, device: QPagedPaintDevice, ledger: Ledger, look: Look
) -> None:
    painter = QPainter(device)
    if not painter.isActive():
        raise OSError(0, "no page could be begun")
    pages = flow.pages()
    for number, page in enumerate(pages, start=1):
        if number > 1:
            device.newPage()
        painter.resetTransform()
        per_px = device.logicalDpiX() / _CSS_DPI
        painter.scale(per_px, per_px)
        ink = Ink(painter, look)
        ink.columns_per_px = _COLUMNS_PER_PX
        for block, y in page:
            block.paint(ink, y)
        _footer(ink, flow, ledger, number, len(pages))
    painter.end()


def _footer(ink: Ink, flow: Flow, ledger: Ledger, number: int, total: int) -> None:
    y = PAGE_HEIGHT - MARGIN - FOOTER + 16
    ink.hline(flow.left, flow.right, y, "rule")
    digest = ledger.evidence.metadata.sha256[:16]
    grouped = " ".join(digest[i : i + 4] for i in range(0, len(digest), 4))
    baseline = y + 17
    ink.text(flow.left, baseline, f"Source SHA-256 {grouped} …", CELL_MUTED)
    edits = len(ledger.edits)
    steps = len(ledger.evidence.recipe.steps)
    work = f"Recipe {steps} steps, {edits} hand edit{'' if edits == 1 else 's'}"
    ink.text((flow.left + flow.right) / 2, baseline, work, CELL_MUTED, align="centre")
    page = f"Page {number} of {total}"
    ink.text(flow.right, baseline, page, CELL_MUTED, align="right")


def _flow(ledger: Ledger, context: ReportContext, look: Look) -> Flow:
    flow = Flow(look)
    _opening(flow, ledger, context)
    _answer(flow, ledger)
    makers: Mapping[str, Callable[[Flow, Ledger, ReportContext], None]] = {
        "evidence": _figure,
        "assignment": _assignment,
        "text": _text,
        "cautions": _cautions,
        "expansions": add_expansions,
        "strays": _strays,
        "quantity": add_amounts,
        "contenders": _contenders,
        "geometry": add_geometry,
        "comparison": add_comparison,
        "advice": add_advice,
        "audit": _audit,
        "signatures": add_signatures,
    }
    for name in context.sections:
        makers[name](flow, ledger, context)
    return flow


def _text(flow: Flow, ledger: Ledger, context: ReportContext) -> None:
    flow.heading("For the experimental section")
    flow.paragraph(experimental_text(ledger, context.text))
    if standing_sentence(ledger):
        flow.paragraph(standing_sentence(ledger), Face(size=12, weight=600))
    flow.paragraph(reference_sentence(ledger), TEXT_MUTED)


def _cautions(flow: Flow, ledger: Ledger, _context: ReportContext) -> None:
    flow.heading("Cautions")
    flow.bullets(printed_cautions(ledger))


def _strays(flow: Flow, ledger: Ledger, _context: ReportContext) -> None:
    add_listing(flow, "Strays", STRAY_HEAD, stray_rows(ledger), (17, 12, 10, 61))


def _contenders(flow: Flow, ledger: Ledger, context: ReportContext) -> None:
    rows = contender_rows(ledger, context.contenders)
    add_listing(flow, "Contenders", CONTENDER_HEAD, rows, (34, 12, 14, 40))
    note = contender_note(ledger, context.contenders)
    if note:
        flow.paragraph(note, TEXT_MUTED)


def _opening(flow: Flow, ledger: Ledger, context: ReportContext) -> None:
    def over(ink: Ink, y: float) -> None:
        ink.text(flow.left, y + 12, "Reconciliation report", TEXT_MUTED)
        ink.text(flow.right, y + 12, context.date, TEXT_MUTED, align="right")

    flow.add(22, over)
    for line in wrap(flow.look, report_title(ledger), flow.width, TITLE):

        def title(ink: Ink, y: float, line: str = line) -> None:
            ink.text(flow.left, y + 24, line, TITLE, max_width=flow.width)

        flow.add(32, title)
    flow.paragraph(report_subtitle(ledger, context), TEXT_MUTED)
    flow.gap(6)
    flow.rule("ink", width=1.5)


def _answer(flow: Flow, ledger: Ledger) -> None:
    drawing = drawing_of(ledger.structure)
    verdict = ledger.verdict
    reasons = " ".join(outgoing(one) for one in verdict.reasons)
    excluded = [one.name or one.smiles for one in ledger.contenders if one.excluded]
    words_width = flow.width - _SKETCH_WIDTH - 56

    def paint(ink: Ink, y: float) -> None:
        paint_balance(ink, flow.left, y + 14, _TILTS[verdict.state], "ink")
        left = flow.left + 44
        head = Face(size=18, weight=600)
        baseline = y + 30
        for line in wrap(ink.look, verdict_title(ledger), words_width, head)[:2]:
            ink.text(left, baseline, line, head)
            baseline += 22
        after = ink.wrapped(
            left, baseline, words_width, probability_words(ledger), SECOND, max_lines=1
        )
        after = ink.wrapped(left, after + 4, words_width, reasons, TEXT, max_lines=5)
        if excluded:
            words = f"Excluded: {', '.join(excluded[:4])}."
            ink.wrapped(left, after + 4, words_width, words, TEXT_MUTED, max_lines=2)
        room = (flow.right - _SKETCH_WIDTH, y + 4, _SKETCH_WIDTH, _ANSWER_HEIGHT - 8)
        paint_sketch(ink, ledger, drawing, room)

    flow.add(_ANSWER_HEIGHT, paint)
    flow.rule()


def _figure(flow: Flow, ledger: Ledger, _context: ReportContext) -> None:
    flow.gap(4)
    scene = lane_scene(ledger.evidence, ledger)

    def head(ink: Ink, y: float) -> None:
        ink.text(flow.left, y + 14, "Evidence and claims", Face(size=14, weight=600))
        words = (
            "ink measured, blue modelled; empty stretches of the axis are folded away"
        )
        ink.text(flow.right, y + 14, words, CELL_MUTED, align="right")

    flow.add(24, head, keeps_next=True)

    def paint(ink: Ink, y: float) -> None:
        paint_figure(ink, scene, flow.left, flow.right, y)

    flow.add(FIGURE_HEIGHT + 14, paint)


def _assignment(flow: Flow, ledger: Ledger, _context: ReportContext) -> None:
    flow.heading("Assignment")
    rows = assignment_rows(ledger)
    cells = [row.cells for row in rows]
    add_table(
        flow,
        _ASSIGNMENT,
        [*cells, balance_cells(ledger)],
        marks=[row.state for row in rows],
    )
    add_double_rule(flow)
    doubt = fixed(accuracy_ppm(ledger), 3)
    flow.paragraph(
        "In brackets: sd of the fit in units of the last digit. Reference, "
        f"concentration and temperature add ±{doubt}\u00a0ppm to every shift.",
        CELL_MUTED,
    )
    for row in rows:
        if row.notes:
            flow.paragraph(f"{row.cells[0]}: {' '.join(row.notes)}", CELL_MUTED)


def _audit(flow: Flow, ledger: Ledger, context: ReportContext) -> None:
    flow.heading("Audit trail")
    for name, value in (*sample_rows(context.sample), *audit_rows(ledger)):
        flow.paragraph(f"{name}: {value}", CELL_MUTED)
    flow.gap(4)
    flow.bullets(recipe_lines(ledger), CELL_MUTED)
    if ledger.edits:
        flow.heading("Hand edits")
        flow.bullets(ledger.edits, CELL_MUTED)
    for line in context.audit:
        by_hand = "by hand: " if line.by_hand else ""
        flow.paragraph(f"{line.when}  {by_hand}{line.what}", CELL_MUTED)
