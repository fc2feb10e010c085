"""``spinledger predict``: the claims of a structure, with sources."""

from __future__ import annotations

import argparse
import json
import sys
from typing import Any

from spinledger.cli.inputs import solvent_of
from spinledger.errors import StructureError
from spinledger.prediction.claims import environments_of, make_claims
from spinledger.prediction.shifts_reasons import KnownEnvironment
from spinledger.report.files import write_file
from spinledger.report.simulated import (
    PredictedClaim,
    predicted_claims,
    simulated_svg,
)
from spinledger.report.words import plain
from spinledger.structure.read import read_structure
from spinledger.values.claim import ClaimSet

_DEFAULT_SOLVENT = "CDCl3"


def run(arguments: argparse.Namespace) -> int:
    """Run the command."""
    solvent = solvent_of(arguments.solvent or _DEFAULT_SOLVENT)
    structure = read_structure(arguments.structure)
    claims = make_claims(
        structure,
        solvent=solvent,
        ph=arguments.ph,
        temperature_k=arguments.temperature,
        slow_exchange=arguments.slow_exchange,
    )
    environments: tuple[tuple[KnownEnvironment, ...], ...] = ()
    if arguments.nearest:
        environments = environments_of(
            structure, claims, solvent=solvent, ph=arguments.ph
        )
    rows = predicted_claims(claims, field_mhz=arguments.field)
    if arguments.svg is not None:
        if all(row.tree is None for row in rows):
            raise StructureError(
                structure.given, f"no proton of it can be seen in {solvent}"
            )
        drawing = simulated_svg(claims, field_mhz=arguments.field)
        write_file(arguments.svg, drawing.encode("utf-8"))
    if arguments.json:
        tree = _tree(claims, rows, field_mhz=arguments.field, solvent=solvent)
        for claim, known in zip(tree["claims"], environments, strict=False):
            claim["known_environments"] = [_environment(item) for item in known]
        sys.stdout.write(json.dumps(tree, indent=1, ensure_ascii=False) + "\n")
        return 0
    sys.stdout.write(
        f"{structure.smiles} in {solvent} at {arguments.field:g} MHz\n"
        f"{'claim':<12s}{'H':>3s}  {'shift/ppm':<15s}{'pattern':<9s} source\n"
    )
    for index, row in enumerate(rows):
        sys.stdout.write(_line(row))
        for item in environments[index] if environments else ():
            sys.stdout.write(_environment_line(item))
    for note in claims.notes:
        sys.stdout.write(f"note: {note}\n")
    return 0


def _line(row: PredictedClaim) -> str:
    claim = row.claim
    shift = f"{plain(claim.shift_ppm, 2)} ± {claim.shift_sd_ppm:.2f}"
    pattern = "" if row.tree is None else row.tree.multiplicity
    text = (
        f"{claim.label:<12s}{claim.n_protons:>3d}  {shift:<15s}{pattern:<9s} "
        f"{claim.shift_source}\n"
    )
    if claim.place:
        text += f"{'':17s}{claim.place}\n"
    if claim.why:
        text += f"{'':17s}{claim.visibility}: {claim.why}\n"
    for partner, j_hz, sd_hz, kind, source in row.couplings:
        text += f"{'':17s}J({partner}) {plain(j_hz, 1)} ± {sd_hz:.1f} Hz, {kind}"
        text += f" [{source}]\n" if source else "\n"
    return text


def _environment_line(item: KnownEnvironment) -> str:
    return (
        f"{'':17s}sphere {item.sphere}: {item.examples} known, median "
        f"{item.median_ppm:.2f}, mean spread {item.deviation_ppm:.2f} ppm, "
        f"{item.fragment}\n"
    )


def _environment(item: KnownEnvironment) -> dict[str, Any]:
    return {
        "sphere": item.sphere,
        "fragment": item.fragment,
        "examples": item.examples,
        "median_ppm": item.median_ppm,
        "mean_spread_ppm": item.deviation_ppm,
    }


def _tree(
    claims: ClaimSet,
    rows: tuple[PredictedClaim, ...],
    *,
    field_mhz: float,
    solvent: str | None,
) -> dict[str, Any]:
    return {
        "solvent": solvent,
        "field_mhz": field_mhz,
        "claims": [_claim(row) for row in rows],
        "species": list(claims.species_smiles),
        "notes": list(claims.notes),
    }


def _claim(row: PredictedClaim) -> dict[str, Any]:
    claim = row.claim
    return {
        "claim": claim.label,
        "atoms": list(claim.atoms),
        "protons": claim.n_protons,
        "species": claim.species,
        "predicted_shift_ppm": claim.shift_ppm,
        "predicted_shift_sd_ppm": claim.shift_sd_ppm,
        "place": claim.place,
        "visibility": claim.visibility,
        "why": claim.why,
        "multiplicity": None if row.tree is None else row.tree.multiplicity,
        "source": claim.shift_source,
        "couplings": [
            {
                "partner": partner,
                "predicted_j_hz": j_hz,
                "predicted_j_sd_hz": sd_hz,
                "kind": kind,
                "source": source,
            }
            for partner, j_hz, sd_hz, kind, source in row.couplings
        ],
    }
