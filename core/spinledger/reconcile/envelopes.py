"""Ranges of placed claims, envelopes they share, integrals and the balance.

Shifts in ppm, areas in intensity * Hz, integrals in protons.
"""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass

import numpy as np

from spinledger.reconcile.assess import expected_protons
from spinledger.reconcile.misfit import spectrum_misfit
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.solve import Solution
from spinledger.reconcile.windows import boxcar, points_of_hz
from spinledger.values.claim import Claim
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import Balance, ClaimLines

LINE_SHARE_IN_RANGE = 0.015
RANGE_MARGIN_WIDTHS = 1.5
OVERLAP_SHARE = 0.1
LINE_BIN_HZ = 2.0
OWNED_SHARE = 0.3


@dataclass(frozen=True, slots=True, kw_only=True)
class Envelope:
    """Claims whose ranges overlap, measured as one.

    Attributes
    ----------
    members : tuple of int
    low_ppm, high_ppm : float, ppm
    measured_over_model : float
        Measured area of the range over the model's.
    area_sd : float
        From the noise alone.
    """

    members: tuple[int, ...]
    low_ppm: float
    high_ppm: float
    measured_over_model: float
    area_sd: float


def claim_ranges(
    evidence: Evidence, solution: Solution, lines: dict[str, ClaimLines]
) -> dict[int, tuple[float, float]]:
    """Range of every placed claim: its lines and one and a half widths beyond.

    Strong coupling lends every proton faint lines among its partner's; lines
    that another claim owns for the most part do not widen a range.
    """
    frequency = evidence.spectrum.spectrometer_frequency_mhz
    placed = {
        index: lines[claim.label]
        for index, claim in enumerate(solution.claims.claims)
        if claim.label in lines
        and lines[claim.label].shifts_ppm.size
        and index not in solution.hidden
    }
    crowd = _crowd(list(placed.values()), frequency)
    ranges = {}
    for index, own in placed.items():
        tall = own.protons >= LINE_SHARE_IN_RANGE * own.protons.max()
        bins = np.round(own.shifts_ppm * frequency / LINE_BIN_HZ).astype(np.int64)
        mine = _crowd([own], frequency)
        owned = np.array(
            [mine[b] >= OWNED_SHARE * max(crowd[b], 1e-12) for b in bins.tolist()]
        )
        kept = tall & owned if (tall & owned).any() else tall
        margin = RANGE_MARGIN_WIDTHS * own.width_hz / frequency
        low = float(own.shifts_ppm[kept].min()) - margin
        high = float(own.shifts_ppm[kept].max()) + margin
        ranges[index] = (low, high)
    return ranges


def _crowd(lines: list[ClaimLines], frequency_mhz: float) -> dict[int, float]:
    """Protons by place, each line counted in its bin and the two beside it."""
    crowd: dict[int, float] = defaultdict(float)
    for one in lines:
        bins = np.round(one.shifts_ppm * frequency_mhz / LINE_BIN_HZ).astype(np.int64)
        for place, protons in zip(bins.tolist(), one.protons.tolist(), strict=True):
            for near in (place - 1, place, place + 1):
                crowd[near] += abs(protons)
    return crowd


def shared_envelopes(
    evidence: Evidence,
    solution: Solution,
    ranges: dict[int, tuple[float, float]],
    constraints: Constraints | None = None,
) -> tuple[Envelope, ...]:
    """Claims grouped by overlapping ranges, each group with its measured area."""
    groups: list[list[int]] = []
    for index in sorted(ranges, key=lambda i: ranges[i][0]):
        last = groups[-1] if groups else []
        if any(_overlap(ranges[index], ranges[other]) for other in last):
            last.append(index)
        else:
            groups.append([index])
    misfit = spectrum_misfit(evidence, solution.best.refinement, constraints)
    half = points_of_hz(evidence.spectrum, 3.0)
    model = boxcar(solution.best.refinement.intensities, half)
    envelopes = []
    for group in groups:
        low = min(ranges[i][0] for i in group)
        high = max(ranges[i][1] for i in group)
        window = evidence.spectrum.window(low, high)
        step_hz = evidence.spectrum.step_hz
        modelled = float(model[window].sum())
        difference = float(misfit.residual[window].sum())
        n_points = window.stop - window.start
        envelopes.append(
            Envelope(
                members=tuple(sorted(group)),
                low_ppm=low,
                high_ppm=high,
                measured_over_model=1.0 + difference / max(modelled, 1e-300),
                area_sd=evidence.noise_sd * step_hz * float(np.sqrt(n_points)),
            )
        )
    return tuple(envelopes)


def _overlap(one: tuple[float, float], other: tuple[float, float]) -> bool:
    shared = min(one[1], other[1]) - max(one[0], other[0])
    shorter = min(one[1] - one[0], other[1] - other[0])
    return shared > OVERLAP_SHARE * shorter


def raw_integrals(
    solution: Solution, envelopes: tuple[Envelope, ...]
) -> dict[int, float]:
    """Protons of every placed claim before the common scale.

    The whole of an envelope is measured; its parts are in the fit's ratio.
    """
    protons = solution.best.refinement.protons
    return {
        index: float(protons[index]) * max(one.measured_over_model, 0.0)
        for one in envelopes
        for index in one.members
    }


def is_balanced(claim: Claim) -> bool:
    """Whether a claim takes part in the balance: seen and not exchangeable."""
    return claim.visibility == "seen" and not claim.is_exchangeable


def common_scale(
    solution: Solution, envelopes: tuple[Envelope, ...], raw: dict[int, float]
) -> tuple[float, str]:
    """Scale by the weighted median ratio, and the signal that sets it."""
    rows: list[tuple[float, float, str]] = []
    for envelope in envelopes:
        members = [
            i for i in envelope.members if is_balanced(solution.claims.claims[i])
        ]
        expected = sum(
            expected_protons(solution.claims, solution.claims.claims[i])
            for i in members
        )
        if not members or len(members) < len(envelope.members):
            continue
        found = sum(raw[i] for i in members)
        names = ", ".join(solution.claims.claims[i].label for i in members)
        if found > 0:
            rows.append((found / expected, expected, names))
    if not rows:
        return 1.0, ""
    rows.sort()
    weights = np.cumsum([row[1] for row in rows])
    middle = int(np.searchsorted(weights, weights[-1] / 2.0))
    return rows[middle][0], rows[middle][2]


def balance_of(
    solution: Solution, integrals: dict[int, float], scale_signal: str
) -> Balance:
    """Protons claimed and found, hidden and exchangeable claims left out."""
    claimed, found = 0.0, 0.0
    for index, claim in enumerate(solution.claims.claims):
        if not is_balanced(claim) or index in solution.hidden:
            continue
        claimed += expected_protons(solution.claims, claim)
        found += integrals.get(index, 0.0)
    return Balance(claimed=claimed, found=found, scale_signal=scale_signal)
