"""Least-squares fit of overlapping lines in one stretch; frequencies in Hz."""

from __future__ import annotations

from dataclasses import dataclass

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


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class FittedLines:
    """Lines fitted to one stretch, in the order given.

    Attributes
    ----------
    centres_hz, centre_sds_hz : numpy.ndarray, shape (n_lines,), Hz
    areas, area_sds : numpy.ndarray, shape (n_lines,), intensity * Hz
    widths_hz, width_sds_hz : numpy.ndarray, shape (n_lines,), Hz
    misfit_sd : float
        Root mean square of what is left, in the units of the data.
    """

    centres_hz: npt.NDArray[np.float64]
    centre_sds_hz: npt.NDArray[np.float64]
    areas: npt.NDArray[np.float64]
    area_sds: npt.NDArray[np.float64]
    widths_hz: npt.NDArray[np.float64]
    width_sds_hz: npt.NDArray[np.float64]
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


def fit_lines(
    frequencies_hz: npt.NDArray[np.float64],
    intensities: npt.NDArray[np.float64],
    centres_hz: npt.NDArray[np.float64],
    *,
    width_hz: float,
    noise_sd: float,
    correlation: float = 1.0,
) -> FittedLines:
    """Fit Lorentz lines and a straight base to one stretch.

    Parameters
    ----------
    frequencies_hz, intensities : numpy.ndarray, shape (n_points,)
    centres_hz : numpy.ndarray, shape (n_lines,), Hz
        Picked positions to start from.
    width_hz : float, Hz
        Width to start from, and about which the widths scatter by 35 %.
    noise_sd : float
        Of one point.
    correlation : float
        Factor by which neighbouring points' correlation (zero filling) raises a
        variance; the number of points a spectral resolution element covers.

    Notes
    -----
    Levenberg-Marquardt on centre, ln width and area of every line, with a weak
    prior that ties the widths together. The sd are those of the noise, or of the
    misfit where that is larger.
    """
    problem = _Problem(frequencies_hz, intensities, centres_hz, width_hz, noise_sd)
    state, misfit = problem.solve()
    return problem.report(state, misfit, correlation)


class _Problem:
    """One fit: parameters are centres, ln widths, areas, and two of the base."""

    def __init__(
        self,
        frequencies_hz: npt.NDArray[np.float64],
        intensities: npt.NDArray[np.float64],
        centres_hz: npt.NDArray[np.float64],
        width_hz: float,
        noise_sd: float,
    ) -> None:
        self.scale = float(np.abs(intensities).max()) or 1.0
        self.frequencies = frequencies_hz
        self.target = intensities / self.scale
        self.noise = max(noise_sd / self.scale, 1e-9)
        self.n_lines = centres_hz.size
        self.start_centres = centres_hz
        self.log_width = float(np.log(width_hz))
        span = max(float(np.ptp(frequencies_hz)), 1e-9)
        middle = float(frequencies_hz.mean())
        self.base = np.column_stack(
            [np.ones(frequencies_hz.size), (frequencies_hz - middle) / span]
        )

    def solve(self) -> tuple[npt.NDArray[np.float64], float]:
        state = self._start()
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

    def report(
        self, state: npt.NDArray[np.float64], misfit: float, correlation: float
    ) -> FittedLines:
        n = self.n_lines
        _, jacobian = self._residual(state)
        error = max(self.noise, misfit)
        normal = jacobian.T @ jacobian / (error**2 * correlation)
        normal[np.diag_indices(2 * n)] += np.concatenate(
            [np.full(n, 1e-12), np.full(n, 1 / _WIDTH_SPREAD**2)]
        )
        covariance = np.linalg.pinv(normal, hermitian=True)
        sds = np.sqrt(np.maximum(np.diag(covariance), 0.0))
        widths = np.exp(state[n : 2 * n])
        return FittedLines(
            centres_hz=state[:n],
            centre_sds_hz=sds[:n],
            areas=state[2 * n : 3 * n] * self.scale,
            area_sds=sds[2 * n : 3 * n] * self.scale,
            widths_hz=widths,
            width_sds_hz=sds[n : 2 * n] * widths,
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
        jacobian = np.column_stack([by_centre, by_width, shape, self.base])
        residual = self.target - shape @ areas - self.base @ state[3 * n :]
        return residual, jacobian

    def _cost(
        self, residual: npt.NDArray[np.float64], state: npt.NDArray[np.float64]
    ) -> float:
        n = self.n_lines
        spread = (state[n : 2 * n] - self.log_width) / _WIDTH_SPREAD
        weight = self._prior_weight(residual.size)
        return float(residual @ residual + weight * (spread @ spread))

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
