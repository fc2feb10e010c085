"""Smoothed second derivative of a spectrum; frequencies in Hz."""

from __future__ import annotations

from typing import TypeVar

import numpy as np
import numpy.typing as npt
import scipy.fft

Values = TypeVar("Values", npt.NDArray[np.float64], npt.NDArray[np.complex128])


def negative_second_derivative(
    values: npt.NDArray[np.float64], *, step_hz: float, sigma_hz: float
) -> npt.NDArray[np.float64]:
    """Minus the second derivative, smoothed by a Gaussian; lines become sharp maxima.

    Parameters
    ----------
    values : numpy.ndarray, shape (n_points,)
        Real spectrum.
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
    times_s = scipy.fft.rfftfreq(n_points, d=step_hz)
    half = np.asarray(scipy.fft.rfft(values)) * _window(times_s, sigma_hz)
    return np.asarray(scipy.fft.irfft(half, n_points))


def complex_second_derivative(
    values: npt.NDArray[np.complex128], *, step_hz: float, sigma_hz: float
) -> npt.NDArray[np.complex128]:
    """The same of a complex spectrum, shape (n_points,)."""
    times_s = scipy.fft.fftfreq(values.size, d=step_hz)
    echo = np.asarray(scipy.fft.ifft(values)) * _window(times_s, sigma_hz)
    return np.asarray(scipy.fft.fft(echo))


def curvature_magnitude(
    values: npt.NDArray[np.float64] | npt.NDArray[np.complex128],
    *,
    step_hz: float,
    sigma_hz: float,
) -> npt.NDArray[np.float64]:
    """Magnitude of the smoothed second derivative of a real or complex spectrum."""
    if np.iscomplexobj(values):
        return np.abs(
            complex_second_derivative(
                values.astype(np.complex128, copy=False),
                step_hz=step_hz,
                sigma_hz=sigma_hz,
            )
        )
    return np.abs(
        negative_second_derivative(
            values.real.astype(np.float64, copy=False),
            step_hz=step_hz,
            sigma_hz=sigma_hz,
        )
    )


def points_per_degree(step_hz: float, sigma_hz: float) -> float:
    """Points that one degree of freedom of noise covers in the second derivative.

    Notes
    -----
    The filter's power is x^4 exp(-x^2) with x = 2 pi sigma t; its effective length
    (int P)^2 / int P^2 = 1.718 in x, and a real trace has two degrees of freedom
    for every positive time bin.
    """
    return max(1.0, np.pi * sigma_hz / (1.718 * step_hz))


def _window(
    times_s: npt.NDArray[np.float64], sigma_hz: float
) -> npt.NDArray[np.float64]:
    squared = (2 * np.pi * sigma_hz * times_s) ** 2
    return squared * np.exp(-0.5 * squared)
