"""Picking of lines by the second derivative with sub-point position."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.lines.derivative import negative_second_derivative
from spinledger.lines.noise import EDGE_SHARE, quiet_rms
from spinledger.values.arrays import locked_floats


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
    sigma_hz: float = 0.45,
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
    sd = quiet_rms(curvature, edge_share=edge_share)
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


def _apart(
    tops: npt.NDArray[np.int64], heights: npt.NDArray[np.float64], distance: int
) -> npt.NDArray[np.int64]:
    keep = np.ones(tops.size, dtype=np.bool_)
    for place in np.argsort(-heights, kind="stable"):
        if not keep[place]:
            continue
        low = np.searchsorted(tops, tops[place] - distance, side="right")
        high = np.searchsorted(tops, tops[place] + distance, side="left")
        keep[low:high] = False
        keep[place] = True
    return tops[keep]
