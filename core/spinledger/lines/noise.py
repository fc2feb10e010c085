"""Noise of a spectrum from its signal-free stretches, in the units of the data."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

N_BLOCKS = 64
EDGE_SHARE = 0.03
QUIET_SHARE = 0.1
_QUIET_DEVIATE = -1.2816  # normal deviate of the 10 % quantile
_LONGEST_LAG = 16

Trace = npt.NDArray[np.float64] | npt.NDArray[np.complex128]


def quiet_rms(
    values: Trace,
    *,
    points_per_degree: float = 1.0,
    edge_share: float = EDGE_SHARE,
    n_blocks: int = N_BLOCKS,
) -> float:
    """Root mean square of the quiet blocks of a trace that is flat by itself.

    Parameters
    ----------
    values : numpy.ndarray, shape (n_points,)
        A second derivative or another trace without baseline. For complex values
        the result is that of one of the two channels.
    points_per_degree : float
        Points that one degree of freedom of the noise covers (smoothing).
    edge_share : float
        Share of the points left out at each end (filter edges).
    n_blocks : int
        Blocks into which the rest is cut.

    Returns
    -------
    float
        From the 10 % quantile of the blocks' rms, so that up to nine tenths of
        the sweep may hold signals, put right for what a low quantile misses.
    """
    blocks = _blocks(values, edge_share, n_blocks)
    power = np.mean(np.abs(blocks) ** 2, axis=1)
    degrees = blocks.shape[1] / points_per_degree
    if np.iscomplexobj(values):
        power, degrees = power / 2, degrees * 2
    return float(np.sqrt(np.quantile(power, QUIET_SHARE) / _low_quantile(degrees)))


def noise_sd(
    values: Trace, *, edge_share: float = EDGE_SHARE, n_blocks: int = N_BLOCKS
) -> float:
    """Standard deviation of one point in the signal-free stretches.

    Parameters
    ----------
    values : numpy.ndarray, shape (n_points,)
        Spectrum, real or complex (then: sd of one channel).
    edge_share : float
        Share of the points left out at each end.
    n_blocks : int
        Blocks; a cubic is taken out of each so that a rolling baseline and the
        tails of strong lines do not count as noise.
    """
    residual = _without_cubic(_blocks(values, edge_share, n_blocks))
    power = np.mean(np.abs(residual) ** 2, axis=1)
    points_per_degree = _sum_of_squares(_autocorrelation(residual, power))
    degrees = max(residual.shape[1] / points_per_degree - 4.0, 1.0)
    power = power * residual.shape[1] / (degrees * points_per_degree)
    if np.iscomplexobj(values):
        power, degrees = power / 2, degrees * 2
    return float(np.sqrt(np.quantile(power, QUIET_SHARE) / _low_quantile(degrees)))


def quiet_correlation(values: npt.NDArray[np.float64]) -> float:
    """Sum of the noise's autocorrelation over all lags, both ways.

    Parameters
    ----------
    values : numpy.ndarray, shape (n_points,)
        Real spectrum.

    Returns
    -------
    float
        Factor by which the variance of a sum over many points is larger than for
        independent points.
    """
    residual = _without_cubic(_blocks(values, EDGE_SHARE, N_BLOCKS))
    power = np.mean(residual**2, axis=1)
    total = 1.0
    for share in _autocorrelation(residual, power).tolist():
        if share < 0.05:
            break
        total += 2 * share
    return total


def _blocks(values: Trace, edge_share: float, n_blocks: int) -> Trace:
    edge = int(values.size * edge_share)
    inner = values[edge : values.size - edge]
    length = max(inner.size // n_blocks, 1)
    count = inner.size // length
    return inner[: count * length].reshape(count, length)


def _without_cubic(blocks: Trace) -> Trace:
    powers = np.vander(np.linspace(-1.0, 1.0, blocks.shape[1]), 4)
    orthonormal = np.linalg.qr(powers)[0]
    return np.asarray(blocks - (blocks @ orthonormal) @ orthonormal.T)


def _autocorrelation(
    residual: Trace, power: npt.NDArray[np.float64]
) -> npt.NDArray[np.float64]:
    """Autocorrelation at lags 1, 2, ... in the quietest tenth of the blocks."""
    n_quiet = max(1, residual.shape[0] // 10)
    quiet = residual[np.argsort(power, kind="stable")[:n_quiet]]
    variance = float(np.mean(np.abs(quiet) ** 2))
    longest = min(_LONGEST_LAG, quiet.shape[1] // 4)
    if variance == 0 or longest < 1:
        return np.zeros(1)
    return np.array(
        [
            float(np.mean((quiet[:, lag:] * np.conj(quiet[:, :-lag])).real)) / variance
            for lag in range(1, longest + 1)
        ]
    )


def _sum_of_squares(correlations: npt.NDArray[np.float64]) -> float:
    """1 + 2 sum rho^2: points per degree of freedom of a mean square."""
    return 1.0 + 2 * float(np.sum(np.square(correlations)))


def _low_quantile(degrees: float) -> float:
    """10 % quantile of chi square over its degrees of freedom.

    Notes
    -----
    (1 - 2/(9 n) + z sqrt(2/(9 n)))^3.

    References
    ----------
    .. [1] E. B. Wilson, M. M. Hilferty, Proc. Natl. Acad. Sci. 17 (1931) 684-688,
       doi:10.1073/pnas.17.12.684.
    """
    share = 2 / (9 * max(degrees, 1.0))
    return max(1 - share + _QUIET_DEVIATE * math.sqrt(share), 0.1) ** 3
