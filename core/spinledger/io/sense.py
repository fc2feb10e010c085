"""Which way round the frequencies of a FID run, told by the maker's own spectrum."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
from scipy.signal import fftconvolve

from spinledger.values.acquisition import Fid
from spinledger.values.spectrum import Spectrum

_N_BINS = 4096
# The maker may have referenced the spectrum meanwhile: so far the axes may differ.
_REACH_PPM = 0.5
# Advantage in correlation that a mirror image must have to be believed.
_MARGIN = 0.1


def is_mirrored(fid: Fid, spectrum: Spectrum) -> bool:
    """Whether the FID fits the maker's spectrum only after conjugation.

    Logarithms of the magnitudes are correlated, so that the phase does not matter
    and a few strong lines do not decide alone. False where neither sense fits
    clearly better.
    """
    width_ppm = fid.spectral_width_hz / fid.metadata.spectrometer_frequency_mhz
    carrier_ppm = fid.carrier_ppm
    if carrier_ppm is None:  # the centre of the maker's axis is the best guess
        carrier_ppm = (spectrum.first_point_ppm + spectrum.last_point_ppm) / 2
    target = _profile(spectrum.shifts_ppm, _magnitude(spectrum), carrier_ppm, width_ppm)
    samples = fid.samples
    lines = np.abs(np.fft.fftshift(np.fft.fft(samples)))
    offsets_ppm = (np.arange(samples.size) / samples.size - 0.5) * width_ppm
    as_read = _profile(carrier_ppm + offsets_ppm, lines, carrier_ppm, width_ppm)
    mirrored = _profile(carrier_ppm - offsets_ppm, lines, carrier_ppm, width_ppm)
    reach = max(1, round(_REACH_PPM / width_ppm * _N_BINS))
    gain = _best_match(mirrored, target, reach) - _best_match(as_read, target, reach)
    return gain > _MARGIN


def conjugated(fid: Fid) -> Fid:
    """The same FID with its frequencies the other way round, and a note on it."""
    note = "The frequencies of the FID ran the other way round; it was conjugated."
    return replace(
        fid,
        samples=np.conj(fid.samples),
        metadata=replace(fid.metadata, notes=(*fid.metadata.notes, note)),
    )


def _magnitude(spectrum: Spectrum) -> npt.NDArray[np.float64]:
    if spectrum.imaginary is None:
        return np.abs(spectrum.intensities)
    return np.hypot(spectrum.intensities, spectrum.imaginary)


def _profile(
    shifts_ppm: npt.NDArray[np.float64],
    magnitudes: npt.NDArray[np.float64],
    centre_ppm: float,
    width_ppm: float,
) -> npt.NDArray[np.float64]:
    """Log of the largest magnitude in each bin, mean taken off, unit norm."""
    places = ((shifts_ppm - centre_ppm) / width_ppm + 0.5) * _N_BINS
    inside = (places >= 0) & (places < _N_BINS)
    highest = np.zeros(_N_BINS)
    np.maximum.at(highest, places[inside].astype(int), magnitudes[inside])
    filled = highest[highest > 0]
    if filled.size == 0:
        return highest
    profile = np.log(highest + np.median(filled))
    profile -= profile.mean()
    norm = float(np.linalg.norm(profile))
    return profile / norm if norm > 0 else profile


def _best_match(
    profile: npt.NDArray[np.float64], target: npt.NDArray[np.float64], reach: int
) -> float:
    """Highest correlation within some bins of offset."""
    correlation = fftconvolve(target, profile[::-1])
    middle = profile.size - 1
    return float(np.max(correlation[middle - reach : middle + reach + 1]))
