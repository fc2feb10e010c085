"""Couplings of protons on oxygen, nitrogen and sulfur to CH, in Hz."""

from __future__ import annotations

from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame


def hetero_vicinal(frame: Frame, first: int, second: int) -> Estimate | None:
    """Coupling H-X-C-H with X oxygen, nitrogen or sulfur."""
    a, b = frame.carrier(first), frame.carrier(second)
    if frame.element(a) == 6:
        a, b = b, a
    if frame.element(b) != 6:
        return None
    element = frame.element(a)
    if element == 16:
        return from_table("H-S-C-H", "H-S-C-H", is_rigid=False)
    if element == 8:
        return _hydroxyl(frame, b)
    if element == 7 and not frame.is_aromatic(a):
        return _amino(frame, a, b)
    return None


def _hydroxyl(frame: Frame, carbon: int) -> Estimate | None:
    if not frame.is_sp3_carbon(carbon):
        return None
    key = {3: "H-O-CH3", 2: "H-O-CH2"}.get(frame.n_hydrogens(carbon), "H-O-C-H")
    return from_table(key, "H-O-C-H", is_rigid=False)


def _amino(frame: Frame, nitrogen: int, carbon: int) -> Estimate | None:
    if frame.is_carbonyl(carbon):
        return from_table("H-N-CHO", "H-N-C-H", is_rigid=False)
    if not frame.is_sp3_carbon(carbon):
        return None
    return from_table(_amino_key(frame, nitrogen, carbon), "H-N-C-H", is_rigid=False)


def _amino_key(frame: Frame, nitrogen: int, carbon: int) -> str:
    others = frame.others(nitrogen, carbon)
    if frame.atom(nitrogen).GetFormalCharge() > 0:
        return "H-N-C-H ammonium"
    if any(_is_acyl(frame, atom, nitrogen) for atom in others):
        return {3: "H-N-CH3 amide", 2: "H-N-CH2 amide"}.get(
            frame.n_hydrogens(carbon), "H-N-C-H amide"
        )
    if any(frame.is_aromatic(atom) for atom in others):
        return "H-N-C-H aniline"
    return "H-N-C-H amine"


def _is_acyl(frame: Frame, atom: int, nitrogen: int) -> bool:
    return any(
        frame.element(n) in (8, 16) and frame.bond_order(atom, n) == 2
        for n in frame.others(atom, nitrogen)
    )
