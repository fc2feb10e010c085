"""What the lanes show: traces, signals, strays and trees of evidence and ledger."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from types import MappingProxyType

import numpy as np
import numpy.typing as npt

from spinledger.values.evidence import Evidence, Signal, Stray
from spinledger.values.ledger import Ledger
from spinledger_app.lanes.folds import filled_stretches
from spinledger_app.lanes.pyramid import Pyramid
from spinledger_app.lanes.scene import (
    Foot,
    IntegralCurve,
    LaneScene,
    SignalMark,
    Trace,
)
from spinledger_app.lanes.shift_map import Stretch
from spinledger_app.presenters.trees import trees
from spinledger_app.presenters.wording import chemical, number, protons, say

_AXIS_LEAST = Stretch(high_ppm=9.0, low_ppm=-0.5)
_AXIS_MARGIN_PPM = 0.6
_INTEGRAL_POINTS = 160
# Solvent, water and reference lines may rise out of the lane; claims must not.
_SUBSTANCES: Mapping[str, re.Pattern[str]] = MappingProxyType(
    {
        "solvent": re.compile(r"[Rr]esidual (\S+) of"),
        "water": re.compile(r"^(\S+) in "),
        "reference": re.compile(r"\b(TMS|DSS|TSP)\b"),
    }
)
# These do not deserve a stretch of the folded axis of their own.
_NO_STRETCH = ("satellite", "sideband")
_MUCH_WIDER = 5.0
# Lines lower than this share of the lane are under a pixel high.
_WEAK_SHARE = 0.01
_LONGEST_NAME = 18
# Amounts below this are told by the mouse only; numbers would crowd the lane.
_LEAST_SHOWN_PROTONS = 0.04
_MAY_BE_CUT = ("solvent", "water", "reference", "satellite", "sideband")


def measured_trace(evidence: Evidence) -> Trace:
    """The measured spectrum, ready to be drawn."""
    spectrum = evidence.spectrum
    return Trace(
        pyramid=Pyramid(spectrum.intensities),
        first_point_ppm=spectrum.first_point_ppm,
        step_ppm=spectrum.step_ppm,
    )


def lane_scene(
    evidence: Evidence,
    ledger: Ledger | None,
    *,
    measured: Trace | None = None,
    excluded_ppm: tuple[tuple[float, float], ...] = (),
    unit_area: float | None = None,
) -> LaneScene:
    """Scene of one project; pure arithmetic, safe outside the window's thread.

    Parameters
    ----------
    measured : Trace or None
        The evidence's trace where it is already at hand.
    unit_area : float or None
        Area of one proton where it was set by hand.
    """
    spectrum = evidence.spectrum
    trace = measured if measured is not None else measured_trace(evidence)
    strays = evidence.strays if ledger is None else ledger.strays
    marks = signal_marks(evidence, ledger, strays, unit_area)
    grown = trees(ledger) if ledger is not None else ()
    whole = whole_axis(evidence)
    height = full_height(trace, marks, strays)
    model = None if ledger is None or ledger.model is None else ledger.model.intensities
    residue = None
    if model is not None and model.size == spectrum.n_points:
        residue = _trace((spectrum.intensities - model) / evidence.noise_sd, trace)
    return LaneScene(
        frequency_mhz=spectrum.spectrometer_frequency_mhz,
        whole=whole,
        folds=filled_stretches(
            spectrum,
            _kept_ranges(trace, marks, strays, (whole, height)),
            whole=whole,
            lines=[line for signal in evidence.signals for line in signal.lines],
            places_ppm=[
                tree.root_ppm
                for tree in grown
                if tree.state == "open" and whole.holds(tree.root_ppm)
            ],
        ),
        measured=trace,
        noise_sd=evidence.noise_sd,
        full_height=height,
        model=None if model is None else _trace(model, trace),
        residue=residue,
        signals=marks,
        feet=_feet(evidence, marks),
        trees=grown,
        integrals=_integrals(evidence, strays),
        excluded_ppm=excluded_ppm,
        partners={} if ledger is None else _partners(ledger),
    )


def _kept_ranges(
    trace: Trace,
    marks: Sequence[SignalMark],
    strays: Sequence[Stray],
    whole_and_height: tuple[Stretch, float],
) -> list[tuple[float, float]]:
    """Ranges that the folded axis must show.

    Satellites, sidebands and lines too weak to be seen beside the tallest claim
    are left to the continuous axis, unless a claim owns them or the ledger names
    them unexplained.
    """
    whole, height = whole_and_height
    aside = {(s.low_ppm, s.high_ppm) for s in strays if s.kind in _NO_STRETCH}
    kept = []
    for mark in marks:
        span = (mark.low_ppm, mark.high_ppm)
        is_weak = trace.highest(mark.high_ppm, mark.low_ppm) < _WEAK_SHARE * height
        is_wanted = mark.claims or mark.stray == "unexplained" or not is_weak
        is_inside = span[1] > whole.low_ppm and span[0] < whole.high_ppm
        if is_inside and span not in aside and is_wanted:
            kept.append(span)
    return kept


def whole_axis(evidence: Evidence) -> Stretch:
    """Continuous axis: all signals with a margin, 9 to -0.5 ppm at least."""
    spectrum = evidence.spectrum
    lows = [signal.low_ppm for signal in evidence.signals]
    highs = [signal.high_ppm for signal in evidence.signals]
    high = max([_AXIS_LEAST.high_ppm, *(h + _AXIS_MARGIN_PPM for h in highs)])
    low = min([_AXIS_LEAST.low_ppm, *(one - _AXIS_MARGIN_PPM / 2 for one in lows)])
    high = min(high, spectrum.first_point_ppm)
    low = max(low, spectrum.last_point_ppm)
    return Stretch(high_ppm=high, low_ppm=low)


def signal_marks(
    evidence: Evidence,
    ledger: Ledger | None,
    strays: Sequence[Stray],
    unit_area: float | None = None,
) -> tuple[SignalMark, ...]:
    """Brackets: signals with their protons and owners, strays by name."""
    unit = unit_area or proton_area(evidence, ledger)
    marks = []
    for index, signal in enumerate(evidence.signals):
        owners = _owners(signal, ledger)
        stray = _stray_over(signal, strays)
        if stray is not None and not owners:
            continue
        amount = signal.area / unit if unit else 0.0
        marks.append(
            SignalMark(
                key=f"signal {index}",
                low_ppm=signal.low_ppm,
                high_ppm=signal.high_ppm,
                text=number(amount, 2) if amount >= _LEAST_SHOWN_PROTONS else "",
                claims=owners,
                tip=_signal_tip(signal, amount, owners),
            )
        )
    marks += [_stray_mark(i, stray) for i, stray in enumerate(strays)]
    return tuple(sorted(marks, key=lambda mark: -mark.centre_ppm))


def _stray_mark(index: int, stray: Stray) -> SignalMark:
    is_known = stray.kind != "unexplained"
    return SignalMark(
        key=f"stray {index}",
        low_ppm=stray.low_ppm,
        high_ppm=stray.high_ppm,
        text="",
        stray="known" if is_known else "unexplained",
        name=stray_name(stray),
        tip=stray.why,
    )


def stray_name(stray: Stray) -> str:
    """Short name of a stray: the substance where its reason names one."""
    if stray.kind == "unexplained":
        return say("unexplained")
    if stray.kind == "satellite":
        return "¹³C"
    pattern = _SUBSTANCES.get(stray.kind)
    found = pattern.search(stray.why) if pattern is not None else None
    if found is not None:
        return chemical(found.group(1))
    head = stray.why.split(":")[0].split(",")[0].strip().rstrip(".")
    return chemical(head) if 0 < len(head) <= _LONGEST_NAME else say(stray.kind)


def proton_area(evidence: Evidence, ledger: Ledger | None) -> float:
    """Area of one proton: the model's, or before it the smallest clear signal's."""
    if ledger is not None and ledger.model is not None:
        return ledger.model.area_per_proton
    owned = [
        signal.area
        for signal in evidence.signals
        if _stray_over(signal, evidence.strays) is None and signal.area > 0
    ]
    if not owned:
        return 0.0
    clear = [area for area in owned if area > 0.08 * max(owned)]
    return min(clear)


def full_height(
    trace: Trace, marks: Sequence[SignalMark], strays: Sequence[Stray]
) -> float:
    """Intensity that fills the lane: the tallest signal that no known stray makes."""
    cut = [
        (stray.low_ppm, stray.high_ppm) for stray in strays if stray.kind in _MAY_BE_CUT
    ]
    heights = [
        trace.highest(mark.high_ppm, mark.low_ppm)
        for mark in marks
        if (mark.low_ppm, mark.high_ppm) not in cut
    ]
    tallest = max(heights, default=0.0)
    if tallest > 0:
        return tallest
    whole = trace.pyramid.extremes(0, trace.pyramid.n_points)[1]
    return whole if whole > 0 else 1.0


def _trace(values: npt.NDArray[np.float64], like: Trace) -> Trace:
    return Trace(
        pyramid=Pyramid(np.asarray(values, dtype=np.float64)),
        first_point_ppm=like.first_point_ppm,
        step_ppm=like.step_ppm,
    )


def _owners(signal: Signal, ledger: Ledger | None) -> tuple[str, ...]:
    if ledger is None:
        return ()
    owners = []
    for entry in ledger.entries:
        if entry.shift_ppm is None:
            continue
        low, high = entry.range_ppm or (entry.shift_ppm, entry.shift_ppm)
        shared = min(high, signal.high_ppm) - max(low, signal.low_ppm)
        is_inside = signal.low_ppm <= entry.shift_ppm <= signal.high_ppm
        if is_inside or shared > 0.3 * (signal.high_ppm - signal.low_ppm):
            owners.append(entry.claim)
    return tuple(owners)


def _stray_over(signal: Signal, strays: Sequence[Stray]) -> Stray | None:
    """The stray that a signal is, if it is one and not much wider than it."""
    width = signal.high_ppm - signal.low_ppm
    for stray in strays:
        own = stray.high_ppm - stray.low_ppm
        shared = min(stray.high_ppm, signal.high_ppm) - max(
            stray.low_ppm, signal.low_ppm
        )
        if shared > 0.5 * min(width, own) and width < _MUCH_WIDER * own:
            return stray
    return None


def _signal_tip(signal: Signal, amount: float, owners: tuple[str, ...]) -> str:
    centre = (signal.low_ppm + signal.high_ppm) / 2
    parts = [
        say("Signal at {0} ppm").replace("{0}", number(centre, 3)),
        say("{0} to {1} ppm")
        .replace("{0}", number(signal.high_ppm, 3))
        .replace("{1}", number(signal.low_ppm, 3)),
        protons(amount),
    ]
    if owners:
        parts.append(say("owned by {0}").replace("{0}", ", ".join(owners)))
    return ", ".join(parts)


def _feet(evidence: Evidence, marks: Sequence[SignalMark]) -> tuple[Foot, ...]:
    feet = []
    for signal in evidence.signals:
        strongest = max((line.area for line in signal.lines), default=0.0)
        for line in signal.lines:
            if line.area < 0.01 * strongest:
                continue
            owners = next(
                (m.claims for m in marks if m.low_ppm <= line.shift_ppm <= m.high_ppm),
                (),
            )
            feet.append(Foot(shift_ppm=line.shift_ppm, claims=owners))
    return tuple(feet)


def _integrals(
    evidence: Evidence, strays: Sequence[Stray]
) -> tuple[IntegralCurve, ...]:
    curves = []
    spectrum = evidence.spectrum
    for signal in evidence.signals:
        stray = _stray_over(signal, strays)
        if stray is not None and stray.kind in _MAY_BE_CUT:
            continue
        window = spectrum.window(signal.low_ppm, signal.high_ppm)
        running = np.cumsum(spectrum.intensities[window])
        if running.size < 2 or running[-1] <= 0:
            continue
        at = np.linspace(0, running.size - 1, _INTEGRAL_POINTS)
        shares = np.interp(at, np.arange(running.size), running / running[-1])
        curves.append(
            IntegralCurve(
                low_ppm=signal.low_ppm,
                high_ppm=signal.high_ppm,
                shares=shares,
                amount=signal.area,
            )
        )
    return tuple(curves)


def _partners(ledger: Ledger) -> dict[str, tuple[str, ...]]:
    return {
        entry.claim: tuple(dict.fromkeys(c.partner for c in entry.couplings))
        for entry in ledger.entries
    }
