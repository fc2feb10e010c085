"""Spectra whose lines are known: spin systems, noise, overlap; Hz and protons."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.spins.engine import simulate
from spinledger.values.acquisition import Fid, Metadata
from spinledger.values.spin_system import SpinSystem

FIELD_MHZ = 600.0
WIDTH_HZ = 9600.0
N_SAMPLES = 16384
CARRIER_PPM = 4.7
LINE_WIDTH_HZ = 1.0
SIGNAL_TO_NOISE = (5.0, 10.0, 30.0, 100.0, 1000.0)
OVERLAPS_HZ = (None, 40.0, 9.0)
LINE_BROADENING_HZ = 0.3


@dataclass(frozen=True, kw_only=True)
class Known:
    """A synthetic FID with what is in it.

    ``signal_to_noise`` is that of the tallest line in the transformed spectrum.
    """

    name: str
    fid: Fid
    frequencies_hz: npt.NDArray[np.float64]
    protons: npt.NDArray[np.float64]
    noise_sd: float
    signal_to_noise: float
    overlap_hz: float | None


def spin_systems() -> dict[str, SpinSystem]:
    """Ten systems, frequencies from their own centre in Hz."""
    return {
        "singlet": _system([3], [0.0], {}),
        "AX": _system([1, 1], [0.0, 900.0], {(0, 1): 7.2}),
        "ethyl": _system([3, 2], [0.0, 1700.0], {(0, 1): 7.1}),
        "isopropyl": _system([6, 1], [0.0, 1000.0], {(0, 1): 6.9}),
        "AMX": _system(
            [1, 1, 1], [0.0, 160.0, 1100.0], {(0, 1): 17.2, (0, 2): 10.4, (1, 2): 1.9}
        ),
        "AB": _system([1, 1], [0.0, 25.0], {(0, 1): 12.1}),
        "ABX": _system(
            [1, 1, 1], [0.0, 42.0, 900.0], {(0, 1): -16.1, (0, 2): 8.8, (1, 2): 3.9}
        ),
        "AA'XX'": _system(
            [1, 1, 1, 1],
            [0.0, 0.0, 280.0, 280.0],
            {
                (0, 2): 8.5,
                (1, 3): 8.5,
                (0, 1): 2.4,
                (2, 3): 2.6,
                (0, 3): 0.4,
                (1, 2): 0.4,
            },
        ),
        "ring": _system(
            [1, 1, 1, 1, 1],
            [0.0, 300.0, 480.0, 900.0, 980.0],
            {(0, 1): 7.9, (1, 2): 9.4, (2, 3): 8.9, (3, 4): -12.3, (2, 4): 2.6},
        ),
        "butyl": _system(
            [3, 2, 2, 2],
            [0.0, 280.0, 420.0, 1500.0],
            {(0, 1): 7.4, (1, 2): 7.5, (2, 3): 6.7},
        ),
    }


def cases() -> Iterator[Known]:
    """Every system at every signal-to-noise, alone and with a second copy near."""
    rng = np.random.default_rng(20240)
    for name, system in spin_systems().items():
        lines = simulate(system, smallest=1e-3)
        protons = lines.intensities.sum(axis=0)
        for overlap_hz in OVERLAPS_HZ:
            frequencies, sizes = _placed(lines.frequencies_hz, protons, overlap_hz)
            for signal_to_noise in SIGNAL_TO_NOISE:
                yield _known(name, frequencies, sizes, signal_to_noise, overlap_hz, rng)


def _system(
    n_spins: list[int],
    frequencies: list[float],
    couplings: dict[tuple[int, int], float],
) -> SpinSystem:
    size = len(n_spins)
    table = np.zeros((size, size))
    for (a, b), j in couplings.items():
        table[a, b] = table[b, a] = j
    return SpinSystem(
        n_spins=np.array(n_spins),
        frequencies_hz=np.array(frequencies),
        couplings_hz=table,
        nuclei=("1H",) * size,
    )


def _placed(
    frequencies_hz: npt.NDArray[np.float64],
    protons: npt.NDArray[np.float64],
    overlap_hz: float | None,
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """On the sweep, off the grid points; a second copy shifted by the overlap."""
    first = frequencies_hz - frequencies_hz.mean() + 123.4567
    if overlap_hz is None:
        return first, protons
    return (
        np.concatenate([first, first + overlap_hz]),
        np.concatenate([protons, 0.7 * protons]),
    )


def decays(
    frequencies_hz: npt.NDArray[np.float64], protons: npt.NDArray[np.float64]
) -> npt.NDArray[np.complex128]:
    """Noise-free FID: every line a decaying exponential from time zero."""
    times = np.arange(N_SAMPLES) / WIDTH_HZ
    rates = 2j * np.pi * frequencies_hz - np.pi * LINE_WIDTH_HZ
    total = np.zeros(N_SAMPLES, dtype=np.complex128)
    for rate, size in zip(rates, protons, strict=True):
        total += size * np.exp(rate * times)
    return total


def tallest_height(
    frequencies_hz: npt.NDArray[np.float64], protons: npt.NDArray[np.float64]
) -> float:
    """Height of the tallest place of the spectrum, in units of sum over samples."""
    width = LINE_WIDTH_HZ + LINE_BROADENING_HZ
    half = width / 2
    apart = frequencies_hz[:, None] - frequencies_hz
    at_lines = (half**2 / (half**2 + apart**2)) @ protons
    return float(at_lines.max()) * WIDTH_HZ / (np.pi * width)


def _known(  # noqa: PLR0913 - a private step of cases
    name: str,
    frequencies_hz: npt.NDArray[np.float64],
    protons: npt.NDArray[np.float64],
    signal_to_noise: float,
    overlap_hz: float | None,
    rng: np.random.Generator,
) -> Known:
    clean = decays(frequencies_hz, protons)
    times = np.arange(N_SAMPLES) / WIDTH_HZ
    window_power = float(np.sum(np.exp(-2 * np.pi * LINE_BROADENING_HZ * times)))
    # sd of one channel of the spectrum = sd of one channel of the FID * sqrt(power).
    sd = tallest_height(frequencies_hz, protons) / signal_to_noise
    sd_fid = sd / np.sqrt(window_power)
    noise = rng.normal(size=N_SAMPLES) + 1j * rng.normal(size=N_SAMPLES)
    metadata = Metadata(
        source_name=name,
        sha256="",
        format_name="synthetic",
        nucleus="1H",
        spectrometer_frequency_mhz=FIELD_MHZ,
        solvent=None,
    )
    return Known(
        name=name,
        fid=Fid(
            metadata=metadata,
            samples=clean + sd_fid * noise,
            spectral_width_hz=WIDTH_HZ,
            carrier_ppm=CARRIER_PPM,
        ),
        frequencies_hz=frequencies_hz,
        protons=protons,
        noise_sd=sd_fid,
        signal_to_noise=signal_to_noise,
        overlap_hz=overlap_hz,
    )


def frequency_bound_hz(protons: float, noise_sd: float) -> float:
    """Cramer-Rao bound of a lone line's frequency, phase known, Hz.

    sigma / (2 pi A sqrt(sum t^2 exp(-2 pi w t))) with sigma the noise of one
    channel of the FID: the derivative by frequency is orthogonal to those by
    amplitude and width.
    """
    times = np.arange(N_SAMPLES) / WIDTH_HZ
    power = float(np.sum(times**2 * np.exp(-2 * np.pi * LINE_WIDTH_HZ * times)))
    return noise_sd / (2 * np.pi * protons * np.sqrt(power))
