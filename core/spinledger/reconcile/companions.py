"""Strays that belong to structures which the user says are in the tube."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from spinledger.prediction.claims import make_claims
from spinledger.reconcile.match import Hypothesis, match
from spinledger.reconcile.solve import Solution
from spinledger.reconcile.strays import Unowned
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence, StrayKind
from spinledger.values.structure import Structure

# Some of a companion's signals may lie under the product's.
NEEDED_SHARE = 0.6


def given_strays(
    evidence: Evidence,
    solution: Solution,
    unowned: Sequence[Unowned],
    companions: Sequence[Structure],
) -> dict[int, tuple[StrayKind, str]]:
    """Unowned stretches that a given structure's claims account for.

    The companion's claims are matched to what the main structure leaves over;
    most of its protons must come to lie on unowned stretches.
    """
    named: dict[int, tuple[StrayKind, str]] = {}
    if not companions or not unowned:
        return named
    model = solution.best.refinement.intensities
    leftover = np.maximum(evidence.spectrum.intensities - model, 0.0)
    spectrum = replace(evidence.spectrum, intensities=leftover)
    rest = replace(evidence, spectrum=spectrum)
    for companion in companions:
        claims = make_claims(companion, solvent=evidence.solvent, ph=None)
        found = match(rest, claims)
        if not found.hypotheses:
            continue
        hits, share = _hits(claims, found.hypotheses[0], unowned)
        if share < NEEDED_SHARE:
            continue
        name = companion.name or companion.given
        for number, labels in hits.items():
            named[number] = ("given", f"{name}, given: {', '.join(labels)}")
    return named


def _hits(
    claims: ClaimSet, hypothesis: Hypothesis, unowned: Sequence[Unowned]
) -> tuple[dict[int, list[str]], float]:
    """Stretches with the claims on them, and the share of protons so placed."""
    hits: dict[int, list[str]] = {}
    placed, wanted = 0, 0
    for index, claim in enumerate(claims.claims):
        if claim.visibility != "seen":
            continue
        wanted += claim.n_protons
        if index in hypothesis.absent:
            continue
        shift = float(hypothesis.shifts_ppm[index])
        near_ppm = 3.0 * claim.shift_sd_ppm
        for number, one in enumerate(unowned):
            inside = one.low_ppm - 0.03 <= shift <= one.high_ppm + 0.03
            if inside and abs(shift - claim.shift_ppm) <= near_ppm:
                hits.setdefault(number, []).append(claim.label)
                placed += claim.n_protons
                break
    return hits, placed / wanted if wanted else 0.0
