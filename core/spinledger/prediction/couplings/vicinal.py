"""Couplings over three bonds between protons on saturated carbons, in Hz."""

from __future__ import annotations

import math

from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.hla import (
    freely_rotating_hz,
    vicinal_over_conformers_hz,
)
from spinledger.prediction.couplings.substituents import electronegativity

_HLA = "HLA equation, lambda electronegativities [haasnoot1980, altona1994]"
#: Largest ring that holds its bonds like the drawing says.
_LARGEST_RIGID_RING = 7
_SMALL_HETEROS = {6: "ring3", 8: "epoxide", 7: "aziridine", 16: "thiirane"}


def vicinal(frame: Frame, first: int, second: int) -> Estimate | None:
    """Coupling of two protons on neighbouring saturated carbons."""
    a, b = frame.carrier(first), frame.carrier(second)
    if not (frame.is_sp3_carbon(a) and frame.is_sp3_carbon(b)):
        return None
    if 3 in (frame.n_hydrogens(a), frame.n_hydrogens(b)):
        return _methyl(frame, a, b)
    size = frame.ring_size(a, b)
    if size == 3:
        return _three_ring(frame, first, second)
    if 0 < size <= _LARGEST_RIGID_RING:
        return _in_ring(frame, first, second, size)
    return _in_chain(frame, first, second)


def _methyl(frame: Frame, a: int, b: int) -> Estimate:
    total = sum(electronegativity(frame, atom, a) for atom in frame.others(a, b))
    total += sum(electronegativity(frame, atom, b) for atom in frame.others(b, a))
    # Bias of the mean over rotamers against published values, by kind.
    bias_hz = 0.17 if 1 in (frame.n_hydrogens(a), frame.n_hydrogens(b)) else 0.32
    return Estimate(
        j_hz=freely_rotating_hz(total) + bias_hz,
        j_sd_hz=0.35,
        kind="vicinal methyl",
        is_rigid=False,
        source=_HLA + ", rotor mean",
    )


def _three_ring(frame: Frame, first: int, second: int) -> Estimate:
    a, b = frame.carrier(first), frame.carrier(second)
    ring = frame.ring_with(a, b) or ()
    third = next((i for i in ring if i not in (a, b)), a)
    name = _SMALL_HETEROS.get(frame.element(third), "ring3")
    if frame.conformers.is_empty:
        return from_table(f"{name} cis", "vicinal ring", is_rigid=False)
    angle, _ = frame.mean_and_spread(abs(frame.dihedral_deg(first, a, b, second)))
    side = "cis" if angle < 70 else "trans"
    return from_table(f"{name} {side}", "vicinal ring", is_rigid=True)


def _in_ring(frame: Frame, first: int, second: int, size: int) -> Estimate:
    if frame.conformers.is_empty:
        return _without_geometry("vicinal ring", 5.5, 3.3)
    a, b = frame.carrier(first), frame.carrier(second)
    mean, spread = frame.mean_and_spread(
        vicinal_over_conformers_hz(frame, first, a, b, second)
    )
    rule_sd = 1.5 if size == 5 else 1.0
    return Estimate(
        j_hz=mean,
        j_sd_hz=math.hypot(rule_sd, 0.4 * spread),
        kind="vicinal ring",
        is_rigid=True,
        source=_HLA,
    )


def _in_chain(frame: Frame, first: int, second: int) -> Estimate:
    if frame.conformers.is_empty:
        return _without_geometry("vicinal chain", 6.8, 2.3)
    a, b = frame.carrier(first), frame.carrier(second)
    mean, spread = frame.mean_and_spread(
        vicinal_over_conformers_hz(frame, first, a, b, second)
    )
    return Estimate(
        j_hz=mean,
        j_sd_hz=math.hypot(1.0, 0.3 * spread),
        kind="vicinal chain",
        is_rigid=False,
        source=_HLA,
    )


def _without_geometry(kind: str, j_hz: float, j_sd_hz: float) -> Estimate:
    return Estimate(
        j_hz=j_hz,
        j_sd_hz=j_sd_hz,
        kind=kind,
        is_rigid=False,
        source="mean of published values, no geometry [bmrb2017]",
    )
