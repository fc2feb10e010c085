"""Classes of substituents: group electronegativities and vinyl groups."""

from __future__ import annotations

from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.tables import substituent_electronegativity

_HALOGENS = {9: "F", 17: "Cl", 35: "Br", 53: "I"}
_PLAIN = {**_HALOGENS, 16: "S", 34: "Se", 15: "P", 14: "Si"}


def electronegativity(frame: Frame, substituent: int, carbon: int) -> float:
    """Group electronegativity lambda of a substituent on a carbon, H = 0.

    Parameters
    ----------
    frame : Frame
    substituent, carbon : int
        Atom indices of a bond.

    References
    ----------
    .. [1] C. Altona, R. Francke, R. de Haan, J. H. Ippel, G. J. Daalmans,
       A. J. A. Westra Hoekzema, J. van Wijk, Magn. Reson. Chem. 32 (1994)
       670-678, doi:10.1002/mrc.1260321107; values from memory.
    """
    element = frame.element(substituent)
    if element == 1:
        return 0.0
    if element == 6:
        return _carbon(frame, substituent, carbon)
    if element == 7:
        return substituent_electronegativity(
            _nitrogen_group(frame, substituent, carbon)
        )
    if element == 8:
        return substituent_electronegativity(_oxygen_group(frame, substituent, carbon))
    return substituent_electronegativity(_PLAIN.get(element, "other"))


def _oxygen_group(frame: Frame, oxygen: int, carbon: int) -> str:
    others = frame.others(oxygen, carbon)
    if not others:
        return "OH"
    if frame.element(others[0]) == 15:
        return "OP"
    return "OC(O)R" if frame.is_carbonyl(others[0]) else "OR"


def _nitrogen_group(frame: Frame, nitrogen: int, carbon: int) -> str:
    if frame.is_aromatic(nitrogen):
        return "N aromatic"
    if frame.atom(nitrogen).GetFormalCharge() > 0:
        return "N+"
    others = frame.others(nitrogen, carbon)
    if any(_is_acyl(frame, other, nitrogen) for other in others):
        return "N amide"
    return "N aryl" if any(map(frame.is_aromatic, others)) else "N"


def _is_acyl(frame: Frame, atom: int, nitrogen: int) -> bool:
    """C(=O), C(=S), S(=O), C(=N+) next to a nitrogen."""
    return any(
        frame.element(n) in (7, 8, 16) and frame.bond_order(atom, n) == 2
        for n in frame.others(atom, nitrogen)
    )


def _carbon(frame: Frame, carbon: int, parent: int) -> float:
    if frame.is_sp3_carbon(carbon):
        return _saturated_carbon(frame, carbon, parent)
    others = frame.others(carbon, parent)
    if any(frame.bond_order(carbon, n) == 3 for n in others):
        group = "CN" if any(frame.element(n) == 7 for n in others) else "C sp2"
    elif frame.is_carbonyl(carbon):
        heteros = sum(frame.element(n) == 8 for n in others)
        group = "COO" if heteros > 1 else "C(O)R"
    else:
        group = "C sp2"
    return substituent_electronegativity(group)


def _saturated_carbon(frame: Frame, carbon: int, parent: int) -> float:
    others = frame.others(carbon, parent)
    if sum(frame.element(n) == 9 for n in others) == 3:
        return substituent_electronegativity("CF3")
    group = {3: "CH3", 2: "CH2"}.get(frame.n_hydrogens(carbon), "CH")
    oxygens = sum(frame.element(n) == 8 for n in others)
    per_oxygen = substituent_electronegativity("C per O")
    return substituent_electronegativity(group) + per_oxygen * min(oxygens, 2)


def vinyl_group(frame: Frame, substituent: int, carbon: int) -> str:
    """Row of the vinyl table for a substituent on an alkene carbon."""
    element = frame.element(substituent)
    if element == 1:
        return "H"
    if element == 6:
        return _vinyl_carbon(frame, substituent, carbon)
    if element == 8:
        is_ester = _oxygen_group(frame, substituent, carbon) == "OC(O)R"
        return "OCO" if is_ester else "O"
    doubles = _double_oxygens(frame, substituent)
    if element == 7:
        is_nitro = frame.atom(substituent).GetFormalCharge() > 0 and doubles
        return "NO2" if is_nitro else "N"
    if element == 16:
        return "SO2" if doubles else "S"
    return _PLAIN.get(element, "other")


def _double_oxygens(frame: Frame, atom: int) -> int:
    return sum(
        frame.element(n) == 8 and frame.bond_order(atom, n) == 2
        for n in frame.others(atom)
    )


def _vinyl_carbon(frame: Frame, substituent: int, carbon: int) -> str:
    if frame.is_sp3_carbon(substituent):
        return "alkyl"
    if frame.is_aromatic(substituent):
        return "aryl"
    others = frame.others(substituent, carbon)
    triples = [n for n in others if frame.bond_order(substituent, n) == 3]
    if triples:
        return "CN" if frame.element(triples[0]) == 7 else "alkynyl"
    if not frame.is_carbonyl(substituent):
        return "vinyl"
    singles = [n for n in others if frame.bond_order(substituent, n) == 1]
    if not singles:
        return "CHO"
    return {8: "COO", 7: "CON"}.get(frame.element(singles[0]), "COR")
