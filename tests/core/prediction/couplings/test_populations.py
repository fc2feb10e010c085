"""Rotamer shares from couplings, against closed forms and published mixtures."""

import numpy as np
import pytest
from rdkit import Chem

from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.hla import vicinal_over_conformers_hz
from spinledger.prediction.couplings.populations import (
    MeasuredCoupling,
    RotamerPopulations,
    rotamer_populations,
)
from spinledger.structure.conformers import Ensemble, ensemble

ASPARTATE = "[NH3+][C@@H](CC(=O)[O-])C(=O)[O-]"
THREONINE = "[NH3+][C@@H]([C@@H](C)O)C(=O)[O-]"


def hydrogens(mol: Chem.Mol, carbon: int) -> list[int]:
    return [
        n.GetIdx()
        for n in mol.GetAtomWithIdx(carbon).GetNeighbors()
        if n.GetAtomicNum() == 1
    ]


def populations(smiles: str, *values_hz: float) -> tuple[RotamerPopulations, ...]:
    mol = Chem.AddHs(Chem.MolFromSmiles(smiles))
    measured = [
        MeasuredCoupling(first=hydrogens(mol, 1)[0], second=second, j_hz=value)
        for second, value in zip(hydrogens(mol, 2), values_hz, strict=True)
    ]
    return rotamer_populations(
        mol,
        ensemble(mol, is_aqueous=True),
        bond=(1, 2),
        measured=measured,
        is_aqueous=True,
    )


def test_two_couplings_of_aspartate_give_both_labellings() -> None:
    found = populations(ASPARTATE, 8.86, 3.65)
    assert len(found) == 2
    # Which proton is which cannot be told: log evidence within 1.
    assert found[0].log_evidence - found[1].log_evidence < 1.0
    for item in found:
        assert item.shares.sum() == pytest.approx(1.0, abs=1e-9)
        assert sorted(item.couplings_hz) == pytest.approx([3.65, 8.86], abs=0.45)
        assert not item.speaks_against_structure
    # Two rotamers share almost everything in either labelling; the one with
    # trans carboxylates has 0.5 to 0.7 (Martin, Bull. Magn. Reson. 1986, from memory).
    assert {int(np.argmax(item.shares)) for item in found} == {1, 2}
    assert all(0.5 < item.shares.max() < 0.7 for item in found)


def test_one_coupling_fixes_only_the_antiperiplanar_rotamer() -> None:
    (found,) = populations(THREONINE, 4.92)
    assert sum(found.is_determined) == 1
    # Two-site estimate: (J - Jg)/(Ja - Jg) with 2.5 and 9.5 Hz gives 0.35.
    share = found.shares[list(found.is_determined).index(True)]
    assert share == pytest.approx(0.35, abs=0.08)


def test_impossible_couplings_speak_against_the_structure() -> None:
    assert all(
        item.speaks_against_structure for item in populations(ASPARTATE, 12.0, 11.0)
    )


def test_couplings_made_from_known_shares_come_back() -> None:
    mol = Chem.AddHs(Chem.MolFromSmiles(ASPARTATE))
    conformers = ensemble(mol, is_aqueous=True)
    frame = Frame(mol, is_aqueous=True, conformers=conformers)
    first = hydrogens(mol, 1)[0]
    angles = frame.dihedral_deg(0, 1, 2, 3) % 360
    wells = [(angles >= low) & (angles < low + 120) for low in (0, 120, 240)]
    shares = np.array([0.6, 0.1, 0.3])
    values = []
    for second in hydrogens(mol, 2):
        curve = vicinal_over_conformers_hz(frame, first, 1, 2, second)
        means = [np.average(curve[w], weights=conformers.weights[w]) for w in wells]
        values.append(float(shares @ means))
    found = populations(ASPARTATE, *values)
    kept = next(item for item in found if item.order == (0, 1))
    # Posterior of a rule with sd 0.45 Hz: shares to about 0.08.
    assert kept.shares == pytest.approx(shares, abs=0.10)


def test_without_conformers_it_refuses() -> None:
    mol = Chem.AddHs(Chem.MolFromSmiles(ASPARTATE))
    empty = Ensemble(
        positions=np.zeros((0, mol.GetNumAtoms(), 3)), weights=np.zeros(0), reason="x"
    )
    with pytest.raises(ValueError, match="at least one coupling"):
        rotamer_populations(mol, empty, bond=(1, 2), measured=[], is_aqueous=True)


def test_a_bond_without_groups_to_turn_is_refused() -> None:
    mol = Chem.AddHs(Chem.MolFromSmiles("CCO"))
    with pytest.raises(ValueError, match="no group to turn"):
        rotamer_populations(
            mol,
            ensemble(mol, is_aqueous=True),
            bond=(0, 1),
            measured=[MeasuredCoupling(first=3, second=6, j_hz=7.0)],
            is_aqueous=True,
        )
