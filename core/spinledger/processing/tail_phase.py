"""Correction of a phase by the tails of the lines; angles in rad, widths in Hz."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.interpolate import BSpline

from spinledger.lines.derivative import Values
from spinledger.lines.noise import EDGE_SHARE
from spinledger.lines.regions import Regions
from spinledger.processing.phase import linear_phasor, sweep_positions

_CLEAR_HZ = 6.0
_CLEAR_OF_WATER_HZ = 100.0
_REACH_HZ = 300.0
_BIN_HZ = 1.0
_KNOT_HZ = 1500.0
_STRONG_SHARE = 0.05
_LEAST_BINS = 40
_N_ROUNDS = 4
_N_REWEIGHTS = 6
_HUBER_SD = 2.0
_SPLINE_RIDGE = 1e-4
_SLOPE_RIDGE = 0.01


@dataclass(frozen=True, slots=True, kw_only=True)
class TailCorrection:
    """What the tails ask to be added to the phase; None of it if too few bins."""

    constant_rad: float
    slope_rad: float
    n_bins: int


def tail_correction(
    values: npt.NDArray[np.complex128],
    kept: Regions,
    *,
    dropped: Regions,
    step_hz: float,
) -> TailCorrection:
    """Phase error seen in the stretches beside strong signals.

    Parameters
    ----------
    values : numpy.ndarray, shape (n_points,), complex
        Spectrum that is nearly in phase.
    kept, dropped : Regions
        Signals to be used, and those to be kept clear of (water).
    step_hz : float, Hz

    Notes
    -----
    Beside a line the dispersive part falls as 1/f and the absorptive one as
    1/f^2, so the real part there is the phase error times the imaginary part,
    plus a stiff baseline: least squares Re = t0 Im + t1 x Im + cubic B-spline with
    knots every 1500 Hz, Huber weights. Flexible splines eat the tails.

    References
    ----------
    .. [1] P. J. Huber, Ann. Math. Statist. 35 (1964) 73-101,
       doi:10.1214/aoms/1177703732: the weights.
    """
    usable = _usable_points(values.size, kept, dropped, step_hz)
    size = max(1, int(_BIN_HZ / step_hz))
    n_bins = values.size // size
    chosen = usable[: n_bins * size].reshape(n_bins, size).all(axis=1)
    if chosen.sum() < _LEAST_BINS:
        return TailCorrection(constant_rad=0.0, slope_rad=0.0, n_bins=0)
    x = _binned(sweep_positions(values.size), size)[chosen]
    spline = _spline_columns(x, values.size * step_hz)
    constant = slope = 0.0
    for _ in range(_N_ROUNDS):
        turned = values * linear_phasor(values.size, constant, slope)
        found = _regression(_binned(turned, size)[chosen], x, spline)
        constant += found[0]
        slope += found[1]
    return TailCorrection(
        constant_rad=constant, slope_rad=slope, n_bins=int(chosen.sum())
    )


def _usable_points(
    n_points: int, kept: Regions, dropped: Regions, step_hz: float
) -> npt.NDArray[np.bool_]:
    taken = kept.mask(n_points, int(_CLEAR_HZ / step_hz))
    taken |= dropped.mask(n_points, int(_CLEAR_OF_WATER_HZ / step_hz))
    strong = kept.select(kept.heights > _STRONG_SHARE * kept.heights.max(initial=0.0))
    usable = strong.mask(n_points, int(_REACH_HZ / step_hz)) & ~taken
    edge = int(n_points * EDGE_SHARE)
    usable[:edge] = False
    usable[n_points - edge :] = False
    return usable


def _spline_columns(
    x: npt.NDArray[np.float64], width_hz: float
) -> npt.NDArray[np.float64]:
    n_knots = max(2, int(width_hz / _KNOT_HZ))
    inner = np.linspace(x.min() - 1e-9, x.max() + 1e-9, n_knots)
    knots = np.concatenate([[inner[0]] * 3, inner, [inner[-1]] * 3])
    columns = BSpline.design_matrix(x, knots, 3).toarray()
    return np.asarray(columns[:, np.abs(columns).sum(axis=0) > 1e-6])


def _regression(
    turned: npt.NDArray[np.complex128],
    x: npt.NDArray[np.float64],
    spline: npt.NDArray[np.float64],
) -> npt.NDArray[np.float64]:
    real, imaginary = turned.real, turned.imag
    columns = np.column_stack([imaginary, imaginary * x, spline])
    weights = np.ones(real.size)
    answer = np.zeros(columns.shape[1])
    for _ in range(_N_REWEIGHTS):
        weighted = columns * weights[:, None]
        normal = weighted.T @ columns
        ridge = np.full(normal.shape[0], 0.0)
        ridge[2:] = _SPLINE_RIDGE * np.median(np.diag(normal)[2:])
        ridge[1] = _SLOPE_RIDGE * normal[0, 0]
        answer = np.linalg.solve(normal + np.diag(ridge), weighted.T @ real)
        residual = np.abs(real - columns @ answer)
        spread = 1.4826 * float(np.median(residual))
        if spread == 0:
            break
        weights = 1 / np.maximum(1.0, residual / (_HUBER_SD * spread))
    return answer


def _binned(values: Values, size: int) -> Values:
    count = values.size // size
    means: Values = values[: count * size].reshape(count, size).mean(axis=1)
    return means
