"""Splitting trees and multiplicities against what chemists write."""

from __future__ import annotations

import numpy as np
import pytest

from core.spins.spin_cases import claim_set, predictions
from spinledger.spins.first_order import owned_lines
from spinledger.spins.multiplicity import multiplicity_of
from spinledger.spins.network import ClaimNetwork
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


def test_four_spin_ring_with_broad_lines_is_still_no_doublet() -> None:
    claims = claim_set(
        [("2-H", [1, 1], 7.30), ("3-H", [1, 1], 6.90)],
        [
            ([(0, 2), (1, 3)], 8.4),
            ([(0, 3), (1, 2)], 0.4),
            ([(0, 1)], 2.3),
            ([(2, 3)], 2.8),
        ],
    )
    broad = Resolution(width_hz=4.0)
    assert tree_of(claims, 0, 500.0, broad).multiplicity == "m (AA′XX′)"


def ester(gap_hz: float) -> ClaimSet:
    """CH2 beside a stereocentre with CH3, its protons some Hz apart at 400 MHz."""
    return claim_set(
        [
            ("3-H", [1], 4.19),
            ("2-HA", [1], 2.42 + gap_hz / 400.0),
            ("2-HB", [1], 2.42),
            ("4-H", [3], 1.22),
        ],
        [
            ([(0, 1)], 3.4),
            ([(0, 2)], 8.6),
            ([(1, 2)], -16.5),
            ([(0, 3)], 6.3),
        ],
    )


@pytest.mark.parametrize(
    ("gap_hz", "words"),
    [(120.0, ["dqd", "dd", "dd", "d"]), (29.0, ["dqd", "dd", "dd", "d"])],
)
def test_displaced_pattern_whose_spacings_read_j_keeps_its_words(
    gap_hz: float, words: list[str]
) -> None:
    """AB part of ABX: doublets of exactly J_AB, (J_AX + J_BX)/2 +- (D+ - D-)/2 apart.

    D+- = hypot(gap +- (J_AX - J_BX)/2, J_AB): 8.27 and 3.73 Hz for a gap of 29 Hz
    in place of 8.6 and 3.4 Hz, well inside the line; 7.5 and 4.5 Hz and outer
    lines of a fifth for a gap of 12 Hz, which read wrongly.
    """
    fine = Resolution(width_hz=1.2)
    found = [tree_of(ester(gap_hz), k, 400.0, fine).multiplicity for k in range(4)]
    assert found == words


def test_pattern_that_reads_wrong_couplings_has_no_words() -> None:
    fine = Resolution(width_hz=1.2)
    found = [tree_of(ester(12.0), k, 400.0, fine).multiplicity for k in (1, 2)]
    assert found == ["m", "m"]


def test_line_is_owned_by_the_claim_that_flips_in_it() -> None:
    claims = claim_set([("A", [1], 2.05), ("B", [1], 2.0)], [([(0, 1)], 12.0)])
    shifts, couplings = predictions(claims, 400.0)
    exact = ClaimNetwork(claims).lines(shifts, couplings)
    shares = [owned_lines(exact, claim, bin_hz=0.02).protons for claim in (0, 1)]
    # AB in closed form, lines by rising frequency: 1 -+ J/D for outer and inner
    # ones. In A's lines A flips by cos and B by sin of half of arcsin(J/D).
    ratio = 12.0 / np.hypot(20.0, 12.0)
    lines = 0.5 * (1 + ratio * np.array([-1, 1, 1, -1]))
    half = 0.5 * np.arcsin(ratio)
    near, far = np.cos(half) ** 2, np.sin(half) ** 2
    # Closed forms both: rounding, and the thinning's scale of 1e-5.
    np.testing.assert_allclose(shares[0], lines * [far, far, near, near], atol=1e-5)
    np.testing.assert_allclose(shares[1], lines * [near, near, far, far], atol=1e-5)


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
