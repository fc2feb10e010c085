"""Train the corrections of the coupling rules and say how good they are.

Run from the repository::

    python core/training/train_couplings.py ../shared/shifts/published_couplings.csv.gz

The models go to ``core/spinledger/prediction/couplings/data``; the figures of
the cross-validation by scaffold are printed as JSON. J in Hz throughout.
"""

from __future__ import annotations

import argparse
import json
import sys
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import lightgbm
import numpy as np
from couplings_chains import (
    FEWEST_FOR_BIAS,
    TRAINED_MEANS,
    BlockData,
    block_data,
    block_errors,
    block_predictions,
    final_blends,
    groups_of_values,
)
from couplings_data import Frames, read_rows
from couplings_fit import N_FOLDS, Floats, Texts, folds, stored_trees
from couplings_rings import RingData, fit_rings, ring_data, ring_errors, trained_kinds

DATA_FOLDER = Path(__file__).parents[1] / "spinledger/prediction/couplings/data/trained"
#: The split into folds is repeated; figures are means.
SPLIT_SEEDS = (1, 2, 3)
#: Kinds with fewer values keep the sd of their rule.
FEWEST_FOR_INTERVAL = 10


def summary(errors: Sequence[Floats]) -> dict[str, Any]:
    """Mean absolute error and quantiles over repeated splits."""
    sizes = np.abs(np.concatenate(list(errors)))
    return {
        "n": int(errors[0].size),
        "mae": round(float(sizes.mean()), 3),
        "p90": round(float(np.quantile(sizes, 0.9)), 2),
    }


def half_widths_of(errors: Sequence[Floats]) -> tuple[float, float, int]:
    """Half widths of the 68 and 95 % intervals."""
    sizes = np.abs(np.concatenate(list(errors)))
    low, high = np.quantile(sizes, [0.68, 0.95])
    return round(float(low), 3), round(float(high), 3), int(errors[0].size)


@dataclass(frozen=True, slots=True, kw_only=True)
class Validation:
    """Out-of-fold errors by kind, one array a split.

    Attributes
    ----------
    single : mapping
        Of single values.
    means : mapping
        Of block means; empty for aromatic kinds.
    groups : mapping
        Scaffold group of every single value.
    """

    single: Mapping[str, list[Floats]]
    means: Mapping[str, list[Floats]]
    groups: Mapping[str, Texts]


def cross_validate(rings: RingData, blocks: Mapping[str, BlockData]) -> Validation:
    """Errors of every kind, split by scaffold."""
    single: dict[str, list[Floats]] = {}
    means: dict[str, list[Floats]] = {}
    groups: dict[str, Texts] = {}
    for seed in SPLIT_SEEDS:
        errors = ring_errors(rings, seed)
        for kind in np.unique(rings.kinds):
            rows = (rings.kinds == kind) & rings.is_physical
            single.setdefault(str(kind), []).append(errors[rows])
            groups[str(kind)] = rings.groups[rows]
        for kind, data in blocks.items():
            if len(data.blocks) < 5:
                continue
            predicted = block_predictions(kind, data, seed)
            found, of_means = block_errors(data, predicted)
            single.setdefault(kind, []).append(found)
            means.setdefault(kind, []).append(of_means)
            groups[kind] = groups_of_values(data)
    return Validation(single=single, means=means, groups=groups)


def coverage(errors: Sequence[Floats], groups: Texts) -> dict[str, float]:
    """Shares within the 68 and 95 % intervals, and within one and two sd.

    The half widths are taken from the other scaffolds.
    """
    inside: dict[str, list[float]] = {name: [] for name in ("68", "95", "sd", "2 sd")}
    for seed, sizes in zip(SPLIT_SEEDS, map(np.abs, errors), strict=True):
        fold = folds(groups, seed)
        for number in range(N_FOLDS):
            mine = sizes[fold == number]
            low, high = np.quantile(sizes[fold != number], [0.68, 0.95])
            sd = np.sqrt(low * high / 1.96)
            for name, limit in (
                ("68", low),
                ("95", high),
                ("sd", sd),
                ("2 sd", 2 * sd),
            ):
                inside[name].extend((mine <= limit).astype(float))
    return {name: round(float(np.mean(hits)), 3) for name, hits in inside.items()}


def parameters(
    rings: RingData, blocks: Mapping[str, BlockData], validation: Validation
) -> tuple[dict[str, Any], dict[str, lightgbm.Booster]]:
    """What the library reads: one JSON value and the tree models by name."""
    everything = np.ones(rings.values_hz.size, dtype=bool)
    ring_models = fit_rings(rings, everything, trained_kinds(rings))
    blends = final_blends(blocks)
    linear = {**ring_models.linear, **{name: b.linear for name, b in blends.items()}}
    bias = {
        kind: round(float(np.median(data.means_hz - data.hla_means_hz)), 3)
        for kind, data in blocks.items()
        if len(data.blocks) >= FEWEST_FOR_BIAS
        and kind not in TRAINED_MEANS
        and kind != "chain CH-CH2"
    }
    stored = {
        "schema": 1,
        "ring_kinds": ring_models.kinds,
        "base": {k: round(v, 4) for k, v in ring_models.bases.items()}
        | {name: round(b.base, 4) for name, b in blends.items()},
        "bias": bias,
        "linear": {name: model.as_json() for name, model in linear.items()},
        "half_widths": {
            kind: half_widths_of(errors)
            for kind, errors in validation.single.items()
            if errors[0].size >= FEWEST_FOR_INTERVAL
        },
    }
    trees = {"aromatic": ring_models.trees} | {n: b.trees for n, b in blends.items()}
    return stored, trees


def figures(validation: Validation) -> dict[str, dict[str, Any]]:
    """Figures of the cross-validation by kind."""
    found: dict[str, dict[str, Any]] = {}
    for kind, errors in validation.single.items():
        found[kind] = summary(errors) if errors[0].size else {"n": 0}
        if errors[0].size >= FEWEST_FOR_INTERVAL:
            found[kind]["inside"] = coverage(errors, validation.groups[kind])
        if kind in validation.means:
            found[kind]["of means"] = summary(validation.means[kind])
    return found


def load(path: Path, cache: Path | None) -> tuple[RingData, dict[str, BlockData]]:
    """Training data from the table of published couplings."""
    rows = read_rows(path)
    frames = Frames(cache)
    return ring_data(rows, frames), block_data(rows, frames)


def main(argv: Sequence[str]) -> int:
    """Train, write the models, print the figures."""
    parser = argparse.ArgumentParser(
        description=__doc__.splitlines()[0] if __doc__ else ""
    )
    parser.add_argument("couplings", type=Path)
    parser.add_argument("--out", type=Path, default=DATA_FOLDER)
    parser.add_argument("--cache", type=Path, help="folder that keeps the conformers")
    arguments = parser.parse_args(argv)
    if arguments.cache is not None:
        arguments.cache.mkdir(parents=True, exist_ok=True)
    rings, blocks = load(arguments.couplings, arguments.cache)
    validation = cross_validate(rings, blocks)
    stored, trees = parameters(rings, blocks, validation)
    text = json.dumps(stored, indent=1, sort_keys=True)
    (arguments.out / "couplings.json").write_text(text + "\n", encoding="utf-8")
    stored_models = {name: stored_trees(booster) for name, booster in trees.items()}
    text = json.dumps(stored_models, separators=(",", ":"), sort_keys=True)
    (arguments.out / "trees.json").write_text(text + "\n", encoding="utf-8")
    json.dump(figures(validation), sys.stdout, indent=1)
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
