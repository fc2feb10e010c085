"""Textbook cases of topicity: the first half; every expectation worked out by hand."""

from dataclasses import dataclass

Expected = dict[tuple[int, ...], list[int]]


@dataclass(frozen=True)
class Case:
    """Groups on each set of carriers that a structure must have, and why."""

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
]
