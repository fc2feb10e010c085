"""Couplings of saturated molecules against published values (from memory where no source is named)."""

import pytest

from coupling_particles import predict


def test_menthol_ring_couplings_tell_axial_from_equatorial() -> None:
    # 1 CHMe2, 3 C4-H, 4 C5-H2, 5 C6-H2, 6 CHMe, 8 CH2, 9 CHOH.
    found = predict(
        "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O",
        [[(9, 0)], [(3, 0)], [(8, 0)], [(8, 1)], [(6, 0)], [(1, 0)]],
        is_aqueous=False,
    )
    # H1: td 10.4, 4.3 Hz in CDCl3; rule sd 1.2 Hz.
    assert found.between(0, 1).j_hz == pytest.approx(10.4, abs=1.2)
    to_methylene = sorted(found.between(0, k).j_hz for k in (2, 3))
    assert to_methylene == pytest.approx([4.3, 10.4], abs=1.3)
    to_methine = sorted(found.between(4, k).j_hz for k in (2, 3))
    assert to_methine == pytest.approx([3.3, 12.2], abs=1.3)
    # Isopropyl CH against H2: 2.8 Hz, the gauche rotamer.
    assert found.between(1, 5).j_hz == pytest.approx(2.8, abs=1.0)
    assert all(found.between(0, k).is_rigid for k in (1, 2, 3))
    assert not found.between(1, 5).is_rigid


@pytest.mark.parametrize(
    ("smiles", "expected_hz"),
    [
        # Metabolite tables (Govindaraju et al., NMR Biomed. 13 (2000) 129):
        # 1-2, 2-3, 3-4, 4-5.
        ("OC[C@H]1O[C@H](O)[C@H](O)[C@@H](O)[C@@H]1O", (3.8, 9.6, 9.4, 9.9)),
        ("OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O", (8.0, 9.1, 9.4, 8.9)),
    ],
)
def test_glucose_ring_couplings(smiles: str, expected_hz: tuple[float, ...]) -> None:
    ring = [4, 6, 8, 10, 2]
    found = predict(smiles, [[(carbon, 0)] for carbon in ring])
    values = [found.between(k, k + 1).j_hz for k in range(4)]
    # Rule sd 1.2 Hz.
    assert values == pytest.approx(expected_hz, abs=1.2)


def test_cyclohexane_averages_over_both_chairs() -> None:
    found = predict(
        "C1CCCCC1", [[(c, h) for c in range(6) for h in (0, 1)]], is_aqueous=False
    )
    vicinal = sorted(c.j_hz for c in found.of_kind("vicinal ring"))
    # Garbisch and Griffith (J. Am. Chem. Soc. 90 (1968) 6543): ax-ax 13.12,
    # eq-eq 2.96, ax-eq 3.65; ring inversion leaves 3.65 for cis and 8.04 for
    # trans protons.
    assert vicinal == pytest.approx([3.65, 8.04], abs=1.0)
    assert [len(c.pairs) for c in found.of_kind("vicinal ring")] == [12, 12]


def test_norbornane_exo_endo_and_w_couplings() -> None:
    # 0, 1 and 3, 4 two-carbon bridges, 2 and 5 bridgeheads, 6 the one-carbon bridge.
    found = predict(
        "C1CC2CCC1C2",
        [[(0, 0)], [(0, 1)], [(1, 0)], [(1, 1)], [(2, 0)], [(5, 0)], [(6, 0)]],
        is_aqueous=False,
    )
    bridge = sorted(found.between(a, b).j_hz for a in (0, 1) for b in (2, 3))
    # Marchand 1982 (from memory): exo-endo 4.6 twice, endo-endo 9.1, exo-exo 12.2.
    assert bridge == pytest.approx([4.6, 4.6, 9.1, 12.2], abs=1.0)
    bridgehead = sorted(found.between(5, k).j_hz for k in (0, 1))
    assert bridgehead == pytest.approx([0.1, 3.8], abs=1.0)
    w_couplings = found.of_kind("W")
    # Handbook: 1 to 4 Hz along the planar zigzag.
    assert {(4, 5)} <= {pair for c in w_couplings for pair in c.pairs}
    assert all(1.0 <= c.j_hz <= 4.0 for c in w_couplings)


def test_chair_rings_have_w_couplings_between_equatorial_protons_only() -> None:
    found = predict(
        "C[C@@H]1C[C@H](C)C[C@@H](C)C1",
        [[(2, 0)], [(2, 1)], [(5, 0)], [(5, 1)]],
        is_aqueous=False,
    )
    pairs = [pair for c in found.of_kind("W") for pair in c.pairs]
    assert len(pairs) == 1


def test_proline_couplings_lie_within_their_sd() -> None:
    found = predict(
        "O=C([O-])[C@@H]1CCC[NH2+]1", [[(3, 0)], [(4, 0)], [(4, 1)], [(5, 0)]]
    )
    # Haasnoot et al., Biopolymers 20 (1981) 1211 and metabolite tables: 8.9 and 6.4.
    values = [found.between(0, k) for k in (1, 2)]
    assert sorted(c.j_hz for c in values) == pytest.approx([6.4, 8.9], abs=2.0)
    assert all(0.8 < c.j_sd_hz < 2.5 for c in values)


def test_ribonucleoside_ring_takes_the_table() -> None:
    smiles = "Nc1ncnc2c1ncn2[C@@H]1O[C@H](CO)[C@@H](O)[C@H]1O"
    c1, c2, c3, c4 = 10, 17, 15, 12
    found = predict(smiles, [[(c, 0)] for c in (c1, c2, c3, c4)])
    values = [found.between(k, k + 1) for k in range(3)]
    # Adenosine in water: 6.2, 5.2, 3.4 Hz (from memory).
    assert [c.j_hz for c in values] == pytest.approx([6.2, 5.2, 3.4], abs=1.4)
    assert all("ribose" in c.source for c in values)
    arabino = smiles.replace("[C@H]1O", "[C@@H]1O")
    other = predict(arabino, [[(c, 0)] for c in (c1, c2, c3, c4)])
    assert all("ribose" not in c.source for c in other.couplings)


def test_epoxide_and_cyclopropane_tell_cis_from_trans() -> None:
    # Styrene oxide: 4.1 and 2.6 Hz, geminal +5.5 Hz.
    found = predict("c1ccccc1C1CO1", [[(6, 0)], [(7, 0)], [(7, 1)]])
    vicinal = sorted(found.between(0, k).j_hz for k in (1, 2))
    assert vicinal == pytest.approx([2.6, 4.1], abs=0.6)
    assert found.between(1, 2).j_hz == pytest.approx(5.5, abs=0.6)


@pytest.mark.parametrize(
    ("smiles", "carbon", "expected_hz"),
    [
        # Handbook ranges, Hz, with sign.
        ("OC(=O)CC(=O)OC", 3, -17.0),
        ("OCC(N)C(=O)O", 1, -12.0),
        ("C1OCCO1", 0, 0.0),
        ("C1CC1C#N", 0, -4.5),
        ("CCCC(C)O", 1, -13.6),
    ],
)
def test_geminal_couplings_carry_their_sign(
    smiles: str, carbon: int, expected_hz: float
) -> None:
    found = predict(smiles, [[(carbon, 0)], [(carbon, 1)]])
    # Rule sd 1.2 to 1.6 Hz.
    assert found.between(0, 1).j_hz == pytest.approx(expected_hz, abs=1.6)


@pytest.mark.parametrize(
    ("smiles", "expected_hz"),
    [
        # Asp and its like at pH 7: metabolite table 3.65 and 9.1 (mean 6.4);
        # threonine-type CH(CH3): 6.4 Hz; alanine 7.23 Hz.
        ("C[C@H]([NH3+])C(=O)[O-]", 7.23),
        ("C[C@@H](O)[C@H]([NH3+])C(=O)[O-]", 6.35),
        ("CC(O)CC(=O)[O-]", 6.27),
        ("CCO", 7.08),
    ],
)
def test_methyl_couplings(smiles: str, expected_hz: float) -> None:
    found = predict(smiles, [[(0, None)], [(1, 0)]])
    claim = found.between(0, 1)
    # 0.5 Hz: the 95 % half width of this kind.
    assert claim.j_hz == pytest.approx(expected_hz, abs=0.5)
    assert claim.kind == "vicinal methyl"


def test_aspartate_has_a_large_and_a_small_coupling_linked_as_swaps() -> None:
    found = predict("[NH3+][C@@H](CC(=O)[O-])C(=O)[O-]", [[(1, 0)], [(2, 0)], [(2, 1)]])
    first, second = found.between(0, 1), found.between(0, 2)
    # Metabolite table: 3.65 and 9.11 Hz; 95 % half width of the kind 2.5 Hz.
    assert sorted([first.j_hz, second.j_hz]) == pytest.approx([3.65, 9.11], abs=2.5)
    assert found.couplings[first.swaps_with or 0] == second
    assert found.couplings[second.swaps_with or 0] == first
    assert not first.is_rigid


def test_succinate_has_j_and_j_prime() -> None:
    found = predict("[O-]C(=O)CCC(=O)[O-]", [[(3, 0), (3, 1), (4, 0), (4, 1)]])
    geminal, j, j_prime = found.couplings
    assert geminal.kind == "geminal"
    assert len(geminal.pairs) == len(j.pairs) == len(j_prime.pairs) == 2
    assert found.couplings[j.swaps_with or 0] == j_prime
    assert found.couplings[j_prime.swaps_with or 0] == j
    assert geminal.swaps_with is None
    # AA'A''A''': J couples each proton of one CH2 to a different one of the other.
    assert not set(j.pairs) & set(j_prime.pairs)
    assert {i for pair in j.pairs for i in pair} == {0, 1, 2, 3}
    # Mean of J and J': 7.3 Hz in succinate (from memory); 95 % of means within 1.2 Hz.
    assert (j.j_hz + j_prime.j_hz) / 2 == pytest.approx(7.3, abs=1.0)


def test_gaba_chain_pairs_j_and_j_prime_on_both_bonds() -> None:
    found = predict(
        "[NH3+]CCCC(=O)[O-]",
        [[(1, 0), (1, 1)], [(2, 0), (2, 1)], [(3, 0), (3, 1)]],
    )
    vicinal = found.of_kind("vicinal chain")
    assert len(vicinal) == 4
    for claim in vicinal:
        partner = found.couplings[claim.swaps_with or 0]
        ends = {frozenset(i // 2 for i in pair) for pair in claim.pairs}
        assert {frozenset(i // 2 for i in pair) for pair in partner.pairs} == ends


def test_no_geometry_falls_back_on_means_and_says_so() -> None:
    # A cage that cannot be embedded; its CH2-CH2 couplings are still predicted.
    found = predict(
        "C[C@]12CC[C@@](C)(CC1)C2", [[(2, 0)], [(2, 1)], [(3, 0)], [(3, 1)]]
    )
    claim = found.between(0, 2)
    assert "no geometry" in claim.source
    assert not claim.is_rigid
    assert claim.j_sd_hz > 2.0
