"""sample.html: the joint ledger of one sample as a self-contained page."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from html import escape

from spinledger.report.difference_figure import difference_svg
from spinledger.report.html_style import style_sheet
from spinledger.report.words import (
    as_sentence,
    fixed,
    nominal_mhz,
    outgoing,
    outgoing_state,
    outgoing_word,
    solvent_glyphs,
)
from spinledger.sample.batch_reference import BatchComparison
from spinledger.sample.joint_values import Column, JointLedger, Witness, entry_of
from spinledger.sample.shake import Shake


def sample_html(
    joint: JointLedger,
    witnesses: Sequence[Witness],
    comparisons: Sequence[BatchComparison] = (),
    *,
    date: str = "",
) -> str:
    """Page with verdict, shifts a spectrum a column, couplings, pairs and limits.

    Parameters
    ----------
    joint : JointLedger
    witnesses : sequence of Witness
        In the order of its columns.
    comparisons : sequence of BatchComparison
    date : str
        As printed.
    """
    title = f"One sample, {len(joint.columns)} spectra"
    parts = [
        f'<header><p class="over"><span>Spin Ledger</span><span>{escape(date)}</span>'
        f"</p><h1>{escape(title)}</h1></header>",
        _verdict(joint),
        _section("Spectra", _spectra(joint.columns)),
        _section("Assignments", _shifts(joint, witnesses)),
        _section("Couplings shared by all spectra", _couplings(joint)),
        *(_shake(one) for one in joint.shakes),
        *(_comparison(one) for one in comparisons),
    ]
    return (
        '<!DOCTYPE html>\n<html lang="en"><head><meta charset="utf-8">'
        f"<title>{escape(title)}</title><style>{style_sheet('', '')}</style></head>"
        f"<body>{''.join(parts)}</body></html>\n"
    )


def _verdict(joint: JointLedger) -> str:
    chance = (
        "" if joint.probability is None else f", probability {joint.probability:.2f}"
    )
    reasons = "".join(
        f"<li>{escape(as_sentence(outgoing(one)))}</li>" for one in joint.reasons
    )
    return (
        f'<section><h2 class="verdict">{escape(_capital(outgoing_word(joint.state)))}'
        f'<span class="probability">{chance}</span></h2>'
        '<p class="small muted">The probability is that of the least probable '
        "spectrum; the same predictions stand behind all of them.</p>"
        f"<ul>{reasons}</ul></section>\n"
    )


def _spectra(columns: Sequence[Column]) -> str:
    rows = [
        (
            one.name,
            one.role,
            solvent_glyphs(one.solvent) if one.solvent else "not known",
            f"{nominal_mhz(one.field_mhz)} MHz",
            "" if one.temperature_k is None else f"{one.temperature_k:.0f} K",
            outgoing_word(one.state),
            "" if one.probability is None else f"{one.probability:.2f}",
        )
        for one in columns
    ]
    head = ("Spectrum", "Role", "Solvent", "Field", "Temperature", "Result", "P")
    return _table(head, rows)


def _shifts(joint: JointLedger, witnesses: Sequence[Witness]) -> str:
    rows = []
    for row in joint.rows:
        cells = []
        for one, cell in zip(witnesses, row.cells, strict=True):
            entry = entry_of(one.ledger, row.claim)
            if cell is None or entry is None:
                cells.append("not claimed")
            elif cell.shift_ppm is None:
                cells.append(outgoing_state(one.ledger, entry))
            else:
                word = outgoing_state(one.ledger, entry)
                cells.append(f"{fixed(cell.shift_ppm, 3)} ({word})")
        rows.append((row.claim, f"{row.protons} H", *cells))
    head = ("Protons", "Count", *(f"{one.name}, δ in ppm" for one in joint.columns))
    return _table(head, rows)


def _couplings(joint: JointLedger) -> str:
    if not joint.couplings:
        return "<p>No coupling is determined by these spectra.</p>"
    rows = [
        (
            f"{one.claim} and {one.partner}",
            f"{fixed(one.j_hz, 2)} ± {fixed(one.sd_hz, 2)}",
            *(
                "" if value is None else f"{fixed(value.value, 2)}"
                for value in one.values
            ),
            "agrees" if one.agrees else "differs",
        )
        for one in joint.couplings
    ]
    head = ("Protons", "|J| in Hz", *(one.name for one in joint.columns), "")
    note = (
        '<p class="small muted">Weighted by inverse variance; the sd holds the scatter '
        "between spectra.</p>"
    )
    return _table(head, rows) + note


def _shake(shake: Shake) -> str:
    rows = [
        (
            " and ".join(one.claims),
            f"{fixed(one.high_ppm, 2)} to {fixed(one.low_ppm, 2)}",
            "cannot be told"
            if one.fraction is None or one.sd is None
            else f"{fixed(one.fraction, 2)} ± {fixed(one.sd, 2)}",
            one.why or "integrated alone",
        )
        for one in shake.fractions
    ]
    head = ("Protons", "Range in ppm", "Exchanged share", "How")
    table = _table(head, rows) if rows else "<p>No exchangeable proton was seen.</p>"
    figure = difference_svg(shake.difference, names=(shake.before, shake.after))
    return _section(
        f"D₂O shake: {shake.before} and {shake.after}",
        f'{table}<figure class="wide">{figure}</figure>',
    )


def _comparison(one: BatchComparison) -> str:
    rows = "".join(f"<li>{escape(row)}</li>" for row in one.sentences())
    limits = one.limits
    figure = difference_svg(one.difference, names=(one.batch, one.reference))
    return _section(
        f"{'Pass' if one.passed else 'Fail'}: {one.batch} against {one.reference}",
        f"<ul>{rows}</ul>"
        f'<p class="small muted">Limits: {limits.line_mol_percent:g} mol % for a line, '
        f"{limits.integral_percent:g} % for an integral, {limits.shift_ppm:g} ppm for a "
        "shift.</p>"
        f'<figure class="wide">{figure}</figure>',
    )


def _section(title: str, body: str) -> str:
    return f"<section><h3>{escape(title)}</h3>{body}</section>\n"


def _table(head: Iterable[str], rows: Iterable[Iterable[str]]) -> str:
    names = "".join(f'<th scope="col">{escape(name)}</th>' for name in head)
    body = "".join(
        f"<tr>{''.join(f'<td>{escape(cell)}</td>' for cell in row)}</tr>"
        for row in rows
    )
    return f"<table><thead><tr>{names}</tr></thead><tbody>{body}</tbody></table>"


def _capital(text: str) -> str:
    return text[:1].upper() + text[1:]
