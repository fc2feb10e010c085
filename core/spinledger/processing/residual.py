"""Recognising the solvent by its residual line; shifts in ppm, splittings in Hz."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.lines.clusters import Clusters
from spinledger.lines.picking import Picks
from spinledger.processing.solvents import ResidualLine, quintet_solvents
from spinledger.processing.standard import satellite_shares
from spinledger.values.spectrum import Spectrum

# Half of 1J(CH) of chloroform, 209 Hz; that of an aromatic CH is about 160 Hz.
CHLOROFORM_SATELLITE_HZ = 104.5
_CHLOROFORM_PPM = 7.26
_CHLOROFORM_LOW_PPM, _CHLOROFORM_HIGH_PPM = 7.1, 7.45
_NEAR_HZ = 12.0
_NEAR_SHARE = 0.12
_WIDEST_HZ = 2.6
_QUINTET_RATIOS = (1 / 3, 2 / 3, 2 / 3, 1 / 3)
_QUINTET_PLACES = (-2, -1, 1, 2)
_QUINTET_WINDOW_PPM = (1.5, 4.2)
_QUINTET_SPLITTINGS_HZ = np.arange(1.5, 2.75, 0.05)
_QUINTET_LINE_HZ = 0.18
_QUINTET_LEAST_SD = 15.0
QUINTET_MOST = 0.45


@dataclass(frozen=True, slots=True, kw_only=True)
class Chloroform:
    """A singlet that may be CHCl3; ``satellites`` are shares at -+104.5 Hz."""

    point: float
    shift_ppm: float
    signal_to_noise: float
    neighbour_share: float
    satellites: tuple[float, float]

    @property
    def is_proven(self) -> bool:
        """Both carbon satellites of 1J 209 Hz are seen, 0.2 to 1.2 %."""
        return all(0.002 < share < 0.012 for share in self.satellites)

    @property
    def is_clean(self) -> bool:
        """Nothing taller than 12 % stands within 12 Hz."""
        return self.neighbour_share < _NEAR_SHARE


@dataclass(frozen=True, slots=True, kw_only=True)
class Quintet:
    """A 1:2:3:2:1 pattern as a CD2H group gives it.

    ``figure`` adds up the ratio error, what stands just outside, and the scatter
    of the positions; true ones are below 0.45.
    """

    point: float
    shift_ppm: float
    splitting_hz: float
    figure: float
    signal_to_noise: float


def chloroform_candidates(
    spectrum: Spectrum, clusters: Clusters, *, offset_ppm: float = 0.0
) -> tuple[Chloroform, ...]:
    """Singlets near 7.26 ppm, the most CHCl3-like first.

    Parameters
    ----------
    spectrum : Spectrum
    clusters : Clusters
    offset_ppm : float, ppm
        What the axis as it stands lacks to the true one, as far as it is known.
    """
    shifts = spectrum.first_point_ppm - spectrum.step_ppm * clusters.points
    true_shifts = shifts + offset_ppm
    chosen = np.flatnonzero(
        (true_shifts > _CHLOROFORM_LOW_PPM)
        & (true_shifts < _CHLOROFORM_HIGH_PPM)
        & (clusters.widths_hz < _WIDEST_HZ)
        & (clusters.sums > 10 * clusters.noise_sd)
    )
    found = []
    for index in chosen.tolist():
        apart_hz = (shifts - shifts[index]) * spectrum.spectrometer_frequency_mhz
        near = (np.abs(apart_hz) < _NEAR_HZ) & (np.abs(apart_hz) > 0.1)
        found.append(
            Chloroform(
                point=float(clusters.points[index]),
                shift_ppm=float(shifts[index]),
                signal_to_noise=float(clusters.sums[index] / clusters.noise_sd),
                neighbour_share=float(
                    clusters.sums[near].max(initial=0.0) / clusters.sums[index]
                ),
                satellites=satellite_shares(
                    clusters, apart_hz, index, CHLOROFORM_SATELLITE_HZ, 2.0
                ),
            )
        )
    return tuple(
        sorted(
            found,
            key=lambda one: (not one.is_proven, not one.is_clean, -one.signal_to_noise),
        )
    )


def quintets(spectrum: Spectrum, picks: Picks) -> tuple[Quintet, ...]:
    """1:2:3:2:1 patterns between 1.5 and 4.2 ppm, best figure first."""
    shifts = spectrum.first_point_ppm - spectrum.step_ppm * picks.points
    hz = shifts * spectrum.spectrometer_frequency_mhz
    low, high = _QUINTET_WINDOW_PPM
    chosen = np.flatnonzero(
        (shifts > low)
        & (shifts < high)
        & (picks.heights > _QUINTET_LEAST_SD * picks.noise_sd)
    )
    found = []
    for index in chosen:
        # Picks run from high to low shift.
        near = slice(
            int(np.searchsorted(-hz, -hz[index] - 12.0)),
            int(np.searchsorted(-hz, -hz[index] + 12.0)),
        )
        best = _best_comb(
            hz[near] - hz[index], picks.heights[near] / picks.heights[index]
        )
        if best is not None:
            found.append(
                Quintet(
                    point=float(picks.points[index]),
                    shift_ppm=float(shifts[index]),
                    splitting_hz=best[0],
                    figure=best[1],
                    signal_to_noise=float(picks.heights[index] / picks.noise_sd),
                )
            )
    return tuple(sorted(found, key=lambda one: one.figure))


def _best_comb(
    apart_hz: npt.NDArray[np.float64], shares: npt.NDArray[np.float64]
) -> tuple[float, float] | None:
    best: tuple[float, float] | None = None
    for splitting in _QUINTET_SPLITTINGS_HZ:
        figure = _comb_figure(apart_hz, shares, float(splitting))
        if figure is not None and (best is None or figure < best[1]):
            best = (float(splitting), figure)
    return best


def _comb_figure(
    apart_hz: npt.NDArray[np.float64], shares: npt.NDArray[np.float64], splitting: float
) -> float | None:
    ratio_error, misses = 0.0, []
    for place, ratio in zip(_QUINTET_PLACES, _QUINTET_RATIOS, strict=True):
        there = np.flatnonzero(np.abs(apart_hz - place * splitting) < _QUINTET_LINE_HZ)
        if there.size == 0:
            return None
        tallest = there[np.argmax(shares[there])]
        ratio_error = max(ratio_error, abs(float(shares[tallest]) - ratio))
        misses.append(float(apart_hz[tallest]) - place * splitting)
    distance = np.abs(apart_hz)
    outside = (distance > 2.45 * splitting) & (distance < 4 * splitting)
    return ratio_error + float(shares[outside].max(initial=0.0)) + float(np.std(misses))


def solvent_of_quintet(
    quintet: Quintet, *, offset_ppm: float, offset_sd_ppm: float
) -> ResidualLine | None:
    """Solvent whose CD2H line has this place and splitting, or None.

    Parameters
    ----------
    quintet : Quintet
    offset_ppm, offset_sd_ppm : float, ppm
        What the axis lacks, and how sure that is.
    """
    best, best_cost = None, 9.0
    for line in quintet_solvents():
        place = (quintet.shift_ppm + offset_ppm - line.shift_ppm) / offset_sd_ppm
        # Splittings are tabulated to 0.1 Hz and read to about 0.15 Hz.
        splitting = (quintet.splitting_hz - (line.j_hd_hz or 0.0)) / 0.25
        cost = place**2 + splitting**2
        if cost < best_cost:
            best, best_cost = line, cost
    return best


def chloroform_line() -> float:
    """Shift of CHCl3 in CDCl3, ppm."""
    return _CHLOROFORM_PPM
