"""Composition of a mixture: mixture.json and mixture.csv; mol %."""

from __future__ import annotations

import csv
import io
import json
from typing import Any

from spinledger.project.audit import versions
from spinledger.report.json_ledger import SCHEMA
from spinledger.report.numbers import finite
from spinledger.report.words import plain
from spinledger.sample.mixture import Mixture


def mixture_json(mixture: Mixture) -> str:
    """Content of mixture.json."""
    tree: dict[str, Any] = {
        "schema": SCHEMA,
        "verdict": mixture.ledger.verdict.state,
        "components": [
            {
                "name": one.name,
                "part": one.part,
                "mol_percent": finite(one.mol_percent),
                "mol_percent_sd": finite(one.mol_percent_sd),
                "by": "integral" if one.by_integral else "fit",
                "claims": list(one.claims),
            }
            for one in mixture.amounts
        ],
        "ratios": [
            {
                "kind": one.kind,
                "first": one.first,
                "second": one.second,
                "percent": finite(one.percent),
                "sd": finite(one.sd),
            }
            for one in mixture.ratios
        ],
        "sentences": list(mixture.sentences()),
        "versions": versions(),
    }
    return json.dumps(tree, ensure_ascii=False, indent=1, allow_nan=False) + "\n"


def mixture_csv(mixture: Mixture) -> str:
    """mixture.csv: one row a component."""
    stream = io.StringIO(newline="")
    writer = csv.writer(stream)
    writer.writerow(["component", "part", "mol_percent", "sd", "by", "claims"])
    for one in mixture.amounts:
        writer.writerow(
            [
                one.name,
                one.part,
                plain(one.mol_percent, 2),
                plain(one.mol_percent_sd, 2),
                "integral" if one.by_integral else "fit",
                " ".join(one.claims),
            ]
        )
    return stream.getvalue()
