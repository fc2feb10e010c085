import numpy as np
import pytest
from rdkit import Chem

from spinledger.structure.conformers import (
    Ensemble,
    ensemble,
    n_axial_carbons,
    n_conformers,
)
from spinledger.structure.dihedrals import dihedrals_deg

SERINE = "[NH3+][C@@H](CO)C(=O)[O-]"
MENTHOL = "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O"


def with_hydrogens(smiles: str) -> Chem.Mol:
    return Chem.AddHs(Chem.MolFromSmiles(smiles))


def signed_volumes(mol: Chem.Mol, positions: np.ndarray) -> np.ndarray:
    """Sign of every four-coordinate carbon with at most two H, (n_conf, n_centres)."""
    columns = []
    for atom in mol.GetAtoms():
        neighbours = [n.GetIdx() for n in atom.GetNeighbors()]
        hydrogens = sum(mol.GetAtomWithIdx(i).GetAtomicNum() == 1 for i in neighbours)
        if atom.GetAtomicNum() == 6 and len(neighbours) == 4 and hydrogens <= 2:
            arms = positions[:, neighbours] - positions[:, [atom.GetIdx()]]
            columns.append(
                np.sign(
                    np.einsum("ci,ci->c", arms[:, 1], np.cross(arms[:, 2], arms[:, 3]))
                )
            )
    return np.array(columns).T


@pytest.mark.parametrize(
    "smiles", [SERINE, MENTHOL, "OC(=O)C1CCCCC1", "C1CC2CCC1C2", "CCCCO"]
)
def test_protons_of_a_ch2_keep_their_sides_in_every_conformer(smiles: str) -> None:
    mol = with_hydrogens(smiles)
    signs = signed_volumes(mol, ensemble(mol, is_aqueous=True).positions)
    assert signs.size > 0
    assert np.all(signs == signs[0])


def test_the_given_configuration_is_kept() -> None:
    for smiles in (SERINE, SERINE.replace("@@", "@")):
        mol = with_hydrogens(smiles)
        found = ensemble(mol, is_aqueous=True)
        # Signed volume of N, CH2 and COO seen from the carbon, H away: the
        # priorities N > COO > CH2 run anticlockwise for S, that is L-serine.
        arms = found.positions[:, [0, 4, 2]] - found.positions[:, [1]]
        volumes = np.einsum("ci,ci->c", arms[:, 0], np.cross(arms[:, 1], arms[:, 2]))
        label = dict(Chem.FindMolChiralCenters(mol, useLegacyImplementation=False))[1]
        assert np.all(np.sign(volumes) == (1.0 if label == "S" else -1.0))


def test_a_sulfoxide_keeps_its_configuration_relative_to_carbon() -> None:
    smiles = "C[C@H](O)C[S@](C)=O"
    mol = with_hydrogens(smiles)
    found = ensemble(mol, is_aqueous=False)
    seen = set()
    for positions in found.positions:
        conformer = Chem.Conformer(mol.GetNumAtoms())
        conformer.Set3D(True)
        for index, place in enumerate(positions):
            conformer.SetAtomPosition(index, place.tolist())
        copy = Chem.Mol(mol)
        copy.AddConformer(conformer)
        Chem.AssignStereochemistryFrom3D(copy, replaceExistingTags=True)
        seen.add(Chem.MolToSmiles(Chem.RemoveHs(copy)))
    assert seen == {Chem.CanonSmiles(smiles)}


def test_an_open_stereocentre_is_the_same_in_all_conformers() -> None:
    mol = with_hydrogens("OC1CCCC(C)C1")
    signs = signed_volumes(mol, ensemble(mol, is_aqueous=False).positions)
    assert np.all(signs == signs[0])


def test_same_input_gives_the_same_ensemble() -> None:
    mol = with_hydrogens(SERINE)
    first, second = (ensemble(mol, is_aqueous=True) for _ in range(2))
    assert np.array_equal(first.positions, second.positions)
    assert np.array_equal(first.weights, second.weights)


def test_weights_are_a_distribution_and_arrays_are_locked() -> None:
    found = ensemble(with_hydrogens(MENTHOL), is_aqueous=False)
    # 1e-12: sum of a dozen float64 shares.
    assert found.weights.sum() == pytest.approx(1.0, abs=1e-12)
    assert np.all(np.diff(found.weights) <= 0)
    with pytest.raises(ValueError, match="read-only"):
        found.positions[0, 0, 0] = 1.0


def test_the_molecule_given_is_not_changed() -> None:
    mol = with_hydrogens(SERINE)
    before = Chem.MolToMolBlock(mol), mol.GetNumConformers()
    ensemble(mol, is_aqueous=True)
    assert (Chem.MolToMolBlock(mol), mol.GetNumConformers()) == before


def test_a_ring_carbon_group_prefers_to_be_equatorial() -> None:
    # Free energies of 1.7 to 2.8 kcal/mol for methyl and phenyl (Eliel's
    # A values, from memory) leave less than 8 % axial; weights softened to
    # twice RT allow up to 30 %.
    for smiles in ("CC1CCCCC1", "c1ccccc1C1CCCCC1"):
        mol = with_hydrogens(smiles)
        found = ensemble(mol, is_aqueous=True)
        equatorial = n_axial_carbons(mol, found.positions) == 0
        assert 0.70 < found.weights[equatorial].sum() <= 1.0 + 1e-12


def test_axial_and_equatorial_groups_are_told_apart() -> None:
    # In cis-4-tert-butyl-1-methylcyclohexane the butyl group holds the
    # methyl group axial; in the trans isomer both are equatorial.
    for smiles, n_axial in (
        ("C[C@H]1CC[C@@H](C(C)(C)C)CC1", 1),
        ("C[C@H]1CC[C@H](C(C)(C)C)CC1", 0),
    ):
        mol = with_hydrogens(smiles)
        found = ensemble(mol, is_aqueous=False)
        assert n_axial_carbons(mol, found.positions)[0] == n_axial


def test_beta_glucose_is_a_chair_with_all_groups_equatorial() -> None:
    mol = with_hydrogens("OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O")
    found = ensemble(mol, is_aqueous=True)
    ring = (3, 4, 6, 8, 10, 2)
    for place in range(6):
        path = [ring[(place + k) % 6] for k in range(4)]
        angles = np.abs(dihedrals_deg(found.positions, path))
        # A pyranose chair has ring dihedrals of 50 to 65 degrees.
        assert found.weights @ angles == pytest.approx(57.0, abs=8.0)


def test_uff_is_said_where_mmff_has_no_parameters() -> None:
    found = ensemble(with_hydrogens("OB(O)c1ccccc1"), is_aqueous=False)
    assert "UFF" in found.reason
    assert not found.is_empty


def test_no_model_gives_an_empty_ensemble_with_the_reason() -> None:
    # Both bridgeheads cannot point the same way in so small a cage.
    mol = with_hydrogens("C[C@]12CC[C@@](C)(CC1)C2")
    found = ensemble(mol, is_aqueous=False)
    assert found.is_empty
    assert found.positions.shape == (0, mol.GetNumAtoms(), 3)
    assert "three-dimensional" in found.reason


def test_flexible_molecules_get_more_conformers_and_large_ones_fewer() -> None:
    counts = [
        n_conformers(with_hydrogens(smiles))
        for smiles in ("c1ccccc1", "CCCCCCCCC", "CCCCCCCCC" * 5)
    ]
    assert counts[1] == 50
    assert counts[0] < counts[1] > counts[2]


def test_sizes_that_differ_are_refused() -> None:
    with pytest.raises(ValueError, match="sizes differ"):
        Ensemble(positions=np.zeros((2, 3, 3)), weights=np.ones(1))


def test_dihedral_angle_has_the_sign_of_the_closed_form() -> None:
    # Looking along the middle bond, the far arm turned clockwise by t.
    for turn_deg in (-150.0, -60.0, 0.0, 45.0, 120.0):
        turn = np.radians(turn_deg)
        points = np.array(
            [[[1, 0, 0], [0, 0, 0], [0, 0, -1], [np.cos(turn), -np.sin(turn), -1]]]
        )
        # 1e-9: rounding of float64 trigonometry.
        assert dihedrals_deg(points, (0, 1, 2, 3))[0] == pytest.approx(
            turn_deg, abs=1e-9
        )


def test_no_model_is_made_of_a_very_large_molecule() -> None:
    mol = Chem.AddHs(Chem.MolFromSmiles("C" * 101))
    found = ensemble(mol, is_aqueous=False)
    assert found.is_empty
    assert "More than 100 heavy atoms" in found.reason
