"""ledger.json, schema 1: keys may be added, never changed.

Shifts and ranges in ppm, couplings in Hz, integrals in protons.
"""

from __future__ import annotations

import json
import re
from pathlib import Path
from typing import Any

from rdkit import Chem, rdBase

from spinledger.errors import FileError
from spinledger.project.audit import versions
from spinledger.report.json_geometry import geometry_to_json
from spinledger.report.numbers import finite
from spinledger.values.evidence import Evidence, Stray
from spinledger.values.ledger import (
    Advice,
    Contender,
    Entry,
    EntryCoupling,
    EntryGroup,
    Ledger,
    SideFinding,
)
from spinledger.values.structure import Structure

SCHEMA = 1


class LedgerFileError(FileError, ValueError):
    """A ledger.json could not be read or is not one."""


def ledger_to_json(ledger: Ledger) -> dict[str, Any]:
    """Ledger as plain dicts, lists, text and finite numbers.

    Parameters
    ----------
    ledger : Ledger

    Returns
    -------
    dict
        Schema 1. What is unknown is None.
    """
    verdict = ledger.verdict
    return {
        "schema": SCHEMA,
        "spectrum": evidence_to_json(ledger.evidence),
        "structure": _structure(ledger),
        "entries": [_entry(entry) for entry in ledger.entries],
        "strays": [_stray(stray) for stray in ledger.strays],
        "balance": {
            "claimed": finite(ledger.balance.claimed),
            "found": finite(ledger.balance.found),
            "scale_signal": ledger.balance.scale_signal,
        },
        "verdict": {
            "state": verdict.state,
            "probability": finite(verdict.probability),
            "prior": finite(verdict.prior),
            "likelihood_ratio": finite(verdict.likelihood_ratio),
            "unique": verdict.unique,
            "reasons": list(verdict.reasons),
        },
        "contenders": [_contender(one) for one in ledger.contenders],
        "advice": [_advice(one) for one in ledger.advice],
        "recipe": ledger.evidence.recipe.to_json(),
        "edits": list(ledger.edits),
        "versions": versions(),
        "cautions": list(ledger.cautions),
        "side": [_side(one) for one in ledger.side],
        "geometry": geometry_to_json(ledger.geometry),
    }


def ledger_text(ledger: Ledger) -> str:
    """Content of ledger.json."""
    tree = ledger_to_json(ledger)
    return json.dumps(tree, ensure_ascii=False, indent=1, allow_nan=False) + "\n"


def read_ledger_json(path: Path) -> dict[str, Any]:
    """Tree of a ledger.json, checked as far as a reader relies on it.

    Parameters
    ----------
    path : pathlib.Path
        The file, or a folder that holds ledger.json.

    Raises
    ------
    LedgerFileError
        If it is missing, unreadable, of a newer schema, or not a ledger.
    """
    target = path / "ledger.json" if path.is_dir() else path
    try:
        tree = json.loads(target.read_text(encoding="utf-8"))
    except FileNotFoundError as error:
        raise LedgerFileError(target, "there is no such file") from error
    except OSError as error:
        reason = error.strerror or "it cannot be read"
        raise LedgerFileError(target, f"it could not be read ({reason})") from error
    except ValueError as error:
        raise LedgerFileError(target, "this is not a ledger.json") from error
    if not isinstance(tree, dict) or not isinstance(tree.get("entries"), list):
        raise LedgerFileError(target, "this is not a ledger.json")
    if tree.get("schema") != SCHEMA:
        raise LedgerFileError(
            target,
            f"schema {tree.get('schema')!r} is not known here; update Spin Ledger",
        )
    return tree


def evidence_to_json(evidence: Evidence) -> dict[str, Any]:
    """The "spectrum" part of a record."""
    metadata = evidence.metadata
    return {
        "source": metadata.source_name,
        "sha256": metadata.sha256,
        "field_mhz": finite(metadata.spectrometer_frequency_mhz),
        "nucleus": metadata.nucleus,
        "solvent": evidence.solvent,
        "solvent_seen": evidence.solvent_seen,
        "reference": {
            "by": evidence.reference.by,
            "sd_ppm": finite(evidence.reference.sd_ppm),
            "offset_ppm": finite(evidence.reference.offset_ppm),
            "why": evidence.reference.why,
        },
        "solvent_header": evidence.solvent_header,
        "temperature_k": finite(metadata.temperature_k),
        "format": metadata.format_name,
        "quality": {
            "phase_sd_deg": finite(evidence.quality.phase_sd_deg),
            "baseline_sd": finite(evidence.quality.baseline_sd),
        },
        "doubts": [*metadata.notes, *evidence.quality.doubts],
    }


def _structure(ledger: Ledger) -> dict[str, Any]:
    structure = ledger.structure
    smiles = _smiles_as_given(structure)
    tree: dict[str, Any] = {
        "smiles": smiles or structure.smiles,
        "visible_protons": visible_protons(ledger),
        "given": given_name(structure),
        "canonical_smiles": structure.smiles,
        "name": structure.name,
        "species": list(ledger.claims.species_smiles),
    }
    if smiles is None:  # atoms are counted in the file's order, which this keeps
        tree["molblock"] = structure.molblock
    return tree


def given_name(structure: Structure) -> str:
    """What the user gave: the SMILES, or the file's name without its folders."""
    given = structure.given
    if _smiles_as_given(structure) is not None or given.startswith("InChI="):
        return given
    return re.split(r"[/\\]", given.strip())[-1]


def _smiles_as_given(structure: Structure) -> str | None:
    """SMILES text of the user; None where a file or an InChI was given."""
    words = structure.given.split()
    if not words:
        return None
    with rdBase.BlockLogs():
        is_smiles = Chem.MolFromSmiles(words[0]) is not None
    return words[0] if is_smiles else None


def visible_protons(ledger: Ledger) -> int | float:
    """Protons that this spectrum can show, by the claims; species by their shares."""
    shares = ledger.claims.species_shares
    total = 0.0
    for claim in ledger.claims.claims:
        if claim.visibility == "silent":
            continue
        is_known = claim.species < len(shares)
        total += claim.n_protons * (shares[claim.species][0] if is_known else 1.0)
    nearest = round(total)
    return nearest if abs(total - nearest) < 1e-6 else round(total, 3)


def _entry(entry: Entry) -> dict[str, Any]:
    return {
        "claim": entry.claim,
        "atoms": [int(atom) for atom in entry.atoms],
        "species": entry.species,
        "protons": entry.protons,
        "state": entry.state,
        "predicted_shift_ppm": finite(entry.predicted_shift_ppm),
        "predicted_shift_sd_ppm": finite(entry.predicted_shift_sd_ppm),
        "shift_ppm": finite(entry.shift_ppm),
        "shift_sd_ppm": finite(entry.shift_sd_ppm),
        "range_ppm": None
        if entry.range_ppm is None
        else [finite(end) for end in entry.range_ppm],
        "integral_protons": finite(entry.integral_protons),
        "multiplicity": entry.multiplicity,
        "group": _group(entry.group),
        "couplings": [_coupling(one) for one in entry.couplings],
        "integral_sd_protons": finite(entry.integral_sd_protons),
        "predicted_multiplicity": entry.predicted_multiplicity,
        "width_hz": finite(entry.width_hz),
        "shift_residual_sd": finite(entry.shift_residual_sd),
        "integral_residual_sd": finite(entry.integral_residual_sd),
        "j_residual_sd": finite(entry.j_residual_sd),
        "why": entry.why,
        "reasons": list(entry.reasons),
    }


def _group(group: EntryGroup | None) -> dict[str, Any] | None:
    if group is None:
        return None
    return {
        "kind": group.kind,
        "with": list(group.partners),
        "odds": finite(group.odds),
    }


def _coupling(coupling: EntryCoupling) -> dict[str, Any]:
    tree: dict[str, Any] = {
        "partner": coupling.partner,
        "j_hz": finite(coupling.j_hz) if coupling.determined else None,
        "determined": coupling.determined,
        "j_sd_hz": finite(coupling.j_sd_hz) if coupling.determined else None,
        "predicted_j_hz": finite(coupling.predicted_j_hz),
        "predicted_j_sd_hz": finite(coupling.predicted_j_sd_hz),
        "kind": coupling.kind,
        "disputed": coupling.is_disputed,
    }
    if coupling.sum_hz is not None:
        tree["sum_hz"] = finite(coupling.sum_hz)
    return tree


def _stray(stray: Stray) -> dict[str, Any]:
    return {
        "range_ppm": [finite(stray.low_ppm), finite(stray.high_ppm)],
        "kind": stray.kind,
        "why": stray.why,
        "protons": finite(stray.protons),
    }


def _contender(contender: Contender) -> dict[str, Any]:
    return {
        "name": contender.name,
        "smiles": contender.smiles,
        "origin": contender.origin,
        "probability": finite(contender.probability),
        "verdict": contender.verdict,
        "excluded": contender.excluded,
        "why": contender.why,
    }


def _advice(advice: Advice) -> dict[str, Any]:
    return {
        "measurement": advice.measurement,
        "expected_discrimination": finite(advice.expected_discrimination),
        "look_for": advice.look_for,
        "expected_log_odds": finite(advice.expected_log_odds),
        "against": list(advice.against),
    }


def _side(finding: SideFinding) -> dict[str, Any]:
    return {
        "kind": finding.kind,
        "sentence": finding.sentence,
        "cost": finite(finding.cost),
    }
