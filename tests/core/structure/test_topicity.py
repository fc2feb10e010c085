"""Textbook cases of topicity; every expectation was worked out by hand.

Each case gives the sizes of the proton groups on each set of carriers (0-based
atoms of the SMILES) and the reason. Facts of stereochemistry as in any textbook
(for example E. L. Eliel, S. H. Wilen, Stereochemistry of Organic Compounds,
chapter 8), applied by hand.
"""

from collections import defaultdict
from dataclasses import dataclass

import pytest
from rdkit import Chem

from spinledger.structure.read import molecule, read_structure
from spinledger.structure.settled import settled
from spinledger.structure.symmetry import Site, Symmetry
from spinledger.structure.topicity import (
    ProtonGroup,
    proton_groups,
    site_classes,
    site_hydrogens,
)

Expected = dict[tuple[int, ...], list[int]]


@dataclass(frozen=True)
class Case:
    name: str
    smiles: str
    groups: Expected
    reason: str


CASES = [
    Case(
        "methane",
        "C",
        {(0,): [4]},
        "all four are exchanged by rotations",
    ),
    Case(
        "ethanol",
        "CCO",
        {(0,): [3], (1,): [2], (2,): [1]},
        "a mirror plane exchanges the CH2 protons",
    ),
    Case(
        "2-butanol",
        "CC(O)CC",
        {(0,): [3], (1,): [1], (2,): [1], (3,): [1, 1], (4,): [3]},
        "CH2 beside a stereocentre, though its configuration is not drawn",
    ),
    Case(
        "(R)-2-butanol",
        "C[C@@H](O)CC",
        {(0,): [3], (1,): [1], (2,): [1], (3,): [1, 1], (4,): [3]},
        "the same with the configuration drawn",
    ),
    Case(
        "2-chlorobutane CH2 far from the centre",
        "CC(Cl)CCCO",
        {(0,): [3], (1,): [1], (3,): [1, 1], (4,): [1, 1], (5,): [1, 1], (6,): [1]},
        "distance from the stereocentre does not matter for the count",
    ),
    Case(
        "glycerol",
        "OCC(O)CO",
        {(0, 5): [2], (1, 4): [2, 2], (2,): [1], (3,): [1]},
        "no stereocentre, but each CH2 has no mirror plane through it; "
        "the mirror plane of the molecule pairs them across",
    ),
    Case(
        "acetaldehyde diethyl acetal",
        "CCOC(C)OCC",
        {(0, 7): [6], (1, 6): [2, 2], (3,): [1], (4,): [3]},
        "the acetal carbon is prochiral for the CH2 of each ethyl group",
    ),
    Case(
        "formaldehyde diethyl acetal",
        "CCOCOCC",
        {(0, 6): [6], (1, 5): [4], (3,): [2]},
        "planes through the chain exchange each geminal pair",
    ),
    Case(
        "acetone diethyl ketal",
        "CCOC(C)(C)OCC",
        {(0, 8): [6], (1, 7): [4], (4, 5): [6]},
        "two like groups on the ketal carbon leave a mirror plane",
    ),
    Case(
        "diethyl malonate",
        "CCOC(=O)CC(=O)OCC",
        {(0, 10): [6], (1, 9): [4], (5,): [2]},
        "planar chain average, all geminal pairs enantiotopic or homotopic",
    ),
    Case(
        "diethyl methylmalonate",
        "CCOC(=O)C(C)C(=O)OCC",
        {(0, 11): [6], (1, 10): [2, 2], (5,): [1], (6,): [3]},
        "the central carbon is prochiral, so OCH2 protons are diastereotopic",
    ),
    Case(
        "diethyl dimethylmalonate",
        "CCOC(=O)C(C)(C)C(=O)OCC",
        {(0, 12): [6], (1, 11): [4], (6, 7): [6]},
        "two methyls restore the mirror plane through each ethyl",
    ),
    Case(
        "citric acid",
        "OC(CC(=O)O)(CC(=O)O)C(=O)O",
        {(0,): [1], (2, 6): [2, 2], (5, 9): [2], (12,): [1]},
        "the two arms are mirror images, the protons of one arm are not",
    ),
    Case(
        "isopropyl methyl ether",
        "CC(C)OC",
        {(0, 2): [6], (1,): [1], (4,): [3]},
        "mirror plane between the methyls",
    ),
    Case(
        "3-methyl-2-butanol",
        "CC(C)C(C)O",
        {(0, 2): [3, 3], (1,): [1], (3,): [1], (4,): [3], (5,): [1]},
        "isopropyl methyls beside a stereocentre are diastereotopic",
    ),
    Case(
        "isopropyl beside a prochiral centre",
        "CC(C)C(O)(C)C(C)C",
        {(0, 2, 7, 8): [6, 6], (1, 6): [2], (4,): [1], (5,): [3]},
        "mirror plane of the molecule pairs methyls of different isopropyls only",
    ),
    Case(
        "isobutanol",
        "CC(C)CO",
        {(0, 2): [6], (1,): [1], (3,): [2], (4,): [1]},
        "mirror plane",
    ),
    Case(
        "leucine",
        "CC(C)C[C@H](N)C(=O)O",
        {(0, 2): [3, 3], (1,): [1], (3,): [1, 1], (4,): [1], (5,): [2], (8,): [1]},
        "both CH3 and both CH2 protons feel the stereocentre",
    ),
    Case(
        "glycine in a chiral amide",
        "C[C@H](N)C(=O)NCC(=O)O",
        {(0,): [3], (1,): [1], (2,): [2], (5,): [1], (6,): [1, 1], (9,): [1]},
        "glycine CH2 is diastereotopic through the alanine centre",
    ),
    Case(
        "glycine",
        "NCC(=O)O",
        {(0,): [2], (1,): [2], (4,): [1]},
        "mirror plane",
    ),
    Case(
        "chiral ester OCH2",
        "CC(O)C(=O)OCC",
        {(0,): [3], (1,): [1], (2,): [1], (6,): [1, 1], (7,): [3]},
        "ethyl lactate: OCH2 diastereotopic, however small the difference",
    ),
    Case(
        "meso-tartaric acid",
        "O[C@@H](C(=O)O)[C@H](O)C(=O)O",
        {(0, 6): [2], (1, 5): [2], (4, 9): [2]},
        "the halves are mirror images",
    ),
    Case(
        "(R,R)-tartaric acid",
        "O[C@@H](C(=O)O)[C@@H](O)C(=O)O",
        {(0, 6): [2], (1, 5): [2], (4, 9): [2]},
        "the halves are exchanged by a twofold axis",
    ),
    Case(
        "meso-2,4-pentanediol",
        "C[C@H](O)C[C@H](O)C",
        {(0, 6): [6], (1, 4): [2], (2, 5): [2], (3,): [1, 1]},
        "R and S ends: the CH2 protons face different sides",
    ),
    Case(
        "(R,R)-2,4-pentanediol",
        "C[C@@H](O)C[C@@H](C)O",
        {(0, 5): [6], (1, 4): [2], (2, 6): [2], (3,): [2]},
        "a twofold axis exchanges the CH2 protons: homotopic",
    ),
    Case(
        "2,4-pentanediol, configurations open",
        "CC(O)CC(O)C",
        {(0, 6): [6], (1, 4): [2], (2, 5): [2], (3,): [1, 1]},
        "may be meso, so the CH2 protons are claimed apart",
    ),
    Case(
        "cyclohexane",
        "C1CCCCC1",
        {(0, 1, 2, 3, 4, 5): [12]},
        "ring inversion makes all twelve alike",
    ),
    Case(
        "methylcyclohexane",
        "CC1CCCCC1",
        {
            (0,): [3],
            (1,): [1],
            (2, 6): [2, 2],
            (3, 5): [2, 2],
            (4,): [1, 1],
        },
        "cis and trans to the methyl differ, also at C4, inversion or not",
    ),
    Case(
        "1,1-dimethylcyclohexane",
        "CC1(C)CCCCC1",
        {(0, 2): [6], (3, 7): [4], (4, 6): [4], (5,): [2]},
        "ring inversion averages each CH2",
    ),
    Case(
        "cis-1,4-dimethylcyclohexane",
        "C[C@H]1CC[C@@H](C)CC1",
        {(0, 5): [6], (1, 4): [2], (2, 3, 6, 7): [4, 4]},
        "on average two mirror planes; CH2 protons cis or trans to the methyls",
    ),
    Case(
        "trans-1,4-dimethylcyclohexane",
        "C[C@H]1CC[C@H](C)CC1",
        {(0, 5): [6], (1, 4): [2], (2, 3, 6, 7): [4, 4]},
        "inversion centre; again two kinds",
    ),
    Case(
        "cis-1,2-dimethylcyclohexane",
        "C[C@H]1CCCC[C@H]1C",
        {(0, 7): [6], (1, 6): [2], (2, 5): [2, 2], (3, 4): [2, 2]},
        "average mirror plane through the C1-C2 bond",
    ),
    Case(
        "trans-decalin",
        "C1CC[C@@H]2CCCC[C@H]2C1",
        {(2, 4, 7, 9): [4, 4], (0, 1, 5, 6): [4, 4], (3, 8): [2]},
        "axial and equatorial do not exchange, all four like carbons do",
    ),
    Case(
        "cis-decalin",
        "C1CC[C@H]2CCCC[C@H]2C1",
        {(2, 4, 7, 9): [4, 4], (0, 1, 5, 6): [4, 4], (3, 8): [2]},
        "inversion makes like carbons alike, but not the faces of the rings",
    ),
    Case(
        "cyclopropane-1,1-dicarboxylic acid",
        "OC(=O)C1(CC1)C(=O)O",
        {(0, 8): [2], (4, 5): [4]},
        "two mirror planes",
    ),
    Case(
        "cyclopropanecarboxylic acid",
        "OC(=O)C1CC1",
        {(0,): [1], (3,): [1], (4, 5): [2, 2]},
        "cis and trans to the carboxyl group",
    ),
    Case(
        "oxirane methyl",
        "CC1CO1",
        {(0,): [3], (1,): [1], (2,): [1, 1]},
        "ring CH2 beside a stereocentre, cis and trans to the methyl",
    ),
    Case(
        "para-disubstituted benzene",
        "Brc1ccc(Cl)cc1",
        {(2, 7): [2], (3, 6): [2]},
        "twofold axis; AA'XX'",
    ),
    Case(
        "1,4-dichlorobenzene",
        "Clc1ccc(Cl)cc1",
        {(2, 3, 6, 7): [4]},
        "all four are alike",
    ),
    Case(
        "1,2-dichlorobenzene",
        "Clc1ccccc1Cl",
        {(2, 5): [2], (3, 4): [2]},
        "AA'BB'",
    ),
    Case(
        "1,3-dichlorobenzene",
        "Clc1cccc(Cl)c1",
        {(2, 4): [2], (3,): [1], (7,): [1]},
        "mirror plane through C2 and C5",
    ),
    Case(
        "1,3,5-trichlorobenzene",
        "Clc1cc(Cl)cc(Cl)c1",
        {(2, 5, 8): [3]},
        "threefold axis",
    ),
    Case(
        "pyridine",
        "c1ccncc1",
        {(0,): [1], (1, 5): [2], (2, 4): [2]},
        "twofold axis through N and C4",
    ),
    Case(
        "benzimidazole",
        "c1ccc2[nH]cnc2c1",
        {(0, 1): [2], (2, 8): [2], (4,): [1], (5,): [1]},
        "the NH proton moves fast between both nitrogens",
    ),
    Case(
        "3,5-dimethylpyrazole",
        "Cc1cc(C)[nH]n1",
        {(0, 4): [6], (2,): [1], (5,): [1]},
        "annular tautomers average the two methyls",
    ),
    Case(
        "3-methylpyrazole",
        "Cc1cc[nH]n1",
        {(0,): [3], (2,): [1], (3,): [1], (4,): [1]},
        "no symmetry even with the proton moving",
    ),
    Case(
        "acetylacetone, enol",
        "CC(=O)C=C(C)O",
        {(0, 5): [6], (3,): [1], (6,): [1]},
        "the enol proton moves fast, the methyls are alike",
    ),
    Case(
        "propene",
        "C=CC",
        {(0,): [1, 1], (1,): [1], (2,): [3]},
        "cis and trans to the methyl group",
    ),
    Case(
        "isobutene",
        "C=C(C)C",
        {(0,): [2], (2, 3): [6]},
        "twofold axis",
    ),
    Case(
        "2-methyl-2-butene",
        "CC=C(C)C",
        {(0,): [3], (1,): [1], (3, 4): [3, 3]},
        "methyls cis and trans to the single methyl",
    ),
    Case(
        "1,1-diphenylethene",
        "C=C(c1ccccc1)c1ccccc1",
        {
            (0,): [2],
            (3, 7, 9, 13): [4],
            (4, 6, 10, 12): [4],
            (5, 11): [2],
        },
        "like substituents; phenyl groups turn",
    ),
    Case(
        "allene",
        "C=C=C",
        {(0, 2): [4]},
        "all four are exchanged by rotations and reflections",
    ),
    Case(
        "1,2-butadiene",
        "C=C=CC",
        {(0,): [2], (2,): [1], (3,): [3]},
        "the plane of the far end exchanges the CH2 protons",
    ),
    Case(
        "2,3-pentadiene with a CH2",
        "CC=C=CCO",
        {(0,): [3], (1,): [1], (3,): [1], (4,): [1, 1], (5,): [1]},
        "a 1,3-disubstituted allene is chiral, so the CH2 is diastereotopic",
    ),
    Case(
        "trisubstituted allene with two like ends",
        "CC(C)=C=CCO",
        {(0, 2): [6], (4,): [1], (5,): [2], (6,): [1]},
        "two methyls at one end: a mirror plane, achiral",
    ),
    Case(
        "butatriene",
        "CC=C=C=CC",
        {(0, 5): [6], (1, 4): [2]},
        "planar like an alkene",
    ),
    Case(
        "biphenyl",
        "c1ccccc1-c1ccccc1",
        {(0, 4, 7, 11): [4], (1, 3, 8, 10): [4], (2, 9): [2]},
        "free rotation and a twofold axis",
    ),
    Case(
        "biphenyl with CH2, free",
        "OCc1ccccc1-c1ccccc1",
        {
            (0,): [1],
            (1,): [2],
            (3,): [1],
            (4,): [1],
            (5,): [1],
            (6,): [1],
            (9, 13): [2],
            (10, 12): [2],
            (11,): [1],
        },
        "one ortho substituent does not lock the axis",
    ),
    Case(
        "hindered chiral biaryl",
        "Cc1cccc(Cl)c1-c1c(C)cccc1CO",
        {
            (0,): [3],
            (2,): [1],
            (3,): [1],
            (4,): [1],
            (10,): [3],
            (11,): [1],
            (12,): [1],
            (13,): [1],
            (15,): [1, 1],
            (16,): [1],
        },
        "four ortho substituents lock the axis: axial chirality",
    ),
    Case(
        "hindered achiral biaryl",
        "Cc1cccc(C)c1-c1c(C)cccc1CO",
        {
            (0, 6): [6],
            (2, 4): [2],
            (3,): [1],
            (10,): [3],
            (11,): [1],
            (12,): [1],
            (13,): [1],
            (15,): [2],
            (16,): [1],
        },
        "two like ortho groups on one ring leave a mirror plane",
    ),
    Case(
        "dimethylformamide",
        "CN(C)C=O",
        {(0, 2): [3, 3], (3,): [1]},
        "slow rotation: one methyl is cis to oxygen, one trans",
    ),
    Case(
        "N-formylpiperidine",
        "O=CN1CCCCC1",
        {(1,): [1], (3, 7): [2, 2], (4, 6): [2, 2], (5,): [2]},
        "slow amide rotation tells the two sides of the ring apart, "
        "the amide plane pairs each CH2",
    ),
    Case(
        "tetramethylurea",
        "CN(C)C(=O)N(C)C",
        {(0, 2, 6, 7): [12]},
        "urea C-N bonds turn fast",
    ),
    Case(
        "acetamide",
        "CC(N)=O",
        {(0,): [3], (2,): [1, 1]},
        "NH2 protons cis and trans to oxygen",
    ),
    Case(
        "N-nitrosodimethylamine",
        "CN(C)N=O",
        {(0, 2): [3, 3]},
        "slow N-N rotation",
    ),
    Case(
        "triethylamine",
        "CCN(CC)CC",
        {(0, 4, 6): [9], (1, 3, 5): [6]},
        "inversion and rotation",
    ),
    Case(
        "choline",
        "C[N+](C)(C)CCO",
        {(0, 2, 3): [9], (4,): [2], (5,): [2], (6,): [1]},
        "three methyls exchanged by rotation",
    ),
    Case(
        "benzyl methyl sulfoxide",
        "CS(=O)Cc1ccccc1",
        {(0,): [3], (3,): [1, 1], (5, 9): [2], (6, 8): [2], (7,): [1]},
        "sulfoxide sulfur is a stable stereocentre",
    ),
    Case(
        "benzyl methyl sulfone",
        "CS(=O)(=O)Cc1ccccc1",
        {(0,): [3], (4,): [2], (6, 10): [2], (7, 9): [2], (8,): [1]},
        "two like oxygens: mirror plane",
    ),
    Case(
        "diethyl methylphosphonate",
        "CCOP(C)(=O)OCC",
        {(0, 8): [6], (1, 7): [2, 2], (4,): [3]},
        "prochiral phosphorus, as in an acetal",
    ),
    Case(
        "triethyl phosphate",
        "CCOP(=O)(OCC)OCC",
        {(0, 7, 10): [9], (1, 6, 9): [6]},
        "two like ester groups remain: mirror plane",
    ),
    Case(
        "norbornane",
        "C1CC2CCC1C2",
        {(0, 1, 3, 4): [4, 4], (2, 5): [2], (6,): [2]},
        "exo and endo; C7 protons are exchanged by the twofold axis",
    ),
    Case(
        "adamantane",
        "C1C2CC3CC1CC(C2)C3",
        {(0, 2, 4, 6, 8, 9): [12], (1, 3, 5, 7): [4]},
        "tetrahedral symmetry",
    ),
    Case(
        "1-chloroadamantane",
        "ClC12CC3CC(CC(C3)C1)C2",
        {(2, 9, 10): [6], (3, 5, 7): [3], (4, 6, 8): [3, 3]},
        "threefold axis and planes; far CH2 face the chlorine side or turn away",
    ),
    Case(
        "cubane",
        "C12C3C4C1C5C2C3C45",
        {(0, 1, 2, 3, 4, 5, 6, 7): [8]},
        "octahedral symmetry",
    ),
    Case(
        "1,4-diazabicyclo[2.2.2]octane",
        "C1CN2CCN1CC2",
        {(0, 1, 3, 4, 6, 7): [12]},
        "all CH2 alike; twisting averages",
    ),
    Case(
        "spiro[4.4]nonane-type ketal",
        "C1COC2(O1)OCCO2",
        {(0, 1, 6, 7): [8]},
        "spiro centre of four oxygens: all CH2 protons alike",
    ),
    Case(
        "2-methyl-1,3-dioxolane",
        "CC1OCCO1",
        {(0,): [3], (1,): [1], (3, 4): [2, 2]},
        "cis and trans to the methyl group; AA'BB'",
    ),
    Case(
        "tert-butyl methyl ether",
        "COC(C)(C)C",
        {(0,): [3], (3, 4, 5): [9]},
        "three methyls exchanged by rotation",
    ),
    Case(
        "trans-2,3-dimethyloxirane",
        "C[C@@H]1O[C@H]1C",
        {(0, 4): [6], (1, 3): [2]},
        "twofold axis or mirror plane, either way alike",
    ),
    Case(
        "methyl-d group",
        "[2H]CO",
        {(1,): [2], (2,): [1]},
        "CH2D turns fast: its two protons are alike",
    ),
    Case(
        "sodium phosphate monoester",
        "CCOP(=O)([O-])[O-]",
        {(0,): [3], (1,): [2]},
        "three like oxygens on phosphorus",
    ),
    Case(
        "crystal violet",
        "CN(C)c1ccc(cc1)C(=C1C=CC(=[N+](C)C)C=C1)c1ccc(cc1)N(C)C",
        {
            (0, 2, 15, 16, 26, 27): [18],
            (4, 8, 12, 17, 21, 23): [6],
            (5, 7, 11, 18, 20, 24): [6],
        },
        "the charge is shared by three like rings",
    ),
]


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


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
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
