"""The stored processing steps; re-running them gives the same spectrum bit for bit."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass, fields
from typing import Any, Literal


@dataclass(frozen=True, slots=True, kw_only=True)
class RemoveDelay:
    """Take the digital-filter delay out as a first-order phase after the FFT."""

    group_delay_points: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Apodize:
    """Window of the FID, time counted from the end of the delay.

    Attributes
    ----------
    kind : {"exponential", "gaussian", "lorentz_to_gauss", "sine_bell", "none"}
    line_broadening_hz : float, Hz
        Lorentzian broadening (negative narrows, for lorentz_to_gauss).
    gaussian_hz : float, Hz
        Gaussian full width at half maximum that is put on, where used.
    sine_power, sine_offset_deg : float
        Power and start angle of a sine bell.
    """

    kind: Literal["exponential", "gaussian", "lorentz_to_gauss", "sine_bell", "none"]
    line_broadening_hz: float = 0.0
    gaussian_hz: float = 0.0
    sine_power: float = 1.0
    sine_offset_deg: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class ZeroFill:
    """Extend the FID with zeros to ``n_points`` complex points."""

    n_points: int


@dataclass(frozen=True, slots=True, kw_only=True)
class FourierTransform:
    """Complex FFT; the first point is halved where no delay stands before it."""

    halve_first_point: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Phase:
    """Zero- and first-order phase: phase0 + phase1 * (x - pivot) over the width.

    ``x`` runs from -0.5 (lowest shift) to 0.5 (highest shift) over the sweep;
    ``pivot`` is in the same unit. ``automatic`` tells who chose it.
    """

    phase0_deg: float
    phase1_deg: float
    pivot: float = 0.0
    automatic: bool = True


@dataclass(frozen=True, slots=True, kw_only=True)
class Baseline:
    """Masked stiff Whittaker smoother on binned points, subtracted.

    Attributes
    ----------
    method : {"whittaker", "none"}
    stiffness : float
        Second-difference penalty on the binned axis.
    n_bins : int
    masked_ppm : tuple of (low_ppm, high_ppm)
        Stretches that hold signals and take no part.
    """

    method: Literal["whittaker", "none"]
    stiffness: float = 1e9
    n_bins: int = 8192
    masked_ppm: tuple[tuple[float, float], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Reference:
    """Shift of the axis, with who set it and how sure that is.

    Attributes
    ----------
    offset_ppm : float, ppm
        Added to every shift of the header's axis.
    by : str
        DSS, TMS, TSP, solvent, water, match, header, or user.
    sd_ppm : float, ppm
        Uncertainty of the zero point.
    line_ppm : float or None
        Where the reference line stands on the new axis.
    why : str
        One sentence.
    """

    offset_ppm: float
    by: str
    sd_ppm: float
    line_ppm: float | None = None
    why: str = ""


Step = (
    RemoveDelay | Apodize | ZeroFill | FourierTransform | Phase | Baseline | Reference
)
_STEPS: Mapping[str, type[Step]] = {
    kind.__name__: kind
    for kind in (
        RemoveDelay,
        Apodize,
        ZeroFill,
        FourierTransform,
        Phase,
        Baseline,
        Reference,
    )
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Recipe:
    """Processing steps in the order in which they run."""

    steps: tuple[Step, ...]

    def find(self, kind: type[Step]) -> Step | None:
        """First step of a kind, or None."""
        return next((step for step in self.steps if isinstance(step, kind)), None)

    def to_json(self) -> list[dict[str, Any]]:
        """Plain lists and numbers, one dict a step, with the step's name."""
        return [{"step": type(step).__name__, **asdict(step)} for step in self.steps]

    @classmethod
    def from_json(cls, rows: list[dict[str, Any]]) -> Recipe:
        """Recipe from what :meth:`to_json` gave.

        Raises
        ------
        ValueError
            If a step is unknown.
        """
        return cls(steps=tuple(_step_from_json(row) for row in rows))


def _step_from_json(row: dict[str, Any]) -> Step:
    kind = _STEPS.get(str(row.get("step")))
    if kind is None:
        raise ValueError(f"step: unknown processing step {row.get('step')!r}")
    names = {field.name for field in fields(kind)}
    given = {key: value for key, value in row.items() if key in names}
    if "masked_ppm" in given:
        given["masked_ppm"] = tuple(tuple(pair) for pair in given["masked_ppm"])
    return kind(**given)
