"""Train the shift predictor and write its model files.

usage: python core/training/train_shifts.py [--rounds N] [--folds N] [--threads N] [--out DIR]

Reads ``shifts/assigned_1h_shifts.csv.gz`` in the folder that SPINLEDGER_SHARED
names. Errors for the intervals come from a cross-validation by scaffold. Prints
one JSON object with the errors and coverages of that cross-validation.
"""

from __future__ import annotations

import argparse
import gzip
import json
import zlib
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import lightgbm
import numpy as np
import numpy.typing as npt
from shift_labels import SOLVENTS, Labels, read_labels

from spinledger.prediction.shifts_spheres import Lookup, SphereTable, fit_table
from spinledger.prediction.shifts_types import EXCHANGEABLE_CLASSES, PROTON_CLASSES

DATA = Path(__file__).resolve().parents[1] / "spinledger" / "prediction" / "data"
FEWEST_NONZERO = 40
INNER_FOLDS = 7
SMALLEST_ERROR_PPM = 0.02
FEWEST_FOR_CLASS = 150

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class MeanModel:
    """Table and the two boosters whose mean is the predicted shift."""

    table: SphereTable
    residual: lightgbm.Booster
    direct: lightgbm.Booster


def booster_settings(threads: int) -> dict[str, Any]:
    """Settings that all boosters share; robust loss, since some labels are wrong."""
    return {
        "objective": "huber",
        "alpha": 0.3,
        "learning_rate": 0.08,
        "num_leaves": 63,
        "min_data_in_leaf": 15,
        "feature_fraction": 0.3,
        "bagging_fraction": 0.8,
        "bagging_freq": 1,
        "max_bin": 63,
        "lambda_l2": 1.0,
        "seed": 1,
        "deterministic": True,
        "force_col_wise": True,
        "num_threads": threads,
        "verbose": -1,
    }


def inputs(
    labels: Labels, index: Integers, columns: Integers
) -> npt.NDArray[np.float32]:
    """Counted features and the solvent of some labels."""
    counted = labels.features[labels.row[index]][:, columns]
    return np.column_stack([counted, labels.solvents[index]]).astype(np.float32)


def with_lookup(
    counted: npt.NDArray[np.float32], lookup: Lookup
) -> npt.NDArray[np.float32]:
    """Counted features followed by what the table says."""
    return np.column_stack([counted, lookup.features]).astype(np.float32)


def look_up(labels: Labels, table: SphereTable, index: Integers) -> Lookup:
    """Answers of a table for some labels."""
    return table.look_up(labels.codes[labels.row[index]], list(labels.classes[index]))


def table_of(labels: Labels, index: Integers) -> SphereTable:
    """Table made of some labels."""
    return fit_table(
        labels.codes[labels.row[index]],
        labels.shifts_ppm[index],
        labels.classes[index],
    )


def out_of_group(labels: Labels, index: Integers) -> tuple[Floats, Floats]:
    """Features and estimates of tables that have not seen the label's scaffold."""
    inner = np.array(
        [zlib.crc32(b"inner" + g.encode()) % INNER_FOLDS for g in labels.groups[index]]
    )
    features: Floats | None = None
    estimates = np.zeros(index.size)
    for fold in range(INNER_FOLDS):
        held = inner == fold
        found = look_up(labels, table_of(labels, index[~held]), index[held])
        if features is None:
            features = np.zeros((index.size, found.features.shape[1]))
        features[held] = found.features
        estimates[held] = found.estimates_ppm
    assert features is not None
    return features, estimates


def is_plausible(
    labels: Labels, index: Integers, estimates: Floats
) -> npt.NDArray[np.bool_]:
    """Whether a label is not far from what its neighbourhood says."""
    error = np.abs(labels.shifts_ppm[index] - estimates)
    exchangeable = np.isin(labels.classes[index], list(EXCHANGEABLE_CLASSES))
    return exchangeable | (error < 3.0)


def fit_mean(
    labels: Labels, index: Integers, columns: Integers, *, rounds: int, threads: int
) -> MeanModel:
    """Fit table and boosters to some labels."""
    features, estimates = out_of_group(labels, index)
    good = is_plausible(labels, index, estimates)
    kept = index[good]
    counted = inputs(labels, kept, columns)
    shifts = labels.shifts_ppm[kept]
    settings = booster_settings(threads)
    stacked = np.column_stack([counted, features[good]]).astype(np.float32)
    residual = lightgbm.train(
        settings, lightgbm.Dataset(stacked, shifts - estimates[good]), rounds
    )
    direct = lightgbm.train(settings, lightgbm.Dataset(counted, shifts), rounds)
    return MeanModel(table=table_of(labels, index), residual=residual, direct=direct)


def predict_mean(
    model: MeanModel, labels: Labels, index: Integers, columns: Integers
) -> tuple[Floats, npt.NDArray[np.float32]]:
    """Predicted shifts, and the features that went into the residual booster."""
    lookup = look_up(labels, model.table, index)
    counted = inputs(labels, index, columns)
    stacked = with_lookup(counted, lookup)
    corrected = lookup.estimates_ppm + np.asarray(model.residual.predict(stacked))
    return (corrected + np.asarray(model.direct.predict(counted))) / 2, stacked


def fit_scale(
    features: npt.NDArray[np.float32], errors: Floats, groups: Integers, threads: int
) -> tuple[lightgbm.Booster, Floats]:
    """Model of the size of the error, and its own out-of-fold answers.

    The booster predicts ln(|error| + 0.02 ppm).
    """
    settings = {
        **booster_settings(threads),
        "objective": "l2",
        "num_leaves": 15,
        "learning_rate": 0.06,
        "min_data_in_leaf": 60,
    }
    target = np.log(errors + SMALLEST_ERROR_PPM)
    honest = np.zeros(errors.size)
    for fold in range(3):
        held = groups % 3 == fold
        part = lightgbm.train(
            settings, lightgbm.Dataset(features[~held], target[~held]), 150
        )
        honest[held] = np.asarray(part.predict(features[held]))
    whole = lightgbm.train(settings, lightgbm.Dataset(features, target), 150)
    return whole, np.exp(honest)


def class_factors(
    errors: Floats, scales: Floats, classes: npt.NDArray[np.str_]
) -> dict[str, list[float]]:
    """Factors that make 68 and 95 % of the errors fall inside, for each class."""
    ratio = errors / scales
    pooled = np.quantile(ratio, [0.6827, 0.9545])
    factors = {"all": [float(q) for q in pooled]}
    for name in PROTON_CLASSES:
        of_class = ratio[classes == name]
        if of_class.size >= FEWEST_FOR_CLASS:
            quantiles = np.quantile(of_class, [0.6827, 0.9545])
            factors[name] = [float(q) for q in quantiles]
    return factors


def report(
    errors: Floats, half_widths: Floats, classes: npt.NDArray[np.str_], depths: Integers
) -> dict[str, Any]:
    """Errors and coverages by class and by depth of the known neighbourhood."""
    out: dict[str, Any] = {}
    carbon = ~np.isin(classes, list(EXCHANGEABLE_CLASSES))
    chosen = {"all C-H": carbon, **{n: classes == n for n in PROTON_CLASSES}}
    chosen.update({f"depth {k}": carbon & (depths == k) for k in range(6)})
    for name, mask in chosen.items():
        if not mask.any():
            continue
        inside = errors[mask, None] <= half_widths[mask]
        out[name] = {
            "n": int(mask.sum()),
            "mae_ppm": round(float(errors[mask].mean()), 4),
            "median_ppm": round(float(np.median(errors[mask])), 4),
            "p90_ppm": round(float(np.quantile(errors[mask], 0.9)), 3),
            "coverage_68": round(100 * float(inside[:, 0].mean()), 1),
            "coverage_95": round(100 * float(inside[:, 1].mean()), 1),
        }
    return out


def write_table(table: SphereTable, path: Path) -> None:
    """Write the table as plain arrays; codes seen once at radius 0 stay too."""
    arrays: dict[str, npt.NDArray[Any]] = {
        "class_medians_ppm": table.class_medians_ppm,
        "class_sds_ppm": table.class_sds_ppm,
    }
    for radius, sphere in enumerate(table.spheres):
        arrays[f"codes_{radius}"] = sphere.codes
        arrays[f"medians_{radius}"] = sphere.medians_ppm.astype(np.float16)
        arrays[f"deviations_{radius}"] = sphere.deviations_ppm.astype(np.float16)
        arrays[f"counts_{radius}"] = np.minimum(sphere.counts, 65535).astype(np.uint16)
    np.savez_compressed(path, **arrays)


def write_booster(booster: lightgbm.Booster, path: Path) -> None:
    """Write a booster as gzipped text, the same bytes for the same model."""
    text = booster.model_to_string().encode()
    with (
        path.open("wb") as raw,
        gzip.GzipFile(
            filename="", mode="wb", fileobj=raw, mtime=0, compresslevel=9
        ) as packed,
    ):
        packed.write(text)


def main() -> None:
    """Run the training."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--rounds", type=int, default=700)
    parser.add_argument("--folds", type=int, default=5)
    parser.add_argument("--used-folds", type=int, default=5)
    parser.add_argument("--threads", type=int, default=2)
    parser.add_argument("--out", type=Path, default=DATA)
    args = parser.parse_args()
    labels = read_labels()
    columns = np.nonzero(
        ((labels.features != 0) & ~np.isnan(labels.features)).sum(axis=0)
        >= FEWEST_NONZERO
    )[0]
    everything = np.arange(labels.row.size)
    folds = labels.folds(args.folds)
    tested = np.nonzero(folds < args.used_folds)[0]
    predicted = np.zeros(everything.size)
    stacked: npt.NDArray[np.float32] | None = None
    for fold in range(args.used_folds):
        train, test = np.nonzero(folds != fold)[0], np.nonzero(folds == fold)[0]
        model = fit_mean(
            labels, train, columns, rounds=args.rounds, threads=args.threads
        )
        predicted[test], features = predict_mean(model, labels, test, columns)
        if stacked is None:
            stacked = np.zeros((everything.size, features.shape[1]), np.float32)
        stacked[test] = features
    assert stacked is not None
    errors = np.abs(predicted - labels.shifts_ppm)[tested]
    scale, scales = fit_scale(
        stacked[tested], errors, labels.folds(1000003)[tested], args.threads
    )
    factors = class_factors(errors, scales, labels.classes[tested])
    half_widths = np.array(
        [
            np.array(factors.get(name, factors["all"])) * scale_ppm
            for name, scale_ppm in zip(labels.classes[tested], scales, strict=True)
        ]
    )
    final = fit_mean(
        labels, everything, columns, rounds=args.rounds, threads=args.threads
    )
    args.out.mkdir(parents=True, exist_ok=True)
    write_table(final.table, args.out / "shift_table.npz")
    write_booster(final.residual, args.out / "shift_residual.txt.gz")
    write_booster(final.direct, args.out / "shift_direct.txt.gz")
    write_booster(scale, args.out / "shift_scale.txt.gz")
    facts = {
        "columns": columns.tolist(),
        "solvents": list(SOLVENTS),
        "class_factors": factors,
        "smallest_error_ppm": SMALLEST_ERROR_PPM,
    }
    (args.out / "shift_facts.json").write_text(json.dumps(facts) + "\n")
    depths = stacked[tested][:, -3].astype(np.int64)
    print(json.dumps(report(errors, half_widths, labels.classes[tested], depths)))


if __name__ == "__main__":
    main()
