"""Stiff masked baseline; bins along the sweep, intensities in the data's units."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from spinledger.values.recipe import Baseline
from spinledger.values.spectrum import Spectrum

N_ROUNDS = 5
# Points that stand out upwards are missed signals, downwards mostly dispersion.
_HIGH_SD, _HIGH_WEIGHT = 2.5, 0.01
_LOW_SD, _LOW_WEIGHT = 4.0, 0.1
# The penalised system needs a definite diagonal where everything is masked.
_LEAST_WEIGHT = 1e-9


def baseline_of(spectrum: Spectrum, step: Baseline) -> npt.NDArray[np.float64]:
    """Baseline of a phased spectrum, shape (n_points,).

    Parameters
    ----------
    spectrum : Spectrum
        Its axis is the one that the step's masked stretches refer to.
    step : Baseline

    Raises
    ------
    ValueError
        If the method is unknown.

    Notes
    -----
    Whittaker smoother with a second-difference penalty on bins; bins that touch
    a masked stretch take no part; five rounds of reweighting keep missed signals
    and broad humps from lifting it.

    References
    ----------
    .. [1] P. H. C. Eilers, Anal. Chem. 75 (2003) 3631-3636,
       doi:10.1021/ac034173t.
    """
    if step.method == "none":
        return np.zeros(spectrum.n_points)
    if step.method != "whittaker":
        raise ValueError(f"method: unknown baseline {step.method!r}")
    size = max(1, spectrum.n_points // step.n_bins)
    n_bins = spectrum.n_points // size
    binned = spectrum.intensities[: n_bins * size].reshape(n_bins, size).mean(axis=1)
    free = _free_bins(spectrum, step, size, n_bins)
    smooth = _robust_whittaker(binned, free, step.stiffness)
    # Linear between bin centres; the ends go on with the last slope.
    centres = (np.arange(n_bins, dtype=np.float64) + 0.5) * size - 0.5
    return _stretched(smooth, centres, spectrum.n_points)


def _free_bins(
    spectrum: Spectrum, step: Baseline, size: int, n_bins: int
) -> npt.NDArray[np.bool_]:
    free = np.ones(spectrum.n_points, dtype=np.bool_)
    for low_ppm, high_ppm in step.masked_ppm:
        if high_ppm >= spectrum.last_point_ppm and low_ppm <= spectrum.first_point_ppm:
            free[spectrum.window(low_ppm, high_ppm)] = False
    return np.asarray(free[: n_bins * size].reshape(n_bins, size).all(axis=1))


def _robust_whittaker(
    binned: npt.NDArray[np.float64], free: npt.NDArray[np.bool_], stiffness: float
) -> npt.NDArray[np.float64]:
    # Half a second with what it brings along: only where a baseline is drawn.
    from pybaselines.utils import whittaker_smooth  # noqa: PLC0415

    scale = float(np.abs(binned).max())
    if scale == 0 or not free.any():
        return np.zeros(binned.size)
    scaled = binned / scale
    start = free.astype(np.float64)
    weights = start
    smooth = np.zeros(binned.size)
    for _ in range(N_ROUNDS):
        smooth = np.asarray(
            whittaker_smooth(scaled, lam=stiffness, weights=weights + _LEAST_WEIGHT)
        )
        residual = scaled - smooth
        spread = 1.4826 * float(np.median(np.abs(residual[free])))
        weights = (
            start
            * np.where(residual > _HIGH_SD * spread, _HIGH_WEIGHT, 1.0)
            * np.where(residual < -_LOW_SD * spread, _LOW_WEIGHT, 1.0)
        )
    return smooth * scale


def _stretched(
    smooth: npt.NDArray[np.float64], centres: npt.NDArray[np.float64], n_points: int
) -> npt.NDArray[np.float64]:
    points = np.arange(n_points, dtype=np.float64)
    full = np.interp(points, centres, smooth)
    if smooth.size > 1:
        step = centres[1] - centres[0]
        before, after = points < centres[0], points > centres[-1]
        slopes = (smooth[1] - smooth[0]) / step, (smooth[-1] - smooth[-2]) / step
        full[before] = smooth[0] + slopes[0] * (points[before] - centres[0])
        full[after] = smooth[-1] + slopes[1] * (points[after] - centres[-1])
    return full
