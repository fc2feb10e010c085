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
_AROMATIC_SATELLITE_HZ = 80.0
CHLOROFORM_PPM = 7.26
_CHLOROFORM_LOW_PPM, _CHLOROFORM_HIGH_PPM = 7.1, 7.45
_NEAR_HZ = 12.0
_NEAR_SHARE = 0.2
_LEAST_SATELLITE = 0.002
# A residual line is small beside the solute; above this S/N satellites show.
_LARGEST_SIZE = 0.3
_SATELLITES_SEEN = 5000.0
_WIDEST_HZ = 2.6
# Solvents that are rarely met, or that show other residual lines besides.
_RARITY = {"toluene-d8": -4.0, "CD3CO2D": -4.0, "DMF-d7": -4.0}
_QUINTET_RATIOS = (1 / 3, 2 / 3, 2 / 3, 1 / 3)
# Outer to inner lines: 1/2 in 1:2:3:2:1, 1/4 in the 1:4:6:4:1 of four equal protons;
# a second derivative reads 0.3 to 0.5, and 0.07 to 0.22.
_LEAST_OUTER = 0.26
_QUINTET_PLACES = (-2, -1, 1, 2)
_QUINTET_WINDOW_PPM = (1.5, 4.2)
_QUINTET_SPLITTINGS_HZ = np.arange(1.5, 2.75, 0.05)
_QUINTET_LINE_HZ = 0.18
_QUINTET_LEAST_SD = 15.0
_QUINTET_MOST = 0.45


@dataclass(frozen=True, slots=True, kw_only=True)
class Chloroform:
    """A singlet that may be CHCl3.

    Attributes
    ----------
    point, shift_ppm : float
        Fractional point index, and shift on the axis as it stands.
    signal_to_noise : float
    size : float
        Height as a share of the tallest line of the spectrum.
    neighbour_share : float
        Tallest line within 12 Hz, as a share of this one.
    satellites, aromatic_satellites : tuple of (float, float)
        Lines at -+104.5 Hz (1J of CHCl3) and at -+80 Hz (1J of an aromatic CH),
        as shares of this one.
    """

    point: float
    shift_ppm: float
    signal_to_noise: float
    size: float
    neighbour_share: float
    satellites: tuple[float, float]
    aromatic_satellites: tuple[float, float]

    @property
    def is_proven(self) -> bool:
        """Both carbon satellites of 1J 209 Hz are seen, 0.2 to 1.2 %."""
        return all(_LEAST_SATELLITE < share < 0.012 for share in self.satellites)

    @property
    def is_likely(self) -> bool:
        """A lone, small line near 7.26 ppm that its satellites do not disprove."""
        if self.neighbour_share > _NEAR_SHARE or self.size > _LARGEST_SIZE:
            return False
        if self.signal_to_noise > _SATELLITES_SEEN:
            return self.is_proven
        is_aromatic = all(
            share > _LEAST_SATELLITE for share in self.aromatic_satellites
        )
        return not is_aromatic or max(self.aromatic_satellites) > 0.05


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
    spectrum: Spectrum,
    clusters: Clusters,
    *,
    offset_ppm: float = 0.0,
    reach_ppm: float = 0.0,
) -> tuple[Chloroform, ...]:
    """Singlets near 7.26 ppm, the most CHCl3-like first.

    Parameters
    ----------
    spectrum : Spectrum
    clusters : Clusters
    offset_ppm : float, ppm
        What the axis as it stands lacks to the true one, as far as it is known.
    reach_ppm : float, ppm
        How much wider than 7.1 to 7.45 ppm is searched.
    """
    shifts = spectrum.first_point_ppm - spectrum.step_ppm * clusters.points
    true_shifts = shifts + offset_ppm
    chosen = np.flatnonzero(
        (true_shifts > _CHLOROFORM_LOW_PPM - reach_ppm)
        & (true_shifts < _CHLOROFORM_HIGH_PPM + reach_ppm)
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
                size=float(clusters.sums[index] / clusters.sums.max()),
                neighbour_share=float(
                    clusters.sums[near].max(initial=0.0) / clusters.sums[index]
                ),
                satellites=satellite_shares(
                    clusters, apart_hz, index, CHLOROFORM_SATELLITE_HZ, 2.0
                ),
                aromatic_satellites=satellite_shares(
                    clusters, apart_hz, index, _AROMATIC_SATELLITE_HZ, 4.0
                ),
            )
        )
    return tuple(
        sorted(
            found,
            key=lambda one: (
                not one.is_proven,
                not one.is_likely,
                abs(one.shift_ppm + offset_ppm - CHLOROFORM_PPM),
            ),
        )
    )


def quintets(
    spectrum: Spectrum, picks: Picks, *, offset_ppm: float = 0.0, reach_ppm: float = 0.0
) -> tuple[Quintet, ...]:
    """1:2:3:2:1 patterns with a figure below 0.45, the strongest first.

    Parameters
    ----------
    spectrum : Spectrum
    picks : Picks
    offset_ppm : float, ppm
        What the axis as it stands lacks to the true one, as far as it is known.
    reach_ppm : float, ppm
        How much wider than 1.5 to 4.2 ppm is searched.
    """
    shifts = spectrum.first_point_ppm - spectrum.step_ppm * picks.points
    hz = shifts * spectrum.spectrometer_frequency_mhz
    low, high = _QUINTET_WINDOW_PPM
    chosen = np.flatnonzero(
        (shifts + offset_ppm > low - reach_ppm)
        & (shifts + offset_ppm < high + reach_ppm)
        & (picks.heights > _QUINTET_LEAST_SD * picks.noise_sd)
    )
    found = []
    for index in chosen.tolist():
        # Picks run from high to low shift.
        near = slice(
            int(np.searchsorted(-hz, -hz[index] - 12.0)),
            int(np.searchsorted(-hz, -hz[index] + 12.0)),
        )
        best = _best_comb(
            hz[near] - hz[index], picks.heights[near] / picks.heights[index]
        )
        if best is not None and best[1] < _QUINTET_MOST:
            found.append(
                Quintet(
                    point=float(picks.points[index]),
                    shift_ppm=float(shifts[index]),
                    splitting_hz=best[0],
                    figure=best[1],
                    signal_to_noise=float(picks.heights[index] / picks.noise_sd),
                )
            )
    return tuple(sorted(found, key=lambda one: -one.signal_to_noise))


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
    """Figure of a comb with one splitting; None where a line is missing."""
    seen, misses = [], []
    for place in _QUINTET_PLACES:
        there = np.flatnonzero(np.abs(apart_hz - place * splitting) < _QUINTET_LINE_HZ)
        if there.size == 0:
            return None
        tallest = there[np.argmax(shares[there])]
        seen.append(float(shares[tallest]))
        misses.append(float(apart_hz[tallest]) - place * splitting)
    far_low, near_low, near_high, far_high = seen
    if far_low + far_high < _LEAST_OUTER * (near_low + near_high):
        return None
    ratio_error = float(np.abs(np.array(seen) - _QUINTET_RATIOS).max())
    distance = np.abs(apart_hz)
    outside = (distance > 2.45 * splitting) & (distance < 4 * splitting)
    return ratio_error + float(shares[outside].max(initial=0.0)) + float(np.std(misses))


def solvent_of_quintet(
    quintet: Quintet, *, offset_ppm: float, offset_sd_ppm: float, favoured: str | None
) -> ResidualLine | None:
    """Solvent whose CD2H line has this place and splitting, or None.

    Parameters
    ----------
    quintet : Quintet
    offset_ppm, offset_sd_ppm : float, ppm
        What the axis lacks, and how sure that is.
    favoured : str or None
        Solvent that user or header name; it wins among those that are possible.
    """
    costs = []
    for line in quintet_solvents():
        place = (quintet.shift_ppm + offset_ppm - line.shift_ppm) / offset_sd_ppm
        # Splittings are tabulated to 0.1 Hz and read to about 0.15 Hz.
        splitting = (quintet.splitting_hz - (line.j_hd_hz or 0.0)) / 0.25
        bonus = 5.0 if line.solvent == favoured else _RARITY.get(line.solvent, 0.0)
        if place**2 + splitting**2 < 9.0:
            costs.append((place**2 + splitting**2 - bonus, line))
    return min(costs, key=lambda pair: pair[0])[1] if costs else None
