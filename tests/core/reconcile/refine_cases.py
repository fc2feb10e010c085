"""Made spectra with a known answer, for the tests of refinement."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from spinledger.spins.network import ClaimNetwork
from spinledger.values.acquisition import Metadata
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import (
    Evidence,
    Line,
    ProcessingQuality,
    Signal,
    Stray,
)
from spinledger.values.recipe import Recipe, Reference
from spinledger.values.spectrum import Spectrum

Floats = npt.NDArray[np.float64]


def made_evidence(
    claims: ClaimSet,
    *,
    snr: float,
    rng: np.random.Generator,
    frequency_mhz: float = 500.0,
    width_hz: float = 1.0,
    step_hz: float = 0.2,
    strays: tuple[Stray, ...] = (),
    areas: Floats | None = None,
    width_ratios: Floats | None = None,
    gauss_share: float = 0.0,
) -> Evidence:
    """Lines of the claims' own parameters with white noise.

    They are Lorentz lines, or in part Gauss lines of the same full width, and are summed one by one in the frequency domain, which is not the
    way in which the fit draws them.
    """
    shifts = np.array([claim.shift_ppm for claim in claims.claims])
    couplings = np.array([coupling.j_hz for coupling in claims.couplings])
    low_ppm, high_ppm = float(shifts.min()) - 0.7, float(shifts.max()) + 0.7
    n_points = int((high_ppm - low_ppm) * frequency_mhz / step_hz)
    axis = high_ppm * frequency_mhz - step_hz * np.arange(n_points)
    lines = ClaimNetwork(claims).lines(shifts * frequency_mhz, couplings)
    scale = np.ones(len(claims.claims)) if areas is None else areas
    values = np.zeros(n_points)
    halves = np.full(len(claims.claims), width_hz / 2)
    if width_ratios is not None:
        halves *= width_ratios
    for line, protons, claim in zip(
        lines.frequencies_hz, lines.protons, lines.claim, strict=True
    ):
        apart, half = axis - line, halves[claim]
        shape = (1.0 - gauss_share) * half / np.pi / (apart**2 + half**2)
        if gauss_share:
            sharpness = np.log(2.0) / half**2
            gauss = np.exp(-sharpness * apart**2)
            shape += gauss_share * np.sqrt(sharpness / np.pi) * gauss
        values += scale[claim] * protons * shape
    noise_sd = float(values.max()) / snr
    values += noise_sd * rng.normal(size=n_points)
    signals = []
    for claim in range(len(claims.claims)):
        own = lines.frequencies_hz[lines.claim == claim] / frequency_mhz
        margin = 12.0 / frequency_mhz
        centre = Line(
            shift_ppm=float(own.mean()),
            shift_sd_ppm=1e-3,
            area=1.0,
            area_sd=0.1,
            width_hz=1.15 * width_hz,
            width_sd_hz=0.1,
        )
        signals.append(
            Signal(
                low_ppm=float(own.min()) - margin,
                high_ppm=float(own.max()) + margin,
                area=1.0,
                area_sd=0.1,
                lines=(centre,),
            )
        )
    return Evidence(
        metadata=Metadata(
            source_name="made",
            sha256="",
            format_name="made",
            nucleus="1H",
            spectrometer_frequency_mhz=frequency_mhz,
        ),
        recipe=Recipe(steps=()),
        reference=Reference(offset_ppm=0.0, by="DSS", sd_ppm=0.0005),
        # A number of counts that no code may depend on.
        spectrum=Spectrum(
            intensities=7.3e6 * values,
            first_point_ppm=high_ppm,
            spectral_width_hz=n_points * step_hz,
            spectrometer_frequency_mhz=frequency_mhz,
        ),
        noise_sd=7.3e6 * noise_sd,
        solvent=None,
        solvent_seen=None,
        solvent_header=None,
        signals=tuple(signals),
        strays=strays,
        quality=ProcessingQuality(phase_sd_deg=0.0, baseline_sd=1.0),
    )
