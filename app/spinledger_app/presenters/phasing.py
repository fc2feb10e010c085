"""Phase by hand: the spectrum turned at once, before it is processed anew.

Phases in degrees; a place on the sweep runs from -0.5 (lowest shift) to 0.5.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from spinledger.processing.phase import linear_phasor
from spinledger.values.evidence import Evidence
from spinledger.values.recipe import Phase, Recipe, Step
from spinledger_app.lanes.pyramid import Pyramid
from spinledger_app.lanes.scene import Trace


@dataclass(frozen=True, slots=True, kw_only=True)
class PhaseSetting:
    """Zero and first order about a pivot, as a recipe's step has them."""

    phase0_deg: float
    phase1_deg: float
    pivot: float

    @classmethod
    def of(cls, step: Phase) -> PhaseSetting:
        """Setting of a recipe's step."""
        return cls(
            phase0_deg=step.phase0_deg, phase1_deg=step.phase1_deg, pivot=step.pivot
        )

    def pivoted(self, pivot: float) -> PhaseSetting:
        """The same phase everywhere, said about another pivot."""
        phase0 = self.phase0_deg + self.phase1_deg * (pivot - self.pivot)
        return replace(self, phase0_deg=phase0, pivot=pivot)

    def turned(self, phase0_deg: float, phase1_deg: float) -> PhaseSetting:
        """With so much more of both orders; the pivot stays as it is."""
        return replace(
            self,
            phase0_deg=self.phase0_deg + phase0_deg,
            phase1_deg=self.phase1_deg + phase1_deg,
        )


class PhaseTrial:
    """A spectrum with its dispersive half, ready to be turned.

    The dispersive half is the Hilbert transform of the absorptive one: exact for a
    FID that was zero-filled to twice its length, before the baseline is corrected.
    What is shown while dragging is therefore a sketch; the recipe is run when the
    phase is taken.
    """

    def __init__(self, evidence: Evidence) -> None:
        step = evidence.recipe.find(Phase)
        if not isinstance(step, Phase):
            raise ValueError("recipe: there is no phase step to change")
        spectrum = evidence.spectrum
        self._spectrum = spectrum
        self._complex = with_dispersion(spectrum.intensities)
        self.start = PhaseSetting.of(step)

    def trace(self, setting: PhaseSetting) -> Trace:
        """The measured trace as it would be with another phase."""
        difference = setting.turned(0.0, -self.start.phase1_deg)
        # Both said about the middle of the sweep, so that they can be subtracted.
        middle = setting.pivoted(0.0).phase0_deg - self.start.pivoted(0.0).phase0_deg
        phasor = linear_phasor(
            self._complex.size,
            math.radians(middle),
            math.radians(difference.phase1_deg),
        )
        values = np.ascontiguousarray((self._complex * phasor).real)
        return Trace(
            pyramid=Pyramid(values),
            first_point_ppm=self._spectrum.first_point_ppm,
            step_ppm=self._spectrum.step_ppm,
        )

    def place_of(self, shift_ppm: float) -> float:
        """Place of a shift on the sweep."""
        spectrum = self._spectrum
        index = (spectrum.first_point_ppm - shift_ppm) / spectrum.step_ppm
        return 0.5 - index / spectrum.n_points

    def shift_of(self, place: float) -> float:
        """Shift of a place on the sweep, ppm."""
        spectrum = self._spectrum
        index = (0.5 - place) * spectrum.n_points
        return spectrum.first_point_ppm - index * spectrum.step_ppm

    def tallest_ppm(self) -> float:
        """Shift of the tallest point: where the pivot starts."""
        index = int(np.argmax(np.abs(self._complex)))
        return self._spectrum.first_point_ppm - index * self._spectrum.step_ppm


def with_dispersion(
    absorption: npt.NDArray[np.float64],
) -> npt.NDArray[np.complex128]:
    """Complex spectrum whose real part is given and whose FID is one-sided.

    Index 0 is the highest shift, so that time runs against the inverse transform.
    """
    n_points = absorption.size
    times = np.fft.fft(absorption)
    window = np.zeros(n_points)
    window[0] = 1.0
    window[1 : (n_points + 1) // 2] = 2.0
    if n_points % 2 == 0:
        window[n_points // 2] = 1.0
    return np.asarray(np.fft.ifft(times * window))


def with_setting(recipe: Recipe, setting: PhaseSetting) -> Recipe:
    """Recipe with a phase that was set by hand.

    Raises
    ------
    ValueError
        If the recipe has no phase step.
    """
    steps: list[Step] = []
    found = False
    for step in recipe.steps:
        if isinstance(step, Phase):
            found = True
            steps.append(
                Phase(
                    phase0_deg=setting.phase0_deg,
                    phase1_deg=setting.phase1_deg,
                    pivot=setting.pivot,
                    automatic=False,
                )
            )
        else:
            steps.append(step)
    if not found:
        raise ValueError("recipe: there is no phase step to change")
    return Recipe(steps=tuple(steps))
