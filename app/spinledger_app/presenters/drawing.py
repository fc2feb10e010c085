"""Flat drawings of structures, made with RDKit in the working process."""

from __future__ import annotations

import math
from typing import Any

from rdkit import Chem
from rdkit.Chem import Descriptors, rdMolDescriptors

from spinledger.report.sketch import drawable
from spinledger.structure.read import molecule
from spinledger.values.structure import Structure
from spinledger_app.presenters.structure import Drawing, DrawnAtom, DrawnBond


def drawing_of(structure: Structure) -> Drawing:
    """Flat drawing of a structure, atoms in the given order."""
    mol = Chem.Mol(drawable(structure))
    Chem.Kekulize(mol, clearAromaticFlags=False)
    conformer = mol.GetConformer()
    Chem.WedgeMolBonds(mol, conformer)
    length = _bond_length(mol)
    atoms = tuple(_atom(atom, conformer, length) for atom in mol.GetAtoms())
    bonds = tuple(_bond(mol, bond, conformer) for bond in mol.GetBonds())
    return Drawing(
        atoms=atoms,
        bonds=bonds,
        formula=rdMolDescriptors.CalcMolFormula(mol),
        mass=f"{Descriptors.MolWt(mol):.2f}",  # type: ignore[attr-defined]
        stereo=_stereo(mol),
    )


def is_same_but_for_layout(one: Structure, other: Structure) -> bool:
    """Whether two structures are the same, atom by atom, and only lie otherwise."""
    return one.smiles == other.smiles and _table(one) == _table(other)


def _table(structure: Structure) -> tuple[object, ...]:
    mol = molecule(structure)
    atoms = tuple(
        (atom.GetAtomicNum(), atom.GetFormalCharge(), atom.GetIsotope())
        for atom in mol.GetAtoms()
    )
    bonds = frozenset(
        frozenset((bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()))
        for bond in mol.GetBonds()
    )
    return atoms, bonds


def _bond_length(mol: Any) -> float:
    lengths = []
    conformer = mol.GetConformer()
    for bond in mol.GetBonds():
        a = conformer.GetAtomPosition(bond.GetBeginAtomIdx())
        b = conformer.GetAtomPosition(bond.GetEndAtomIdx())
        lengths.append(math.hypot(a.x - b.x, a.y - b.y))
    lengths = sorted(one for one in lengths if one > 1e-6)
    return lengths[len(lengths) // 2] if lengths else 1.0


def _atom(atom: Any, conformer: Any, length: float) -> DrawnAtom:
    place = conformer.GetAtomPosition(atom.GetIdx())
    symbol = atom.GetSymbol()
    degree = atom.GetDegree()
    charge = atom.GetFormalCharge()
    isotope = atom.GetIsotope()
    n_hydrogens = atom.GetTotalNumHs()
    is_bare = symbol == "C" and degree > 0 and not charge and not isotope
    marks = {"2H": "D", "3H": "T"}
    written = f"{isotope}{symbol}" if isotope else symbol
    written = marks.get(written, written)
    sign = "" if not charge else ("+" if charge > 0 else "−")
    return DrawnAtom(
        x=place.x / length,
        y=place.y / length,
        symbol="" if is_bare else written,
        hydrogens=""
        if is_bare or not n_hydrogens
        else ("H" if n_hydrogens == 1 else f"H{n_hydrogens}"),
        charge=sign if abs(charge) < 2 else f"{abs(charge)}{sign}",
    )


def _bond(mol: Any, bond: Any, conformer: Any) -> DrawnBond:
    start, end = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
    wedges = {Chem.BondDir.BEGINWEDGE: "wedge", Chem.BondDir.BEGINDASH: "hash"}
    order = {
        Chem.BondType.DOUBLE: 2,
        Chem.BondType.TRIPLE: 3,
    }.get(bond.GetBondType(), 1)
    return DrawnBond(
        start=start,
        end=end,
        order=order,
        wedge=wedges.get(bond.GetBondDir(), ""),
        inward=_ring_side(mol, bond, conformer) if order == 2 else 0,
    )


def _ring_side(mol: Any, bond: Any, conformer: Any) -> int:
    start, end = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
    rings = [
        ring for ring in mol.GetRingInfo().AtomRings() if start in ring and end in ring
    ]
    if not rings:
        return 0
    ring = min(rings, key=lambda one: (len(one) != 6, len(one)))
    places = [conformer.GetAtomPosition(i) for i in ring]
    cx = sum(p.x for p in places) / len(places)
    cy = sum(p.y for p in places) / len(places)
    a = conformer.GetAtomPosition(start)
    b = conformer.GetAtomPosition(end)
    cross = (b.x - a.x) * (cy - a.y) - (b.y - a.y) * (cx - a.x)
    return 1 if cross > 0 else -1


def _stereo(mol: Any) -> str:
    Chem.AssignCIPLabels(mol)
    found = []
    for atom in mol.GetAtoms():
        if atom.HasProp("_CIPCode"):
            found.append(atom.GetProp("_CIPCode"))
    if not found or len(found) > 4:
        return f"{len(found)} stereocentres" if found else ""
    return "(" + ",".join(found) + ")"
