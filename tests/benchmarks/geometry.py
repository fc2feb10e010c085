"""Relative configuration by the couplings of acquired spectra: one JSON object.

The structure is the true one; the figure is whether its relative configuration
is the likeliest by the fitted couplings alone, and with what probability.
"""

from __future__ import annotations

import argparse
import json
import os
import time
from pathlib import Path
from typing import Any

from spinledger.detection.evidence import gather_evidence
from spinledger.errors import SpinLedgerError
from spinledger.io.read import read_acquired
from spinledger.reconcile.configurations import related_centres
from spinledger.reconcile.evaluate import evaluate, lay_out
from spinledger.reconcile.geometry import what_couplings_say
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.solve import FINISH_QUICK, Limits
from spinledger.structure.read import molecule, read_structure
from spinledger.structure.settled import settled


def row_of(place: Path, smiles: str, solvent: str | None) -> dict[str, Any]:
    """Outcome for one spectrum."""
    begun = time.process_time()
    evidence = gather_evidence(read_acquired(place), solvent=solvent)
    bench = lay_out(evidence, ReconcileOptions(quick=True))
    limits = Limits(max_refined=2, finish=FINISH_QUICK)
    own = evaluate(read_structure(smiles), bench, limits)
    fitted = time.process_time()
    found = what_couplings_say(own, Limits())
    row: dict[str, Any] = {
        "case": place.name,
        "state": own.state,
        "fit_s": round(fitted - begun, 1),
        "geometry_s": round(time.process_time() - fitted, 1),
    }
    if found is None:
        return row | {"couplings": 0}
    rows = found.configurations
    drawn = next((one for one in rows if one.is_drawn), None)
    return row | {
        "couplings": len(found.dihedrals),
        "misfit": [round(found.misfit_before, 2), round(found.misfit_after, 2)],
        "configurations": len(rows),
        "drawn_probability": None if drawn is None else round(drawn.probability, 3),
        "drawn_is_first": bool(rows) and rows[0].is_drawn,
        "sentences": list(found.sentences[:1]),
    }


def main() -> None:
    """Print one JSON object."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--cases", nargs="*", help="folders of acquired spectra")
    arguments = parser.parse_args()
    shared = Path(os.environ.get("SPINLEDGER_SHARED", "../shared")) / "acquired"
    rows = []
    for place in sorted(shared.iterdir()):
        if not (place / "truth.json").is_file():
            continue
        if arguments.cases and place.name not in arguments.cases:
            continue
        truth = json.loads((place / "truth.json").read_text(encoding="utf-8"))
        smiles = truth.get("smiles") or truth.get("structure", {}).get("smiles")
        if not smiles or place.name.startswith("neg_"):
            continue
        drawn = settled(molecule(read_structure(smiles)))
        if len(related_centres(drawn)) < 2:
            continue
        try:
            rows.append(row_of(place, smiles, truth.get("solvent")))
        except SpinLedgerError as error:
            rows.append({"case": place.name, "error": str(error)})
    decided = [
        one
        for one in rows
        if one.get("configurations") and one["state"] != "not reconciled"
    ]
    print(
        json.dumps(
            {
                "spectra": len(rows),
                "with_odds": len(decided),
                "true_first": sum(one["drawn_is_first"] for one in decided),
                "confidently_wrong": sum(
                    (one["drawn_probability"] or 0.0) < 0.1 for one in decided
                ),
                "rows": rows,
            },
            indent=1,
        )
    )


if __name__ == "__main__":
    main()
