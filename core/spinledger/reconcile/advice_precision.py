"""How well a coupling would be known at another field, by Fisher information; Hz."""

from __future__ import annotations

import numpy as np

from spinledger.reconcile.advice_fields import Simulator
from spinledger.reconcile.coarse import FloatArray
from spinledger.spins.clusters import QUICK_EFFORT

#: Errors of real line shapes, as a share of the tallest line.
SHAPE_ERROR = 0.02
SHIFT_PRIOR_HZ = 50.0
_STEP_HZ = 0.25
#: Larger systems are left alone: advice must stay quick.
_MOST_POINTS = 60_000
_MOST_LINES = 4_000


def coupling_sds_hz(
    simulator: Simulator, field_mhz: float, *, noise_per_hz: float
) -> FloatArray:
    """Least sd of every coupling from one spectrum at a field, shape (n_couplings,).

    Parameters
    ----------
    simulator : Simulator
    field_mhz : float, MHz
    noise_per_hz : float
        Noise sd of a stretch of one Hz, in protons per Hz.

    Returns
    -------
    numpy.ndarray, Hz
        The predicted sd where the spectrum tells nothing, and for systems of
        more than 4000 lines.

    Notes
    -----
    Inverse of the Fisher information of all shifts and couplings, with the
    predictions' sds as priors. Noise is white, and every point is good to 2 %
    of the tallest line at best, so that no fit is thought better than real
    line shapes allow.

    References
    ----------
    .. [1] S. M. Kay, Fundamentals of Statistical Signal Processing: Estimation
       Theory, 1993, section 3.9.
    """
    view = simulator.view
    claims = view.evaluation.claims
    shifts_hz = simulator.shifts_hz(field_mhz)
    plan = simulator.network.plan(
        shifts_hz, view.couplings_hz, without=view.gone, effort=QUICK_EFFORT
    )
    lines = simulator.network.lines(
        shifts_hz,
        view.couplings_hz,
        intensity_derivatives="shared",
        plan=plan,
    )
    prior = np.concatenate(
        [
            np.full(len(claims.claims), SHIFT_PRIOR_HZ),
            [max(one.j_sd_hz, 0.1) for one in claims.couplings],
        ]
    )
    grid = _grid(lines.frequencies_hz)
    is_large = grid.size > _MOST_POINTS or lines.frequencies_hz.size > _MOST_LINES
    if lines.d_frequency is None or lines.d_protons is None or is_large:
        return prior[len(claims.claims) :]
    model, slopes = _slopes(
        grid,
        lines.frequencies_hz,
        lines.protons,
        lines.d_frequency,
        lines.d_protons,
        simulator.width_hz,
    )
    noise = np.hypot(noise_per_hz / np.sqrt(_STEP_HZ), SHAPE_ERROR * model.max())
    information = slopes.T @ slopes / noise**2 + np.diag(1.0 / prior**2)
    sds = np.sqrt(np.diag(np.linalg.inv(information)))
    return np.asarray(sds[len(claims.claims) :])


def _grid(frequencies_hz: FloatArray) -> FloatArray:
    """Points within 20 Hz of any line."""
    bins = np.unique(np.rint(frequencies_hz / 5.0).astype(int))
    wanted = np.unique(np.add.outer(bins, np.arange(-4, 5)).ravel())
    inside = np.arange(0.0, 5.0, _STEP_HZ)
    return np.asarray(np.add.outer(wanted * 5.0, inside).ravel())


def _slopes(
    grid: FloatArray,
    frequencies_hz: FloatArray,
    protons: FloatArray,
    d_frequency: FloatArray,
    d_protons: FloatArray,
    width_hz: float,
) -> tuple[FloatArray, FloatArray]:
    """Spectrum and its slopes by every parameter, (n_points,) and (n_points, n)."""
    half = width_hz / 2.0
    model = np.zeros(grid.size)
    slopes = np.zeros((grid.size, d_frequency.shape[1]))
    reach = 20.0
    order = np.argsort(grid)
    sorted_grid = grid[order]
    for k, frequency in enumerate(frequencies_hz):
        low, high = np.searchsorted(sorted_grid, (frequency - reach, frequency + reach))
        rows = order[low:high]
        gap = grid[rows] - frequency
        bottom = gap**2 + half**2
        shape = half / np.pi / bottom
        steep = 2.0 * gap * half / np.pi / bottom**2
        model[rows] += protons[k] * shape
        for column in np.flatnonzero(d_frequency[k]):
            slopes[rows, column] += protons[k] * d_frequency[k, column] * steep
        for column in np.flatnonzero(d_protons[k]):
            slopes[rows, column] += d_protons[k, column] * shape
    return model, slopes
