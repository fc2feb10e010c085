"""What a gesture on the bench means as a hand edit of the project."""

from __future__ import annotations

import re

from spinledger.project.document import Project
from spinledger.project.edits import (
    Edit,
    FixCoupling,
    PinClaim,
    ReleaseClaim,
    SwapClaims,
    UnlinkClaim,
)
from spinledger.values.ledger import Entry, Ledger
from spinledger_app.lanes.scene import LaneScene, SignalMark
from spinledger_app.presenters.wording import say

# Half of the range a root is held to where it is dropped beside all signals.
_FREE_DROP_HZ = 10.0
_NUMBER = re.compile(r"[−-]?\d+(?:[.,]\d+)?")
_SAME_J_HZ = 0.005


def entry_of(ledger: Ledger | None, claim: str) -> Entry | None:
    """Entry of a claim."""
    if ledger is None:
        return None
    return next((one for one in ledger.entries if one.claim == claim), None)


def put_together(mark: SignalMark, claim: str) -> PinClaim:
    """The edit that puts a claim to a signal."""
    return PinClaim(
        claim=claim,
        shift_ppm=mark.centre_ppm,
        low_ppm=mark.low_ppm,
        high_ppm=mark.high_ppm,
    )


def drop_root(scene: LaneScene, claim: str, shift_ppm: float) -> PinClaim:
    """The edit that puts a claim where its root was dropped."""
    mark = scene.signal_at(shift_ppm)
    if mark is not None:
        return PinClaim(
            claim=claim,
            shift_ppm=shift_ppm,
            low_ppm=mark.low_ppm,
            high_ppm=mark.high_ppm,
        )
    reach_ppm = _FREE_DROP_HZ / scene.frequency_mhz
    return PinClaim(
        claim=claim,
        shift_ppm=shift_ppm,
        low_ppm=shift_ppm - reach_ppm,
        high_ppm=shift_ppm + reach_ppm,
    )


def swap(ledger: Ledger, first: str, second: str) -> SwapClaims | None:
    """The edit that exchanges the places of two claims; None if one has none."""
    one, other = entry_of(ledger, first), entry_of(ledger, second)
    if one is None or other is None:
        return None
    pins = (_pin_at(first, other), _pin_at(second, one))
    if pins[0] is None or pins[1] is None:
        return None
    return SwapClaims(first=pins[0], second=pins[1])


def _pin_at(claim: str, place: Entry) -> PinClaim | None:
    if place.shift_ppm is None:
        return None
    low, high = place.range_ppm or (place.shift_ppm - 0.01, place.shift_ppm + 0.01)
    # Two claims in one signal share its range; the shift tells their places apart.
    reach = min(0.5 * (high - low), 0.004) if high - low > 0 else 0.004
    return PinClaim(
        claim=claim,
        shift_ppm=place.shift_ppm,
        low_ppm=min(place.shift_ppm - reach, place.shift_ppm - 1e-4),
        high_ppm=max(place.shift_ppm + reach, place.shift_ppm + 1e-4),
    )


def swap_partner(ledger: Ledger, claim: str) -> str | None:
    """The claim that one would exchange with: the pair's other half, or the group's."""
    for one in ledger.claims.claims:
        pair = one.pair if one.label == claim else None
        if pair is not None and entry_of(ledger, pair) is not None:
            return pair
    entry = entry_of(ledger, claim)
    if entry is None:
        return None
    if entry.group is not None and entry.group.partners:
        return entry.group.partners[0]
    return _sibling(ledger, entry)


def _sibling(ledger: Ledger, entry: Entry) -> str | None:
    others = [
        one.claim
        for one in ledger.entries
        if one.atoms == entry.atoms and one.claim != entry.claim
    ]
    return others[0] if others else None


def typed_couplings(entry: Entry, text: str) -> list[FixCoupling]:
    """Edits for J values typed in the order in which the row shows them.

    Raises
    ------
    ValueError
        If there are more or fewer values than splittings; the text says so.
    """
    values = [
        abs(float(found.replace("−", "-").replace(",", ".")))
        for found in _NUMBER.findall(_with_points(text))
    ]
    shown = sorted(
        (c for c in entry.couplings if c.determined and c.j_hz is not None),
        key=lambda c: -abs(c.j_hz or 0.0),
    )
    shown = [c for c in shown if abs(c.j_hz or 0.0) >= 0.3]
    if len(values) != len(shown):
        raise ValueError(
            say("{0} has {1} J values; give as many, larger first.")
            .replace("{0}", entry.claim)
            .replace("{1}", str(len(shown)))
        )
    return [
        FixCoupling(claim=entry.claim, partner=c.partner, j_hz=value)
        for c, value in zip(shown, values, strict=True)
        if abs(value - round(abs(c.j_hz or 0.0), 2)) > _SAME_J_HZ
    ]


def _with_points(text: str) -> str:
    """Comma between digits without a blank after it is a decimal comma."""
    return re.sub(r"(\d),(\d)", r"\1.\2", text)


def by_hand(project: Project) -> dict[str, str]:
    """What the user last did with each claim: "pinned" or "unlinked"."""
    states: dict[str, str] = {}
    for edit in project.edits:
        _note(states, edit)
    return states


def _note(states: dict[str, str], edit: Edit) -> None:
    match edit:
        case PinClaim():
            states[edit.claim] = "pinned"
        case UnlinkClaim():
            states[edit.claim] = "unlinked"
        case ReleaseClaim():
            states.pop(edit.claim, None)
        case SwapClaims():
            states[edit.first.claim] = states[edit.second.claim] = "pinned"
        case _:
            return


def row_actions(project: Project) -> dict[str, list[tuple[str, str]]]:
    """Buttons of every row: pairs of (id, word)."""
    ledger = project.ledger
    if ledger is None:
        return {}
    held = by_hand(project)
    actions: dict[str, list[tuple[str, str]]] = {}
    for entry in ledger.entries:
        mine = [("put", say("Put elsewhere"))]
        partner = swap_partner(ledger, entry.claim)
        if partner is not None and entry.shift_ppm is not None:
            mine.append(("swap", say("Swap with {0}").replace("{0}", partner)))
        if entry.claim in held:
            mine.append(("release", say("Give back")))
        elif entry.shift_ppm is not None:
            mine.append(("unlink", say("Take off")))
        actions[entry.claim] = mine
    return actions
