"""Small regression models and splits by scaffold for the coupling rules; J in Hz."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import lightgbm
import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
Texts = npt.NDArray[np.str_]

N_FOLDS = 5
TREES: dict[str, Any] = {
    "objective": "huber",
    "learning_rate": 0.04,
    "bagging_fraction": 0.8,
    "bagging_freq": 1,
    "feature_fraction": 0.5,
    "verbose": -1,
    "num_threads": 1,
    "seed": 7,
    "deterministic": True,
}
RIDGE_ROBUST_HZ = 0.6


@dataclass(frozen=True, slots=True, kw_only=True)
class Linear:
    """Ridge regression with the range it was trained on."""

    coefficients: Floats
    intercept: float
    low: float
    high: float

    def predict(self, features: Floats) -> Floats:
        """Values for rows of features."""
        return np.clip(
            features @ self.coefficients + self.intercept, self.low, self.high
        )

    def as_json(self) -> dict[str, Any]:
        """What the library reads."""
        return {
            "coefficients": [round(float(c), 5) for c in self.coefficients],
            "intercept": round(self.intercept, 5),
            "low": round(self.low, 4),
            "high": round(self.high, 4),
        }


def fit_ridge(
    features: Floats, values: Floats, weights: Floats, strength: float
) -> Linear:
    """Robust ridge regression on scaled features (Huber weights, four rounds)."""
    scale = features.std(axis=0)
    scale[scale == 0] = 1.0
    scaled = features / scale
    active = weights.copy()
    coefficients, intercept = np.zeros(features.shape[1]), 0.0
    for _ in range(4):
        centre = np.average(scaled, axis=0, weights=active)
        level = float(np.average(values, weights=active))
        spread = scaled - centre
        normal = (spread * active[:, None]).T @ spread
        normal += strength * np.eye(normal.shape[0])
        coefficients = np.linalg.solve(
            normal, (spread * active[:, None]).T @ (values - level)
        )
        intercept = level - float(centre @ coefficients)
        misfit = np.abs(values - scaled @ coefficients - intercept)
        active = weights / np.maximum(1.0, misfit / RIDGE_ROBUST_HZ)
    low, high = np.quantile(values, [0.005, 0.995])
    return Linear(
        coefficients=coefficients / scale,
        intercept=intercept,
        low=float(low),
        high=float(high),
    )


def fit_trees(
    features: Floats,
    values: Floats,
    weights: Floats,
    parameters: Mapping[str, Any],
    n_trees: int,
) -> lightgbm.Booster:
    """Gradient-boosted trees on residuals."""
    data = lightgbm.Dataset(features, values, weight=weights)
    return lightgbm.train(dict(parameters), data, n_trees)


def folds(groups: Texts, seed: int) -> npt.NDArray[np.int64]:
    """Fold of each row; groups are whole, folds about equally large."""
    names, member, counts = np.unique(groups, return_inverse=True, return_counts=True)
    order = np.random.default_rng(seed).permutation(names.size)
    order = order[np.argsort(-counts[order], kind="stable")]
    loads = np.zeros(N_FOLDS)
    fold = np.zeros(names.size, dtype=np.int64)
    for group in order:
        fold[group] = int(np.argmin(loads))
        loads[fold[group]] += counts[group]
    return fold[member]


def stored_trees(booster: lightgbm.Booster) -> list[dict[str, list[float]]]:
    """Trees as plain lists: feature, threshold, left and right of each split, leaf values.

    A child below zero is leaf ``-1 - child``.
    """
    return [
        _stored_tree(item["tree_structure"])
        for item in booster.dump_model()["tree_info"]
    ]


def _stored_tree(root: Mapping[str, Any]) -> dict[str, list[float]]:
    splits: list[Mapping[str, Any]] = []
    leaves: list[float] = []
    tree: dict[str, list[float]] = {
        name: [] for name in ("feature", "threshold", "left", "right")
    }

    def place(node: Mapping[str, Any]) -> int:
        if "leaf_value" in node:
            leaves.append(round(float(node["leaf_value"]), 5))
            return -len(leaves)
        index = len(splits)
        splits.append(node)
        for column in tree.values():
            column.append(0)
        tree["feature"][index] = int(node["split_feature"])
        tree["threshold"][index] = round(float(node["threshold"]), 6)
        tree["left"][index] = place(node["left_child"])
        tree["right"][index] = place(node["right_child"])
        return index

    place(root)
    return tree | {"leaf": leaves}
