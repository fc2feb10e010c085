"""Ions, salts, anomers and hydrates; facts from textbooks and reviews."""

import pytest
from rdkit import Chem

from spinledger.structure.acidity import at_ph
from spinledger.structure.read import molecule, read_structure
from spinledger.structure.species import Solution, in_solution
from spinledger.structure.sugars import sugar_forms


def solution(smiles: str, solvent: str | None, ph: float | None = None) -> Solution:
    return in_solution(molecule(read_structure(smiles)), solvent, ph)


def canonical(smiles: str) -> str:
    return str(Chem.CanonSmiles(smiles))


@pytest.mark.parametrize(
    ("drawn", "ion"),
    [
        ("C[C@H](N)C(=O)O", "C[C@H]([NH3+])C(=O)[O-]"),
        ("NCCCCC(N)C(=O)O", "[NH3+]CCCCC([NH3+])C(=O)[O-]"),
        ("OC(=O)C1CCCN1", "[O-]C(=O)C1CCC[NH2+]1"),
        ("CN(CC(=O)O)C(=N)N", "CN(CC(=O)[O-])C(=[NH2+])N"),
        ("OC(=O)CC(O)(CC(=O)O)C(=O)O", "[O-]C(=O)CC(O)(CC(=O)[O-])C(=O)[O-]"),
        ("CCOP(=O)(O)O", "CCOP(=O)([O-])[O-]"),
        ("NCCS(=O)(=O)O", "[NH3+]CCS(=O)(=O)[O-]"),
        ("NCCc1ccc(O)cc1", "[NH3+]CCc1ccc(O)cc1"),
        ("Nc1ccccc1", "Nc1ccccc1"),
        ("c1ccncc1", "c1ccncc1"),
        ("NCC(=O)NCC(=O)O", "[NH3+]CC(=O)NCC(=O)[O-]"),
        ("OC1CCCCC1", "OC1CCCCC1"),
    ],
)
def test_ions_at_neutral_ph(drawn: str, ion: str) -> None:
    (species,) = solution(drawn, "D2O").species
    assert Chem.MolToSmiles(species.mol) == canonical(ion)


@pytest.mark.parametrize(
    ("drawn", "ph", "ion"),
    [
        ("NCC(=O)O", 1.0, "[NH3+]CC(=O)O"),
        ("NCC(=O)O", 12.0, "NCC(=O)[O-]"),
        ("NCCN", 5.0, "[NH3+]CC[NH3+]"),
        ("NCCN", 8.5, "NCC[NH3+]"),
        ("CCOP(=O)(O)O", 4.0, "CCOP(=O)([O-])O"),
        ("Oc1ccccc1", 12.0, "[O-]c1ccccc1"),
    ],
)
def test_ph_decides_the_ion(drawn: str, ph: float, ion: str) -> None:
    found = at_ph(molecule(read_structure(drawn)), ph)
    assert Chem.MolToSmiles(found.mol) == canonical(ion)


def test_half_protonated_group_is_flagged() -> None:
    assert at_ph(molecule(read_structure("Cn1ccnc1")), 7.0).borderline
    assert not at_ph(molecule(read_structure("CCN")), 7.4).borderline


def test_drawing_is_kept_in_organic_solvents() -> None:
    for solvent in ("CDCl3", "DMSO-d6", None):
        (species,) = solution("C[C@H](N)C(=O)O", solvent).species
        assert Chem.MolToSmiles(species.mol) == "C[C@H](N)C(=O)O"


def test_amino_acid_is_a_zwitterion_in_methanol() -> None:
    (species,) = solution("C[C@H](N)C(=O)O", "CD3OD").species
    assert Chem.MolToSmiles(species.mol) == "C[C@H]([NH3+])C(=O)[O-]"


@pytest.mark.parametrize("solvent", ["CDCl3", "DMSO-d6", "D2O"])
def test_acid_drawn_beside_an_amine_is_a_salt(solvent: str) -> None:
    found = solution("CCN(CC)CC.OC(=O)C(F)(F)F", solvent)
    assert Chem.MolToSmiles(found.species[0].mol) == canonical(
        "CC[NH+](CC)CC.[O-]C(=O)C(F)(F)F"
    )
    assert any("proportion" in note for note in found.notes)


def test_hydrochloride_of_an_amino_acid_stays_a_cation() -> None:
    (species,) = solution("Cl.C[C@H](N)C(=O)O", "D2O").species
    assert Chem.MolToSmiles(species.mol) == canonical("[Cl-].C[C@H]([NH3+])C(=O)O")


BETA_GLUCOSE = "OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O"
ALPHA_GLUCOSE = "OC[C@H]1O[C@H](O)[C@H](O)[C@@H](O)[C@@H]1O"
ALPHA_MANNOSE = "OC[C@H]1O[C@H](O)[C@@H](O)[C@@H](O)[C@@H]1O"


def test_glucose_is_both_anomers_in_water() -> None:
    """36 : 64 at 31 degC (Angyal 1984)."""
    found = solution(BETA_GLUCOSE, "D2O")
    assert [s.name for s in found.species] == ["beta", "alpha"]
    assert [s.share for s in found.species] == pytest.approx([0.64, 0.36], abs=0.03)
    names = [Chem.MolToSmiles(s.mol) for s in found.species]
    assert names == [canonical(BETA_GLUCOSE), canonical(ALPHA_GLUCOSE)]


def test_drawn_anomer_comes_first() -> None:
    found = solution(ALPHA_GLUCOSE, "D2O")
    assert [s.name for s in found.species] == ["alpha", "beta"]


def test_mannose_prefers_alpha() -> None:
    """About two thirds alpha (Angyal 1984)."""
    pair = sugar_forms(molecule(read_structure(ALPHA_MANNOSE)))
    assert pair[0].name == "alpha"
    assert pair[0].share == pytest.approx(0.67, abs=0.04)


@pytest.mark.parametrize(
    "smiles",
    [
        "OC1CCCCC1",
        "CO[C@@H]1O[C@H](CO)[C@@H](O)[C@H](O)[C@H]1O",  # methyl glucoside
        "O[C@H]1[C@H](O)[C@@H](O)[C@H](O)[C@@H](O)[C@H]1O",  # inositol
        "OC1CCCO1",
        "OC[C@H]1O[C@H](OC[C@H]2O[C@@](CO)(O[C@H]3O[C@H](CO)[C@@H](O)[C@H](O)[C@H]3O)"
        "[C@@H](O)[C@@H]2O)[C@H](O)[C@@H](O)[C@@H]1O",  # raffinose, not reducing
    ],
)
def test_others_have_no_anomers(smiles: str) -> None:
    assert sugar_forms(molecule(read_structure(smiles))) == ()


FRUCTOPYRANOSE = "OC[C@@]1(O)OC[C@@H](O)[C@@H](O)[C@@H]1O"
FRUCTOFURANOSE = "OC[C@H]1O[C@](O)(CO)[C@@H](O)[C@@H]1O"


def test_fructose_changes_its_ring_size() -> None:
    """About 70 % beta-pyranose, 25 % beta-furanose in water (Angyal 1984)."""
    forms = sugar_forms(molecule(read_structure(FRUCTOPYRANOSE)))
    found = {Chem.MolToSmiles(form.mol): form.share for form in forms}
    assert found[canonical(FRUCTOPYRANOSE)] == pytest.approx(0.70, abs=0.05)
    assert found[canonical(FRUCTOFURANOSE)] == pytest.approx(0.25, abs=0.05)


def test_drawn_furanose_comes_first_though_it_is_the_minor_form() -> None:
    forms = sugar_forms(molecule(read_structure(FRUCTOFURANOSE)))
    assert Chem.MolToSmiles(forms[0].mol) == canonical(FRUCTOFURANOSE)
    assert forms[0].share < forms[1].share


def test_open_chain_sugar_closes_to_the_same_forms() -> None:
    open_chain = sugar_forms(
        molecule(read_structure("O=C[C@H](O)[C@@H](O)[C@H](O)[C@H](O)CO"))
    )
    ring = sugar_forms(molecule(read_structure(BETA_GLUCOSE)))
    assert {Chem.MolToSmiles(f.mol) for f in open_chain} == {
        Chem.MolToSmiles(f.mol) for f in ring
    }


def test_reducing_disaccharide_has_two_anomers() -> None:
    lactose = (
        "OC[C@H]1O[C@@H](O[C@H]2[C@H](O)[C@@H](O)C(O)O[C@@H]2CO)"
        "[C@H](O)[C@@H](O)[C@H]1O"
    )
    assert len(sugar_forms(molecule(read_structure(lactose)))) == 2


def test_glucose_is_one_species_in_dmso() -> None:
    assert len(solution(BETA_GLUCOSE, "DMSO-d6").species) == 1


def test_heavy_atoms_keep_their_order_in_every_species() -> None:
    drawn = molecule(read_structure(BETA_GLUCOSE))
    for species in solution(BETA_GLUCOSE, "D2O").species:
        assert [a.GetSymbol() for a in species.mol.GetAtoms()] == [
            a.GetSymbol() for a in drawn.GetAtoms()
        ]


def test_pyruvate_offers_its_hydrate() -> None:
    """5-10 % at neutral pH, most of it hydrate in acid (common knowledge)."""
    neutral = solution("CC(=O)C(=O)O", "D2O").species
    assert [s.name for s in neutral] == ["carbonyl form", "hydrate"]
    assert neutral[1].share < 0.15
    assert Chem.MolToSmiles(neutral[1].mol) == canonical("CC(O)(O)C(=O)[O-]")
    acid = solution("CC(=O)C(=O)O", "D2O", ph=1.0).species
    assert acid[1].share > 0.4


def test_ketone_and_aromatic_aldehyde_have_no_hydrate() -> None:
    for smiles in ("CC(C)=O", "O=Cc1ccccc1"):
        assert len(solution(smiles, "D2O").species) == 1


def test_acetylacetone_is_mostly_enol_in_chloroform_and_keto_in_water() -> None:
    """80-85 % enol in CDCl3, 15-20 % in water (textbook)."""
    for drawn in ("CC(=O)CC(C)=O", "CC(O)=CC(C)=O"):
        organic = solution(drawn, "CDCl3").species
        shares = {s.name: s.share for s in organic}
        assert shares["enol form"] == pytest.approx(0.82, abs=0.05)
        assert shares["keto form"] == pytest.approx(0.18, abs=0.05)
        assert Chem.MolToSmiles(organic[0].mol) == canonical(drawn)
        water = {s.name: s.share for s in solution(drawn, "D2O").species}
        assert water["enol form"] < 0.25


def test_keto_ester_is_claimed_as_keto_with_a_note() -> None:
    found = solution("CCOC(=O)CC(C)=O", "CDCl3")
    assert len(found.species) == 1
    assert any("enol" in note for note in found.notes)
