"""Noise of a spectrum from its signal-free stretches, in the units of the data."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

N_BLOCKS = 64
EDGE_SHARE = 0.03
QUIET_SHARE = 0.1


def quiet_rms(
    values: npt.NDArray[np.float64] | npt.NDArray[np.complex128],
    *,
    edge_share: float = EDGE_SHARE,
    n_blocks: int = N_BLOCKS,
) -> float:
    """Root mean square of the quiet blocks of a trace that is flat by itself.

    Parameters
    ----------
    values : numpy.ndarray, shape (n_points,)
        A second derivative or another trace without baseline. For complex values
        the result is that of one of the two channels.
    edge_share : float
        Share of the points left out at each end (filter edges).
    n_blocks : int
        Blocks into which the rest is cut.

    Returns
    -------
    float
        The 10 % quantile of the blocks' rms, so that up to nine tenths of the
        sweep may hold signals.
    """
    blocks = _blocks(values, edge_share, n_blocks)
    power = np.mean(np.abs(blocks) ** 2, axis=1)
    if np.iscomplexobj(values):
        power = power / 2
    return float(np.quantile(np.sqrt(power), QUIET_SHARE))


def noise_sd(
    values: npt.NDArray[np.float64] | npt.NDArray[np.complex128],
    *,
    edge_share: float = EDGE_SHARE,
    n_blocks: int = N_BLOCKS,
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
    blocks = _blocks(values, edge_share, n_blocks)
    length = blocks.shape[1]
    powers = np.vander(np.linspace(-1.0, 1.0, length), 4)
    orthonormal = np.linalg.qr(powers)[0]
    residual = blocks - (blocks @ orthonormal) @ orthonormal.T
    freedom = max(length - 4, 1)
    power = np.sum(np.abs(residual) ** 2, axis=1) / freedom
    if np.iscomplexobj(values):
        power = power / 2
    return float(np.quantile(np.sqrt(power), QUIET_SHARE))


def _blocks(
    values: npt.NDArray[np.float64] | npt.NDArray[np.complex128],
    edge_share: float,
    n_blocks: int,
) -> npt.NDArray[np.float64] | npt.NDArray[np.complex128]:
    edge = int(values.size * edge_share)
    inner = values[edge : values.size - edge]
    length = max(inner.size // n_blocks, 1)
    count = inner.size // length
    return inner[: count * length].reshape(count, length)


def quiet_correlation(values: npt.NDArray[np.float64]) -> float:
    """Sum of the noise's autocorrelation over all lags, 1 or more.

    Parameters
    ----------
    values : numpy.ndarray, shape (n_points,)
        Real spectrum.
    """
    blocks = _blocks(values, EDGE_SHARE, N_BLOCKS)
    length = blocks.shape[1]
    powers = np.vander(np.linspace(-1.0, 1.0, length), 4)
    orthonormal = np.linalg.qr(powers)[0]
    residual = blocks - (blocks @ orthonormal) @ orthonormal.T
    power = np.mean(residual**2, axis=1)
    quietest = residual[np.argsort(power, kind="stable")[: max(1, N_BLOCKS // 10)]]
    variance = float(np.mean(quietest**2))
    if variance == 0:
        return 1.0
    total = 1.0
    for lag in range(1, min(12, length // 4)):
        share = float(np.mean(quietest[:, lag:] * quietest[:, :-lag])) / variance
        if share < 0.05:
            break
        total += 2 * share
    return total
