"""``spinledger library``: a laboratory's own assigned compounds in a plain folder."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from spinledger.cli.inputs import solvent_of
from spinledger.detection.evidence import gather_evidence
from spinledger.errors import UsageError
from spinledger.io.read import read_acquired
from spinledger.prediction.claims import make_claims
from spinledger.project.storage import load_project
from spinledger.sample.library import (
    Library,
    load_library,
    named_by_library,
    neighbours,
    record_of,
    save_record,
    sharpened,
)
from spinledger.structure.read import read_structure


def run(arguments: argparse.Namespace) -> int:
    """Run the command: save a record, show nearest environments, or name a spectrum."""
    chosen = [
        name for name in ("add", "near", "data") if getattr(arguments, name) is not None
    ]
    if len(chosen) != 1:
        raise UsageError("library: give one of --add, --near and --data")
    if arguments.add is not None:
        return _add(arguments.library, arguments.add, arguments.name)
    library = load_library(arguments.library)
    for problem in library.problems:
        sys.stderr.write(f"{problem}\n")
    solvent = solvent_of(arguments.solvent)
    if arguments.near is not None:
        return _near(library, arguments.near, solvent or "CDCl3")
    return _name(library, arguments.data, solvent)


def _add(folder: Path, path: Path, name: str | None) -> int:
    project = load_project(path)
    if project.ledger is None:
        raise UsageError(f"{path}: the project has no ledger yet; solve and save it")
    record = record_of(project.ledger, name or project.name)
    written = save_record(record, folder)
    sys.stdout.write(f"{record.name}: {len(record.claims)} claims in {written}\n")
    return 0


def _near(library: Library, text: str, solvent: str) -> int:
    structure = read_structure(text)
    claims = make_claims(structure, solvent=solvent)
    sharper = sharpened(claims, structure, library, solvent=solvent)
    sys.stdout.write("claim,predicted_ppm,sd_ppm,with_library_ppm,sd_ppm,nearest\n")
    for before, after in zip(claims.claims, sharper.claims, strict=True):
        near = neighbours(library, structure, before, solvent=solvent)
        said = f"{near[0].label} of {near[0].record}" if near else ""
        sys.stdout.write(
            f"{before.label},{before.shift_ppm:.3f},{before.shift_sd_ppm:.3f},"
            f"{after.shift_ppm:.3f},{after.shift_sd_ppm:.3f},{said}\n"
        )
    return 0


def _name(library: Library, path: Path, solvent: str | None) -> int:
    evidence = gather_evidence(read_acquired(path), solvent=solvent)
    found = named_by_library(evidence, library)
    if not found:
        sys.stdout.write("No record of the library is shown by this spectrum.\n")
    for record, share in found:
        sys.stdout.write(
            f"{record.name} ({record.smiles}): {100 * share:.0f} % of its lines are "
            "shown\n"
        )
    return 0
