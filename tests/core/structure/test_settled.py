"""Settled molecules: models in space agree with what the symmetry takes."""

import numpy as np
import pytest
from rdkit import Chem

from spinledger.structure.conformers import ensemble
from spinledger.structure.read import molecule, read_structure
from spinledger.structure.settled import open_centres, settled, with_hydrogens
from spinledger.structure.topicity import proton_groups


def model(smiles: str) -> tuple[Chem.Mol, Chem.Mol, np.ndarray]:
    mol = settled(molecule(read_structure(smiles)))
    full = with_hydrogens(mol)
    return mol, full, np.asarray(ensemble(full, is_aqueous=False).positions)


def side_of_ring(positions: np.ndarray, ring: list[int], hydrogen: int) -> float:
    """Signed distance of a hydrogen from its own carbon along the ring normal."""
    atoms = positions[ring]
    centre = atoms.mean(axis=0)
    normal = sum(
        np.cross(atoms[i] - centre, atoms[(i + 1) % len(ring)] - centre)
        for i in range(len(ring))
    )
    return float(np.dot(positions[hydrogen] - centre, normal))


def test_groups_of_a_ring_stand_on_one_face_in_every_conformer() -> None:
    """Cyclohexanecarboxylic acid: 2-H and 6-H of one group are both cis or trans."""
    mol, full, conformers = model("OC(=O)C1CCCCC1")
    ring = [3, 4, 5, 6, 7, 8]
    carboxyl = 1
    groups = [g for g in proton_groups(mol) if g.carriers == (4, 8)]
    assert len(groups) == 2
    for positions in conformers:
        up = side_of_ring(positions, ring, carboxyl) > 0
        faces = []
        for group in groups:
            sides = set()
            for h in group.hydrogens:
                carrier = full.GetAtomWithIdx(h).GetNeighbors()[0].GetIdx()
                other = next(
                    n.GetIdx()
                    for n in full.GetAtomWithIdx(carrier).GetNeighbors()
                    if n.GetAtomicNum() == 1 and n.GetIdx() != h
                )
                # Of two geminal hydrogens the higher one is on the upper face.
                here = side_of_ring(positions, ring, h)
                there = side_of_ring(positions, ring, other)
                sides.add((here > there) == up)
            assert len(sides) == 1
            faces.append(sides.pop())
        assert sorted(faces) == [False, True]


@pytest.mark.parametrize("smiles", ["C=CC(=O)OC", "COC(=O)C=C", "C=C(Cl)CC"])
def test_first_hydrogen_of_a_vinyl_group_keeps_its_side(smiles: str) -> None:
    _, full, conformers = model(smiles)
    (outer,) = (
        a.GetIdx()
        for a in full.GetAtoms()
        if a.GetAtomicNum() == 6
        and a.GetDegree() == 3
        and sum(n.GetAtomicNum() == 1 for n in a.GetNeighbors()) == 2
    )
    neighbours = [n.GetIdx() for n in full.GetAtomWithIdx(outer).GetNeighbors()]
    inner = next(i for i in neighbours if full.GetAtomWithIdx(i).GetAtomicNum() == 6)
    first = min(i for i in neighbours if full.GetAtomWithIdx(i).GetAtomicNum() == 1)
    cis = next(
        n.GetIdx()
        for n in full.GetAtomWithIdx(inner).GetNeighbors()
        if n.GetIdx() != outer and n.GetAtomicNum() > 1
    )
    for positions in conformers:
        near = np.linalg.norm(positions[first] - positions[cis])
        second = max(
            i for i in neighbours if full.GetAtomWithIdx(i).GetAtomicNum() == 1
        )
        far = np.linalg.norm(positions[second] - positions[cis])
        assert near < far


def test_bridgeheads_are_settled_together() -> None:
    """Adamantane embeds only if its four bridgeheads agree."""
    _, _, conformers = model("C1C2CC3CC1CC(C2)C3")
    assert len(conformers) >= 1


def test_open_centres_are_remembered() -> None:
    mol = settled(molecule(read_structure("CC(O)C[C@H](C)N")))
    assert open_centres(mol) == (1,)
    assert all(
        mol.GetAtomWithIdx(i).GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED
        for i in (1, 4)
    )


def test_known_centres_are_kept() -> None:
    smiles = "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O"
    mol = settled(molecule(read_structure(smiles)))
    copy = Chem.Mol(mol)
    Chem.AssignStereochemistry(copy, cleanIt=True, force=True)
    assert Chem.MolToSmiles(copy) == Chem.CanonSmiles(smiles)
