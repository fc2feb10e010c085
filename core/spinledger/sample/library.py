"""Library of a laboratory's own assigned compounds: a plain folder of JSON records.

Shifts in ppm, couplings and widths in Hz, fields in MHz.
"""

from __future__ import annotations

import json
import os
import re
import tempfile
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
from rdkit.Chem import rdFingerprintGenerator

from spinledger.errors import OutputError, StructureError
from spinledger.structure.read import molecule, read_structure
from spinledger.values.claim import Claim, ClaimSet
from spinledger.values.evidence import Evidence, Signal
from spinledger.values.ledger import Ledger
from spinledger.values.structure import Structure

SCHEMA = 1
SUFFIX = ".json"
DEEPEST = 4
# How well a proton whose surroundings are the same to so many bonds repeats the
# miss of the prediction; sd in ppm [common practice].
MISS_SD_PPM = {1: 0.25, 2: 0.15, 3: 0.08, 4: 0.05}
OTHER_SOLVENT_SD_PPM = 0.15
# Two lines this near in place are one line of one compound.
SAME_LINE_PPM = 0.02
LEAST_SHARE = 0.6


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordClaim:
    """One assigned group of protons; ``predicted_ppm`` is what was expected then."""

    label: str
    atoms: tuple[int, ...]
    protons: int
    shift_ppm: float
    predicted_ppm: float
    is_exchangeable: bool = False
    couplings: tuple[tuple[str, float], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordLine:
    """One fitted line of the compound: place and area in protons."""

    shift_ppm: float
    protons: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Record:
    """An assigned compound as the library keeps it."""

    name: str
    smiles: str
    solvent: str | None
    field_mhz: float
    sha256: str
    claims: tuple[RecordClaim, ...]
    lines: tuple[RecordLine, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Neighbour:
    """A known proton in surroundings like those that were asked for.

    Attributes
    ----------
    record : str
    label : str
    shift_ppm : float, ppm
    miss_ppm : float, ppm
        Measured minus predicted.
    bonds : int
        To which the surroundings are the same.
    same_solvent : bool
    """

    record: str
    label: str
    shift_ppm: float
    miss_ppm: float
    bonds: int
    same_solvent: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Library:
    """Records of a folder, and a sentence for each file that could not be used."""

    records: tuple[Record, ...]
    problems: tuple[str, ...] = ()


def record_of(ledger: Ledger, name: str) -> Record:
    """Record of a reconciled compound: its settled claims and their lines.

    Raises
    ------
    StructureError
        If the ledger is not reconciled, so that nothing wrong is learnt.
    """
    if ledger.verdict.state != "reconciled":
        raise StructureError(
            name,
            f"the ledger is {ledger.verdict.state}; only reconciled compounds go into "
            "the library",
        )
    loose = {one.label for one in ledger.claims.claims if one.is_exchangeable}
    claims = tuple(
        RecordClaim(
            label=one.claim,
            atoms=one.atoms,
            protons=one.protons,
            shift_ppm=one.shift_ppm,
            predicted_ppm=one.predicted_shift_ppm,
            is_exchangeable=one.claim in loose,
            couplings=tuple(
                (j.partner, j.j_hz) for j in one.couplings if j.j_hz is not None
            ),
        )
        for one in ledger.entries
        if one.state == "settled" and one.shift_ppm is not None and one.species == 0
    )
    kept = {one.label for one in claims if not one.is_exchangeable}
    lines = tuple(
        RecordLine(shift_ppm=float(at), protons=float(area))
        for one in (ledger.model.claim_lines if ledger.model else ())
        if one.claim in kept
        for at, area in zip(one.shifts_ppm, one.protons, strict=True)
        if area > 0.02
    )
    return Record(
        name=name,
        smiles=ledger.structure.smiles,
        solvent=ledger.evidence.solvent,
        field_mhz=ledger.evidence.spectrum.spectrometer_frequency_mhz,
        sha256=ledger.evidence.metadata.sha256,
        claims=claims,
        lines=lines,
    )


def save_record(record: Record, folder: Path) -> Path:
    """Write a record; an older one of the same name and spectrum is replaced.

    Raises
    ------
    OutputError
        If the folder cannot be written to.
    """
    stem = re.sub(r"[^\w.+-]+", "_", record.name).strip("._") or "compound"
    path = folder / f"{stem}-{record.sha256[:8]}{SUFFIX}"
    text = json.dumps(_to_json(record), ensure_ascii=False, indent=1) + "\n"
    try:
        folder.mkdir(parents=True, exist_ok=True)
        handle, name = tempfile.mkstemp(dir=folder, prefix=".", suffix=".part")
        temporary = Path(name)
        try:
            with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as stream:
                stream.write(text)
            temporary.replace(path)
        except BaseException:
            temporary.unlink(missing_ok=True)
            raise
    except OSError as error:
        reason = error.strerror or "it cannot be written"
        raise OutputError(
            folder, f"the record could not be saved ({reason})"
        ) from error
    return path


def load_library(folder: Path) -> Library:
    """Read all records of a folder; what cannot be read is said, not lost.

    Raises
    ------
    OutputError
        If there is no such folder.
    """
    if not folder.is_dir():
        raise OutputError(folder, "there is no such library folder")
    records, problems = [], []
    for path in sorted(folder.glob(f"*{SUFFIX}")):
        try:
            records.append(_from_json(json.loads(path.read_text(encoding="utf-8"))))
        except (ValueError, KeyError, TypeError, OSError) as error:
            problems.append(f"{path.name} is no library record ({error}); passed over.")
    return Library(records=tuple(records), problems=tuple(problems))


def neighbours(
    library: Library, structure: Structure, claim: Claim, *, solvent: str | None
) -> tuple[Neighbour, ...]:
    """Known protons with the most alike surroundings, the nearest first.

    Parameters
    ----------
    library : Library
    structure : Structure
        That the claim belongs to.
    claim : Claim
    solvent : str or None
        Known protons in the same solvent come before others.
    """
    wanted = _environments(structure).get(claim.atoms[0], ())
    rows = []
    for record in library.records:
        codes = _environments(read_structure(record.smiles))
        for one in record.claims:
            if one.is_exchangeable != claim.is_exchangeable:
                continue
            bonds = _same_to(wanted, codes.get(one.atoms[0], ()))
            if bonds < 1:
                continue
            rows.append(
                Neighbour(
                    record=record.name,
                    label=one.label,
                    shift_ppm=one.shift_ppm,
                    miss_ppm=one.shift_ppm - one.predicted_ppm,
                    bonds=bonds,
                    same_solvent=record.solvent == solvent,
                )
            )
    return tuple(sorted(rows, key=lambda row: (-row.bonds, not row.same_solvent)))


def sharpened(
    claims: ClaimSet, structure: Structure, library: Library, *, solvent: str | None
) -> ClaimSet:
    """Claims whose shifts are corrected by the misses of their nearest neighbours.

    Notes
    -----
    The miss of a neighbour is taken as a measurement of the claim's own, with an
    sd by how far their surroundings are the same; it is combined with the
    prediction's sd by inverse variance. Only the nearest kind counts. Protons
    that exchange, and species beyond the first, are left as they are.
    """
    if not library.records:
        return claims
    changed = [
        one
        if one.is_exchangeable or one.species or not one.atoms
        else _sharpened_claim(one, neighbours(library, structure, one, solvent=solvent))
        for one in claims.claims
    ]
    return replace(claims, claims=tuple(changed))


def library_structures(library: Library) -> tuple[Structure, ...]:
    """Structures of all records, once each: companions of a reconciliation."""
    smiles = dict.fromkeys(one.smiles for one in library.records)
    return tuple(read_structure(one) for one in smiles)


def named_by_library(
    evidence: Evidence, library: Library
) -> tuple[tuple[Record, float], ...]:
    """Records whose lines a spectrum shows, best first, with the share shown.

    Records in another solvent are passed over.
    """
    rows = []
    for record in library.records:
        total = sum(one.protons for one in record.lines)
        if (record.solvent and record.solvent != evidence.solvent) or total <= 0.0:
            continue
        shown = sum(
            one.protons
            for one in record.lines
            if any(_shows(signal, one.shift_ppm) for signal in evidence.signals)
        )
        if shown / total >= LEAST_SHARE:
            rows.append((record, shown / total))
    return tuple(sorted(rows, key=lambda row: -row[1]))


def _shows(signal: Signal, shift_ppm: float) -> bool:
    """Whether a signal has a line at a place; one without a line list, if it covers it."""
    if not signal.lines:
        return signal.low_ppm <= shift_ppm <= signal.high_ppm
    return any(abs(one.shift_ppm - shift_ppm) <= SAME_LINE_PPM for one in signal.lines)


def _sharpened_claim(claim: Claim, near: Sequence[Neighbour]) -> Claim:
    if not near:
        return claim
    deepest = near[0].bonds
    chosen = [one for one in near if one.bonds == deepest]
    misses = np.array([one.miss_ppm for one in chosen])
    sds = np.array(
        [
            np.hypot(
                MISS_SD_PPM[deepest], 0.0 if one.same_solvent else OTHER_SOLVENT_SD_PPM
            )
            for one in chosen
        ]
    )
    weights = sds**-2
    miss = float(np.sum(weights * misses) / np.sum(weights))
    # Misses of one environment are alike, so that many are worth little more.
    variance = float(1.0 / np.mean(weights))
    gain = claim.shift_sd_ppm**2 / (claim.shift_sd_ppm**2 + variance)
    best = chosen[0]
    return replace(
        claim,
        shift_ppm=claim.shift_ppm + gain * miss,
        shift_sd_ppm=float(claim.shift_sd_ppm * np.sqrt(1.0 - gain)),
        shift_source=f"{claim.shift_source}; own library: {best.label} of {best.record}, "
        f"the same to {deepest} bonds",
    )


def _environments(structure: Structure) -> dict[int, tuple[int, ...]]:
    """Codes of the surroundings of every heavy atom, radius 0 outwards."""
    mol = molecule(structure)
    generator = rdFingerprintGenerator.GetMorganGenerator(
        radius=DEEPEST, includeRedundantEnvironments=True
    )
    output = rdFingerprintGenerator.AdditionalOutput()
    output.AllocateAtomToBits()
    generator.GetSparseFingerprint(mol, additionalOutput=output)
    return {
        index: tuple(int(code) for code in codes)
        for index, codes in enumerate(output.GetAtomToBits())
    }


def _same_to(one: Sequence[int], other: Sequence[int]) -> int:
    """Radius to which two surroundings are the same; 0 for the atom alone."""
    depth = -1
    for first, second in zip(one, other, strict=False):
        if first != second:
            break
        depth += 1
    return min(depth, DEEPEST)


def _to_json(record: Record) -> dict[str, Any]:
    return {
        "schema": SCHEMA,
        "name": record.name,
        "smiles": record.smiles,
        "solvent": record.solvent,
        "field_mhz": round(record.field_mhz, 4),
        "sha256": record.sha256,
        "claims": [
            {
                "label": one.label,
                "atoms": list(one.atoms),
                "protons": one.protons,
                "shift_ppm": round(one.shift_ppm, 4),
                "predicted_ppm": round(one.predicted_ppm, 4),
                "exchangeable": one.is_exchangeable,
                "couplings": [
                    {"partner": partner, "j_hz": round(j_hz, 3)}
                    for partner, j_hz in one.couplings
                ],
            }
            for one in record.claims
        ],
        "lines": [
            [round(one.shift_ppm, 4), round(one.protons, 4)] for one in record.lines
        ],
    }


def _from_json(tree: dict[str, Any]) -> Record:
    if tree.get("schema") != SCHEMA:
        raise ValueError(f"schema {tree.get('schema')!r} is not known")
    read_structure(str(tree["smiles"]))
    return Record(
        name=str(tree["name"]),
        smiles=str(tree["smiles"]),
        solvent=tree["solvent"],
        field_mhz=float(tree["field_mhz"]),
        sha256=str(tree["sha256"]),
        claims=tuple(
            RecordClaim(
                label=str(one["label"]),
                atoms=tuple(int(atom) for atom in one["atoms"]),
                protons=int(one["protons"]),
                shift_ppm=float(one["shift_ppm"]),
                predicted_ppm=float(one["predicted_ppm"]),
                is_exchangeable=bool(one["exchangeable"]),
                couplings=tuple(
                    (str(j["partner"]), float(j["j_hz"])) for j in one["couplings"]
                ),
            )
            for one in tree["claims"]
        ),
        lines=tuple(
            RecordLine(shift_ppm=float(at), protons=float(area))
            for at, area in tree["lines"]
        ),
    )
