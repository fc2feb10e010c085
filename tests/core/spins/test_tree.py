"""Splitting trees and multiplicities against what chemists write."""

from __future__ import annotations

import numpy as np
import pytest

from core.spins.spin_cases import claim_set, predictions
from spinledger.spins.multiplicity import multiplicity_of
from spinledger.spins.tree import Resolution, Tree, splitting_tree
from spinledger.values.claim import ClaimSet


def tree_of(
    claims: ClaimSet, index: int, frequency_mhz: float, fine: Resolution | None = None
) -> Tree:
    shifts, couplings = predictions(claims, frequency_mhz)
    return splitting_tree(claims, index, shifts, couplings, resolution=fine)


def amx(gap_ppm: float) -> ClaimSet:
    return claim_set(
        [("A", [1], 4.0), ("M", [1], 2.9 + gap_ppm), ("X", [1], 2.9)],
        [([(0, 1)], 7.0), ([(0, 2)], 5.0), ([(1, 2)], -14.0)],
    )


def test_amx_is_three_doublets_of_doublets_larger_j_first() -> None:
    tree = tree_of(amx(0.4), 1, 500.0)
    assert tree.multiplicity == "dd"
    assert [level.coupling_hz for level in tree.levels] == [14.0, 7.0]
    # Four leaves of a quarter proton at centre +- 7 +- 3.5 Hz, in closed form.
    np.testing.assert_allclose(
        tree.leaves_hz, 3.3 * 500 + np.array([-10.5, -3.5, 3.5, 10.5])
    )
    np.testing.assert_allclose(tree.leaf_protons, 0.25)
    assert tree.is_first_order


def test_departure_grows_as_the_shifts_close_in() -> None:
    trees = [tree_of(amx(gap), 1, 500.0) for gap in (0.8, 0.2, 0.03)]
    departures = [tree.departure for tree in trees]
    assert departures == sorted(departures)
    assert departures[0] < 0.1
    assert departures[2] > 0.5
    assert trees[2].multiplicity == "m"
    # The roof leans towards the partner at lower frequency.
    assert trees[1].roof < 0.0


def test_ethyl_is_a_triplet_and_a_quartet() -> None:
    claims = claim_set([("CH3", [3], 1.2), ("CH2", [2], 4.1)], [([(0, 1)], 7.1)])
    assert tree_of(claims, 0, 400.0).multiplicity == "t"
    quartet = tree_of(claims, 1, 400.0)
    assert quartet.multiplicity == "q"
    np.testing.assert_allclose(quartet.leaf_protons, 2 * np.array([1, 3, 3, 1]) / 8)


def test_accidentally_equal_couplings_are_an_apparent_triplet() -> None:
    claims = claim_set(
        [("a", [1], 3.5), ("b", [1], 5.0), ("c", [1], 7.0)],
        [([(0, 1)], 7.0), ([(0, 2)], 7.1)],
    )
    tree = tree_of(claims, 0, 500.0)
    assert tree.multiplicity == "app t"
    assert tree.levels[0].is_accidental
    apart = tree_of(claims, 0, 500.0, Resolution(width_hz=0.1))
    assert apart.multiplicity == "dd"


def test_four_spin_ring_is_named_and_never_a_doublet() -> None:
    claims = claim_set(
        [("2-H", [1, 1], 7.30), ("3-H", [1, 1], 6.90)],
        [
            ([(0, 2), (1, 3)], 8.4),
            ([(0, 3), (1, 2)], 0.4),
            ([(0, 1)], 2.3),
            ([(2, 3)], 2.8),
        ],
    )
    assert tree_of(claims, 0, 500.0).multiplicity == "m (AA′XX′)"
    assert tree_of(claims, 0, 100.0).multiplicity == "m (AA′BB′)"


def test_unknown_coupling_makes_no_multiplicity() -> None:
    fine = Resolution(determined=np.array([True, False, True]))
    assert tree_of(amx(0.4), 0, 500.0, fine).multiplicity == "m"


def test_coupling_under_half_a_width_is_not_resolved() -> None:
    claims = claim_set([("a", [1], 7.0), ("b", [1], 6.0)], [([(0, 1)], 0.4)])
    assert tree_of(claims, 0, 500.0).multiplicity == "s"


@pytest.mark.parametrize(
    ("levels", "text"),
    [
        ([], "s"),
        ([(1, False)], "d"),
        ([(1, False), (3, False)], "dq"),
        ([(4, False)], "quint"),
        ([(6, False), (1, False)], "sept d"),
        ([(7, False)], "m"),
        ([(1, False)] * 5, "m"),
    ],
)
def test_multiplicity_words(levels: list[tuple[int, bool]], text: str) -> None:
    assert multiplicity_of(levels, is_first_order=True) == text
