"""A processed spectrum; shifts in ppm, frequencies in Hz and MHz."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.values.arrays import locked_floats


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Spectrum:
    """A real 1D spectrum on a uniform shift axis, highest shift first.

    Attributes
    ----------
    intensities : numpy.ndarray, shape (n_points,), arbitrary units
        Index 0 is the highest shift. Copied and locked on construction.
    imaginary : numpy.ndarray or None, shape (n_points,)
        Dispersive part where there is one, so that the phase can be changed.
    first_point_ppm : float, ppm
        Shift of point 0.
    spectral_width_hz : float, Hz
        Full width, ``n_points`` times the point spacing.
    spectrometer_frequency_mhz : float, MHz
        Frequency that 0 ppm corresponds to; 1 ppm is this many Hz.
    """

    intensities: npt.NDArray[np.float64]
    first_point_ppm: float
    spectral_width_hz: float
    spectrometer_frequency_mhz: float
    imaginary: npt.NDArray[np.float64] | None = None

    def __post_init__(self) -> None:
        owned = locked_floats(self.intensities, "intensities")
        if owned.size < 2:
            raise ValueError(f"intensities: need 2 or more points, got {owned.size}")
        for name in ("spectral_width_hz", "spectrometer_frequency_mhz"):
            if not getattr(self, name) > 0:
                raise ValueError(f"{name} must be > 0, got {getattr(self, name)!r}")
        object.__setattr__(self, "intensities", owned)
        if self.imaginary is not None:
            dispersive = locked_floats(self.imaginary, "imaginary")
            if dispersive.size != owned.size:
                raise ValueError("imaginary must have as many points as intensities")
            object.__setattr__(self, "imaginary", dispersive)

    @property
    def n_points(self) -> int:
        """Number of points."""
        return int(self.intensities.size)

    @property
    def step_hz(self) -> float:
        """Distance of neighbouring points, Hz, > 0."""
        return self.spectral_width_hz / self.n_points

    @property
    def step_ppm(self) -> float:
        """Distance of neighbouring points, ppm, > 0."""
        return self.step_hz / self.spectrometer_frequency_mhz

    @property
    def last_point_ppm(self) -> float:
        """Lowest shift on the axis, ppm."""
        return self.first_point_ppm - self.step_ppm * (self.n_points - 1)

    @property
    def shifts_ppm(self) -> npt.NDArray[np.float64]:
        """Shift of every point, descending, shape (n_points,), ppm."""
        return self.first_point_ppm - self.step_ppm * np.arange(
            self.n_points, dtype=np.float64
        )

    def index_of_ppm(self, shift_ppm: float) -> int:
        """Index of the point nearest to a shift, clipped to the axis."""
        index = round((self.first_point_ppm - shift_ppm) / self.step_ppm)
        return min(max(index, 0), self.n_points - 1)

    def window(self, low_ppm: float, high_ppm: float) -> slice:
        """Slice of the points between two shifts, both ends included."""
        return slice(self.index_of_ppm(high_ppm), self.index_of_ppm(low_ppm) + 1)
