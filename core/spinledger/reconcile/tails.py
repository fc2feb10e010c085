"""Masks widened over the wings of tall solvent, water and reference lines.

Shifts in ppm, widths in Hz.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from spinledger.reconcile.coarse import MASKED_KINDS, FloatArray
from spinledger.reconcile.windows import boxcar, points_of_hz
from spinledger.values.evidence import Evidence, Stray

SMOOTHING_HZ = 3.0
# Wings of suppressed water reach far; those of other lines do not.
REACH_PPM = {"water": 0.9, "solvent": 0.08, "reference": 0.08}
NOISE_LEVELS = 5.0
RISE = 1.25


def with_tails(evidence: Evidence) -> Evidence:
    """Evidence whose masked strays reach as far as their wings fall.

    From each edge of a stray the mask follows the smoothed intensity while it
    falls and stands clear of the noise; it ends at the last minimum before
    anything rises.
    """
    spectrum = evidence.spectrum
    half = points_of_hz(spectrum, SMOOTHING_HZ)
    smooth = boxcar(spectrum.intensities, half)
    noise = evidence.noise_sd / float(np.sqrt(2 * half + 1))
    strays = tuple(
        _widened(stray, evidence, smooth, noise)
        if stray.kind in MASKED_KINDS
        else stray
        for stray in evidence.strays
    )
    return replace(evidence, strays=strays)


def _widened(
    stray: Stray, evidence: Evidence, smooth: FloatArray, noise: float
) -> Stray:
    spectrum = evidence.spectrum
    reach = max(1, round(REACH_PPM[stray.kind] / spectrum.step_ppm))
    window = spectrum.window(stray.low_ppm, stray.high_ppm)
    # Index 0 is the highest shift: leftwards is upwards.
    upward = smooth[max(0, window.start - reach) : window.start][::-1]
    downward = smooth[window.stop : window.stop + reach]
    up = _tail_length(upward, noise) * spectrum.step_ppm
    down = _tail_length(downward, noise) * spectrum.step_ppm
    return replace(stray, low_ppm=stray.low_ppm - down, high_ppm=stray.high_ppm + up)


def _tail_length(levels: FloatArray, noise: float) -> int:
    """Points over which levels fall towards the noise, from the mask outwards."""
    if levels.size == 0:
        return 0
    lowest = np.minimum.accumulate(levels)
    rises = levels > RISE * np.maximum(lowest, 0.0) + NOISE_LEVELS * noise
    ends = levels < NOISE_LEVELS * noise
    stop = int(np.argmax(rises | ends)) if (rises | ends).any() else levels.size
    if stop == 0:
        return 0
    return int(np.argmin(levels[:stop])) + 1 if stop < levels.size else stop
