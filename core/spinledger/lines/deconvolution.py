"""Least-squares fit of overlapping lines in one stretch; frequencies in Hz."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from spinledger.lines.shapes import lorentzian
from spinledger.values.arrays import locked_floats

_N_STEPS = 12
_LEAST_WIDTH_HZ = 0.15
_MOST_WIDTH_HZ = 60.0
# How far the widths of one stretch may differ: sd of the natural logarithm.
_WIDTH_SPREAD = 0.35
_FIRST_DAMPING = 1e-3
_LEAST_AREA_SD = 3.0
_MOST_PRUNINGS = 3
_GOOD_MISFIT = 1.25
_PHASE_SD_RAD = math.radians(3.0)
_BASE_NOISE, _BASE_SHARE = 0.2, 5e-4


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class FittedLines:
    """Lines fitted to one stretch, in the order given.

    Attributes
    ----------
    centres_hz, centre_sds_hz : numpy.ndarray, shape (n_lines,), Hz
    areas, area_sds : numpy.ndarray, shape (n_lines,), intensity * Hz
    widths_hz, width_sds_hz : numpy.ndarray, shape (n_lines,), Hz
    total_area_sd : float, intensity * Hz
        sd of the sum of the areas; less than theirs where lines overlap.
    misfit_sd : float
        Root mean square of what is left, in the units of the data.
    """

    centres_hz: npt.NDArray[np.float64]
    centre_sds_hz: npt.NDArray[np.float64]
    areas: npt.NDArray[np.float64]
    area_sds: npt.NDArray[np.float64]
    widths_hz: npt.NDArray[np.float64]
    width_sds_hz: npt.NDArray[np.float64]
    total_area_sd: float
    misfit_sd: float

    def __post_init__(self) -> None:
        for name in (
            "centres_hz",
            "centre_sds_hz",
            "areas",
            "area_sds",
            "widths_hz",
            "width_sds_hz",
        ):
            object.__setattr__(self, name, locked_floats(getattr(self, name), name))


@dataclass(frozen=True, slots=True, kw_only=True)
class NoiseModel:
    """Noise of one point of a spectrum, and how it is correlated.

    Attributes
    ----------
    sd : float
    correlation : float
        Factor by which the variance of a sum over many points is larger than for
        independent points.
    line_broadening_hz : float, Hz
        Exponential window that line and noise share: the noise of what decays as
        a line does is smaller by (w / (w + LB))^3 for a line of width w.
    """

    sd: float
    correlation: float = 1.0
    line_broadening_hz: float = 0.0

    def every(self, stride: int) -> NoiseModel:
        """Of the data when only every ``stride``-th point is taken."""
        return replace(self, correlation=max(1.0, self.correlation / stride))


def fit_lines(
    frequencies_hz: npt.NDArray[np.float64],
    intensities: npt.NDArray[np.float64],
    centres_hz: npt.NDArray[np.float64],
    *,
    width_hz: float,
    noise: NoiseModel,
) -> FittedLines:
    """Fit Lorentz lines and a straight base to one stretch.

    Parameters
    ----------
    frequencies_hz, intensities : numpy.ndarray, shape (n_points,)
    centres_hz : numpy.ndarray, shape (n_lines,), Hz
        Picked positions to start from.
    width_hz : float, Hz
        Width to start from, and about which the widths scatter by 35 %.
    noise : NoiseModel

    Notes
    -----
    Levenberg-Marquardt on centre, ln width and area of every line, with a weak
    prior that ties the widths together. Lines whose area is not 3 sd (all else
    held) are dropped and the rest fitted again. Where the lines describe the
    stretch to its noise, a small phase common to it is fitted as well (dispersion
    lines of the same places, sd 3 degrees beforehand). The sd are those of the
    noise, or of the misfit where that is larger.
    """
    centres = centres_hz
    for _ in range(_MOST_PRUNINGS):
        problem = _Problem(frequencies_hz, intensities, centres, width_hz, noise)
        state, misfit = problem.solve()
        kept = problem.is_significant(state, misfit)
        if kept.all() or not kept.any():
            break
        centres = centres[kept]
    if misfit < _GOOD_MISFIT * noise.sd / problem.scale:
        # The lines are Lorentzian: what is left of the phase error would move them.
        problem.free_phase(state)
        state, misfit = problem.solve()
    return problem.report(state, misfit)


class _Problem:
    """One fit: centres, ln widths, areas, two of the base, and a phase if freed."""

    def __init__(
        self,
        frequencies_hz: npt.NDArray[np.float64],
        intensities: npt.NDArray[np.float64],
        centres_hz: npt.NDArray[np.float64],
        width_hz: float,
        noise: NoiseModel,
    ) -> None:
        self.scale = float(np.abs(intensities).max()) or 1.0
        self.frequencies = frequencies_hz
        self.target = intensities / self.scale
        self.noise = max(noise.sd / self.scale, 1e-9)
        self.noise_model = noise
        self.n_lines = centres_hz.size
        self.start_centres = centres_hz
        self.first_state: npt.NDArray[np.float64] | None = None
        self.log_width = float(np.log(width_hz))
        span = max(float(np.ptp(frequencies_hz)), 1e-9)
        middle = float(frequencies_hz.mean())
        # The spectrum is flat already: what base is left is small against the noise
        # and against the feet of the lines.
        base_weight = (self.noise / max(_BASE_NOISE * self.noise, _BASE_SHARE)) ** 2
        self.extra_weights = np.full(2, base_weight)
        self.base = np.column_stack(
            [np.ones(frequencies_hz.size), (frequencies_hz - middle) / span]
        )

    def free_phase(self, state: npt.NDArray[np.float64]) -> None:
        """Fit a small common phase as well from now on, from a state without."""
        phase_weight = (self.noise / _PHASE_SD_RAD) ** 2
        self.extra_weights = np.append(self.extra_weights, phase_weight)
        self.first_state = np.append(state, 0.0)
        self.start_centres = state[: self.n_lines]

    def solve(self) -> tuple[npt.NDArray[np.float64], float]:
        state = self._start() if self.first_state is None else self.first_state
        damping = _FIRST_DAMPING
        residual, jacobian = self._residual(state)
        cost = self._cost(residual, state)
        for _ in range(_N_STEPS):
            step = self._step(residual, jacobian, state, damping)
            trial = self._limited(state + step)
            new_residual, new_jacobian = self._residual(trial)
            new_cost = self._cost(new_residual, trial)
            if new_cost < cost:
                gain = (cost - new_cost) / cost
                state, residual, jacobian, cost = (
                    trial,
                    new_residual,
                    new_jacobian,
                    new_cost,
                )
                damping = max(damping / 5, 1e-9)
                if gain < 1e-5:
                    break
            else:
                damping *= 8
                if damping > 1e3:
                    break
        return state, float(np.sqrt(np.mean(residual**2)))

    def is_significant(
        self, state: npt.NDArray[np.float64], misfit: float
    ) -> npt.NDArray[np.bool_]:
        """Whether leaving a line out would cost 3 sd or more, shape (n_lines,)."""
        n = self.n_lines
        shapes = self._residual(state)[1][:, 2 * n : 3 * n]
        error = max(self.noise, misfit) * np.sqrt(self.noise_model.correlation)
        sds = error / np.sqrt(np.sum(shapes**2, axis=0))
        return np.asarray(state[2 * n : 3 * n] > _LEAST_AREA_SD * sds)

    def report(self, state: npt.NDArray[np.float64], misfit: float) -> FittedLines:
        n = self.n_lines
        _, jacobian = self._residual(state)
        error = max(self.noise, misfit)
        normal = jacobian.T @ jacobian / error**2
        base = np.arange(3 * n, state.size)
        normal[base, base] += self.extra_weights / error**2
        normal[np.diag_indices(2 * n)] += np.concatenate(
            [np.full(n, 1e-12), np.full(n, 1 / _WIDTH_SPREAD**2)]
        )
        covariance = np.linalg.pinv(normal, hermitian=True)
        sds = np.sqrt(np.maximum(np.diag(covariance), 0.0))
        widths = np.exp(state[n : 2 * n])
        apart = widths / (widths + max(self.noise_model.line_broadening_hz, 0.0))
        raised = np.sqrt(self.noise_model.correlation)
        area_block = covariance[2 * n : 3 * n, 2 * n : 3 * n]
        total_sd = np.sqrt(max(float(area_block.sum()), 0.0)) * self.scale * raised
        return FittedLines(
            centres_hz=state[:n],
            centre_sds_hz=sds[:n] * raised * apart**1.5,
            areas=state[2 * n : 3 * n] * self.scale,
            area_sds=sds[2 * n : 3 * n] * self.scale * raised * np.sqrt(apart),
            widths_hz=widths,
            width_sds_hz=sds[n : 2 * n] * widths * raised * apart**1.5,
            total_area_sd=float(total_sd),
            misfit_sd=misfit * self.scale,
        )

    def _start(self) -> npt.NDArray[np.float64]:
        n = self.n_lines
        state = np.zeros(3 * n + 2)
        state[:n] = self.start_centres
        state[n : 2 * n] = self.log_width
        apart = self.frequencies[:, None] - self.start_centres
        columns = np.column_stack(
            [lorentzian(apart, np.exp(self.log_width)), self.base]
        )
        # A little ridge keeps lines closer than their width apart from blowing up.
        normal = columns.T @ columns
        normal[np.diag_indices_from(normal)] *= 1.0 + 1e-3
        base = np.arange(n, n + 2)
        normal[base, base] += self.extra_weights
        state[2 * n :] = np.linalg.solve(normal, columns.T @ self.target)
        state[2 * n : 3 * n] = np.maximum(state[2 * n : 3 * n], 0.0)
        return state

    def _residual(
        self, state: npt.NDArray[np.float64]
    ) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
        n = self.n_lines
        half = np.exp(state[n : 2 * n]) / 2
        areas = state[2 * n : 3 * n]
        apart = self.frequencies[:, None] - state[:n]
        denominator = half**2 + apart**2
        shape = half / np.pi / denominator
        # d/d centre and d/d ln width of the unit Lorentzian.
        by_centre = areas * shape * 2 * apart / denominator
        by_width = areas * shape * (apart**2 - half**2) / denominator
        extra = self.base
        if state.size > 3 * n + 2:
            # A small phase adds this much of the lines' dispersion.
            dispersion = (apart / np.pi / denominator) @ areas
            extra = np.column_stack([self.base, dispersion])
        jacobian = np.column_stack([by_centre, by_width, shape, extra])
        residual = self.target - shape @ areas - extra @ state[3 * n :]
        return residual, jacobian

    def _cost(
        self, residual: npt.NDArray[np.float64], state: npt.NDArray[np.float64]
    ) -> float:
        n = self.n_lines
        spread = (state[n : 2 * n] - self.log_width) / _WIDTH_SPREAD
        weight = self._prior_weight(residual.size)
        extra = state[3 * n :]
        return float(
            residual @ residual
            + weight * (spread @ spread)
            + self.extra_weights @ extra**2
        )

    def _prior_weight(self, n_points: int) -> float:
        # As if the misfit were at least 1 % of the tallest point: keeps widths
        # together where lines overlap, leaves separated strong lines free.
        return max(self.noise, 0.01) ** 2 * min(1.0, n_points / 100)

    def _step(
        self,
        residual: npt.NDArray[np.float64],
        jacobian: npt.NDArray[np.float64],
        state: npt.NDArray[np.float64],
        damping: float,
    ) -> npt.NDArray[np.float64]:
        n = self.n_lines
        normal = jacobian.T @ jacobian
        gradient = jacobian.T @ residual
        weight = self._prior_weight(residual.size) / _WIDTH_SPREAD**2
        rows = np.arange(n, 2 * n)
        normal[rows, rows] += weight
        gradient[rows] -= weight * (state[rows] - self.log_width)
        base = np.arange(3 * n, state.size)
        normal[base, base] += self.extra_weights
        gradient[base] -= self.extra_weights * state[base]
        diagonal = np.diag(normal).copy()
        floor = 1e-9 * float(diagonal.max())
        normal[np.diag_indices_from(normal)] += damping * diagonal + floor
        return np.asarray(np.linalg.solve(normal, gradient))

    def _limited(self, state: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
        n = self.n_lines
        reach = 2 * np.exp(self.log_width)
        state[:n] = np.clip(
            state[:n], self.start_centres - reach, self.start_centres + reach
        )
        state[n : 2 * n] = np.clip(
            state[n : 2 * n], np.log(_LEAST_WIDTH_HZ), np.log(_MOST_WIDTH_HZ)
        )
        state[2 * n : 3 * n] = np.maximum(state[2 * n : 3 * n], 0.0)
        return state
