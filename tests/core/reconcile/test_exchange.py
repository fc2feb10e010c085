"""Which claims can stand the other way round, and the odds of it."""

from collections.abc import Callable

import pytest

from spinledger.reconcile.exchange import like_pairs
from spinledger.reconcile.mixture import joined
from spinledger.values.claim import ClaimSet

Claims = Callable[..., ClaimSet]


def test_both_protons_of_a_ch2_can_be_exchanged_with_their_couplings(
    make_claims: Claims,
) -> None:
    claims = make_claims(
        [("X", 4.0, 0.2, 1), ("A", 2.8, 0.2, 1), ("B", 2.7, 0.2, 1)],
        [(0, 1, 9.0), (0, 2, 4.0), (1, 2, -14.0)],
    )
    pairs = [pair for pair in like_pairs(claims, frozenset()) if pair.first == 1]
    assert [(pair.first, pair.second, pair.couplings) for pair in pairs] == [
        (1, 2, ((0, 1),))
    ]


def test_claims_with_other_neighbours_cannot_be_exchanged(make_claims: Claims) -> None:
    claims = make_claims(
        [("A", 2.8, 0.2, 1), ("B", 2.7, 0.2, 1), ("Me", 1.0, 0.2, 3)], [(0, 2, 7.0)]
    )
    assert list(like_pairs(claims, frozenset())) == []


def test_absent_claims_and_other_counts_are_left_alone(make_claims: Claims) -> None:
    claims = make_claims([("A", 7.0, 0.2, 1), ("B", 7.1, 0.2, 1), ("C", 7.2, 0.2, 2)])
    assert [(p.first, p.second) for p in like_pairs(claims, frozenset())] == [(0, 1)]
    assert list(like_pairs(claims, frozenset({1}))) == []


def test_joined_species_keep_their_couplings_apart(make_claims: Claims) -> None:
    one = make_claims([("A", 4.0, 0.1, 2), ("B", 1.0, 0.1, 3)], [(0, 1, 7.0)])
    both = joined([one, one])
    assert [claim.label for claim in both.claims] == ["A", "B", "A (2)", "B (2)"]
    assert [claim.species for claim in both.claims] == [0, 0, 1, 1]
    owners = [
        {both.particles[p].claim for p in coupling.pairs[0]}
        for coupling in both.couplings
    ]
    assert owners == [{0, 1}, {2, 3}]
    # Two sets of unknown ratio: half each to begin with.
    assert [share for share, _ in both.species_shares] == pytest.approx([0.5, 0.5])
