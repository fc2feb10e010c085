"""report.html: one self-contained page that prints on A4."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Mapping
from html import escape

from rdkit import Chem, rdBase
from rdkit.Chem.rdMolDescriptors import CalcMolFormula

from spinledger.project.audit import versions
from spinledger.report.cautions import accuracy_ppm, printed_cautions
from spinledger.report.context import ReportContext
from spinledger.report.figure import expansion_svgs, overview_svg
from spinledger.report.html_style import style_sheet
from spinledger.report.json_ledger import given_name
from spinledger.report.quantity_rows import (
    BUDGET_HEAD,
    CONTENT_HEAD,
    budget_rows,
    content_rows,
    quantity_of,
    quantity_sentences,
)
from spinledger.report.sketch import sketch_svg
from spinledger.report.svg import number, state_mark
from spinledger.report.tables import (
    ASSIGNMENT_HEAD,
    COMPARISON_HEAD,
    CONTENDER_HEAD,
    SIGNATURE_HEAD,
    STRAY_HEAD,
    AssignmentRow,
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
from spinledger.report.words import (
    fixed,
    outgoing,
    outgoing_verdict,
    solvent_glyphs,
)
from spinledger.structure.read import molecule
from spinledger.values.ledger import Ledger, VerdictState

_LABEL = re.compile(r"(?:[\w′.,]+\(?)?[\w′]+-(?:CH|OH|NH|SH|H|O|N|C)[\w′]*")
_SUBSCRIPTS = re.compile("[₀-₉]+")
_PLAIN_DIGITS = str.maketrans("₀₁₂₃₄₅₆₇₈₉", "0123456789")
_TILT_DEG: Mapping[VerdictState, float] = {
    "reconciled": 0.0,
    "undecided": 9.0,
    "not reconciled": 20.0,
    "not judged": 5.0,
}


def report_html(ledger: Ledger, context: ReportContext | None = None) -> str:
    """The report as one HTML page with its drawings inside.

    Parameters
    ----------
    ledger : Ledger
    context : ReportContext, optional

    Returns
    -------
    str
        UTF-8 text; refers to nothing outside itself.
    """
    chosen = context or ReportContext()
    parts = [_header(ledger, chosen), _verdict(ledger, chosen)]
    makers: Mapping[str, Callable[[Ledger, ReportContext], str]] = {
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
    parts += [makers[name](ledger, chosen) for name in chosen.sections]
    title = escape(f"{report_title(ledger)}: reconciliation report")
    return (
        '<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f"<title>{title}</title>\n<style>{style_sheet(*_footers(ledger))}</style>\n"
        f"</head>\n<body>\n<main>\n{''.join(parts)}</main>\n{_footer(ledger)}"
        "</body>\n</html>\n"
    )


def report_title(ledger: Ledger) -> str:
    """Name of the structure, or its formula."""
    if ledger.structure.name:
        return ledger.structure.name
    formula = CalcMolFormula(molecule(ledger.structure))
    return solvent_glyphs(formula)


def report_subtitle(ledger: Ledger, context: ReportContext) -> str:
    """Sample, field, nucleus, solvent and temperature in one line."""
    metadata = ledger.evidence.metadata
    tube = context.sample.name or context.sample.batch or metadata.source_name
    solvent = ledger.evidence.solvent
    field = f"{metadata.spectrometer_frequency_mhz:.2f}\u00a0MHz ¹H"
    if solvent:
        field += f" in {solvent_glyphs(solvent)}"
    temperature = metadata.temperature_k
    parts = [tube, field]
    if temperature is not None:
        parts.append(f"{temperature:.1f}\u00a0K")
    return ", ".join(parts)


def _header(ledger: Ledger, context: ReportContext) -> str:
    return (
        '<header><p class="over"><span>Reconciliation report</span>'
        f"<span>{escape(context.date)}</span></p>"
        f"<h1>{_lowered(report_title(ledger))}</h1>"
        f'<p class="under">{_lowered(report_subtitle(ledger, context))}</p>'
        f'<p class="under">{escape(ledger.structure.smiles)}</p></header>\n'
    )


def _verdict(ledger: Ledger, context: ReportContext) -> str:
    reasons = " ".join(outgoing(one) for one in ledger.verdict.reasons)
    excluded = [one for one in ledger.contenders if one.excluded]
    lines = [
        f'<h2 class="verdict">{escape(verdict_title(ledger))}</h2>'
        f'<p class="probability">{escape(probability_words(ledger))}</p>',
        f"<p>{_held(reasons)}</p>" if reasons else "",
        _before_edits(ledger, context),
    ]
    if excluded:
        names = list(dict.fromkeys(one.name or one.smiles for one in excluded))
        more = f" and {len(names) - 4} more" if len(names) > 4 else ""
        said = ", ".join(names[:4]) + more
        lines.append(f'<p class="muted">Excluded: {escape(said)}.</p>')
    if ledger.contenders and not ledger.verdict.unique:
        standing = dict.fromkeys(
            one.name or one.smiles for one in ledger.contenders if not one.excluded
        )
        lines.append(
            '<p class="muted">Not excluded: '
            f"{escape(', '.join(standing) or 'other structures')}.</p>"
        )
    return (
        '<section class="answer" aria-label="Verdict"><div class="words">'
        f"{_balance_icon(ledger.verdict.state)}<div>{''.join(lines)}</div></div>"
        f'<figure class="sketch">{sketch_svg(ledger)}</figure></section>\n'
    )


def _before_edits(ledger: Ledger, context: ReportContext) -> str:
    before = context.verdict_before_edits
    if before is None or not ledger.edits:
        return ""
    chance = (
        "" if before.probability is None else f", probability {before.probability:.3g}"
    )
    words = f"Before hand edits: {outgoing_verdict(before).lower()}{chance}."
    return f'<p class="muted">{escape(words)}</p>'


def _evidence(ledger: Ledger, _context: ReportContext) -> str:
    note = "ink measured, blue modelled; empty stretches of the axis are folded away"
    return (
        '<section><div class="head"><h3>Evidence and claims</h3>'
        f'<p class="muted">{note}</p></div>'
        f'<figure class="wide">{overview_svg(ledger)}</figure>'
        '<p class="small muted">One gain for all stretches. Under the trees: '
        "measured minus modelled in noise sd, linear to 3 and logarithmic "
        "beyond.</p></section>\n"
    )


def _assignment(ledger: Ledger, _context: ReportContext) -> str:
    rows = "".join(_assignment_row(row) for row in assignment_rows(ledger))
    closing = "".join(f"<td>{escape(cell)}</td>" for cell in balance_cells(ledger))
    doubt = fixed(accuracy_ppm(ledger), 3)
    return (
        "<section><h3>Assignment</h3>"
        f'<table class="assignment"><thead>{_head(ASSIGNMENT_HEAD)}</thead>'
        f'<tbody>{rows}</tbody><tfoot><tr class="balance">{closing}</tr></tfoot></table>'
        '<p class="small muted">In brackets: sd of the fit in units of the last '
        f"digit. Reference, concentration and temperature add ±{doubt}\u00a0ppm to "
        "every shift. Printed J are absolute values. Exchangeable protons and strays are left "
        "out of the balance.</p></section>\n"
    )


def _assignment_row(row: AssignmentRow) -> str:
    first, *rest, state = row.cells
    mark = (
        '<svg class="mark" viewBox="0 0 12 12" width="12" height="12" '
        f'aria-hidden="true">{state_mark((6, 6), row.state, size=9)}</svg>'
    )
    cells = "".join(f"<td>{_held(cell)}</td>" for cell in rest)
    noted = ' class="noted"' if row.notes else ""
    html = (
        f'<tr{noted}><th scope="row">{escape(first)}</th>{cells}'
        f'<td class="state">{mark} {escape(state)}</td></tr>'
    )
    if row.notes:
        html += (
            f'<tr class="note"><td></td><td colspan="{len(row.cells) - 1}">'
            f"{_held(' '.join(row.notes))}</td></tr>"
        )
    return html


def _text(ledger: Ledger, context: ReportContext) -> str:
    runs = "".join(
        f"<i>{escape(run.text)}</i>" if run.is_italic else _held(run.text)
        for run in experimental_runs(ledger, context.text)
    )
    return (
        "<section><h3>For the experimental section</h3>"
        f'<p class="journal">{runs}</p>'
        f"{_standing(ledger)}"
        f'<p class="muted">{escape(reference_sentence(ledger))}</p></section>\n'
    )


def _standing(ledger: Ledger) -> str:
    sentence = standing_sentence(ledger)
    return f"<p><b>{escape(sentence)}</b></p>" if sentence else ""


def _cautions(ledger: Ledger, _context: ReportContext) -> str:
    items = "".join(f"<li>{escape(one)}</li>" for one in printed_cautions(ledger))
    return f'<section class="cautions"><h3>Cautions</h3><ul>{items}</ul></section>\n'


def _expansions(ledger: Ledger, _context: ReportContext) -> str:
    drawings = "".join(
        f"<figure>{drawing}<figcaption>{escape(caption)}</figcaption></figure>"
        for caption, drawing in expansion_svgs(ledger)
    )
    if not drawings:
        return ""
    return (
        "<section><h3>Expansions</h3>"
        '<p class="small muted">Each at its own gain.</p>'
        f'<div class="expansions">{drawings}</div></section>\n'
    )


def _strays(ledger: Ledger, _context: ReportContext) -> str:
    rows = stray_rows(ledger)
    body = _table(STRAY_HEAD, rows) if rows else "<p>None. Every line has an owner.</p>"
    return f"<section><h3>Strays</h3>{body}</section>\n"


def _quantity(ledger: Ledger, context: ReportContext) -> str:
    quantity = quantity_of(ledger, context)
    said = "".join(f"<p>{escape(one)}</p>" for one in quantity_sentences(quantity))
    rows = content_rows(quantity.content)
    purity = quantity.purity
    budget = purity.budget if purity is not None else None
    return (
        f"<section><h3>Amounts</h3>{said}"
        + (_table(BUDGET_HEAD, budget_rows(budget)) if budget is not None else "")
        + (_table(CONTENT_HEAD, rows) if rows else "")
        + "</section>\n"
    )


def _contenders(ledger: Ledger, context: ReportContext) -> str:
    rows = contender_rows(ledger, context.contenders)
    note = contender_note(ledger, context.contenders)
    body = (
        _table(CONTENDER_HEAD, rows)
        if rows
        else "<p>No other structure was tested against this spectrum.</p>"
    )
    body += note and f"<p>{escape(note)}</p>"
    return f"<section><h3>Contenders</h3>{body}</section>\n"


def _geometry(ledger: Ledger, _context: ReportContext) -> str:
    items = "".join(f"<li>{_held(one)}</li>" for one in geometry_rows(ledger))
    return (
        f"<section><h3>Geometry by the couplings</h3><ul>{items}</ul></section>\n"
        if items
        else ""
    )


def _comparison(_ledger: Ledger, context: ReportContext) -> str:
    comparison = context.comparison
    if comparison is None:
        return ""
    remarks = "".join(f"<li>{escape(one)}</li>" for one in comparison.remarks)
    return (
        "<section><h3>Published list</h3>"
        f"<p>{escape(comparison_sentence(comparison))}</p>"
        f"{remarks and f'<ul>{remarks}</ul>'}"
        f"{_table(COMPARISON_HEAD, comparison_rows(comparison))}</section>\n"
    )


def _advice(ledger: Ledger, _context: ReportContext) -> str:
    rows = advice_rows(ledger)
    if not rows:
        return ""
    items = "".join(
        f"<li><b>{escape(what)}</b> {escape(look_for)}</li>" for what, look_for in rows
    )
    return f"<section><h3>Next measurement</h3><ol>{items}</ol></section>\n"


def _audit(ledger: Ledger, context: ReportContext) -> str:
    facts = _definitions(
        (
            *sample_rows(context.sample),
            *audit_rows(ledger),
            *_structure_facts(ledger),
        )
    )
    recipe = "".join(f"<li>{escape(one)}</li>" for one in recipe_lines(ledger))
    made_with = ", ".join(f"{name} {number}" for name, number in versions().items())
    edits = "".join(f"<li>{escape(one)}.</li>" for one in ledger.edits)
    trail = "".join(
        f"<li><time>{escape(line.when)}</time> "
        f"{'by hand: ' if line.by_hand else ''}{escape(line.what)}</li>"
        for line in context.audit
    )
    return (
        f"<section><h3>Audit trail</h3>{facts}<h4>Recipe</h4><ol>{recipe}</ol>"
        + (f"<h4>Hand edits</h4><ol>{edits}</ol>" if edits else "<p>No hand edits.</p>")
        + (f"<h4>Steps</h4><ol>{trail}</ol>" if trail else "")
        + f'<p class="small muted">Made with {escape(made_with)}.</p></section>\n'
    )


def _structure_facts(ledger: Ledger) -> tuple[tuple[str, str], ...]:
    structure = ledger.structure
    facts = [
        ("Structure as given", given_name(structure)),
        ("SMILES", structure.smiles),
    ]
    with rdBase.BlockLogs():
        inchi = str(
            Chem.MolToInchi(molecule(structure))  # type: ignore[no-untyped-call]  # RDKit
        )
    if inchi:
        facts.append(("InChI", inchi))
    species = [one for one in ledger.claims.species_smiles if one != structure.smiles]
    if species:
        facts.append(("In solution", " and ".join(ledger.claims.species_smiles)))
    facts += [("Note", outgoing(note)) for note in ledger.claims.notes]
    return tuple(facts)


def _signatures(_ledger: Ledger, context: ReportContext) -> str:
    lines = "".join(
        f"<tr>{''.join(f'<td>{escape(cell)}</td>' for cell in row)}</tr>"
        for row in signature_rows(context.sample)
    )
    return (
        '<section><h3>Signatures</h3><table class="signatures"><thead>'
        f"{_head(SIGNATURE_HEAD)}</thead><tbody>{lines}</tbody></table></section>\n"
    )


def _table(head: Iterable[str], rows: Iterable[Iterable[str]]) -> str:
    body = "".join(
        f"<tr>{''.join(f'<td>{escape(cell)}</td>' for cell in row)}</tr>"
        for row in rows
    )
    return f"<table><thead>{_head(head)}</thead><tbody>{body}</tbody></table>"


def _head(names: Iterable[str]) -> str:
    cells = "".join(f'<th scope="col">{escape(name)}</th>' for name in names)
    return f"<tr>{cells}</tr>"


def _definitions(rows: Iterable[tuple[str, str]]) -> str:
    body = "".join(
        f"<dt>{escape(name)}</dt><dd>{escape(value)}</dd>" for name, value in rows
    )
    return f"<dl>{body}</dl>"


def _held(text: str) -> str:
    """Markup of a text whose labels, like 2-HA, do not break at their hyphen."""
    return _LABEL.sub(r'<span class="held">\g<0></span>', _lowered(text))


def _lowered(text: str) -> str:
    """Markup of a text whose subscript digits are set by the browser."""

    def tag(match: re.Match[str]) -> str:
        return f"<sub>{match[0].translate(_PLAIN_DIGITS)}</sub>"

    return _SUBSCRIPTS.sub(tag, escape(text))


def _footers(ledger: Ledger) -> tuple[str, str]:
    digest = ledger.evidence.metadata.sha256[:16]
    grouped = " ".join(digest[i : i + 4] for i in range(0, len(digest), 4))
    steps = len(ledger.evidence.recipe.steps)
    edits = len(ledger.edits)
    work = f"Recipe {steps} steps, {edits} hand edit{'' if edits == 1 else 's'}"
    return f"Source SHA-256 {grouped} …", work


def _footer(ledger: Ledger) -> str:
    source, work = _footers(ledger)
    return (
        f"<footer><span>{escape(source)}</span><span>{escape(work)}</span></footer>\n"
    )


def _balance_icon(state: VerdictState) -> str:
    """A pair of scales, level where the structure agrees."""
    tilt = number(_TILT_DEG[state])
    return (
        '<svg class="scales" viewBox="0 0 32 26" width="40" height="32" '
        'aria-hidden="true" fill="none" stroke="currentColor" stroke-width="1.6">'
        '<path d="M16 3V22M9 23H23"/>'
        f'<g transform="rotate({tilt} 16 5)"><path d="M3 5H29"/>'
        '<path d="M3 5L-1.5 12M3 5L7.5 12M29 5L24.5 12M29 5L33.5 12" '
        'stroke-width="0.9"/><path d="M-2.5 12c1.5 4.5 9.5 4.5 11 0zM23.5 12c1.5 '
        '4.5 9.5 4.5 11 0z" fill="currentColor" stroke="none"/></g></svg>'
    )
