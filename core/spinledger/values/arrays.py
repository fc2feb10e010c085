"""Owned, locked arrays for frozen values."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt


def locked_floats(
    values: npt.ArrayLike, name: str, *, ndim: int = 1
) -> npt.NDArray[np.float64]:
    """Copy of ``values`` as float64 that cannot be written to.

    Raises
    ------
    ValueError
        If the array does not have ``ndim`` dimensions.
    """
    return _locked(np.array(values, dtype=np.float64), name, ndim)


def locked_complex(values: npt.ArrayLike, name: str) -> npt.NDArray[np.complex128]:
    """Copy of ``values``, shape (n,), as complex128 that cannot be written to."""
    return _locked(np.array(values, dtype=np.complex128), name, 1)


def locked_integers(
    values: npt.ArrayLike, name: str, *, ndim: int = 1
) -> npt.NDArray[np.int64]:
    """Copy of ``values`` as int64 that cannot be written to."""
    return _locked(np.array(values, dtype=np.int64), name, ndim)


def _locked(owned: npt.NDArray[Any], name: str, ndim: int) -> npt.NDArray[Any]:
    if owned.ndim != ndim:
        raise ValueError(f"{name}: need {ndim} dimension(s), got shape {owned.shape}")
    owned.setflags(write=False)
    return owned
