"""How well a placement and a structure agree with side evidence.

Shifts in ppm, couplings in Hz; costs are negative log likelihoods. Agreement
costs nothing, so that it never raises a probability; disagreement costs what
the rates of listing errors below say [common practice].
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations, product

import numpy as np
from rdkit import Chem
from scipy.optimize import linear_sum_assignment

from spinledger.reconcile.coarse import FloatArray
from spinledger.reconcile.side_evidence import (
    HsqcPeak,
    ListedCarbon,
    SideEvidence,
)
from spinledger.structure.carbons import CarbonLine, carbon_lines
from spinledger.values.claim import ClaimSet

#: ln of the odds that a line is in the list: 97 % of carbons with protons and
#: 93 % of those without are found apart from all others.
MISSING_COST = 3.5
MISSING_QUATERNARY_COST = 2.6
#: Weak quaternary lines are lost together or not at all.
MOST_FOR_QUATERNARY = 5.0
#: A minor species may be too weak for a carbon spectrum.
MISSING_MINOR_COST = 0.7
MINOR_SHARE = 0.15
EXTRA_COST = 3.0
WRONG_TYPE_COST = 4.5
OUTSIDE_WINDOW_COST = 4.0
MOST_CARBON_COST = 12.0

#: A shift read off a contour plot, and one carbon read twice.
PROTON_SD_PPM = 0.02
SAME_CARBON_PPM = 0.15
#: Peaks tried for a claim, nearest in proton shift first.
PEAKS_TRIED = 4
UNLISTED_COST = 3.0
NOTABLE_COST = 2.0
UNOWNED_PEAK_COST = 1.5
#: Like carbons often coincide; seldom three times in one molecule.
COINCIDENCE_COST = 1.5
MOST_FOR_COINCIDENCES = 3.0
MOST_HSQC_COST = 10.0

COSY_REACH_PPM = 0.04
#: Chance of seeing a cross peak by the size of J [common practice].
COSY_CHANCES = ((3.0, 0.95), (1.5, 0.8), (0.5, 0.3), (0.0, 0.03))
COSY_LEAST_HZ = 0.4
COSY_STRONG_HZ = 4.0
COSY_DIAGONAL_PPM = 0.1
UNOWNED_CROSS_PEAK_COST = 2.5
MISSING_CROSS_PEAK_COST = 0.5
MOST_FOR_MISSING = 2.0
MOST_COSY_COST = 8.0


@dataclass(frozen=True, slots=True, kw_only=True)
class SideResult:
    """Cost of one kind of side evidence and why, one sentence a fault."""

    cost: float
    reasons: tuple[str, ...] = ()


FREE = SideResult(cost=0.0)


def expected_carbons(
    molecules: Sequence[Chem.Mol],
    shares: Sequence[float],
    *,
    temperature_k: float | None = None,
) -> tuple[tuple[CarbonLine, ...], tuple[CarbonLine, ...]]:
    """Carbon lines of all species that must show, and of those that may.

    Parameters
    ----------
    molecules : sequence of rdkit.Chem.Mol
        One a species, hydrogens implicit.
    shares : sequence of float
        Expected share of each; minor species only may show.
    temperature_k : float, K, optional
    """
    must: list[CarbonLine] = []
    may: list[CarbonLine] = []
    for mol, share in zip(molecules, shares, strict=True):
        lines = carbon_lines(mol, temperature_k=temperature_k)
        (may if share < MINOR_SHARE else must).extend(lines)
    return tuple(must), tuple(may)


def carbon_result(
    must: Sequence[CarbonLine], may: Sequence[CarbonLine], side: SideEvidence
) -> SideResult:
    """Listed carbons against those that the structure should show.

    Listed lines are given to expected ones so that the cost is least; what is
    missing, extra, of the wrong type or in an impossible place costs.
    """
    listed = side.carbons
    if not listed:
        return FREE
    if not side.shows_quaternary:
        must = [one for one in must if one.n_protons > 0]
        may = [one for one in may if one.n_protons > 0]
    expected = [*must, *may]
    missing = np.array(
        [_missing_cost(one, k >= len(must)) for k, one in enumerate(expected)]
    )
    extra = np.full(len(listed), EXTRA_COST)
    wrong = np.array([[_carbon_cost(a, b) for b in expected] for a in listed]).reshape(
        len(listed), len(expected)
    )
    pairs = _assigned(wrong, extra, missing)
    owned = {a for a, _ in pairs}
    found = {b for _, b in pairs}
    lost = [b for b in range(len(expected)) if b not in found]
    bare = sum(missing[b] for b in lost if expected[b].n_protons == 0)
    cost = sum(missing[b] for b in lost if expected[b].n_protons > 0)
    cost += min(bare, MOST_FOR_QUATERNARY)
    cost += EXTRA_COST * (len(listed) - len(owned))
    cost += sum(wrong[a, b] for a, b in pairs)
    if cost == 0.0 or (cost <= sum(missing[b] for b in lost if b >= len(must))):
        return SideResult(cost=float(cost))
    return SideResult(
        cost=float(min(cost, MOST_CARBON_COST)),
        reasons=(_carbon_sentence(must, side),),
    )


def _missing_cost(line: CarbonLine, is_minor: bool) -> float:
    if is_minor:
        return MISSING_MINOR_COST
    return MISSING_COST if line.n_protons else MISSING_QUATERNARY_COST


def _carbon_cost(listed: ListedCarbon, line: CarbonLine) -> float:
    cost = 0.0 if line.n_protons in listed.n_protons else WRONG_TYPE_COST
    low, high = line.window_ppm
    if listed.shift_ppm is not None and not low <= listed.shift_ppm <= high:
        cost += OUTSIDE_WINDOW_COST
    return cost


def _assigned(
    costs: FloatArray, row_costs: FloatArray, column_costs: FloatArray
) -> list[tuple[int, int]]:
    """Pairs of the cheapest one-to-one assignment; any row or column may stay alone."""
    n_rows, n_columns = costs.shape
    table = np.full((n_rows + n_columns, n_columns + n_rows), 1e9)
    table[:n_rows, :n_columns] = costs
    table[n_rows:, n_columns:] = 0.0
    for row in range(n_rows):
        table[row, n_columns + row] = row_costs[row]
    for column in range(n_columns):
        table[n_rows + column, column] = column_costs[column]
    rows, columns = linear_sum_assignment(table)
    return [
        (int(a), int(b))
        for a, b in zip(rows, columns, strict=True)
        if a < n_rows and b < n_columns
    ]


def _carbon_sentence(must: Sequence[CarbonLine], side: SideEvidence) -> str:
    listed = side.carbons
    claimed = types_in_words([one.n_protons for one in must])
    if all(len(one.n_protons) == 1 for one in listed):
        seen = types_in_words([next(iter(one.n_protons)) for one in listed])
        return f"the structure should show {claimed}; listed are {seen}"
    sort = "carbon lines" if side.shows_quaternary else "carbon lines with protons"
    if len(listed) != len(must):
        return (
            f"the structure should show {len(must)} {sort} ({claimed}); "
            f"{len(listed)} are listed"
        )
    return f"the listed carbons do not suit the structure, which has {claimed}"


def types_in_words(n_protons: Sequence[int]) -> str:
    """Numbers of CH3, CH2, CH and C in words: "2 CH3, 1 CH2 and 1 C"."""
    names = {4: "CH4", 3: "CH3", 2: "CH2", 1: "CH", 0: "C"}
    parts = [
        f"{n_protons.count(n)} {name}" for n, name in names.items() if n in n_protons
    ]
    if not parts:
        return "no carbon"
    return " and ".join([", ".join(parts[:-1]), parts[-1]]) if parts[1:] else parts[0]


def placement_cost(
    claims: ClaimSet,
    shifts_ppm: FloatArray,
    left_out: frozenset[int],
    side: SideEvidence | None,
) -> float:
    """Cost of a placement by HSQC and COSY together; 0 where nothing is given.

    Parameters
    ----------
    claims : ClaimSet
    shifts_ppm : numpy.ndarray, shape (n_claims,)
    left_out : frozenset of int
        Claims that are absent or hidden.
    side : SideEvidence or None
    """
    if side is None:
        return 0.0
    return (
        hsqc_result(claims, shifts_ppm, left_out, side).cost
        + cosy_result(claims, shifts_ppm, left_out, side).cost
    )


def hsqc_prior(side: SideEvidence | None, grid_ppm: FloatArray) -> FloatArray:
    """Cost of putting a proton on carbon where HSQC lists none, shape of the grid."""
    if side is None or not side.hsqc:
        return np.zeros_like(grid_ppm)
    places = np.array([peak.proton_ppm for peak in side.hsqc])
    gaps = np.abs(grid_ppm[:, None] - places[None, :]).min(axis=1)
    return np.asarray(
        np.minimum(0.5 * np.square(gaps / (1.5 * PROTON_SD_PPM)), UNLISTED_COST)
    )


def hsqc_result(
    claims: ClaimSet,
    shifts_ppm: FloatArray,
    left_out: frozenset[int],
    side: SideEvidence,
) -> SideResult:
    """Placed claims against HSQC peaks.

    Every claim needs a peak at its shift, of the type of its carbon. The two
    protons of a CH2 need peaks of one carbon shift; that different carbons
    share one is possible, and costs what such a coincidence is worth.
    """
    if not side.hsqc:
        return FREE
    carriers = _carriers(claims, left_out)
    chosen = [_best_peaks(claims, own, shifts_ppm, side.hsqc) for own in carriers]
    cost = sum(one for one, _ in chosen)
    reasons = [
        _carrier_sentence(claims, own, [side.hsqc[k] for k in peaks])
        for own, (one, peaks) in zip(carriers, chosen, strict=True)
        if one > NOTABLE_COST
    ]
    used = [{round(side.hsqc[k].carbon_ppm, 3) for k in peaks} for _, peaks in chosen]
    n_shared = sum(
        any(abs(a - b) < SAME_CARBON_PPM for a in one for b in other)
        for one, other in combinations(used, 2)
    )
    cost += min(COINCIDENCE_COST * n_shared, MOST_FOR_COINCIDENCES)
    if n_shared:
        reasons.append("HSQC peaks of one carbon shift stand at different carbons")
    taken = {k for _, peaks in chosen for k in peaks}
    for number, peak in enumerate(side.hsqc):
        if number not in taken:
            cost += UNOWNED_PEAK_COST
            reasons.append(
                f"no claim stands at the HSQC peak {peak.proton_ppm:.2f}/"
                f"{peak.carbon_ppm:.1f} ppm"
            )
    return SideResult(cost=float(min(cost, MOST_HSQC_COST)), reasons=tuple(reasons))


def _best_peaks(
    claims: ClaimSet,
    own: Sequence[int],
    shifts_ppm: FloatArray,
    peaks: Sequence[HsqcPeak],
) -> tuple[float, tuple[int, ...]]:
    """Cheapest peaks for the claims of one carbon, one a claim."""
    places = np.array([peak.proton_ppm for peak in peaks])
    atoms = claims.claims[own[0]].atoms
    n_protons = sum(claims.claims[k].n_protons for k in own) // max(len(atoms), 1)
    options: list[list[tuple[float, int]]] = []
    for index in own:
        gaps = np.abs(places - float(shifts_ppm[index]))
        nearest = np.argsort(gaps, kind="stable")[:PEAKS_TRIED]
        options.append(
            [
                (
                    min(0.5 * float(gaps[k] / PROTON_SD_PPM) ** 2, UNLISTED_COST)
                    + (0.0 if n_protons in peaks[k].n_protons else WRONG_TYPE_COST),
                    int(k),
                )
                for k in nearest
            ]
        )
    best: tuple[float, tuple[int, ...]] = (np.inf, ())
    for some in product(*options):
        carbons = [peaks[k].carbon_ppm for _, k in some]
        apart = max(carbons) - min(carbons) >= SAME_CARBON_PPM
        cost = sum(one for one, _ in some) + (UNLISTED_COST if apart else 0.0)
        if cost < best[0]:
            best = (cost, tuple(k for _, k in some))
    return best


def _carrier_sentence(
    claims: ClaimSet, own: Sequence[int], peaks: Sequence[HsqcPeak]
) -> str:
    labels = " and ".join(claims.claims[k].label for k in own)
    carbons = " and ".join(f"{peak.carbon_ppm:.1f}" for peak in peaks)
    return f"{labels} and the HSQC peaks at {carbons} ppm (13C) do not agree"


def _carriers(claims: ClaimSet, left_out: frozenset[int]) -> list[list[int]]:
    """Placed claims by the carbon that carries them."""
    by_carrier: dict[tuple[int, tuple[int, ...]], list[int]] = {}
    for index, claim in enumerate(claims.claims):
        if index not in left_out and not claim.is_exchangeable:
            by_carrier.setdefault((claim.species, claim.atoms), []).append(index)
    return list(by_carrier.values())


def cosy_result(
    claims: ClaimSet,
    shifts_ppm: FloatArray,
    left_out: frozenset[int],
    side: SideEvidence,
) -> SideResult:
    """Cross peaks against coupled claims at the two shifts."""
    if not side.cosy:
        return FREE
    coupled = _coupled_pairs(claims, left_out)
    reasons = []
    cost = 0.0
    listed: set[tuple[int, int]] = set()
    for peak in side.cosy:
        owners = [
            pair
            for pair in coupled
            if _is_at(shifts_ppm, pair, peak.first_ppm, peak.second_ppm)
        ]
        listed.update(owners)
        if owners:
            largest = max(coupled[pair] for pair in owners)
            doubt = float(np.log(COSY_CHANCES[0][1] / cosy_chance(largest)))
            cost += doubt
            if doubt > 1.0:
                reasons.append(
                    f"the COSY peak between {peak.first_ppm:.2f} and "
                    f"{peak.second_ppm:.2f} ppm would need a coupling of only "
                    f"{largest:.1f} Hz to show"
                )
        if not owners:
            cost += UNOWNED_CROSS_PEAK_COST
            reasons.append(
                f"the COSY peak between {peak.first_ppm:.2f} and "
                f"{peak.second_ppm:.2f} ppm joins no two coupled claims"
            )
    missing = [
        pair
        for pair, j_hz in coupled.items()
        if pair not in listed
        and j_hz >= COSY_STRONG_HZ
        and abs(float(shifts_ppm[pair[0]] - shifts_ppm[pair[1]])) > COSY_DIAGONAL_PPM
    ]
    cost += min(MISSING_CROSS_PEAK_COST * len(missing), MOST_FOR_MISSING)
    reasons += [
        f"{claims.claims[a].label} and {claims.claims[b].label} couple, but no COSY "
        "peak is listed between them"
        for a, b in missing
    ]
    return SideResult(cost=float(min(cost, MOST_COSY_COST)), reasons=tuple(reasons))


def cosy_chance(j_hz: float) -> float:
    """Chance that a coupling gives a COSY cross peak."""
    return next(chance for limit, chance in COSY_CHANCES if abs(j_hz) >= limit)


def _coupled_pairs(
    claims: ClaimSet, left_out: frozenset[int]
) -> dict[tuple[int, int], float]:
    """Largest predicted |J| of every two placed claims that couple, Hz."""
    found: dict[tuple[int, int], float] = {}
    for coupling in claims.couplings:
        first, second = (claims.particles[p].claim for p in coupling.pairs[0])
        if first is None or second is None or first == second:
            continue
        if {first, second} & left_out or abs(coupling.j_hz) < COSY_LEAST_HZ:
            continue
        pair = (min(first, second), max(first, second))
        found[pair] = max(found.get(pair, 0.0), abs(coupling.j_hz))
    return found


def _is_at(
    shifts_ppm: FloatArray, pair: tuple[int, int], first_ppm: float, second_ppm: float
) -> bool:
    one, other = (float(shifts_ppm[k]) for k in pair)
    return any(
        abs(a - first_ppm) < COSY_REACH_PPM and abs(b - second_ppm) < COSY_REACH_PPM
        for a, b in ((one, other), (other, one))
    )
