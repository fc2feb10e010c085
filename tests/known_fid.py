"""FIDs and spectra in closed form, for tests that must know what is in them."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.values.acquisition import Fid, MakerSpectrum, Metadata
from spinledger.values.spectrum import Spectrum


@dataclass(frozen=True, kw_only=True)
class KnownLine:
    """One line: shift, area in protons, full width at half maximum."""

    shift_ppm: float
    area: float = 1.0
    width_hz: float = 1.0


@dataclass(frozen=True, kw_only=True)
class Setting:
    """Instrument settings of a made FID.

    ``noise_sd`` is that of one channel of one sample; ``phase0_deg`` and
    ``phase1_deg`` are put on the spectrum (first order over the sweep).
    """

    field_mhz: float = 500.0
    width_hz: float = 8000.0
    n_samples: int = 16384
    carrier_ppm: float = 5.0
    delay_points: float = 0.0
    noise_sd: float = 0.0
    phase0_deg: float = 0.0
    phase1_deg: float = 0.0
    seed: int = 1


def made_fid(
    lines: Sequence[KnownLine],
    setting: Setting | None = None,
    *,
    solvent: str | None = None,
    pulse_program: str | None = None,
) -> Fid:
    """A FID that is the sum of the lines' exact decays, and white noise.

    A first-order phase is put on as what it is: a start of sampling late by
    phase1 / (360 width) for every line.
    """
    place = setting or Setting()
    times = np.arange(place.n_samples) / place.width_hz
    late = times - place.delay_points / place.width_hz
    running = late >= 0
    samples = np.zeros(place.n_samples, dtype=np.complex128)
    for line in lines:
        offset_hz = (line.shift_ppm - place.carrier_ppm) * place.field_mhz
        phase_deg = place.phase0_deg + place.phase1_deg * offset_hz / place.width_hz
        rate = 2j * np.pi * offset_hz - np.pi * line.width_hz
        decay = np.exp(rate * np.maximum(late, 0.0)) * running
        samples += line.area * np.exp(1j * np.radians(phase_deg)) * decay
    rng = np.random.default_rng(place.seed)
    noise = rng.normal(size=(2, place.n_samples)) * place.noise_sd
    return Fid(
        metadata=metadata(
            place.field_mhz, solvent=solvent, pulse_program=pulse_program
        ),
        samples=samples + noise[0] + 1j * noise[1],
        spectral_width_hz=place.width_hz,
        carrier_ppm=place.carrier_ppm,
        group_delay_points=place.delay_points,
    )


def metadata(
    field_mhz: float = 500.0,
    *,
    solvent: str | None = None,
    pulse_program: str | None = None,
) -> Metadata:
    """Facts of a made acquisition."""
    return Metadata(
        source_name="made",
        sha256="",
        format_name="made",
        nucleus="1H",
        spectrometer_frequency_mhz=field_mhz,
        solvent=solvent,
        pulse_program=pulse_program,
    )


def made_spectrum(
    intensities: npt.ArrayLike,
    *,
    first_point_ppm: float = 12.0,
    width_hz: float = 8000.0,
    field_mhz: float = 500.0,
) -> Spectrum:
    """A real spectrum with given intensities."""
    return Spectrum(
        intensities=np.asarray(intensities, dtype=np.float64),
        first_point_ppm=first_point_ppm,
        spectral_width_hz=width_hz,
        spectrometer_frequency_mhz=field_mhz,
    )


def maker_spectrum(spectrum: Spectrum, *, solvent: str | None = None) -> MakerSpectrum:
    """The same as if a maker's program had written it."""
    return MakerSpectrum(
        metadata=metadata(spectrum.spectrometer_frequency_mhz, solvent=solvent),
        spectrum=spectrum,
    )


def multiplet(
    shift_ppm: float,
    couplings_hz: Sequence[float],
    *,
    area: float = 1.0,
    width_hz: float = 1.0,
    field_mhz: float = 500.0,
) -> list[KnownLine]:
    """First-order multiplet: every coupling halves and doubles the lines."""
    offsets = np.zeros(1)
    for coupling in couplings_hz:
        offsets = np.concatenate([offsets - coupling / 2, offsets + coupling / 2])
    places, counts = np.unique(np.round(offsets, 6), return_counts=True)
    return [
        KnownLine(
            shift_ppm=shift_ppm + place / field_mhz,
            area=area * count / offsets.size,
            width_hz=width_hz,
        )
        for place, count in zip(places.tolist(), counts.tolist(), strict=True)
    ]
