"""Trained corrections to the coupling rules, read on first use; J in Hz."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any

import numpy as np
import numpy.typing as npt

from spinledger.values.arrays import locked_floats, locked_integers

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]

#: Shared under CC BY-SA 4.0, see the licence beside the files.
MODEL_FOLDER = "trained"


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class LinearModel:
    """Ridge regression, held within the range it was trained on.

    Attributes
    ----------
    coefficients : numpy.ndarray, shape (n_features,)
    intercept, low, high : float, Hz
    """

    coefficients: Floats
    intercept: float
    low: float
    high: float

    def __post_init__(self) -> None:
        locked = locked_floats(self.coefficients, "coefficients")
        object.__setattr__(self, "coefficients", locked)

    def predict(self, features: Floats) -> float:
        """Value for one row of features, Hz."""
        value = float(features @ self.coefficients) + self.intercept
        return min(max(value, self.low), self.high)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Trees:
    """Sum of regression trees, all walked at once.

    Attributes
    ----------
    features, left, right : numpy.ndarray of int, shape (n_trees, n_splits)
        Split feature and children; a child below zero is leaf ``-1 - child``.
    thresholds : numpy.ndarray, shape (n_trees, n_splits)
        Values up to the threshold go left.
    leaves : numpy.ndarray, shape (n_trees, n_leaves), Hz
    """

    features: Integers
    thresholds: Floats
    left: Integers
    right: Integers
    leaves: Floats

    def __post_init__(self) -> None:
        for name in ("features", "left", "right"):
            owned = locked_integers(getattr(self, name), name, ndim=2)
            object.__setattr__(self, name, owned)
        for name in ("thresholds", "leaves"):
            object.__setattr__(
                self, name, locked_floats(getattr(self, name), name, ndim=2)
            )

    def predict(self, row: Floats) -> float:
        """Value for one row of features, Hz."""
        trees = np.arange(self.leaves.shape[0])
        nodes = np.zeros(trees.size, dtype=np.int64)
        while np.any(nodes >= 0):
            at = np.maximum(nodes, 0)
            goes_left = row[self.features[trees, at]] <= self.thresholds[trees, at]
            below = np.where(goes_left, self.left[trees, at], self.right[trees, at])
            nodes = np.where(nodes >= 0, below, nodes)
        return float(self.leaves[trees, -1 - nodes].sum())


@dataclass(frozen=True, slots=True, kw_only=True)
class HalfWidths:
    """Half widths of the intervals of one kind of coupling, from cross-validation.

    Attributes
    ----------
    half_68_hz, half_95_hz : float, Hz
    n_values : int
        Published values behind them.
    """

    half_68_hz: float
    half_95_hz: float
    n_values: int

    @property
    def sd_hz(self) -> float:
        """One sd that does justice to both intervals.

        Errors have heavier tails than a normal distribution; the geometric
        mean of the two half widths in their normal units lies between.
        """
        return float(np.sqrt(self.half_68_hz * self.half_95_hz / 1.96))


def linear_model(name: str) -> LinearModel:
    """Ridge model by name.

    Raises
    ------
    KeyError
        If it was not trained.
    """
    return _linear_models()[name]


def tree_value_hz(name: str, features: Floats) -> float:
    """Value of a tree model for one row of features, Hz.

    Parameters
    ----------
    name : str
    features : numpy.ndarray, shape (n_features,)
    """
    return _trees(name).predict(features)


def half_widths(kind: str) -> HalfWidths:
    """Intervals of a kind of coupling.

    Raises
    ------
    KeyError
        If the kind was not in the published values.
    """
    return _half_widths()[kind]


def known_kinds() -> frozenset[str]:
    """Kinds that have intervals from published values."""
    return frozenset(_half_widths())


def base_hz(key: str) -> float:
    """Typical value of a table key after a look at the published values, Hz.

    Raises
    ------
    KeyError
        If the key was not in the published values.
    """
    return float(_parameters()["base"][key])


def bias_hz(kind: str) -> float:
    """What a rule of this kind lacks on average, Hz; 0 where it was not measured."""
    return float(_parameters()["bias"].get(kind, 0.0))


def trained_ring_kinds() -> tuple[str, ...]:
    """Aromatic kinds that have models, in the order of the models' columns."""
    return tuple(_parameters()["ring_kinds"])


@cache
def _parameters() -> Mapping[str, Any]:
    return _stored("couplings.json")


@cache
def _stored_trees() -> Mapping[str, Any]:
    return _stored("trees.json")


def _stored(name: str) -> Mapping[str, Any]:
    path = files(__package__).joinpath("data", MODEL_FOLDER, name)
    loaded: Mapping[str, Any] = json.loads(path.read_text(encoding="utf-8"))
    return loaded


@cache
def _linear_models() -> Mapping[str, LinearModel]:
    return {
        name: LinearModel(
            coefficients=np.array(item["coefficients"]),
            intercept=item["intercept"],
            low=item["low"],
            high=item["high"],
        )
        for name, item in _parameters()["linear"].items()
    }


@cache
def _half_widths() -> Mapping[str, HalfWidths]:
    return {
        kind: HalfWidths(half_68_hz=low, half_95_hz=high, n_values=int(count))
        for kind, (low, high, count) in _parameters()["half_widths"].items()
    }


@cache
def _trees(name: str) -> Trees:
    stored = _stored_trees()[name]
    return Trees(
        features=_padded(stored, "feature").astype(np.int64),
        thresholds=_padded(stored, "threshold"),
        left=_padded(stored, "left").astype(np.int64),
        right=_padded(stored, "right").astype(np.int64),
        leaves=_padded(stored, "leaf"),
    )


def _padded(trees: Sequence[Mapping[str, Sequence[float]]], column: str) -> Floats:
    """One column of all trees, filled up to the longest.

    A tree without splits has its only leaf at the root: children of the
    filling point at leaf 0.
    """
    filling = -1.0 if column in ("left", "right") else 0.0
    longest = max(1, *(len(tree[column]) for tree in trees))
    table = np.full((len(trees), longest), filling)
    for row, tree in zip(table, trees, strict=True):
        row[: len(tree[column])] = tree[column]
    return table
