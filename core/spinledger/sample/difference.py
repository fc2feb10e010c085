"""Difference of two aligned spectra, on the axis of the main one; ppm."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.sample.align import Alignment
from spinledger.sample.traces import Trace, trace_of, trace_upon
from spinledger.values.evidence import Evidence

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Difference:
    """Main spectrum minus the other, moved and scaled upon it.

    Attributes
    ----------
    shifts_ppm : numpy.ndarray, shape (n_points,), ppm
        The main spectrum's own axis.
    main, other : Trace
        Both on that axis; the other as a ghost to be drawn beneath.
    intensities : numpy.ndarray, shape (n_points,)
        Positive where the main spectrum has more; 0 where the other has no data.
    noise_sd : float
        Of one point of the difference.
    """

    shifts_ppm: Floats
    main: Trace
    other: Trace
    intensities: Floats
    noise_sd: float

    @property
    def in_noise_sd(self) -> Floats:
        """Difference in units of its noise sd."""
        return self.intensities / self.noise_sd


def difference(main: Evidence, other: Evidence, alignment: Alignment) -> Difference:
    """Lay the other spectrum upon the main one and take it away.

    Parameters
    ----------
    main, other : Evidence
    alignment : Alignment
        Of ``other`` upon ``main``.
    """
    first = trace_of(main)
    ghost = scaled(
        trace_upon(other, first, offset_ppm=alignment.offset_ppm), alignment.scale
    )
    is_covered = ghost.intensities != 0.0
    return Difference(
        shifts_ppm=first.shifts_ppm,
        main=first,
        other=ghost,
        intensities=np.where(is_covered, first.intensities - ghost.intensities, 0.0),
        noise_sd=float(np.hypot(first.noise_sd, ghost.noise_sd)),
    )


def scaled(trace: Trace, factor: float) -> Trace:
    """The same trace with all intensities times a factor."""
    return Trace(
        shifts_ppm=trace.shifts_ppm,
        intensities=trace.intensities * factor,
        frequency_mhz=trace.frequency_mhz,
        is_empty=trace.is_empty,
        noise_sd=trace.noise_sd * abs(factor),
    )
