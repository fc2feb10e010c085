"""A small dense network that corrects the base estimate of a shift; ppm."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from spinledger.prediction.shifts_types import PROTON_CLASSES

Rows = npt.NDArray[np.float32]

_FURTHEST_SDS: Final = 6.0
_UNKNOWN: Final = -0.1


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Network:
    """Dense layers with rectified units, the last one a single number.

    Attributes
    ----------
    centre, spread : numpy.ndarray, shape (n_inputs,)
        Inputs are centred and divided, then clipped at 6.
    weights : tuple of numpy.ndarray, shape (n_in, n_out) each
    biases : tuple of numpy.ndarray, shape (n_out,) each
    """

    centre: Rows
    spread: Rows
    weights: tuple[Rows, ...]
    biases: tuple[Rows, ...]

    def predict(self, inputs: Rows) -> npt.NDArray[np.float64]:
        """Correction of every row, ppm.

        Parameters
        ----------
        inputs : numpy.ndarray of float32, shape (n_rows, n_inputs)
            From :func:`network_inputs`.
        """
        layer = scaled(inputs, self.centre, self.spread)
        for weight, bias in zip(self.weights[:-1], self.biases[:-1], strict=True):
            layer = np.maximum(layer @ weight + bias, 0.0)
        return np.asarray(
            (layer @ self.weights[-1] + self.biases[-1])[:, 0], dtype=np.float64
        )


def scaled(inputs: Rows, centre: Rows, spread: Rows) -> Rows:
    """Inputs in units of their spread, clipped at 6."""
    units = (inputs - centre) / spread
    return np.asarray(np.clip(units, -_FURTHEST_SDS, _FURTHEST_SDS), dtype=np.float32)


def network_inputs(
    counted: Rows,
    base: npt.NDArray[np.float64],
    classes: Sequence[str],
    n_solvents: int,
) -> Rows:
    """Inputs of the network.

    Parameters
    ----------
    counted : numpy.ndarray of float32, shape (n_rows, n_counted + 1)
        Counted features; the last column is the index of the solvent, -1 where
        it is unknown.
    base : numpy.ndarray, shape (n_rows, n_base)
        What table and increments say.
    classes : sequence of str, length n_rows
    n_solvents : int
    """
    plain = np.nan_to_num(counted[:, :-1])
    solvents = counted[:, -1:] == np.arange(-1, n_solvents, dtype=np.float32)
    index = np.array([PROTON_CLASSES.index(name) for name in classes], dtype=np.int64)
    kinds = index.reshape(-1, 1) == np.arange(len(PROTON_CLASSES))
    return np.column_stack(
        [
            np.sign(plain) * np.sqrt(np.abs(plain)),
            solvents,
            kinds,
            np.nan_to_num(base, nan=_UNKNOWN),
        ]
    ).astype(np.float32)
