"""What the recipe strip shows: one chip a step."""

from __future__ import annotations

from dataclasses import dataclass

from spinledger.values.acquisition import Acquired, Fid
from spinledger.values.evidence import Evidence
from spinledger.values.recipe import (
    Apodize,
    Baseline,
    FourierTransform,
    Phase,
    Reference,
    RemoveDelay,
    Step,
    ZeroFill,
)
from spinledger_app.presenters.wording import chemical, number, say

_KIBI = 1024


@dataclass(frozen=True, slots=True, kw_only=True)
class ChipText:
    """One step: name over value; ``step`` is its index, -1 for reading."""

    step: int
    name: str
    value: str
    tip: str
    is_by_hand: bool = False
    is_off: bool = False


def chips(acquired: Acquired | None, evidence: Evidence | None) -> tuple[ChipText, ...]:
    """Chips of the spectrum that is shown."""
    if acquired is None and evidence is None:
        return ()
    made = [_read_chip(acquired, evidence)]
    if evidence is not None:
        made += [
            _chip(index, step, evidence)
            for index, step in enumerate(evidence.recipe.steps)
        ]
    return tuple(made)


def summary(evidence: Evidence) -> str:
    """Sample, solvent, temperature and acquisition in one line."""
    meta = evidence.metadata
    parts = [meta.source_name]
    if evidence.solvent:
        parts.append(chemical(evidence.solvent))
    if meta.temperature_k is not None:
        parts.append(f"{meta.temperature_k:.1f} K")
    if meta.n_scans is not None:
        parts.append(say("{0} scans").replace("{0}", str(meta.n_scans)))
    if meta.relaxation_delay_s is not None:
        parts.append(say("delay {0} s").replace("{0}", f"{meta.relaxation_delay_s:g}"))
    if meta.pulse_length_us is not None:
        parts.append(say("pulse {0} µs").replace("{0}", f"{meta.pulse_length_us:g}"))
    return ", ".join(parts)


def _read_chip(acquired: Acquired | None, evidence: Evidence | None) -> ChipText:
    meta = evidence.metadata if evidence is not None else acquired.metadata  # type: ignore[union-attr]
    if isinstance(acquired, Fid):
        value = f"FID {_points(acquired.samples.size)}"
    elif evidence is not None and evidence.recipe.find(FourierTransform) is not None:
        value = "FID"
    else:
        value = say("spectrum")
    tip = [meta.format_name, meta.source_name, *meta.notes]
    return ChipText(step=-1, name=say("Read"), value=value, tip="\n".join(tip))


def _points(n_points: int) -> str:
    if n_points >= _KIBI and n_points % _KIBI == 0:
        return f"{n_points // _KIBI}k"
    return f"{n_points / _KIBI:.0f}k" if n_points > 4 * _KIBI else str(n_points)


def _chip(index: int, step: Step, evidence: Evidence) -> ChipText:
    name, value, tip = _words(step)
    by_hand = isinstance(step, Phase) and not step.automatic
    by_hand = by_hand or (isinstance(step, Reference) and step.by == "user")
    is_off = isinstance(step, Apodize | Baseline) and (
        getattr(step, "kind", "") == "none" or getattr(step, "method", "") == "none"
    )
    if isinstance(step, Phase) and evidence.quality.phase_sd_deg is not None:
        sd = number(evidence.quality.phase_sd_deg, 1)
        tip += "\n" + say("estimated error {0}°").replace("{0}", sd)
    return ChipText(
        step=index, name=name, value=value, tip=tip, is_by_hand=by_hand, is_off=is_off
    )


def _words(step: Step) -> tuple[str, str, str]:
    match step:
        case RemoveDelay():
            value = f"{step.group_delay_points:.2f}"
            return say("Delay"), value, say("Digital-filter delay, points")
        case Apodize():
            return say("Window"), _window(step), say("Window of the FID")
        case ZeroFill():
            return say("Fill"), _points(step.n_points), say("Points after zero filling")
        case FourierTransform():
            return say("FFT"), say("complex"), say("Complex Fourier transform")
        case Phase():
            value = f"{number(step.phase0_deg, 1)}°, {number(step.phase1_deg, 1)}°"
            who = say("automatic") if step.automatic else say("by hand")
            return say("Phase"), value, say("Zero and first order") + ", " + who
        case Baseline():
            value = say("off") if step.method == "none" else say("smooth")
            return say("Baseline"), value, say("Stiff smoother under the signals")
        case Reference():
            return say("Reference"), _reference(step), step.why


def _window(step: Apodize) -> str:
    width = f"{number(step.line_broadening_hz, 2)} Hz"
    if step.kind == "none":
        return say("none")
    if step.kind == "exponential":
        return f"exp {width}"
    if step.kind == "gaussian":
        return f"gauss {step.gaussian_hz:.2f} Hz"
    if step.kind == "lorentz_to_gauss":
        lorentz = number(step.line_broadening_hz, 1)
        return f"{lorentz} → {step.gaussian_hz:.1f} Hz"
    return f"sine, {step.sine_offset_deg:.0f}°"


def _reference(step: Reference) -> str:
    if step.line_ppm is not None:
        return f"{chemical(step.by)} {number(step.line_ppm, 3)}"
    return say(step.by)
