"""What several commands read from their words: solvents, structures, candidates."""

from __future__ import annotations

import argparse
from pathlib import Path

from spinledger.errors import StructureError, UsageError
from spinledger.processing.solvents import canonical_solvent, solvent_names
from spinledger.reconcile.options import Candidate, Constraints, ReconcileOptions
from spinledger.reconcile.side_reading import side_evidence_from
from spinledger.structure.read import read_structure, read_structures


def solvent_of(name: str | None) -> str | None:
    """Canonical name of a solvent.

    Raises
    ------
    UsageError
        If it is not known.
    """
    if name is None:
        return None
    known = canonical_solvent(name)
    if known is None:
        raise UsageError(
            f"the solvent {name!r} is not known; known are {', '.join(solvent_names())}"
        )
    return known


def options_of(arguments: argparse.Namespace) -> ReconcileOptions:
    """Options of a reconciliation from the words of reconcile, rank or sample.

    Raises
    ------
    StructureError
        If a file of species or companions cannot be read.
    SideEvidenceError
        If the side evidence cannot be read or understood.
    """
    species = read_structures(arguments.species) if arguments.species else ()
    companions = read_structures(arguments.strays) if arguments.strays else ()
    side = side_evidence_from(arguments.side) if arguments.side else None
    return ReconcileOptions(
        ph=arguments.ph,
        temperature_k=arguments.temperature,
        species=species,
        companions=companions,
        n_contenders=arguments.contenders,
        quick=arguments.quick,
        constraints=Constraints(side=side),
    )


def read_candidates(path: Path) -> tuple[Candidate, ...]:
    """Candidates of a file; those that do not parse stay, with the reason.

    Parameters
    ----------
    path : pathlib.Path
        One ``SMILES name`` a line (a line that starts with # is a remark), or
        an SD file. A candidate without a name is called by its SMILES.

    Raises
    ------
    StructureError
        If the file is missing, unreadable or holds no candidate.
    """
    try:
        text = path.read_bytes().decode("utf-8-sig", errors="replace")
    except OSError as error:
        reason = error.strerror or "it cannot be read"
        raise StructureError(
            str(path), f"the candidates could not be read ({reason})"
        ) from error
    if "M  END" in text:
        found = tuple(
            _from_record(one) for one in text.split("$$$$") if "M  END" in one
        )
    else:
        lines = (line.rstrip("\r\n") for line in text.split("\n"))
        found = tuple(
            _from_line(line)
            for line in lines
            if line.strip() and not line.lstrip().startswith("#")
        )
    if not found:
        raise StructureError(str(path), "the file holds no candidates")
    return found


def _from_line(line: str) -> Candidate:
    smiles, *rest = line.strip().split(None, 1)
    return _candidate(smiles, smiles, rest[0] if rest else smiles)


def _from_record(record: str) -> Candidate:
    text = record.lstrip("\r\n") if record[:1] in "\r\n" else record
    name = text.split("\n", 1)[0].strip()
    candidate = _candidate(text, "", name)
    if candidate.structure is None:
        return candidate
    smiles = candidate.structure.smiles
    return Candidate(name=name or smiles, smiles=smiles, structure=candidate.structure)


def _candidate(text: str, smiles: str, name: str) -> Candidate:
    try:
        structure = read_structure(text)
    except StructureError as error:
        return Candidate(name=name, smiles=smiles, structure=None, reason=error.reason)
    return Candidate(name=name, smiles=smiles, structure=structure)
