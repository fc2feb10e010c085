"""What a solvent lets be seen of exchanging protons (common practice)."""

import pytest

from spinledger.structure.exchange import couples_over_exchange, exchanges
from spinledger.structure.read import molecule, read_structure


def visibility(
    smiles: str, solvent: str | None, atom: int, ph: float | None = None
) -> str:
    found = exchanges(molecule(read_structure(smiles)), solvent, ph)
    return found[atom].visibility if atom in found else "seen"


@pytest.mark.parametrize("solvent", ["D2O", "CD3OD"])
@pytest.mark.parametrize(
    ("smiles", "atom"),
    [("CCO", 2), ("CCN", 2), ("CCS", 2), ("CC(=O)O", 3), ("Oc1ccccc1", 0)],
)
def test_mobile_protons_vanish_in_protic_solvents(
    smiles: str, atom: int, solvent: str
) -> None:
    assert visibility(smiles, solvent, atom) == "silent"


@pytest.mark.parametrize("solvent", ["CDCl3", "DMSO-d6", "acetone-d6", "C6D6", None])
@pytest.mark.parametrize(
    ("smiles", "atom"),
    [("CCO", 2), ("CCN", 2), ("CC(=O)O", 3), ("CC(=O)NC", 3), ("Oc1ccccc1", 0)],
)
def test_mobile_protons_are_optional_elsewhere(
    smiles: str, atom: int, solvent: str | None
) -> None:
    assert visibility(smiles, solvent, atom) == "optional"


def test_amide_nh_lasts_in_methanol_and_in_water_with_protons() -> None:
    assert visibility("CC(=O)NC", "CD3OD", 3) == "optional"
    assert visibility("CC(=O)NC", "H2O/D2O", 3) == "optional"
    assert visibility("CC(=O)NC", "D2O", 3) == "silent"


def test_hydroxyl_is_silent_in_water_with_protons() -> None:
    assert visibility("CCO", "H2O/D2O", 2) == "silent"


@pytest.mark.parametrize(
    ("smiles", "atom"),
    [
        ("CCOC(=O)CC(=O)C", 5),  # acetoacetate between the carbonyls
        ("C[N+](=O)[O-]", 0),  # nitromethane
        ("Oc1cc(O)cc(O)c1", 2),  # phloroglucinol
        ("C[n+]1ccn(C)c1", 6),  # imidazolium C2
        ("CC(=O)C(=O)O", 0),  # pyruvate
    ],
)
def test_carbon_acids_may_fade_in_deuterium_oxide_only(smiles: str, atom: int) -> None:
    assert visibility(smiles, "D2O", atom) == "optional"
    assert visibility(smiles, "CDCl3", atom) == "seen"


def test_alkyne_and_ketone_fade_in_base_only() -> None:
    for smiles, atom in (("C#CCO", 0), ("CC(=O)C", 0)):
        assert visibility(smiles, "D2O", atom) == "seen"
        assert visibility(smiles, "D2O", atom, ph=12.0) == "optional"


@pytest.mark.parametrize(
    ("smiles", "atom", "solvent", "low_ppm", "high_ppm"),
    [
        # Usual ranges as any table of proton shifts gives them.
        ("CCO", 2, "DMSO-d6", 4.0, 5.2),
        ("CC(=O)O", 3, "CDCl3", 10.0, 13.0),
        ("Oc1ccccc1", 0, "DMSO-d6", 9.0, 10.0),
        ("O=Cc1ccccc1O", 8, "CDCl3", 10.0, 12.5),
        ("CC(O)=CC(C)=O", 2, "CDCl3", 12.0, 17.0),
        ("CC(=O)Nc1ccccc1", 3, "DMSO-d6", 9.5, 10.3),
        ("CCN", 2, "CDCl3", 0.8, 2.5),
        ("c1ccc2[nH]ccc2c1", 4, "DMSO-d6", 10.5, 11.5),
        ("CCS", 2, "CDCl3", 1.0, 2.0),
    ],
)
def test_prior_lies_in_the_usual_range(
    smiles: str, atom: int, solvent: str, low_ppm: float, high_ppm: float
) -> None:
    found = exchanges(molecule(read_structure(smiles)), solvent)[atom]
    assert found.shift_ppm is not None
    assert low_ppm <= found.shift_ppm <= high_ppm
    assert found.shift_sd_ppm is not None
    assert found.shift_sd_ppm >= 0.3  # weak: it never decides anything


def test_carboxylic_acid_may_be_absent_and_says_so() -> None:
    found = exchanges(molecule(read_structure("CC(=O)O")), "CDCl3")[3]
    assert "no evidence" in found.why


def test_hydroxyl_couples_in_dmso_and_not_in_chloroform() -> None:
    assert couples_over_exchange("alcohol", "DMSO-d6")
    assert not couples_over_exchange("alcohol", "CDCl3")
    assert couples_over_exchange("amide", "CDCl3")
    assert not couples_over_exchange("carboxylic acid", "DMSO-d6")
