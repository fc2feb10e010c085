"""What a drawing means: molecule, SMILES, hydrogens, faults, and a clean layout."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace
from statistics import median
from typing import Final

from rdkit import Chem, rdBase
from rdkit.Chem import rdDepictor, rdMolDescriptors

from spinledger.errors import StructureError
from spinledger.structure.read import molecule, read_structure
from spinledger_app.sketch.drawing import Atom, Bond, Drawing, Point, Wedge
from spinledger_app.sketch.molfile import molblock

_ORDERS: Final = {
    Chem.BondType.SINGLE: 1,
    Chem.BondType.DOUBLE: 2,
    Chem.BondType.TRIPLE: 3,
}
_WEDGES: Final[dict[Chem.BondDir, Wedge]] = {
    Chem.BondDir.BEGINWEDGE: "wedge",
    Chem.BondDir.BEGINDASH: "hash",
    Chem.BondDir.UNKNOWN: "either",
}
_RECORD_END = "$$$$"
_MOLFILE_END = "M  END"
_FLAT: Final = 1e-3


@dataclass(frozen=True, slots=True, kw_only=True)
class Fault:
    """An atom that breaks a valence rule, and one sentence about it."""

    atom: int
    sentence: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Meaning:
    """What a drawing stands for.

    Attributes
    ----------
    hydrogens : tuple of int
        Implied hydrogens of every atom.
    faults : tuple of Fault
    formula : str
        Molecular formula; empty where there are faults.
    smiles : str
        Canonical, with stereo; empty where there are faults.
    labels : tuple of str
        R, S, r or s at every stereocentre, else an empty text.
    """

    hydrogens: tuple[int, ...] = ()
    faults: tuple[Fault, ...] = ()
    formula: str = ""
    smiles: str = ""
    labels: tuple[str, ...] = ()


def to_mol(drawing: Drawing) -> Chem.Mol:
    """Molecule as drawn, not sanitised; atoms in the order of the drawing."""
    with rdBase.BlockLogs():
        mol = Chem.MolFromMolBlock(molblock(drawing), sanitize=False, removeHs=False)
    if mol is None:
        raise ValueError("drawing: its molfile cannot be read back")
    mol.UpdatePropertyCache(strict=False)
    return mol


def meaning(drawing: Drawing) -> Meaning:
    """Hydrogens, faults, formula, SMILES and stereo labels of a drawing."""
    if not drawing.atoms:
        return Meaning()
    mol = to_mol(drawing)
    hydrogens = tuple(atom.GetTotalNumHs() for atom in mol.GetAtoms())
    faults = tuple(_faults(mol))
    if faults:
        return Meaning(
            hydrogens=hydrogens, faults=faults, labels=("",) * len(hydrogens)
        )
    sound = _sound(mol)
    return Meaning(
        hydrogens=hydrogens,
        formula=rdMolDescriptors.CalcMolFormula(sound),
        smiles=_smiles(sound),
        labels=tuple(
            atom.GetProp("_CIPCode") if atom.HasProp("_CIPCode") else ""
            for atom in sound.GetAtoms()
        ),
    )


def smiles(drawing: Drawing) -> str:
    """Canonical SMILES with stereo.

    Raises
    ------
    ValueError
        If an atom breaks a valence rule.
    """
    found = meaning(drawing)
    if found.faults:
        raise ValueError(f"drawing: {found.faults[0].sentence}")
    return found.smiles


def from_mol(mol: Chem.Mol) -> Drawing:
    """Drawing of a sanitised molecule; laid out anew unless it lies flat already.

    Raises
    ------
    StructureError
        If it has a bond that is not single, double, triple or aromatic.
    """
    drawn = Chem.Mol(mol)
    if not drawn.GetNumAtoms():
        return Drawing()
    if not _is_flat(drawn):
        rdDepictor.Compute2DCoords(drawn)
    Chem.Kekulize(drawn, clearAromaticFlags=True)
    conformer = drawn.GetConformer()
    Chem.WedgeMolBonds(drawn, conformer)
    length = _bond_length(drawn)
    places = [conformer.GetAtomPosition(i) for i in range(drawn.GetNumAtoms())]
    return Drawing(
        atoms=tuple(
            Atom(
                element=atom.GetSymbol(),
                x=place.x / length,
                y=place.y / length,
                charge=atom.GetFormalCharge(),
                isotope=atom.GetIsotope(),
                locant=atom.GetAtomMapNum(),
            )
            for atom, place in zip(drawn.GetAtoms(), places, strict=True)
        ),
        bonds=tuple(_bond(bond) for bond in drawn.GetBonds()),
    )


def from_text(text: str) -> Drawing:
    """Drawing of a SMILES, InChI, molfile, SDF or CDXML text.

    Raises
    ------
    StructureError
        If it cannot be read, or cannot be drawn here without loss.
    """
    structure = read_structure(_one_record(text))
    mol = Chem.Mol(molecule(structure))
    for atom, locant in zip(mol.GetAtoms(), structure.locants, strict=False):
        if locant is not None and locant.isdecimal() and len(locant) <= 3:
            atom.SetAtomMapNum(int(locant))
    drawing = from_mol(mol)
    if _without_locants(drawing) != structure.smiles:
        raise StructureError(
            text.strip().split("\n")[0][:60],
            "This structure has a feature that cannot be drawn here without loss "
            "(unusual valence or stereo); open it as a file instead.",
        )
    return drawing


def cleaned_up(drawing: Drawing) -> Drawing:
    """The same structure laid out anew about the same middle, stereo kept."""
    if not drawing.atoms:
        return drawing
    mol = to_mol(drawing)
    if any(True for _ in _faults(mol)):
        return _laid_out_only(drawing, mol)
    fresh = _sound(mol)
    rdDepictor.Compute2DCoords(fresh)
    tidy = from_mol(fresh)
    kept = {bond.ends: bond for bond in drawing.bonds}
    bonds = tuple(_same_kind(bond, kept[bond.ends]) for bond in tidy.bonds)
    return _about(
        replace(tidy, bonds=bonds, atoms=_named(tidy, drawing)), _middle(drawing)
    )


def _same_kind(tidy: Bond, drawn: Bond) -> Bond:
    """A bond of the new layout, its order and its wavy line as they were drawn.

    Wedges are the layout's own: they depend on the places.
    """
    if tidy.wedge in ("wedge", "hash"):
        return tidy
    wedge: Wedge = "either" if drawn.wedge == "either" else ""
    return replace(
        drawn if wedge else tidy, order=drawn.order, wedge=wedge or tidy.wedge
    )


def _laid_out_only(drawing: Drawing, mol: Chem.Mol) -> Drawing:
    """New places for a drawing with faults; its wedges are kept as drawn."""
    rdDepictor.Compute2DCoords(mol)
    length = _bond_length(mol)
    conformer = mol.GetConformer()
    places = [conformer.GetAtomPosition(i) for i in range(mol.GetNumAtoms())]
    atoms = tuple(
        replace(atom, x=place.x / length, y=place.y / length)
        for atom, place in zip(drawing.atoms, places, strict=True)
    )
    return _about(replace(drawing, atoms=atoms), _middle(drawing))


def _named(tidy: Drawing, drawing: Drawing) -> tuple[Atom, ...]:
    return tuple(
        replace(old, x=new.x, y=new.y)
        for new, old in zip(tidy.atoms, drawing.atoms, strict=True)
    )


def _middle(drawing: Drawing) -> Point:
    left, low, right, high = drawing.bounds
    return (left + right) / 2, (low + high) / 2


def _about(drawing: Drawing, middle: Point) -> Drawing:
    x, y = _middle(drawing)
    atoms = tuple(
        replace(one, x=one.x + middle[0] - x, y=one.y + middle[1] - y)
        for one in drawing.atoms
    )
    return replace(drawing, atoms=atoms)


def _sound(mol: Chem.Mol) -> Chem.Mol:
    """Sanitised copy of a molecule without faults, stereo taken from the drawing."""
    sound = Chem.Mol(mol)
    with rdBase.BlockLogs():
        Chem.SanitizeMol(sound)
        Chem.AssignChiralTypesFromBondDirs(sound)
        Chem.SetDoubleBondNeighborDirections(sound, sound.GetConformer())
        Chem.AssignStereochemistry(sound, cleanIt=True, force=True)
        Chem.AssignCIPLabels(sound)
    return sound


def _smiles(sound: Chem.Mol) -> str:
    with rdBase.BlockLogs():
        return str(Chem.MolToSmiles(Chem.RemoveHs(sound)))


def _without_locants(drawing: Drawing) -> str:
    bare = replace(
        drawing, atoms=tuple(replace(one, locant=0) for one in drawing.atoms)
    )
    return meaning(bare).smiles


def _faults(mol: Chem.Mol) -> Iterator[Fault]:
    with rdBase.BlockLogs():
        problems = Chem.DetectChemistryProblems(mol)
    for problem in problems:
        if problem.GetType() != "AtomValenceException":
            continue
        atom = mol.GetAtomWithIdx(problem.GetAtomIdx())
        count = round(sum(bond.GetBondTypeAsDouble() for bond in atom.GetBonds()))
        yield Fault(
            atom=atom.GetIdx(),
            sentence=f"{atom.GetSymbol()} has {count} "
            f"{'bond' if count == 1 else 'bonds'}, more than it can have; "
            "take one away or give it a charge.",
        )


def _is_flat(mol: Chem.Mol) -> bool:
    """Whether a molecule has a layout in the plane with its atoms apart."""
    if not mol.GetNumConformers() or mol.GetConformer().Is3D():
        return False
    places = mol.GetConformer().GetPositions()
    n_apart = len({(round(x, 2), round(y, 2)) for x, y, _ in places})
    return n_apart == len(places) and all(abs(z) < _FLAT for _, _, z in places)


def _bond_length(mol: Chem.Mol) -> float:
    conformer = mol.GetConformer()
    lengths = []
    for bond in mol.GetBonds():
        a = conformer.GetAtomPosition(bond.GetBeginAtomIdx())
        b = conformer.GetAtomPosition(bond.GetEndAtomIdx())
        lengths.append(math.dist((a.x, a.y), (b.x, b.y)))
    longer = [one for one in lengths if one > _FLAT]
    # 1.5 is the length RDKit lays out with; it stands where there is no bond.
    return median(longer) if longer else 1.5


def _bond(bond: Chem.Bond) -> Bond:
    order = _ORDERS.get(bond.GetBondType())
    if order is None:
        raise StructureError(
            "structure",
            "The structure has a bond of a kind that cannot be drawn here; "
            "use single, double and triple bonds.",
        )
    wedge: Wedge = _WEDGES.get(bond.GetBondDir(), "") if order == 1 else ""
    is_open = bond.GetStereo() == Chem.BondStereo.STEREOANY
    if order == 2 and (is_open or bond.GetBondDir() == Chem.BondDir.EITHERDOUBLE):
        wedge = "either"
    return Bond(
        start=bond.GetBeginAtomIdx(), end=bond.GetEndAtomIdx(), order=order, wedge=wedge
    )


def _one_record(text: str) -> str:
    """The molfile of an SDF or CDXML text with one structure; other texts as given.

    Raises
    ------
    StructureError
        If there are several structures in an SDF, or none that can be read.
    """
    if "<CDXML" in text:
        return molfile_of_cdxml(text)
    if _RECORD_END not in text:
        return text
    records = [one for one in text.split(_RECORD_END) if _MOLFILE_END in one]
    if len(records) != 1:
        raise StructureError(
            "SDF",
            f"The text holds {len(records)} structures; give one at a time.",
        )
    return records[0].lstrip("\r\n") if records[0].startswith("\n\n\n") else records[0]


def molfile_of_cdxml(text: str) -> str:
    """Molfile of all that a CDXML text draws.

    Raises
    ------
    StructureError
        If it holds no structure.
    """
    with rdBase.BlockLogs():
        found = Chem.MolsFromCDXML(text, sanitize=True, removeHs=False)
    mols = [mol for mol in found if mol is not None and mol.GetNumAtoms()]
    if not mols:
        raise StructureError("CDXML", "The CDXML text holds no structure.")
    whole = mols[0]
    for mol in mols[1:]:
        whole = Chem.CombineMols(whole, mol)
    return str(Chem.MolToV3KMolBlock(whole))
