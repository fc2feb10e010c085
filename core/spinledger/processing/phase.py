"""Zero- and first-order phase of a complex spectrum, highest shift first."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from spinledger.values.recipe import Phase


def sweep_positions(n_points: int) -> npt.NDArray[np.float64]:
    """Place of every point in the sweep, from near 0.5 down to -0.5.

    The carrier is 0; point j is at 1/2 - (j + 1)/n, which is its frequency from
    the carrier in units of the sweep for an even number of points.
    """
    top = (n_points + 1) // 2 - 1
    return (top - np.arange(n_points, dtype=np.float64)) / n_points


def linear_phasor(
    n_points: int, constant_rad: float, slope_rad: float
) -> npt.NDArray[np.complex128]:
    """exp(i (constant + slope x)) at every point of the sweep, shape (n_points,).

    Notes
    -----
    Built as an outer product of a coarse and a fine phasor, so that only about
    2 sqrt(n) exponentials are needed; exact to rounding.
    """
    fine_size = 1 << max(1, math.isqrt(n_points).bit_length())
    coarse_size = -(-n_points // fine_size)
    top = ((n_points + 1) // 2 - 1) / n_points
    turn = -slope_rad / n_points
    fine = np.exp(1j * (constant_rad + slope_rad * top + turn * np.arange(fine_size)))
    coarse = np.exp(1j * turn * fine_size * np.arange(coarse_size))
    return np.asarray(np.multiply.outer(coarse, fine).reshape(-1)[:n_points])


def phased(
    values: npt.NDArray[np.complex128], step: Phase | None
) -> npt.NDArray[np.complex128]:
    """Complex spectrum turned by a phase step; the input where there is none."""
    if step is None:
        return values
    phase0 = math.radians(step.phase0_deg)
    phase1 = math.radians(step.phase1_deg)
    return values * linear_phasor(values.size, phase0 - phase1 * step.pivot, phase1)
