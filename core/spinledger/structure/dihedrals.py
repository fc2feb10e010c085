"""Dihedral angles over many conformers, in degrees."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]


def dihedrals_deg(positions: Floats, atoms: Sequence[int]) -> Floats:
    """Signed dihedral angle of four atoms in every conformer.

    Parameters
    ----------
    positions : numpy.ndarray, shape (n_conformers, n_atoms, 3)
    atoms : sequence of four int
        Atoms along the chain.

    Returns
    -------
    numpy.ndarray, shape (n_conformers,), degrees
        In (-180, 180], IUPAC sign: clockwise looking along the middle bond is
        positive.
    """
    first, second, third, fourth = (positions[:, index] for index in atoms)
    axis = third - second
    axis = axis / np.linalg.norm(axis, axis=1, keepdims=True)
    front = first - second
    front = front - np.sum(front * axis, axis=1, keepdims=True) * axis
    back = fourth - third
    back = back - np.sum(back * axis, axis=1, keepdims=True) * axis
    sine = np.sum(np.cross(axis, front) * back, axis=1)
    cosine = np.sum(front * back, axis=1)
    return np.asarray(np.degrees(np.arctan2(sine, cosine)))
