"""Fit of the increments: robust ridge regression on fragment counts."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import sparse
from scipy.sparse.linalg import lsqr
from shift_labels import Labels

from spinledger.prediction.shifts_increments import FragmentCounts, IncrementTable
from spinledger.prediction.shifts_types import EXCHANGEABLE_CLASSES, PROTON_CLASSES

Integers = npt.NDArray[np.int64]

# Both chosen on one fold of the split by scaffold.
RIDGE = 5.0
FEWEST_ATOMS = 2
ROUNDS = 3
STEPS = 40
ROBUST_PPM = 0.25


def runs(labels: Labels, rows: Integers) -> FragmentCounts:
    """Fragments of some rows, one run a row in the order asked for."""
    found = labels.fragments
    lengths = found.starts[rows + 1] - found.starts[rows]
    starts = np.concatenate([[0], np.cumsum(lengths)]).astype(np.int64)
    offset = np.repeat(found.starts[rows] - starts[:-1], lengths)
    entries = np.arange(starts[-1]) + offset
    return FragmentCounts(
        keys=found.keys[entries], weights=found.weights[entries], starts=starts
    )


def fit_increments(labels: Labels, index: Integers) -> IncrementTable:
    """Increments from some labels; exchangeable protons are left out.

    Notes
    -----
    Least squares with a ridge, repeated three times with labels that are far off
    weighted down (Huber weights).
    """
    medians = np.array([_median_of(labels, index, name) for name in PROTON_CLASSES])
    used = index[~np.isin(labels.classes[index], list(EXCHANGEABLE_CLASSES))]
    counts = runs(labels, labels.row[used])
    known, column, n_atoms = np.unique(
        counts.keys, return_inverse=True, return_counts=True
    )
    matrix = sparse.csr_matrix(
        (counts.weights.astype(np.float64), column, counts.starts),
        shape=(used.size, known.size),
    )
    kept = np.nonzero(n_atoms >= FEWEST_ATOMS)[0]
    matrix = matrix[:, kept].tocsr()
    start = medians[[PROTON_CLASSES.index(name) for name in labels.classes[used]]]
    target = labels.shifts_ppm[used] - start
    increments: npt.NDArray[np.float64] | None = None
    weights = np.ones(used.size)
    for _ in range(ROUNDS):
        root = np.sqrt(weights)
        increments = lsqr(
            sparse.diags(root) @ matrix,
            root * target,
            damp=RIDGE,
            iter_lim=STEPS,
            x0=increments,
        )[0]
        away = np.abs(target - matrix @ increments)
        weights = 1.0 / np.maximum(1.0, away / ROBUST_PPM)
    assert increments is not None
    return IncrementTable(
        keys=known[kept],
        increments_ppm=increments.astype(np.float32),
        class_medians_ppm=medians,
    )


def _median_of(labels: Labels, index: Integers, name: str) -> float:
    of_class = labels.shifts_ppm[index][labels.classes[index] == name]
    return float(np.median(of_class)) if of_class.size else 4.0
