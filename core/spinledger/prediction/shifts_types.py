"""Atom types and proton classes that the shift predictor counts; pure graph facts."""

from __future__ import annotations

from typing import Final

from rdkit import Chem

ATOM_TYPES: Final = (
    *("C3", "C3q", "Car", "CarN", "Cvin", "CO", "COX", "CON", "CN", "Cyne", "C=N"),
    *("Cx", "Nam", "Nar", "NarH", "Namide", "N=", "NO2", "N+", "Nnit", "Nso", "Nx"),
    *("OH", "Oeth", "O=", "Oest", "Oar", "O-", "OxO", "S2", "Sar", "S4", "S6"),
    *("F", "Cl", "Br", "I", "P", "Si", "Sn", "X"),
)
TYPE_INDEX: Final = {name: index for index, name in enumerate(ATOM_TYPES)}

PROTON_CLASSES: Final = (
    *("CH3", "CH2", "CH", "ArH", "alkene", "CHO", "alkyne", "NH", "OH", "SH", "other"),
)
EXCHANGEABLE_CLASSES: Final = frozenset({"NH", "OH", "SH"})

# Pauling electronegativities (handbook values, from memory).
ELECTRONEGATIVITY: Final = {
    1: 2.20,
    5: 2.04,
    6: 2.55,
    7: 3.04,
    8: 3.44,
    9: 3.98,
    14: 1.90,
    15: 2.19,
    16: 2.58,
    17: 3.16,
    34: 2.55,
    35: 2.96,
    50: 1.96,
    53: 2.66,
}

_SIMPLE: Final = {
    9: "F",
    17: "Cl",
    35: "Br",
    53: "I",
    15: "P",
    14: "Si",
    50: "Sn",
}


def atom_type(atom: Chem.Atom) -> str:
    """Name of an atom's type, one of :data:`ATOM_TYPES`."""
    number = atom.GetAtomicNum()
    typed = {6: _carbon, 7: _nitrogen, 8: _oxygen, 16: _sulfur}.get(number)
    return typed(atom) if typed else _SIMPLE.get(number, "X")


def proton_class(atom: Chem.Atom) -> str:
    """Class of the protons on a heavy atom, one of :data:`PROTON_CLASSES`."""
    simple = {7: "NH", 8: "OH", 16: "SH"}.get(atom.GetAtomicNum())
    if simple or atom.GetAtomicNum() != 6:
        return simple or "other"
    if atom.GetIsAromatic():
        return "ArH"
    if (partner := _partner(atom, 3.0)) is not None:
        return "alkyne" if partner.GetAtomicNum() == 6 else "other"
    if (partner := _partner(atom, 2.0)) is not None:
        return "CHO" if partner.GetAtomicNum() == 8 else "alkene"
    return {3: "CH3", 2: "CH2", 1: "CH"}.get(proton_count(atom), "other")


def proton_count(atom: Chem.Atom) -> int:
    """Hydrogens on an atom, deuterium and tritium included."""
    return int(atom.GetTotalNumHs(includeNeighbors=True))


def _partner(atom: Chem.Atom, order: float) -> Chem.Atom | None:
    for bond in atom.GetBonds():
        if bond.GetBondTypeAsDouble() == order:
            partner: Chem.Atom = bond.GetOtherAtom(atom)
            return partner
    return None


def _carbon(atom: Chem.Atom) -> str:
    if atom.GetIsAromatic():
        hetero = any(
            n.GetIsAromatic() and n.GetAtomicNum() != 6 for n in atom.GetNeighbors()
        )
        return "CarN" if hetero else "Car"
    if (partner := _partner(atom, 3.0)) is not None:
        return "CN" if partner.GetAtomicNum() == 7 else "Cyne"
    if (partner := _partner(atom, 2.0)) is None:
        return "C3q" if proton_count(atom) == 0 else "C3"
    number = partner.GetAtomicNum()
    if number in (8, 16):
        return _carbonyl(atom, partner.GetIdx())
    return {7: "C=N", 6: "Cvin"}.get(number, "Cx")


def _carbonyl(atom: Chem.Atom, oxygen: int) -> str:
    others = {n.GetAtomicNum() for n in atom.GetNeighbors() if n.GetIdx() != oxygen}
    if 7 in others:
        return "CON"
    return "COX" if others & {8, 9, 16, 17, 35} else "CO"


def _nitrogen(atom: Chem.Atom) -> str:
    charged = atom.GetFormalCharge() > 0
    if atom.GetIsAromatic():
        if charged:
            return "N+"
        return "NarH" if proton_count(atom) or atom.GetDegree() == 3 else "Nar"
    if _partner(atom, 3.0) is not None:
        return "Nnit"
    terminal = sum(
        n.GetAtomicNum() == 8 and n.GetDegree() == 1 for n in atom.GetNeighbors()
    )
    if terminal >= 2:
        return "NO2"
    if charged:
        return "N+"
    if _partner(atom, 2.0) is not None:
        return "N="
    return _amine_or_amide(atom)


def _amine_or_amide(atom: Chem.Atom) -> str:
    for neighbour in atom.GetNeighbors():
        if is_acyl_carbon(neighbour):
            return "Namide"
        if neighbour.GetAtomicNum() == 16 and neighbour.GetDegree() >= 3:
            return "Nso"
    return "Nam"


def is_acyl_carbon(atom: Chem.Atom) -> bool:
    """Whether an atom is a carbon with a double bond to oxygen or sulfur."""
    if atom.GetAtomicNum() != 6 or atom.GetIsAromatic():
        return False
    partner = _partner(atom, 2.0)
    return partner is not None and partner.GetAtomicNum() in (8, 16)


def _oxygen(atom: Chem.Atom) -> str:
    if atom.GetIsAromatic():
        return "Oar"
    if atom.GetFormalCharge() < 0:
        return "O-"
    heavy = [n for n in atom.GetNeighbors() if n.GetAtomicNum() > 1]
    if len(heavy) <= 1:
        return "O=" if _partner(atom, 2.0) is not None else "OH"
    if any(is_acyl_carbon(n) for n in heavy):
        return "Oest"
    return "OxO" if any(n.GetAtomicNum() in (15, 16) for n in heavy) else "Oeth"


def _sulfur(atom: Chem.Atom) -> str:
    if atom.GetIsAromatic():
        return "Sar"
    return {4: "S6", 3: "S4"}.get(atom.GetDegree(), "S2")
