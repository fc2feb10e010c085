"""The assignment table as it goes to the clipboard."""

from __future__ import annotations

from html import escape

from spinledger.values.ledger import Entry, Ledger

_HEAD = ("Claim", "Shift, ppm", "Protons", "Pattern", "J, Hz (partner)", "State")


def table_rows(ledger: Ledger) -> list[tuple[str, ...]]:
    """The assignment table, head first, as plain text."""
    return [_HEAD, *(_row(entry) for entry in ledger.entries)]


def _row(entry: Entry) -> tuple[str, ...]:
    couplings = [
        f"{abs(c.j_hz):.2f} ({c.partner})"
        for c in sorted(entry.couplings, key=lambda c: -abs(c.j_hz or 0.0))
        if c.determined and c.j_hz is not None
    ]
    protons = entry.integral_protons
    return (
        entry.claim,
        "" if entry.shift_ppm is None else f"{entry.shift_ppm:.4f}",
        "" if protons is None else f"{protons:.2f}",
        entry.multiplicity or "",
        ", ".join(couplings),
        entry.state,
    )


def table_tsv(ledger: Ledger) -> str:
    """The table for a spreadsheet."""
    return "\n".join("\t".join(row) for row in table_rows(ledger)) + "\n"


def table_html(ledger: Ledger) -> str:
    """The table for a text processor."""
    head, *rows = table_rows(ledger)
    cells = "".join(f"<th align='left'>{escape(cell)}</th>" for cell in head)
    body = "".join(
        "<tr>" + "".join(f"<td>{escape(cell)}</td>" for cell in row) + "</tr>"
        for row in rows
    )
    return f"<table><tr>{cells}</tr>{body}</table>"
