"""Automatic processing: raw data in, recipe and referenced spectrum out."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from spinledger.errors import EvidenceError, UsageError
from spinledger.lines.picking import pick_lines
from spinledger.processing.automatic_baseline import automatic_baseline
from spinledger.processing.automatic_phase import automatic_phase
from spinledger.processing.automatic_window import (
    automatic_line_broadening,
    automatic_size,
)
from spinledger.processing.found_regions import found_regions
from spinledger.processing.presaturation import is_presaturated
from spinledger.processing.quality import acquisition_doubts, baseline_roughness
from spinledger.processing.recipe import (
    Run,
    find_step,
    finish,
    referenced,
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
from spinledger.processing.solvents import (
    canonical_solvent,
    is_aqueous,
    solvent_names,
)
from spinledger.values.acquisition import Acquired, Fid
from spinledger.values.evidence import ProcessingQuality
from spinledger.values.recipe import (
    Apodize,
    FourierTransform,
    Recipe,
    Reference,
    RemoveDelay,
    ZeroFill,
)
from spinledger.values.spectrum import Spectrum

_LEAST_SAMPLES = 256
_LEAST_SPECTRUM_POINTS = 512


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
    EvidenceError
        If there are too few points for a spectrum with lines, or all are zero.
    UsageError
        If the solvent is not in the table.
    """
    facts = solvent_facts(acquired, solvent=solvent, temperature_k=temperature_k)
    _check_size(acquired)
    presaturated = is_presaturated(acquired.metadata.pulse_program)
    recipe = starting_recipe(acquired)
    transformed = transform(acquired, recipe)
    regions = found_regions(
        transformed,
        water_at_carrier=presaturated or is_aqueous(facts.given or facts.header),
    )
    phase = None
    if isinstance(acquired, Fid):
        phase = automatic_phase(transformed, regions)
        recipe = recipe if phase is None else with_step(recipe, phase.step)
    recipe = with_step(recipe, automatic_baseline(transformed, regions))
    flat = finish(transformed, recipe)
    picks = pick_lines(flat.intensities, step_hz=flat.step_hz)
    referencing = choose_reference(flat, picks, facts=facts)
    recipe = with_step(recipe, referencing.reference)
    spectrum = referenced(flat, referencing.reference)
    doubts = (
        *acquisition_doubts(acquired, recipe, spectrum),
        *(phase.doubts if phase else ()),
        *referencing.doubts,
    )
    return ProcessedSpectrum(
        run=Run(
            acquired=acquired, recipe=recipe, transformed=transformed, spectrum=spectrum
        ),
        referencing=referencing,
        solvent_header=facts.header,
        quality=ProcessingQuality(
            phase_sd_deg=phase.sd_deg if phase else None,
            baseline_sd=baseline_roughness(spectrum),
            doubts=doubts,
        ),
        presaturated=presaturated,
    )


def _check_size(acquired: Acquired) -> None:
    """Refuse what cannot hold lines, in one sentence."""
    name = acquired.metadata.source_name
    if isinstance(acquired, Fid):
        count, least, what = acquired.samples.size, _LEAST_SAMPLES, "FID"
        is_empty = not np.any(acquired.samples)
    else:
        count, least = acquired.spectrum.n_points, _LEAST_SPECTRUM_POINTS
        what = "spectrum"
        is_empty = np.ptp(acquired.spectrum.intensities) == 0
    if count < least:
        raise EvidenceError(
            name,
            f"the {what} has only {count} points, and {least} are the least that "
            "could show lines; look for the whole data set",
        )
    if is_empty:
        raise EvidenceError(name, f"the {what} is empty: all its points are the same")


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
    EvidenceError
        If there are too few points for a spectrum with lines, or all are zero.
    UsageError
        If the solvent is not in the table.
    ValueError
        If a step cannot be run.
    """
    facts = solvent_facts(acquired, solvent=solvent, temperature_k=temperature_k)
    _check_size(acquired)
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
        doubts=(
            *acquisition_doubts(acquired, recipe, run.spectrum),
            *referencing.doubts,
        ),
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
            known = ", ".join(solvent_names())
            raise UsageError(
                f"the solvent {solvent!r} is not known; use one of {known}"
            )
    written = acquired.metadata.solvent
    header = None if written is None else canonical_solvent(written) or written
    return SolventFacts(
        given=given,
        header=header,
        temperature_k=temperature_k or acquired.metadata.temperature_k,
        is_maker_axis=not isinstance(acquired, Fid),
        has_axis=not isinstance(acquired, Fid) or acquired.carrier_ppm is not None,
    )


def starting_recipe(acquired: Acquired) -> Recipe:
    """Steps up to the Fourier transform, chosen by the FID; none for a spectrum."""
    if not isinstance(acquired, Fid):
        return Recipe(steps=())
    return Recipe(
        steps=(
            RemoveDelay(group_delay_points=acquired.group_delay_points),
            Apodize(
                kind="exponential",
                line_broadening_hz=automatic_line_broadening(acquired),
            ),
            ZeroFill(n_points=automatic_size(acquired)),
            FourierTransform(halve_first_point=acquired.group_delay_points == 0),
        )
    )
