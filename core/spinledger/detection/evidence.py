"""The whole chain from acquired data to evidence; shifts in ppm, widths in Hz."""

from __future__ import annotations

import numpy as np

from spinledger.detection.satellites import satellites, sidebands
from spinledger.detection.signals import IntegralDoubt, find_signals
from spinledger.detection.strays import StrayFacts, recognised_lines
from spinledger.errors import EvidenceError
from spinledger.lines.deconvolution import NoiseModel
from spinledger.lines.kernel import learn_kernel
from spinledger.lines.noise import noise_sd
from spinledger.lines.picking import (
    FINE_SIGMA_HZ,
    Picks,
    pick_lines,
    pick_weak_lines,
)
from spinledger.processing.automatic import ProcessedSpectrum, process, reprocess
from spinledger.processing.automatic_window import resolution_hz
from spinledger.processing.noise_model import noise_model
from spinledger.processing.recipe import find_step
from spinledger.processing.solvents import is_aqueous, water_lines
from spinledger.values.acquisition import Acquired, Fid
from spinledger.values.evidence import Evidence, LineKernel, Signal, Stray
from spinledger.values.recipe import Apodize, Recipe, Reference
from spinledger.values.spectrum import Spectrum

_PLAIN_WATER_SD = 0.03
_PLAIN_ORGANIC_SD = 0.05
_SUPPRESSED_SD = 0.20
_SUPPRESSED_NEAR_SD = 0.40
_SUPPRESSED_REACH_PPM = 1.2
_KERNEL_WINDOW_HZ = 15.0
_SIGMA_PER_RESOLUTION = 0.2
# No receiver spans more; keeps noise-free simulations from drowning in rounding.
_LEAST_NOISE_SHARE = 1e-6


def gather_evidence(
    acquired: Acquired,
    *,
    solvent: str | None = None,
    temperature_k: float | None = None,
    recipe: Recipe | None = None,
) -> Evidence:
    """Everything a spectrum says before a structure is asked.

    Parameters
    ----------
    acquired : Fid or MakerSpectrum
    solvent : str, optional
        As the user names it; wins over what the spectrum shows and the header.
    temperature_k : float, K, optional
        Of the sample; else the header's.
    recipe : Recipe, optional
        Run this one instead of processing automatically.

    Raises
    ------
    EvidenceError
        If the spectrum holds no signal at all, or too few points.
    UsageError
        If the solvent is not in the table of solvents.
    """
    if recipe is None:
        processed = process(acquired, solvent=solvent, temperature_k=temperature_k)
    else:
        processed = reprocess(
            acquired, recipe, solvent=solvent, temperature_k=temperature_k
        )
    return evidence_from(processed, temperature_k=temperature_k)


def evidence_from(
    processed: ProcessedSpectrum, *, temperature_k: float | None = None
) -> Evidence:
    """Detection on a processed spectrum.

    Raises
    ------
    EvidenceError
        If the spectrum holds no signal at all.
    """
    metadata = processed.run.acquired.metadata
    temperature = temperature_k or metadata.temperature_k
    spectrum = processed.spectrum
    solvent = processed.referencing.solvent
    reference = processed.referencing.reference
    tallest = float(np.abs(spectrum.intensities).max())
    sd = max(noise_sd(spectrum.intensities), _LEAST_NOISE_SHARE * tallest)
    picks = _picks(processed)
    noise = noise_model(processed.run, sd)
    doubt = _integral_doubt(processed, sd, temperature)
    signals = find_signals(spectrum, picks, noise=noise, doubt=doubt)
    if not signals:
        raise EvidenceError(
            metadata.source_name,
            "the spectrum shows no signal above the noise, so there is nothing to "
            "compare",
        )
    strays = _strays(signals, processed, noise, temperature)
    return Evidence(
        metadata=metadata,
        recipe=processed.run.recipe,
        reference=reference,
        spectrum=spectrum,
        noise_sd=sd,
        solvent=solvent,
        solvent_seen=processed.referencing.solvent_seen,
        solvent_header=processed.solvent_header,
        signals=signals,
        strays=strays,
        quality=processed.quality,
        kernel=_kernel(spectrum, reference, sd),
        presaturated=processed.presaturated,
    )


def _picks(processed: ProcessedSpectrum) -> Picks:
    """Lines at the finest smoothing that the FID's length allows, and coarser."""
    spectrum, acquired = processed.spectrum, processed.run.acquired
    sigma_hz = FINE_SIGMA_HZ
    window = find_step(processed.run.recipe, Apodize)
    if isinstance(acquired, Fid) and window is not None:
        width_hz = resolution_hz(acquired, window.line_broadening_hz)
        sigma_hz = max(sigma_hz, _SIGMA_PER_RESOLUTION * width_hz)
    fine = pick_lines(spectrum.intensities, step_hz=spectrum.step_hz, sigma_hz=sigma_hz)
    return pick_weak_lines(
        spectrum.intensities, fine, step_hz=spectrum.step_hz, sigma_hz=sigma_hz
    )


def _strays(
    signals: tuple[Signal, ...],
    processed: ProcessedSpectrum,
    noise: NoiseModel,
    temperature_k: float | None,
) -> tuple[Stray, ...]:
    """Everything that is told without a structure, each stretch once."""
    spectrum = processed.spectrum
    known = recognised_lines(
        signals,
        StrayFacts(
            spectrum=spectrum,
            noise=noise,
            referencing=processed.referencing,
            temperature_k=temperature_k,
            carrier_ppm=_irradiated_ppm(processed),
        ),
    )
    frequency_mhz = spectrum.spectrometer_frequency_mhz
    weak = (*satellites(signals, frequency_mhz), *sidebands(signals, frequency_mhz))
    free = tuple(
        stray
        for stray in weak
        if not any(
            one.low_ppm <= (stray.low_ppm + stray.high_ppm) / 2 <= one.high_ppm
            for one in known
        )
    )
    return (*known, *free)


def _irradiated_ppm(processed: ProcessedSpectrum) -> float | None:
    """Carrier on the referenced axis, where water is suppressed there."""
    acquired = processed.run.acquired
    if not processed.presaturated or not isinstance(acquired, Fid):
        return None
    carrier_ppm = acquired.carrier_ppm if acquired.carrier_ppm is not None else 0.0
    return carrier_ppm + processed.referencing.reference.offset_ppm


def _integral_doubt(
    processed: ProcessedSpectrum, sd: float, temperature_k: float | None
) -> IntegralDoubt:
    solvent = processed.referencing.solvent
    baseline = sd * max(0.0, processed.quality.baseline_sd**2 - 1.0) ** 0.5
    if processed.presaturated:
        water = water_lines(solvent if is_aqueous(solvent) else "D2O", temperature_k)
        return IntegralDoubt(
            relative_sd=_SUPPRESSED_SD,
            near_water_sd=_SUPPRESSED_NEAR_SD,
            water_ppm=water[0].shift_ppm,
            water_reach_ppm=_SUPPRESSED_REACH_PPM,
            baseline_sd=baseline,
        )
    plain = _PLAIN_WATER_SD if is_aqueous(solvent) else _PLAIN_ORGANIC_SD
    return IntegralDoubt(
        relative_sd=plain,
        near_water_sd=plain,
        water_ppm=None,
        water_reach_ppm=0.0,
        baseline_sd=baseline,
    )


def _kernel(spectrum: Spectrum, reference: Reference, sd: float) -> LineKernel | None:
    """Line shape from the reference singlet; a solvent quintet is none."""
    if reference.line_ppm is None or reference.by not in (
        "DSS",
        "TMS",
        "TSP",
        "solvent",
    ):
        return None
    if reference.by == "solvent" and "quintet" in reference.why:
        return None
    half_ppm = _KERNEL_WINDOW_HZ / spectrum.spectrometer_frequency_mhz
    window = spectrum.window(
        reference.line_ppm - half_ppm, reference.line_ppm + half_ppm
    )
    apart_hz = (
        spectrum.shifts_ppm[window] - reference.line_ppm
    ) * spectrum.spectrometer_frequency_mhz
    return learn_kernel(
        apart_hz,
        spectrum.intensities[window],
        noise_sd=sd,
        has_silicon=reference.by != "solvent",
    )
