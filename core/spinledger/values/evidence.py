"""The spectrum side: lines, signals, recognised strays and how sure they are.

Shifts in ppm, widths in Hz (full width at half maximum), areas in intensity * Hz.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt

from spinledger.values.acquisition import Metadata
from spinledger.values.arrays import locked_floats
from spinledger.values.recipe import Recipe, Reference
from spinledger.values.spectrum import Spectrum

StrayKind = Literal[
    "solvent",
    "water",
    "reference",
    "impurity",
    "satellite",
    "sideband",
    "given",
    "unexplained",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """One resonance line: centre, area and width, each with its sd."""

    shift_ppm: float
    shift_sd_ppm: float
    area: float
    area_sd: float
    width_hz: float
    width_sd_hz: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Signal:
    """Lines that belong together, with their range and summed integral."""

    low_ppm: float
    high_ppm: float
    area: float
    area_sd: float
    lines: tuple[Line, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Stray:
    """A stretch of the spectrum that no claim owns.

    ``why`` is one sentence; ``protons`` is its size on the ledger's proton
    scale once that is known.
    """

    low_ppm: float
    high_ppm: float
    kind: StrayKind
    why: str
    protons: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class ProcessingQuality:
    """How far the automatic processing is to be trusted.

    Attributes
    ----------
    phase_sd_deg : float or None, deg
        Estimated error of the phase; None where it was not ours to set.
    baseline_sd : float
        Roughness of the signal-free stretches in noise sd (1 is flat).
    doubts : tuple of str
        One plain sentence for each thing that is doubtful (phase, clipping,
        truncated FID, narrow sweep, presaturation, ...).
    """

    phase_sd_deg: float | None
    baseline_sd: float
    doubts: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class LineKernel:
    """Common line shape learned from an isolated reference singlet.

    A sum of Lorentzians at ``offsets_hz`` from the true position with
    ``weights`` (sum 1), all of full width ``width_hz``.
    """

    offsets_hz: npt.NDArray[np.float64]
    weights: npt.NDArray[np.float64]
    width_hz: float

    def __post_init__(self) -> None:
        for name in ("offsets_hz", "weights"):
            owned = locked_floats(getattr(self, name), name)
            object.__setattr__(self, name, owned)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Evidence:
    """Everything the spectrum says, before any structure is asked.

    Attributes
    ----------
    metadata : Metadata
    recipe : Recipe
    reference : Reference
    spectrum : Spectrum
        Phased, flat, on the referenced axis.
    noise_sd : float
        Of one point of ``spectrum``.
    solvent : str or None
        The one that is used: given by the user, else seen, else header.
    solvent_seen, solvent_header : str or None
    signals : tuple of Signal
        By descending shift; all regions with lines, strays included.
    strays : tuple of Stray
        Recognised without a structure: solvent, water, reference, satellites,
        sidebands. The match may still give such a stretch to a claim.
    quality : ProcessingQuality
    kernel : LineKernel or None
    presaturated : bool
        The pulse program irradiates or suppresses water: integrals near it
        and of fast-exchanging neighbours are not to be trusted.
    """

    metadata: Metadata
    recipe: Recipe
    reference: Reference
    spectrum: Spectrum
    noise_sd: float
    solvent: str | None
    solvent_seen: str | None
    solvent_header: str | None
    signals: tuple[Signal, ...]
    strays: tuple[Stray, ...]
    quality: ProcessingQuality
    kernel: LineKernel | None = None
    presaturated: bool = False
