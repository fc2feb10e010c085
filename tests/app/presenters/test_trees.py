"""Splitting trees against closed forms: binomials, dd, pairing, gaps."""

from __future__ import annotations

from math import comb

import invented
import numpy as np
import pytest

from spinledger.values.ledger import ClaimLines
from spinledger_app.lanes.scene import Level
from spinledger_app.presenters.trees import first_order, tips_of, trees

FIELD_MHZ = 400.0


def level(j_hz: float, n_partners: int = 1) -> Level:
    return Level(
        j_hz=j_hz,
        n_partners=n_partners,
        partner="x",
        predicted_j_hz=j_hz,
        predicted_j_sd_hz=1.0,
    )


@pytest.mark.parametrize("n", [1, 2, 3, 6])
def test_equal_partners_give_binomial_lines(n: int) -> None:
    places, weights = first_order(4.0, [level(7.0, n)], FIELD_MHZ)
    expected = [comb(n, k) / 2**n for k in range(n + 1)]
    assert weights == pytest.approx(expected)
    # Outer lines stand n J apart (closed form of a multiplet).
    assert (places[0] - places[-1]) * FIELD_MHZ == pytest.approx(7.0 * n)


def test_equal_couplings_of_two_levels_coincide_as_a_triplet() -> None:
    places, weights = first_order(1.0, [level(6.0), level(6.0)], FIELD_MHZ)
    assert weights == pytest.approx([0.25, 0.5, 0.25])
    assert np.diff(places) * FIELD_MHZ == pytest.approx([-6.0, -6.0])


def test_double_doublet_stands_where_it_must() -> None:
    places, _ = first_order(2.5, [level(16.5), level(3.4)], FIELD_MHZ)
    offsets = (places - 2.5) * FIELD_MHZ
    # Half sums and half differences of the two J, to the hundredth of a Hz to
    # which places are rounded.
    assert offsets == pytest.approx([9.95, 6.55, -6.55, -9.95], abs=0.006)


def test_tips_keep_their_order_and_extra_lines_become_twigs() -> None:
    bases = np.array([1.02, 0.98])
    exact = ClaimLines(
        claim="x",
        shifts_ppm=np.array([1.03, 0.975, 0.965, 0.80]),
        protons=np.array([0.45, 0.40, 0.10, 0.05]),
        width_hz=1.0,
    )
    tips, twigs = tips_of(bases, exact, FIELD_MHZ)
    assert tips == pytest.approx([1.03, 0.975])
    # 0.965 ppm is 6 Hz from the last branch; 0.80 ppm, a combination line 72 Hz
    # away, belongs to no branch.
    assert twigs == pytest.approx((0.965,))


def test_lines_that_coincide_are_shared_by_neighbours() -> None:
    bases = np.array([1.01, 1.0, 0.99])
    exact = ClaimLines(
        claim="x",
        shifts_ppm=np.array([1.008, 0.992]),
        protons=np.array([0.5, 0.5]),
        width_hz=1.0,
    )
    tips, twigs = tips_of(bases, exact, FIELD_MHZ)
    assert tips[0] == pytest.approx(1.008)
    assert tips[-1] == pytest.approx(0.992)
    assert twigs == ()


def test_every_entry_has_a_tree_with_its_multiplet() -> None:
    grown = {tree.claim: tree for tree in trees(invented.ledger())}
    counts = {claim: len(tree.leaves) for claim, tree in grown.items()}
    # d of q of d: 2 x 4 x 2 lines; the exchangeable has one broad leaf.
    assert counts == {
        "3-H": 16,
        "1′-H": 4,
        "OH": 1,
        "2-HA": 4,
        "2-HB": 4,
        "2′-H": 3,
        "4-H": 2,
    }
    assert grown["OH"].width_hz == 15.0
    assert grown["2-HB"].levels[0].partner == "2-HA"


def test_gap_is_measured_to_the_nearest_line() -> None:
    tree = next(t for t in trees(invented.ledger()) if t.claim == "4-H")
    gaps = [leaf.gap_hz for leaf in tree.leaves]
    # The invented model lies on the invented lines.
    assert gaps == pytest.approx([0.0, 0.0], abs=0.01)
    assert not any(leaf.is_off for leaf in tree.leaves)


def test_open_claims_stand_at_their_prediction() -> None:
    tree = next(t for t in trees(invented.lost()) if t.claim == "2-HA")
    assert tree.state == "open"
    assert tree.root_ppm == 2.55
