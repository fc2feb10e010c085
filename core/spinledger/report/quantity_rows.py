"""Content, budget and residual solvents as plain text and as JSON."""

from __future__ import annotations

import json
from dataclasses import asdict
from typing import Any

from spinledger.project.audit import versions
from spinledger.quantity.budget import Budget, Contribution
from spinledger.quantity.content import Content, content
from spinledger.quantity.purity import Purity
from spinledger.quantity.result import Quantity
from spinledger.report.context import ReportContext
from spinledger.report.json_ledger import SCHEMA
from spinledger.report.numbers import finite
from spinledger.report.words import fixed, label_glyphs, outgoing
from spinledger.values.ledger import Ledger

BUDGET_HEAD = (
    "Quantity",
    "Value",
    "Standard uncertainty",
    "Relative",
    "Share",
    "Source",
)
CONTENT_HEAD = ("Compound", "Signal, ppm", "Protons", "mol %", "mass %")
_MASS_FRACTION_NOTE = (
    "A content by protons does not see silica, salts, water, or anything else "
    "without protons of its own; it is a mass fraction of what was weighed."
)


def quantity_of(ledger: Ledger, context: ReportContext) -> Quantity:
    """The quantity that was asked for, or what the strays alone tell."""
    return context.quantity or Quantity(content=content(ledger))


def quantity_sentences(quantity: Quantity) -> tuple[str, ...]:
    """Result, or the refusal with its reasons, and what was assumed."""
    purity = quantity.purity
    if purity is not None:
        return _purity_sentences(purity)
    found = quantity.content
    if found.refusals:
        return ("No amounts are given. " + " ".join(map(outgoing, found.refusals)),)
    if not found.companions and not found.not_counted:
        return ("No residual solvent or common impurity was recognised.",)
    return tuple(outgoing(one) for one in (*found.not_counted, *found.notes))


def _purity_sentences(purity: Purity) -> tuple[str, ...]:
    budget = purity.budget
    notes = tuple(outgoing(one) for one in purity.notes)
    if budget is None:
        reasons = " ".join(outgoing(one) for one in purity.refusals)
        return (f"No content is given. {reasons}", *notes)
    used = ", ".join(label_glyphs(x) for one in purity.signals for x in one.labels)
    left = [
        f"{', '.join(label_glyphs(x) for x in one.labels)} ({one.why})"
        for one in purity.left_out
    ]
    sentences = [
        f"Content {percent_words(budget)} by mass (coverage factor "
        f"{budget.coverage_factor:g}), against {purity.standard.name}.",
        f"Signals used: {used}." + (f" Left out: {'; '.join(left)}." if left else ""),
        *notes,
        _MASS_FRACTION_NOTE,
    ]
    return tuple(sentences)


def percent_words(budget: Budget) -> str:
    r"""Content and expanded uncertainty with two figures of the latter.

    Examples
    --------
    >>> from spinledger.quantity.budget import Input, combine
    >>> part = Input(name="P", value=0.98312, unit="", standard_uncertainty=0.0047,
    ...              exponent=1, source="")
    >>> percent_words(combine([part]))
    '98.31 ± 0.94\xa0%'
    """
    expanded = 100 * budget.expanded
    digits = 2 if expanded < 1 else 1
    return f"{fixed(100 * budget.value, digits)} ± {fixed(expanded, digits)}\u00a0%"


def budget_rows(budget: Budget) -> tuple[tuple[str, ...], ...]:
    """One row an input, and the result as the last."""
    rows = [_budget_row(one) for one in budget.rows]
    total = budget.standard_uncertainty / budget.value
    closing = (
        "Content",
        f"{budget.value:.4f}",
        f"{budget.standard_uncertainty:.2g}",
        f"{fixed(100 * total, 2)}\u00a0%",
        "100\u00a0%",
        f"expanded {budget.expanded:.2g} (k = {budget.coverage_factor:g})",
    )
    return (*rows, closing)


def _budget_row(one: Contribution) -> tuple[str, ...]:
    source = one.source
    unit = f"\u00a0{source.unit}" if source.unit else ""
    shape = ", rectangular" if source.distribution == "rectangular" else ""
    return (
        source.name,
        f"{source.value:.6g}{unit}",
        f"{source.standard_uncertainty:.2g}{unit}",
        f"{fixed(100 * source.relative, 2)}\u00a0%",
        f"{fixed(100 * one.share, 0)}\u00a0%",
        f"{source.source}{shape}",
    )


def content_rows(found: Content) -> tuple[tuple[str, ...], ...]:
    """One row a recognised compound, the largest mass first."""
    return tuple(
        (
            one.name,
            fixed(one.shift_ppm, 2),
            str(one.n_protons),
            f"{fixed(one.mol_percent, 2)} ± "
            f"{fixed(2 * one.mol_percent * one.mol_ratio_u / one.mol_ratio, 2)}",
            fixed(one.mass_percent, 2),
        )
        for one in found.companions
    )


def quantity_json(quantity: Quantity) -> str:
    """Content of quantity.json."""
    tree = {"schema": SCHEMA, **_plain(asdict(quantity)), "versions": versions()}
    purity = quantity.purity
    if purity is not None and purity.budget is not None:
        tree["purity"]["budget"]["expanded"] = finite(purity.budget.expanded)
    return json.dumps(tree, ensure_ascii=False, indent=1, allow_nan=False) + "\n"


def _plain(value: Any) -> Any:
    if isinstance(value, dict):
        return {name: _plain(one) for name, one in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(one) for one in value]
    return finite(value) if isinstance(value, float) else value
