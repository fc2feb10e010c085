"""Textbook cases of topicity; every expectation was worked out by hand.

Each case gives the sizes of the proton groups on each set of carriers (0-based
atoms of the SMILES) and the reason. Facts of stereochemistry as in any textbook
(for example E. L. Eliel, S. H. Wilen, Stereochemistry of Organic Compounds,
chapter 8), applied by hand.
"""

from collections import defaultdict

import pytest
from rdkit import Chem

from core.structure.topicity_cases import CASES, Case, Expected
from core.structure.topicity_cases_more import MORE_CASES
from spinledger.structure.read import molecule, read_structure
from spinledger.structure.settled import settled
from spinledger.structure.symmetry import Site, Symmetry
from spinledger.structure.topicity import (
    ProtonGroup,
    proton_groups,
    site_classes,
    site_hydrogens,
)


def expected_form(mol: Chem.Mol, groups: tuple[ProtonGroup, ...]) -> Expected:
    """Sizes of the groups, gathered over carriers of one constitution."""
    ranks = list(Chem.CanonicalRankAtoms(mol, breakTies=False, includeChirality=False))
    sets: list[set[int]] = []
    for group in groups:
        joined = set(group.carriers)
        joined |= {
            a.GetIdx()
            for a in mol.GetAtoms()
            if a.GetTotalNumHs() and ranks[a.GetIdx()] in {ranks[i] for i in joined}
        }
        rest = []
        for known in sets:
            if known & joined:
                joined |= known
            else:
                rest.append(known)
        sets = [*rest, joined]
    found: dict[tuple[int, ...], list[int]] = defaultdict(list)
    for group in groups:
        place = next(s for s in sets if group.carriers[0] in s)
        found[tuple(sorted(place))].append(len(group.hydrogens))
    return {carriers: sorted(sizes) for carriers, sizes in found.items()}


def groups_of(smiles: str) -> tuple[Chem.Mol, tuple[ProtonGroup, ...]]:
    mol = settled(molecule(read_structure(smiles)))
    return mol, proton_groups(mol)


@pytest.mark.parametrize("case", [*CASES, *MORE_CASES], ids=lambda case: case.name)
def test_topicity_agrees_with_textbook(case: Case) -> None:
    mol, groups = groups_of(case.smiles)
    assert expected_form(mol, groups) == case.groups, case.reason


@pytest.mark.parametrize(
    ("smiles", "atom", "relation"),
    [
        ("ClCCl", 1, "homotopic"),
        ("C[C@@H](O)C[C@@H](C)O", 3, "homotopic"),
        ("C=C(C)C", 0, "homotopic"),
        ("CCO", 1, "enantiotopic"),
        ("ClCBr", 1, "enantiotopic"),
        ("OC(=O)CC(O)(C(=O)O)CC(=O)O", 3, "diastereotopic"),
        ("C=CC", 0, "diastereotopic"),
        ("C[C@H](O)C[C@H](O)C", 3, "diastereotopic"),
    ],
)
def test_geminal_relation_is_named(smiles: str, atom: int, relation: str) -> None:
    _, groups = groups_of(smiles)
    found = {group.relation for group in groups if atom in group.carriers}
    assert found == {relation}


@pytest.mark.parametrize(
    ("smiles", "carriers", "particles", "reason"),
    [
        ("ClCCBr", (1,), [1, 1], "AA'XX': geminal protons see the others differently"),
        ("CCBr", (1,), [2], "the methyl group turns: one coupling to both"),
        ("CC(C)O", (0, 2), [6], "both methyls couple alike with the one CH"),
        ("CC(C)(C)O", (0, 2, 3), [9], "no neighbours at all"),
        ("Clc1ccc(Br)cc1", (2, 7), [1, 1], "ortho and para couplings differ"),
        ("Clc1ccc(Cl)cc1", (2, 3, 6, 7), [4], "one shift, nothing else to couple with"),
        ("Clc1ccccc1Cl", (2, 5), [1, 1], "AA'BB'"),
        ("OC(=O)CCC(=O)O", (3, 4), [4], "one shift only"),
        ("CCOCC", (0, 4), [3, 3], "two ethyl groups far from each other"),
        ("C=C(F)F", (0,), [1, 1], "AA'XX' with fluorine"),
        ("FC(F)(F)CO", (4,), [2], "CF3 turns, OH left aside by exchange or mirror"),
    ],
)
def test_magnetic_equivalence_is_kept_apart(
    smiles: str, carriers: tuple[int, ...], particles: list[int], reason: str
) -> None:
    _, groups = groups_of(smiles)
    group = next(g for g in groups if g.carriers == carriers)
    assert sorted(len(part) for part in group.particles) == particles, reason


def test_hydrogens_index_the_molecule_with_hydrogens_appended() -> None:
    mol, groups = groups_of("CC(O)CC")
    full = Chem.AddHs(mol)
    for group in groups:
        carriers = {
            full.GetAtomWithIdx(h).GetNeighbors()[0].GetIdx() for h in group.hydrogens
        }
        assert carriers == set(group.carriers)
    every = sorted(h for group in groups for h in group.hydrogens)
    assert every == list(range(mol.GetNumAtoms(), full.GetNumAtoms()))


def test_amide_rotation_is_fast_in_the_heat() -> None:
    """Dimethylbenzamide: barrier 15.5 kcal/mol, one N-CH3 signal at 120 deg C."""
    mol = settled(molecule(read_structure("CN(C)C(=O)c1ccccc1")))
    cold = proton_groups(mol, temperature_k=298.0)
    hot = proton_groups(mol, temperature_k=393.0)
    assert sorted(len(g.hydrogens) for g in cold if g.carriers[0] in (0, 2)) == [3, 3]
    assert [len(g.hydrogens) for g in hot if g.carriers[0] in (0, 2)] == [6]


def substitution_key(full: Chem.Mol, hydrogen: int) -> str:
    """Canonical name of the labelled compound or its mirror image, from RDKit."""
    names = []
    for is_mirrored in (False, True):
        labelled = Chem.Mol(full)
        labelled.GetAtomWithIdx(hydrogen).SetIsotope(2)
        if is_mirrored:
            for atom in labelled.GetAtoms():
                atom.InvertChirality()
        Chem.AssignStereochemistry(labelled, cleanIt=True, force=True)
        names.append(Chem.MolToSmiles(Chem.RemoveHs(labelled)))
    return min(names)


# No C=CH2, C=C(CH3)2, amides, hindered axes, mobile protons or delocalised
# charges: there the canonical name of a drawing cannot know what moves.
@pytest.mark.parametrize(
    "smiles",
    [
        "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O",
        "C[C@]12CC[C@H]3[C@@H](CCC4=CC(=O)CC[C@]34C)[C@@H]1CC[C@@H]2O",
        "OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O",
        "O[C@H]1[C@H](O)[C@@H](O)[C@H](O)[C@@H](O)[C@H]1O",
        "CC1(C)[C@@H]2CC[C@]1(C)C(=O)C2",
        "CCOC(OCC)C(OCC)OCC",
        "C[C@H]1CO[C@H](C)CO1",
        "C[C@H]1CO[C@@H](C)CO1",
        "O=C1[C@@H]2CC[C@H]1CC2",
        "C1C[C@@H]2CC[C@H]1O2",
        "CC(C)Oc1ccccc1C(O)C(C)C",
        "CCN(CC)CC(O)COC(C)C",
        "ClC(Cl)C(C(Cl)Cl)C(Br)C(Cl)Cl",
        "CC[Si](CC)(CC)OC(C)C(C)C",
    ],
)
def test_classes_agree_with_canonical_names(smiles: str) -> None:
    mol = settled(molecule(read_structure(smiles)))
    full = Chem.AddHs(mol)
    symmetry = Symmetry(mol)
    hydrogens = site_hydrogens(mol, symmetry)
    by_name: dict[str, set[Site]] = defaultdict(set)
    for site in symmetry.sites():
        by_name[substitution_key(full, hydrogens[site][0])].add(site)
    assert {frozenset(s) for s in by_name.values()} == {
        frozenset(s) for s in site_classes(symmetry)
    }
