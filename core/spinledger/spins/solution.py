"""Intermediate results of the engine: eigenstates, transition moments, chosen lines."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class EigenSystem:
    """Energies and states of every block stack, in the order of the stacks."""

    energies: tuple[Floats, ...]  # each (n_blocks, size)
    vectors: tuple[Floats, ...]  # each (n_blocks, size, size)


@dataclass(frozen=True, slots=True, eq=False)
class Moments:
    """Transition moments of one transition stack."""

    rows: Floats  # (n, n_rows, upper size, lower size)
    total: Floats  # (n, upper size, lower size)
    weights: Floats  # (n,)


@dataclass(frozen=True, slots=True, eq=False)
class Kept:
    """Lines of one transition stack that are strong enough to keep."""

    flat: Integers  # places among all (link, upper, lower)
    shape: tuple[int, int, int]
    intensities: Floats  # (n_rows, n_kept)

    def indices(self) -> tuple[Integers, Integers, Integers]:
        """Link, upper and lower state of every kept line."""
        link, upper, lower = np.unravel_index(self.flat, self.shape)
        return link, upper, lower
