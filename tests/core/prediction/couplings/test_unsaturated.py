"""Couplings of alkenes, alkynes, arenes and heteroarenes against published values."""

import pytest

from coupling_particles import predict


def test_styrene_vinyl_group() -> None:
    found = predict("C=Cc1ccccc1", [[(0, 0)], [(0, 1)], [(1, 0)]])
    # Handbook: gem 1.0, cis 10.9, trans 17.6 Hz.
    assert found.between(0, 1).j_hz == pytest.approx(1.1, abs=0.5)
    values = sorted(found.between(2, k).j_hz for k in (0, 1))
    assert values == pytest.approx([10.9, 17.6], abs=0.3)
    trans = max((found.between(2, k) for k in (0, 1)), key=lambda c: c.j_hz)
    assert trans.is_rigid
    assert trans.kind == "vinyl trans"


@pytest.mark.parametrize(
    ("smiles", "atoms", "expected_hz", "kind"),
    [
        # E and Z disubstituted ethylenes, handbook values from memory.
        ("OC(=O)/C=C/c1ccccc1", (3, 4), 16.0, "vinyl trans"),
        ("OC(=O)/C=C\\c1ccccc1", (3, 4), 12.7, "vinyl cis"),
        ("C/C=C/C(=O)OCC", (1, 2), 15.6, "vinyl trans"),
        ("C/C=C\\C(=O)OCC", (1, 2), 11.5, "vinyl cis"),
        ("[O-][N+](=O)/C=C/c1ccccc1", (3, 4), 13.7, "vinyl trans"),
        ("CO/C=C/C", (2, 3), 12.7, "vinyl trans"),
        ("Cl/C=C\\Cl", (1, 2), 5.3, "vinyl cis"),
        ("C1CCC=CC1", (3, 4), 10.0, "vinyl cis ring"),
        ("C1CC=CC1", (2, 3), 5.6, "vinyl cis ring"),
        ("C1=COCC1", (0, 1), 2.6, "vinyl cis ring"),
        ("C1=COCCC1", (0, 1), 6.2, "vinyl cis ring"),
    ],
)
def test_alkene_couplings(
    smiles: str,
    atoms: tuple[int, int],
    expected_hz: float,
    kind: str,
) -> None:
    claim = predict(smiles, [[(atoms[0], 0)], [(atoms[1], 0)]]).between(0, 1)
    # Rule sd 0.7 to 1.0 Hz.
    assert claim.j_hz == pytest.approx(expected_hz, abs=1.0)
    assert claim.kind == kind
    assert claim.is_rigid


def test_an_undrawn_double_bond_is_wide_and_not_rigid() -> None:
    claim = predict("OC(=O)C=Cc1ccccc1", [[(3, 0)], [(4, 0)]]).between(0, 1)
    # Covers 12.7 (Z) and 16.0 (E) at one sd.
    assert claim.j_hz - claim.j_sd_hz < 12.7
    assert claim.j_hz + claim.j_sd_hz > 16.0
    assert not claim.is_rigid


@pytest.mark.parametrize(
    ("smiles", "first", "second", "expected_hz", "limit_hz"),
    [
        # Handbook values from memory; limits are the sds of the rules.
        ("C/C=C/C(=O)OCC", (0, None), (1, 0), 6.9, 0.5),
        ("C/C=C/C(=O)OCC", (0, None), (2, 0), -1.7, 0.5),
        ("CC=O", (0, None), (1, 0), 2.9, 0.3),
        ("C=CC=O", (1, 0), (2, 0), 7.9, 0.5),
        ("C=CC=C", (1, 0), (2, 0), 10.4, 1.0),
        ("C#CCO", (0, 0), (2, 0), -2.5, 0.4),
        ("CC#CCO", (0, None), (3, 0), 2.4, 0.5),
        ("C=C=CCO", (0, 0), (2, 0), -6.5, 0.6),
        ("C=C=CCO", (0, 0), (3, 0), 3.0, 0.6),
        ("C1C=CCC=C1", (0, 0), (3, 0), 8.8, 1.2),
        ("Cc1ccccc1", (0, None), (2, 0), -0.75, 0.25),
        ("O=Cc1ccccc1", (1, 0), (4, 0), 0.45, 0.3),
    ],
)
def test_couplings_through_pi_bonds(
    smiles: str,
    first: tuple[int, int | None],
    second: tuple[int, int | None],
    expected_hz: float,
    limit_hz: float,
) -> None:
    found = predict(smiles, [[first], [second]], is_aqueous=False)
    assert found.between(0, 1).j_hz == pytest.approx(expected_hz, abs=limit_hz)


def test_para_disubstituted_benzene_is_aa_bb() -> None:
    found = predict("Clc1ccc(Br)cc1", [[(2, 0), (7, 0)], [(3, 0), (6, 0)]])
    ortho, para = found.between(0, 2), found.between(0, 3)
    assert set(ortho.pairs) == {(0, 2), (1, 3)}
    assert set(para.pairs) == {(0, 3), (1, 2)}
    assert found.couplings[ortho.swaps_with or 0] == para
    # Textbook AA'BB' of dihalobenzenes: 8.6, 0.3, meta 2.4 Hz.
    assert ortho.j_hz == pytest.approx(8.6, abs=0.5)
    assert para.j_hz == pytest.approx(0.3, abs=0.4)
    across = found.between(0, 1), found.between(2, 3)
    assert across[0] is not across[1]
    assert [c.j_hz for c in across] == pytest.approx([2.4, 2.4], abs=0.6)
    assert all(c.is_rigid for c in found.couplings)


def test_monosubstituted_benzene_has_aa_bb_c() -> None:
    found = predict(
        "[O-][N+](=O)c1ccccc1", [[(4, 0), (8, 0)], [(5, 0), (7, 0)], [(6, 0)]]
    )
    # Nitrobenzene (Castellano and Sun, J. Am. Chem. Soc. 88 (1966) 4741, from
    # memory): J23 8.36, J34 7.47, J24 1.17, J25 0.48, J26 2.4, J35 1.5 Hz.
    expected = {(0, 2): 8.36, (2, 4): 7.47, (0, 4): 1.17, (0, 3): 0.48, (0, 1): 2.4}
    for pair, value in expected.items():
        # 0.6 Hz: a bit over the 68 % half width of ortho and meta.
        assert found.between(*pair).j_hz == pytest.approx(value, abs=0.6), pair
    assert len(found.between(2, 4).pairs) == 2


@pytest.mark.parametrize(
    ("smiles", "atoms", "expected_hz", "limit_hz"),
    [
        # Handbook values from memory; limits are about one sd of the kind.
        ("O=c1ccc2ccccc2o1", (2, 3), 9.6, 0.8),
        ("c1ccncc1", (2, 1), 4.9, 0.8),
        ("c1ccncc1", (0, 1), 7.7, 0.8),
        ("c1ccoc1", (1, 2), 1.8, 0.4),
        ("c1ccoc1", (0, 1), 3.4, 0.4),
        ("c1ccsc1", (1, 2), 4.9, 0.6),
        ("c1ccsc1", (0, 1), 3.5, 0.7),
        ("c1cc[nH]c1", (1, 2), 2.6, 0.4),
        ("Cn1ccnc1", (2, 3), 1.2, 0.3),
        ("Cn1cccn1", (2, 3), 2.3, 0.4),
        ("c1nccs1", (2, 3), 3.3, 0.5),
        ("O=c1cc[nH]c(=O)[nH]1", (2, 3), 7.7, 0.5),
        ("c1ccc2ccccc2c1", (1, 2), 8.3, 0.5),
        ("c1ccc2ccccc2c1", (0, 1), 6.85, 0.8),
        ("c1ccc2[nH]ccc2c1", (5, 6), 3.2, 0.3),
    ],
)
def test_heteroaromatic_and_fused_rings(
    smiles: str,
    atoms: tuple[int, int],
    expected_hz: float,
    limit_hz: float,
) -> None:
    claim = predict(smiles, [[(atoms[0], 0)], [(atoms[1], 0)]]).between(0, 1)
    assert claim.j_hz == pytest.approx(expected_hz, abs=limit_hz)
    assert claim.is_rigid


def test_naphthalene_zigzag_runs_over_the_fusion_bond_only() -> None:
    # 4 and 7 are peri to each other; 2 and 7 lie along the zigzag.
    found = predict("c1ccc2ccccc2c1", [[(2, 0)], [(4, 0)], [(7, 0)], [(9, 0)]])
    # H4-H8 of naphthalene 0.8 Hz.
    assert found.between(0, 2).j_hz == pytest.approx(0.8, abs=0.3)
    assert not found.has(0, 1)


def test_imidazole_with_fast_nh_averages_its_couplings() -> None:
    # H4 and H5 as one claim: what fast exchange of NH makes of them.
    found = predict("c1c[nH]cn1", [[(0, 0), (1, 0)], [(3, 0)]])
    assert len(found.between(0, 2).pairs) == 2
