"""Ranges of signals, sharp and broad, as point indices."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from spinledger.lines.derivative import negative_second_derivative, points_per_degree
from spinledger.lines.noise import EDGE_SHARE, quiet_rms
from spinledger.lines.picking import Picks
from spinledger.lines.regions import RegionSearch, find_regions, joined_runs
from spinledger.values.spectrum import Spectrum

# Ranges closer than this belong to one signal.
_JOIN_HZ = 20.0
_SHARP = RegionSearch(join_hz=10.0, pad_hz=5.0)
_BROAD_SIGMAS_HZ = (6.0, 25.0)
_BROAD_FACTOR = 10.0
# A hump must rise this much over the noise of the spectrum itself.
_BROAD_HEIGHT_SD = 4.0


def signal_ranges(
    spectrum: Spectrum, picks: Picks, *, noise_sd: float
) -> list[tuple[int, int]]:
    """Start and stop of every stretch that holds a signal, by rising index.

    Parameters
    ----------
    spectrum : Spectrum
        Phased and flat.
    picks : Picks
        Its lines; each takes a few Hz about it.
    noise_sd : float
        Of one point.

    Notes
    -----
    Strong signals by the second derivative at 0.8 Hz, weak lines by where they
    were picked, and humps by the derivative at 6 and 25 Hz where nothing sharp
    stands within three of those widths.
    """
    step_hz = spectrum.step_hz
    sharp = find_regions(spectrum.intensities, step_hz=step_hz, search=_SHARP)
    taken = sharp.mask(spectrum.n_points)
    pad = int(_SHARP.pad_hz / step_hz)
    for point in np.rint(picks.points).astype(np.int64).tolist():
        taken[max(0, point - pad) : point + pad + 1] = True
    for sigma_hz in _BROAD_SIGMAS_HZ:
        taken |= _humps(spectrum, taken, sigma_hz, noise_sd)
    starts, stops = joined_runs(taken, int((_JOIN_HZ - 2 * _SHARP.pad_hz) / step_hz))
    return [(int(a), int(b)) for a, b in zip(starts, stops, strict=True)]


def _humps(
    spectrum: Spectrum,
    taken: npt.NDArray[np.bool_],
    sigma_hz: float,
    noise_sd: float,
) -> npt.NDArray[np.bool_]:
    step_hz = spectrum.step_hz
    curvature = negative_second_derivative(
        spectrum.intensities, step_hz=step_hz, sigma_hz=sigma_hz
    )
    sd = quiet_rms(curvature, points_per_degree=points_per_degree(step_hz, sigma_hz))
    reach = int(3 * sigma_hz / step_hz)
    near = _grown(taken, reach)
    raised = (curvature > _BROAD_FACTOR * sd) & ~near
    edge = int(EDGE_SHARE * spectrum.n_points)
    raised[:edge] = False
    raised[spectrum.n_points - edge :] = False
    found = np.zeros(spectrum.n_points, dtype=np.bool_)
    starts, stops = joined_runs(raised, reach)
    for start, stop in zip(starts, stops, strict=True):
        height = float(spectrum.intensities[start:stop].mean())
        wide = (stop - start) * step_hz > sigma_hz
        if wide and height > _BROAD_HEIGHT_SD * noise_sd:
            grow = int(1.5 * (stop - start))
            found[max(0, start - grow) : stop + grow] = True
    return found & ~taken


def _grown(flags: npt.NDArray[np.bool_], reach: int) -> npt.NDArray[np.bool_]:
    """True within ``reach`` points of any true point."""
    counts = np.concatenate([[0], np.cumsum(flags)])
    index = np.arange(flags.size)
    high = np.minimum(index + reach + 1, flags.size)
    low = np.maximum(index - reach, 0)
    return np.asarray(counts[high] > counts[low])
