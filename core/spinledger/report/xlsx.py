"""report.xlsx: assignment, couplings, strays and audit trail as sheets of numbers.

Shifts in ppm, couplings in Hz, integrals in protons.
"""

from __future__ import annotations

import io
import math
from collections.abc import Sequence
from typing import Any

from openpyxl import Workbook
from openpyxl.styles import Alignment, Border, Font, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.properties import PageSetupProperties

from spinledger.project.audit import versions
from spinledger.report.cautions import printed_cautions
from spinledger.report.context import ReportContext
from spinledger.report.quantity_rows import (
    CONTENT_HEAD,
    content_rows,
    quantity_of,
    quantity_sentences,
)
from spinledger.report.tables import (
    COMPARISON_HEAD,
    CONTENDER_HEAD,
    SIGNATURE_HEAD,
    STRAY_HEAD,
    audit_rows,
    comparison_rows,
    contender_rows,
    probability_words,
    recipe_lines,
    sample_rows,
    signature_rows,
    stray_rows,
    verdict_title,
)
from spinledger.report.text import experimental_text
from spinledger.report.words import outgoing, outgoing_state
from spinledger.values.ledger import Entry, Ledger

Cell = str | float | int | None
_ASSIGNMENT = (
    "claim",
    "atoms",
    "protons",
    "state",
    "shift_ppm",
    "shift_sd_ppm",
    "range_low_ppm",
    "range_high_ppm",
    "integral_protons",
    "multiplicity",
    "predicted_shift_ppm",
    "predicted_shift_sd_ppm",
    "shift_residual_sd",
    "integral_residual_sd",
    "j_residual_sd",
    "why",
)
_WIDEST, _FLOAT_WIDTH, _LINE_PT = 60, 10, 15.0
_BUDGET = (
    "quantity",
    "value",
    "unit",
    "standard_uncertainty",
    "distribution",
    "sensitivity",
    "share_of_variance",
    "source",
)
_COUPLINGS = (
    "claim",
    "partner",
    "j_hz",
    "j_sd_hz",
    "determined",
    "sum_hz",
    "predicted_j_hz",
    "predicted_j_sd_hz",
    "kind",
)


def report_xlsx(ledger: Ledger, context: ReportContext | None = None) -> bytes:
    """The report as a workbook; numbers stay numbers.

    Parameters
    ----------
    ledger : Ledger
    context : ReportContext, optional

    Returns
    -------
    bytes
        Content of an .xlsx file.
    """
    chosen = context or ReportContext()
    book = Workbook()
    book.remove(book.active)
    sheet = _sheet(
        book, "Assignment", _ASSIGNMENT, [_entry(ledger, e) for e in ledger.entries]
    )
    _close_account(sheet, ledger)
    _sheet(book, "Couplings", _COUPLINGS, _coupling_rows(ledger))
    _sheet(book, "Strays", STRAY_HEAD, stray_rows(ledger))
    rows = contender_rows(ledger, chosen.contenders)
    _sheet(book, "Contenders", CONTENDER_HEAD, rows)
    _sheet(book, "Verdict", ("what", "value"), _verdict_rows(ledger, chosen))
    _sheet(book, "Audit", ("what", "value"), _audit_rows(ledger, chosen))
    _quantity_sheets(book, ledger, chosen)
    _sheet(book, "Signatures", SIGNATURE_HEAD, signature_rows(chosen.sample))
    if chosen.comparison is not None:
        _sheet(
            book, "Published list", COMPARISON_HEAD, comparison_rows(chosen.comparison)
        )
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def _quantity_sheets(book: Any, ledger: Ledger, context: ReportContext) -> None:
    quantity = quantity_of(ledger, context)
    said = [("", one) for one in quantity_sentences(quantity)]
    rows = [*said, *content_rows(quantity.content)]
    _sheet(book, "Amounts", CONTENT_HEAD, rows)
    budget = quantity.purity.budget if quantity.purity is not None else None
    if budget is None:
        return
    numbers: list[tuple[Cell, ...]] = [
        (
            one.source.name,
            one.source.value,
            one.source.unit,
            one.source.standard_uncertainty,
            one.source.distribution,
            one.sensitivity,
            one.share,
            one.source.source,
        )
        for one in budget.rows
    ]
    total = (
        "content",
        budget.value,
        "",
        budget.standard_uncertainty,
        "",
        None,
        1.0,
        "",
    )
    expanded = (f"expanded, k = {budget.coverage_factor:g}", budget.expanded)
    _sheet(book, "Budget", _BUDGET, [*numbers, total, expanded])


def _entry(ledger: Ledger, entry: Entry) -> tuple[Cell, ...]:
    low, high = entry.range_ppm or (None, None)
    return (
        entry.claim,
        " ".join(str(atom + 1) for atom in entry.atoms),
        entry.protons,
        outgoing_state(ledger, entry),
        entry.shift_ppm,
        entry.shift_sd_ppm,
        low,
        high,
        entry.integral_protons,
        entry.multiplicity,
        entry.predicted_shift_ppm,
        entry.predicted_shift_sd_ppm,
        entry.shift_residual_sd,
        entry.integral_residual_sd,
        entry.j_residual_sd,
        entry.why,
    )


def _coupling_rows(ledger: Ledger) -> list[tuple[Cell, ...]]:
    return [
        (
            entry.claim,
            one.partner,
            one.j_hz if one.determined else None,
            one.j_sd_hz if one.determined else None,
            "yes" if one.determined else "no",
            one.sum_hz,
            one.predicted_j_hz,
            one.predicted_j_sd_hz,
            one.kind,
        )
        for entry in ledger.entries
        for one in entry.couplings
    ]


def _verdict_rows(ledger: Ledger, context: ReportContext) -> list[tuple[Cell, ...]]:
    reasons: list[tuple[Cell, ...]] = [
        ("reason", outgoing(one)) for one in ledger.verdict.reasons
    ]
    cautions: list[tuple[Cell, ...]] = [
        ("caution", one) for one in printed_cautions(ledger)
    ]
    return [
        ("verdict", verdict_title(ledger)),
        ("probability", probability_words(ledger)),
        *reasons,
        ("experimental section", experimental_text(ledger, context.text)),
        *cautions,
    ]


def _audit_rows(ledger: Ledger, context: ReportContext) -> list[tuple[Cell, ...]]:
    rows: list[tuple[Cell, ...]] = [*sample_rows(context.sample), *audit_rows(ledger)]
    rows += [("recipe", line) for line in recipe_lines(ledger)]
    rows += [("hand edit", edit) for edit in ledger.edits]
    rows += [(one.when, one.what) for one in context.audit]
    rows += [(f"version of {name}", number) for name, number in versions().items()]
    return rows


def _sheet(
    book: Any, title: str, head: Sequence[str], rows: Sequence[Sequence[Cell]]
) -> Any:
    sheet = book.create_sheet(title)
    sheet.append(list(head))
    for cell in sheet[1]:
        cell.font = Font(bold=True)
    sheet.freeze_panes = "A2"
    for row in rows:
        sheet.append([None] * len(row))
        for column, value in enumerate(row, start=1):
            cell = sheet.cell(row=sheet.max_row, column=column)
            cell.value = value
            if isinstance(value, str):  # text stays text, even with a leading "="
                cell.data_type = "s"
                cell.alignment = Alignment(wrap_text=True, vertical="top")
            elif isinstance(value, float):  # shown short, stored in full
                cell.number_format = "0.0000"
    _widths(sheet)
    _printed(sheet)
    return sheet


def _printed(sheet: Any) -> None:
    """Landscape A4, all columns on one page, the head again on every page."""
    sheet.page_setup.orientation = "landscape"
    sheet.page_setup.paperSize = sheet.PAPERSIZE_A4
    sheet.sheet_properties.pageSetUpPr = PageSetupProperties(fitToPage=True)
    sheet.page_setup.fitToHeight = 0
    sheet.print_title_rows = "1:1"


def _widths(sheet: Any) -> None:
    """Columns as wide as their text, up to a limit; rows as high as it wraps."""
    lines: dict[int, int] = {}
    for number, column in enumerate(sheet.columns, start=1):
        lengths = [
            _FLOAT_WIDTH
            if isinstance(cell.value, float)
            else len(str(cell.value or ""))
            for cell in column
        ]
        width = min(_WIDEST, max(lengths) + 2)
        sheet.column_dimensions[get_column_letter(number)].width = width
        for row, length in enumerate(lengths, start=1):
            # Words break early: a tenth of a line is lost.
            needed = math.ceil(1.1 * length / width) if length > width else 1
            lines[row] = max(lines.get(row, 1), needed)
    for row, count in lines.items():
        if count > 1:
            sheet.row_dimensions[row].height = _LINE_PT * count


def _close_account(sheet: Any, ledger: Ledger) -> None:
    """Balance under the entries, closed by a double rule."""
    row = sheet.max_row + 1
    sheet.cell(row=row, column=1, value="balance")
    sheet.cell(row=row, column=3, value=ledger.balance.claimed)
    sheet.cell(row=row, column=9, value=ledger.balance.found)
    for column in range(1, len(_ASSIGNMENT) + 1):
        cell = sheet.cell(row=row, column=column)
        cell.border = Border(bottom=Side(style="double"))
        cell.font = Font(bold=True)
