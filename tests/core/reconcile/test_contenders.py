"""Close isomers: what must be among them and what must not."""

from collections.abc import Callable

import pytest
from rdkit import Chem
from rdkit.Chem.rdMolDescriptors import CalcMolFormula

from spinledger.errors import CancelledError
from spinledger.reconcile.contenders import close_isomers


def isomers(smiles: str, limit: int = 20) -> set[str]:
    return {
        one.smiles for one in close_isomers(Chem.MolFromSmiles(smiles), limit=limit)
    }


def canonical(smiles: str) -> str:
    return str(Chem.MolToSmiles(Chem.MolFromSmiles(smiles)))


@pytest.mark.parametrize(
    ("smiles", "expected"),
    [
        ("C/C=C/C(=O)OCC", "C/C=C\\C(=O)OCC"),
        ("CC(=O)Oc1ccccc1C(=O)O", "CC(=O)Oc1cccc(C(=O)O)c1"),
        ("CCC(=O)Nc1ccccc1", "CCNC(=O)c1ccccc1"),
        ("CCCBr", "CC(C)Br"),
        ("CC(C)CC(N)C(=O)O", "CCC(C)C(N)C(=O)O"),
        ("C[C@H](O)[C@@H](C)Cl", "C[C@H](O)[C@H](C)Cl"),
        ("OC(=O)C1CCCN1", "OC(=O)C1CCNC1"),
        ("CC1CCCCC1Cl", "CC1CCCC(Cl)C1"),
    ],
)
def test_textbook_isomer_is_enumerated(smiles: str, expected: str) -> None:
    mirror = expected.replace("@@", "?").replace("@", "@@").replace("?", "@")
    # One of a pair of mirror images stands for both.
    assert {canonical(expected), canonical(mirror)} & isomers(smiles)


@pytest.mark.parametrize(
    "smiles",
    ["CC(C)CC(N)C(=O)O", "CC(=O)Oc1ccccc1C(=O)O", "c1ccc2[nH]cc(CC(N)C(=O)O)c2c1"],
)
def test_isomers_keep_the_formula(smiles: str) -> None:
    formula = CalcMolFormula(Chem.MolFromSmiles(smiles))
    found = isomers(smiles)
    assert found
    assert {CalcMolFormula(Chem.MolFromSmiles(one)) for one in found} == {formula}


def test_mirror_image_and_the_structure_itself_are_left_out() -> None:
    both = "C[C@H](O)[C@@H](C)Cl"
    mirror = canonical("C[C@@H](O)[C@H](C)Cl")
    assert mirror not in isomers(both)
    assert canonical(both) not in isomers(both)


def test_short_lived_isomers_are_left_out() -> None:
    # Moving OH of ethylene glycol to the other carbon gives a gem-diol.
    assert isomers("OCCO") == set()


def test_limit_holds_and_cancel_is_heard() -> None:
    menthol = Chem.MolFromSmiles("CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O")
    assert len(close_isomers(menthol, limit=3)) == 3

    def stop() -> None:
        raise CancelledError("stopped")

    call: Callable[[], None] = stop
    with pytest.raises(CancelledError, match="stopped"):
        close_isomers(menthol, limit=3, cancelled=call)
