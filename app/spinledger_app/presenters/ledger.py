"""What the ledger panel shows: verdict, balance, rows, strays, advice, tally."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from spinledger.values.evidence import Stray
from spinledger.values.ledger import Entry, EntryCoupling, Ledger, Verdict
from spinledger_app.presenters.lanes import stray_name
from spinledger_app.presenters.wording import (
    couplings,
    number,
    protons,
    say,
    sentences,
    shift_sd,
    whole_protons,
)

STATES = ("settled", "disputed", "open", "silent", "stray")
_TILTS = {
    "reconciled": 0.0,
    "undecided": 9.0,
    "not reconciled": 20.0,
    "not judged": 5.0,
}
_STRAY_ORDER = (
    "unexplained",
    "impurity",
    "given",
    "solvent",
    "water",
    "reference",
    "satellite",
    "sideband",
)
_LEAST_SHOWN_J_HZ = 0.3
_TOGETHER = ("satellite", "sideband")
_MOST_ALONE = 2


@dataclass(frozen=True, slots=True, kw_only=True)
class VerdictText:
    """Head of the panel.

    ``ratio`` is the likelihood ratio with its prior, ``before`` the verdict
    without the hand edits where it differs.
    """

    word: str
    probability: str
    tilt_deg: float
    reasons: str
    detail: str
    ratio: str = ""
    before: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class BalanceCell:
    """One claim on the balance bar."""

    claim: str
    state: str
    claimed: float
    found: float


@dataclass(frozen=True, slots=True, kw_only=True)
class BalanceText:
    """The balance bar and the totals."""

    cells: tuple[BalanceCell, ...]
    stray_protons: tuple[float, ...]
    claimed: str
    found: str
    tip: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Gauge:
    """Residuals in sd; None where there is none to show."""

    shift: float | None
    coupling: float | None
    integral: float | None
    is_booked_elsewhere: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class RowText:
    """One row of the ledger, in words.

    ``sentences`` are the reasons that unfold; ``spoken`` says the whole row.
    """

    claim: str
    state: str
    count: str
    claimed_shift: str
    claimed_pattern: str
    found_shift: str
    found_protons: str
    found_couplings: str
    gauge: Gauge
    sentences: tuple[str, ...]
    flag: str
    spoken: str
    is_pinned: bool = False
    shift_ppm: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class StrayText:
    """One stray; ``key`` is that of its mark in the lanes."""

    key: str
    is_known: bool
    shift: str
    name: str
    kind: str
    tip: str


@dataclass(frozen=True, slots=True, kw_only=True)
class AdviceText:
    """A further measurement; ``share`` (0 to 1) is the length of its bar."""

    measurement: str
    look_for: str
    value: str
    share: float


@dataclass(frozen=True, slots=True, kw_only=True)
class LedgerText:
    """Everything the ledger panel shows."""

    verdict: VerdictText
    balance: BalanceText
    rows: tuple[RowText, ...]
    strays: tuple[StrayText, ...]
    stray_head: str
    advice: tuple[AdviceText, ...]
    tally: dict[str, int]
    cautions: tuple[str, ...]


def ledger_text(
    ledger: Ledger,
    *,
    is_stale: bool = False,
    before: Verdict | None = None,
    pinned: Sequence[str] = (),
) -> LedgerText:
    """Words of a ledger.

    Parameters
    ----------
    is_stale : bool
        Hand edits were made since it was solved.
    before : Verdict or None
        The verdict before any hand edit.
    pinned : sequence of str
        Claims that were put somewhere by hand.
    """
    rows = tuple(
        row_text(entry, is_pinned=entry.claim in pinned) for entry in ledger.entries
    )
    strays = stray_texts(ledger.strays)
    tally = dict.fromkeys(STATES, 0)
    for row in rows:
        tally[row.state] += 1
    tally["stray"] = len(strays)
    return LedgerText(
        verdict=verdict_text(ledger.verdict, is_stale=is_stale, before=before),
        balance=balance_text(ledger),
        rows=rows,
        strays=strays,
        stray_head=_stray_head(ledger.strays),
        advice=_advice(ledger),
        tally=tally,
        cautions=ledger.cautions,
    )


def verdict_text(
    verdict: Verdict, *, is_stale: bool = False, before: Verdict | None = None
) -> VerdictText:
    """Word, probability and reasons; a stale ledger is not judged."""
    if is_stale:
        return VerdictText(
            word=say("Not judged"),
            probability="–",
            tilt_deg=_TILTS["not judged"],
            reasons=say("Edited by hand. Refine to settle it, or undo the edit."),
            detail="",
        )
    probability = (
        "–" if verdict.probability is None else _probability(verdict.probability)
    )
    detail = "\n".join(sentences((one,)) for one in verdict.reasons)
    ratio = ""
    if verdict.likelihood_ratio is not None:
        ratio = (
            say("prior {0}, likelihood ratio {1}")
            .replace("{0}", f"{verdict.prior:g}")
            .replace("{1}", f"{verdict.likelihood_ratio:.3g}")
        )
    changed = before is not None and before.state != verdict.state
    return VerdictText(
        word=say(verdict.state.capitalize()),
        probability=probability,
        tilt_deg=_TILTS[verdict.state],
        reasons=sentences(verdict.reasons),
        detail=detail,
        ratio=ratio,
        before=(
            say("before edits: {0}").replace("{0}", say(before.state))
            if changed and before is not None
            else ""
        ),
    )


def _probability(value: float) -> str:
    if value > 0.995:
        return "> 0.99"
    if value < 0.005:
        return "< 0.01"
    return f"{value:.2f}"


def balance_text(ledger: Ledger) -> BalanceText:
    """Cells of claimed and found protons, exchangeables included but not summed."""
    cells = tuple(
        BalanceCell(
            claim=entry.claim,
            state=entry.state,
            claimed=float(entry.protons),
            found=entry.integral_protons or 0.0,
        )
        for entry in ledger.entries
        if entry.state != "silent"
    )
    unexplained = tuple(
        stray.protons
        for stray in ledger.strays
        if stray.kind == "unexplained" and stray.protons is not None
    )
    scale = ledger.balance.scale_signal
    tip = say("Exchangeable protons and strays are left out of the sum.")
    if scale:
        tip += " " + say("{0} sets the scale.").replace("{0}", scale)
    return BalanceText(
        cells=cells,
        stray_protons=unexplained,
        claimed=whole_protons(ledger.balance.claimed),
        found=protons(ledger.balance.found),
        tip=tip,
    )


def row_text(entry: Entry, *, is_pinned: bool = False) -> RowText:
    """Words of one entry."""
    seen = [c for c in entry.couplings if abs(c.predicted_j_hz) >= _LEAST_SHOWN_J_HZ]
    predicted = couplings(tuple(c.predicted_j_hz for c in seen), 1)
    pattern = entry.predicted_multiplicity
    gauge = Gauge(
        shift=entry.shift_residual_sd,
        coupling=entry.j_residual_sd,
        integral=entry.integral_residual_sd,
        is_booked_elsewhere=entry.state == "settled"
        and abs(entry.j_residual_sd or 0.0) > 2,
    )
    reasons = entry.reasons if entry.reasons else ((entry.why,) if entry.why else ())
    found = entry.shift_ppm is not None
    row = RowText(
        claim=entry.claim,
        state=entry.state,
        count=f"{entry.protons} H",
        claimed_shift=shift_sd(entry.predicted_shift_ppm, entry.predicted_shift_sd_ppm),
        claimed_pattern=f"{pattern}  {predicted}".strip() if pattern else predicted,
        found_shift=number(entry.shift_ppm, 3) if entry.shift_ppm is not None else "",
        found_protons=protons(entry.integral_protons)
        if found and entry.integral_protons is not None
        else "",
        found_couplings=_found_couplings(entry.couplings, entry) if found else "",
        gauge=gauge,
        sentences=tuple(sentences((one,)) for one in reasons),
        flag=_flag(entry),
        spoken="",
        is_pinned=is_pinned,
        shift_ppm=entry.shift_ppm
        if entry.shift_ppm is not None
        else entry.predicted_shift_ppm,
    )
    return _with_spoken(row, entry)


def _with_spoken(row: RowText, entry: Entry) -> RowText:
    parts = [
        f"{row.claim}, {say(row.state)}, {row.count}",
        say("claimed {0} ppm {1}")
        .replace("{0}", row.claimed_shift)
        .replace("{1}", row.claimed_pattern),
    ]
    if row.found_shift:
        parts.append(
            say("found {0} ppm, {1}, J {2}")
            .replace("{0}", row.found_shift)
            .replace("{1}", row.found_protons)
            .replace("{2}", row.found_couplings)
        )
    elif entry.state == "open":
        parts.append(say("nothing found"))
    if row.flag:
        parts.append(row.flag)
    values = {name: getattr(row, name) for name in row.__slots__}
    values["spoken"] = "; ".join(parts)
    return RowText(**values)


def _found_couplings(found: Sequence[EntryCoupling], entry: Entry) -> str:
    values = tuple(c.j_hz for c in found if c.determined and c.j_hz is not None)
    shown = couplings(tuple(v for v in values if abs(v) >= _LEAST_SHOWN_J_HZ), 2)
    pattern = entry.multiplicity
    if not shown:
        if any(not c.determined for c in found):
            shown = say("J not determined")
        else:
            return pattern or say("no splitting")
    differs = pattern and pattern != entry.predicted_multiplicity
    return f"{pattern}  {shown}" if differs else shown


def _flag(entry: Entry) -> str:
    group = entry.group
    if group is None:
        return ""
    partners = ", ".join(group.partners)
    if group.kind == "interchangeable":
        text = say("either way round with {0}").replace("{0}", partners)
        if group.odds is not None:
            text += ", " + say("odds {0}").replace("{0}", f"{group.odds:.2f}")
        return text
    return say("one signal with {0}; parts from the fit").replace("{0}", partners)


def stray_texts(strays: Sequence[Stray]) -> tuple[StrayText, ...]:
    """Strays, unexplained first, each kind by descending shift."""
    keyed = [(f"stray {index}", stray) for index, stray in enumerate(strays)]
    pairs = [one for one in keyed if one[1].kind in _TOGETHER]
    if len(pairs) > _MOST_ALONE:
        keyed = [one for one in keyed if one not in pairs]
    keyed.sort(key=lambda pair: (_STRAY_ORDER.index(pair[1].kind), -pair[1].high_ppm))
    texts = [_stray_text(key, stray) for key, stray in keyed]
    if len(pairs) > _MOST_ALONE:
        texts.append(_satellites(pairs))
    return tuple(texts)


def _satellites(pairs: Sequence[tuple[str, Stray]]) -> StrayText:
    """Satellites and sidebands in one row; the tool tip names each."""
    ordered = sorted(pairs, key=lambda pair: -pair[1].high_ppm)
    centres = [number((stray.low_ppm + stray.high_ppm) / 2, 3) for _, stray in ordered]
    return StrayText(
        key=ordered[0][0],
        is_known=True,
        shift=say("{0} lines").replace("{0}", str(len(ordered))),
        name=", ".join(centres),
        kind=say("satellites"),
        tip="\n".join(
            f"{c} ppm: {s.why}" for c, (_, s) in zip(centres, ordered, strict=True)
        ),
    )


def _stray_text(key: str, stray: Stray) -> StrayText:
    is_known = stray.kind != "unexplained"
    name = stray_name(stray)
    if not is_known:
        amount = "" if stray.protons is None else protons(stray.protons)
        name = ", ".join(part for part in (amount, say("no match")) if part)
    elif name == say(stray.kind):
        name = stray.why.rstrip(".")
    return StrayText(
        key=key,
        is_known=is_known,
        shift=number((stray.low_ppm + stray.high_ppm) / 2, 3),
        name=name,
        kind=say(stray.kind),
        tip=stray.why,
    )


def _stray_head(strays: Sequence[Stray]) -> str:
    if not strays:
        return say("none. Every line has an owner.")
    unexplained = sum(stray.kind == "unexplained" for stray in strays)
    if not unexplained:
        return say("all explained")
    if unexplained == 1:
        return say("one unexplained")
    return say("{0} unexplained").replace("{0}", str(unexplained))


def _advice(ledger: Ledger) -> tuple[AdviceText, ...]:
    scale = 3.2  # the most that one measurement is trusted with, in sd
    return tuple(
        AdviceText(
            measurement=one.measurement,
            look_for=one.look_for,
            value=number(one.expected_discrimination, 1),
            share=min(1.0, max(0.0, one.expected_discrimination / scale)),
        )
        for one in ledger.advice
    )
