"""COSY, homodecoupling and D2O shake, foretold for two structures.

Shifts in ppm, couplings in Hz.
"""

from __future__ import annotations

from itertools import combinations

from spinledger.processing.solvents import is_protic_deuterated
from spinledger.reconcile.advice_view import (
    Finding,
    View,
    odds_of_chances,
    odds_of_difference,
    pattern_difference,
    pattern_words,
)
from spinledger.reconcile.side_costs import cosy_chance

DIAGONAL_PPM = 0.08
#: A second radio frequency takes this much with it, and disturbs this much.
IRRADIATED_HZ = 10.0
DISTURBED_HZ = 40.0
LEAST_LOG_ODDS = 0.1
#: A signal that goes after a shake with D2O, where one structure says so.
_GOES, _STAYS = 0.95, 0.04


def cosy_finding(own: View, other: View) -> Finding | None:
    """Cross peaks that only one of two structures gives."""
    best: tuple[float, str] | None = None
    total = 0.0
    for first, second in combinations(own.places, 2):
        shifts = own.places[first], own.places[second]
        if abs(shifts[0] - shifts[1]) < DIAGONAL_PPM:
            continue
        theirs = [other.near(shift) for shift in shifts]
        if theirs[0] is None or theirs[1] is None or theirs[0] == theirs[1]:
            continue
        mine = cosy_chance(own.coupling_between(first, second))
        not_mine = cosy_chance(other.coupling_between(theirs[0], theirs[1]))
        odds = odds_of_chances(mine, not_mine)
        total += odds
        if odds > LEAST_LOG_ODDS and (best is None or odds > best[0]):
            high, low = max(shifts), min(shifts)
            right = own.name if mine > not_mine else other.name
            wrong = other.name if mine > not_mine else own.name
            best = (
                odds,
                f"a cross peak between {high:.2f} and {low:.2f} ppm if {right} is "
                f"right, none if {wrong} is",
            )
    if best is None:
        return None
    return Finding(log_odds=min(total, 1.5 * best[0]), look_for=best[1])


def decoupling_finding(own: View, other: View) -> Finding | None:
    """The irradiation after which one signal looks most different."""
    best: Finding | None = None
    for target, place in own.places.items():
        for seen, at in own.places.items():
            if seen == target or abs(at - place) * own.frequency_mhz < DISTURBED_HZ:
                continue
            theirs = other.near(at)
            if theirs is None or other.near(place) is None:
                continue
            mine = own.split_by(seen, without=irradiated(own, place))
            not_mine = other.split_by(theirs, without=irradiated(other, place))
            before = pattern_difference(own.split_by(seen), other.split_by(theirs))
            gain = pattern_difference(mine, not_mine) - before
            odds = odds_of_difference(max(gain, 0.0))
            if odds > LEAST_LOG_ODDS and (best is None or odds > best.log_odds):
                best = Finding(
                    log_odds=odds,
                    look_for=f"irradiate at {place:.2f} ppm: the signal at {at:.2f} ppm "
                    f"({own.label(seen)}) "
                    + _becomes(pattern_words(own.split_by(seen)), pattern_words(mine))
                    + f" if {own.name} is right, "
                    + _becomes(
                        pattern_words(other.split_by(theirs)), pattern_words(not_mine)
                    )
                    + f" if {other.name} is",
                )
    return best


def irradiated(view: View, place_ppm: float) -> frozenset[int]:
    """Claims that a second frequency at a shift saturates."""
    return frozenset(
        claim
        for claim, shift in view.all_places.items()
        if abs(shift - place_ppm) * view.frequency_mhz <= IRRADIATED_HZ
    )


def _becomes(before: str, after: str) -> str:
    return f"stays {before}" if before == after else f"collapses to {after}"


def shake_finding(own: View, other: View) -> Finding | None:
    """Signals that go, or lose a splitting, when OH, NH and SH exchange with D2O."""
    if is_protic_deuterated(own.evaluation.evidence.solvent):
        return None
    findings = [_goes(own, other), _goes(other, own), _loses(own, other)]
    known = [one for one in findings if one is not None]
    return max(known, key=lambda one: one.log_odds, default=None)


def _goes(right: View, wrong: View) -> Finding | None:
    """A signal that exchanges in one structure and sits on carbon in the other."""
    for claim, shift in right.all_places.items():
        theirs = wrong.near(shift, with_exchanging=True)
        if not right.exchanges(claim) or theirs is None or wrong.exchanges(theirs):
            continue
        return Finding(
            log_odds=odds_of_chances(_GOES, _STAYS),
            look_for=f"the signal at {shift:.2f} ppm goes if {right.name} is right "
            f"({right.label(claim)}), and stays if {wrong.name} is",
        )
    return None


def _loses(own: View, other: View) -> Finding | None:
    """A signal on carbon whose splitting by OH or NH differs."""
    best: Finding | None = None
    for claim, shift in own.places.items():
        theirs = other.near(shift)
        if theirs is None:
            continue
        mine = own.split_by(claim, without=_exchanging(own))
        not_mine = other.split_by(theirs, without=_exchanging(other))
        before = pattern_difference(own.split_by(claim), other.split_by(theirs))
        odds = odds_of_difference(max(pattern_difference(mine, not_mine) - before, 0.0))
        if odds > LEAST_LOG_ODDS and (best is None or odds > best.log_odds):
            best = Finding(
                log_odds=odds,
                look_for=f"after the shake the signal at {shift:.2f} ppm is "
                f"{pattern_words(mine)} if {own.name} is right, "
                f"{pattern_words(not_mine)} if {other.name} is",
            )
    return best


def _exchanging(view: View) -> frozenset[int]:
    claims = view.evaluation.claims.claims
    return frozenset(k for k, one in enumerate(claims) if one.is_exchangeable)
