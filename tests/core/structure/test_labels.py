"""Labels: unique, never file positions, numbered as a chemist would."""

import re

import pytest

from spinledger.structure.labels import group_labels
from spinledger.structure.read import molecule, read_structure
from spinledger.structure.settled import settled
from spinledger.structure.topicity import proton_groups


def labels(smiles: str) -> dict[str, tuple[int, ...]]:
    structure = read_structure(smiles)
    mol = settled(molecule(structure))
    groups = proton_groups(mol)
    found = group_labels(mol, groups, structure.locants)
    assert len(set(found)) == len(found)
    return {label: group.carriers for label, group in zip(found, groups, strict=True)}


# Systematic numbers of the compounds, worked out by hand.
@pytest.mark.parametrize(
    ("smiles", "expected"),
    [
        (
            "N[C@@H](CC(=O)O)C(=O)O",
            {"2-H": (1,), "3-HA": (2,), "3-HB": (2,)},
        ),
        ("CCCCCC", {"1,6-H": (0, 5), "2,5-H": (1, 4), "3,4-H": (2, 3)}),
        ("CC(O)CC(=O)OCC", {"4-H": (0,), "3-H": (1,), "2-HA": (3,), "2-HB": (3,)}),
        ("COc1ccc(C=O)cc1", {"3,5-H": (3, 9), "2,6-H": (4, 8), "4-OCH3": (0,)}),
        (
            "Cn1c(=O)c2c(ncn2C)n(C)c1=O",
            {"1-NCH3": (0,), "8-H": (7,), "7-NCH3": (9,), "3-NCH3": (11,)},
        ),
        (
            "Nc1ncnc2c1ncn2[C@@H]1O[C@H](CO)[C@@H](O)[C@H]1O",
            {"2-H": (3,), "8-H": (8,), "1'-H": (10,), "4'-H": (12,), "5'-HA": (13,)},
        ),
        (
            "OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O",
            {"1-H": (4,), "2-H": (6,), "5-H": (2,), "6-HA": (1,), "4-OH": (11,)},
        ),
        ("c1ccc2ncccc2c1", {"2-H": (5,), "4-H": (7,), "8-H": (2,), "5-H": (9,)}),
        ("O=c1ccc2ccccc2o1", {"3-H": (2,), "4-H": (3,), "5-H": (5,), "8-H": (8,)}),
        ("CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O", {"1-H": (9,), "2-H": (3,), "5-H": (6,)}),
        ("CC(=O)Oc1ccccc1C(=O)O", {"3-H": (5,), "6-H": (8,), "1-COOH": (12,)}),
    ],
)
def test_locants_are_the_customary_ones(
    smiles: str, expected: dict[str, tuple[int, ...]]
) -> None:
    found = labels(smiles)
    assert {label: found.get(label) for label in expected} == expected


def test_given_locants_win() -> None:
    found = labels("[CH3:7][CH2:9]O")
    assert set(found) == {"7-H", "9-H", "9-OH"}


@pytest.mark.parametrize(
    "smiles",
    [
        "CC(=O)NC(C)C(=O)NC(C)C(=O)NC",
        "CCN(CC)CC.OC(=O)C(F)(F)F",
        "C1CC2CCC1C2",
        "c1ccc(cc1)C(c1ccccc1)c1ccccc1",
        "CN(C)C=O",
        "CC1(C)C2CCC1(C)C(=O)C2",
        "OCC1OC(OC2C(O)C(O)C(O)OC2CO)C(O)C(O)C1O",
        "CC(C)CC(NC(=O)C(Cc1ccccc1)NC(=O)OC(C)(C)C)C(=O)NCC(=O)OC",
        "O.O.CC(=O)O.CC(=O)O.NCCN",
    ],
)
def test_labels_are_unique_and_hold_no_zero(smiles: str) -> None:
    found = labels(smiles)
    assert not any(re.search(r"(^|[^\d])0", label) for label in found)
