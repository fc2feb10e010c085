"""One-bond couplings of protons to carbon-13, for satellites; J in Hz."""

from __future__ import annotations

from rdkit import Chem

from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame

_KIND = "13C one bond"
#: Added to a saturated CH per electronegative neighbour, from memory of CH3X
#: (CH3F 149, CH3OH 141, CH3NH2 133, CH3Cl 150, CH3Br 152, CH3I 152, methane 125).
_PER_ELEMENT = {9: 24.0, 8: 18.0, 7: 10.0, 17: 26.0, 35: 27.0, 53: 27.0, 16: 13.0}
_THREE_RINGS = {6: "cyclopropane", 8: "epoxide", 7: "epoxide", 16: "epoxide"}


def one_bond_carbon(mol_with_hydrogens: Chem.Mol, carbon: int) -> Estimate | None:
    """Coupling of the protons of a carbon to its 13C.

    Parameters
    ----------
    mol_with_hydrogens : rdkit.Chem.Mol
    carbon : int
        Atom index.

    Returns
    -------
    Estimate or None
        None for a carbon without protons or an atom that is no carbon.
    """
    frame = Frame(mol_with_hydrogens, is_aqueous=False)
    if frame.element(carbon) != 6 or not frame.hydrogens(carbon):
        return None
    if frame.is_sp3_carbon(carbon):
        return _saturated(frame, carbon)
    return from_table(f"13C {_unsaturated_name(frame, carbon)}", _KIND, is_rigid=True)


def _saturated(frame: Frame, carbon: int) -> Estimate:
    size = frame.ring_size(carbon)
    if size == 3:
        ring = frame.ring_with(carbon) or ()
        heteros = [frame.element(i) for i in ring if frame.element(i) != 6]
        name = _THREE_RINGS.get(heteros[0] if heteros else 6, "cyclopropane")
        return from_table(f"13C {name}", _KIND, is_rigid=True)
    key = "13C cyclobutane" if size == 4 else "13C alkane"
    base = from_table(key, _KIND, is_rigid=True)
    more = sum(_PER_ELEMENT.get(frame.element(n), 0.0) for n in frame.others(carbon))
    return base.changed(j_hz=base.j_hz + more)


def _unsaturated_name(frame: Frame, carbon: int) -> str:
    neighbours = frame.others(carbon)
    if frame.is_aromatic(carbon):
        beside = any(frame.element(n) != 6 for n in neighbours)
        return "heteroaromatic" if beside else "aromatic"
    if any(frame.bond_order(carbon, n) == 3 for n in neighbours):
        return "alkyne"
    if frame.is_carbonyl(carbon):
        heteros = sum(frame.element(n) in (7, 8) for n in neighbours)
        return "formate" if heteros > 1 else "aldehyde"
    return "alkene"
