"""Structures from SMILES, InChI, molfiles and SDF; atoms keep the order given."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from rdkit import Chem, rdBase
from rdkit.Chem import rdDepictor

from spinledger.errors import StructureError
from spinledger.structure.refuse import check, explain
from spinledger.values.structure import Structure

_MOLFILE_END = "M  END"
_RECORD_END = "$$$$"
_LONGEST_PATH = 1024
_LARGEST_FILE_BYTES = 50_000_000
_FILE_ENDINGS = frozenset(
    {".mol", ".mdl", ".sdf", ".sd", ".smi", ".smiles", ".inchi", ".txt"}
)
_LOCANT_FIELDS = ("SPINLEDGER_LOCANTS", "ATOM_LOCANTS", "LOCANTS")


def read_structure(text_or_path: str | Path) -> Structure:
    """One structure from a SMILES, an InChI, a molfile text, or a file of these.

    Parameters
    ----------
    text_or_path : str or pathlib.Path
        ``SMILES`` or ``SMILES name``, ``InChI=...``, the text of a molfile, or
        the path of a .mol, .sdf, .smi or text file with one structure.

    Returns
    -------
    Structure

    Raises
    ------
    StructureError
        If it does not parse, breaks a valence rule, holds nothing that a proton
        spectrum could show, is too large, or is not one definite molecule.

    Examples
    --------
    >>> read_structure("CCO ethanol").name
    'ethanol'
    """
    path = _existing_file(text_or_path)
    if path is None:
        return _from_text(str(text_or_path))
    found = list(_records(path))
    if len(found) != 1:
        count = "no structure" if not found else f"{len(found)} structures"
        raise StructureError(
            str(path), f"The file holds {count}; give a file with exactly one."
        )
    return _from_record(found[0], str(path))


def read_structures(path: str | Path) -> tuple[Structure, ...]:
    """All structures of a .smi or .sdf file, in the order of the file.

    Raises
    ------
    StructureError
        If the file is absent or empty, or one of its structures cannot be used.
    """
    file = _existing_file(path)
    if file is None:
        raise StructureError(str(path), "There is no such file; check the path.")
    found = tuple(_from_record(text, str(file)) for text in _records(file))
    if not found:
        raise StructureError(str(path), "The file holds no structure.")
    return found


def molecule(structure: Structure) -> Chem.Mol:
    """RDKit molecule of a structure, heavy atoms in the given order.

    Hydrogens are implicit, except isotopes; ``Chem.AddHs`` of it appends them.
    """
    with rdBase.BlockLogs():
        mol = Chem.MolFromMolBlock(structure.molblock, removeHs=True)
    if mol is None:
        raise StructureError(structure.given, "The stored structure cannot be read.")
    return _same_stereo(mol, structure.smiles)


def _existing_file(text_or_path: str | Path) -> Path | None:
    if isinstance(text_or_path, str):
        text = text_or_path.strip()
        if "\n" in text or len(text) > _LONGEST_PATH or not text:
            return None
        path = Path(text)
    else:
        path = text_or_path
    try:
        is_file, is_folder = path.is_file(), path.is_dir()
    except (OSError, ValueError):  # not a possible file name, so it is a SMILES
        return None
    if is_folder:
        raise StructureError(
            str(path), "This is a folder; give a structure file or a SMILES."
        )
    if not is_file and path.suffix.lower() in _FILE_ENDINGS:
        raise StructureError(str(path), "There is no such file; check the path.")
    return path if is_file else None


def _records(path: Path) -> Iterator[str]:
    """Texts of the single structures of a file."""
    if path.stat().st_size > _LARGEST_FILE_BYTES:
        raise StructureError(str(path), "The file is too large for a structure file.")
    text = path.read_bytes().decode("utf-8", errors="replace")
    text = text.removeprefix("\ufeff").replace("\r\n", "\n").replace("\r", "\n")
    if _MOLFILE_END in text:
        for record in re.split(r"^\$\$\$\$.*\n?", text, flags=re.MULTILINE):
            if _MOLFILE_END in record:
                yield record
        return
    for line in text.split("\n"):
        if line.strip() and not line.lstrip().startswith("#"):
            yield line.strip()


def _from_record(text: str, file: str) -> Structure:
    if _MOLFILE_END in text:
        return _from_molfile(text, file)
    return _from_text(text)


def _from_text(text: str) -> Structure:
    stripped = text.strip()
    if not stripped:
        raise StructureError("structure", "The structure is empty; give a SMILES.")
    if _MOLFILE_END in text:
        return _from_molfile(text, "molfile")
    if stripped.startswith("InChI="):
        return _from_inchi(stripped)
    smiles, _, name = stripped.partition(" ")
    if "\t" in smiles:
        smiles, _, name = stripped.partition("\t")
    return _from_smiles(smiles, name.strip() or None, stripped)


def _from_smiles(smiles: str, name: str | None, given: str) -> Structure:
    # Any: RDKit's stubs make these fields read-only.
    parser: Any = Chem.SmilesParserParams()
    parser.sanitize = False
    parser.removeHs = False
    parser.allowCXSMILES = False
    parser.parseName = False
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(smiles, parser)
    if mol is None:
        raise StructureError(
            given, "This is neither a file nor a SMILES that can be read."
        )
    return _finished(mol, given=given, name=name)


def _from_inchi(text: str) -> Structure:
    inchi, _, name = text.partition(" ")
    with rdBase.BlockLogs():
        mol = Chem.MolFromInchi(  # type: ignore[no-untyped-call]
            inchi, sanitize=False, removeHs=False
        )
    if mol is None:
        raise StructureError(text, "This InChI cannot be read; check it.")
    return _finished(mol, given=text, name=name.strip() or None)


def _from_molfile(text: str, given: str) -> Structure:
    block, _, fields = text.partition(_MOLFILE_END)
    title = block.lstrip("\ufeff").split("\n", 1)[0].strip()
    with rdBase.BlockLogs():
        mol = Chem.MolFromMolBlock(
            f"{block}{_MOLFILE_END}\n", sanitize=False, removeHs=False
        )
    if mol is None:
        raise StructureError(given, "The molfile cannot be read; export it again.")
    return _finished(
        mol,
        given=given,
        name=title or None,
        locants=_locants_of_fields(fields),
        is_drawn=True,
    )


def _finished(
    mol: Chem.Mol,
    *,
    given: str,
    name: str | None,
    locants: tuple[str, ...] = (),
    is_drawn: bool = False,
) -> Structure:
    """Check, sanitise and freeze a freshly parsed molecule."""
    with rdBase.BlockLogs():
        explain(mol, given)
        if is_drawn:
            _stereo_from_drawing(mol)
        mol = Chem.RemoveHs(mol)
        check(mol, given)
        labels = _atom_locants(mol, locants)
        for atom in mol.GetAtoms():
            atom.SetAtomMapNum(0)
        Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
        return Structure(
            given=given,
            molblock=_molblock(mol),
            smiles=Chem.MolToSmiles(mol),
            name=name,
            locants=labels,
        )


def _stereo_from_drawing(mol: Chem.Mol) -> None:
    """Stereo from wedges and from the coordinates, flat or in space."""
    if not mol.GetNumConformers():
        return
    conformer = mol.GetConformer()
    if conformer.Is3D():
        Chem.AssignStereochemistryFrom3D(mol)
        return
    Chem.AssignChiralTypesFromBondDirs(mol)
    Chem.SetDoubleBondNeighborDirections(mol, conformer)
    Chem.AssignStereochemistry(mol, cleanIt=True, force=True)


def _atom_locants(
    mol: Chem.Mol, from_fields: tuple[str, ...]
) -> tuple[str | None, ...]:
    """Locants from atom maps, atom aliases or a data field; empty where none."""
    if len(from_fields) == mol.GetNumAtoms():
        return tuple(None if text in ("", "-", "?") else text for text in from_fields)
    found: list[str | None] = []
    for atom in mol.GetAtoms():
        text = str(atom.GetAtomMapNum()) if atom.GetAtomMapNum() else None
        for key in ("molFileAlias", "molFileValue"):
            if atom.HasProp(key) and atom.GetProp(key).strip():
                text = atom.GetProp(key).strip()
        found.append(text)
    return tuple(found) if any(found) else ()


def _locants_of_fields(fields: str) -> tuple[str, ...]:
    for match in re.finditer(r"^> .*<([^>]+)>.*\n(.*)$", fields, flags=re.MULTILINE):
        if match[1].upper() in _LOCANT_FIELDS:
            return tuple(match[2].replace(",", " ").split())
    return ()


def _molblock(mol: Chem.Mol) -> str:
    """V3000 text; flat coordinates are laid out where there are none."""
    drawn = Chem.Mol(mol)
    if not drawn.GetNumConformers():
        rdDepictor.Compute2DCoords(drawn)
    for bond in drawn.GetBonds():
        if _may_be_e_or_z(bond):
            bond.SetStereo(Chem.BondStereo.STEREOANY)
    return str(Chem.MolToV3KMolBlock(drawn))


def _may_be_e_or_z(bond: Chem.Bond) -> bool:
    """Whether an open double bond would be read back as E or Z from coordinates."""
    return (
        bond.GetBondType() == Chem.BondType.DOUBLE
        and bond.GetStereo() == Chem.BondStereo.STEREONONE
        and not bond.IsInRing()
        and all(a.GetDegree() > 1 for a in (bond.GetBeginAtom(), bond.GetEndAtom()))
    )


def _same_stereo(mol: Chem.Mol, smiles: str) -> Chem.Mol:
    """The molecule, with the stereo of the SMILES where a drawing lost some."""
    if Chem.MolToSmiles(mol) == smiles:
        return mol
    with rdBase.BlockLogs():
        reference = Chem.MolFromSmiles(smiles)
    order = reference.GetSubstructMatch(mol, useChirality=False)
    if len(order) != mol.GetNumAtoms():
        return mol
    renumbered = Chem.RenumberAtoms(reference, list(order))
    for match in _matches(renumbered, mol):
        candidate = Chem.RenumberAtoms(reference, [order[i] for i in match])
        if Chem.MolToSmiles(candidate) == smiles:
            return candidate
    return mol


def _matches(first: Chem.Mol, second: Chem.Mol) -> Iterator[tuple[int, ...]]:
    yield from first.GetSubstructMatches(
        second, useChirality=False, uniquify=False, maxMatches=1
    )
