"""Phase by the smallest negative area inside signal regions; angles in rad."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.optimize import minimize

from spinledger.lines.regions import Regions
from spinledger.processing.phase import sweep_positions

_WIDEN_HZ = 10.0
_INTRUDE_HZ = 2.0
_MOST_POINTS = 512
_BASE_SHARE = 12
_HEIGHT_CAP = 10.0
_GRID_RAD = np.radians(30.0)
_SLOPE_REACH_RAD = np.radians(360.0)
# Just enough to choose between optima that are equally good.
_SLOPE_PENALTY = 2e-4 / (2 * np.pi) ** 2
_N_STARTS = 4
# Relative change of the cost at which a descent ends.
_COARSE, _FINE = 1e-3, 1e-8


@dataclass(frozen=True, slots=True, kw_only=True)
class PhaseFit:
    """Phase constant + slope x, x = -0.5 to 0.5 over the sweep, and its cost."""

    constant_rad: float
    slope_rad: float
    cost: float


class NegativeAreaCost:
    """Negative area after a local straight base, over all regions.

    Parameters
    ----------
    values : numpy.ndarray, shape (n_points,), complex
        Unphased spectrum.
    regions : Regions
    step_hz : float, Hz
    noise_sd : float
        Of one channel; negative values within it cost nothing.

    Notes
    -----
    cost = sum_r w_r sum_k max(0, -R_k - sd) / sum_k |S_k| / sum_r w_r, where R is
    the real part after the phase, less the straight line through the means of the
    first and last twelfth of the region. A distribution of fields over the sample
    is never negative, so bad shims do not move the optimum; a symmetry criterion
    would. The weight is the height, capped at ten medians.
    """

    def __init__(
        self,
        values: npt.NDArray[np.complex128],
        regions: Regions,
        *,
        step_hz: float,
        noise_sd: float,
    ) -> None:
        spans = _widened(regions, step_hz, values.size)
        positions = sweep_positions(values.size)
        pieces = [_averaged(values, positions, start, stop) for start, stop in spans]
        lengths = np.array([piece[0].size for piece in pieces])
        self._values = np.concatenate([piece[0] for piece in pieces])
        self._x = np.concatenate([piece[1] for piece in pieces])
        self._noise_sd = noise_sd
        self._set_base(lengths)
        caps = np.minimum(regions.heights, _HEIGHT_CAP * np.median(regions.heights))
        totals = np.add.reduceat(np.abs(self._values), self._starts)
        self._point_weights = np.repeat(caps / totals / caps.sum(), lengths)

    def _set_base(self, lengths: npt.NDArray[np.int64]) -> None:
        stops = np.cumsum(lengths)
        self._starts = stops - lengths
        sizes = np.maximum(3, lengths // _BASE_SHARE)
        spans = [np.arange(size) for size in sizes]
        self._heads = np.concatenate(
            [start + span for start, span in zip(self._starts, spans, strict=True)]
        )
        self._tails = np.concatenate(
            [stop - 1 - span for stop, span in zip(stops, spans, strict=True)]
        )
        self._sizes = sizes
        self._size_starts = np.cumsum(sizes) - sizes
        self._lengths = lengths
        self._along = np.concatenate([np.linspace(0.0, 1.0, n) for n in lengths])

    def less_base(
        self, turned: npt.NDArray[np.complex128]
    ) -> npt.NDArray[np.complex128]:
        """Values less the straight line through the ends of each region."""
        heads = np.add.reduceat(turned[self._heads], self._size_starts) / self._sizes
        tails = np.add.reduceat(turned[self._tails], self._size_starts) / self._sizes
        first = np.repeat(heads, self._lengths)
        slopes = np.repeat(tails - heads, self._lengths)
        return np.asarray(turned - first - slopes * self._along)

    def value_and_slope(
        self, angles_rad: npt.NDArray[np.float64]
    ) -> tuple[float, npt.NDArray[np.float64]]:
        """Cost at (constant, slope) and its gradient."""
        turned = self._values * np.exp(1j * (angles_rad[0] + angles_rad[1] * self._x))
        flat = self.less_base(turned)
        below = -flat.real - self._noise_sd
        weights = np.where(below > 0, self._point_weights, 0.0)
        cost = float(weights @ below) + _SLOPE_PENALTY * angles_rad[1] ** 2
        # d(-R)/d angle = Im of the turned values, the base taken off likewise.
        sloped = self.less_base(turned * self._x)
        gradient = np.array(
            [
                weights @ flat.imag,
                weights @ sloped.imag + 2 * _SLOPE_PENALTY * angles_rad[1],
            ]
        )
        return cost, gradient

    def grid(
        self, constants: npt.NDArray[np.float64], slopes: npt.NDArray[np.float64]
    ) -> npt.NDArray[np.float64]:
        """Cost on a grid, shape (n_slopes, n_constants)."""
        costs = np.empty((slopes.size, constants.size))
        for row, slope in enumerate(slopes):
            flat = self.less_base(self._values * np.exp(1j * slope * self._x))
            for column, constant in enumerate(constants):
                real = flat.real * np.cos(constant) - flat.imag * np.sin(constant)
                below = np.maximum(-real - self._noise_sd, 0.0)
                costs[row, column] = self._point_weights @ below
            costs[row] += _SLOPE_PENALTY * slope**2
        return costs


def least_negative_area(
    cost: NegativeAreaCost, *, slope_rad: float | None = None
) -> PhaseFit:
    """Phase of least negative area, from a grid of starts over all phases.

    Parameters
    ----------
    cost : NegativeAreaCost
    slope_rad : float, rad, optional
        Hold the first-order phase at this value.
    """
    constants = np.arange(-np.pi, np.pi - 1e-9, _GRID_RAD, dtype=np.float64)
    slopes = np.arange(
        -_SLOPE_REACH_RAD, _SLOPE_REACH_RAD + 1e-9, _GRID_RAD, dtype=np.float64
    )
    if slope_rad is not None:
        slopes = np.array([slope_rad])
    grid = cost.grid(constants, slopes)
    order = np.argsort(grid, axis=None, kind="stable")[:_N_STARTS]
    starts = [
        np.array([constants[place % constants.size], slopes[place // constants.size]])
        for place in order
    ]
    free = np.array([1.0, 1.0 if slope_rad is None else 0.0])
    fits = [_descend(cost, start, free, _COARSE) for start in starts]
    best = min(fits, key=lambda fit: fit.cost)
    return _descend(cost, np.array([best.constant_rad, best.slope_rad]), free, _FINE)


def _descend(
    cost: NegativeAreaCost,
    start: npt.NDArray[np.float64],
    free: npt.NDArray[np.float64],
    tolerance: float,
) -> PhaseFit:
    """Minimum near a start; angles whose ``free`` is 0 stay where they are."""

    def cost_and_gradient(
        step: npt.NDArray[np.float64],
    ) -> tuple[float, npt.NDArray[np.float64]]:
        value, gradient = cost.value_and_slope(start + free * step)
        return value, free * gradient

    result = minimize(
        cost_and_gradient,
        np.zeros(2),
        jac=True,
        method="L-BFGS-B",
        options={"ftol": tolerance, "gtol": 1e-9},
    )
    angles = start + free * np.asarray(result.x)
    return PhaseFit(
        constant_rad=float(angles[0]),
        slope_rad=float(angles[1]),
        cost=float(result.fun),
    )


def _widened(regions: Regions, step_hz: float, n_points: int) -> list[tuple[int, int]]:
    """Regions with a margin, but not onto the lines of the next region.

    A base drawn through the ends would else stand on a neighbour's lines. Regions
    already hold a few Hz beyond their lines.
    """
    widen, intrude = int(_WIDEN_HZ / step_hz), int(_INTRUDE_HZ / step_hz)
    lows, highs = regions.starts - widen, regions.stops + widen
    lows[1:] = np.maximum(lows[1:], regions.stops[:-1] - intrude)
    highs[:-1] = np.minimum(highs[:-1], regions.starts[1:] + intrude)
    lows = np.minimum(np.maximum(lows, 0), regions.starts)
    highs = np.maximum(np.minimum(highs, n_points), regions.stops)
    return [(int(a), int(b)) for a, b in zip(lows, highs, strict=True)]


def _averaged(
    values: npt.NDArray[np.complex128],
    positions: npt.NDArray[np.float64],
    start: int,
    stop: int,
) -> tuple[npt.NDArray[np.complex128], npt.NDArray[np.float64]]:
    stop = min(stop, values.size)
    size = max(1, (stop - start) // _MOST_POINTS)
    count = (stop - start) // size
    piece = slice(start, start + count * size)
    return (
        values[piece].reshape(count, size).mean(axis=1),
        positions[piece].reshape(count, size).mean(axis=1),
    )
