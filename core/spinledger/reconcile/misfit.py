"""Misfit of a fit along the spectrum, after smoothing that forgives line shape.

Shifts in ppm, widths in Hz.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from spinledger.reconcile.coarse import BoolArray, FloatArray, usable_points
from spinledger.reconcile.match import masked_by_hand
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.refine_values import Refinement
from spinledger.reconcile.windows import (
    Stretch,
    boxcar,
    edge_baseline,
    inside_ranges,
    points_of_hz,
    stretches,
)
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import ClaimLines

SMOOTHING_HZ = 3.0
WINDOW_PAD_HZ = 25.0
CLAIM_PAD_HZ = 15.0
# Strays with a known cause say nothing for or against a structure.
EXPLAINED_KINDS = frozenset({"satellite", "sideband", "impurity", "given"})


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class SpectrumMisfit:
    """Smoothed misfit along the axis.

    Attributes
    ----------
    residual : numpy.ndarray, shape (n_points,)
        Smoothed measured minus modelled, local baseline taken off, 0 outside
        the windows and within the noise.
    measured : numpy.ndarray, shape (n_points,)
        Smoothed measured intensity without the local baseline.
    windows : tuple of Stretch
    share, unexplained_share : float
    claim_shares : dict
        Misfit around each placed claim over the claim's own area, by label.
    """

    residual: FloatArray
    measured: FloatArray
    windows: tuple[Stretch, ...]
    share: float
    unexplained_share: float
    claim_shares: dict[str, float]


def spectrum_misfit(
    evidence: Evidence, refinement: Refinement, constraints: Constraints | None = None
) -> SpectrumMisfit:
    """Compare measured and modelled intensity after a boxcar of +-3 Hz.

    The boxcar forgives line shape and keeps misplacement. Misfit below twice
    the noise of a smoothed point is taken for noise.
    """
    spectrum = evidence.spectrum
    half = points_of_hz(spectrum, SMOOTHING_HZ)
    usable = usable_points(evidence, masked_by_hand(constraints))
    usable &= ~inside_ranges(
        spectrum,
        [
            (stray.low_ppm, stray.high_ppm)
            for stray in evidence.strays
            if stray.kind in EXPLAINED_KINDS
        ],
    )
    noise = evidence.noise_sd / np.sqrt(2 * half + 1)
    # A tall masked line must not leak out of its mask through the boxcar.
    kept = np.where(usable, spectrum.intensities, refinement.intensities)
    measured = boxcar(kept, half)
    model = boxcar(refinement.intensities, half)
    windows = _windows(evidence, measured, model, usable)
    edge = points_of_hz(spectrum, WINDOW_PAD_HZ / 3)
    baseline = edge_baseline(measured - model, windows, edge)
    inside = _inside(windows, spectrum.n_points) & usable
    residual = np.where(inside, measured - model - baseline, 0.0)
    residual = np.sign(residual) * np.maximum(np.abs(residual) - 2.0 * noise, 0.0)
    level = np.where(inside, measured - baseline, 0.0)
    total = float(np.maximum(np.abs(level) - noise, 0.0).sum())
    total = max(total, float(np.where(inside, model, 0.0).sum()), 1e-300)
    near = inside_ranges(
        spectrum,
        [
            (float(one.shifts_ppm.min()) - pad, float(one.shifts_ppm.max()) + pad)
            for one in refinement.claim_lines
            if one.shifts_ppm.size
            for pad in [WINDOW_PAD_HZ / spectrum.spectrometer_frequency_mhz]
        ],
    )
    return SpectrumMisfit(
        residual=residual,
        measured=level,
        windows=windows,
        share=float(np.abs(residual).sum()) / total,
        unexplained_share=float(np.maximum(residual, 0.0)[~near].sum()) / total,
        claim_shares=_claim_shares(evidence, refinement.claim_lines, residual, model),
    )


def _windows(
    evidence: Evidence,
    measured: FloatArray,
    model: FloatArray,
    usable: BoolArray,
) -> tuple[Stretch, ...]:
    """Where measured or modelled intensity stands out, with room at both ends."""
    spectrum = evidence.spectrum
    half = points_of_hz(spectrum, SMOOTHING_HZ)
    noise = evidence.noise_sd / np.sqrt(2 * half + 1)
    floor = max(5.0 * noise, 0.004 * float(np.where(usable, model, 0.0).max(initial=0)))
    signals = inside_ranges(
        spectrum, [(one.low_ppm, one.high_ppm) for one in evidence.signals]
    )
    stands_out = ((measured > floor) & signals) | (model > floor)
    return stretches(stands_out & usable, pad=points_of_hz(spectrum, WINDOW_PAD_HZ))


def _inside(windows: tuple[Stretch, ...], n_points: int) -> BoolArray:
    inside = np.zeros(n_points, dtype=np.bool_)
    for window in windows:
        inside[window.start : window.stop] = True
    return inside


def _claim_shares(
    evidence: Evidence,
    claim_lines: tuple[ClaimLines, ...],
    residual: FloatArray,
    model: FloatArray,
) -> dict[str, float]:
    """Misfit within reach of each claim, shared out by the claims' own parts."""
    spectrum = evidence.spectrum
    pad = CLAIM_PAD_HZ / spectrum.spectrometer_frequency_mhz
    areas = {one.claim: float(one.protons.sum()) for one in claim_lines}
    reach = {
        one.claim: spectrum.window(
            float(one.shifts_ppm.min()) - pad, float(one.shifts_ppm.max()) + pad
        )
        for one in claim_lines
        if one.shifts_ppm.size
    }
    crowd = np.zeros(spectrum.n_points)
    for name, where in reach.items():
        crowd[where] += areas[name]
    shares = {}
    for name, where in reach.items():
        part = areas[name] / np.maximum(crowd[where], 1e-300)
        own = float((model[where] * part).sum())
        misfit = float((np.abs(residual[where]) * part).sum())
        shares[name] = misfit / max(own, 1e-300)
    return shares
