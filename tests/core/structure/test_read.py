"""Reading of structures: order of atoms, stereo, and one sentence for each fault."""

from pathlib import Path

import pytest
from rdkit import Chem

from spinledger.errors import StructureError
from spinledger.structure.read import molecule, read_structure, read_structures

STEREO = [
    "OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O",
    "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O",
    "C/C=C/C(=O)OCC",
    "C/C=C\\C(=O)OCC",
    "CC=CC(=O)OCC",
    "C[S@](=O)c1ccccc1",
    "C[C@]12CC[C@H]3[C@@H](CCC4=CC(=O)CC[C@]34C)[C@@H]1CC[C@@H]2O",
    "C[C@H](O)CC(O)C",
    "CC1(C)[C@@H]2CC[C@]1(C)C(=O)C2",
    "N[C@@H](Cc1c[nH]c2ccccc12)C(=O)O",
    "C1=CC=CC=CC=C1",
    "[Na+].[O-]C(=O)/C=C/C(=O)[O-].[NH4+]",
]


@pytest.mark.parametrize("smiles", STEREO)
def test_molecule_keeps_atom_order_and_stereo(smiles: str) -> None:
    structure = read_structure(smiles)
    mol = molecule(structure)
    given = Chem.MolFromSmiles(smiles)
    assert [a.GetSymbol() for a in mol.GetAtoms()] == [
        a.GetSymbol() for a in given.GetAtoms()
    ]
    assert [a.GetTotalNumHs() for a in mol.GetAtoms()] == [
        a.GetTotalNumHs() for a in given.GetAtoms()
    ]
    assert Chem.MolToSmiles(mol) == Chem.MolToSmiles(given)


@pytest.mark.parametrize("smiles", STEREO)
def test_molfile_round_trip_keeps_structure(smiles: str, tmp_path: Path) -> None:
    mol = Chem.MolFromSmiles(smiles)
    Chem.rdDepictor.Compute2DCoords(mol)
    for bond in mol.GetBonds():
        # A flat drawing shows an open double bond crossed.
        if bond.GetStereo() == Chem.BondStereo.STEREONONE and not bond.IsInRing():
            neighbours = min(
                bond.GetBeginAtom().GetDegree(), bond.GetEndAtom().GetDegree()
            )
            if bond.GetBondType() == Chem.BondType.DOUBLE and neighbours > 1:
                bond.SetStereo(Chem.BondStereo.STEREOANY)
    for is_v3000 in (False, True):
        path = tmp_path / f"drawn{int(is_v3000)}.mol"
        path.write_text(Chem.MolToMolBlock(mol, forceV3000=is_v3000))
        structure = read_structure(path)
        assert structure.smiles == Chem.MolToSmiles(Chem.MolFromSmiles(smiles))


def test_name_follows_the_smiles() -> None:
    structure = read_structure("CCO  ethanol, absolute ")
    assert structure.name == "ethanol, absolute"
    assert structure.smiles == "CCO"


def test_explicit_hydrogens_are_taken_out_and_isotopes_kept() -> None:
    assert molecule(read_structure("[H]OC([H])([H])C")).GetNumAtoms() == 3
    deuterated = molecule(read_structure("[2H]C([2H])([2H])O"))
    assert [a.GetIsotope() for a in deuterated.GetAtoms()] == [2, 0, 2, 2, 0]


def test_atom_maps_are_locants() -> None:
    structure = read_structure("[CH3:4][CH2:3]O")
    assert structure.locants == ("4", "3", None)
    assert structure.smiles == "CCO"


def test_inchi_is_read() -> None:
    assert read_structure("InChI=1S/C2H6O/c1-2-3/h3H,2H2,1H3").smiles == "CCO"


def test_files_with_several_structures(tmp_path: Path) -> None:
    listing = tmp_path / "candidates.smi"
    listing.write_text("# comment\nCCO ethanol\n\nCOC dimethyl ether\n")
    found = read_structures(listing)
    assert [(s.smiles, s.name) for s in found] == [
        ("CCO", "ethanol"),
        ("COC", "dimethyl ether"),
    ]
    with pytest.raises(StructureError, match="2 structures"):
        read_structure(listing)


def test_sd_file_with_crlf_and_locants(tmp_path: Path) -> None:
    block = Chem.MolToMolBlock(Chem.MolFromSmiles("CCO"))
    text = f"{block}>  <ATOM_LOCANTS>\n2 1 -\n\n$$$$\n".replace("\n", "\r\n")
    path = tmp_path / "one.sdf"
    path.write_bytes(text.encode())
    structure = read_structure(path)
    assert structure.locants == ("2", "1", None)


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("xyz", "neither a file nor a SMILES"),
        ("", "empty"),
        ("CC(C)(C)(C)C", r"C \(atom 2, counted from 1\) has 5 bonds"),
        ("C[N](C)(C)C", r"N \(atom 2, counted from 1\) has 4 bonds"),
        ("c1cccn1", "aromatic ring"),
        ("O=C=O", "no 1H"),
        ("[2H]C(Cl)(Cl)Cl", "no 1H"),
        ("C" * 201, "201 heavy atoms"),
        ("*CC", "placeholder"),
        ("[CH2]C", "unpaired electron"),
        ("InChI=1S/nonsense", "InChI cannot be read"),
        ("absent.mol", "no such file"),
    ],
)
def test_fault_is_told_in_one_sentence(text: str, sentence: str) -> None:
    with pytest.raises(StructureError, match=sentence) as caught:
        read_structure(text)
    assert "\n" not in str(caught.value)
    assert caught.value.reason.endswith(".")


def test_empty_file_and_folder_are_refused(tmp_path: Path) -> None:
    empty = tmp_path / "empty.smi"
    empty.write_text("")
    with pytest.raises(StructureError, match="no structure"):
        read_structure(empty)
    with pytest.raises(StructureError, match="folder"):
        read_structure(tmp_path)
    with pytest.raises(StructureError, match="no such file"):
        read_structures(tmp_path / "none.smi")


@pytest.mark.parametrize(
    "smiles",
    [
        "CCN.Cl",
        "CC(=O)[O-].[Na+]",
        "CCO.O",
        "C[N+](C)(C)C.[Cl-]",
        "CC(=O)O[Pd]OC(C)=O",
        "c1ccc(cc1)[B-](c1ccccc1)(c1ccccc1)c1ccccc1.[K+]",
    ],
)
def test_salts_solvates_and_complexes_are_not_refused(smiles: str) -> None:
    assert read_structure(smiles).smiles


def test_polymer_is_refused() -> None:
    block = """
  x

  0  0  0     0  0            999 V3000
M  V30 BEGIN CTAB
M  V30 COUNTS 2 1 1 0 0
M  V30 BEGIN ATOM
M  V30 1 C 0 0 0 0
M  V30 2 C 1.5 0 0 0
M  V30 END ATOM
M  V30 BEGIN BOND
M  V30 1 1 1 2
M  V30 END BOND
M  V30 BEGIN SGROUP
M  V30 1 SRU 1 ATOMS=(2 1 2) BRKXYZ=(9 -0.5 1 0 -0.5 -1 0 0 0 0) -
M  V30 BRKXYZ=(9 2 1 0 2 -1 0 0 0 0) CONNECT=HT LABEL=n
M  V30 END SGROUP
M  V30 END CTAB
M  END
"""
    with pytest.raises(StructureError, match="polymer"):
        read_structure(block)
