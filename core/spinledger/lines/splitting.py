"""Lines that stand too close to be picked apart, found by splitting fitted ones."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.lines.deconvolution import FittedLines, NoiseModel, fit_lines
from spinledger.lines.shapes import lorentzian

# A fit within this factor of the noise is good; only then is a split believed.
_GOOD_MISFIT = 1.25
_MOST_ROUNDS = 3
_MOST_LINES = 12
_MOST_LINES_SPLIT = 20
# Chi square about a line above its expectation, in sd, that calls for a split.
_EXCESS_SDS = 3.0
_SPLIT_HALF_WIDTHS = 0.8
# What one more line must gain in chi square: three parameters at about 5 sd.
_LEAST_GAIN = 30.0
_LEAST_PROGRESS = 0.5
# Splits that leave more of a misfit this large only draw another shape.
_LEAST_FALL, _OTHER_SHAPE = 0.75, 4.0


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
    Every line with more misfit about it than noise leaves is replaced by two, as
    long as that helps. The splits stand only if the whole stretch is then described
    to the noise: where the line shape itself is not Lorentzian, splitting would
    only draw the shape, so the picked lines are kept.
    """
    first = stretch.fit(centres_hz)
    if centres_hz.size > _MOST_LINES:
        return first
    best = first
    for _ in range(_MOST_ROUNDS):
        doubtful = _badly_fitted(stretch, best)
        if not doubtful.any():
            break
        trial = stretch.fit(_split(best, doubtful))
        gain = stretch.chi_square(best) - stretch.chi_square(trial)
        if gain < _LEAST_PROGRESS * _LEAST_GAIN:
            break
        falls = trial.misfit_sd < _LEAST_FALL * best.misfit_sd
        best = trial
        if not falls and best.misfit_sd > _OTHER_SHAPE * stretch.noise.sd:
            break
    gain = stretch.chi_square(first) - stretch.chi_square(best)
    added = best.centres_hz.size - first.centres_hz.size
    if _is_good(stretch, best) and gain > _LEAST_GAIN * added:
        return best
    return first


def _is_good(stretch: Stretch, fit: FittedLines) -> bool:
    return fit.misfit_sd < _GOOD_MISFIT * stretch.noise.sd


def _badly_fitted(stretch: Stretch, fit: FittedLines) -> npt.NDArray[np.bool_]:
    """Lines about which more is left than noise, the worst ones if they are many."""
    apart = stretch.frequencies_hz[:, None] - fit.centres_hz
    left = stretch.intensities - lorentzian(apart, fit.widths_hz) @ fit.areas
    base = np.column_stack(
        [np.ones(apart.shape[0]), np.linspace(-1.0, 1.0, apart.shape[0])]
    )
    left = left - base @ np.linalg.lstsq(base, left, rcond=None)[0]
    near = (np.abs(apart) < fit.widths_hz).T.astype(np.float64)
    degrees = near.sum(axis=1) / stretch.noise.correlation
    noise = max(stretch.noise.sd, 1e-300)
    chi_squares = near @ (left / noise) ** 2 / stretch.noise.correlation
    excess = (chi_squares - degrees) / np.sqrt(2 * np.maximum(degrees, 1.0))
    doubtful = excess > _EXCESS_SDS
    most = max(1, _MOST_LINES_SPLIT - fit.centres_hz.size)
    doubtful[np.argsort(-excess, kind="stable")[most:]] = False
    return np.asarray(doubtful)


def _split(
    fit: FittedLines, doubtful: npt.NDArray[np.bool_]
) -> npt.NDArray[np.float64]:
    """Centres with every doubtful line replaced by two."""
    half = _SPLIT_HALF_WIDTHS * fit.widths_hz[doubtful] / 2
    centres = fit.centres_hz[doubtful]
    parts = [fit.centres_hz[~doubtful], centres - half, centres + half]
    return np.sort(np.concatenate(parts))
