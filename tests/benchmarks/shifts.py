"""Shift prediction by scaffold, its intervals, size and speed; prints one JSON object.

Run from the repository; the cross-validation trains one model a fold, with the
settings of core/training/train_shifts.py (minutes of processor time a fold)::

    python tests/benchmarks/shifts.py --used-folds 1
    python tests/benchmarks/shifts.py --used-folds 0    # size and speed only

Shifts in ppm, times in ms of processor time.
"""

from __future__ import annotations

import argparse
import importlib
import json
import statistics
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

from rdkit import Chem

from spinledger.prediction.claims import make_claims
from spinledger.prediction.shifts import predict_shifts
from spinledger.prediction.shifts_model import load_model
from spinledger.structure.read import read_structure

ROOT = Path(__file__).resolve().parents[2]
DATA = ROOT / "core" / "spinledger" / "prediction" / "data"
LIMITS = {
    "mae_ppm": 0.195,
    "coverage_points": (2.0, 1.0),
    "coverage_points_by_class": (4.0, 2.0),
    "model_mb": 10.0,
    "load_ms": 300.0,
    "molecule_ms": 10.0,
    "claims_30_heavy_atoms_ms": 4000.0,
    "claims_cached_ms": 20.0,
}
FEWEST_FOR_CLASS = 400
# Eight to thirty heavy atoms, of many kinds.
SMILES = (
    "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O",
    "CC(=O)Oc1ccccc1C(=O)O",
    "Cn1cnc2c1c(=O)n(C)c(=O)n2C",
    "OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O",
    "C/C=C/C(=O)OCC",
    "N[C@@H](Cc1c[nH]c2ccccc12)C(=O)O",
    "C[C@]12CC[C@H]3[C@@H](CCC4=CC(=O)CC[C@]34C)[C@@H]1CC[C@@H]2O",
    "COc1cc2c(cc1OC)C(Cc1ccc(OC)c(OC)c1)NCC2",
)
# Thirty heavy atoms: chains, a saturated ring, arenes.
LARGE = "CCOC(=O)[C@H](CCc1ccccc1)N[C@@H](C)C(=O)N1CCC[C@H]1C(=O)NCCO"


def milliseconds(call: Callable[[], object]) -> float:
    """Processor time of one call."""
    start = time.process_time()
    call()
    return 1000.0 * (time.process_time() - start)


def speed() -> dict[str, float]:
    """Load, prediction and claims."""
    importlib.import_module("lightgbm")
    load = milliseconds(load_model)
    molecules = [Chem.MolFromSmiles(text) for text in SMILES]
    times = []
    for mol in [*molecules, *molecules]:
        atoms = [
            a.GetIdx()
            for a in mol.GetAtoms()
            if a.GetAtomicNum() == 6 and a.GetTotalNumHs()
        ]
        times.append(milliseconds(lambda m=mol, i=atoms: predict_shifts(m, i)))
    structure = read_structure(LARGE)
    cold = milliseconds(lambda: make_claims(structure, solvent="CDCl3"))
    cached = milliseconds(lambda: make_claims(structure, solvent="CDCl3"))
    return {
        "load_ms": round(load, 1),
        "molecule_ms": round(statistics.median(times[len(molecules) :]), 2),
        "molecule_max_ms": round(max(times[len(molecules) :]), 2),
        "claims_30_heavy_atoms_ms": round(cold, 1),
        "claims_cached_ms": round(cached, 3),
    }


def cross_validated(used_folds: int, rounds: int, networks: int) -> dict[str, Any]:
    """Errors and coverages on scaffolds that the models have not seen."""
    sys.path.insert(0, str(ROOT / "core" / "training"))
    train = importlib.import_module("train_shifts")
    labels = train.read_labels()
    columns = train.useful_columns(labels)
    sizes = train.Sizes(rounds=rounds, networks=networks, threads=1)
    honest = train.cross_validate(
        labels, columns, sizes, folds=5, used_folds=used_folds
    )
    calibration = train.calibrate(labels, honest, 1)
    found: dict[str, Any] = train.report(labels, honest, calibration, columns)
    return found


def missed_classes(report: dict[str, Any]) -> list[str]:
    """Classes whose coverage is further off than the limits allow."""
    inner, outer = LIMITS["coverage_points_by_class"]
    return [
        name
        for name, row in report.items()
        if row["n"] >= FEWEST_FOR_CLASS
        and not name.startswith("depth")
        and (
            abs(row["coverage_68"] - 68.27) > inner
            or abs(row["coverage_95"] - 95.45) > outer
        )
    ]


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--used-folds", type=int, default=5)
    parser.add_argument("--rounds", type=int, default=150)
    parser.add_argument("--networks", type=int, default=2)
    args = parser.parse_args()
    size = sum(path.stat().st_size for path in DATA.glob("shift_*"))
    out: dict[str, Any] = {
        "model_mb": round(size / 1e6, 2),
        "limits": LIMITS,
        **speed(),
    }
    if args.used_folds:
        out["classes"] = cross_validated(args.used_folds, args.rounds, args.networks)
        out["missed_coverage"] = missed_classes(out["classes"])
    print(json.dumps(out))


if __name__ == "__main__":
    main()
