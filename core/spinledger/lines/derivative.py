"""Smoothed second derivative of a spectrum; frequencies in Hz."""

from __future__ import annotations

from typing import TypeVar

import numpy as np
import numpy.typing as npt
import scipy.fft

Values = TypeVar("Values", npt.NDArray[np.float64], npt.NDArray[np.complex128])


def negative_second_derivative(
    values: Values, *, step_hz: float, sigma_hz: float
) -> Values:
    """Minus the second derivative, smoothed by a Gaussian; lines become sharp maxima.

    Parameters
    ----------
    values : numpy.ndarray, shape (n_points,), real or complex
    step_hz : float, Hz
        Distance of neighbouring points.
    sigma_hz : float, Hz
        Standard deviation of the Gaussian.

    Returns
    -------
    numpy.ndarray, shape (n_points,)
        -sigma^2 d^2/df^2 (values * Gaussian): the units of the data. A constant
        and a slope vanish, 1/f tails of far lines nearly so.

    Notes
    -----
    The product in the time domain: window (2 pi sigma t)^2 exp(-(2 pi sigma t)^2 / 2)
    on the inverse transform. Two transforms, whatever the width of the Gaussian.
    """
    n_points = values.size
    if np.iscomplexobj(values):
        times_s = scipy.fft.fftfreq(n_points, d=step_hz)
        echo = scipy.fft.ifft(values)
        echo *= _window(times_s, sigma_hz)
        return scipy.fft.fft(echo, overwrite_x=True)
    times_s = scipy.fft.rfftfreq(n_points, d=step_hz)
    half = scipy.fft.rfft(values)
    half *= _window(times_s, sigma_hz)
    return scipy.fft.irfft(half, n_points, overwrite_x=True)


def _window(
    times_s: npt.NDArray[np.float64], sigma_hz: float
) -> npt.NDArray[np.float64]:
    squared = (2 * np.pi * sigma_hz * times_s) ** 2
    return squared * np.exp(-0.5 * squared)
