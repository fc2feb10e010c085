"""Train the shift predictor and write its model files.

usage: python core/training/train_shifts.py [--rounds N] [--folds N] [--threads N] [--out DIR]

Reads ``shifts/assigned_1h_shifts.csv.gz`` and ``published_spin_fit_shifts.csv.gz``
in the folder that SPINLEDGER_SHARED names. Errors for the intervals come from a
cross-validation by scaffold; one fold of five (17 000 labels) is enough for them.
Prints one JSON object with the errors and coverages of that cross-validation.
"""

from __future__ import annotations

import argparse
import gzip
import json
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import lightgbm
import numpy as np
import numpy.typing as npt
from shift_increments import fit_increments, runs
from shift_labels import FITTED, SOLVENTS, Labels, read_labels
from shift_network import train_network

from spinledger.prediction.shifts_increments import IncrementTable
from spinledger.prediction.shifts_network import Network, network_inputs
from spinledger.prediction.shifts_spheres import SphereTable, fit_table
from spinledger.prediction.shifts_types import EXCHANGEABLE_CLASSES, PROTON_CLASSES

DATA = Path(__file__).resolve().parents[1] / "spinledger" / "prediction" / "data"
FEWEST_NONZERO = 40
INNER_FOLDS = 5
SHARES = {"residual": 0.4, "direct": 0.1, "network": 0.5}

SMALLEST_ERROR_PPM = 0.02
FEWEST_FOR_CLASS = 150
DEPTH_FEATURE = 15  # place of the fine depth among the table's features

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class BaseModel:
    """Table of neighbourhoods and increments; their mean is where trees start."""

    table: SphereTable
    increments: IncrementTable


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class BaseAnswer:
    """Estimates of both, and the features that the trees get."""

    base_ppm: Floats
    features: Floats


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class MeanModel:
    """Base, boosters of what is left and of the whole, networks of what is left."""

    base: BaseModel
    residual: lightgbm.Booster
    direct: lightgbm.Booster
    networks: tuple[Network, ...]


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


def fit_base(labels: Labels, index: Integers) -> BaseModel:
    """Table and increments made of some labels."""
    rows = labels.row[index]
    table = fit_table(
        labels.fine[rows],
        labels.coarse[rows],
        labels.shifts_ppm[index],
        labels.classes[index],
    )
    return BaseModel(table=table, increments=fit_increments(labels, index))


def ask_base(labels: Labels, base: BaseModel, index: Integers) -> BaseAnswer:
    """Answers of table and increments for some labels."""
    rows, classes = labels.row[index], list(labels.classes[index])
    lookup = base.table.look_up(labels.fine[rows], labels.coarse[rows], classes)
    sums = base.increments.estimate(runs(labels, rows), classes)
    return BaseAnswer(
        base_ppm=(lookup.estimates_ppm + sums) / 2,
        features=np.column_stack([lookup.features, sums, sums - lookup.estimates_ppm]),
    )


def out_of_group(labels: Labels, index: Integers) -> BaseAnswer:
    """Answers of bases that have not seen the label's scaffold."""
    inner = labels.folds(INNER_FOLDS, "inner")[index]
    base_ppm = np.zeros(index.size)
    features: Floats | None = None
    for fold in range(INNER_FOLDS):
        held = inner == fold
        answer = ask_base(labels, fit_base(labels, index[~held]), index[held])
        if features is None:
            features = np.zeros((index.size, answer.features.shape[1]))
        features[held], base_ppm[held] = answer.features, answer.base_ppm
    assert features is not None
    return BaseAnswer(base_ppm=base_ppm, features=features)


def is_plausible(
    labels: Labels, index: Integers, estimates: Floats
) -> npt.NDArray[np.bool_]:
    """Whether a label is not far from what its neighbourhood says."""
    error = np.abs(labels.shifts_ppm[index] - estimates)
    exchangeable = np.isin(labels.classes[index], list(EXCHANGEABLE_CLASSES))
    return exchangeable | (error < 3.0)


def fit_mean(
    labels: Labels, index: Integers, columns: Integers, sizes: Sizes
) -> MeanModel:
    """Fit base and boosters to some labels."""
    answer = out_of_group(labels, index)
    good = is_plausible(labels, index, answer.base_ppm)
    kept = index[good]
    counted = inputs(labels, kept, columns)
    shifts = labels.shifts_ppm[kept]
    settings = booster_settings(sizes.threads)
    stacked = np.column_stack([counted, answer.features[good]]).astype(np.float32)
    residual = lightgbm.train(
        settings,
        lightgbm.Dataset(stacked, shifts - answer.base_ppm[good]),
        sizes.rounds,
    )
    direct = lightgbm.train(settings, lightgbm.Dataset(counted, shifts), sizes.rounds)
    shown = network_inputs(
        counted, answer.features[good], list(labels.classes[kept]), len(SOLVENTS)
    )
    return MeanModel(
        base=fit_base(labels, index),
        residual=residual,
        direct=direct,
        networks=tuple(
            train_network(shown, shifts - answer.base_ppm[good], seed)
            for seed in range(1, sizes.networks + 1)
        ),
    )


def predict_mean(
    model: MeanModel, labels: Labels, index: Integers, columns: Integers
) -> tuple[Floats, npt.NDArray[np.float32]]:
    """Predicted shifts, and the features that went into the residual booster."""
    answer = ask_base(labels, model.base, index)
    counted = inputs(labels, index, columns)
    stacked = np.column_stack([counted, answer.features]).astype(np.float32)
    shown = network_inputs(
        counted, answer.features, list(labels.classes[index]), len(SOLVENTS)
    )
    parts = {
        "residual": answer.base_ppm + np.asarray(model.residual.predict(stacked)),
        "direct": np.asarray(model.direct.predict(counted)),
        "network": answer.base_ppm
        + np.mean([network.predict(shown) for network in model.networks], axis=0),
    }
    mean = sum(SHARES[name] * part for name, part in parts.items())
    return np.asarray(mean), stacked


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
    labels: Labels, honest: Honest, calibration: Calibration, columns: Integers
) -> dict[str, Any]:
    """Errors and coverages by class and by depth of the known neighbourhood."""
    tested, errors = honest.tested, honest.errors_ppm
    half_widths = calibration.half_widths_ppm
    depths = honest.stacked[:, columns.size + 1 + DEPTH_FEATURE].astype(np.int64)
    out: dict[str, Any] = {}
    classes = labels.classes[tested]
    is_fitted = labels.sources[tested] == FITTED
    carbon = ~np.isin(classes, list(EXCHANGEABLE_CLASSES)) & ~is_fitted
    chosen = {"all C-H": carbon}
    chosen.update({n: ~is_fitted & (classes == n) for n in PROTON_CLASSES})
    chosen.update({f"depth {k}": carbon & (depths == k) for k in range(6)})
    chosen["fitted, D2O"] = is_fitted
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
    """Write the table as plain arrays."""
    arrays: dict[str, npt.NDArray[Any]] = {
        "class_medians_ppm": table.class_medians_ppm,
        "class_sds_ppm": table.class_sds_ppm,
    }
    for family, spheres in (("fine", table.fine), ("coarse", table.coarse)):
        for radius, sphere in enumerate(spheres):
            name = f"{family}_{radius}"
            arrays[f"codes_{name}"] = sphere.codes
            arrays[f"medians_{name}"] = sphere.medians_ppm.astype(np.float16)
            arrays[f"deviations_{name}"] = sphere.deviations_ppm.astype(np.float16)
            arrays[f"counts_{name}"] = np.minimum(sphere.counts, 65535).astype(
                np.uint16
            )
    np.savez_compressed(path, **arrays)  # type: ignore[arg-type] # numpy's stub


def write_increments(table: IncrementTable, path: Path) -> None:
    """Write the increments as plain arrays."""
    np.savez_compressed(
        path,
        keys=table.keys,
        increments_ppm=table.increments_ppm.astype(np.float16),
        class_medians_ppm=table.class_medians_ppm,
    )


def write_networks(networks: tuple[Network, ...], path: Path) -> None:
    """Write the networks as plain arrays of half precision."""
    arrays: dict[str, npt.NDArray[Any]] = {}
    for number, network in enumerate(networks):
        arrays[f"centre_{number}"] = network.centre
        arrays[f"spread_{number}"] = network.spread
        for layer, (weight, bias) in enumerate(
            zip(network.weights, network.biases, strict=True)
        ):
            arrays[f"weight_{number}_{layer}"] = weight.astype(np.float16)
            arrays[f"bias_{number}_{layer}"] = bias
    np.savez_compressed(path, **arrays)  # type: ignore[arg-type] # numpy's stub


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


@dataclass(frozen=True, slots=True, kw_only=True)
class Sizes:
    """How much is trained."""

    rounds: int
    networks: int
    threads: int


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Honest:
    """Out-of-fold predictions of the labels ``tested``, with what the trees saw."""

    tested: Integers
    predicted_ppm: Floats
    stacked: npt.NDArray[np.float32]
    errors_ppm: Floats


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Calibration:
    """Model of the interval: scale, factors by class, half-widths of the tested labels."""

    scale: lightgbm.Booster
    factors: dict[str, list[float]]
    half_widths_ppm: Floats


def useful_columns(labels: Labels) -> Integers:
    """Features that are not zero in enough rows."""
    known = (labels.features != 0) & ~np.isnan(labels.features)
    return np.nonzero(known.sum(axis=0) >= FEWEST_NONZERO)[0]


def cross_validate(
    labels: Labels, columns: Integers, sizes: Sizes, *, folds: int, used_folds: int
) -> Honest:
    """Predict each used fold by models that have not seen its scaffolds."""
    fold_of = labels.folds(folds)
    tested, predicted, stacked = [], [], []
    for fold in range(used_folds):
        train, test = np.nonzero(fold_of != fold)[0], np.nonzero(fold_of == fold)[0]
        model = fit_mean(labels, train, columns, sizes)
        shifts, features = predict_mean(model, labels, test, columns)
        tested.append(test)
        predicted.append(shifts)
        stacked.append(features)
    index = np.concatenate(tested)
    found = np.concatenate(predicted)
    return Honest(
        tested=index,
        predicted_ppm=found,
        stacked=np.vstack(stacked),
        errors_ppm=np.abs(found - labels.shifts_ppm[index]),
    )


def calibrate(labels: Labels, honest: Honest, threads: int) -> Calibration:
    """Fit the size of the error, and the factors that make intervals hold."""
    scale, scales = fit_scale(
        honest.stacked,
        honest.errors_ppm,
        labels.folds(1000003)[honest.tested],
        threads,
    )
    classes = labels.classes[honest.tested]
    factors = class_factors(honest.errors_ppm, scales, classes)
    rows = [
        np.array(factors.get(name, factors["all"])) * scale_ppm
        for name, scale_ppm in zip(classes, scales, strict=True)
    ]
    return Calibration(scale=scale, factors=factors, half_widths_ppm=np.array(rows))


def write_files(
    final: MeanModel, calibration: Calibration, columns: Integers, out: Path
) -> None:
    """Write every model file."""
    out.mkdir(parents=True, exist_ok=True)
    write_table(final.base.table, out / "shift_table.npz")
    write_increments(final.base.increments, out / "shift_increments.npz")
    write_networks(final.networks, out / "shift_networks.npz")
    write_booster(final.residual, out / "shift_residual.txt.gz")
    write_booster(final.direct, out / "shift_direct.txt.gz")
    write_booster(calibration.scale, out / "shift_scale.txt.gz")
    facts = {
        "columns": columns.tolist(),
        "solvents": list(SOLVENTS),
        "class_factors": calibration.factors,
        "shares": SHARES,
    }
    (out / "shift_facts.json").write_text(json.dumps(facts) + "\n")


def main() -> None:
    """Run the training."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--rounds", type=int, default=150)
    parser.add_argument("--networks", type=int, default=2)
    parser.add_argument("--threads", type=int, default=2)
    parser.add_argument("--folds", type=int, default=5)
    parser.add_argument("--used-folds", type=int, default=1)
    parser.add_argument("--no-files", action="store_true", help="only cross-validate")
    parser.add_argument("--out", type=Path, default=DATA)
    args = parser.parse_args()
    sizes = Sizes(rounds=args.rounds, networks=args.networks, threads=args.threads)
    labels = read_labels()
    columns = useful_columns(labels)
    honest = cross_validate(
        labels, columns, sizes, folds=args.folds, used_folds=args.used_folds
    )
    calibration = calibrate(labels, honest, args.threads)
    if not args.no_files:
        final = fit_mean(labels, np.arange(labels.row.size), columns, sizes)
        write_files(final, calibration, columns, args.out)
    print(json.dumps(report(labels, honest, calibration, columns)))


if __name__ == "__main__":
    main()
