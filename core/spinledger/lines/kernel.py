"""Line shape learned from an isolated singlet; frequencies in Hz."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy.optimize import nnls

from spinledger.values.evidence import LineKernel

_REACH_HZ = 2.4
_SPACING_HZ = 0.2
_HALF_WIDTHS_HZ = np.arange(0.25, 1.45, 0.1)
_LEAST_SIGNAL_TO_NOISE = 500.0
_MOST_RESIDUAL = 0.03
_WINDOW_HZ = 12.0
_SILICON_SATELLITE_HZ = 3.3
_SATELLITE_MASK_HZ = 0.7


def learn_kernel(
    apart_hz: npt.NDArray[np.float64],
    intensities: npt.NDArray[np.float64],
    *,
    noise_sd: float,
    has_silicon: bool,
) -> LineKernel | None:
    """Common line shape as a sum of equal Lorentz lines at small offsets.

    Parameters
    ----------
    apart_hz : numpy.ndarray, shape (n_points,), Hz
        Distance from the singlet's position, positive to higher shift.
    intensities : numpy.ndarray, shape (n_points,)
        The flat spectrum about the singlet.
    noise_sd : float
        Of one point.
    has_silicon : bool
        Leave out the 29Si satellites at 3.3 Hz on either side.

    Returns
    -------
    LineKernel or None
        None where the signal-to-noise is below 500 or non-negative least squares
        leaves 3 % or more: a poor kernel makes every fit worse.

    Notes
    -----
    Offsets -2.4 to 2.4 Hz in steps of 0.2; the common half width from 0.25 to
    1.35 Hz that leaves least. Offsets are counted from the centre of gravity.
    """
    inside = np.abs(apart_hz) < _WINDOW_HZ
    if has_silicon:
        satellite = np.abs(np.abs(apart_hz) - _SILICON_SATELLITE_HZ)
        inside &= satellite > _SATELLITE_MASK_HZ
    x, y = apart_hz[inside], intensities[inside]
    top = float(y.max(initial=0.0))
    if x.size < 40 or top < _LEAST_SIGNAL_TO_NOISE * noise_sd:
        return None
    offsets = np.arange(-_REACH_HZ, _REACH_HZ + 1e-9, _SPACING_HZ)
    fits = [(*_fitted(x, y / top, offsets, half), half) for half in _HALF_WIDTHS_HZ]
    weights, left, half = min(fits, key=lambda fit: fit[1])
    if left / float(np.linalg.norm(y / top)) >= _MOST_RESIDUAL or weights.sum() <= 0:
        return None
    kept = weights > 0
    shares = weights[kept] / weights[kept].sum()
    centred = offsets[kept] - shares @ offsets[kept]
    return LineKernel(offsets_hz=centred, weights=shares, width_hz=2 * float(half))


def _fitted(
    x: npt.NDArray[np.float64],
    y: npt.NDArray[np.float64],
    offsets: npt.NDArray[np.float64],
    half: float,
) -> tuple[npt.NDArray[np.float64], float]:
    columns = half**2 / (half**2 + (x[:, None] - offsets) ** 2)
    # A base of either sign: two columns, as the solver knows only positive ones.
    ones = np.ones((x.size, 1))
    weights, left = nnls(np.hstack([columns, ones, -ones]), y)
    return weights[: offsets.size], float(left)
