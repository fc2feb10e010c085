"""Several spectra of one tube: what they say together.

Shifts in ppm.
"""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from spinledger.project.audit import versions
from spinledger.report.json_ledger import SCHEMA, evidence_to_json
from spinledger.report.numbers import finite
from spinledger.report.words import outgoing_state, plain
from spinledger.values.ledger import Entry, Ledger, VerdictState


@dataclass(frozen=True, slots=True, kw_only=True)
class JointVerdict:
    """Verdict over several spectra.

    Attributes
    ----------
    state : str
        Reconciled if every judged spectrum is, not reconciled if one is not,
        undecided else, not judged if none was.
    probability : float or None
        That of the least probable spectrum. The odds are not multiplied: the
        same predictions stand behind all spectra, so they are not independent.
    reasons : tuple of str
    """

    state: VerdictState
    probability: float | None
    reasons: tuple[str, ...]


def joint_verdict(ledgers: Sequence[Ledger]) -> JointVerdict:
    """What the spectra say together.

    Parameters
    ----------
    ledgers : sequence of Ledger
        Of one structure; at least one.

    Raises
    ------
    ValueError
        If there is none.
    """
    if not ledgers:
        raise ValueError("ledgers: need one or more")
    judged = [one for one in ledgers if one.verdict.state != "not judged"]
    states = {one.verdict.state for one in judged}
    state: VerdictState = "undecided"
    if not judged:
        state = "not judged"
    elif "not reconciled" in states:
        state = "not reconciled"
    elif states == {"reconciled"}:
        state = "reconciled"
    chances = [
        one.verdict.probability for one in judged if one.verdict.probability is not None
    ]
    reasons = [
        f"{_name(one)}: {one.verdict.state}."
        for one in sorted(ledgers, key=lambda one: one.verdict.probability or 0.0)
    ]
    return JointVerdict(
        state=state,
        probability=min(chances) if chances else None,
        reasons=(*reasons, *exchange_sentences(ledgers)),
    )


def exchange_sentences(ledgers: Sequence[Ledger]) -> tuple[str, ...]:
    """One sentence for each exchangeable claim that comes and goes."""
    sentences = []
    for label in _exchangeable(ledgers):
        seen = [_name(one) for one in ledgers if _is_seen(_entry(one, label))]
        gone = [_name(one) for one in ledgers if not _is_seen(_entry(one, label))]
        if seen and gone:
            sentences.append(
                f"{label} is seen in {', '.join(seen)} and not in {', '.join(gone)}, "
                "as an exchangeable proton may."
            )
    return tuple(sentences)


def joint_json(ledgers: Sequence[Ledger], folders: Sequence[str]) -> str:
    """Content of sample.json."""
    verdict = joint_verdict(ledgers)
    tree: dict[str, Any] = {
        "schema": SCHEMA,
        "verdict": {
            "state": verdict.state,
            "probability": finite(verdict.probability),
            "reasons": list(verdict.reasons),
        },
        "spectra": [
            {
                "folder": folder,
                "spectrum": evidence_to_json(one.evidence),
                "verdict": one.verdict.state,
                "probability": finite(one.verdict.probability),
            }
            for one, folder in zip(ledgers, folders, strict=True)
        ],
        "versions": versions(),
    }
    return json.dumps(tree, ensure_ascii=False, indent=1, allow_nan=False) + "\n"


def joint_csv(ledgers: Sequence[Ledger]) -> str:
    """sample.csv: one row a claim, one pair of columns a spectrum."""
    stream = io.StringIO(newline="")
    writer = csv.writer(stream)
    names = [_name(one) for one in ledgers]
    head = [f"{what} {name}" for name in names for what in ("shift_ppm", "state")]
    writer.writerow(["claim", "protons", *head])
    labels = dict.fromkeys(e.claim for one in ledgers for e in one.entries)
    for label in labels:
        entries = [_entry(one, label) for one in ledgers]
        protons = next(entry.protons for entry in entries if entry is not None)
        cells: list[str] = []
        for ledger, entry in zip(ledgers, entries, strict=True):
            cells += _cells(ledger, entry)
        writer.writerow([label, protons, *cells])
    return stream.getvalue()


def _cells(ledger: Ledger, entry: Entry | None) -> list[str]:
    if entry is None:
        return ["", ""]
    shift = "" if entry.shift_ppm is None else plain(entry.shift_ppm, 4)
    return [shift, outgoing_state(ledger, entry)]


def _exchangeable(ledgers: Sequence[Ledger]) -> list[str]:
    labels = dict.fromkeys(
        claim.label
        for one in ledgers
        for claim in one.claims.claims
        if claim.is_exchangeable
    )
    return list(labels)


def _entry(ledger: Ledger, label: str) -> Entry | None:
    return next((one for one in ledger.entries if one.claim == label), None)


def _is_seen(entry: Entry | None) -> bool:
    return entry is not None and entry.shift_ppm is not None


def _name(ledger: Ledger) -> str:
    metadata = ledger.evidence.metadata
    solvent = f" in {ledger.evidence.solvent}" if ledger.evidence.solvent else ""
    return f"{metadata.source_name}{solvent}"
