"""From the FID to the complex spectrum: window, zero filling, FFT, delay removal.

Times in s, frequencies in Hz; spectra run from the highest shift to the lowest.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt
import scipy.fft

from spinledger.processing.phase import linear_phasor
from spinledger.values.acquisition import Fid
from spinledger.values.recipe import Apodize

# A Gaussian decay exp(-a t^2) gives a line of FWHM w when a = (pi w)^2 / (4 ln 2).
_FOUR_LN_2 = 4 * math.log(2)


def apodization_window(
    step: Apodize, times_s: npt.NDArray[np.float64], *, length_s: float
) -> npt.NDArray[np.float64]:
    """Window by which the FID is multiplied.

    Parameters
    ----------
    step : Apodize
    times_s : numpy.ndarray, shape (n_points,), s
        Counted from the end of the digital-filter delay; negative before it,
        where the window is held at its value for time zero.
    length_s : float, s
        Time of the last point, to which a sine bell is stretched.

    Raises
    ------
    ValueError
        If the kind of window is unknown.

    Notes
    -----
    exponential: exp(-pi LB t). gaussian: exp(-(pi GB t)^2 / (4 ln 2)).
    lorentz_to_gauss: both factors, with LB negative to take a Lorentzian width
    off and GB the Gaussian width put on. sine_bell:
    sin(offset + (pi - offset) t / length)^power.

    References
    ----------
    .. [1] R. R. Ernst, Adv. Magn. Reson. 2 (1966) 1-135,
       doi:10.1016/B978-1-4832-3114-3.50006-X (from memory).
    .. [2] A. G. Ferrige, J. C. Lindon, J. Magn. Reson. 31 (1978) 337-340,
       doi:10.1016/0022-2364(78)90196-4 (from memory).
    """
    since = np.maximum(times_s, 0.0)
    exponential = np.exp(-np.pi * step.line_broadening_hz * since)
    gaussian = np.exp(-((np.pi * step.gaussian_hz * since) ** 2) / _FOUR_LN_2)
    if step.kind == "exponential":
        return exponential
    if step.kind == "gaussian":
        return gaussian
    if step.kind == "lorentz_to_gauss":
        return exponential * gaussian
    if step.kind == "sine_bell":
        start = math.radians(step.sine_offset_deg)
        angles = start + (np.pi - start) * np.minimum(since / length_s, 1.0)
        return np.asarray(np.maximum(np.sin(angles), 0.0) ** step.sine_power)
    if step.kind == "none":
        return np.ones_like(since)
    raise ValueError(f"kind: unknown window {step.kind!r}")


def apodized(
    fid: Fid, step: Apodize | None, *, group_delay_points: float
) -> npt.NDArray[np.complex128]:
    """Samples of a FID times the window of one step."""
    if step is None or step.kind == "none":
        return fid.samples
    points = np.arange(fid.samples.size, dtype=np.float64) - group_delay_points
    times_s = points / fid.spectral_width_hz
    return fid.samples * apodization_window(step, times_s, length_s=float(times_s[-1]))


def fourier_transform(
    samples: npt.NDArray[np.complex128],
    *,
    n_points: int,
    halve_first_point: bool,
    group_delay_points: float = 0.0,
) -> npt.NDArray[np.complex128]:
    """Complex spectrum, highest shift first, of samples filled with zeros.

    Parameters
    ----------
    samples : numpy.ndarray, shape (n_samples,), complex
    n_points : int
        Points of the spectrum; samples beyond it are cut off.
    halve_first_point : bool
        Take half of the first sample, the trapezoidal rule's end point.
    group_delay_points : float
        Delay taken out as a first-order phase, fraction included.

    Returns
    -------
    numpy.ndarray, shape (n_points,), complex
        Point j stands at carrier + (1/2 - (j + 1)/n) widths, for even n.

    References
    ----------
    .. [1] G. Otting, H. Widmer, G. Wagner, K. Wuthrich, J. Magn. Reson. 66 (1986)
       187-193, doi:10.1016/0022-2364(86)90122-4: the first point (from memory).
    """
    filled = np.zeros(n_points, dtype=np.complex128)
    n_used = min(samples.size, n_points)
    filled[:n_used] = samples[:n_used]
    if halve_first_point:
        filled[0] *= 0.5
    ascending = scipy.fft.fftshift(scipy.fft.fft(filled, overwrite_x=True))
    descending = np.ascontiguousarray(ascending[::-1])
    if group_delay_points:
        descending *= linear_phasor(n_points, 0.0, 2 * np.pi * group_delay_points)
    return descending
