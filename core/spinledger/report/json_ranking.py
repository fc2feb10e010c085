"""ranking.json, schema 1: candidates against one spectrum, best first."""

from __future__ import annotations

import json
from typing import Any

from spinledger.project.audit import versions
from spinledger.reconcile.ranking import RankedCandidate, Ranking
from spinledger.report.json_ledger import SCHEMA, evidence_to_json
from spinledger.report.numbers import finite
from spinledger.values.evidence import Evidence


def ranking_to_json(ranking: Ranking, evidence: Evidence) -> dict[str, Any]:
    """Ranking as plain dicts, lists, text and finite numbers.

    Parameters
    ----------
    ranking : Ranking
    evidence : Evidence
        The spectrum that was ranked against.
    """
    return {
        "schema": SCHEMA,
        "candidates": [_candidate(one) for one in ranking.candidates],
        "spectrum": evidence_to_json(evidence),
        "versions": versions(),
    }


def ranking_text(ranking: Ranking, evidence: Evidence) -> str:
    """Content of ranking.json."""
    tree = ranking_to_json(ranking, evidence)
    return json.dumps(tree, ensure_ascii=False, indent=1, allow_nan=False) + "\n"


def _candidate(one: RankedCandidate) -> dict[str, Any]:
    return {
        "name": one.name,
        "smiles": one.smiles,
        "probability": finite(one.probability),
        "verdict": one.verdict,
        "verdict_probability": finite(one.verdict_probability),
        "reasons": list(one.reasons),
    }
