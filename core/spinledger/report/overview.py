"""overview.html of a batch: all rows, the worst first, each with its figure."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from html import escape
from urllib.parse import quote

from spinledger.report.palette import FONT_STACK, HAIRLINE, INK, MUTED, PAPER
from spinledger.report.words import outgoing_word

# Worst first.
_ORDER = ("", "not reconciled", "not judged", "undecided", "reconciled")


def overview_html(rows: Sequence[Mapping[str, str]], *, title: str) -> str:
    """Page with one line a row, sorted worst first.

    Parameters
    ----------
    rows : sequence of mapping
        Cells of summary.csv; the figure of a row is figure.svg in the folder
        that its id names.
    title : str

    Returns
    -------
    str
        HTML text. Figures are linked, not embedded.
    """
    ordered = sorted(rows, key=_badness)
    failed = sum(bool(row["error"]) for row in rows)
    body = "".join(_row(row) for row in ordered)
    head = "".join(
        f'<th scope="col">{name}</th>'
        for name in ("Row", "Result", "Probability", "Found of claimed", "Figure")
    )
    return (
        '<!DOCTYPE html>\n<html lang="en"><head><meta charset="utf-8">'
        f"<title>{escape(title)}</title><style>{_STYLE}</style></head><body>"
        f"<h1>{escape(title)}</h1><p>{len(rows)} rows, {failed} failed; the worst "
        f"stand first.</p><table><thead><tr>{head}</tr></thead><tbody>{body}</tbody>"
        "</table></body></html>\n"
    )


def _badness(row: Mapping[str, str]) -> tuple[int, float]:
    rank = _ORDER.index(row["verdict"]) if row["verdict"] in _ORDER else 0
    return (rank, float(row["probability"] or 0.0))


def _row(row: Mapping[str, str]) -> str:
    name = escape(row["id"])
    structure = f'<p class="muted">{escape(row["structure"])}</p>'
    if row["error"]:
        return (
            f'<tr><th scope="row">{name}{structure}</th><td>failed</td>'
            f'<td colspan="3">{escape(row["error"])}</td></tr>'
        )
    folder = quote(row["id"])
    counts = f"{row['found_protons']} of {row['claimed_protons']} H"
    details = ", ".join(
        f"{row[key]} {words}"
        for key, words in (
            ("inconsistent", "inconsistent"),
            ("not_observed", "not observed"),
            ("unexplained", "unexplained"),
        )
        if row[key] not in ("", "0")
    )
    return (
        f'<tr><th scope="row"><a href="{folder}/report.html">{name}</a>{structure}</th>'
        f"<td>{escape(outgoing_word(row['verdict']))}"
        f'<p class="muted">{escape(details)}</p></td>'
        f"<td>{escape(row['probability'])}</td><td>{escape(counts)}</td>"
        f'<td><img src="{folder}/figure.svg" alt="Spectrum of {name}" loading="lazy">'
        "</td></tr>"
    )


_STYLE = f"""
html {{ background: {PAPER}; color: {INK}; font: 14px/1.4 {FONT_STACK}; }}
body {{ margin: 24px auto; max-width: 1000px; padding: 0 16px; }}
table {{ border-collapse: collapse; width: 100%; }}
th, td {{ text-align: left; vertical-align: top; padding: 8px 12px 8px 0;
  border-bottom: 1px solid {HAIRLINE}; overflow-wrap: anywhere; }}
thead th, .muted {{ color: {MUTED}; font-weight: 400; font-size: 12px; }}
p {{ margin: 2px 0; }}
img {{ width: 260px; height: auto; display: block; }}
"""
