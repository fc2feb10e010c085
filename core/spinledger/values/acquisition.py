"""What a spectrometer wrote: a FID or the maker's own spectrum, with its facts.

Frequencies in MHz or Hz, shifts in ppm, times in s; unknown is None, never a
made-up default.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.values.arrays import locked_complex
from spinledger.values.spectrum import Spectrum


@dataclass(frozen=True, slots=True, kw_only=True)
class Metadata:
    """Facts about one acquisition, in one spelling for all makers.

    Attributes
    ----------
    source_name : str
        Name of the file or dataset folder, never a path.
    sha256 : str
        Of the file; of a folder over sorted relative paths and bytes.
    format_name : str
        In the user's words: "Bruker folder", "JCAMP-DX FID", ...
    nucleus : str
        "1H" for everything this program can use.
    spectrometer_frequency_mhz : float, MHz
        Frequency that 0 ppm corresponds to, as far as the header tells.
    solvent : str or None
        As in the table of solvents where the name is known, else as written.
    temperature_k : float or None, K
    n_scans : int or None
    pulse_program : str or None
    pulse_length_us, pulse_angle_deg : float or None
    relaxation_delay_s : float or None, s
    acquired_on : str or None
        ISO 8601 date.
    title : str or None
    notes : tuple of str
        One sentence for each oddity the reader met and mended.
    """

    source_name: str
    sha256: str
    format_name: str
    nucleus: str
    spectrometer_frequency_mhz: float
    solvent: str | None = None
    temperature_k: float | None = None
    n_scans: int | None = None
    pulse_program: str | None = None
    pulse_length_us: float | None = None
    pulse_angle_deg: float | None = None
    relaxation_delay_s: float | None = None
    acquired_on: str | None = None
    title: str | None = None
    notes: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        if not self.spectrometer_frequency_mhz > 0:
            raise ValueError(
                "spectrometer_frequency_mhz must be > 0, "
                f"got {self.spectrometer_frequency_mhz!r}"
            )


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Fid:
    """A free induction decay in one frequency sense.

    Attributes
    ----------
    metadata : Metadata
    samples : numpy.ndarray, shape (n_points,), complex, arbitrary units
        In the sense that a forward FFT puts higher shifts at higher frequency
        (a line at carrier + f Hz rotates as exp(+2 pi i f t)). Copied, locked.
    spectral_width_hz : float, Hz
        Complex sampling rate; dwell time is its inverse.
    carrier_ppm : float or None, ppm
        Shift of zero frequency by the header; None if the file does not say.
    group_delay_points : float
        Digital-filter delay at the start of the samples, may be fractional.
    """

    metadata: Metadata
    samples: npt.NDArray[np.complex128]
    spectral_width_hz: float
    carrier_ppm: float | None
    group_delay_points: float = 0.0

    def __post_init__(self) -> None:
        if not self.spectral_width_hz > 0:
            raise ValueError(
                f"spectral_width_hz must be > 0, got {self.spectral_width_hz!r}"
            )
        object.__setattr__(self, "samples", locked_complex(self.samples, "samples"))

    @property
    def acquisition_time_s(self) -> float:
        """Length of the FID without the digital-filter delay, s."""
        return (self.samples.size - self.group_delay_points) / self.spectral_width_hz


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class MakerSpectrum:
    """A spectrum that came processed: by the maker's program or as JCAMP-DX."""

    metadata: Metadata
    spectrum: Spectrum


Acquired = Fid | MakerSpectrum
