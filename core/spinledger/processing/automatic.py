"""Automatic processing: raw data in, recipe and referenced spectrum out."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
import scipy.fft

from spinledger.lines.noise import EDGE_SHARE, noise_sd
from spinledger.lines.picking import pick_lines
from spinledger.lines.regions import Regions, find_regions
from spinledger.processing.automatic_phase import automatic_phase, phase_regions
from spinledger.processing.recipe import (
    Run,
    Transformed,
    find_step,
    finish,
    rerun,
    start_run,
    transform,
    with_step,
)
from spinledger.processing.reference import (
    Referencing,
    SolventFacts,
    choose_reference,
)
from spinledger.processing.solvents import canonical_solvent, is_aqueous
from spinledger.values.acquisition import Acquired, Fid
from spinledger.values.evidence import ProcessingQuality
from spinledger.values.recipe import (
    Apodize,
    Baseline,
    FourierTransform,
    Recipe,
    Reference,
    RemoveDelay,
    ZeroFill,
)
from spinledger.values.spectrum import Spectrum

_LEAST_POINTS = 1 << 16
_MOST_POINTS = 1 << 17
_LINE_BROADENING_HZ = 0.3
_TRUNCATION_SHARE = 0.003
_COHERENT_FACTOR = 20.0
_SIGNAL_GROWTH_HZ = 40.0
_WATER_GROWTH_HZ = 150.0
_PRESATURATION_WORDS = (
    "zgpr",
    "zgcppr",
    "cppr",
    "noesypr",
    "noesygppr",
    "metnoesy",
    "tnnoesy",
    "presat",
    "zgesgp",
    "zgesfp",
    "watergate",
    "p3919",
    "w5",
    "wet",
    "purge",
    "gppr",
    "zgespe",
    "cpmgpr",
    "ledbpgppr",
    "watersup",
)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class ProcessedSpectrum:
    """Result of the automatic chain.

    Attributes
    ----------
    run : Run
        Recipe, spectrum and what later changes can start from.
    referencing : Referencing
    solvent_header : str or None
    quality : ProcessingQuality
    presaturated : bool
    """

    run: Run
    referencing: Referencing
    solvent_header: str | None
    quality: ProcessingQuality
    presaturated: bool

    @property
    def spectrum(self) -> Spectrum:
        """Phased, flat, on the referenced axis."""
        return self.run.spectrum


def process(
    acquired: Acquired,
    *,
    solvent: str | None = None,
    temperature_k: float | None = None,
) -> ProcessedSpectrum:
    """Process raw data or a maker's spectrum without any setting.

    Parameters
    ----------
    acquired : Fid or MakerSpectrum
    solvent : str, optional
        As the user names it; wins over what the spectrum shows and the header.
    temperature_k : float, K, optional
        Of the sample; else the header's.

    Raises
    ------
    ValueError
        If the solvent is not in the table.
    """
    facts = solvent_facts(acquired, solvent=solvent, temperature_k=temperature_k)
    presaturated = is_presaturated(acquired.metadata.pulse_program)
    water_at_carrier = presaturated or is_aqueous(facts.given or facts.header)
    recipe = starting_recipe(acquired)
    transformed = transform(acquired, recipe)
    phase_sd: float | None = None
    doubts: tuple[str, ...] = ()
    if isinstance(acquired, Fid):
        phase = automatic_phase(transformed, water_at_carrier=water_at_carrier)
        if phase is not None:
            recipe = with_step(recipe, phase.step)
            phase_sd, doubts = phase.sd_deg, phase.doubts
    baseline = automatic_baseline(transformed, water_at_carrier=water_at_carrier)
    recipe = with_step(recipe, baseline)
    flat = finish(transformed, recipe)
    picks = pick_lines(flat.intensities, step_hz=flat.step_hz)
    referencing = choose_reference(flat, picks, facts=facts)
    recipe = with_step(recipe, referencing.reference)
    spectrum = finish(transformed, recipe)
    quality = ProcessingQuality(
        phase_sd_deg=phase_sd,
        baseline_sd=baseline_roughness(spectrum),
        doubts=doubts + referencing.doubts,
    )
    run = Run(
        acquired=acquired, recipe=recipe, transformed=transformed, spectrum=spectrum
    )
    return ProcessedSpectrum(
        run=run,
        referencing=referencing,
        solvent_header=facts.header,
        quality=quality,
        presaturated=presaturated,
    )


def reprocess(
    acquired: Acquired,
    recipe: Recipe,
    *,
    solvent: str | None = None,
    temperature_k: float | None = None,
) -> ProcessedSpectrum:
    """Run a given recipe; its reference stands, the solvent is told as always.

    Raises
    ------
    ValueError
        If the solvent is not in the table, or a step cannot be run.
    """
    facts = solvent_facts(acquired, solvent=solvent, temperature_k=temperature_k)
    run = start_run(acquired, recipe)
    unreferenced = Recipe(
        steps=tuple(step for step in recipe.steps if not isinstance(step, Reference))
    )
    flat = finish(run.transformed, unreferenced)
    picks = pick_lines(flat.intensities, step_hz=flat.step_hz)
    referencing = choose_reference(flat, picks, facts=facts)
    given = find_step(recipe, Reference)
    if given is not None:
        referencing = replace(referencing, reference=given)
    else:
        run = rerun(run, with_step(recipe, referencing.reference))
    quality = ProcessingQuality(
        phase_sd_deg=None,
        baseline_sd=baseline_roughness(run.spectrum),
        doubts=referencing.doubts,
    )
    return ProcessedSpectrum(
        run=run,
        referencing=referencing,
        solvent_header=facts.header,
        quality=quality,
        presaturated=is_presaturated(acquired.metadata.pulse_program),
    )


def solvent_facts(
    acquired: Acquired, *, solvent: str | None, temperature_k: float | None
) -> SolventFacts:
    """What user and header say of solvent and temperature, in canonical names."""
    given = None
    if solvent is not None:
        given = canonical_solvent(solvent)
        if given is None:
            raise ValueError(f"solvent: {solvent!r} is not in the table of solvents")
    written = acquired.metadata.solvent
    header = None if written is None else canonical_solvent(written) or written
    return SolventFacts(
        given=given,
        header=header,
        temperature_k=temperature_k or acquired.metadata.temperature_k,
        is_maker_axis=not isinstance(acquired, Fid),
        has_axis=not isinstance(acquired, Fid) or acquired.carrier_ppm is not None,
    )


def is_presaturated(pulse_program: str | None) -> bool:
    """Whether a pulse program's name says that water is irradiated or suppressed."""
    if pulse_program is None:
        return False
    name = pulse_program.lower()
    return any(word in name for word in _PRESATURATION_WORDS)


def starting_recipe(acquired: Acquired) -> Recipe:
    """Steps up to the Fourier transform, chosen by the FID; none for a spectrum."""
    if not isinstance(acquired, Fid):
        return Recipe(steps=())
    n_points = 1 << math.ceil(math.log2(2 * acquired.samples.size))
    n_points = min(max(n_points, _LEAST_POINTS), _MOST_POINTS)
    n_points = max(n_points, 1 << math.ceil(math.log2(acquired.samples.size)))
    return Recipe(
        steps=(
            RemoveDelay(group_delay_points=acquired.group_delay_points),
            Apodize(
                kind="exponential",
                line_broadening_hz=automatic_line_broadening(acquired),
            ),
            ZeroFill(n_points=n_points),
            FourierTransform(halve_first_point=acquired.group_delay_points == 0),
        )
    )


def automatic_line_broadening(fid: Fid) -> float:
    """Line broadening that ends a FID which was cut short, else 0.3 Hz.

    Notes
    -----
    Where the last eighth still holds a coherent signal (its largest Fourier
    component over 20 times the median), LB = ln(r/0.003)/(pi AQ) with r the ratio
    of the last to the first rms, so that the step at the end is below 0.3 %.
    """
    samples = fid.samples[math.ceil(fid.group_delay_points) :]
    if samples.size < 64:
        return _LINE_BROADENING_HZ
    tail = samples[-samples.size // 8 :]
    components = np.abs(scipy.fft.fft(tail))
    if components.max() <= _COHERENT_FACTOR * np.median(components):
        return _LINE_BROADENING_HZ
    ends = max(1, samples.size * 3 // 100)
    ratio = _rms(samples[-ends:]) / _rms(samples[:ends])
    needed = math.log(max(ratio, 1e-12) / _TRUNCATION_SHARE) / (
        math.pi * fid.acquisition_time_s
    )
    return max(_LINE_BROADENING_HZ, round(needed, 2))


def _rms(values: npt.NDArray[np.complex128]) -> float:
    return float(np.sqrt(np.mean(np.abs(values) ** 2)))


def automatic_baseline(transformed: Transformed, *, water_at_carrier: bool) -> Baseline:
    """Baseline step with the signals masked, on the header's axis."""
    regions = phase_regions(transformed, water_at_carrier=water_at_carrier)
    step_ppm = transformed.step_hz / transformed.spectrometer_frequency_mhz
    edge = int(EDGE_SHARE * transformed.values.size)
    spans = [(0, edge), (transformed.values.size - edge, transformed.values.size)]
    for part, grow_hz in (
        (regions.kept, _SIGNAL_GROWTH_HZ),
        (regions.dropped, _WATER_GROWTH_HZ),
    ):
        spans += _grown(part, int(grow_hz / transformed.step_hz))
    first = transformed.first_point_ppm
    masked = tuple(
        (round(first - step_ppm * stop, 4), round(first - step_ppm * start, 4))
        for start, stop in _merged(spans)
    )
    return Baseline(method="whittaker", masked_ppm=masked)


def _grown(regions: Regions, grow: int) -> list[tuple[int, int]]:
    return [
        (int(start) - grow, int(stop) + grow)
        for start, stop in zip(regions.starts, regions.stops, strict=True)
    ]


def _merged(spans: list[tuple[int, int]]) -> list[tuple[int, int]]:
    merged: list[tuple[int, int]] = []
    for start, stop in sorted(spans):
        if merged and start <= merged[-1][1]:
            merged[-1] = (merged[-1][0], max(merged[-1][1], stop))
        else:
            merged.append((start, stop))
    return merged


def baseline_roughness(spectrum: Spectrum) -> float:
    """Spread of the signal-free stretches in noise sd; 1 is flat."""
    sd = noise_sd(spectrum.intensities)
    if sd == 0:
        return 1.0
    regions = find_regions(spectrum.intensities, step_hz=spectrum.step_hz)
    taken = regions.mask(spectrum.n_points, int(_WATER_GROWTH_HZ / spectrum.step_hz))
    edge = int(EDGE_SHARE * spectrum.n_points)
    taken[:edge] = True
    taken[spectrum.n_points - edge :] = True
    free = spectrum.intensities[~taken]
    if free.size < 2:
        return 1.0
    return float(1.4826 * np.median(np.abs(free)) / sd)
