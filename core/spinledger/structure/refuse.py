"""What cannot be taken as a structure, each with one sentence that says why."""

from __future__ import annotations

from typing import Any, Final

from rdkit import Chem

from spinledger.errors import StructureError

MOST_HEAVY_ATOMS: Final = 200
_POLYMER_GROUPS: Final = frozenset(
    {"SRU", "MON", "MER", "COP", "CRO", "MOD", "GRA", "ANY"}
)
# Elements whose unpaired electrons mean a radical and not a bookkeeping matter
# of a metal complex.
_MAIN_GROUP: Final = frozenset({1, 5, 6, 7, 8, 9, 14, 15, 16, 17, 34, 35, 53})


def explain(mol: Chem.Mol, given: str) -> None:
    """Sanitise in place, or say in one sentence which atom is at fault.

    Raises
    ------
    StructureError
        If a valence is impossible or an aromatic ring cannot be drawn.
    """
    for atom in mol.GetAtoms():
        if atom.GetAtomicNum() == 0 or _is_query(atom):
            raise StructureError(
                given,
                f"Atom {_position(atom)} is a placeholder (R group or query atom); "
                "draw the whole molecule.",
            )
    problems = Chem.DetectChemistryProblems(mol)
    if problems:
        raise StructureError(given, _sentence(mol, problems[0]))
    Chem.SanitizeMol(mol)


def check(mol: Chem.Mol, given: str) -> None:
    """Refuse what is not one definite molecule with protons.

    Parameters
    ----------
    mol : Chem.Mol
        Sanitised, hydrogens implicit.
    given : str
        What the user wrote.

    Raises
    ------
    StructureError
        For polymers, radicals, more than 200 heavy atoms, and structures
        without 1H.
    """
    groups = Chem.GetMolSubstanceGroups(mol)
    if any(g.HasProp("TYPE") and g.GetProp("TYPE") in _POLYMER_GROUPS for g in groups):
        raise StructureError(
            given, "This is a polymer with repeat units; draw one definite molecule."
        )
    if mol.GetNumHeavyAtoms() > MOST_HEAVY_ATOMS:
        raise StructureError(
            given,
            f"The structure has {mol.GetNumHeavyAtoms()} heavy atoms; "
            f"at most {MOST_HEAVY_ATOMS} can be handled.",
        )
    for atom in mol.GetAtoms():
        if atom.GetNumRadicalElectrons() and atom.GetAtomicNum() in _MAIN_GROUP:
            raise StructureError(
                given,
                f"{_name(atom)} has an unpaired electron; "
                "a radical has no proton spectrum of the usual kind.",
            )
    if not any(a.GetTotalNumHs() for a in mol.GetAtoms()):
        raise StructureError(
            given, "The structure has no 1H, so a proton spectrum cannot show it."
        )


def _is_query(atom: Chem.Atom) -> bool:
    return bool(atom.HasQuery()) and atom.DescribeQuery().strip() != ""


def _position(atom: Chem.Atom) -> int:
    return int(atom.GetIdx()) + 1


def _name(atom: Chem.Atom) -> str:
    return f"{atom.GetSymbol()} (atom {_position(atom)}, counted from 1)"


def _sentence(mol: Chem.Mol, problem: Any) -> str:
    kind = problem.GetType()
    if kind == "AtomValenceException":
        atom = mol.GetAtomWithIdx(problem.GetAtomIdx())
        bonds = sum(b.GetBondTypeAsDouble() for b in atom.GetBonds())
        count = bonds + atom.GetNumExplicitHs()
        return (
            f"{_name(atom)} has {count:g} bonds, more than it can have; "
            "correct the bonds or the charge."
        )
    if kind in ("KekulizeException", "AtomKekulizeException"):
        return (
            "An aromatic ring cannot be drawn with alternating double bonds; "
            "write the hydrogen of a ring nitrogen as [nH]."
        )
    return "The structure breaks a valence rule; check its bonds and charges."
