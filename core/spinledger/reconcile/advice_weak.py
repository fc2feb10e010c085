"""Measurements that would settle weak points of the ledger itself.

Interchangeable, shared and disputed claims, undetermined couplings, and claims
under a masked line; shifts in ppm, couplings in Hz.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from spinledger.processing.solvents import (
    is_aqueous,
    is_protic_deuterated,
    residual_lines,
    water_lines,
)
from spinledger.reconcile.advice_fields import (
    APART,
    OVERLAPPED,
    Simulator,
    other_fields,
    overlaps,
)
from spinledger.reconcile.advice_precision import coupling_sds_hz
from spinledger.reconcile.advice_view import (
    Finding,
    View,
    odds_of_chances,
    odds_of_difference,
)
from spinledger.reconcile.noe import (
    STRONG,
    Distances,
    contact_odds,
    contact_words,
)
from spinledger.reconcile.side_costs import cosy_chance
from spinledger.reconcile.solve import Limits

Named = tuple[str, Finding]

WELL_KNOWN_HZ = 0.3
WORTH_KNOWING_HZ = 1.5
#: A solvent moves shifts by about this much [common practice].
SOLVENT_SD_PPM = 0.15
_CLEAR_OF_LINE_PPM = 0.25
_SOLVENTS = ("CDCl3", "acetone-d6", "CD3OD", "DMSO-d6", "D2O", "CD3CN", "C6D6")
#: A claim under a line is worth about an even bet.
_HIDDEN_LOG_ODDS = 1.0
_WRONG_PLACE_CHANCE = 0.1


def weak_points(
    view: View, simulator: Simulator, distances: Distances, limits: Limits
) -> Iterator[Named]:
    """Measurement and finding for every weak point that one could settle."""
    yield from _orders(view, distances)
    yield from _disputed(view)
    yield from _hidden(view)
    if limits.is_over():
        return
    yield from _apart(view, simulator, limits)
    yield from _couplings(view, simulator, limits)


def _orders(view: View, distances: Distances) -> Iterator[Named]:
    """NOE that tell two interchangeable claims apart."""
    for pair in view.solution.odds:
        if pair.first not in view.places or pair.second not in view.places:
            continue
        best: tuple[float, int] | None = None
        for third, shift in view.places.items():
            if third in (pair.first, pair.second):
                continue
            near = _distance(distances, pair.first, third)
            far = _distance(distances, pair.second, third)
            apart = min(abs(shift - view.places[k]) for k in (pair.first, pair.second))
            if near is None or far is None or min(near, far) > STRONG or apart < 0.05:
                continue
            odds = contact_odds(near, far)
            if best is None or odds > best[0]:
                best = odds, third
        if best is None or best[0] < 0.1:
            continue
        odds, third = best
        # Nothing is gained where the order is already sure.
        doubt = 4.0 * pair.odds * (1.0 - pair.odds)
        words = [
            f"{contact_words(_distance(distances, k, third) or 5.0)} from {view.label(k)}"
            for k in (pair.first, pair.second)
        ]
        yield (
            "NOESY",
            Finding(
                log_odds=odds * doubt,
                look_for=f"to {view.label(third)} ({view.places[third]:.2f} ppm): "
                f"{words[0]}, {words[1]}; this tells which of {_places(view, pair.first, pair.second)} "
                "is which",
            ),
        )


def _places(view: View, first: int, second: int) -> str:
    return f"{view.places[first]:.2f} and {view.places[second]:.2f} ppm"


def _distance(distances: Distances, first: int, second: int) -> float | None:
    return distances.get((min(first, second), max(first, second)))


def _disputed(view: View) -> Iterator[Named]:
    """Cross peaks that a disputed claim must have where it was put."""
    booking = view.evaluation.booking
    if booking is None:
        return
    for index, entry in enumerate(booking.entries):
        if entry.state != "disputed" or index not in view.places:
            continue
        partners = {
            k: view.coupling_between(index, k)
            for k in view.places
            if abs(view.places[k] - view.places[index]) > 0.08
        }
        if not partners:
            continue
        partner = max(partners, key=lambda k: partners[k])
        chance = cosy_chance(partners[partner])
        odds = odds_of_chances(chance, _WRONG_PLACE_CHANCE)
        if chance > 0.5:
            yield (
                "COSY",
                Finding(
                    log_odds=odds,
                    look_for=f"a cross peak between {view.places[index]:.2f} and "
                    f"{view.places[partner]:.2f} ppm if {entry.claim}, which is "
                    f"disputed, stands where it was put (J to {view.label(partner)})",
                ),
            )


def _hidden(view: View) -> Iterator[Named]:
    """A solvent whose lines leave the hidden claims free."""
    hidden = view.solution.hidden
    if not hidden:
        return
    shifts = view.solution.best.refinement.shifts_ppm
    labels = ", ".join(view.label(k) for k in sorted(hidden))
    places = [float(shifts[k]) for k in hidden]
    solvent = _clear_solvent(view, places)
    said = "at another temperature, which moves water"
    if solvent:
        said += f", or in {solvent}, whose lines lie elsewhere"
    yield (
        "another temperature or solvent",
        Finding(
            log_odds=_HIDDEN_LOG_ODDS * min(len(hidden), 3),
            look_for=f"{labels} should come out from under the masked line {said}",
        ),
    )


def _clear_solvent(view: View, places_ppm: list[float]) -> str | None:
    """Usual solvent without a line near the places that keeps what is seen now."""
    now = view.evaluation.evidence.solvent
    is_salt = is_aqueous(now)
    for solvent in _SOLVENTS:
        if solvent == now or (is_salt and not is_protic_deuterated(solvent)):
            continue
        lines = [one.shift_ppm for one in residual_lines(solvent)]
        lines += [one.shift_ppm for one in water_lines(solvent)]
        gaps = [abs(line - place) for line in lines for place in places_ppm]
        if lines and min(gaps) > _CLEAR_OF_LINE_PPM + SOLVENT_SD_PPM:
            return solvent
    return None


def _apart(view: View, simulator: Simulator, limits: Limits) -> Iterator[Named]:
    """The lowest field at which overlapped claims come apart."""
    now = overlaps(simulator, view.frequency_mhz)
    crowded = [k for k, share in now.items() if share > OVERLAPPED]
    for field_mhz in other_fields(view.frequency_mhz):
        limits.checked()
        if not crowded or limits.is_over():
            return
        if field_mhz < view.frequency_mhz:
            continue
        then = overlaps(simulator, field_mhz)
        free = [k for k in crowded if then.get(k, 1.0) < APART]
        if not free:
            continue
        crowded = [k for k in crowded if k not in free]
        best = max(free, key=lambda k: now[k] - then[k])
        labels = ", ".join(view.label(k) for k in free[:4])
        more = f" and {len(free) - 4} more" if len(free) > 4 else ""
        yield (
            f"{field_mhz:.0f} MHz",
            Finding(
                log_odds=odds_of_difference(0.4 * (now[best] - then[best])),
                look_for=f"{labels}{more} stand free of their neighbours: "
                f"{view.label(best)} is overlapped to {100 * now[best]:.0f} % here, to "
                f"{100 * then[best]:.0f} % there",
            ),
        )


def _couplings(view: View, simulator: Simulator, limits: Limits) -> Iterator[Named]:
    """The lowest field at which couplings that are not determined here would be."""
    claims = view.evaluation.claims
    determined = view.solution.best.refinement.determined
    wanted = []
    for index, coupling in enumerate(claims.couplings):
        owners = [claims.particles[p].claim for p in coupling.pairs[0]]
        is_here = all(o in view.places for o in owners) and owners[0] != owners[1]
        if is_here and not determined[index] and abs(coupling.j_hz) > WORTH_KNOWING_HZ:
            wanted.append(index)
    if not wanted:
        return
    noise = _noise_per_hz(view)
    now = coupling_sds_hz(simulator, view.frequency_mhz, noise_per_hz=noise)
    for field_mhz in other_fields(view.frequency_mhz):
        limits.checked()
        if limits.is_over():
            return
        if field_mhz < view.frequency_mhz:
            continue
        then = coupling_sds_hz(simulator, field_mhz, noise_per_hz=noise)
        known = [
            k for k in wanted if then[k] < WELL_KNOWN_HZ and then[k] < 0.5 * now[k]
        ]
        if not known:
            continue
        named = []
        for k in known[:3]:
            first, second = (
                claims.particles[p].claim or 0 for p in claims.couplings[k].pairs[0]
            )
            named.append(
                f"J({view.label(first)}, {view.label(second)}) to {then[k]:.1f} Hz"
            )
        yield (
            f"{field_mhz:.0f} MHz",
            Finding(
                log_odds=float(np.log(now[known[0]] / then[known[0]])),
                look_for="less second order: "
                + ", ".join(named)
                + " can be read there",
            ),
        )
        return


def _noise_per_hz(view: View) -> float:
    """Noise of a stretch of one Hz, in protons per Hz."""
    evidence = view.evaluation.evidence
    area = max(view.solution.best.refinement.area_per_proton, 1e-300)
    return float(evidence.noise_sd * np.sqrt(evidence.spectrum.step_hz) / area)
