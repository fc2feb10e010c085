"""Window and zero filling chosen by the FID; widths in Hz, times in s."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt
import scipy.fft

from spinledger.values.acquisition import Fid

_LEAST_POINTS = 1 << 16
_MOST_POINTS = 1 << 17
LINE_BROADENING_HZ = 0.3
_TRUNCATION_SHARE = 0.003
_COHERENT_FACTOR = 20.0


def automatic_size(fid: Fid) -> int:
    """Points of the spectrum: twice the FID or more, a power of two.

    65,536 at least, so that lines are drawn finely; 131,072 at most, unless the
    FID itself is longer.
    """
    n_samples = fid.samples.size
    doubled = 1 << math.ceil(math.log2(2 * n_samples))
    single = 1 << math.ceil(math.log2(n_samples))
    return max(min(max(doubled, _LEAST_POINTS), _MOST_POINTS), single)


def automatic_line_broadening(fid: Fid) -> float:
    """Line broadening that ends a FID which was cut short, else 0.3 Hz.

    Notes
    -----
    Where the last eighth still holds a coherent signal (its largest Fourier
    component over 20 times the median), LB = ln(r/0.003)/(pi AQ) with r the ratio
    of the last to the first rms, so that the step at the end is below 0.3 %.
    """
    samples = fid.samples[math.ceil(fid.group_delay_points) :]
    if samples.size < 64:
        return LINE_BROADENING_HZ
    tail = samples[-samples.size // 8 :]
    # Without the zero-frequency bin: a receiver's offset is no signal.
    components = np.abs(scipy.fft.fft(tail))[1:]
    if components.max() <= _COHERENT_FACTOR * np.median(components):
        return LINE_BROADENING_HZ
    ends = max(1, samples.size * 3 // 100)
    ratio = _rms(samples[-ends:]) / _rms(samples[:ends])
    needed = math.log(max(ratio, 1e-12) / _TRUNCATION_SHARE) / (
        math.pi * fid.acquisition_time_s
    )
    return max(LINE_BROADENING_HZ, round(needed, 2))


def resolution_hz(fid: Fid, line_broadening_hz: float) -> float:
    """Width that window and length of a FID put on every line, Hz."""
    return max(line_broadening_hz, 0.0) + 1 / fid.acquisition_time_s


def _rms(values: npt.NDArray[np.complex128]) -> float:
    return float(np.sqrt(np.mean(np.abs(values) ** 2)))
