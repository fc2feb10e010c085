"""How much of each exchangeable proton a shake with heavy water has taken.

Shifts in ppm, widths in Hz, areas in intensity * Hz.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from spinledger.sample.align import Alignment, align, robust_scale
from spinledger.sample.shim import Matched, match_widths
from spinledger.sample.traces import (
    FLANK_SHARE,
    Integral,
    Range,
    integral,
    trace_of,
    trace_upon,
)
from spinledger.values.evidence import Evidence

# A Lorentz line keeps 94 % of its area within five widths on each side.
REACH_WIDTHS = 5.0
LEAST_REACH_HZ = 8.0
LOOKS_THE_SAME = 0.02
# Areas of one spectrum agree with the proton counts no better than this
# [common practice].
LEAST_STOICHIOMETRY_SD = 0.02
# Tails, phase and drift leave two integrals of one proton this unlike
# [common practice].
REPEAT_SD = 0.01


@dataclass(frozen=True, slots=True, kw_only=True)
class Plot:
    """Where a claim stands in the spectrum before the shake.

    Attributes
    ----------
    claim : str
    n_protons : float
    low_ppm, high_ppm : float, ppm
        Outermost lines.
    width_hz : float, Hz
    frequency_mhz : float, MHz
    may_exchange : bool
    """

    claim: str
    n_protons: float
    low_ppm: float
    high_ppm: float
    width_hz: float
    frequency_mhz: float
    may_exchange: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class ExchangedFraction:
    """Share of a claim's protons that the shake has replaced.

    Attributes
    ----------
    claims : tuple of str
        One claim, or several that cannot be told apart and count together.
    n_protons : float
    low_ppm, high_ppm : float, ppm
        What was integrated.
    fraction, sd : float or None
        0 unchanged, 1 all gone; None where it cannot be told.
    is_alone : bool
        Integrated by itself; else what lies with it was taken off by its
        proton count.
    why : str
        One sentence where it cannot be told or is taken from an overlap.
    """

    claims: tuple[str, ...]
    n_protons: float
    low_ppm: float
    high_ppm: float
    fraction: float | None
    sd: float | None
    is_alone: bool
    why: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Loss:
    """A claim that must not exchange and still changed its area.

    ``fraction`` is the lost share (negative for a gain).
    """

    claims: tuple[str, ...]
    fraction: float
    sd: float


@dataclass(frozen=True, slots=True, kw_only=True)
class ShakeAreas:
    """Areas before and after, put on one scale.

    Attributes
    ----------
    alignment : Alignment
        Its scale is that of the signals that do not exchange.
    fractions : tuple of ExchangedFraction
    losses : tuple of Loss
        Only those beyond four sd and a fifth of the area.
    stoichiometry_sd : float
        Relative scatter of area over proton count before the shake.
    """

    alignment: Alignment
    fractions: tuple[ExchangedFraction, ...]
    losses: tuple[Loss, ...]
    stoichiometry_sd: float


@dataclass(frozen=True, slots=True, kw_only=True)
class _Field:
    """Claims whose windows touch, with the window around all of them."""

    plots: tuple[Plot, ...]
    low_ppm: float
    high_ppm: float

    @property
    def exchanging(self) -> tuple[Plot, ...]:
        return tuple(one for one in self.plots if one.may_exchange)

    @property
    def steady(self) -> tuple[Plot, ...]:
        return tuple(one for one in self.plots if not one.may_exchange)


def exchanged_areas(
    before: Evidence,
    after: Evidence,
    plots: Sequence[Plot],
    *,
    waters: Sequence[Range] = (),
) -> ShakeAreas:
    """Exchanged share of every claim that may exchange.

    Parameters
    ----------
    before, after : Evidence
    plots : sequence of Plot
        Every claim that was placed in the spectrum before the shake.
    waters : sequence of (low_ppm, high_ppm)
        Water in either spectrum, on the axis of the first.

    Raises
    ------
    EvidenceError
        If there is no common signal that does not exchange.

    Notes
    -----
    With W the area over a window before and after, s the scale of the steady
    signals and O the area of the steady protons inside the window,
    f = (W_before - s W_after) / (W_before - O). A coupling that collapses moves
    intensity inside the window only. First-order sd from the noise of both
    integrals, the scale, and the scatter of area over proton count.
    """
    fields = _fields(plots, before.spectrum.spectrometer_frequency_mhz)
    steady = [one for one in fields if not one.exchanging]
    alignment = align(before, after, [_core(one) for one in steady])
    matched = matched_traces(before, after, alignment)
    first, second = matched.main, matched.other
    pairs = {
        one: (
            integral(first, one.low_ppm, one.high_ppm),
            integral(second, one.low_ppm, one.high_ppm),
        )
        for one in fields
    }
    known = [pairs[one] for one in steady if min(_areas(pairs[one])) > 0.0]
    if known:
        alignment = _with_scale(alignment, known)
    per_proton = _per_proton(steady, pairs)
    fractions = [
        _fraction(one, pairs[one], alignment, per_proton, waters)
        for one in fields
        if one.exchanging
    ]
    return ShakeAreas(
        alignment=alignment,
        fractions=tuple(fractions),
        losses=_losses(steady, pairs, alignment),
        stoichiometry_sd=per_proton[1],
    )


def matched_traces(before: Evidence, after: Evidence, alignment: Alignment) -> Matched:
    """Both spectra on the axis of the first, brought to one line width."""
    first = trace_of(before)
    second = trace_upon(after, first, offset_ppm=alignment.offset_ppm)
    # A signal whose couplings collapsed says nothing of the width.
    alike = max(one.correlation for one in alignment.signals) - LOOKS_THE_SAME
    common = [
        (one.low_ppm, one.high_ppm)
        for one in alignment.signals
        if one.correlation >= alike
    ]
    margin_ppm = LEAST_REACH_HZ / first.frequency_mhz
    return match_widths(
        first, second, [(low - margin_ppm, high + margin_ppm) for low, high in common]
    )


def _fields(plots: Sequence[Plot], frequency_mhz: float) -> list[_Field]:
    """Windows around the claims, those that touch joined."""
    rows = []
    for one in plots:
        reach_ppm = max(REACH_WIDTHS * one.width_hz, LEAST_REACH_HZ) / frequency_mhz
        rows.append((one.low_ppm - reach_ppm, one.high_ppm + reach_ppm, one))
    rows.sort(key=lambda row: row[0])
    fields: list[_Field] = []
    for low, high, plot in rows:
        last = fields[-1] if fields else None
        if last is not None and low <= last.high_ppm:
            fields[-1] = _Field(
                plots=(*last.plots, plot),
                low_ppm=last.low_ppm,
                high_ppm=max(last.high_ppm, high),
            )
        else:
            fields.append(_Field(plots=(plot,), low_ppm=low, high_ppm=high))
    return fields


def _core(field: _Field) -> Range:
    return (
        min(one.low_ppm for one in field.plots),
        max(one.high_ppm for one in field.plots),
    )


def _areas(pair: tuple[Integral, Integral]) -> tuple[float, float]:
    return pair[0].area, pair[1].area


def _with_scale(
    alignment: Alignment, pairs: Sequence[tuple[Integral, Integral]]
) -> Alignment:
    """Scale from the windows that are integrated, instead of the narrow ones."""
    ratios = np.array([one.area / two.area for one, two in pairs])
    sds = np.array(
        [
            np.hypot(one.sd / one.area, two.sd / two.area) * one.area / two.area
            for one, two in pairs
        ]
    )
    scale, scale_sd, scatter = robust_scale(ratios, sds)
    return Alignment(
        offset_ppm=alignment.offset_ppm,
        offset_sd_ppm=alignment.offset_sd_ppm,
        scale=scale,
        scale_sd=scale_sd,
        scatter=scatter,
        signals=alignment.signals,
        n_missing=alignment.n_missing,
    )


def _counted(field: _Field, plots: Sequence[Plot]) -> float:
    """Protons of some claims that an integral over the field catches."""
    return sum(one.n_protons * _caught(field, one) for one in plots)


def _caught(field: _Field, plot: Plot) -> float:
    """Share of a claim's Lorentz lines inside the field and above its ground."""
    half_hz = plot.width_hz / 2.0
    flank_ppm = FLANK_SHARE * (field.high_ppm - field.low_ppm)
    shares = []
    for centre in np.linspace(plot.low_ppm, plot.high_ppm, 3):
        edges = np.array(
            [
                field.low_ppm - flank_ppm,
                field.low_ppm,
                field.high_ppm,
                field.high_ppm + flank_ppm,
            ]
        )
        turns = np.arctan((edges - centre) * plot.frequency_mhz / half_hz) / np.pi
        flanks = turns[1] - turns[0] + turns[3] - turns[2]
        shares.append(turns[2] - turns[1] - flanks / (2.0 * FLANK_SHARE))
    return float(np.mean(shares))


def _per_proton(
    steady: Sequence[_Field], pairs: dict[_Field, tuple[Integral, Integral]]
) -> tuple[float, float]:
    """Area of one proton before the shake, and its relative scatter."""
    values, sds = [], []
    for one in steady:
        count = _counted(one, one.plots)
        area, sd = pairs[one][0].area, pairs[one][0].sd
        if area > 0.0 and count > 0:
            values.append(area / count)
            sds.append(sd / count)
    if not values:
        return float("nan"), LEAST_STOICHIOMETRY_SD
    middle, _, scatter = robust_scale(np.array(values), np.array(sds))
    return middle, max(scatter, LEAST_STOICHIOMETRY_SD)


def _fraction(
    field: _Field,
    pair: tuple[Integral, Integral],
    alignment: Alignment,
    per_proton: tuple[float, float],
    waters: Sequence[Range],
) -> ExchangedFraction:
    before, after = pair
    others = _counted(field, field.steady)
    others_area = per_proton[0] * others if field.steady else 0.0
    own = before.area - others_area
    own_sd = float(np.hypot(before.sd, per_proton[1] * others_area))
    why = _why_untold(field, own, own_sd, waters)
    fraction, sd = None, None
    if not why:
        fraction = (before.area - alignment.scale * after.area) / own
        parts = (
            (1.0 - fraction) * before.sd,
            alignment.scale * after.sd,
            after.area * alignment.scale_sd,
            fraction * per_proton[1] * others_area,
            # Each signal's ratio scatters by itself, beyond the common scale.
            alignment.scatter * alignment.scale * after.area,
        )
        sd = float(np.hypot(np.linalg.norm(parts) / own, REPEAT_SD))
        why = _with_others(field)
    return ExchangedFraction(
        claims=tuple(one.claim for one in field.exchanging),
        n_protons=sum(one.n_protons for one in field.exchanging),
        low_ppm=field.low_ppm,
        high_ppm=field.high_ppm,
        fraction=fraction,
        sd=sd,
        is_alone=not field.steady,
        why=why,
    )


def _why_untold(
    field: _Field, own: float, own_sd: float, waters: Sequence[Range]
) -> str:
    """Reason why no fraction can be given, or an empty text."""
    names = " and ".join(one.claim for one in field.exchanging)
    for low, high in waters:
        if low < field.high_ppm and field.low_ppm < high:
            return (
                f"Water lies on {names} ({field.low_ppm:.2f} to {field.high_ppm:.2f} "
                "ppm), so its loss cannot be told from the HOD line."
            )
    # Below five sd the ratio is no longer near normal.
    if own < 5.0 * own_sd:
        return f"{names} is too weak beside what lies with it to be integrated."
    return ""


def _with_others(field: _Field) -> str:
    if not field.steady:
        return ""
    names = ", ".join(one.claim for one in field.steady)
    return f"It lies with {names}, whose area was taken off by proton count."


def _losses(
    steady: Sequence[_Field],
    pairs: dict[_Field, tuple[Integral, Integral]],
    alignment: Alignment,
) -> tuple[Loss, ...]:
    losses = []
    for one in steady:
        before, after = pairs[one]
        if before.area <= 0.0:
            continue
        fraction = 1.0 - alignment.scale * after.area / before.area
        kept = 1.0 - fraction
        parts = (
            kept * before.sd / before.area,
            alignment.scale * after.sd / before.area,
            kept * alignment.scale_sd / alignment.scale,
            alignment.scatter,
        )
        sd = float(np.linalg.norm(parts))
        if abs(fraction) > max(0.2, 4.0 * sd):
            names = tuple(plot.claim for plot in one.plots)
            losses.append(Loss(claims=names, fraction=fraction, sd=sd))
    return tuple(losses)
