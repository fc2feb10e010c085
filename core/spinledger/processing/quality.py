"""How far a processed spectrum is to be trusted, in figures and in words."""

from __future__ import annotations

import math

import numpy as np

from spinledger.lines.noise import EDGE_SHARE, noise_sd
from spinledger.lines.regions import find_regions
from spinledger.processing.automatic_window import LINE_BROADENING_HZ
from spinledger.processing.recipe import find_step
from spinledger.values.acquisition import Acquired, Fid
from spinledger.values.recipe import Apodize, Recipe
from spinledger.values.spectrum import Spectrum

_CLEAR_HZ = 150.0
# Claims are looked for between these shifts.
_LOW_PPM, _HIGH_PPM = -0.2, 10.0
_CLIPPED_SAMPLES = 6
_CLIPPED_SHARE = 1 - 1e-6


def acquisition_doubts(
    acquired: Acquired, recipe: Recipe, spectrum: Spectrum
) -> tuple[str, ...]:
    """One sentence for each thing that was wrong before processing began."""
    doubts = []
    if isinstance(acquired, Fid):
        window = find_step(recipe, Apodize)
        broadening_hz = window.line_broadening_hz if window else 0.0
        if broadening_hz > LINE_BROADENING_HZ:
            doubts.append(
                f"The FID was cut short after {acquired.acquisition_time_s:.2f} s; "
                f"lines were broadened by {broadening_hz:.1f} Hz to hide it."
            )
        if is_clipped(acquired):
            doubts.append(
                "The receiver was overloaded: the FID is clipped, so intensities "
                "are wrong and false lines may show."
            )
    edge_ppm = EDGE_SHARE * spectrum.n_points * spectrum.step_ppm
    low, high = spectrum.last_point_ppm + edge_ppm, spectrum.first_point_ppm - edge_ppm
    if low > _LOW_PPM or high < _HIGH_PPM:
        doubts.append(
            f"The sweep only covers {high:z.1f} to {low:z.1f} ppm; signals outside "
            "are missing or folded in."
        )
    return tuple(doubts)


def is_clipped(fid: Fid) -> bool:
    """Whether the largest sample value is met again and again.

    A decaying signal meets its largest value once; a receiver that overflows
    writes the same full-scale number many times.
    """
    samples = fid.samples[math.ceil(fid.group_delay_points) :]
    parts = np.abs(np.concatenate([samples.real, samples.imag]))
    top = float(parts.max(initial=0.0))
    return top > 0 and int(np.sum(parts >= _CLIPPED_SHARE * top)) >= _CLIPPED_SAMPLES


def baseline_roughness(spectrum: Spectrum) -> float:
    """Spread of the signal-free stretches in noise sd; 1 is flat."""
    sd = noise_sd(spectrum.intensities)
    if sd == 0:
        return 1.0
    regions = find_regions(spectrum.intensities, step_hz=spectrum.step_hz)
    taken = regions.mask(spectrum.n_points, int(_CLEAR_HZ / spectrum.step_hz))
    edge = int(EDGE_SHARE * spectrum.n_points)
    taken[:edge] = True
    taken[spectrum.n_points - edge :] = True
    free = spectrum.intensities[~taken]
    if free.size < 2:
        return 1.0
    return float(1.4826 * np.median(np.abs(free)) / sd)
