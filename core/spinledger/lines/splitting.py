"""Lines that stand too close to be picked apart, found by splitting fitted ones."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.lines.deconvolution import FittedLines, NoiseModel, fit_lines
from spinledger.lines.shapes import lorentzian

# A fit within this factor of the noise is good; only then is a split believed.
_GOOD_MISFIT = 1.25
_MOST_SPLITS = 4
_MOST_LINES = 12
_SPLIT_HALF_WIDTHS = 0.8
# What one more line must gain in chi square: three parameters at about 5 sd.
_LEAST_GAIN = 30.0
_LEAST_PROGRESS = 0.75


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Stretch:
    """Data of one fit: frequencies in Hz, typical width, noise."""

    frequencies_hz: npt.NDArray[np.float64]
    intensities: npt.NDArray[np.float64]
    width_hz: float
    noise: NoiseModel

    def fit(self, centres_hz: npt.NDArray[np.float64]) -> FittedLines:
        """Lorentz lines started at given centres."""
        return fit_lines(
            self.frequencies_hz,
            self.intensities,
            centres_hz,
            width_hz=self.width_hz,
            noise=self.noise,
        )

    def chi_square(self, fit: FittedLines) -> float:
        """Squared misfit in noise variances of independent points."""
        ratio = fit.misfit_sd / max(self.noise.sd, 1e-300)
        return ratio**2 * self.intensities.size / self.noise.correlation


def fit_with_splits(
    stretch: Stretch, centres_hz: npt.NDArray[np.float64]
) -> FittedLines:
    """Fit picked lines; split those that turn out to be two.

    Parameters
    ----------
    stretch : Stretch
    centres_hz : numpy.ndarray, shape (n_lines,), Hz

    Notes
    -----
    The line with the largest misfit about it is replaced by two, as long as the
    misfit falls. The splits stand only if the whole stretch is then described to
    the noise: where the line shape itself is not Lorentzian, splitting would only
    draw the shape, so the picked lines are kept.
    """
    first = stretch.fit(centres_hz)
    if _is_good(stretch, first) or centres_hz.size > _MOST_LINES:
        return first
    best = first
    for _ in range(_MOST_SPLITS):
        trial = stretch.fit(_split(stretch, best))
        if trial.misfit_sd > _LEAST_PROGRESS * best.misfit_sd:
            break
        best = trial
        if _is_good(stretch, best):
            break
    gain = stretch.chi_square(first) - stretch.chi_square(best)
    added = best.centres_hz.size - first.centres_hz.size
    if _is_good(stretch, best) and gain > _LEAST_GAIN * added:
        return best
    return first


def _is_good(stretch: Stretch, fit: FittedLines) -> bool:
    return fit.misfit_sd < _GOOD_MISFIT * stretch.noise.sd


def _split(stretch: Stretch, fit: FittedLines) -> npt.NDArray[np.float64]:
    """Centres with the worst-fitted line replaced by two."""
    apart = stretch.frequencies_hz[:, None] - fit.centres_hz
    shapes = lorentzian(apart, fit.widths_hz)
    base = np.column_stack(
        [np.ones(apart.shape[0]), np.linspace(-1.0, 1.0, apart.shape[0])]
    )
    left = stretch.intensities - shapes @ fit.areas
    left = left - base @ np.linalg.lstsq(base, left, rcond=None)[0]
    near = np.abs(apart) < fit.widths_hz
    misfits = near.T.astype(np.float64) @ left**2
    worst = int(np.argmax(misfits))
    half = _SPLIT_HALF_WIDTHS * fit.widths_hz[worst] / 2
    centre = fit.centres_hz[worst]
    others = np.delete(fit.centres_hz, worst)
    return np.sort(np.append(others, [centre - half, centre + half]))
