"""One-bond couplings to 13C against handbook values (from memory)."""

import pytest
from rdkit import Chem

from spinledger.prediction.couplings.satellites import one_bond_carbon


@pytest.mark.parametrize(
    ("smiles", "carbon", "expected_hz"),
    [
        ("CC", 0, 125.0),
        ("CO", 0, 141.0),
        ("CCl", 0, 150.0),
        ("ClC(Cl)Cl", 1, 209.0),
        ("ClCCl", 1, 178.0),
        ("C1CO1", 0, 176.0),
        ("c1ccccc1", 0, 159.0),
        ("c1ccncc1", 2, 178.0),
        ("CC#C", 2, 248.0),
        ("CC=O", 1, 172.0),
        ("OC=O", 1, 222.0),
    ],
)
def test_one_bond_couplings(smiles: str, carbon: int, expected_hz: float) -> None:
    found = one_bond_carbon(Chem.AddHs(Chem.MolFromSmiles(smiles)), carbon)
    assert found is not None
    # Two sd of the rule; heteroaromatic and formyl ones spread by 10 to 12 Hz.
    assert found.j_hz == pytest.approx(expected_hz, abs=max(2 * found.j_sd_hz, 6.0))
    assert abs(found.j_hz - expected_hz) < 12.0


def test_carbon_without_protons_has_none() -> None:
    mol = Chem.AddHs(Chem.MolFromSmiles("CC(C)(C)O"))
    assert one_bond_carbon(mol, 1) is None
    assert one_bond_carbon(mol, 4) is None
