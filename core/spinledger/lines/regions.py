"""Stretches of a spectrum that hold signals, found without a phase; Hz and points."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.lines.derivative import curvature_magnitude, points_per_degree
from spinledger.lines.noise import EDGE_SHARE, quiet_rms
from spinledger.values.arrays import locked_floats, locked_integers


@dataclass(frozen=True, slots=True, kw_only=True)
class RegionSearch:
    """How signal regions are found.

    Attributes
    ----------
    sigma_hz : float, Hz
        Smoothing of the second derivative.
    noise_factor : float
        A point belongs to a region above this many noise sd.
    top_share : float
        It must also stand above this share of the tallest point, so that the
        wiggles of a FID that was cut short stay below.
    join_hz, pad_hz, least_hz : float, Hz
        Gaps that are closed, margin put on, and width below which a region is
        dropped.
    edge_share : float
        Share of the sweep left out at each end.
    """

    sigma_hz: float = 0.8
    noise_factor: float = 6.0
    top_share: float = 3e-4
    join_hz: float = 10.0
    pad_hz: float = 5.0
    least_hz: float = 0.8
    edge_share: float = EDGE_SHARE


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Regions:
    """Signal regions in point indices, by rising index, not overlapping by much.

    Attributes
    ----------
    starts, stops : numpy.ndarray of int, shape (n_regions,)
        First point and the point after the last.
    peaks : numpy.ndarray of int, shape (n_regions,)
        Point of the largest second derivative.
    heights : numpy.ndarray, shape (n_regions,)
        Largest magnitude of the spectrum in the region.
    strengths : numpy.ndarray, shape (n_regions,)
        Largest magnitude of the second derivative, in its noise sd.
    """

    starts: npt.NDArray[np.int64]
    stops: npt.NDArray[np.int64]
    peaks: npt.NDArray[np.int64]
    heights: npt.NDArray[np.float64]
    strengths: npt.NDArray[np.float64]

    def __post_init__(self) -> None:
        for name in ("starts", "stops", "peaks"):
            object.__setattr__(self, name, locked_integers(getattr(self, name), name))
        for name in ("heights", "strengths"):
            object.__setattr__(self, name, locked_floats(getattr(self, name), name))

    @property
    def count(self) -> int:
        """Number of regions."""
        return int(self.starts.size)

    def select(self, keep: npt.NDArray[np.bool_]) -> Regions:
        """Only the regions where ``keep`` is true."""
        return Regions(
            starts=self.starts[keep],
            stops=self.stops[keep],
            peaks=self.peaks[keep],
            heights=self.heights[keep],
            strengths=self.strengths[keep],
        )

    def mask(self, n_points: int, grow_points: int = 0) -> npt.NDArray[np.bool_]:
        """True for the points inside any region grown on both sides."""
        inside = np.zeros(n_points, dtype=np.bool_)
        for start, stop in zip(self.starts, self.stops, strict=True):
            inside[max(0, start - grow_points) : stop + grow_points] = True
        return inside


def find_regions(
    values: npt.NDArray[np.float64] | npt.NDArray[np.complex128],
    *,
    step_hz: float,
    search: RegionSearch | None = None,
    weighed: npt.NDArray[np.bool_] | None = None,
) -> Regions:
    """Signal regions of a spectrum whose phase need not be right.

    Parameters
    ----------
    values : numpy.ndarray, shape (n_points,), real or complex
    step_hz : float, Hz
    search : RegionSearch, optional
    weighed : numpy.ndarray of bool, shape (n_points,), optional
        Points among which the tallest is looked for; water may be left out.

    Notes
    -----
    Works on the magnitude of the second derivative, which neither a phase error
    nor the 1/f tails of strong lines reach far; magnitude thresholds on the
    spectrum itself join everything into one region at high signal-to-noise.
    """
    settings = search or RegionSearch()
    curvature = curvature_magnitude(values, step_hz=step_hz, sigma_hz=settings.sigma_hz)
    channels = 2.0 if np.iscomplexobj(values) else 1.0
    covered = points_per_degree(step_hz, settings.sigma_hz) / channels
    sd = quiet_rms(
        curvature, points_per_degree=covered, edge_share=settings.edge_share
    ) / np.sqrt(channels)
    edge = int(settings.edge_share * values.size)
    inner = slice(edge, values.size - edge)
    counted = curvature[inner] if weighed is None else curvature[inner][weighed[inner]]
    threshold = max(
        settings.noise_factor * sd,
        settings.top_share * float(counted.max(initial=0.0)),
    )
    raised = curvature > threshold
    raised[:edge] = False
    raised[values.size - edge :] = False
    return _regions_from(raised, values, curvature, step_hz, settings, sd)


def _regions_from(
    raised: npt.NDArray[np.bool_],
    values: npt.NDArray[np.float64] | npt.NDArray[np.complex128],
    curvature: npt.NDArray[np.float64],
    step_hz: float,
    settings: RegionSearch,
    sd: float,
) -> Regions:
    starts, stops = joined_runs(raised, int(settings.join_hz / step_hz))
    wide = (stops - starts) * step_hz >= settings.least_hz
    starts, stops = starts[wide], stops[wide]
    peaks = np.array(
        [
            a + int(np.argmax(curvature[a:b]))
            for a, b in zip(starts, stops, strict=True)
        ],
        dtype=np.int64,
    )
    heights = np.array(
        [np.abs(values[a:b]).max() for a, b in zip(starts, stops, strict=True)],
        dtype=np.float64,
    )
    pad = int(settings.pad_hz / step_hz)
    return Regions(
        starts=np.maximum(starts - pad, 0),
        stops=np.minimum(stops + pad, values.size),
        peaks=peaks,
        heights=heights,
        strengths=curvature[peaks] / sd if sd > 0 else np.zeros(peaks.size),
    )


def joined_runs(
    flags: npt.NDArray[np.bool_], gap_points: int
) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.int64]]:
    """Starts and stops of the runs of true points, gaps up to a length closed."""
    padded = np.concatenate([[False], flags, [False]])
    turns = np.flatnonzero(padded[1:] != padded[:-1]).astype(np.int64)
    starts, stops = turns[0::2], turns[1::2]
    if starts.size == 0:
        return starts, stops
    apart = starts[1:] - stops[:-1] > gap_points
    return (
        np.concatenate([starts[:1], starts[1:][apart]]),
        np.concatenate([stops[:-1][apart], stops[-1:]]),
    )
