"""Residuals of a fit, claim by claim, and the features that the judge weighs.

Shifts in ppm, couplings and widths in Hz; z are residuals in sd.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from spinledger.reconcile.misfit import SpectrumMisfit, spectrum_misfit
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.refine_values import Refinement
from spinledger.reconcile.side_costs import placement_cost
from spinledger.values.claim import Claim, ClaimSet
from spinledger.values.evidence import Evidence

SQUARE_CAP = 12.0
RESIDUAL_FLOOR = 0.02
SHIFT_EXTRA_SD_PPM = 0.02
COUPLING_EXTRA_SD_HZ = 0.3
AMPLITUDE_SD = 0.25
WIDTH_SD = 0.4
LEAST_WINDOW_HZ = 1.0
EXCESS_ALLOWED = 1.5
HIDDEN_PART = 0.25
COINCIDENCE_CAP = 6.0


@dataclass(frozen=True, slots=True, kw_only=True)
class ClaimResidual:
    """How one claim fits.

    Attributes
    ----------
    claim : int
    is_counted : bool
        Takes part in the verdict: placed, not hidden, not exchangeable.
    shift_z : float
    amplitude_log, width_log : float
        Natural logarithm of amplitude and width over the common ones.
    residual_share : float
        Smoothed misfit around the claim over its own area.
    """

    claim: int
    is_counted: bool
    shift_z: float
    amplitude_log: float
    width_log: float
    residual_share: float


@dataclass(frozen=True, slots=True, kw_only=True)
class CouplingResidual:
    """How one determined coupling fits its prediction."""

    coupling: int
    z: float
    is_rigid: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Assessment:
    """All residuals of one fit.

    Attributes
    ----------
    residual_share : float
        Smoothed misfit over smoothed area, all windows.
    unexplained_share : float
        Area beyond every claim and known stray over all area.
    open_share : float
        Protons of open claims over protons that must be seen.
    coincidence : float
        Negative log probability that coupled claims which the structure keeps
        apart fall together so that their splitting does not show.
    offset_ppm : float
        Common error of the reference.
    claims : tuple of ClaimResidual
    couplings : tuple of CouplingResidual
    selection_score : float
        Negative log likelihood by which fits of one spectrum are compared.
    """

    residual_share: float
    unexplained_share: float
    open_share: float
    coincidence: float
    offset_ppm: float
    claims: tuple[ClaimResidual, ...]
    couplings: tuple[CouplingResidual, ...]
    selection_score: float

    def faults(self) -> dict[str, float]:
        """Features of the verdict by name; 0 is faultless."""
        counted = [one for one in self.claims if one.is_counted]
        shifts = _costs([one.shift_z for one in counted])
        rigid = _costs([one.z for one in self.couplings if one.is_rigid])
        soft = _costs([one.z for one in self.couplings if not one.is_rigid])
        amplitudes = _costs([one.amplitude_log / AMPLITUDE_SD for one in counted])
        widths = _costs([one.width_log / WIDTH_SD for one in counted])
        misfits = [min(one.residual_share, 2.0) for one in counted]
        share = max(self.residual_share, RESIDUAL_FLOOR)
        return {
            "misfit": float(np.log(share / RESIDUAL_FLOOR)),
            "worst_misfit": max(misfits, default=0.0),
            "shift": _mean(shifts),
            "worst_shift": max(shifts, default=0.0),
            "rigid_coupling": _mean(rigid),
            "worst_rigid_coupling": max(rigid, default=0.0),
            "soft_coupling": _mean(soft),
            "amplitude": _mean(amplitudes),
            "width": _mean(widths),
            "open": self.open_share,
            "coincidence": self.coincidence,
            "unexplained": self.unexplained_share,
        }


def _costs(residuals: list[float]) -> list[float]:
    """Half squares, capped so that one outlier cannot decide alone."""
    return [min(0.5 * z * z, SQUARE_CAP) for z in residuals]


def _mean(values: list[float]) -> float:
    return float(np.mean(values)) if values else 0.0


def assess(
    evidence: Evidence,
    claims: ClaimSet,
    fits: Sequence[Refinement],
    *,
    absent: frozenset[int],
    hidden: frozenset[int],
    constraints: Constraints | None = None,
) -> Assessment:
    """Residuals of a refinement against the evidence.

    Parameters
    ----------
    evidence : Evidence
    claims : ClaimSet
    fits : sequence of Refinement
        The refinement, then the broadened fit that it began with, if any. A
        fine fit gives way to line shapes that no model has; the smaller misfit
        of the two tells how well the claims are placed.
    absent, hidden : frozenset of int
        Claims that are not in the spectrum, and those under a mask.
    constraints : Constraints, optional
        Stretches left out by hand take no part.
    """
    refinement = fits[0]
    misfits = [spectrum_misfit(evidence, one, constraints) for one in fits]
    misfit = min(misfits, key=lambda one: one.share)
    excess = exchangeable_excess(claims, refinement, absent | hidden)
    misfit = replace(
        misfit,
        share=misfit.share + excess,
        unexplained_share=misfit.unexplained_share + excess,
    )
    offset_ppm = reference_offset(evidence, claims, refinement, absent | hidden)
    rows = _claim_rows(
        claims, refinement, misfit, offset_ppm, absent=absent, hidden=hidden
    )
    couplings = _coupling_residuals(claims, refinement, absent | hidden)
    open_share = _open_share(claims, absent, hidden)
    return Assessment(
        residual_share=misfit.share,
        unexplained_share=misfit.unexplained_share,
        open_share=open_share,
        coincidence=coincidence_cost(
            claims,
            refinement,
            absent | hidden,
            evidence.spectrum.spectrometer_frequency_mhz,
        ),
        offset_ppm=offset_ppm,
        claims=rows,
        couplings=couplings,
        selection_score=_selection_score(
            misfit, rows, couplings, n_skipped=_n_skipped(claims, absent)
        )
        + placement_cost(
            claims,
            refinement.shifts_ppm,
            absent | hidden,
            constraints.side if constraints else None,
        ),
    )


def reference_offset(
    evidence: Evidence,
    claims: ClaimSet,
    refinement: Refinement,
    absent: frozenset[int],
) -> float:
    """Common shift error by weighted mean, held by the reference's own sd, ppm."""
    reference_sd = evidence.reference.sd_ppm
    if reference_sd <= 0.0:
        return 0.0
    pull, weight = 0.0, 1.0 / reference_sd**2
    for index, claim in enumerate(claims.claims):
        if index in absent or claim.is_exchangeable:
            continue
        sd = max(claim.shift_sd_ppm, SHIFT_EXTRA_SD_PPM)
        gap = float(refinement.shifts_ppm[index]) - claim.shift_ppm
        # An outlier must not drag the zero point along.
        gap = float(np.clip(gap, -3 * sd, 3 * sd))
        pull += gap / sd**2
        weight += 1.0 / sd**2
    return pull / weight


def _claim_rows(
    claims: ClaimSet,
    refinement: Refinement,
    misfit: SpectrumMisfit,
    offset_ppm: float,
    *,
    absent: frozenset[int],
    hidden: frozenset[int],
) -> tuple[ClaimResidual, ...]:
    common_width = _common_width(claims, refinement, absent | hidden)
    rows = []
    for index, claim in enumerate(claims.claims):
        if index in absent or index in hidden:
            continue
        gap = float(refinement.shifts_ppm[index]) - claim.shift_ppm - offset_ppm
        sd = float(np.hypot(claim.shift_sd_ppm, SHIFT_EXTRA_SD_PPM))
        amplitude = float(refinement.protons[index]) / expected_protons(claims, claim)
        width = max(float(refinement.widths_hz[index]), 1e-3)
        is_counted = claim.visibility == "seen" and not claim.is_exchangeable
        rows.append(
            ClaimResidual(
                claim=index,
                is_counted=is_counted,
                shift_z=gap / sd,
                amplitude_log=float(np.log(max(amplitude, 0.05))),
                width_log=float(np.log(width / common_width)),
                residual_share=misfit.claim_shares.get(claim.label, 0.0),
            )
        )
    return tuple(rows)


def expected_protons(claims: ClaimSet, claim: Claim) -> float:
    """Protons that a claim should show, its species' share included."""
    share = 1.0
    if claim.species < len(claims.species_shares):
        share = max(claims.species_shares[claim.species][0], 0.01)
    return claim.n_protons * share


def _common_width(
    claims: ClaimSet, refinement: Refinement, left_out: frozenset[int]
) -> float:
    widths = [
        float(refinement.widths_hz[index])
        for index, claim in enumerate(claims.claims)
        if index not in left_out and not claim.is_exchangeable
    ]
    return max(float(np.median(widths)), 1e-3) if widths else 1.0


def _coupling_residuals(
    claims: ClaimSet, refinement: Refinement, left_out: frozenset[int]
) -> tuple[CouplingResidual, ...]:
    rows = []
    for index, coupling in enumerate(claims.couplings):
        owners = {claims.particles[p].claim for pair in coupling.pairs for p in pair}
        unsure = any(
            owner in left_out or claims.claims[owner].is_exchangeable
            for owner in owners
            if owner is not None
        )
        if unsure or not refinement.determined[index]:
            continue
        gap = abs(float(refinement.couplings_hz[index])) - abs(coupling.j_hz)
        sd = float(np.hypot(coupling.j_sd_hz, COUPLING_EXTRA_SD_HZ))
        rows.append(
            CouplingResidual(coupling=index, z=gap / sd, is_rigid=coupling.is_rigid)
        )
    return tuple(rows)


def coincidence_cost(
    claims: ClaimSet,
    refinement: Refinement,
    left_out: frozenset[int],
    frequency_mhz: float,
) -> float:
    """Cost of inequivalent claims that fall together, at most 12.

    Two coupled claims closer than half their J show next to no splitting. That
    they lie so close has the probability of the window under the predicted
    difference; each claim that joins others is counted once. The two protons of
    one CH2 are often equal by accident and are left out.
    """
    costs: list[tuple[float, int, int]] = []
    for coupling in claims.couplings:
        first, second = (claims.particles[p].claim for p in coupling.pairs[0])
        if first is None or second is None or first == second:
            continue
        one, other = claims.claims[first], claims.claims[second]
        if {first, second} & left_out or one.pair == other.label:
            continue
        if one.is_exchangeable or other.is_exchangeable:
            continue
        window = abs(coupling.j_hz) / 2.0
        gap = abs(float(refinement.shifts_ppm[first] - refinement.shifts_ppm[second]))
        if window < LEAST_WINDOW_HZ or gap * frequency_mhz > window:
            continue
        sd = float(np.hypot(one.shift_sd_ppm, other.shift_sd_ppm))
        z = (one.shift_ppm - other.shift_ppm) / sd
        share = 2.0 * window / frequency_mhz / (np.sqrt(2.0 * np.pi) * sd)
        cost = -float(np.log(min(share, 1.0))) + 0.5 * z * z
        costs.append((min(cost, COINCIDENCE_CAP), first, second))
    return min(_spanning_cost(costs), SQUARE_CAP)


def _spanning_cost(costs: list[tuple[float, int, int]]) -> float:
    """Sum over the cheapest pairs that join all claims which fall together."""
    group: dict[int, int] = {}

    def root(claim: int) -> int:
        while group.get(claim, claim) != claim:
            claim = group[claim]
        return claim

    total = 0.0
    for cost, first, second in sorted(costs):
        low, high = sorted((root(first), root(second)))
        if low != high:
            group[high] = low
            total += cost
    return total


def exchangeable_excess(
    claims: ClaimSet, refinement: Refinement, left_out: frozenset[int]
) -> float:
    """Area that exchangeable claims took beyond one and a half times their own.

    Their areas are nearly free in the fit, so that one could swallow a signal
    which no other claim owns; that part counts as unexplained. As a share of
    all modelled area.
    """
    excess, total = 0.0, 0.0
    for index, claim in enumerate(claims.claims):
        if index in left_out:
            continue
        protons = float(np.nan_to_num(refinement.protons[index]))
        total += protons
        if claim.is_exchangeable:
            allowed = EXCESS_ALLOWED * expected_protons(claims, claim)
            excess += max(protons - allowed, 0.0)
    return excess / total if total > 0.0 else 0.0


def _open_share(
    claims: ClaimSet, absent: frozenset[int], hidden: frozenset[int]
) -> float:
    """Protons of open claims, and a quarter of hidden ones, over all to be seen."""
    must = [i for i, claim in enumerate(claims.claims) if claim.visibility == "seen"]
    protons = sum(claims.claims[i].n_protons for i in must)
    missing = sum(claims.claims[i].n_protons for i in must if i in absent)
    unseen = sum(claims.claims[i].n_protons for i in must if i in hidden)
    return (missing + HIDDEN_PART * unseen) / protons if protons else 0.0


def _n_skipped(claims: ClaimSet, absent: frozenset[int]) -> int:
    return sum(claims.claims[i].visibility == "optional" for i in absent)


def _selection_score(
    misfit: SpectrumMisfit,
    rows: tuple[ClaimResidual, ...],
    couplings: tuple[CouplingResidual, ...],
    *,
    n_skipped: int,
) -> float:
    """Smaller is better; weights as found on acquired spectra."""
    counted = [one for one in rows if one.is_counted]
    score = 15.0 * float(np.log(max(misfit.share, RESIDUAL_FLOOR)))
    score += sum(_costs([one.shift_z for one in rows]))
    score += sum(_costs([one.z for one in couplings]))
    score += 0.3 * sum(_costs([one.amplitude_log / 0.2 for one in counted]))
    score += 0.5 * sum(_costs([one.width_log / WIDTH_SD for one in counted]))
    return score + 1.5 * n_skipped
