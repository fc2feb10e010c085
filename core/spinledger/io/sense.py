"""Which way round the frequencies of a FID run, told by the maker's own spectrum."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
import scipy.fft

from spinledger.values.acquisition import Fid
from spinledger.values.spectrum import Spectrum

SENSE_UNKNOWN = (
    "The file does not tell the sense of its frequencies; that of most exporters was "
    "taken, so if the spectrum looks mirrored, export it as a spectrum."
)

# Bins over the width; fewer where a FID or spectrum is short, so that none is empty.
_MOST_BINS = 4096
# The maker may have referenced the spectrum meanwhile: so far the axes may differ.
_REACH_PPM = 0.5
# Advantage in correlation that a mirror image must have to be believed.
_MARGIN = 0.1


@dataclass(frozen=True, slots=True, kw_only=True)
class Agreement:
    """How well a FID fits a spectrum, 1 at best.

    Attributes
    ----------
    as_read, mirrored : float
        Correlation of the log magnitudes for the FID as it is, and conjugated.
    """

    as_read: float
    mirrored: float

    @property
    def best(self) -> float:
        """The better of the two."""
        return max(self.as_read, self.mirrored)


def agreement(fid: Fid, spectrum: Spectrum) -> Agreement:
    """Agreement of a FID with the maker's spectrum in both senses.

    Logarithms of the magnitudes are correlated, so that the phase does not matter
    and a few strong lines do not decide alone. Measured on 43 acquired pairs:
    0.69 to 1.00 in the right sense, 0.25 to 1.01 better than the mirror image.
    """
    width_ppm = fid.spectral_width_hz / fid.metadata.spectrometer_frequency_mhz
    carrier_ppm = fid.carrier_ppm
    if carrier_ppm is None:  # the centre of the maker's axis is the best guess
        carrier_ppm = (spectrum.first_point_ppm + spectrum.last_point_ppm) / 2
    samples = fid.samples
    frame = _Frame(
        low_ppm=carrier_ppm - width_ppm / 2,
        width_ppm=width_ppm,
        n_bins=_bin_count(samples.size, width_ppm / spectrum.step_ppm),
    )
    target = _profile(spectrum.shifts_ppm, _magnitude(spectrum), frame)
    lines = np.abs(np.fft.fftshift(np.fft.fft(samples)))
    offsets_ppm = (np.arange(samples.size) / samples.size - 0.5) * width_ppm
    as_read = _profile(carrier_ppm + offsets_ppm, lines, frame)
    mirrored = _profile(carrier_ppm - offsets_ppm, lines, frame)
    reach = max(1, round(_REACH_PPM / width_ppm * frame.n_bins))
    reach = min(reach, frame.n_bins - 1)
    return Agreement(
        as_read=_best_match(as_read, target, reach),
        mirrored=_best_match(mirrored, target, reach),
    )


def is_mirrored(fid: Fid, spectrum: Spectrum) -> bool:
    """Whether the FID fits the maker's spectrum only after conjugation.

    False where neither sense fits clearly better.
    """
    found = agreement(fid, spectrum)
    return found.mirrored - found.as_read > _MARGIN


def in_sense_of(fid: Fid, spectrum: Spectrum) -> Fid:
    """FID turned to agree with the maker's spectrum, where that is clear.

    What the notes said about an unknown sense is settled by the spectrum.
    """
    notes = tuple(note for note in fid.metadata.notes if note != SENSE_UNKNOWN)
    settled = replace(fid, metadata=replace(fid.metadata, notes=notes))
    return conjugated(settled) if is_mirrored(settled, spectrum) else settled


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


@dataclass(frozen=True, slots=True, kw_only=True)
class _Frame:
    """Stretch of the shift axis cut into equal bins."""

    low_ppm: float
    width_ppm: float
    n_bins: int


def _bin_count(n_samples: int, n_points: float) -> int:
    return int(min(_MOST_BINS, max(16, min(n_samples, n_points) / 2)))


def _profile(
    shifts_ppm: npt.NDArray[np.float64],
    magnitudes: npt.NDArray[np.float64],
    frame: _Frame,
) -> npt.NDArray[np.float64]:
    """Log of the largest magnitude in each bin, mean taken off, unit norm."""
    places = (shifts_ppm - frame.low_ppm) / frame.width_ppm * frame.n_bins
    inside = (places >= 0) & (places < frame.n_bins)
    highest = np.zeros(frame.n_bins)
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
    size = scipy.fft.next_fast_len(target.size + profile.size, real=True)
    product = scipy.fft.rfft(target, size) * np.conj(scipy.fft.rfft(profile, size))
    # Offset k stands at index k, and negative ones count from the end.
    correlation = scipy.fft.irfft(product, size)
    return float(np.max(correlation[np.arange(-reach, reach + 1)]))
