"""Train the model of the distance of two unlike protons on one carbon.

usage: python core/training/train_shift_gaps.py [--rounds N] [--threads N] [--out DIR]

Reads the same tables as train_shifts.py. Only labels with two values count: most
published assignments give one value for both protons. Prints one JSON object with
the errors of a cross-validation by scaffold.
"""

from __future__ import annotations

import argparse
import json
from pathlib import Path

import lightgbm
import numpy as np
from shift_labels import FITTED, Labels, read_labels
from train_shifts import DATA, booster_settings, write_booster

KINDS = ("CH2", "CH3", "alkene")
SMALLEST_GAP_PPM = 0.005
LARGEST_GAP_PPM = 2.5
FLOOR_PPM = 0.02
FOLDS = 5
FEWEST_NONZERO = 20


def main() -> None:
    """Run the training."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--rounds", type=int, default=150)
    parser.add_argument("--threads", type=int, default=2)
    parser.add_argument("--out", type=Path, default=DATA)
    args = parser.parse_args()
    train(read_labels(), args.out, rounds=args.rounds, threads=args.threads)


def train(labels: Labels, out: Path, *, rounds: int, threads: int) -> None:
    """Cross-validate, fit on everything and write the files."""
    index = np.nonzero(
        np.isin(labels.classes, KINDS)
        & (labels.gaps_ppm > SMALLEST_GAP_PPM)
        & (labels.gaps_ppm < LARGEST_GAP_PPM)
    )[0]
    counted = labels.features[labels.row[index]]
    columns = np.nonzero(
        ((counted != 0) & ~np.isnan(counted)).sum(axis=0) >= FEWEST_NONZERO
    )[0]
    is_fitted = labels.sources[index] == FITTED
    inputs = np.column_stack([counted[:, columns], is_fitted]).astype(np.float32)
    target = np.log(labels.gaps_ppm[index] + FLOOR_PPM)
    settings = {
        **booster_settings(threads),
        "objective": "l1",
        "num_leaves": 15,
        "learning_rate": 0.05,
        "min_data_in_leaf": 20,
    }
    folds = labels.folds(FOLDS)[index]
    honest = np.zeros(index.size)
    for fold in range(FOLDS):
        held = folds == fold
        part = lightgbm.train(
            settings, lightgbm.Dataset(inputs[~held], target[~held]), rounds
        )
        honest[held] = np.asarray(part.predict(inputs[held]))
    whole = lightgbm.train(settings, lightgbm.Dataset(inputs, target), rounds)
    away = np.abs(target - honest)
    spread = {
        name: float(np.quantile(away[labels.classes[index] == name], 0.6827))
        for name in KINDS
    }
    write_booster(whole, out / "shift_gap.txt.gz")
    facts = {"columns": columns.tolist(), "ln_spread": spread, "floor_ppm": FLOOR_PPM}
    (out / "shift_gap_facts.json").write_text(json.dumps(facts) + "\n")
    found = np.exp(honest) - FLOOR_PPM
    gaps = labels.gaps_ppm[index]
    report = {}
    for name in KINDS:
        for source in (False, True):
            mask = (labels.classes[index] == name) & (is_fitted == source)
            if mask.sum() >= 10:
                report[f"{name}, {'fitted' if source else 'assigned'}"] = {
                    "n": int(mask.sum()),
                    "median_ppm": round(float(np.median(gaps[mask])), 3),
                    "mae_constant_ppm": round(
                        float(np.abs(gaps[mask] - np.median(gaps[mask])).mean()), 3
                    ),
                    "mae_ppm": round(float(np.abs(gaps[mask] - found[mask]).mean()), 3),
                    "correlation": round(
                        float(np.corrcoef(gaps[mask], found[mask])[0, 1]), 2
                    ),
                }
    print(json.dumps({"gaps": report, "ln_spread": spread}))


if __name__ == "__main__":
    main()
