"""Numbers of a spin system: composite particles, frequencies and couplings in Hz."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.values.arrays import locked_floats, locked_integers


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class SpinSystem:
    """Composite particles of spin-1/2 nuclei and the scalar couplings between them.

    Attributes
    ----------
    n_spins : numpy.ndarray of int, shape (n_particles,)
        Magnetically equivalent spins in each particle (3 for CH3).
    frequencies_hz : numpy.ndarray, shape (n_particles,), Hz
        Shift of each particle times the spectrometer frequency.
    couplings_hz : numpy.ndarray, shape (n_particles, n_particles), Hz
        Symmetric, zero diagonal (couplings inside a particle do not show).
    nuclei : tuple of str
        "1H" for the observed nucleus; others couple weakly to it.
    """

    n_spins: npt.NDArray[np.int64]
    frequencies_hz: npt.NDArray[np.float64]
    couplings_hz: npt.NDArray[np.float64]
    nuclei: tuple[str, ...]

    def __post_init__(self) -> None:
        n_spins = locked_integers(self.n_spins, "n_spins")
        frequencies = locked_floats(self.frequencies_hz, "frequencies_hz")
        couplings = locked_floats(self.couplings_hz, "couplings_hz", ndim=2)
        size = n_spins.size
        if frequencies.size != size or couplings.shape != (size, size):
            raise ValueError(
                f"sizes differ: {size} particles, {frequencies.size} frequencies, "
                f"couplings {couplings.shape}"
            )
        if len(self.nuclei) != size:
            raise ValueError(f"nuclei: need {size}, got {len(self.nuclei)}")
        if np.any(n_spins < 1):
            raise ValueError("n_spins: every particle needs one spin or more")
        if not np.array_equal(couplings, couplings.T):
            raise ValueError("couplings_hz must be symmetric")
        object.__setattr__(self, "n_spins", n_spins)
        object.__setattr__(self, "frequencies_hz", frequencies)
        object.__setattr__(self, "couplings_hz", couplings)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Transitions:
    """Exact lines of a spin system.

    Attributes
    ----------
    frequencies_hz : numpy.ndarray, shape (n_lines,), Hz
    intensities : numpy.ndarray, shape (n_observed, n_lines)
        Share of every observed particle in every line, in protons; row sums
        are the particle's number of spins.
    observed : tuple of int
        Particle index of each row.
    error_bound : float
        Largest error of the lines against an exact calculation, as a share of
        the tallest line; 0 for an exact one.
    """

    frequencies_hz: npt.NDArray[np.float64]
    intensities: npt.NDArray[np.float64]
    observed: tuple[int, ...]
    error_bound: float = 0.0
