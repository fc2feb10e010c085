"""Couplings against published ones, by kind, split by scaffold; prints one JSON object.

Run from the repository; ``--cache FOLDER`` keeps the conformers::

    python tests/benchmarks/couplings.py --cache /tmp/conformers

Every kind: number of values, mean absolute error, limit where one is set, and
how many values lie within the 68 and 95 % intervals calibrated on the other
scaffolds. J in Hz.
"""

from __future__ import annotations

import argparse
import json
import os
import sys
import time
from pathlib import Path
from typing import Any

import numpy as np

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT / "core" / "training"))

from couplings_data import Frames, by_entry, read_rows  # noqa: E402 # scripts, no package
from train_couplings import Validation, cross_validate, figures, load  # noqa: E402

from spinledger.prediction.couplings.pairs import estimate_pair  # noqa: E402

SHARED = Path(os.environ.get("SPINLEDGER_SHARED", ROOT.parent / "shared"))
TABLE = SHARED / "shifts" / "published_couplings.csv.gz"
#: Largest mean absolute errors that count as good, Hz.
LIMITS_HZ = {
    "benzene ortho": 0.43,
    "benzene meta": 0.34,
    "azine ortho": 0.6,
    "azine ortho next to N": 0.6,
    "azine meta": 0.6,
    "furan ortho": 0.6,
    "thiophene ortho": 0.6,
    "vinyl trans": 0.4,
    "chain CH-CH3": 0.25,
    "chain CH2-CH3": 0.25,
    "chain CH-CH2": 0.8,
    "chain CH2-CH2 mean": 0.5,
    "ring values": 1.1,
    "chain CH-CH": 1.4,
}


def vinyl_figures(cache: Path | None) -> dict[str, dict[str, float]]:
    """Errors of drawn double bonds, which no model was trained on."""
    frames = Frames(cache)
    errors: dict[str, list[float]] = {}
    for rows in by_entry(read_rows(TABLE)).values():
        frame = frames.of(rows[0].smiles)
        for row in rows:
            a, b = row.heavy
            if row.is_assumed or frame.bond_order(a, b) != 2:
                continue
            # Labels of the two protons of =CH2 carry no stereo information.
            if 2 in (frame.n_hydrogens(a), frame.n_hydrogens(b)):
                continue
            frame = frames.with_conformers(row.smiles)
            found = estimate_pair(frame, frame.hydrogens(a)[0], frame.hydrogens(b)[0])
            if found is not None and found.is_rigid and row.bonds == 3:
                errors.setdefault(found.kind, []).append(row.j_hz - found.j_hz)
    return {
        kind: {"n": len(values), "mae": round(float(np.abs(values).mean()), 3)}
        for kind, values in errors.items()
    }


def pooled(validation: Validation) -> dict[str, dict[str, float]]:
    """Ring values of all kinds together, and the means of chain CH2-CH2."""
    rings = [
        np.abs(np.concatenate(errors))
        for kind, errors in validation.single.items()
        if kind.startswith("ring")
    ]
    means = np.abs(np.concatenate(validation.means["chain CH2-CH2"]))
    return {
        "ring values": {"mae": round(float(np.concatenate(rings).mean()), 3)},
        "chain CH2-CH2 mean": {"mae": round(float(means.mean()), 3)},
    }


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--cache", type=Path)
    cache = parser.parse_args().cache
    if cache is not None:
        cache.mkdir(parents=True, exist_ok=True)
    start = time.process_time()
    validation = cross_validate(*load(TABLE, cache))
    found: dict[str, dict[str, Any]] = figures(validation)
    found |= pooled(validation) | vinyl_figures(cache)
    for kind, limit in LIMITS_HZ.items():
        found[kind]["limit"] = limit
        found[kind]["is_within"] = found[kind]["mae"] <= limit
    print(json.dumps({"kinds": found, "cpu_s": round(time.process_time() - start)}))


if __name__ == "__main__":
    main()
