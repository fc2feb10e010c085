"""Increments: a shift as a sum over the fragments around a proton; ppm.

Each atom within a few bonds adds terms for what it is, what it is bonded to, and
what those are bonded to, by its distance from the proton's carbon.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt
from rdkit import Chem

from spinledger.prediction.shifts_spheres import coarse_neighbourhoods
from spinledger.prediction.shifts_types import PROTON_CLASSES, proton_class

Keys = npt.NDArray[np.uint32]

# Furthest bonds at which fragments of radius 0, 1, 2 count.
_REACH_BONDS: Final = (6, 5, 4)
_MIX: Final = tuple(
    np.uint64(value)
    for value in (
        0x9E3779B97F4A7C15,
        0xC2B2AE3D27D4EB4F,
        0x165667B19E3779F9,
        0x27D4EB2F165667C5,
        0xBF58476D1CE4E5B9,
    )
)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class FragmentCounts:
    """Fragments around some atoms, one run of keys an atom.

    Attributes
    ----------
    keys : numpy.ndarray of uint32, shape (n_entries,)
    weights : numpy.ndarray, shape (n_entries,)
        Square root of how often a fragment occurs.
    starts : numpy.ndarray of int, shape (n_atoms + 1,)
        Where the run of each atom begins.
    """

    keys: Keys
    weights: npt.NDArray[np.float32]
    starts: npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class IncrementTable:
    """Increments by fragment, sorted by key, on the median of each class."""

    keys: Keys
    increments_ppm: npt.NDArray[np.float32]
    class_medians_ppm: npt.NDArray[np.float64]

    def estimate(
        self, counts: FragmentCounts, classes: Sequence[str]
    ) -> npt.NDArray[np.float64]:
        """Sum of the increments of every atom, ppm."""
        place = np.searchsorted(self.keys, counts.keys)
        place = np.minimum(place, self.keys.size - 1)
        known = self.keys[place] == counts.keys
        terms = np.where(known, self.increments_ppm[place] * counts.weights, 0.0)
        totals = np.concatenate([[0.0], np.cumsum(terms, dtype=np.float64)])
        index = [PROTON_CLASSES.index(name) for name in classes]
        sums = totals[counts.starts[1:]] - totals[counts.starts[:-1]]
        return np.asarray(self.class_medians_ppm[index] + sums)


def fragment_counts(
    mol: Chem.Mol,
    atoms: Sequence[int],
    distances: npt.NDArray[np.float64],
    wide: npt.NDArray[np.uint64] | None = None,
) -> FragmentCounts:
    """Fragments around the protons of some atoms.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    atoms : sequence of int
    distances : numpy.ndarray, shape (n_atoms, n_atoms)
        Bonds between atoms.
    wide : numpy.ndarray, optional
        From :func:`coarse_neighbourhoods`, where it is known already.
    """
    codes = coarse_neighbourhoods(mol) if wide is None else wide
    in_one_ring = np.zeros(distances.shape, dtype=np.uint64)
    for ring in mol.GetRingInfo().AtomRings():
        in_one_ring[np.ix_(ring, ring)] = 1
    keys, weights, starts = [], [], [0]
    for index in atoms:
        own = PROTON_CLASSES.index(proton_class(mol.GetAtomWithIdx(index)))
        found, counts = np.unique(
            _keys_around(codes, distances[index], in_one_ring[index], own),
            return_counts=True,
        )
        keys.append(found)
        weights.append(np.sqrt(counts))
        starts.append(starts[-1] + found.size)
    return FragmentCounts(
        keys=np.concatenate(keys) if keys else np.zeros(0, np.uint32),
        weights=np.concatenate(weights).astype(np.float32)
        if weights
        else np.zeros(0, np.float32),
        starts=np.array(starts, dtype=np.int64),
    )


def _keys_around(
    codes: npt.NDArray[np.uint64],
    distances: npt.NDArray[np.float64],
    in_one_ring: npt.NDArray[np.uint64],
    own_class: int,
) -> Keys:
    parts = []
    for radius, reach in enumerate(_REACH_BONDS):
        near = np.nonzero(distances <= reach)[0]
        mixed = (
            codes[near, radius] * _MIX[0]
            + distances[near].astype(np.uint64) * _MIX[1]
            + np.full(near.size, own_class * 16 + radius, np.uint64) * _MIX[2]
            + in_one_ring[near] * _MIX[3]
        )
        mixed ^= mixed >> np.uint64(29)
        mixed *= _MIX[4]
        parts.append((mixed >> np.uint64(32)).astype(np.uint32))
    return np.concatenate(parts)
