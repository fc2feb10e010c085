"""How much the correlation of neighbouring points raises a fitted variance."""

from __future__ import annotations

import numpy as np

from spinledger.lines.noise import quiet_correlation
from spinledger.processing.recipe import Run, find_step
from spinledger.processing.transform import apodization_window
from spinledger.values.acquisition import Fid
from spinledger.values.recipe import Apodize


def noise_correlation(run: Run) -> float:
    """Factor for the variance of anything fitted over several points.

    Notes
    -----
    White noise times a window w is, after zero filling to N points, correlated;
    a sum over many points has the variance of independent points times
    N w(0)^2 / sum w^2 where the window is near w(0). For a maker's spectrum it is
    read off the noise itself.
    """
    acquired = run.acquired
    if not isinstance(acquired, Fid):
        return quiet_correlation(run.spectrum.intensities)
    n_fid = acquired.samples.size
    points = np.arange(n_fid, dtype=np.float64) - acquired.group_delay_points
    times_s = points / acquired.spectral_width_hz
    step = find_step(run.recipe, Apodize)
    power = float(n_fid)
    if step is not None:
        window = apodization_window(step, times_s, length_s=float(times_s[-1]))
        power = float(np.sum(window**2)) / max(float(window[0]) ** 2, 1e-12)
    return max(1.0, run.spectrum.n_points / power)
