"""Two spectra brought to one line width, so that their windows compare; Hz.

Shim, and with it every line's width, differs from one measurement to the next.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
from scipy import fft
from scipy.optimize import minimize_scalar

from spinledger.sample.traces import Range, Trace

Floats = npt.NDArray[np.float64]

# Shims of one spectrometer differ by less [common practice].
MOST_BROADENING_HZ = 4.0
SURE_TO_HZ = 0.02


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Matched:
    """Two traces on one axis with one line width.

    Attributes
    ----------
    main, other : Trace
    broadening_hz : float, Hz
        Lorentz width put on the other trace; negative: on the main one.
    """

    main: Trace
    other: Trace
    broadening_hz: float


def match_widths(main: Trace, other: Trace, windows: Sequence[Range]) -> Matched:
    """Broaden the sharper of two traces until common signals look alike.

    Parameters
    ----------
    main, other : Trace
        On the same axis, aligned.
    windows : sequence of (low_ppm, high_ppm)
        Signals that both show.

    Notes
    -----
    One Lorentz width by least squares over all windows, each with its own
    factor and offset. The wider trace is left as it is.
    """
    slices = [main.points(low, high) for low, high in windows]
    slices = [one for one in slices if one.stop - one.start > 4]
    if not slices:
        return Matched(main=main, other=other, broadening_hz=0.0)
    times_s, first = _decays(main)
    _, second = _decays(other)
    size = main.intensities.size

    def misfit(broadening_hz: float) -> float:
        one = _drawn(first, times_s, max(-broadening_hz, 0.0), size)
        two = _drawn(second, times_s, max(broadening_hz, 0.0), size)
        return sum(_unlike(one[where], two[where]) for where in slices)

    found = minimize_scalar(
        misfit,
        bounds=(-MOST_BROADENING_HZ, MOST_BROADENING_HZ),
        method="bounded",
        options={"xatol": SURE_TO_HZ},
    )
    width_hz = float(found.x) if float(found.fun) < misfit(0.0) else 0.0
    return Matched(
        main=broadened(main, -width_hz) if width_hz < 0.0 else main,
        other=broadened(other, width_hz) if width_hz > 0.0 else other,
        broadening_hz=width_hz,
    )


def broadened(trace: Trace, width_hz: float) -> Trace:
    """Trace convolved with a Lorentz line of this full width."""
    times_s, decays = _decays(trace)
    intensities = _drawn(decays, times_s, width_hz, trace.intensities.size)
    return replace(trace, intensities=intensities)


def _decays(trace: Trace) -> tuple[Floats, npt.NDArray[np.complex128]]:
    """Times and cosine decays of a trace, mirrored at its end against jumps."""
    mirrored = np.concatenate([trace.intensities, trace.intensities[::-1]])
    times_s = fft.rfftfreq(mirrored.size, d=trace.step_hz)
    return times_s, np.asarray(fft.rfft(mirrored))


def _drawn(
    decays: npt.NDArray[np.complex128], times_s: Floats, width_hz: float, size: int
) -> Floats:
    window = np.exp(-np.pi * width_hz * times_s)
    return np.asarray(fft.irfft(decays * window, 2 * size)[:size], dtype=np.float64)


def _unlike(one: Floats, two: Floats) -> float:
    """Share of a window's variance that the other does not explain."""
    first, second = one - one.mean(), two - two.mean()
    square = float(first @ first) * float(second @ second)
    if square <= 0.0:
        return 1.0
    return 1.0 - float(first @ second) ** 2 / square
