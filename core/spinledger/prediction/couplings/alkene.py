"""Couplings through double and triple bonds outside aromatic rings, in Hz."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt
from rdkit import Chem

from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.substituents import vinyl_group
from spinledger.prediction.couplings.tables import vinyl_shift_hz

Floats = npt.NDArray[np.float64]

#: Two substituents on the same side press each other apart and raise the cis
#: coupling above the sum; trans ones a little. From memory of Z and E
#: disubstituted ethylenes (2-butenes, stilbenes, cinnamates, crotonates).
_CIS_EXCESS_HZ = 2.4
_TRANS_EXCESS_HZ = 0.4
#: Two paths in 1,4-cyclohexadienes give more than their sum (8 to 9.6 Hz).
_TWO_PATHS = 1.6
_ETHYLENE_CIS_HZ, _ETHYLENE_TRANS_HZ = 11.6, 19.1


def across_double_bond(frame: Frame, first: int, second: int) -> Estimate | None:
    """Coupling H-C=C-H."""
    a, b = frame.carrier(first), frame.carrier(second)
    size = frame.ring_size(a, b)
    if 3 <= size <= 8:
        key = _ring_alkene_key(frame, a, b, size)
        return from_table(key, "vinyl cis ring", is_rigid=True)
    side = _side(frame, first, second)
    if side is None:
        return from_table("alkene unspecified", "vinyl", is_rigid=False)
    if size and side == "cis":
        return from_table("larger ring alkene cis", "vinyl cis ring", is_rigid=True)
    column = 1 if side == "cis" else 2
    groups = [vinyl_group(frame, n, a) for n in frame.others(a, b)]
    groups += [vinyl_group(frame, n, b) for n in frame.others(b, a)]
    value = _ETHYLENE_CIS_HZ if side == "cis" else _ETHYLENE_TRANS_HZ
    value += sum(vinyl_shift_hz(group)[column] for group in groups)
    if len(groups) == 2:
        value += _CIS_EXCESS_HZ if side == "cis" else _TRANS_EXCESS_HZ
    return from_table(f"alkene {side}", f"vinyl {side}", is_rigid=True, j_hz=value)


def _ring_alkene_key(frame: Frame, a: int, b: int, size: int) -> str:
    """Oxygen or nitrogen at the double bond lowers the coupling."""
    elements = [
        frame.element(n) for c, d in ((a, b), (b, a)) for n in frame.others(c, d)
    ]
    if size in (5, 6):
        for element, name in ((8, "O"), (7, "N")):
            if element in elements:
                return f"ring{size} alkene {name}"
    return f"ring{size} alkene"


def _side(frame: Frame, first: int, second: int) -> str | None:
    """Which side of the double bond, from the drawing; None if it does not say."""
    a, b = frame.carrier(first), frame.carrier(second)
    if 2 in (frame.n_hydrogens(a), frame.n_hydrogens(b)):
        return _side_from_geometry(frame, first, a, b, second)
    bond = frame.mol.GetBondBetweenAtoms(a, b)
    stereo = bond.GetStereo()
    if stereo in _SIDES:
        return _SIDES[stereo]
    if stereo in _RELATIVE and all(frame.element(i) > 1 for i in bond.GetStereoAtoms()):
        return _RELATIVE[stereo]
    return None


#: Each carbon bears one proton and one group, and every group outranks a
#: proton, so that the protons lie as the groups do.
_SIDES = {Chem.BondStereo.STEREOZ: "cis", Chem.BondStereo.STEREOE: "trans"}
_RELATIVE = {Chem.BondStereo.STEREOCIS: "cis", Chem.BondStereo.STEREOTRANS: "trans"}


def _side_from_geometry(
    frame: Frame, first: int, a: int, b: int, second: int
) -> str | None:
    if frame.conformers.is_empty:
        return None
    angle = abs(frame.dihedral_deg(first, a, b, second)[0])
    return "cis" if angle < 90 else "trans"


def next_to_double_bond(frame: Frame, first: int, second: int) -> Estimate | None:
    """Coupling H-C-C-H over a single bond with at least one trigonal carbon."""
    a, b = frame.carrier(first), frame.carrier(second)
    if frame.is_sp2_carbon(a) and frame.is_sp2_carbon(b):
        return _between_trigonal(frame, a, b)
    if frame.is_sp3_carbon(b):
        first, second, a, b = second, first, b, a
    if not (frame.is_sp3_carbon(a) and frame.is_sp2_carbon(b)):
        return None
    doubled = [n for n in frame.others(b, a) if frame.bond_order(b, n) == 2]
    if not doubled:
        return None
    element = frame.element(doubled[0])
    n_hydrogens = frame.n_hydrogens(a)
    if element == 8:
        group = {3: "methyl", 2: "CH2"}.get(n_hydrogens, "CH")
        return from_table(f"aldehyde {group}", "vicinal aldehyde", is_rigid=False)
    if element != 6:
        return from_table("imine H", "vicinal imine", is_rigid=False)
    return _allyl_vicinal(frame, first, a, b, second)


def _allyl_vicinal(frame: Frame, first: int, a: int, b: int, second: int) -> Estimate:
    kind = "vicinal sp3-sp2"
    if not frame.ring_size(a, b):
        key = {3: "methyl vinyl", 2: "CH2 vinyl"}.get(frame.n_hydrogens(a), "CH vinyl")
        return from_table(key, kind, is_rigid=False)
    if frame.conformers.is_empty:
        return from_table("sp3-sp2 ring", kind, is_rigid=False)
    values = _garbisch_vicinal_hz(frame.dihedral_deg(first, a, b, second))
    mean, spread = frame.mean_and_spread(values)
    return Estimate(
        j_hz=mean,
        j_sd_hz=math.hypot(0.9, 0.4 * spread),
        kind=kind,
        is_rigid=True,
        source="Karplus equation for HC-CH= [garbisch1964]",
    )


def _garbisch_vicinal_hz(angle_deg: Floats) -> Floats:
    squared = np.cos(np.radians(angle_deg)) ** 2
    front = np.where(np.abs(angle_deg) <= 90, 6.6, 11.6)
    return np.asarray(front * squared + 2.6 * (1 - squared))


def _between_trigonal(frame: Frame, a: int, b: int) -> Estimate | None:
    carbonyls = frame.is_carbonyl(a) + frame.is_carbonyl(b)
    size = frame.ring_size(a, b)
    if carbonyls == 1 and not size:
        return from_table("enal", "vicinal enal", is_rigid=True)
    if carbonyls:
        return None
    if size in (5, 6, 7):
        return from_table(f"diene ring{size}", "vicinal diene", is_rigid=True)
    return from_table("diene single bond", "vicinal diene", is_rigid=not size)


def four_bonds(frame: Frame, first: int, second: int) -> Estimate | None:
    """Coupling over four bonds with at least one multiple bond, not aromatic."""
    a, b = frame.carrier(first), frame.carrier(second)
    for _, middle, _ in frame.paths(a, b):
        found = _four_bonds_via(frame, (first, a, middle, b, second))
        if found is not None:
            return found
    return None


def _four_bonds_via(frame: Frame, path: tuple[int, ...]) -> Estimate | None:
    first, a, middle, b, second = path
    orders = (frame.bond_order(a, middle), frame.bond_order(middle, b))
    if frame.element(middle) != 6:
        return None
    if orders == (2, 2):
        return from_table("allene", "allene", is_rigid=True)
    if 3 in orders:
        ends_sp3 = frame.is_sp3_carbon(a) or frame.is_sp3_carbon(b)
        key = "propargylic" if ends_sp3 else "enyne"
        return from_table(key, key, is_rigid=False)
    if 2 not in orders:
        return None
    if orders[0] == 2:
        first, a, b, second = second, b, a, first
    if frame.is_sp3_carbon(a):
        return _allylic(frame, first, a, middle, b)
    if frame.is_carbonyl(a):
        return from_table("allylic aldehyde", "allylic aldehyde", is_rigid=False)
    return from_table("diene 4J", "diene four bonds", is_rigid=True)


def _allylic(frame: Frame, first: int, a: int, middle: int, b: int) -> Estimate:
    """Allylic coupling; ``a`` saturated, ``middle`` = ``b`` the double bond."""
    if not frame.ring_size(a, middle) or frame.conformers.is_empty:
        return from_table("allylic", "allylic", is_rigid=False)
    angle = frame.dihedral_deg(first, a, middle, b)
    squared = np.cos(np.radians(angle)) ** 2
    values = np.where(np.abs(angle) <= 90, 1.3, 0.0) * squared - 2.6 * (1 - squared)
    mean, spread = frame.mean_and_spread(values)
    return Estimate(
        j_hz=mean,
        j_sd_hz=math.hypot(0.5, 0.4 * spread),
        kind="allylic",
        is_rigid=True,
        source="Karplus equation for HC-C=CH [garbisch1964]",
    )


def five_bonds(frame: Frame, first: int, second: int) -> Estimate | None:
    """Coupling over five bonds through multiple bonds, not aromatic."""
    a, b = frame.carrier(first), frame.carrier(second)
    homoallylic: list[Estimate] = []
    for _, c, d, _ in frame.paths(a, b):
        if not frame.element(c) == frame.element(d) == 6:
            continue
        orders = tuple(frame.bond_order(*pair) for pair in ((a, c), (c, d), (d, b)))
        if orders == (1, 2, 1) and not (frame.is_aromatic(c) or frame.is_aromatic(d)):
            found = _homoallylic(frame, (first, a, c, d, b, second))
            if found is not None:
                homoallylic.append(found)
            continue
        key = _FIVE_BOND_KEYS.get(orders) or _FIVE_BOND_KEYS.get(orders[::-1])
        if key is not None:
            return from_table(key, key, is_rigid=False)
    if not homoallylic:
        return None
    total = sum(item.j_hz for item in homoallylic)
    if len(homoallylic) > 1:
        total *= _TWO_PATHS
    return homoallylic[0].changed(j_hz=total)


_FIVE_BOND_KEYS: dict[tuple[float, ...], str] = {
    (1, 3, 1): "homopropargylic",
    (3, 1, 3): "diyne",
    (2, 2, 1): "allene long",
    (2, 1, 2): "diene 5J",
}


def _homoallylic(frame: Frame, path: tuple[int, ...]) -> Estimate | None:
    first, a, c, d, b, second = path
    if not (frame.is_sp3_carbon(a) and frame.is_sp3_carbon(b)):
        return None
    rings = frame.ring_size(a, c), frame.ring_size(d, b)
    if not any(rings) or frame.conformers.is_empty:
        return from_table("homoallylic", "homoallylic", is_rigid=False)
    sines = (
        np.sin(np.radians(frame.dihedral_deg(first, a, c, d)))
        * np.sin(np.radians(frame.dihedral_deg(second, b, d, c)))
    ) ** 2
    # 5 Hz a path for two perpendicular C-H bonds reproduces 1.3 Hz of freely
    # rotating groups and the order of the cyclohexadienes.
    mean, spread = frame.mean_and_spread(5.0 * sines)
    return Estimate(
        j_hz=mean,
        j_sd_hz=math.hypot(0.7, 0.3 * mean + 0.4 * spread),
        kind="homoallylic",
        is_rigid=True,
        source="sin2 sin2 rule for homoallylic couplings [handbook]",
    )
