"""Further measurements, best first: what would tell the contenders apart.

Each is foretold from the fits at hand, for the claimed structure and for every
contender that is not excluded; where none is left, for the weak points of the
ledger itself. Shifts in ppm.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

import numpy as np

from spinledger.reconcile.advice_carbons import carbon_finding, hsqc_finding
from spinledger.reconcile.advice_fields import (
    Simulator,
    field_finding,
    other_fields,
)
from spinledger.reconcile.advice_pairs import (
    cosy_finding,
    decoupling_finding,
    shake_finding,
)
from spinledger.reconcile.advice_solvent import solvent_finding
from spinledger.reconcile.advice_view import Finding, View, view_of
from spinledger.reconcile.advice_weak import weak_points
from spinledger.reconcile.evaluate import Evaluation
from spinledger.reconcile.noe import contact_distances, noe_finding
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.solve import Limits
from spinledger.values.ledger import Advice

Named = tuple[str, Evaluation]
Row = tuple[str, str, Finding]

MOST_ADVICE = 6
#: Contenders that are simulated at other fields; each costs five spectra.
MOST_SIMULATED = 2
LEAST_LOG_ODDS = 0.1
#: Time, samples and machine: the same odds from a shake come first [common practice].
EFFORT_LOG_ODDS = {
    "D2O shake": 0.0,
    "homodecoupling": 0.1,
    "COSY": 0.2,
    "edited HSQC": 0.3,
    "13C with DEPT": 0.4,
    "NOESY": 0.5,
}
_OTHER_EFFORT = 0.6


def advise(
    own: Evaluation,
    others: Sequence[Named],
    limits: Limits,
    *,
    options: ReconcileOptions | None = None,
) -> tuple[Advice, ...]:
    """Measurements ranked by the odds that they are expected to give.

    Parameters
    ----------
    own : Evaluation
        Of the claimed structure.
    others : sequence of (name, Evaluation)
        Contenders that are not excluded.
    limits : Limits
        Let the user stop; nothing new is begun after the deadline.
    options : ReconcileOptions, optional

    Notes
    -----
    The expected log odds of a measurement are the mean over the contenders of
    ln(P(outcome | right) / P(outcome | wrong)), averaged over either being
    right, each capped; differences are weighed by what the measurement can
    resolve (line patterns 12 % of area, distances 20 %, listing errors of
    carbon lines and cross peaks).
    """
    view = view_of(own, "the structure")
    if view is None:
        return ()
    chosen = options or ReconcileOptions()
    rivals = [
        (name, rival)
        for name, evaluation in others
        if (rival := view_of(evaluation, name)) is not None
    ]
    rows = list(_against(view, rivals, limits, chosen))
    advice = _ranked(rows, len(rivals))
    if len(advice) < MOST_ADVICE and not limits.is_over():
        advice += _for_weak_points(view, limits, chosen)
    return tuple(advice[:MOST_ADVICE])


def _against(
    view: View,
    rivals: Sequence[tuple[str, View]],
    limits: Limits,
    options: ReconcileOptions,
) -> Iterator[Row]:
    """Measurement, contender and finding of everything that separates."""
    if not rivals:
        return
    pair_probes: tuple[tuple[str, Callable[[View, View], Finding | None]], ...] = (
        ("D2O shake", shake_finding),
        ("homodecoupling", decoupling_finding),
        ("COSY", cosy_finding),
        ("edited HSQC", hsqc_finding),
        ("the same in DMSO-d6", solvent_finding),
    )
    for name, rival in rivals:
        limits.checked()
        for measurement, probe in pair_probes:
            yield from _known(measurement, name, probe(view, rival))
        yield from _known("13C with DEPT", name, carbon_finding(view, rival, options))
    yield from _by_contacts(view, rivals, limits, options)
    yield from _by_fields(view, rivals, limits)


def _known(measurement: str, name: str, found: Finding | None) -> Iterator[Row]:
    if found is not None and found.log_odds > LEAST_LOG_ODDS:
        yield measurement, name, found


def _by_contacts(
    view: View,
    rivals: Sequence[tuple[str, View]],
    limits: Limits,
    options: ReconcileOptions,
) -> Iterator[Row]:
    mine = contact_distances(view, ph=options.ph)
    for name, rival in rivals:
        limits.checked()
        if limits.is_over() or not mine:
            return
        theirs = contact_distances(rival, ph=options.ph)
        yield from _known("NOESY", name, noe_finding(view, rival, (mine, theirs)))


def _by_fields(
    view: View, rivals: Sequence[tuple[str, View]], limits: Limits
) -> Iterator[Row]:
    own = Simulator(view)
    for name, rival in rivals[:MOST_SIMULATED]:
        theirs = Simulator(rival)
        for field_mhz in other_fields(view.frequency_mhz):
            limits.checked()
            if limits.is_over():
                return
            found = field_finding(own, theirs, field_mhz)
            yield from _known(f"{field_mhz:.0f} MHz", name, found)


def _ranked(rows: Sequence[Row], n_rivals: int) -> list[Advice]:
    """One row a measurement, odds averaged over all contenders, best first."""
    by_measurement: dict[str, list[Row]] = {}
    for row in rows:
        by_measurement.setdefault(row[0], []).append(row)
    advice = []
    for measurement, found in by_measurement.items():
        best = max(found, key=lambda row: row[2].log_odds)
        odds = sum(row[2].log_odds for row in found) / n_rivals
        names = tuple(dict.fromkeys(row[1] for row in found))
        advice.append(_advice(measurement, odds, best[2].look_for, names))
    return sorted(advice, key=_worth)


def _worth(advice: Advice) -> float:
    return EFFORT_LOG_ODDS.get(advice.measurement, _OTHER_EFFORT) - (
        advice.expected_log_odds
    )


def _advice(
    measurement: str, log_odds: float, look_for: str, against: tuple[str, ...]
) -> Advice:
    return Advice(
        measurement=measurement,
        expected_discrimination=float(np.sqrt(2.0 * log_odds)),
        look_for=look_for,
        expected_log_odds=log_odds,
        against=against,
    )


def _for_weak_points(
    view: View, limits: Limits, options: ReconcileOptions
) -> list[Advice]:
    distances = contact_distances(view, ph=options.ph) if view.solution.odds else {}
    found = [
        _advice(measurement, finding.log_odds, finding.look_for, ())
        for measurement, finding in weak_points(
            view, Simulator(view), distances, limits
        )
        if finding.log_odds > LEAST_LOG_ODDS
    ]
    return sorted(found, key=_worth)
