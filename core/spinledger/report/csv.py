"""assignment.csv: one row a claim; shifts in ppm, couplings in Hz."""

from __future__ import annotations

import csv
import io

from spinledger.report.words import outgoing_state, plain, with_sd
from spinledger.values.ledger import Entry, EntryCoupling, Ledger

COLUMNS = (
    "claim",
    "atoms",
    "species",
    "protons",
    "state",
    "shift_ppm",
    "shift_sd_ppm",
    "range_low_ppm",
    "range_high_ppm",
    "integral_protons",
    "multiplicity",
    "couplings_hz",
    "predicted_shift_ppm",
    "predicted_shift_sd_ppm",
    "shift_residual_sd",
    "integral_residual_sd",
    "j_residual_sd",
    "group",
    "why",
)


def assignment_csv(ledger: Ledger) -> str:
    """Assignment table as comma-separated text, with a header line.

    Atoms are counted from 1 here, as on paper. Several couplings stand in one
    cell, "8.60(2) 2-HB; 6.31(2) 4-H"; what is unknown is left empty.

    Parameters
    ----------
    ledger : Ledger

    Returns
    -------
    str
        Lines end in CR LF (RFC 4180).
    """
    stream = io.StringIO(newline="")
    writer = csv.writer(stream)
    writer.writerow(COLUMNS)
    for entry in ledger.entries:
        writer.writerow(_row(ledger, entry))
    return stream.getvalue()


def _row(ledger: Ledger, entry: Entry) -> list[str]:
    low, high = entry.range_ppm or (None, None)
    return [
        _safe(entry.claim),
        " ".join(str(atom + 1) for atom in entry.atoms),
        str(entry.species),
        str(entry.protons),
        outgoing_state(ledger, entry),
        _digits(entry.shift_ppm, 5),
        _digits(entry.shift_sd_ppm, 5),
        _digits(low, 4),
        _digits(high, 4),
        _digits(entry.integral_protons, 3),
        entry.multiplicity or "",
        "; ".join(_coupling(one) for one in entry.couplings),
        _digits(entry.predicted_shift_ppm, 2),
        _digits(entry.predicted_shift_sd_ppm, 2),
        _digits(entry.shift_residual_sd, 1),
        _digits(entry.integral_residual_sd, 1),
        _digits(entry.j_residual_sd, 1),
        _group(entry),
        _safe(entry.why),
    ]


def _coupling(coupling: EntryCoupling) -> str:
    if coupling.j_hz is None or not coupling.determined:
        return f"undetermined {coupling.partner}"
    value = with_sd(abs(coupling.j_hz), coupling.j_sd_hz, digits=2)
    return f"{value} {coupling.partner}"


def _group(entry: Entry) -> str:
    if entry.group is None:
        return ""
    return f"{entry.group.kind} with {' '.join(entry.group.partners)}"


def _digits(value: float | None, digits: int) -> str:
    return "" if value is None else plain(value, digits)


def _safe(text: str) -> str:
    """Text that a spreadsheet does not take for a formula."""
    return f"'{text}" if text[:1] in ("=", "+", "-", "@") else text
