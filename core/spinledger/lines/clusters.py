"""Picked lines that stand closer than a bad shim splits one line; points and Hz."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.lines.picking import Picks
from spinledger.values.arrays import locked_floats


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Clusters:
    """Clusters of lines, by rising point index.

    Attributes
    ----------
    points : numpy.ndarray, shape (n_clusters,)
        Height-weighted centre.
    tops, sums : numpy.ndarray, shape (n_clusters,)
        Tallest second-derivative height, and their sum.
    widths_hz : numpy.ndarray, shape (n_clusters,), Hz
        Distance of the outermost lines.
    noise_sd : float
        Of the second derivative.
    """

    points: npt.NDArray[np.float64]
    tops: npt.NDArray[np.float64]
    sums: npt.NDArray[np.float64]
    widths_hz: npt.NDArray[np.float64]
    noise_sd: float

    def __post_init__(self) -> None:
        for name in ("points", "tops", "sums", "widths_hz"):
            object.__setattr__(self, name, locked_floats(getattr(self, name), name))


def cluster_lines(
    picks: Picks, *, step_hz: float, reach_hz: float = 2.6, least_sd: float = 8.0
) -> Clusters:
    """Join lines that are closer than ``reach_hz``.

    Parameters
    ----------
    picks : Picks
    step_hz : float, Hz
    reach_hz : float, Hz
        2.6 Hz joins a standard line that a bad shim splits.
    least_sd : float
        Lines lower than this many noise sd are left out.
    """
    kept = picks.select(picks.heights > least_sd * picks.noise_sd)
    points, heights = kept.points, kept.heights
    if points.size == 0:
        empty = np.zeros(0)
        return Clusters(
            points=empty,
            tops=empty,
            sums=empty,
            widths_hz=empty,
            noise_sd=picks.noise_sd,
        )
    starts = np.concatenate(
        [[0], np.flatnonzero(np.diff(points) * step_hz > reach_hz) + 1]
    )
    lasts = np.append(starts[1:], points.size) - 1
    sums = np.add.reduceat(heights, starts)
    return Clusters(
        points=np.add.reduceat(points * heights, starts) / sums,
        tops=np.maximum.reduceat(heights, starts),
        sums=sums,
        widths_hz=(points[lasts] - points[starts]) * step_hz,
        noise_sd=picks.noise_sd,
    )
