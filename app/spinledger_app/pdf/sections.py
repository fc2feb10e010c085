"""Further parts of the PDF: expansions, amounts, published list, signatures."""

from __future__ import annotations

import re
from collections.abc import Sequence

from PySide6.QtCore import QByteArray, QRectF
from PySide6.QtSvg import QSvgRenderer

from spinledger.report.context import ReportContext
from spinledger.report.figure import expansion_svgs
from spinledger.report.quantity_rows import (
    BUDGET_HEAD,
    CONTENT_HEAD,
    budget_rows,
    content_rows,
    quantity_of,
    quantity_sentences,
)
from spinledger.report.tables import (
    COMPARISON_HEAD,
    SIGNATURE_HEAD,
    advice_rows,
    comparison_rows,
    comparison_sentence,
    geometry_rows,
    signature_rows,
)
from spinledger.values.ledger import Ledger
from spinledger_app.painting.ink import Ink
from spinledger_app.pdf.flow import CELL_MUTED, Column, Flow, add_double_rule, add_table
from spinledger_app.theme import FAMILY

_GAP = 17.0
# Qt's SVG knows no clips and would paint their rectangles black.
_FAMILY = re.compile(r'font-family="[^"]*"')
_CLIP = re.compile(r"<clipPath.*?</clipPath>", re.DOTALL)


def add_listing(
    flow: Flow,
    heading: str,
    head: Sequence[str],
    rows: Sequence[Sequence[str]],
    shares: Sequence[float],
) -> None:
    """Add a table, under a heading if there is one; nothing if it has no rows."""
    if not rows:
        return
    if heading:
        flow.heading(heading)
    columns = [Column(head=h, share=s) for h, s in zip(head, shares, strict=True)]
    add_table(flow, columns, rows)
    add_double_rule(flow)


def add_expansions(flow: Flow, ledger: Ledger, _context: ReportContext) -> None:
    """Add every region with its trees, two in a row, at its own gain."""
    drawings = [
        QSvgRenderer(QByteArray(_for_qt(svg).encode()))
        for _, svg in expansion_svgs(ledger)
    ]
    if not drawings:
        return
    flow.heading("Expansions, each at its own gain")
    width = (flow.width - _GAP) / 2
    for rank in range(0, len(drawings), 2):
        pair = drawings[rank : rank + 2]
        size = pair[0].defaultSize()
        height = width * size.height() / size.width()

        def paint(
            ink: Ink, y: float, pair: list[QSvgRenderer] = pair, height: float = height
        ) -> None:
            for place, drawing in enumerate(pair):
                left = flow.left + place * (width + _GAP)
                drawing.render(ink.painter, QRectF(left, y, width, height))

        flow.add(height + 8, paint)


def _for_qt(svg: str) -> str:
    """Drawing without clips, in the program's own face."""
    return _FAMILY.sub(f'font-family="{FAMILY}"', _CLIP.sub("", svg))


def add_amounts(flow: Flow, ledger: Ledger, context: ReportContext) -> None:
    """Add content with its budget, and residual solvents."""
    quantity = quantity_of(ledger, context)
    flow.heading("Amounts")
    for sentence in quantity_sentences(quantity):
        flow.paragraph(sentence)
    purity = quantity.purity
    if purity is not None and purity.budget is not None:
        flow.gap(4)
        rows = budget_rows(purity.budget)
        add_listing(flow, "", BUDGET_HEAD, rows, (32, 15, 17, 10, 8, 24))
    flow.gap(4)
    rows = content_rows(quantity.content)
    add_listing(flow, "", CONTENT_HEAD, rows, (40, 16, 12, 20, 12))


def add_comparison(flow: Flow, _ledger: Ledger, context: ReportContext) -> None:
    """Add the table against a published list."""
    comparison = context.comparison
    if comparison is None:
        return
    flow.heading("Published list")
    flow.paragraph(comparison_sentence(comparison))
    flow.bullets(comparison.remarks, CELL_MUTED)
    rows = comparison_rows(comparison)
    add_listing(flow, "", COMPARISON_HEAD, rows, (17, 15, 16, 12, 20, 20))


def add_geometry(flow: Flow, ledger: Ledger, _context: ReportContext) -> None:
    """Add what the couplings say about the geometry."""
    rows = geometry_rows(ledger)
    if rows:
        flow.heading("Geometry by the couplings")
        flow.bullets(rows)


def add_advice(flow: Flow, ledger: Ledger, _context: ReportContext) -> None:
    """Add the measurements that would decide most."""
    rows = advice_rows(ledger)
    if rows:
        flow.heading("Next measurement")
        flow.bullets([f"{what}: {look_for}" for what, look_for in rows])


def add_signatures(flow: Flow, _ledger: Ledger, context: ReportContext) -> None:
    """Add signed lines, and blank ones for maker, second person and release."""
    rows = signature_rows(context.sample)
    add_listing(flow, "Signatures", SIGNATURE_HEAD, rows, (18, 30, 22, 30))
