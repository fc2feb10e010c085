"""Signal regions of an unphased spectrum, with water told apart; shifts in ppm."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.lines.derivative import curvature_magnitude, points_per_degree
from spinledger.lines.noise import quiet_rms
from spinledger.lines.regions import Regions, find_regions
from spinledger.processing.recipe import Transformed

_WATER_PPM = (4.55, 5.0)
_CARRIER_MARGIN_PPM = 0.1
_LINE_SIGMA_HZ = 0.4
_LINE_SD = 8.0


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class FoundRegions:
    """Regions that hold lines, and those kept clear of: water, and tails without."""

    kept: Regions
    dropped: Regions


def found_regions(transformed: Transformed, *, water_at_carrier: bool) -> FoundRegions:
    """Signal regions of an unphased spectrum, with and without water."""
    values, step_hz = transformed.values, transformed.step_hz
    weighed = _away_from_water(transformed) if water_at_carrier else None
    regions = find_regions(values, step_hz=step_hz, weighed=weighed)
    usable = _with_lines(values, regions, step_hz)
    if water_at_carrier:
        dry = usable & ~_at_water(transformed, regions)
        usable = dry if dry.any() else usable
    return FoundRegions(kept=regions.select(usable), dropped=regions.select(~usable))


def _away_from_water(transformed: Transformed) -> npt.NDArray[np.bool_]:
    """Points beyond the reach of water's own lines, shape (n_points,)."""
    n_points = transformed.values.size
    step_ppm = transformed.step_hz / transformed.spectrometer_frequency_mhz
    index = np.arange(n_points)
    shifts = transformed.first_point_ppm - step_ppm * index
    carrier = (n_points + 1) // 2 - 1
    near = np.abs(index - carrier) * step_ppm < 2 * _CARRIER_MARGIN_PPM
    return np.asarray(~near & ((shifts < _WATER_PPM[0]) | (shifts > _WATER_PPM[1])))


def _with_lines(
    values: npt.NDArray[np.complex128], regions: Regions, step_hz: float
) -> npt.NDArray[np.bool_]:
    curvature = curvature_magnitude(values, step_hz=step_hz, sigma_hz=_LINE_SIGMA_HZ)
    covered = points_per_degree(step_hz, _LINE_SIGMA_HZ) / 2
    noise = quiet_rms(curvature, points_per_degree=covered) / math.sqrt(2)
    threshold = _LINE_SD * noise
    return np.array(
        [
            curvature[start:stop].max() > threshold
            for start, stop in zip(regions.starts, regions.stops, strict=True)
        ],
        dtype=np.bool_,
    )


def _at_water(transformed: Transformed, regions: Regions) -> npt.NDArray[np.bool_]:
    n_points = transformed.values.size
    step_ppm = transformed.step_hz / transformed.spectrometer_frequency_mhz
    first = transformed.first_point_ppm
    carrier = (n_points + 1) // 2 - 1
    margin = _CARRIER_MARGIN_PPM / step_ppm
    over_carrier = (regions.starts - margin < carrier) & (
        regions.stops + margin > carrier
    )
    peaks_ppm = first - step_ppm * regions.peaks
    in_window = (peaks_ppm > _WATER_PPM[0]) & (peaks_ppm < _WATER_PPM[1])
    return np.asarray(over_carrier | in_window)
