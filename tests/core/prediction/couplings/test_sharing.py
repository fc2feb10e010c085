"""Which pairs share a parameter, and what swaps with what; counted by hand."""

import pytest

from coupling_particles import predict


def test_propanediol_has_j_and_j_prime_of_four_pairs_each() -> None:
    found = predict("OCCCO", [[(1, 0), (1, 1), (3, 0), (3, 1)], [(2, 0), (2, 1)]])
    vicinal = found.of_kind("vicinal chain")
    assert [len(c.pairs) for c in vicinal] == [4, 4]
    # Every end proton meets one middle proton by J and the other by J'.
    for end in range(4):
        for middle in (4, 5):
            assert found.has(end, middle)
    first = {frozenset(p) for p in vicinal[0].pairs}
    assert all(
        sum(frozenset((end, m)) in first for m in (4, 5)) == 1 for end in range(4)
    )
    assert [len(c.pairs) for c in found.of_kind("geminal")] == [2, 1]


def test_dioxane_has_one_geminal_one_cis_and_one_trans_coupling() -> None:
    found = predict(
        "C1COCCO1", [[(c, h) for c in (0, 1, 3, 4) for h in (0, 1)]], is_aqueous=False
    )
    assert [len(c.pairs) for c in found.of_kind("geminal")] == [4]
    assert [len(c.pairs) for c in found.of_kind("vicinal ring")] == [4, 4]


def test_benzene_has_three_couplings() -> None:
    found = predict("c1ccccc1", [[(c, 0) for c in range(6)]])
    assert sorted(len(c.pairs) for c in found.couplings) == [3, 6, 6]
    # Read, Mathis and Goldstein 1966 (from memory): 7.54, 1.37, 0.66 Hz.
    values = sorted(c.j_hz for c in found.couplings)
    assert values == pytest.approx([0.66, 1.37, 7.54], abs=0.5)


def test_ortho_dichlorobenzene_is_aa_bb() -> None:
    found = predict("Clc1ccccc1Cl", [[(2, 0), (5, 0)], [(3, 0), (4, 0)]])
    kinds = {frozenset(p): c.kind for c in found.couplings for p in c.pairs}
    assert kinds == {
        frozenset({0, 2}): "ortho",
        frozenset({1, 3}): "ortho",
        frozenset({2, 3}): "ortho",
        frozenset({0, 3}): "meta",
        frozenset({1, 2}): "meta",
        frozenset({0, 1}): "para",
    }
    assert len(found.couplings) == 4


def test_enantiotopic_methylene_beside_a_methine_shares_one_coupling() -> None:
    # Isobutanol: the CH2 protons are enantiotopic, so are the two methyls.
    found = predict("CC(C)CO", [[(0, None), (2, None)], [(1, 0)], [(3, 0), (3, 1)]])
    to_methylene = found.between(2, 3)
    assert set(to_methylene.pairs) == {(2, 3), (2, 4)}
    assert set(found.between(0, 2).pairs) == {(0, 2), (1, 2)}


def test_diastereotopic_methyls_of_valine_swap() -> None:
    found = predict(
        "CC(C)[C@H]([NH3+])C(=O)[O-]", [[(0, None)], [(2, None)], [(1, 0)], [(3, 0)]]
    )
    first, second = found.between(0, 2), found.between(1, 2)
    assert first is not second
    assert found.couplings[first.swaps_with or 0] == second


def test_links_between_two_diastereotopic_methylenes_are_mutual() -> None:
    # Glutamate: 3-HA, 3-HB, 4-HA, 4-HB.
    found = predict(
        "[NH3+][C@@H](CCC(=O)[O-])C(=O)[O-]",
        [[(1, 0)], [(2, 0)], [(2, 1)], [(3, 0)], [(3, 1)]],
    )
    for index, claim in enumerate(found.couplings):
        if claim.swaps_with is not None:
            assert found.couplings[claim.swaps_with].swaps_with == index
    # The pair with the lower claim index is the one exchanged.
    to_4a = found.between(1, 3)
    assert found.couplings[to_4a.swaps_with or 0] == found.between(2, 3)


def test_meso_and_chiral_tartrate_each_have_one_chain_coupling() -> None:
    for smiles in (
        "O[C@@H](C(=O)[O-])[C@H](O)C(=O)[O-]",
        "O[C@H](C(=O)[O-])[C@H](O)C(=O)[O-]",
    ):
        found = predict(smiles, [[(1, 0), (5, 0)]])
        assert len(found.couplings) == 1


def test_open_relative_configuration_widens_ring_couplings() -> None:
    drawn = predict("C[C@@H]1CCCC[C@H]1O", [[(1, 0)], [(6, 0)]], is_aqueous=False)
    undrawn = predict("CC1CCCCC1O", [[(1, 0)], [(6, 0)]], is_aqueous=False)
    assert drawn.between(0, 1).is_rigid
    assert not undrawn.between(0, 1).is_rigid
    assert undrawn.between(0, 1).j_sd_hz > 2 * drawn.between(0, 1).j_sd_hz
    # One open centre has no relative configuration to leave open.
    single = predict("OC1CCCCC1", [[(1, 0)], [(2, 0)]], is_aqueous=False)
    assert single.between(0, 1).is_rigid


def test_small_long_range_couplings_are_left_out() -> None:
    found = predict("CCCCO", [[(0, None)], [(1, 0)], [(2, 0)], [(3, 0)]])
    assert not found.has(0, 2)
    assert not found.has(0, 3)
    assert all(c.bonds <= 3 or abs(c.j_hz) >= 0.15 for c in found.couplings)


def test_same_input_gives_the_same_claims() -> None:
    claims = [[(1, 0)], [(2, 0)], [(2, 1)]]
    smiles = "[NH3+][C@@H](CC(=O)[O-])C(=O)[O-]"
    assert predict(smiles, claims).couplings == predict(smiles, claims).couplings
