"""Several spectra of one tube: sample.json, sample.csv; shifts in ppm, J in Hz."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Sequence
from typing import Any

from spinledger.project.audit import versions
from spinledger.report.json_ledger import SCHEMA, evidence_to_json
from spinledger.report.numbers import finite
from spinledger.report.words import outgoing_state, plain
from spinledger.sample.batch_reference import BatchComparison, Deviation
from spinledger.sample.joint_values import (
    Column,
    JointLedger,
    SharedCoupling,
    Witness,
    entry_of,
)
from spinledger.sample.shake import Shake


def joint_json(
    joint: JointLedger,
    witnesses: Sequence[Witness],
    folders: Sequence[str],
    comparisons: Sequence[BatchComparison] = (),
) -> str:
    """Content of sample.json."""
    tree: dict[str, Any] = {
        "schema": SCHEMA,
        "verdict": {
            "state": joint.state,
            "probability": finite(joint.probability),
            "reasons": list(joint.reasons),
        },
        "spectra": [
            _spectrum(column, one, folder)
            for column, one, folder in zip(
                joint.columns, witnesses, folders, strict=True
            )
        ],
        "claims": [
            {
                "claim": row.claim,
                "protons": row.protons,
                "spectra": [
                    None
                    if cell is None
                    else {
                        "shift_ppm": finite(cell.shift_ppm),
                        "shift_sd_ppm": finite(cell.shift_sd_ppm),
                        "state": cell.state,
                    }
                    for cell in row.cells
                ],
            }
            for row in joint.rows
        ],
        "couplings": [_coupling(one) for one in joint.couplings],
        "shakes": [_shake(one) for one in joint.shakes],
        "comparisons": [comparison_to_json(one) for one in comparisons],
        "versions": versions(),
    }
    return json.dumps(tree, ensure_ascii=False, indent=1, allow_nan=False) + "\n"


def _spectrum(column: Column, one: Witness, folder: str) -> dict[str, Any]:
    again = column.refit
    return {
        "folder": folder,
        "role": column.role,
        "spectrum": evidence_to_json(one.ledger.evidence),
        "temperature_k": finite(column.temperature_k),
        "verdict": column.state,
        "probability": finite(column.probability),
        "counts": column.counts,
        "turned": [list(pair) for pair in column.turned],
        "refit": None
        if again is None
        else {
            "unexplained_before": finite(again.share_before),
            "unexplained_after": finite(again.share_after),
            "taken": again.taken,
        },
    }


def _coupling(one: SharedCoupling) -> dict[str, Any]:
    return {
        "claim": one.claim,
        "partner": one.partner,
        "j_hz": finite(one.j_hz),
        "j_sd_hz": finite(one.sd_hz),
        "spectra": [
            None
            if value is None
            else {"j_hz": finite(value.value), "j_sd_hz": finite(value.sd)}
            for value in one.values
        ],
        "chi2": finite(one.chi2),
        "agrees": one.agrees,
    }


def _shake(shake: Shake) -> dict[str, Any]:
    return {
        "before": shake.before,
        "after": shake.after,
        "offset_ppm": finite(shake.alignment.offset_ppm),
        "scale": finite(shake.alignment.scale),
        "scale_sd": finite(shake.alignment.scale_sd),
        "exchanged": [
            {
                "claims": list(one.claims),
                "range_ppm": [finite(one.low_ppm), finite(one.high_ppm)],
                "fraction": finite(one.fraction),
                "sd": finite(one.sd),
                "alone": one.is_alone,
                "why": one.why,
            }
            for one in shake.fractions
        ],
        "collapsed": [
            {
                "claim": one.claim,
                "partner": one.partner,
                "j_hz": finite(one.j_hz),
                "fraction": finite(one.fraction),
                "sd": finite(one.sd),
            }
            for one in shake.collapses
        ],
        "gained": [
            {
                "range_ppm": [finite(one.low_ppm), finite(one.high_ppm)],
                "kind": "water" if one.is_water else "unexplained",
            }
            for one in shake.gains
        ],
        "contradicts": shake.contradicts,
    }


def comparison_to_json(one: BatchComparison) -> dict[str, Any]:
    """A batch against its reference, as plain lists and numbers."""
    return {
        "batch": one.batch,
        "reference": one.reference,
        "passed": one.passed,
        "limits": {
            "line_mol_percent": one.limits.line_mol_percent,
            "integral_percent": one.limits.integral_percent,
            "shift_ppm": one.limits.shift_ppm,
        },
        "deviations": [_deviation(row) for row in one.deviations],
        "sentences": list(one.sentences()),
    }


def _deviation(one: Deviation) -> dict[str, Any]:
    return {
        "kind": one.kind,
        "range_ppm": [finite(one.low_ppm), finite(one.high_ppm)],
        "amount": finite(one.amount),
        "sd": finite(one.sd),
        "limit": one.limit,
        "noise_sd": finite(one.noise_sd),
    }


def joint_csv(joint: JointLedger, witnesses: Sequence[Witness]) -> str:
    """sample.csv: one row a claim, a pair of columns a spectrum; then the couplings."""
    stream = io.StringIO(newline="")
    writer = csv.writer(stream)
    names = [column.name for column in joint.columns]
    head = [f"{what} {name}" for name in names for what in ("shift_ppm", "state")]
    writer.writerow(["claim", "protons", *head])
    for row in joint.rows:
        cells: list[str] = []
        for one, cell in zip(witnesses, row.cells, strict=True):
            entry = entry_of(one.ledger, row.claim)
            if cell is None or entry is None:
                cells += ["", ""]
                continue
            shift = "" if cell.shift_ppm is None else plain(cell.shift_ppm, 4)
            cells += [shift, outgoing_state(one.ledger, entry)]
        writer.writerow([row.claim, row.protons, *cells])
    return stream.getvalue()


def couplings_csv(joint: JointLedger) -> str:
    """couplings.csv: one row a coupling, a pair of columns a spectrum."""
    stream = io.StringIO(newline="")
    writer = csv.writer(stream)
    names = [column.name for column in joint.columns]
    head = [f"{what} {name}" for name in names for what in ("j_hz", "j_sd_hz")]
    writer.writerow(["claim", "partner", "j_hz", "j_sd_hz", "agrees", *head])
    for one in joint.couplings:
        cells: list[str] = []
        for value in one.values:
            cells += (
                ["", ""]
                if value is None
                else [plain(value.value, 3), plain(value.sd, 3)]
            )
        writer.writerow(
            [
                one.claim,
                one.partner,
                plain(one.j_hz, 3),
                plain(one.sd_hz, 3),
                "yes" if one.agrees else "no",
                *cells,
            ]
        )
    return stream.getvalue()
