"""Couplings of protons to phosphorus over one to five bonds, in Hz."""

from __future__ import annotations

from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame


def phosphorus(frame: Frame, hydrogen: int, phosphorus_atom: int) -> Estimate | None:
    """Coupling of a proton to phosphorus."""
    n_bonds = frame.n_bonds(hydrogen, phosphorus_atom)
    is_pentavalent = frame.atom(phosphorus_atom).GetTotalValence() > 3
    if n_bonds == 1:
        key = "HP 1J PV" if is_pentavalent else "HP 1J PIII"
        return from_table(key, "HP one bond", is_rigid=True)
    carrier = frame.carrier(hydrogen)
    if n_bonds == 2:
        return _two_bonds(frame, carrier, phosphorus_atom)
    if frame.is_aromatic(carrier):
        return _aryl(n_bonds, is_pentavalent)
    if n_bonds == 3:
        return _three_bonds(frame, hydrogen, carrier, phosphorus_atom)
    if n_bonds == 4 and frame.element(carrier) == 6:
        return _four_bonds(frame, carrier, phosphorus_atom)
    return None


def _two_bonds(frame: Frame, carrier: int, phosphorus_atom: int) -> Estimate | None:
    if frame.element(carrier) != 6:
        return None
    oxygens = sum(frame.element(n) == 8 for n in frame.others(phosphorus_atom))
    if frame.atom(phosphorus_atom).GetFormalCharge() > 0 and not oxygens:
        key = "HP 2J phosphonium"
    elif oxygens >= 2:
        key = "HP 2J phosphonate"
    elif oxygens == 1:
        key = "HP 2J oxide"
    else:
        key = "HP 2J phosphine"
    return from_table(key, "HP geminal", is_rigid=True)


def _aryl(n_bonds: int, is_pentavalent: bool) -> Estimate | None:
    keys = {
        3: "HP 3J aryl" if is_pentavalent else "HP 3J aryl PIII",
        4: "HP 4J aryl",
        5: "HP 5J aryl",
    }
    key = keys.get(n_bonds)
    return None if key is None else from_table(key, "HP aromatic", is_rigid=True)


def _three_bonds(
    frame: Frame, hydrogen: int, carrier: int, phosphorus_atom: int
) -> Estimate | None:
    if frame.element(carrier) != 6:
        return None
    middle = next(path[1] for path in frame.paths(carrier, phosphorus_atom))
    element = frame.element(middle)
    is_methyl = frame.n_hydrogens(carrier) == 3
    if element == 8:
        key = "HP 3J HCOP methyl" if is_methyl else "HP 3J HCOP"
        return from_table(key, "HP vicinal", is_rigid=False)
    if element == 7:
        return from_table("HP 3J HCNP", "HP vicinal", is_rigid=False)
    if frame.bond_order(carrier, middle) == 2 and not frame.conformers.is_empty:
        angle = abs(frame.dihedral_deg(hydrogen, carrier, middle, phosphorus_atom)[0])
        side = "cis" if angle < 90 else "trans"
        return from_table(f"HP 3J vinyl {side}", "HP vicinal", is_rigid=True)
    key = "HP 3J HCCP ring" if frame.ring_size(carrier, middle) else "HP 3J HCCP"
    return from_table(key, "HP vicinal", is_rigid=False)


def _four_bonds(frame: Frame, carrier: int, phosphorus_atom: int) -> Estimate | None:
    if not frame.is_sp3_carbon(carrier):
        return None
    path = next(iter(frame.paths(carrier, phosphorus_atom)))
    if frame.element(path[-2]) != 8:
        return None
    return from_table("HP 4J", "HP four bonds", is_rigid=False)
