"""Aromatic couplings: training rows, models and errors; J in Hz."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import lightgbm
import numpy as np
import numpy.typing as npt
from couplings_data import (
    Frames,
    Row,
    by_entry,
    relabelled_aromatic,
    relabelled_five_rings,
    scaffold_groups,
    skeleton,
)
from couplings_fit import (
    N_FOLDS,
    TREES,
    Floats,
    Linear,
    Texts,
    fit_ridge,
    fit_trees,
    folds,
)

from spinledger.prediction.couplings.aromatic import ring_rule
from spinledger.prediction.couplings.aromatic_features import ring_features
from spinledger.prediction.couplings.tables import rule

FEWEST_FOR_MODEL = 35
#: Physical ranges of aromatic couplings; values outside are swapped labels.
RING_LIMITS_HZ = {
    "benzene ortho": (5.0, 11.0),
    "benzene meta": (0.0, 4.0),
    "benzene para": (-1.0, 2.0),
    "azine ortho next to N": (3.5, 9.5),
    "azine ortho": (5.5, 11.0),
    "azine meta": (0.0, 4.0),
    "azine para": (-1.0, 2.3),
    "furan ortho": (0.5, 5.0),
    "thiophene ortho": (2.5, 7.3),
    "pyrrole ortho": (1.2, 5.0),
}
RING_TREES: dict[str, Any] = TREES | {
    "alpha": 0.3,
    "learning_rate": 0.03,
    "num_leaves": 11,
    "min_data_in_leaf": 12,
}
N_RING_TREES = 280
RING_RIDGE = 20.0


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class RingData:
    """Aromatic couplings with features.

    Attributes
    ----------
    values_hz : numpy.ndarray, shape (n,)
    table_hz : numpy.ndarray, shape (n,)
        Literature value of the rule table.
    kinds, bases : numpy.ndarray of str, shape (n,)
    linear, tree : numpy.ndarray, shape (n, n_features)
    groups : numpy.ndarray of str, shape (n,)
        Scaffold groups.
    is_physical : numpy.ndarray of bool, shape (n,)
    """

    values_hz: Floats
    table_hz: Floats
    kinds: Texts
    bases: Texts
    linear: Floats
    tree: Floats
    groups: Texts
    is_physical: npt.NDArray[np.bool_]


def ring_data(rows: Iterable[Row], frames: Frames) -> RingData:
    """Measured aromatic couplings, labels put right, with features."""
    found: list[tuple[Row, str, str, float, Floats, Floats]] = []
    for entry in by_entry(rows).values():
        frame = frames.of(entry[0].smiles)
        aromatic = [row for row in entry if all(map(frame.is_aromatic, row.heavy))]
        mended = relabelled_aromatic(aromatic, frame.mol)
        for row in relabelled_five_rings(mended, frame):
            ring = frame.aromatic_ring_with(*row.heavy)
            if row.is_assumed or ring is None or row.heavy[0] == row.heavy[1]:
                continue
            chosen = ring_rule(frame, ring, row.heavy)
            if chosen is None:
                continue
            features = ring_features(frame, ring, row.heavy)
            typical = rule(chosen.key).j_hz
            found.append((row, chosen.kind, chosen.base, typical, *features))
    placeholders = _shared_values(row for row, *_ in found)
    found = [item for item in found if round(item[0].j_hz, 4) not in placeholders]
    values = np.array([item[0].j_hz for item in found])
    kinds = np.array([item[1] for item in found])
    limits = np.array([RING_LIMITS_HZ.get(kind, (-1.0, 12.0)) for kind in kinds])
    return RingData(
        values_hz=values,
        table_hz=np.array([item[3] for item in found]),
        kinds=kinds,
        bases=np.array([item[2] for item in found]),
        linear=np.array([item[4] for item in found]),
        tree=np.array([item[5] for item in found]),
        groups=np.array(scaffold_groups([item[0].smiles for item in found])),
        is_physical=(values >= limits[:, 0]) & (values <= limits[:, 1]),
    )


def _shared_values(rows: Iterable[Row]) -> set[float]:
    """Values that four or more unrelated compounds share: put in, not fitted."""
    compounds: dict[float, set[str]] = {}
    for row in rows:
        compounds.setdefault(round(row.j_hz, 4), set()).add(skeleton(row.smiles))
    return {value for value, names in compounds.items() if len(names) >= 4}


def trained_kinds(data: RingData) -> list[str]:
    """Kinds with values enough for models."""
    names, counts = np.unique(data.kinds[data.is_physical], return_counts=True)
    return [str(n) for n, c in zip(names, counts, strict=True) if c >= FEWEST_FOR_MODEL]


@dataclass(frozen=True, slots=True, kw_only=True)
class RingModels:
    """Everything trained on aromatic couplings."""

    kinds: list[str]
    bases: dict[str, float]
    linear: dict[str, Linear]
    trees: lightgbm.Booster

    def predict(self, data: RingData) -> Floats:
        """Values for every row, table values where no model speaks."""
        values = data.table_hz.copy()
        is_trained = np.isin(data.kinds, self.kinds)
        tree = self.trees.predict(_with_kinds(data, self.kinds), num_threads=1)
        for kind in self.kinds:
            rows = is_trained & (data.kinds == kind)
            base = np.array([self.bases[name] for name in data.bases[rows]])
            linear = self.linear[kind].predict(data.linear[rows])
            values[rows] = base + (linear + np.asarray(tree)[rows]) / 2
        return values


def _with_kinds(data: RingData, kinds: Sequence[str]) -> Floats:
    columns = np.array([[float(k == kind) for kind in kinds] for k in data.kinds])
    return np.hstack([data.tree, columns])


def fit_rings(
    data: RingData, rows: npt.NDArray[np.bool_], kinds: list[str]
) -> RingModels:
    """Train on some of the rows."""
    used = rows & data.is_physical & np.isin(data.kinds, kinds)
    bases = {}
    for name in np.unique(data.bases[np.isin(data.kinds, kinds)]):
        table = float(np.median(data.table_hz[data.bases == name]))
        mine = data.values_hz[used & (data.bases == name)]
        share = mine.size / (mine.size + 10.0)
        lack = float(np.median(mine)) - table if mine.size else 0.0
        bases[str(name)] = table + share * lack
    residual = data.values_hz - np.array([bases.get(str(n), 0.0) for n in data.bases])
    linear = {}
    for kind in kinds:
        mine = used & (data.kinds == kind)
        ones = np.ones(int(mine.sum()))
        linear[kind] = fit_ridge(data.linear[mine], residual[mine], ones, RING_RIDGE)
    columns = _with_kinds(data, kinds)
    trees = fit_trees(
        columns[used],
        residual[used],
        np.ones(int(used.sum())),
        RING_TREES,
        N_RING_TREES,
    )
    return RingModels(kinds=kinds, bases=bases, linear=linear, trees=trees)


def ring_errors(data: RingData, seed: int) -> Floats:
    """Published minus predicted, every row predicted by a model that never saw its scaffold."""
    kinds = trained_kinds(data)
    fold = folds(data.groups, seed)
    predicted = np.full(data.values_hz.size, np.nan)
    for number in range(N_FOLDS):
        model = fit_rings(data, fold != number, kinds)
        predicted[fold == number] = model.predict(data)[fold == number]
    return data.values_hz - predicted
