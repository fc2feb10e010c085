"""Search for the line of TMS, DSS or TSP; shifts in ppm, distances in Hz."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.lines.clusters import Clusters
from spinledger.values.spectrum import Spectrum

# Half of 1J(CH) of Si-CH3, 118 Hz, and of 2J(SiH), 6.6 Hz.
CARBON_SATELLITE_HZ = 59.0
SILICON_SATELLITE_HZ = 3.3
# The CH2 groups of DSS from its methyl line: SiCH2, CCH2C, CH2S.
DSS_CHAIN_PPM = (0.625, 1.755, 2.91)
_CHAIN_SHARE = 2 / 9
_WINDOW_PPM = 0.6
_NEAR_HZ = 12.0
_NEAR_SHARE = 0.12
_WIDEST_HZ = 2.6
_UPFIELD_REACH_PPM = 3.0


@dataclass(frozen=True, slots=True, kw_only=True)
class StandardCandidate:
    """A line that may be the standard's.

    Attributes
    ----------
    point : float
        Fractional point index of the line.
    shift_ppm : float, ppm
        On the axis as it stands.
    score : float
        log10 of the signal-to-noise, plus and minus what speaks for and against.
    signal_to_noise : float
    has_dss_chain : bool
        Two or more of the three CH2 signals of DSS stand at their places.
    carbon_satellites : tuple of (float, float)
        Heights at -59 and +59 Hz as a share of the line.
    has_carbon_satellites : bool
        Both are between 0.25 and 1.2 %.
    """

    point: float
    shift_ppm: float
    score: float
    signal_to_noise: float
    has_dss_chain: bool
    carbon_satellites: tuple[float, float]
    has_carbon_satellites: bool


def standard_candidates(
    spectrum: Spectrum,
    clusters: Clusters,
    *,
    centre_ppm: float = 0.0,
    reach_ppm: float = 0.0,
) -> tuple[StandardCandidate, ...]:
    """Lines that may be the standard's, best first.

    Parameters
    ----------
    spectrum : Spectrum
        Phased and flat.
    clusters : Clusters
        Its lines.
    centre_ppm : float, ppm
        Where zero is expected on the axis as it stands; 0.6 ppm about it are
        searched.
    reach_ppm : float, ppm
        How much wider than that is searched.
    """
    shifts = spectrum.first_point_ppm - spectrum.step_ppm * clusters.points
    chosen = np.flatnonzero(
        (np.abs(shifts - centre_ppm) < _WINDOW_PPM + reach_ppm)
        & (clusters.widths_hz < _WIDEST_HZ)
    )
    offsets_hz = shifts * spectrum.spectrometer_frequency_mhz
    found = [
        _candidate(spectrum, clusters, shifts, offsets_hz - offsets_hz[index], index)
        for index in chosen.tolist()
        if _stands_alone(clusters, offsets_hz - offsets_hz[index], index)
    ]
    best = sorted(found, key=lambda candidate: -candidate.score)
    return tuple(_without_own_satellites(best, spectrum))


def _stands_alone(
    clusters: Clusters, apart_hz: npt.NDArray[np.float64], index: int
) -> bool:
    distance = np.abs(apart_hz)
    near = (
        (distance < _NEAR_HZ)
        & (distance > 0.1)
        & (np.abs(distance - SILICON_SATELLITE_HZ) > 0.8)
    )
    return bool(
        clusters.sums[near].max(initial=0.0) <= _NEAR_SHARE * clusters.sums[index]
    )


def _candidate(
    spectrum: Spectrum,
    clusters: Clusters,
    shifts: npt.NDArray[np.float64],
    apart_hz: npt.NDArray[np.float64],
    index: int,
) -> StandardCandidate:
    size = clusters.sums[index]
    upfield = (
        (apart_hz < -_NEAR_HZ)
        & (np.abs(apart_hz + CARBON_SATELLITE_HZ) > 4)
        & (apart_hz > -_UPFIELD_REACH_PPM * spectrum.spectrometer_frequency_mhz)
    )
    upfield_share = float(clusters.sums[upfield].max(initial=0.0) / size)
    satellites = satellite_shares(clusters, apart_hz, index, CARBON_SATELLITE_HZ, 2.5)
    has_satellites = all(0.0025 < share < 0.012 for share in satellites)
    has_chain = _has_dss_chain(spectrum, shifts, float(shifts[index]))
    signal_to_noise = float(size / clusters.noise_sd)
    score = (
        math.log10(signal_to_noise)
        + 1.5 * has_chain
        + 0.7 * has_satellites
        - 2.0 * (upfield_share > 0.3)
        - 0.5 * (upfield_share > 0.05)
    )
    return StandardCandidate(
        point=float(clusters.points[index]),
        shift_ppm=float(shifts[index]),
        score=score,
        signal_to_noise=signal_to_noise,
        has_dss_chain=has_chain,
        carbon_satellites=satellites,
        has_carbon_satellites=has_satellites,
    )


def satellite_shares(
    clusters: Clusters,
    apart_hz: npt.NDArray[np.float64],
    index: int,
    distance_hz: float,
    tolerance_hz: float,
) -> tuple[float, float]:
    """Heights of the lines at -distance and +distance, as shares of one line."""
    shares = []
    for place in (-distance_hz, distance_hz):
        there = np.abs(apart_hz - place) < tolerance_hz
        shares.append(
            float(clusters.sums[there].max(initial=0.0) / clusters.sums[index])
        )
    return shares[0], shares[1]


def _has_dss_chain(
    spectrum: Spectrum, shifts: npt.NDArray[np.float64], zero_ppm: float
) -> bool:
    """Whether two of the three CH2 signals hold about 2/9 of the methyl area."""
    methyl = _area(spectrum, zero_ppm - 0.02, zero_ppm + 0.02)
    if methyl <= 0:
        return False
    half_ppm = 0.035 + 8 / spectrum.spectrometer_frequency_mhz
    seen = 0
    for chain_ppm in DSS_CHAIN_PPM:
        centre = zero_ppm + chain_ppm
        share = _area(spectrum, centre - half_ppm, centre + half_ppm) / methyl
        has_line = bool(np.any(np.abs(shifts - centre) < half_ppm))
        seen += has_line and 0.4 < share / _CHAIN_SHARE < 2.2
    return seen >= 2


def _area(spectrum: Spectrum, low_ppm: float, high_ppm: float) -> float:
    """Sum over a straight base through the medians of the ends."""
    piece = spectrum.intensities[spectrum.window(low_ppm, high_ppm)]
    if piece.size < 12:
        return 0.0
    ends = max(3, piece.size // 8)
    base = np.linspace(np.median(piece[:ends]), np.median(piece[-ends:]), piece.size)
    return float(np.sum(piece - base))


def _without_own_satellites(
    best: list[StandardCandidate], spectrum: Spectrum
) -> list[StandardCandidate]:
    """Drop candidates that are a carbon satellite of a stronger one."""
    frequency = spectrum.spectrometer_frequency_mhz
    return [
        candidate
        for candidate in best
        if not any(
            other.signal_to_noise > 20 * candidate.signal_to_noise
            and abs(abs(candidate.shift_ppm - other.shift_ppm) * frequency - 59.0) < 3
            for other in best
        )
    ]
