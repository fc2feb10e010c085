"""Checks that every reader runs on its numbers before they become a value."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from spinledger.errors import SpectrumFormatError
from spinledger.io.limits import check_point_count
from spinledger.values.spectrum import Spectrum

# Of the declared points; below that a FID is refused, above it is used as it is.
_LEAST_SHARE = 0.5
# Correlation of the imaginary part with the Hilbert transform of the real one
# below which the two do not belong together.
_LEAST_CORRELATION = 0.1


def as_floats(numbers: npt.NDArray[Any]) -> npt.NDArray[np.float64]:
    """Real numbers as float64; odd NaN patterns in damaged files pass silently."""
    with np.errstate(invalid="ignore", over="ignore"):
        return numbers.astype(np.float64)


def scaled(
    values: npt.NDArray[np.float64], factor: float | None
) -> npt.NDArray[np.float64]:
    """Values times a factor of the header (1 if None); overflow is told later."""
    if factor is None:
        return values
    with np.errstate(over="ignore", invalid="ignore"):
        return values * factor


def complex_from_parts(
    real: npt.NDArray[np.float64], imaginary: npt.NDArray[np.float64]
) -> npt.NDArray[np.complex128]:
    """Complex numbers from two parts, cut to the shorter one.

    Put together without arithmetic: damaged files hold NaN, which is told later.
    """
    n_both = min(real.size, imaginary.size)
    joined = np.empty(n_both, dtype=np.complex128)
    joined.real, joined.imag = real[:n_both], imaginary[:n_both]
    return joined


def check_fid_samples(
    path: Path, samples: npt.NDArray[np.complexfloating], n_declared: int | None
) -> tuple[npt.NDArray[np.complex128], tuple[str, ...]]:
    """Samples of a FID fit for use, and one note for each thing mended.

    Parameters
    ----------
    path : pathlib.Path
        For the error message.
    samples : numpy.ndarray, shape (n_points,), complex
        As they stand in the file.
    n_declared : int or None
        Number of complex points that the header declares.

    Raises
    ------
    SpectrumFormatError
        If values are not finite, all are zero, or less than half is there.
    """
    notes: list[str] = []
    n_there = samples.size
    if n_declared is not None and n_there < n_declared:
        if n_there < _LEAST_SHARE * n_declared:
            raise SpectrumFormatError(path, _cut_short(n_there, n_declared, "FID"))
        notes.append(
            f"The FID is cut short: {n_there} of {n_declared} points are there."
        )
    owned = samples[:n_declared].astype(np.complex128)
    _check_finite(path, owned)
    last = np.flatnonzero(owned)
    if last.size == 0:
        raise SpectrumFormatError(
            path, "holds a FID of zeros only; no signal was acquired, so run it again"
        )
    kept = int(last[-1]) + 1
    # A few zeros end many files; a long run is padding that says nothing.
    if owned.size - kept > max(16, owned.size // 100):
        notes.append(
            f"The last {owned.size - kept} points of the FID are zeros and were cut."
        )
        owned = owned[:kept]
    check_point_count(path, owned.size)
    return owned, tuple(notes)


def _cut_short(n_there: int, n_declared: int, what: str) -> str:
    return (
        f"holds only {n_there} of the {n_declared} points that its {what} should "
        "have; copy the data from the spectrometer again"
    )


def _check_finite(path: Path, values: npt.NDArray[np.complexfloating]) -> None:
    # 1e150: squares and sums over all points must stay finite as well.
    with np.errstate(invalid="ignore", over="ignore"):
        is_fit = bool(np.all(np.abs(values.real) < 1e150)) and bool(
            np.all(np.abs(values.imag) < 1e150)
        )
    if not is_fit:
        raise SpectrumFormatError(
            path,
            "holds points that are not finite numbers; the file is damaged, "
            "so copy or export it again",
        )


def check_width(path: Path, spectral_width_hz: float | None) -> float:
    """Spectral width if it is one that a proton spectrum can have, Hz.

    Raises
    ------
    SpectrumFormatError
        If it is missing or outside 10 Hz to 10 MHz.
    """
    if spectral_width_hz is None:
        raise SpectrumFormatError(
            path, "does not state its spectral width; export it with all parameters"
        )
    if not 10 <= spectral_width_hz <= 1e7:
        raise SpectrumFormatError(
            path,
            f"states a spectral width of {spectral_width_hz:.6g} Hz, which no proton "
            "spectrum has; the header is damaged, so export it again",
        )
    return spectral_width_hz


def check_frequency(path: Path, spectrometer_frequency_mhz: float | None) -> float:
    """Spectrometer frequency if it is one that exists, MHz.

    Raises
    ------
    SpectrumFormatError
        If it is missing or outside 5 to 2000 MHz.
    """
    if spectrometer_frequency_mhz is None:
        raise SpectrumFormatError(
            path,
            "does not state the spectrometer frequency; export it with all parameters",
        )
    if not 5 <= spectrometer_frequency_mhz <= 2000:
        raise SpectrumFormatError(
            path,
            f"states a spectrometer frequency of {spectrometer_frequency_mhz:.6g} MHz, "
            "which no spectrometer has; the header is damaged, so export it again",
        )
    return spectrometer_frequency_mhz


def plausible_carrier(carrier_ppm: float | None) -> float | None:
    """Carrier if it lies where protons can be, ppm, else None."""
    return carrier_ppm if carrier_ppm is not None and abs(carrier_ppm) < 500 else None


def make_spectrum(
    path: Path,
    real: npt.NDArray[np.float64],
    *,
    imaginary: npt.NDArray[np.float64] | None,
    first_point_ppm: float,
    step_hz: float,
    spectrometer_frequency_mhz: float,
) -> Spectrum:
    """Spectrum from checked numbers, highest shift first.

    Parameters
    ----------
    real, imaginary : numpy.ndarray, shape (n_points,)
        In the order of the file.
    first_point_ppm : float, ppm
        Shift of the first point in the order of the file.
    step_hz : float, Hz
        From each point to the next; negative where the shift falls.

    Raises
    ------
    SpectrumFormatError
        If values are not finite, all are equal, or the axis is impossible.
    """
    n_points = check_point_count(path, real.size)
    if imaginary is not None and imaginary.size != n_points:
        imaginary = None
    dispersive = np.zeros_like(real) if imaginary is None else imaginary
    _check_finite(path, complex_from_parts(real, dispersive))
    if np.ptp(real) == 0:
        raise SpectrumFormatError(
            path, "holds a spectrum without any signal; process or export it again"
        )
    width_hz = check_width(path, abs(step_hz) * n_points)
    if not abs(first_point_ppm) < 1e4:
        raise SpectrumFormatError(
            path, "has an impossible shift axis; export it again with its reference"
        )
    if step_hz > 0:
        last_ppm = first_point_ppm + step_hz / spectrometer_frequency_mhz * (
            n_points - 1
        )
        real, first_point_ppm = real[::-1], last_ppm
        imaginary = None if imaginary is None else imaginary[::-1]
    return Spectrum(
        intensities=real,
        imaginary=_oriented(real, imaginary),
        first_point_ppm=first_point_ppm,
        spectral_width_hz=width_hz,
        spectrometer_frequency_mhz=spectrometer_frequency_mhz,
    )


def _oriented(
    real: npt.NDArray[np.float64], imaginary: npt.NDArray[np.float64] | None
) -> npt.NDArray[np.float64] | None:
    """Imaginary part in the sign that a forward FFT of the FID gives, or None.

    Makers differ in that sign. A causal FID fixes it: the imaginary part is the
    Hilbert transform of the real one, so their correlation tells.
    """
    if imaginary is None:
        return None
    quadrature = hilbert_of_descending(real)
    scale = float(np.linalg.norm(quadrature) * np.linalg.norm(imaginary))
    correlation = float(quadrature @ imaginary) / scale if scale > 0 else 0.0
    if abs(correlation) < _LEAST_CORRELATION:
        return None
    return imaginary if correlation > 0 else -imaginary


def hilbert_of_descending(
    real: npt.NDArray[np.float64],
) -> npt.NDArray[np.float64]:
    """Imaginary part that belongs to a real spectrum in descending order.

    Notes
    -----
    The FID is zero before t = 0. The inverse transform of the real part alone is
    half the FID plus its mirror image; dropping the mirror half and going back
    gives the pair.
    """
    n_points = real.size
    time = np.fft.ifft(real[::-1])
    keep = np.zeros(n_points)
    keep[0] = 1.0
    keep[1 : (n_points + 1) // 2] = 2.0
    if n_points % 2 == 0:
        keep[n_points // 2] = 1.0
    return np.ascontiguousarray(np.fft.fft(time * keep).imag[::-1])
