"""What a fit leaves over, and one number to compare fits by.

Shares have no unit; shifts in ppm, couplings in Hz.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from spinledger.reconcile.refine_data import StageData
from spinledger.reconcile.refine_values import Residuals
from spinledger.reconcile.windows import boxcar
from spinledger.values.claim import ClaimSet

Floats = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]

_BOXCAR_HZ = 3.0


def residual_autocorrelation(residual: Floats, windows: tuple[slice, ...]) -> float:
    """1 + 2 times the summed autocorrelation of a residual, at least 1.

    The sum runs until the correlation falls under 0.05; points of different
    windows are not paired.
    """
    parts = [residual[w] - residual[w].mean() for w in windows]
    power = sum(float(part @ part) for part in parts)
    if power <= 0.0:
        return 1.0
    total = 1.0
    longest = max(part.size for part in parts)
    for lag in range(1, longest):
        product = sum(
            float(part[:-lag] @ part[lag:]) for part in parts if part.size > lag
        )
        correlation = product / power
        if correlation < 0.05:
            break
        total += 2.0 * correlation
    return total


def residuals_of(
    data: StageData,
    *,
    residual: Floats,
    baseline: Floats,
    model: Floats,
    noise_sd: float,
) -> tuple[Residuals, Floats]:
    """Shares of what is compared; the claim-wise fields are filled by the caller.

    Returns
    -------
    Residuals, numpy.ndarray
        And the smoothed |residual| of every compared point.
    """
    half = max(1, round(_BOXCAR_HZ / data.axis.step_hz))
    measured = data.values - baseline
    smooth_residual, smooth_measured = np.empty_like(residual), np.empty_like(residual)
    smooth_model = np.empty_like(residual)
    for window in data.windows:
        smooth_residual[window] = boxcar(residual[window], half)
        smooth_measured[window] = boxcar(measured[window], half)
        smooth_model[window] = boxcar(model[window], half)
    # What noise alone leaves after the boxcar is no misfit.
    floor = 2.0 * noise_sd / np.sqrt(2 * half + 1)
    left = np.maximum(np.abs(smooth_residual) - floor, 0.0)
    total = max(
        float(np.maximum(np.abs(smooth_measured) - floor, 0.0).sum()),
        float(smooth_model.sum()),
        1e-30,
    )
    spread = data.values - data.values.mean()
    result = Residuals(
        boxcar_share=float(left.sum()) / total,
        share=float(np.abs(residual).sum()) / max(float(np.abs(measured).sum()), 1e-30),
        r_squared=1.0 - float(residual @ residual) / max(float(spread @ spread), 1e-30),
        unexplained_share=float(left[smooth_residual < 0].sum()) / total,
        unsupported_share=float(left[smooth_residual > 0].sum()) / total,
        claim_shares=np.zeros(0),
        ln_amplitude_ratios=np.zeros(0),
        ln_width_ratios=np.zeros(0),
        shift_z=np.zeros(0),
        coupling_z=np.zeros(0),
    )
    return result, left


def score_of(residuals: Residuals, claims: ClaimSet, absent: frozenset[int]) -> float:
    """Cost of a refined hypothesis; lower is better.

    Notes
    -----
    5 ln max(r, 0.02) + sum min(z_shift^2 / 2, 12) + sum min(z_J^2 / 2, 12)
    + 0.3 sum t(ln amplitude / 0.2) + 0.5 sum t(ln width / 0.3) + 1.5 for each
    claim left out, t(z) = 2.5 ln(1 + z^2 / 4). Weights from a comparison of
    true and wrong structures; exchangeable claims count for nothing but the
    price of leaving them out.
    """
    steady = np.array(
        [
            not claim.is_exchangeable and index not in absent
            for index, claim in enumerate(claims.claims)
        ],
        dtype=np.bool_,
    )
    optional = sum(
        index in absent and claim.visibility != "silent"
        for index, claim in enumerate(claims.claims)
    )
    return (
        5.0 * float(np.log(max(residuals.boxcar_share, 0.02)))
        + _capped(residuals.shift_z[steady])
        + _capped(residuals.coupling_z)
        + 0.3 * _student(residuals.ln_amplitude_ratios[steady] / 0.2)
        + 0.5 * _student(residuals.ln_width_ratios[steady] / 0.3)
        + 1.5 * optional
    )


def _capped(z: Floats) -> float:
    return float(np.minimum(0.5 * np.nan_to_num(z) ** 2, 12.0).sum())


def _student(z: Floats) -> float:
    return float(2.5 * np.log1p(np.nan_to_num(z) ** 2 / 4.0).sum())
