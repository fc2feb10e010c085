"""Starts that a fit may not reach by itself."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from core.spins.spin_cases import claim_set
from spinledger.reconcile.refine_starts import alternatives
from spinledger.reconcile.refine_values import Start
from spinledger.values.claim import ClaimSet


def ester() -> tuple[ClaimSet, Start]:
    """CH and the two protons of a CH2, 0.05 ppm apart; the methyl is far away."""
    base = claim_set(
        [
            ("2-H", [1], 4.2),
            ("3-HA", [1], 2.50),
            ("3-HB", [1], 2.45),
            ("CH3", [3], 1.2),
        ],
        [([(0, 1)], 8.0), ([(0, 2)], 4.0), ([(1, 2)], -15.0)],
    )
    first, second, geminal = base.couplings
    claims = replace(
        base,
        couplings=(
            replace(first, swaps_with=1),
            replace(second, swaps_with=0),
            replace(geminal, bonds=2),
        ),
    )
    start = Start(
        shifts_ppm=np.array([4.2, 2.50, 2.45, 1.2]),
        couplings_hz=np.array([8.0, 4.0, -15.0]),
    )
    return claims, start


def test_pair_couplings_and_geminal_sign_are_turned_one_at_a_time() -> None:
    claims, start = ester()
    found = alternatives(claims, start)
    assert [one.shifts_ppm.tolist() for one in found] == [
        [4.2, 2.45, 2.50, 1.2],
        [4.2, 2.50, 2.45, 1.2],
        [4.2, 2.50, 2.45, 1.2],
    ]
    assert [one.couplings_hz.tolist() for one in found] == [
        [8.0, 4.0, -15.0],
        [4.0, 8.0, -15.0],
        [8.0, 4.0, 15.0],
    ]


def test_absent_and_distant_claims_are_not_exchanged() -> None:
    claims, start = ester()
    hidden = replace(start, absent=frozenset({2}))
    assert all(
        one.shifts_ppm.tolist() == start.shifts_ppm.tolist()
        for one in alternatives(claims, hidden)
    )
    near = alternatives(claims, start, within_ppm=0.04)
    assert all(one.shifts_ppm.tolist() == start.shifts_ppm.tolist() for one in near)


def test_no_more_than_the_allowed_number_is_given() -> None:
    claims, start = ester()
    assert len(alternatives(claims, start, most=2)) == 2
