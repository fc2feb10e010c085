"""The noise of a processed spectrum, as the steps of its recipe shaped it."""

from __future__ import annotations

import numpy as np

from spinledger.lines.deconvolution import NoiseModel
from spinledger.lines.noise import quiet_correlation
from spinledger.processing.recipe import Run, find_step
from spinledger.processing.transform import apodization_window
from spinledger.values.acquisition import Fid
from spinledger.values.recipe import Apodize


def noise_model(run: Run, noise_sd: float) -> NoiseModel:
    """Noise of one point with the correlation that window and zero filling put on.

    Parameters
    ----------
    run : Run
    noise_sd : float
        Of one point of the run's spectrum.

    Notes
    -----
    White noise times a window w is, after zero filling to N points, correlated;
    the real part of a sum over many points has the variance of independent points
    times N w(0)^2 / (2 sum w^2), and 1 for twofold zero filling without a window.
    For a maker's spectrum it is read off the noise itself.
    """
    acquired = run.acquired
    if not isinstance(acquired, Fid):
        return NoiseModel(
            sd=noise_sd, correlation=quiet_correlation(run.spectrum.intensities)
        )
    n_fid = acquired.samples.size
    points = np.arange(n_fid, dtype=np.float64) - acquired.group_delay_points
    times_s = points / acquired.spectral_width_hz
    step = find_step(run.recipe, Apodize)
    power, broadening_hz = float(n_fid), 0.0
    if step is not None:
        window = apodization_window(step, times_s, length_s=float(times_s[-1]))
        power = float(np.sum(window**2)) / max(float(window[0]) ** 2, 1e-12)
        if step.kind == "exponential":
            broadening_hz = step.line_broadening_hz
    return NoiseModel(
        sd=noise_sd,
        correlation=max(1.0, run.spectrum.n_points / (2 * power)),
        line_broadening_hz=broadening_hz,
    )
