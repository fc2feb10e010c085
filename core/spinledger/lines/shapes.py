"""Line shapes of unit area; frequencies in Hz, widths are full widths at half maximum."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

_LN2 = math.log(2)


def lorentzian(
    apart_hz: npt.NDArray[np.float64], width_hz: npt.ArrayLike
) -> npt.NDArray[np.float64]:
    """Lorentz line of unit area, 1/Hz."""
    half = np.asarray(width_hz, dtype=np.float64) / 2
    return np.asarray(half / np.pi / (half**2 + apart_hz**2))


def gaussian(
    apart_hz: npt.NDArray[np.float64], width_hz: npt.ArrayLike
) -> npt.NDArray[np.float64]:
    """Gauss line of unit area, 1/Hz."""
    half = np.asarray(width_hz, dtype=np.float64) / 2
    return np.asarray(
        math.sqrt(_LN2 / math.pi) / half * np.exp(-_LN2 * (apart_hz / half) ** 2)
    )


def pseudo_voigt(
    apart_hz: npt.NDArray[np.float64],
    width_hz: npt.ArrayLike,
    lorentz_share: float,
) -> npt.NDArray[np.float64]:
    """Sum of a Lorentz and a Gauss line of the same width, unit area, 1/Hz.

    Parameters
    ----------
    apart_hz : numpy.ndarray, Hz
        Distance from the centre.
    width_hz : array_like, Hz
        Broadcasts against ``apart_hz``.
    lorentz_share : float
        Share of the area in the Lorentz part, 0 to 1.
    """
    return lorentz_share * lorentzian(apart_hz, width_hz) + (
        1 - lorentz_share
    ) * gaussian(apart_hz, width_hz)


def share_within(
    low_hz: npt.ArrayLike,
    high_hz: npt.ArrayLike,
    centre_hz: npt.ArrayLike,
    width_hz: npt.ArrayLike,
) -> npt.NDArray[np.float64]:
    """Share of a Lorentz line's area between two frequencies.

    Notes
    -----
    (atan((high - c)/h) - atan((low - c)/h)) / pi with the half width h.
    """
    half = np.asarray(width_hz, dtype=np.float64) / 2
    centre = np.asarray(centre_hz, dtype=np.float64)
    upper = np.arctan((np.asarray(high_hz, dtype=np.float64) - centre) / half)
    lower = np.arctan((np.asarray(low_hz, dtype=np.float64) - centre) / half)
    return np.asarray((upper - lower) / np.pi)
