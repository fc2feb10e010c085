"""Couplings over three bonds between protons on saturated carbons, in Hz."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.prediction.couplings import models
from spinledger.prediction.couplings.bridged import bridging_effect_hz
from spinledger.prediction.couplings.chain_features import bond_features
from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.hla import (
    freely_rotating_hz,
    vicinal_over_conformers_hz,
)
from spinledger.prediction.couplings.ribose import ribose_key
from spinledger.prediction.couplings.substituents import electronegativity

Floats = npt.NDArray[np.float64]

_HLA = "HLA equation, lambda electronegativities [haasnoot1980, altona1994]"
#: Largest ring that holds its bonds like the drawing says.
_LARGEST_RIGID_RING = 7
_SMALL_HETEROS = {6: "ring3", 8: "epoxide", 7: "aziridine", 16: "thiirane"}
#: Ring couplings: error of the rule, and share of the spread over conformers
#: that is doubt; both from published couplings of five- and six-rings.
_RING_RULE_SD_HZ = 1.1
_CONFORMER_DOUBT = 0.25
#: Force fields flatten rings of polyols; what the coupling of two axial protons
#: between oxygens lacks by that in rigid sugars (glucose, inositol).
_POLYOL_LACK_HZ = 0.7
#: Mean and sd of ring couplings over all configurations.
_OPEN_RING_HZ, _OPEN_RING_SD_HZ = 5.5, 3.0
_NAMES = {1: "CH", 2: "CH2", 3: "CH3"}


def vicinal(frame: Frame, first: int, second: int) -> Estimate | None:
    """Coupling of two protons on neighbouring saturated carbons."""
    a, b = frame.carrier(first), frame.carrier(second)
    if not (frame.is_sp3_carbon(a) and frame.is_sp3_carbon(b)):
        return None
    if frame.n_hydrogens(a) > frame.n_hydrogens(b):
        first, second, a, b = second, first, b, a
    if frame.n_hydrogens(b) >= 3:
        return _methyl(frame, a, b)
    size = frame.ring_size(a, b)
    if size == 3:
        return _three_ring(frame, first, second)
    bond = Bond(frame=frame, a=a, b=b)
    if 0 < size <= _LARGEST_RIGID_RING:
        return _in_ring(bond, first, second, size)
    return _in_chain(bond, first, second)


@dataclass(frozen=True, slots=True, kw_only=True)
class Bond:
    """Two neighbouring saturated carbons, the one with fewer protons first.

    Attributes
    ----------
    frame : Frame
    a, b : int
        Carbons.
    """

    frame: Frame
    a: int
    b: int

    @property
    def name(self) -> str:
        """'CH-CH2' and so on."""
        counts = self.frame.n_hydrogens(self.a), self.frame.n_hydrogens(self.b)
        return "-".join(_NAMES[count] for count in counts)

    def hla(self) -> tuple[Floats, Floats]:
        """Mean and spread over the conformers, each (n_a, n_b), Hz."""
        pairs = [
            [self._over_conformers(first, second) for second in self._protons(self.b)]
            for first in self._protons(self.a)
        ]
        found = np.array(pairs)
        return found[..., 0], found[..., 1]

    def place(self, first: int, second: int) -> tuple[int, int]:
        """Row and column of two protons in the arrays."""
        return (
            self._protons(self.a).index(first),
            self._protons(self.b).index(second),
        )

    def _protons(self, carbon: int) -> tuple[int, ...]:
        return self.frame.hydrogens(carbon)

    def _over_conformers(self, first: int, second: int) -> tuple[float, float]:
        values = vicinal_over_conformers_hz(self.frame, first, self.a, self.b, second)
        return self.frame.mean_and_spread(values)


def rotor_mean_hz(frame: Frame, a: int, b: int) -> float:
    """Mean of the HLA equation over the rotamers of a methyl group a or b, Hz."""
    total = sum(electronegativity(frame, atom, a) for atom in frame.others(a, b))
    total += sum(electronegativity(frame, atom, b) for atom in frame.others(b, a))
    return freely_rotating_hz(total)


def _methyl(frame: Frame, a: int, b: int) -> Estimate:
    mean = rotor_mean_hz(frame, a, b)
    kind = f"chain {_NAMES[min(frame.n_hydrogens(a), 3)]}-CH3"
    if kind == "chain CH2-CH3":
        bond = Bond(frame=frame, a=a, b=b)
        mean = _trained_mean_hz(bond, "chain_ch2_ch3", np.array([mean]))
    return Estimate(
        j_hz=mean + models.bias_hz(kind),
        j_sd_hz=_calibrated_sd_hz(kind, 0.35),
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
    angle, _ = frame.mean_and_spread(np.abs(frame.dihedral_deg(first, a, b, second)))
    side = "cis" if angle < 70 else "trans"
    return from_table(f"{name} {side}", "vicinal ring", is_rigid=True)


def _in_ring(bond: Bond, first: int, second: int, size: int) -> Estimate:
    frame = bond.frame
    key = ribose_key(frame, bond.a, bond.b)
    if key is not None:
        return from_table(key, "vicinal ring", is_rigid=True)
    if frame.conformers.is_empty:
        return _without_geometry("vicinal ring", 5.5, 3.3)
    if frame.ring_with(bond.a, bond.b) in frame.open_rings:
        return _open_ring(bond, first, second)
    means, spreads = bond.hla()
    place = bond.place(first, second)
    kind = f"ring{size} {bond.name}"
    value = means[place] + models.bias_hz(kind)
    if bond.name == "CH2-CH2" and _is_trained_ring(bond, size):
        value *= _trained_mean_hz(bond, f"ring{size}_ch2_ch2", means) / means.mean()
    value += _polyol_lack_hz(bond, first, second)
    value += bridging_effect_hz(frame, first, second)
    return Estimate(
        j_hz=float(value),
        j_sd_hz=math.hypot(_RING_RULE_SD_HZ, _CONFORMER_DOUBT * float(spreads[place])),
        kind="vicinal ring",
        is_rigid=True,
        source=_HLA,
    )


def _open_ring(bond: Bond, first: int, second: int) -> Estimate:
    """Relative configuration not drawn: the value belongs to one choice."""
    means, _ = bond.hla()
    return Estimate(
        j_hz=float((means[bond.place(first, second)] + _OPEN_RING_HZ) / 2),
        j_sd_hz=_OPEN_RING_SD_HZ,
        kind="vicinal ring",
        is_rigid=False,
        source=_HLA + ", relative configuration not drawn",
    )


def _is_trained_ring(bond: Bond, size: int) -> bool:
    """Heterocycles of five and six; published values of carbocycles are too few."""
    ring = bond.frame.ring_with(bond.a, bond.b) or ()
    return size in (5, 6) and any(bond.frame.element(i) != 6 for i in ring)


def _polyol_lack_hz(bond: Bond, first: int, second: int) -> float:
    """Correction for trans-diaxial protons between oxygenated carbons of a six-ring."""
    frame = bond.frame
    if frame.ring_size(bond.a, bond.b) != 6 or bond.name != "CH-CH":
        return 0.0
    for carbon in (bond.a, bond.b):
        if not any(frame.element(n) == 8 for n in frame.others(carbon)):
            return 0.0
    angles = np.abs(frame.dihedral_deg(first, bond.a, bond.b, second))
    share, _ = frame.mean_and_spread((angles > 150).astype(np.float64))
    return _POLYOL_LACK_HZ * share


def _in_chain(bond: Bond, first: int, second: int) -> Estimate:
    if bond.name == "CH-CH2":
        value, source = _ch_ch2_hz(bond, second), "trained mean and gap [bmrb2017]"
    elif bond.frame.conformers.is_empty:
        return _without_geometry("vicinal chain", 6.8, 2.3)
    else:
        means, _ = bond.hla()
        value, source = float(means[bond.place(first, second)]), _HLA
        if bond.name == "CH2-CH2":
            mean = _trained_mean_hz(bond, "chain_ch2_ch2", means)
            value, source = value * mean / means.mean(), f"{_HLA}, trained mean"
    return Estimate(
        j_hz=float(value),
        j_sd_hz=_calibrated_sd_hz(f"chain {bond.name}", 1.6),
        kind="vicinal chain",
        is_rigid=False,
        source=source,
    )


def _ch_ch2_hz(bond: Bond, second: int) -> float:
    """Mean and gap from the graph; geometry only hints which proton is which."""
    features = bond_features(bond.frame, bond.a, bond.b)
    mean = _blend_hz("chain_ch_ch2_mean", features)
    gap = max(_blend_hz("chain_ch_ch2_gap", features), 0.0)
    place = bond.frame.hydrogens(bond.b).index(second)
    if bond.frame.conformers.is_empty:
        is_larger = place == 0
    else:
        means, _ = bond.hla()
        is_larger = place == int(np.argmax(means[0]))
    return mean + (gap if is_larger else -gap) / 2


def _blend_hz(name: str, features: Floats) -> float:
    linear = models.linear_model(name).predict(features)
    return (linear + models.base_hz(name) + models.tree_value_hz(name, features)) / 2


def _trained_mean_hz(bond: Bond, name: str, hla: Floats) -> float:
    """HLA mean of the block with trained corrections."""
    features = bond_features(bond.frame, bond.a, bond.b)
    features = np.append(features, hla.mean())
    linear = models.linear_model(name).predict(features)
    correction = (
        linear + models.base_hz(name) + models.tree_value_hz(name, features)
    ) / 2
    return float(hla.mean()) + correction


def _calibrated_sd_hz(kind: str, otherwise_hz: float) -> float:
    if kind in models.known_kinds():
        return models.half_widths(kind).sd_hz
    return otherwise_hz


def _without_geometry(kind: str, j_hz: float, j_sd_hz: float) -> Estimate:
    return Estimate(
        j_hz=j_hz,
        j_sd_hz=j_sd_hz,
        kind=kind,
        is_rigid=False,
        source="mean of published values, no geometry [bmrb2017]",
    )
