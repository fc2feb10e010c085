"""Couplings over two bonds, in Hz, with sign."""

from __future__ import annotations

from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.substituents import vinyl_group
from spinledger.prediction.couplings.tables import rule, vinyl_shift_hz

_KIND = "geminal"
_THREE_RINGS = {6: "three-ring", 8: "epoxide", 7: "aziridine", 16: "thiirane"}
#: Linear model of 242 measured values with distinct shifts, Hz per neighbour.
_PER_PI = -0.42
_PER_CARBONYL = -1.23
_PER_ELEMENT = {8: 1.74, 7: 0.40, 16: 0.57, 34: 0.57}
_FIVE_RING = 0.95
#: Electronegative halogens act as oxygen does, from memory.
_HALOGENS = {9: 2.5, 17: 1.5, 35: 1.5, 53: 1.5}


def geminal(frame: Frame, carrier: int) -> Estimate | None:
    """Coupling of two protons on one atom, the carrier."""
    if frame.element(carrier) == 7:
        return from_table("geminal NH2", _KIND, is_rigid=False)
    if frame.element(carrier) != 6:
        return None
    if frame.is_sp3_carbon(carrier):
        return _saturated(frame, carrier)
    return _unsaturated(frame, carrier)


def _saturated(frame: Frame, carbon: int) -> Estimate:
    size = frame.ring_size(carbon)
    if size == 3:
        return _three_ring(frame, carbon)
    neighbours = frame.others(carbon)
    oxygens = sum(frame.element(n) == 8 for n in neighbours)
    if oxygens == 2:
        key = {5: "dioxolane", 6: "dioxane"}.get(size, "acetal")
        return from_table(f"geminal {key}", _KIND, is_rigid=True)
    if size == 4 and not oxygens:
        return from_table("geminal cyclobutane", _KIND, is_rigid=True)
    value = rule("geminal base").j_hz + sum(_neighbour(frame, n) for n in neighbours)
    value += _FIVE_RING if size == 5 else 0.0
    return from_table("geminal base", _KIND, is_rigid=True, j_hz=value)


def _neighbour(frame: Frame, atom: int) -> float:
    element = frame.element(atom)
    if element == 6:
        if frame.is_sp3_carbon(atom):
            return 0.0
        return _PER_PI + (_PER_CARBONYL if frame.is_carbonyl(atom) else 0.0)
    return _PER_ELEMENT.get(element, _HALOGENS.get(element, 0.0))


def _three_ring(frame: Frame, carbon: int) -> Estimate:
    ring = frame.ring_with(carbon) or ()
    heteros = [frame.element(i) for i in ring if frame.element(i) != 6]
    name = _THREE_RINGS.get(heteros[0] if heteros else 6, "three-ring")
    return from_table(f"geminal {name}", _KIND, is_rigid=True)


def _unsaturated(frame: Frame, carbon: int) -> Estimate:
    partners = frame.others(carbon)
    partner = partners[0] if partners else None
    element = frame.element(partner) if partner is not None else 0
    if partner is None or element not in (6, 7, 8):
        return from_table("geminal CH2=", _KIND, is_rigid=True)
    if element == 8:
        return from_table("geminal formaldehyde", _KIND, is_rigid=True)
    if element == 7:
        return from_table("geminal CH2=N", _KIND, is_rigid=True)
    if not frame.is_sp2_carbon(partner):
        return from_table("geminal allene", _KIND, is_rigid=True)
    base, _, _ = (2.5, 11.6, 19.1)
    value = base + sum(
        vinyl_shift_hz(vinyl_group(frame, n, partner))[0]
        for n in frame.others(partner, carbon)
    )
    return from_table("geminal CH2=C", _KIND, is_rigid=True, j_hz=value)
