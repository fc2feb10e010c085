"""The coarse view of a spectrum and of the claims in which the match searches.

Shifts in ppm, widths, couplings and steps in Hz.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import fft

from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence
from spinledger.values.spectrum import Spectrum

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

COARSE_HALF_WIDTH_HZ = 6.0
COARSE_STEP_HZ = 2.0
LOW_PPM = -1.0
HIGH_PPM = 16.0
MASKED_KINDS = frozenset({"solvent", "water", "reference"})
# A line this far beyond its mask is down by (6 / 15)**2 on the coarse shape.
MASK_TAPER_HZ = 15.0


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class CoarseSpectrum:
    """A spectrum under a common broad Lorentzian, on a grid that rises in shift.

    Attributes
    ----------
    grid_ppm : numpy.ndarray, shape (n,), ppm
    step_hz : float, Hz
    intensities : numpy.ndarray, shape (n,), >= 0
    trust : numpy.ndarray, shape (n,)
        1 where the spectrum counts, 0 under a mask, between them near its edge.
    noise_sd : float
        Of one coarse point.
    frequency_mhz : float
    masked_ppm : tuple of (low_ppm, high_ppm)
    hwhm_hz : float, Hz
        Half width at half maximum of the broadening.
    """

    grid_ppm: FloatArray
    step_hz: float
    intensities: FloatArray
    trust: FloatArray
    noise_sd: float
    frequency_mhz: float
    masked_ppm: tuple[tuple[float, float], ...] = ()
    hwhm_hz: float = COARSE_HALF_WIDTH_HZ

    def hidden_share(
        self, sticks: tuple[FloatArray, FloatArray], shift_ppm: float
    ) -> float:
        """Share of a multiplet (offsets in Hz, areas) that lies under masks."""
        offsets, areas = sticks
        places = shift_ppm + offsets / self.frequency_mhz
        under = np.zeros(places.size, dtype=np.bool_)
        for low, high in self.masked_ppm:
            under |= (places >= low) & (places <= high)
        return float(areas[under].sum() / max(float(areas.sum()), 1e-12))

    @property
    def n_points(self) -> int:
        """Number of grid points."""
        return int(self.grid_ppm.size)

    @property
    def points_per_ppm(self) -> float:
        """Grid points in one ppm."""
        return self.frequency_mhz / self.step_hz

    def index_of_ppm(self, shift_ppm: float) -> int:
        """Nearest grid point, clipped to the grid."""
        step_ppm = self.step_hz / self.frequency_mhz
        index = round((shift_ppm - float(self.grid_ppm[0])) / step_ppm)
        return min(max(index, 0), self.n_points - 1)

    def area(self) -> float:
        """Trusted intensity above the noise, intensity * Hz."""
        above = np.maximum(self.intensities - 3.0 * self.noise_sd, 0.0)
        return float((above * self.trust).sum()) * self.step_hz


def broadened(
    spectrum: Spectrum, intensities: FloatArray, hwhm_hz: float
) -> FloatArray:
    """Intensities under a Lorentzian of half width ``hwhm_hz`` (area kept).

    Computed as a decay in the time domain, zero-filled once so that the two
    ends of the axis do not meet.
    """
    n_points = intensities.size
    length = fft.next_fast_len(2 * n_points, real=True)
    spectrum_of_time = fft.rfft(intensities, length)
    times_s = np.arange(spectrum_of_time.size) / (length * spectrum.step_hz)
    decay = np.exp(-2.0 * np.pi * hwhm_hz * times_s)
    return np.asarray(fft.irfft(spectrum_of_time * decay, length)[:n_points])


def masked_ranges(
    evidence: Evidence, more_masked_ppm: Iterable[tuple[float, float]] = ()
) -> tuple[tuple[float, float], ...]:
    """Ranges of solvent, water and reference, and further ones, ppm."""
    recognised = tuple(
        (stray.low_ppm, stray.high_ppm)
        for stray in evidence.strays
        if stray.kind in MASKED_KINDS
    )
    return (*recognised, *more_masked_ppm)


def usable_points(
    evidence: Evidence, more_masked_ppm: Iterable[tuple[float, float]] = ()
) -> BoolArray:
    """Points of the evidence that no mask covers, shape (n_points,)."""
    usable = np.ones(evidence.spectrum.n_points, dtype=np.bool_)
    for low_ppm, high_ppm in masked_ranges(evidence, more_masked_ppm):
        usable[evidence.spectrum.window(low_ppm, high_ppm)] = False
    return usable


def coarse_spectrum(
    evidence: Evidence,
    more_masked_ppm: Iterable[tuple[float, float]] = (),
    *,
    hwhm_hz: float = COARSE_HALF_WIDTH_HZ,
    step_hz: float = COARSE_STEP_HZ,
) -> CoarseSpectrum:
    """Broaden the evidence and sample it on the coarse grid.

    Parameters
    ----------
    evidence : Evidence
    more_masked_ppm : iterable of (low_ppm, high_ppm)
        Stretches that take no part beside solvent, water and reference.
    hwhm_hz, step_hz : float, Hz
        Half width at half maximum of the broadening, and grid step.
    """
    more_masked_ppm = tuple(more_masked_ppm)
    spectrum = evidence.spectrum
    usable = usable_points(evidence, more_masked_ppm)
    kept = np.where(usable, spectrum.intensities, 0.0)
    smooth = broadened(spectrum, kept, hwhm_hz)[::-1]
    shifts_ppm = spectrum.shifts_ppm[::-1]
    low_ppm = max(LOW_PPM, float(shifts_ppm[0]))
    high_ppm = min(HIGH_PPM, float(shifts_ppm[-1]))
    frequency_mhz = spectrum.spectrometer_frequency_mhz
    n_grid = max(2, int((high_ppm - low_ppm) * frequency_mhz / step_hz))
    grid_ppm = low_ppm + np.arange(n_grid, dtype=np.float64) * step_hz / frequency_mhz
    seen = np.interp(grid_ppm, shifts_ppm, usable[::-1].astype(np.float64))
    # A Lorentzian filter of half width B lets through noise in the ratio
    # sqrt(step / (2 pi B)) (integral of its squared shape).
    through = np.sqrt(spectrum.step_hz / (2.0 * np.pi * hwhm_hz))
    return CoarseSpectrum(
        grid_ppm=np.asarray(grid_ppm, dtype=np.float64),
        step_hz=step_hz,
        intensities=np.maximum(np.interp(grid_ppm, shifts_ppm, smooth), 0.0),
        trust=_tapered(seen > 0.5, step_hz),
        noise_sd=evidence.noise_sd * float(min(through, 1.0)),
        frequency_mhz=frequency_mhz,
        masked_ppm=masked_ranges(evidence, more_masked_ppm),
        hwhm_hz=hwhm_hz,
    )


def _tapered(seen: BoolArray, step_hz: float) -> FloatArray:
    """1 away from masks, falling linearly to 0 at their edges."""
    if seen.all():
        return np.ones(seen.size)
    positions = np.arange(seen.size)
    hidden = positions[~seen]
    after = np.searchsorted(hidden, positions)
    left = np.abs(positions - hidden[np.clip(after - 1, 0, hidden.size - 1)])
    right = np.abs(positions - hidden[np.clip(after, 0, hidden.size - 1)])
    distance_hz = np.minimum(left, right) * step_hz
    return np.asarray(np.clip(distance_hz / MASK_TAPER_HZ, 0.0, 1.0))


def first_order_sticks(
    claims: ClaimSet, couplings_hz: FloatArray
) -> tuple[tuple[FloatArray, FloatArray], ...]:
    """Weak-coupling multiplet of every claim: offsets in Hz, areas in protons.

    Particles of one claim do not split each other; the coarse line shape
    hides what that leaves out. Silent claims give empty sticks.
    """
    partners: dict[int, list[tuple[int, float]]] = {}
    for coupling, j_hz in zip(claims.couplings, couplings_hz, strict=True):
        for one, other in coupling.pairs:
            partners.setdefault(one, []).append((other, float(j_hz)))
            partners.setdefault(other, []).append((one, float(j_hz)))
    sticks = []
    for index in range(len(claims.claims)):
        offsets, areas = np.zeros(0), np.zeros(0)
        for number, particle in enumerate(claims.particles):
            if particle.claim != index:
                continue
            splits = [
                (claims.particles[other].n_spins, j_hz)
                for other, j_hz in partners.get(number, [])
                if claims.particles[other].claim != index
            ]
            lines, shares = _split(splits)
            offsets = np.concatenate([offsets, lines])
            areas = np.concatenate([areas, shares * particle.n_spins])
        sticks.append((offsets, areas))
    return tuple(sticks)


def _split(splits: list[tuple[int, float]]) -> tuple[FloatArray, FloatArray]:
    """Lines and shares (sum 1) of one spin split by sets of equal spins 1/2."""
    lines: FloatArray = np.zeros(1)
    shares: FloatArray = np.ones(1)
    for n_spins, j_hz in splits:
        for _ in range(n_spins):
            lines = np.concatenate([lines - j_hz / 2.0, lines + j_hz / 2.0])
            shares = np.concatenate([shares, shares]) / 2.0
            # Far below the coarse width, so merging keeps the shape.
            bins = np.round(lines / 0.25).astype(np.int64)
            merged, where = np.unique(bins, return_inverse=True)
            shares_by_bin = np.bincount(where, shares)
            lines = np.asarray(np.bincount(where, shares * lines) / shares_by_bin)
            shares = np.asarray(shares_by_bin, dtype=np.float64)
            if merged.size > 400:
                keep = shares > 1e-4
                lines, shares = lines[keep], shares[keep] / shares[keep].sum()
    return lines, shares


def coarse_shape(
    sticks: tuple[FloatArray, FloatArray],
    half_points: int,
    *,
    hwhm_hz: float = COARSE_HALF_WIDTH_HZ,
    step_hz: float = COARSE_STEP_HZ,
) -> FloatArray:
    """Multiplet on offsets -half..half grid points; its area is its protons."""
    offsets_hz = np.arange(-half_points, half_points + 1) * step_hz
    lines, areas = sticks
    gaps = offsets_hz[:, None] - lines[None, :]
    return np.asarray((hwhm_hz / np.pi / (gaps**2 + hwhm_hz**2)) @ areas)
