"""Automatic phase of a transformed FID with its quality figure; angles in deg."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.lines.noise import noise_sd
from spinledger.lines.regions import Regions
from spinledger.processing.found_regions import FoundRegions
from spinledger.processing.negative_area import (
    NegativeAreaCost,
    PhaseFit,
    least_negative_area,
)
from spinledger.processing.phase import linear_phasor, sweep_positions
from spinledger.processing.recipe import Transformed
from spinledger.processing.tail_phase import TailCorrection, tail_correction
from spinledger.values.recipe import Phase

_MOST_CONSTANT_RAD = math.radians(12.0)
_MOST_SLOPE_RAD = math.radians(40.0)
_DOUBTFUL_DEG = 3.0
_LEAST_SD_DEG = 1.0
# Measured on acquired spectra with noise put on, against the maker's phase.
_NOISE_FACTOR = 10.0
_FAR_WORDS = (
    "The phase far from the few signals it was found from is doubtful by about "
    "{:.0f} degrees."
)


@dataclass(frozen=True, slots=True, kw_only=True)
class AutomaticPhase:
    """A phase step with how far it is to be trusted.

    Attributes
    ----------
    step : Phase
    sd_deg : float, deg
        Estimated error in the worst region that holds lines.
    doubts : tuple of str
        One sentence for each thing that makes the phase doubtful.
    """

    step: Phase
    sd_deg: float
    doubts: tuple[str, ...]


def automatic_phase(
    transformed: Transformed, regions: FoundRegions
) -> AutomaticPhase | None:
    """Phase of least negative area, put right by the tails of the lines.

    Parameters
    ----------
    transformed : Transformed
        Complex spectrum, delay taken out.
    regions : FoundRegions

    Returns
    -------
    AutomaticPhase or None
        None where no signal region is found.
    """
    values, step_hz = transformed.values, transformed.step_hz
    if regions.kept.count == 0:
        return None
    sd = noise_sd(values)
    cost = NegativeAreaCost(values, regions.kept, step_hz=step_hz, noise_sd=sd)
    fit = least_negative_area(cost)
    turned = values * linear_phasor(values.size, fit.constant_rad, fit.slope_rad)
    tails = tail_correction(
        turned, regions.kept, dropped=regions.dropped, step_hz=step_hz
    )
    return _decided(values, regions, fit, tails, sd)


def _decided(
    values: npt.NDArray[np.complex128],
    regions: FoundRegions,
    fit: PhaseFit,
    tails: TailCorrection,
    sd: float,
) -> AutomaticPhase:
    kept = regions.kept
    x = sweep_positions(values.size)[kept.peaks]
    asked_deg = float(
        np.degrees(np.abs(tails.constant_rad + tails.slope_rad * x)).max()
    )
    refused = (
        abs(tails.constant_rad) > _MOST_CONSTANT_RAD
        or abs(tails.slope_rad) > _MOST_SLOPE_RAD
    )
    constant, slope = fit.constant_rad, fit.slope_rad
    if not refused:
        constant, slope = constant + tails.constant_rad, slope + tails.slope_rad
    far_deg = _far_sd_deg(regions, values.size)
    noise_deg = math.degrees(_worst_noise_rad(values, kept, x, sd))
    step = Phase(
        phase0_deg=math.degrees(math.remainder(constant, 2 * math.pi)),
        phase1_deg=math.degrees(slope),
    )
    return AutomaticPhase(
        step=step,
        sd_deg=math.hypot(max(_LEAST_SD_DEG, asked_deg), noise_deg, far_deg),
        doubts=(
            *_doubts(asked_deg, noise_deg, refused),
            *((_FAR_WORDS.format(far_deg),) if far_deg > _DOUBTFUL_DEG else ()),
        ),
    )


def _far_sd_deg(regions: FoundRegions, n_points: int) -> float:
    """Phase sd at the worst region that took no part, as water does not, deg.

    Notes
    -----
    A straight line through the kept regions, each with an error of 1 degree:
    sd^2 = 1/n + (x - mean)^2 / sum (x_k - mean)^2, where one region counts with
    its own width. Zero where every region took part.
    """
    if regions.dropped.count == 0:
        return 0.0
    x = sweep_positions(n_points)
    kept = x[regions.kept.peaks]
    widths = (regions.kept.stops - regions.kept.starts) / n_points
    spread = float(np.sum((kept - kept.mean()) ** 2) + np.sum(widths**2) / 12)
    apart = np.abs(x[regions.dropped.peaks] - kept.mean()).max()
    # A first-order phase is within about 180 degrees over the sweep.
    spread += (_LEAST_SD_DEG / 180.0) ** 2
    return _LEAST_SD_DEG * math.hypot(kept.size**-0.5, apart / math.sqrt(spread))


def _worst_noise_rad(
    values: npt.NDArray[np.complex128],
    kept: Regions,
    x: npt.NDArray[np.float64],
    sd: float,
) -> float:
    """Phase sd that the noise alone leaves in the worst region, rad.

    Notes
    -----
    The phase of one region is known to sd / sqrt(sum |S|^2) at best, the noise
    being that of one channel; a straight line through all regions spreads it.
    The best is not reached: the factor is measured.
    """
    energies = np.array(
        [
            max(float(np.sum(np.abs(values[a:b]) ** 2)) - 2 * sd**2 * (b - a), 0.0)
            for a, b in zip(kept.starts, kept.stops, strict=True)
        ]
    )
    weights = energies / max(sd**2, 1e-300)
    columns = np.column_stack([np.ones(x.size), x])
    normal = (columns * weights[:, None]).T @ columns
    # A first-order phase is within about 180 degrees over the sweep.
    normal[1, 1] += 1 / math.pi**2
    covariance = np.linalg.pinv(normal, hermitian=True)
    variances = np.einsum("ij,jk,ik->i", columns, covariance, columns)
    return _NOISE_FACTOR * math.sqrt(float(np.max(variances)))


def _doubts(asked_deg: float, noise_deg: float, refused: bool) -> tuple[str, ...]:
    doubts = []
    if refused or asked_deg > _DOUBTFUL_DEG:
        doubts.append(
            f"The phase is doubtful by about {asked_deg:.0f} degrees: "
            "the tails of the lines disagree with their feet."
        )
    if noise_deg > _DOUBTFUL_DEG:
        doubts.append(
            f"The phase is doubtful by about {noise_deg:.0f} degrees: "
            "the signals are weak against the noise."
        )
    return tuple(doubts)
