"""One fitted structure as further measurements would see it.

Shifts in ppm, couplings in Hz; odds are natural logarithms.
"""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass
from functools import cached_property
from math import comb

import numpy as np

from spinledger.reconcile.coarse import FloatArray
from spinledger.reconcile.evaluate import Evaluation
from spinledger.reconcile.solve import Solution
from spinledger.reconcile.words import pattern
from spinledger.spins.multiplicity import multiplicity_of
from spinledger.values.claim import ClaimSet

#: Two fits put a signal to the same place.
SAME_SHIFT_PPM = 0.04
#: What a right pattern may differ from a measured one by, as a share of its area.
PATTERN_SD = 0.12
#: No single look is trusted beyond these odds (about 150 to 1).
MOST_LOG_ODDS = 5.0
#: Splittings below this are not resolved.
RESOLVED_HZ = 1.0
_WIDTH_HZ = 1.5


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """What one measurement would tell two structures apart by.

    Attributes
    ----------
    log_odds : float
        Expected, whichever of the two is right.
    look_for : str
    """

    log_odds: float
    look_for: str


@dataclass(frozen=True, eq=False, kw_only=True)
class View:
    """Places and couplings of one evaluation.

    Attributes
    ----------
    evaluation : Evaluation
    solution : Solution
    name : str
        How sentences call the structure.
    """

    evaluation: Evaluation
    solution: Solution
    name: str

    @cached_property
    def gone(self) -> frozenset[int]:
        """Claims without a place."""
        return self.solution.absent | self.solution.hidden

    @cached_property
    def places(self) -> dict[int, float]:
        """Shift of every placed claim on carbon, ppm."""
        return {k: v for k, v in self.all_places.items() if not self.exchanges(k)}

    @cached_property
    def all_places(self) -> dict[int, float]:
        """Shift of every placed claim, ppm."""
        shifts = self.solution.best.refinement.shifts_ppm
        claims = self.evaluation.claims.claims
        return {k: float(shifts[k]) for k in range(len(claims)) if k not in self.gone}

    @cached_property
    def couplings_hz(self) -> FloatArray:
        """Fitted couplings where determined, else predicted, shape (n_couplings,)."""
        refinement = self.solution.best.refinement
        predicted = [one.j_hz for one in self.evaluation.claims.couplings]
        return np.where(refinement.determined, refinement.couplings_hz, predicted)

    @cached_property
    def splittings(self) -> dict[int, dict[int, list[tuple[float, int]]]]:
        """|J| and number of spins by claim and partner claim (hetero: below 0)."""
        return splittings_of(self.evaluation.claims, self.couplings_hz)

    def exchanges(self, claim: int) -> bool:
        """Whether a claim's protons exchange with water."""
        return self.evaluation.claims.claims[claim].is_exchangeable

    def label(self, claim: int) -> str:
        """Label of a claim."""
        return self.evaluation.claims.claims[claim].label

    def near(self, shift_ppm: float, *, with_exchanging: bool = False) -> int | None:
        """Claim that was put nearest to a shift, if any is close."""
        places = self.all_places if with_exchanging else self.places
        if not places:
            return None
        best = min(places, key=lambda k: abs(places[k] - shift_ppm))
        return best if abs(places[best] - shift_ppm) < SAME_SHIFT_PPM else None

    def coupling_between(self, first: int, second: int) -> float:
        """Largest |J| of two claims, 0 where they do not couple, Hz."""
        rows = self.splittings.get(first, {}).get(second, [])
        return max((j for j, _ in rows), default=0.0)

    def split_by(
        self, claim: int, *, without: frozenset[int] = frozenset()
    ) -> list[tuple[float, int]]:
        """Splittings of a claim, largest first; exchanged protons split nothing."""
        rows = [
            row
            for partner, found in self.splittings.get(claim, {}).items()
            if partner not in without and (partner < 0 or partner not in self.gone)
            for row in found
            if row[0] >= RESOLVED_HZ
        ]
        rows += [
            row
            for partner, found in self.splittings.get(claim, {}).items()
            if partner in self.solution.hidden and partner not in without
            for row in found
            if row[0] >= RESOLVED_HZ
        ]
        return sorted(rows, reverse=True)

    @property
    def frequency_mhz(self) -> float:
        """Of the spectrometer, MHz."""
        return self.evaluation.evidence.spectrum.spectrometer_frequency_mhz


def splittings_of(
    claims: ClaimSet, couplings_hz: FloatArray
) -> dict[int, dict[int, list[tuple[float, int]]]]:
    """|J| and number of spins by claim and partner claim (hetero: below 0).

    Parameters
    ----------
    claims : ClaimSet
    couplings_hz : numpy.ndarray, shape (n_couplings,), Hz
    """
    first: dict[int, int] = {}
    for number, particle in enumerate(claims.particles):
        if particle.claim is not None:
            first.setdefault(particle.claim, number)
    found: dict[int, dict[int, list[tuple[float, int]]]] = defaultdict(
        lambda: defaultdict(list)
    )
    for index, coupling in enumerate(claims.couplings):
        j_hz = abs(float(couplings_hz[index]))
        for pair in coupling.pairs:
            for own, other in (pair, pair[::-1]):
                claim = claims.particles[own].claim
                if claim is None or first[claim] != own:
                    continue
                partner = claims.particles[other]
                owner = -1 - other if partner.claim is None else partner.claim
                if owner != claim:
                    found[claim][owner].append((j_hz, partner.n_spins))
    return found


def view_of(evaluation: Evaluation, name: str) -> View | None:
    """View of an evaluation; None where nothing was placed."""
    if evaluation.solution is None:
        return None
    return View(evaluation=evaluation, solution=evaluation.solution, name=name)


def merged(splittings: list[tuple[float, int]]) -> list[tuple[float, int, bool]]:
    """J, spins, and whether different J were joined, equal ones being one level."""
    levels: list[tuple[float, int, bool]] = []
    for j_hz, n_spins in splittings:
        if levels and levels[-1][0] - j_hz < 0.5 * RESOLVED_HZ:
            before, count, _ = levels[-1]
            total = count + n_spins
            levels[-1] = ((before * count + j_hz * n_spins) / total, total, True)
        else:
            levels.append((j_hz, n_spins, False))
    return levels


def pattern_words(splittings: list[tuple[float, int]]) -> str:
    """First-order pattern in words: "a doublet of triplets (15.5, 7.1 Hz)"."""
    levels = merged(splittings)
    if not levels:
        return "a singlet"
    multiplicity = multiplicity_of(
        [(n_spins, False) for _, n_spins, _ in levels],
        is_first_order=True,
        spin_system=None,
    )
    values = ", ".join(f"{j_hz:.1f}" for j_hz, _, _ in levels)
    return f"{pattern(multiplicity)} ({values} Hz)"


def pattern_difference(
    first: list[tuple[float, int]], second: list[tuple[float, int]]
) -> float:
    """Half the area between two first-order patterns, as a share: 0 alike, 1 apart."""
    sticks = [_sticks(one) for one in (first, second)]
    reach = max(float(np.abs(places).max()) for places, _ in sticks) + 20 * _WIDTH_HZ
    grid = np.arange(-reach, reach, _WIDTH_HZ / 6)
    half = _WIDTH_HZ / 2
    drawn = [
        (
            weights[:, None] * half / np.pi / ((grid - places[:, None]) ** 2 + half**2)
        ).sum(axis=0)
        for places, weights in sticks
    ]
    return float(0.5 * np.abs(drawn[0] - drawn[1]).sum() * (grid[1] - grid[0]))


def _sticks(splittings: list[tuple[float, int]]) -> tuple[FloatArray, FloatArray]:
    places, weights = np.zeros(1), np.ones(1)
    for j_hz, n_spins in splittings:
        steps = (np.arange(n_spins + 1) - n_spins / 2.0) * j_hz
        shares = np.array([comb(n_spins, k) for k in range(n_spins + 1)]) / 2.0**n_spins
        places = np.add.outer(places, steps).ravel()
        weights = np.multiply.outer(weights, shares).ravel()
        if places.size > 256:
            break
    return places, weights / weights.sum()


def odds_of_difference(share: float) -> float:
    """Expected log odds by which a pattern that differs by a share tells apart."""
    return min(0.5 * (share / PATTERN_SD) ** 2, MOST_LOG_ODDS)


def odds_of_chances(first: float, second: float) -> float:
    """Expected log odds of a look that succeeds with one or the other chance."""
    gain = 0.0
    for a, b in ((first, second), (second, first)):
        gain += 0.5 * (a * np.log(a / b) + (1.0 - a) * np.log((1.0 - a) / (1.0 - b)))
    return min(float(gain), MOST_LOG_ODDS)
