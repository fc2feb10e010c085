"""Picking of lines by the second derivative with sub-point position."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.lines.derivative import negative_second_derivative, points_per_degree
from spinledger.lines.noise import EDGE_SHARE, quiet_rms
from spinledger.values.arrays import locked_floats

# Smoothings that find what the fine one misses, and the height they demand.
FINE_SIGMA_HZ = 0.45
_COARSER = (1.8, 4.5, 9.0)
_COARSE_FACTOR = 5.0


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Picks:
    """Picked lines, by rising point index (falling shift).

    Attributes
    ----------
    points : numpy.ndarray, shape (n_lines,)
        Position in fractional point indices.
    heights : numpy.ndarray, shape (n_lines,)
        Height of the second derivative, in the units of the data.
    noise_sd : float
        Noise of the second derivative.
    """

    points: npt.NDArray[np.float64]
    heights: npt.NDArray[np.float64]
    noise_sd: float

    def __post_init__(self) -> None:
        for name in ("points", "heights"):
            object.__setattr__(self, name, locked_floats(getattr(self, name), name))

    def select(self, keep: npt.NDArray[np.bool_]) -> Picks:
        """Only the lines where ``keep`` is true."""
        return Picks(
            points=self.points[keep],
            heights=self.heights[keep],
            noise_sd=self.noise_sd,
        )


def pick_lines(
    intensities: npt.NDArray[np.float64],
    *,
    step_hz: float,
    sigma_hz: float = FINE_SIGMA_HZ,
    noise_factor: float = 6.0,
    least_distance_hz: float = 0.6,
    edge_share: float = EDGE_SHARE,
) -> Picks:
    """Lines as maxima of the smoothed negative second derivative.

    Parameters
    ----------
    intensities : numpy.ndarray, shape (n_points,)
        Phased spectrum.
    step_hz : float, Hz
    sigma_hz : float, Hz
        Smoothing; lines closer than about twice this are not told apart.
    noise_factor : float
        Height demanded, in noise sd of the second derivative.
    least_distance_hz : float, Hz
        Of two maxima closer than this the taller stays.
    edge_share : float
        Share of the sweep left out at each end.
    """
    curvature = negative_second_derivative(
        intensities, step_hz=step_hz, sigma_hz=sigma_hz
    )
    sd = quiet_rms(
        curvature,
        points_per_degree=points_per_degree(step_hz, sigma_hz),
        edge_share=edge_share,
    )
    edge = int(edge_share * intensities.size)
    middle = curvature[1:-1]
    tops = (
        np.flatnonzero(
            (middle > curvature[:-2])
            & (middle >= curvature[2:])
            & (middle > noise_factor * sd)
        )
        + 1
    )
    tops = tops[(tops > edge) & (tops < intensities.size - edge)]
    tops = _apart(tops, curvature[tops], max(1, int(least_distance_hz / step_hz)))
    left, top, right = curvature[tops - 1], curvature[tops], curvature[tops + 1]
    # Vertex of the parabola through three points.
    shift = 0.5 * (left - right) / (left - 2 * top + right)
    return Picks(points=tops + shift, heights=top, noise_sd=sd)


def pick_weak_lines(
    intensities: npt.NDArray[np.float64],
    fine: Picks,
    *,
    step_hz: float,
    sigma_hz: float = FINE_SIGMA_HZ,
    edge_share: float = EDGE_SHARE,
) -> Picks:
    """The fine picks, and lines that only show with more smoothing.

    Parameters
    ----------
    intensities : numpy.ndarray, shape (n_points,)
    fine : Picks
        From :func:`pick_lines`.
    step_hz : float, Hz
    sigma_hz : float, Hz
        Smoothing that the fine picks were made with.
    edge_share : float

    Notes
    -----
    A Lorentz line of 1 Hz with a signal-to-noise of 10 stands 6.4 sd high in the
    second derivative at 0.45 Hz, 8.2 at 0.8 and 8.6 at 2 Hz; one of 3 Hz 2.5,
    5.4 and 11. So smoother derivatives add what the fine one misses, where no
    line is picked within twice their width.
    """
    points, heights = fine.points, fine.heights
    for times in _COARSER:
        coarser_hz = times * sigma_hz
        coarse = pick_lines(
            intensities,
            step_hz=step_hz,
            sigma_hz=coarser_hz,
            noise_factor=_COARSE_FACTOR,
            least_distance_hz=2 * coarser_hz,
            edge_share=edge_share,
        )
        reach = 2 * coarser_hz / step_hz
        free = _distance_to(coarse.points, points) > reach
        # On the scale of the fine heights, in units of noise.
        scale = fine.noise_sd / coarse.noise_sd if coarse.noise_sd > 0 else 1.0
        points = np.concatenate([points, coarse.points[free]])
        heights = np.concatenate([heights, coarse.heights[free] * scale])
        order = np.argsort(points, kind="stable")
        points, heights = points[order], heights[order]
    return Picks(points=points, heights=heights, noise_sd=fine.noise_sd)


def _distance_to(
    points: npt.NDArray[np.float64], others: npt.NDArray[np.float64]
) -> npt.NDArray[np.float64]:
    """Distance of every point to the nearest of ascending others."""
    if others.size == 0:
        return np.full(points.size, np.inf)
    place = np.searchsorted(others, points)
    below = np.abs(points - others[np.maximum(place - 1, 0)])
    above = np.abs(points - others[np.minimum(place, others.size - 1)])
    return np.minimum(below, above)


def _apart(
    tops: npt.NDArray[np.int64], heights: npt.NDArray[np.float64], distance: int
) -> npt.NDArray[np.int64]:
    """Maxima at least ``distance`` points apart, the taller first."""
    close = np.flatnonzero(np.diff(tops) < distance)
    if close.size == 0:
        return tops
    keep = np.ones(tops.size, dtype=np.bool_)
    for place in np.argsort(-heights, kind="stable"):
        if not keep[place]:
            continue
        low = np.searchsorted(tops, tops[place] - distance, side="right")
        high = np.searchsorted(tops, tops[place] + distance, side="left")
        keep[low:high] = False
        keep[place] = True
    return tops[keep]
