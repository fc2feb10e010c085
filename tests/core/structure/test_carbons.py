"""Carbon lines counted by hand from the symmetry of well-known molecules."""

import pytest
from rdkit import Chem

from spinledger.structure.carbons import carbon_lines


@pytest.mark.parametrize(
    ("smiles", "n_protons"),
    [
        ("CCOC(C)=O", [0, 2, 3, 3]),
        ("Clc1ccc(Br)cc1", [0, 0, 1, 1]),  # para: two pairs and two alone
        ("Clc1cccc(Br)c1", [0, 0, 1, 1, 1, 1]),
        ("CC(C)[C@H](N)C(=O)O", [0, 1, 1, 3, 3]),  # valine: diastereotopic methyls
        ("OCC(O)CO", [1, 2]),  # glycerol: enantiotopic CH2OH are alike
        ("O=C(O)[C@H](O)[C@@H](O)C(=O)O", [0, 1]),  # meso
        ("CN(C)C=O", [1, 3, 3]),  # slow amide rotation
        ("C1CCCCC1", [2]),
        ("CC(C)(C)Cl", [0, 3]),
        ("c1ccccc1-c1ccccc1", [0, 1, 1, 1]),
        ("Cn1c(=O)c2c(ncn2C)n(C)c1=O", [0, 0, 0, 0, 1, 3, 3, 3]),  # caffeine
    ],
)
def test_lines_and_protons(smiles: str, n_protons: list[int]) -> None:
    lines = carbon_lines(Chem.MolFromSmiles(smiles))
    assert sorted(line.n_protons for line in lines) == n_protons


def test_windows_hold_textbook_shifts_and_keep_kinds_apart() -> None:
    # Ethyl acetate, 13C in CDCl3: 171.36, 60.49, 21.04, 14.19 (Gottlieb, Kotlyar,
    # Nudelman, doi:10.1021/jo971176v, Table 2).
    shifts = {0: 171.36, 2: 60.49, 3: 21.04}
    lines = carbon_lines(Chem.MolFromSmiles("CCOC(C)=O"))
    for line in lines:
        low, high = line.window_ppm
        assert low < shifts[line.n_protons] < high
        assert (low < 171.36 < high) == (line.n_protons == 0)
