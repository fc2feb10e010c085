"""Distances of groups that differ by their place in space, against published shifts."""

import json

import pytest
from rdkit import Chem

from spinledger.cli import main
from spinledger.prediction.claims import environments_of, make_claims
from spinledger.prediction.shifts_rotation import rotation_gap_ppm
from spinledger.structure.mobility import slow_bonds
from spinledger.structure.read import read_structure
from spinledger.values.claim import Claim, ClaimSet


def claims_of(smiles: str, solvent: str = "CDCl3", **conditions: float) -> ClaimSet:
    return make_claims(read_structure(smiles), solvent=solvent, **conditions)


def on_atom(claims: ClaimSet, atom: int) -> list[Claim]:
    return [claim for claim in claims.claims if atom in claim.atoms]


def gap_ppm(claims: ClaimSet, first: int, second: int) -> float:
    (a,), (b,) = on_atom(claims, first), on_atom(claims, second)
    return abs(a.shift_ppm - b.shift_ppm)


@pytest.mark.parametrize(
    ("smiles", "first", "second", "published_ppm"),
    [
        # Fulmer et al., Organometallics 29 (2010) 2176, CDCl3: DMF 2.96 and 2.88,
        # dimethylacetamide 3.02 and 2.94.
        ("CN(C)C=O", 0, 2, 0.08),
        ("CN(C)C(C)=O", 0, 2, 0.08),
        # Handbook values (from memory): nitrosodimethylamine 3.77 and 3.02,
        # N,N-diisopropylacetamide CH 3.95 and 3.50.
        ("CN(C)N=O", 0, 2, 0.75),
        ("CC(C)N(C(C)C)C(C)=O", 1, 4, 0.45),
    ],
)
def test_sides_of_slow_bonds_stand_as_far_apart_as_published(
    smiles: str, first: int, second: int, published_ppm: float
) -> None:
    # Half of the published distance: the sd that the rule gives itself.
    assert gap_ppm(claims_of(smiles), first, second) == pytest.approx(
        published_ppm, rel=0.5
    )


def test_formylpiperidine_has_four_methylene_claims_beside_nitrogen_and_beyond() -> (
    None
):
    """Two N-CH2 and two C-CH2 of two protons each, apart at room temperature."""
    claims = claims_of("O=CN1CCCCC1")
    assert [len(on_atom(claims, atom)) for atom in (3, 4, 5, 6, 7)] == [1] * 5
    assert [on_atom(claims, atom)[0].n_protons for atom in (3, 4, 6, 7)] == [2] * 4
    # Published (CDCl3): 0.15 ppm beside nitrogen, about 0.05 further off.
    assert gap_ppm(claims, 3, 7) == pytest.approx(0.15, abs=0.07)
    assert gap_ppm(claims, 4, 6) == pytest.approx(0.05, abs=0.03)


def test_sides_are_alike_in_the_heat() -> None:
    """DMF: 20.9 kcal/mol merges well below 450 K."""
    (claim,) = on_atom(claims_of("CN(C)C=O", temperature_k=450.0), 0)
    assert claim.atoms == (0, 2)
    assert claim.n_protons == 6


def test_group_beside_the_formyl_proton_stands_at_lower_field() -> None:
    """Anet and Bourn 1965: the NOE to CHO comes from the low-field methyl group.

    Of the two nitrogen positions the one drawn first is taken cis to the oxygen.
    """
    claims = claims_of("CN(C)C=O")
    (cis,), (trans,) = on_atom(claims, 0), on_atom(claims, 2)
    assert trans.shift_ppm > cis.shift_ppm


def test_no_slow_bond_gives_no_distance() -> None:
    mol = Chem.MolFromSmiles("CCN(CC)CC")
    assert rotation_gap_ppm(mol, slow_bonds(mol), (1, 3)) is None


def test_groups_on_one_branch_of_nitrogen_are_not_told_by_rotation() -> None:
    """The two methyls of one isopropyl group stand on the same side."""
    mol = Chem.MolFromSmiles("CC(C)NC(C)=O")
    assert rotation_gap_ppm(mol, slow_bonds(mol), (0, 2)) is None


def test_equatorial_protons_stand_at_lower_field_in_menthol() -> None:
    """Published pairs (CDCl3, from memory): 1.96/0.97, 1.66/0.86, 1.61/0.98 ppm."""
    claims = claims_of("CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O")
    for atom, published_ppm in ((8, 0.99), (5, 0.80), (4, 0.63)):
        by_place = {c.place.split(", ")[0]: c for c in on_atom(claims, atom)}
        found = by_place["equatorial"].shift_ppm - by_place["axial"].shift_ppm
        # Three sds of the difference, no more than a sign with a size.
        assert found == pytest.approx(published_ppm, abs=0.7)
        assert found > 0.2


def test_axial_protons_are_those_with_the_large_couplings() -> None:
    """Shifts and couplings must agree on which proton is which."""
    claims = claims_of("CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O")
    for coupling in claims.couplings:
        if coupling.kind != "vicinal ring":
            continue
        for a, b in coupling.pairs:
            indices = (claims.particles[a].claim, claims.particles[b].claim)
            places = [
                claims.claims[i].place.split(", ")[0] for i in indices if i is not None
            ]
            # Diaxial 9 to 14 Hz, all others below 6 Hz (any textbook).
            assert (coupling.j_hz > 8.0) == (places == ["axial", "axial"])


def test_diastereotopic_methyls_of_valine_stand_apart() -> None:
    """Valine in D2O: 1.04 and 0.99 ppm (BMRB); within the claim's own sd."""
    claims = claims_of("CC(C)[C@H](N)C(=O)O", "D2O")
    (high,), (low,) = on_atom(claims, 0), on_atom(claims, 2)
    assert abs(high.shift_ppm - low.shift_ppm) < 0.15
    for claim in (high, low):
        # Three sds: honest about a tie.
        assert claim.shift_ppm == pytest.approx(1.01, abs=3 * claim.shift_sd_ppm)


def test_amide_nh2_is_two_claims_half_a_ppm_apart() -> None:
    """Acetamide in DMSO-d6: 7.30 and 6.70 ppm (from memory)."""
    high, low = on_atom(claims_of("CC(N)=O", "DMSO-d6"), 2)
    assert abs(high.shift_ppm - low.shift_ppm) == pytest.approx(0.6, abs=0.3)


def test_known_environments_stand_behind_every_carbon_claim() -> None:
    structure = read_structure("CCOC(C)=O")
    claims = make_claims(structure, solvent="CDCl3")
    found = environments_of(structure, claims, solvent="CDCl3")
    assert len(found) == len(claims.claims)
    for known in found:
        assert [item.sphere for item in known] == list(range(len(known)))
        assert known[-1].examples >= 1


def test_exchangeable_claims_have_no_known_environments() -> None:
    structure = read_structure("CCO")
    claims = make_claims(structure, solvent="CDCl3")
    found = environments_of(structure, claims, solvent="CDCl3")
    assert found[claims.index_of("1-OH")] == ()


def test_predict_prints_the_nearest_known_environments(
    capsys: pytest.CaptureFixture[str],
) -> None:
    assert main(["predict", "CCOC(C)=O", "--nearest", "--json"]) == 0
    claims = json.loads(capsys.readouterr().out)["claims"]
    fragments = [item["fragment"] for item in claims[0]["known_environments"]]
    assert fragments[0] == "[CH3:1]"
    assert main(["predict", "CCOC(C)=O", "--nearest"]) == 0
    assert "sphere 0: " in capsys.readouterr().out


def test_exchange_can_be_told_slow_or_fast() -> None:
    """In CDCl3 ethanol's OH may be a triplet or a singlet: both are offered."""
    structure = read_structure("CCO")
    for slow in (True, False):
        claims = make_claims(structure, solvent="CDCl3", slow_exchange=slow)
        assert any("H-O-C-H" in c.kind for c in claims.couplings) == slow
