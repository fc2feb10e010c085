"""Couplings within aromatic rings and from their side groups, in Hz."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from spinledger.prediction.couplings import models
from spinledger.prediction.couplings.aromatic_features import ring_features
from spinledger.prediction.couplings.estimate import Estimate, from_table
from spinledger.prediction.couplings.frame import Frame

_STEPS = {1: "ortho", 2: "meta", 3: "para"}
_FIVE_RING_NAMES = {8: "furan", 16: "thiophene", 34: "thiophene", 7: "pyrrole"}


def aromatic(frame: Frame, first: int, second: int) -> Estimate | None:
    """Coupling of two protons on one aromatic ring, or between fused rings."""
    a, b = frame.carrier(first), frame.carrier(second)
    if not (frame.is_aromatic(a) and frame.is_aromatic(b)):
        return None
    ring = frame.aromatic_ring_with(a, b)
    if ring is None:
        return _between_rings(frame, a, b)
    rule = ring_rule(frame, ring, (a, b))
    if rule is None:
        return None
    if rule.is_nh:
        return from_table(rule.key, "NH aromatic", is_rigid=False)
    suffix = " five-ring" if len(ring) == 5 else ""
    table = from_table(rule.key, _STEPS[rule.steps] + suffix, is_rigid=True)
    return _refined(frame, ring, (a, b), table, rule)


@dataclass(frozen=True, slots=True, kw_only=True)
class RingRule:
    """Which row of the tables and which trained kind speak for a ring coupling.

    Attributes
    ----------
    key : str
        Row of the rule table.
    steps : int
        1 ortho, 2 meta, 3 para.
    """

    key: str
    steps: int

    @property
    def is_nh(self) -> bool:
        """Whether one proton sits on the ring nitrogen."""
        return self.key.startswith("H-N")

    @property
    def kind(self) -> str:
        """Kind under which models are trained."""
        family = self.key.split()[0]
        family = {"fused": "benzene", "indole": "pyrrole"}.get(family, family)
        name = f"{family} {_STEPS[self.steps]}"
        for special in ("next to N", "across N"):
            if self.key.endswith(special):
                return f"{name} {special}"
        return name

    @property
    def base(self) -> str:
        """Name of the typical value: per position in five-rings, else per kind."""
        six = self.kind.startswith(("benzene", "azine"))
        return self.kind if six else self.key


def ring_rule(
    frame: Frame, ring: tuple[int, ...], pair: tuple[int, int]
) -> RingRule | None:
    """Row of the tables for two atoms of an aromatic ring, None without one.

    Parameters
    ----------
    frame : Frame
    ring : tuple of int
    pair : (int, int)
        Ring atoms that carry the protons.
    """
    gap = abs(ring.index(pair[0]) - ring.index(pair[1]))
    steps = min(gap, len(ring) - gap)
    if 7 in map(frame.element, pair):
        key = "H-N aromatic ring" if steps == 1 else "H-N aromatic ring beta"
        return RingRule(key=key, steps=steps)
    if len(ring) == 5:
        return RingRule(key=_five_ring_key(frame, ring, pair, steps), steps=steps)
    if len(ring) == 6:
        return RingRule(key=_six_ring_key(frame, ring, pair, steps), steps=steps)
    return RingRule(key="seven-ring ortho", steps=1) if steps == 1 else None


def _six_ring_key(
    frame: Frame, ring: tuple[int, ...], pair: tuple[int, int], steps: int
) -> str:
    if any(frame.element(i) != 6 for i in ring):
        return _azine_key(frame, ring, pair, steps)
    fused = _fused_key(frame, ring, pair, steps)
    return fused or f"benzene {_STEPS[steps]}"


def _refined(
    frame: Frame,
    ring: tuple[int, ...],
    pair: tuple[int, int],
    table: Estimate,
    rule: RingRule,
) -> Estimate:
    """Table value with the trained substituent corrections, where there are any."""
    trained = models.trained_ring_kinds()
    if rule.kind not in trained:
        return table
    linear, tree = ring_features(frame, ring, pair)
    columns = np.concatenate([tree, [float(rule.kind == kind) for kind in trained]])
    correction = (
        models.linear_model(rule.kind).predict(linear)
        + models.tree_value_hz("aromatic", columns)
    ) / 2
    return Estimate(
        j_hz=models.base_hz(rule.base) + correction,
        j_sd_hz=models.half_widths(rule.kind).sd_hz,
        kind=table.kind,
        is_rigid=True,
        source=f"trained substituent corrections, {rule.kind} [bmrb2017]",
    )


def _azine_key(
    frame: Frame, ring: tuple[int, ...], pair: tuple[int, int], steps: int
) -> str:
    heteros = [
        {n for n in frame.others(atom) if n in ring and frame.element(n) != 6}
        for atom in pair
    ]
    if steps == 1 and _is_uracil(frame, ring):
        return "uracil ortho"
    if steps == 1:
        return "azine ortho next to N" if any(heteros) else "azine ortho"
    if steps == 3:
        return "azine para"
    if heteros[0] & heteros[1]:
        return "azine meta across N"
    return "azine meta" if any(heteros) else "azine meta beta"


def _is_uracil(frame: Frame, ring: tuple[int, ...]) -> bool:
    """Pyrimidin-2-one with the nitrogen at C6 saturated, as in uracil and cytosine."""
    nitrogens = [i for i in ring if frame.element(i) == 7]
    between = [i for i in ring if all(n in frame.others(i) for n in nitrogens)]
    return (
        len(nitrogens) == 2
        and len(between) == 1
        and frame.is_carbonyl(between[0])
        and any(frame.atom(n).GetTotalDegree() == 3 for n in nitrogens)
    )


def _fused_key(
    frame: Frame, ring: tuple[int, ...], pair: tuple[int, int], steps: int
) -> str | None:
    """Naphthalene-like rings: bond fixation by a six-ring fused to this one."""
    fused = [i for i in ring if _is_fused_aromatic(frame, i, ring)]
    if len(fused) != 2:
        return None
    beside = [any(n in fused for n in frame.others(atom)) for atom in pair]
    if steps == 1:
        return "fused 1-2" if any(beside) else "fused 2-3"
    return "fused meta" if steps == 2 else "fused para"


def _is_fused_aromatic(frame: Frame, atom: int, ring: tuple[int, ...]) -> bool:
    return any(
        atom in other and other != ring and len(other) == 6
        for other in frame.rings
        if all(map(frame.is_aromatic, other))
    )


def _five_ring_key(
    frame: Frame, ring: tuple[int, ...], pair: tuple[int, int], steps: int
) -> str:
    heteros = [i for i in ring if frame.element(i) != 6]
    if len(heteros) > 1:
        return _azole_key(frame, ring, pair, steps)
    element = frame.element(heteros[0]) if heteros else 7
    name = _FIVE_RING_NAMES.get(element, "pyrrole")
    beside = [bool(set(heteros) & set(frame.others(atom))) for atom in pair]
    if steps == 2:
        return f"{name} {'2-5' if all(beside) else '2-4'}"
    if name == "pyrrole" and any(beside) and _has_benzo(frame, ring):
        return "indole 2-3"
    return f"{name} {'2-3' if any(beside) else '3-4'}"


def _has_benzo(frame: Frame, ring: tuple[int, ...]) -> bool:
    return any(_is_fused_aromatic(frame, atom, ring) for atom in ring)


def _azole_key(
    frame: Frame, ring: tuple[int, ...], pair: tuple[int, int], steps: int
) -> str:
    elements = {frame.element(i) for i in ring}
    if steps == 2:
        return "thiazole 2-5" if 16 in elements else "azole meta"
    beside = [n for atom in pair for n in frame.others(atom) if frame.element(n) != 6]
    if 16 in elements:
        return "isothiazole 4-5" if len(beside) == 1 else "thiazole 4-5"
    if 8 in elements:
        return "oxazole 4-5" if len(beside) > 1 else "isoxazole 4-5"
    return "imidazole 4-5" if len(beside) > 1 else "pyrazole 4-5"


def _between_rings(frame: Frame, a: int, b: int) -> Estimate | None:
    """Five bonds along a zigzag over the fusion bond, as H4-H8 of naphthalene."""
    if frame.n_bonds(a, b) != 3:
        return None
    for _, c, d, _ in frame.paths(a, b):
        if frame.aromatic_ring_with(a, c, d) and frame.aromatic_ring_with(c, d, b):
            return from_table("epi zigzag", "five bonds zigzag", is_rigid=True)
    return None


def benzylic(frame: Frame, first: int, second: int) -> Estimate | None:
    """Small coupling of a saturated or formyl CH with a ring proton."""
    a, b = frame.carrier(first), frame.carrier(second)
    if frame.is_aromatic(a):
        a, b = b, a
    if frame.is_aromatic(a) or not frame.is_aromatic(b) or frame.element(b) != 6:
        return None
    anchors = [n for n in frame.others(a) if frame.is_aromatic(n)]
    rings = [(n, frame.aromatic_ring_with(n, b)) for n in anchors]
    found = [(n, ring) for n, ring in rings if ring is not None]
    if len(found) != 1 or frame.element(found[0][0]) != 6:
        return None
    anchor, ring = found[0]
    gap = abs(ring.index(anchor) - ring.index(b))
    steps = min(gap, len(ring) - gap)
    if frame.is_carbonyl(a):
        return _formyl(steps, len(ring))
    if not frame.is_sp3_carbon(a):
        return None
    if len(ring) == 5:
        return (
            from_table("benzylic five-ring", "benzylic", is_rigid=False)
            if steps == 1
            else None
        )
    return from_table(f"benzylic {_STEPS[steps]}", "benzylic", is_rigid=False)


def _formyl(steps: int, size: int) -> Estimate | None:
    if steps == 2 and size == 6:
        return from_table("aldehyde meta", "aldehyde aromatic", is_rigid=False)
    return None
