"""Running a stored recipe, whole or only from the step that changed.

Shifts in ppm, frequencies in Hz; the same recipe on the same raw data gives the
same numbers bit for bit.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TypeVar

import numpy as np
import numpy.typing as npt

from spinledger.processing.baseline import baseline_of
from spinledger.processing.phase import phased
from spinledger.processing.transform import apodized, fourier_transform
from spinledger.values.acquisition import Acquired, Fid, MakerSpectrum
from spinledger.values.arrays import locked_complex
from spinledger.values.recipe import (
    Apodize,
    Baseline,
    FourierTransform,
    Phase,
    Recipe,
    Reference,
    RemoveDelay,
    Step,
    ZeroFill,
)
from spinledger.values.spectrum import Spectrum

KindOfStep = TypeVar(
    "KindOfStep",
    RemoveDelay,
    Apodize,
    ZeroFill,
    FourierTransform,
    Phase,
    Baseline,
    Reference,
)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Transformed:
    """The complex spectrum before phase and baseline, on the header's axis.

    Attributes
    ----------
    values : numpy.ndarray, shape (n_points,), complex
        Highest shift first. Copied, locked.
    has_imaginary : bool
        False for a maker's spectrum without dispersive part: its phase is fixed.
    first_point_ppm : float, ppm
        By the header; where the carrier is unknown it is taken as 0 ppm and the
        recipe's reference puts the axis right.
    spectral_width_hz : float, Hz
    spectrometer_frequency_mhz : float, MHz
    """

    values: npt.NDArray[np.complex128]
    has_imaginary: bool
    first_point_ppm: float
    spectral_width_hz: float
    spectrometer_frequency_mhz: float

    def __post_init__(self) -> None:
        object.__setattr__(self, "values", locked_complex(self.values, "values"))

    @property
    def step_hz(self) -> float:
        """Distance of neighbouring points, Hz."""
        return self.spectral_width_hz / self.values.size


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Run:
    """A recipe that was run, with the intermediate result that makes re-runs fast.

    Attributes
    ----------
    acquired : Fid or MakerSpectrum
    recipe : Recipe
    transformed : Transformed
    spectrum : Spectrum
    """

    acquired: Acquired
    recipe: Recipe
    transformed: Transformed
    spectrum: Spectrum


def run_recipe(acquired: Acquired, recipe: Recipe) -> Spectrum:
    """Processed spectrum: every step of a recipe on raw data.

    Parameters
    ----------
    acquired : Fid or MakerSpectrum
        For a maker's spectrum only phase (where it has a dispersive part),
        baseline and reference apply.
    recipe : Recipe

    Raises
    ------
    ValueError
        If a step holds a value that cannot be run.
    """
    return start_run(acquired, recipe).spectrum


def start_run(acquired: Acquired, recipe: Recipe) -> Run:
    """Run a whole recipe and keep what a later change can start from."""
    transformed = transform(acquired, recipe)
    return Run(
        acquired=acquired,
        recipe=recipe,
        transformed=transformed,
        spectrum=finish(transformed, recipe),
    )


def rerun(run: Run, recipe: Recipe) -> Run:
    """Run another recipe on the same data, from the first step that differs.

    The result is the same, bit for bit, as that of :func:`start_run`.
    """
    if _early_steps(run.recipe) != _early_steps(recipe):
        return start_run(run.acquired, recipe)
    return replace(run, recipe=recipe, spectrum=finish(run.transformed, recipe))


def transform(acquired: Acquired, recipe: Recipe) -> Transformed:
    """Complex spectrum by the steps up to the Fourier transform."""
    if isinstance(acquired, MakerSpectrum):
        return _maker_values(acquired.spectrum)
    return _transformed_fid(acquired, recipe)


def finish(transformed: Transformed, recipe: Recipe) -> Spectrum:
    """Phase, baseline and reference, by a recipe's steps."""
    phase = find_step(recipe, Phase) if transformed.has_imaginary else None
    turned = phased(transformed.values, phase)
    spectrum = Spectrum(
        intensities=turned.real,
        imaginary=turned.imag if transformed.has_imaginary else None,
        first_point_ppm=transformed.first_point_ppm,
        spectral_width_hz=transformed.spectral_width_hz,
        spectrometer_frequency_mhz=transformed.spectrometer_frequency_mhz,
    )
    baseline = find_step(recipe, Baseline)
    if baseline is not None and baseline.method != "none":
        flat = spectrum.intensities - baseline_of(spectrum, baseline)
        spectrum = replace(spectrum, intensities=flat)
    reference = find_step(recipe, Reference)
    return spectrum if reference is None else referenced(spectrum, reference)


def referenced(spectrum: Spectrum, step: Reference) -> Spectrum:
    """Spectrum with its axis moved by a reference step."""
    return replace(spectrum, first_point_ppm=spectrum.first_point_ppm + step.offset_ppm)


def find_step(recipe: Recipe, kind: type[KindOfStep]) -> KindOfStep | None:
    """First step of a kind, or None, with its own type."""
    return next((step for step in recipe.steps if isinstance(step, kind)), None)


def with_step(recipe: Recipe, step: Step) -> Recipe:
    """Recipe in which the step of the same kind is replaced, or added at the end."""
    kinds = [type(old) for old in recipe.steps]
    if type(step) not in kinds:
        return Recipe(steps=(*recipe.steps, step))
    return Recipe(
        steps=tuple(step if type(old) is type(step) else old for old in recipe.steps)
    )


def _early_steps(recipe: Recipe) -> tuple[Step, ...]:
    late = (Phase, Baseline, Reference)
    return tuple(step for step in recipe.steps if not isinstance(step, late))


def _maker_values(spectrum: Spectrum) -> Transformed:
    imaginary = spectrum.imaginary
    has_imaginary = imaginary is not None
    values = spectrum.intensities.astype(np.complex128)
    if imaginary is not None:
        values.imag = imaginary
    return Transformed(
        values=values,
        has_imaginary=has_imaginary,
        first_point_ppm=spectrum.first_point_ppm,
        spectral_width_hz=spectrum.spectral_width_hz,
        spectrometer_frequency_mhz=spectrum.spectrometer_frequency_mhz,
    )


def _transformed_fid(fid: Fid, recipe: Recipe) -> Transformed:
    delay = find_step(recipe, RemoveDelay)
    delay_points = delay.group_delay_points if delay else 0.0
    window = find_step(recipe, Apodize)
    filled = find_step(recipe, ZeroFill)
    fft = find_step(recipe, FourierTransform)
    n_points = filled.n_points if filled else fid.samples.size
    values = fourier_transform(
        apodized(fid, window, group_delay_points=delay_points),
        n_points=n_points,
        halve_first_point=fft.halve_first_point if fft else False,
        group_delay_points=delay_points,
    )
    frequency_mhz = fid.metadata.spectrometer_frequency_mhz
    top = ((n_points + 1) // 2 - 1) / n_points
    carrier_ppm = fid.carrier_ppm if fid.carrier_ppm is not None else 0.0
    return Transformed(
        values=values,
        has_imaginary=True,
        first_point_ppm=carrier_ppm + top * fid.spectral_width_hz / frequency_mhz,
        spectral_width_hz=fid.spectral_width_hz,
        spectrometer_frequency_mhz=frequency_mhz,
    )
