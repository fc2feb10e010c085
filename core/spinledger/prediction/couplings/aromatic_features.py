"""Numbers that describe the surroundings of two protons on one aromatic ring."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from spinledger.prediction.couplings.frame import Frame

Floats = npt.NDArray[np.float64]

#: Classes of groups at the ring; each has its own increment a position.
GROUPS = (
    "alkyl",
    "alkyl with hetero atom",
    "aryl",
    "vinyl",
    "CN",
    "acyl",
    "N aromatic",
    "NO2",
    "N+",
    "N acyl",
    "N",
    "O",
    "S",
    "SO2",
    "F",
    "Cl",
    "Br",
    "I",
    "other",
)
#: Huggins electronegativity above hydrogen, as used by the 1980 HLA equation.
_HUGGINS = {
    6: 0.4,
    7: 0.85,
    8: 1.3,
    9: 1.7,
    16: 0.4,
    17: 0.95,
    35: 0.75,
    53: 0.45,
    5: -0.2,
    14: -0.3,
    15: -0.05,
    34: 0.35,
}
#: Rough pi acceptor (+) and donor (-) strength of the groups.
_PI = {
    "aryl": 0.3,
    "vinyl": 0.3,
    "CN": 1.0,
    "acyl": 1.0,
    "NO2": 1.0,
    "SO2": 1.0,
    "N aromatic": -0.3,
    "N acyl": -0.6,
    "N": -1.0,
    "O": -1.0,
    "S": -0.5,
    "F": -0.5,
    "Cl": -0.3,
}
_HALOGENS = {9: "F", 17: "Cl", 35: "Br", 53: "I"}
_N_RING, _N_PHYSICAL = 7, 5


def ring_features(
    frame: Frame, ring: Sequence[int], pair: tuple[int, int]
) -> tuple[Floats, Floats]:
    """Features of the linear and of the tree model.

    Parameters
    ----------
    frame : Frame
    ring : sequence of int
        Aromatic ring that holds both atoms.
    pair : (int, int)
        Ring atoms that carry the two protons.

    Returns
    -------
    tuple of numpy.ndarray
        Shapes (n_linear,) and (n_tree,). Ring positions outward from the pair
        enter as sum (and for trees as absolute difference) of the two sides,
        so that exchanging the pair changes nothing.
    """
    between, first_side, second_side = _walk(ring, pair)
    linear: list[Floats] = []
    tree: list[Floats] = []
    for step in range(3):
        sides = [
            _position(frame, ring, side[step]) if step < len(side) else _NOTHING
            for side in (first_side, second_side)
        ]
        sums = [left + right for left, right in zip(*sides, strict=True)]
        gaps = [abs(left - right) for left, right in zip(*sides, strict=True)]
        linear += sums
        tree += [sums[0], sums[2], gaps[0], gaps[2]]
    inner = [
        np.sum(parts, axis=0)
        for parts in zip(*(_position(frame, ring, i) for i in between), strict=True)
    ] or list(_NOTHING)
    linear += inner
    sizes = np.array([len(ring), len(between) + 1, len(_aromatic_rings(frame))])
    tree += [inner[0], inner[2], sizes.astype(np.float64)]
    return np.concatenate(linear), np.concatenate(tree)


_NOTHING: tuple[Floats, Floats, Floats] = (
    np.zeros(_N_RING),
    np.zeros(len(GROUPS)),
    np.zeros(_N_PHYSICAL),
)


def _walk(
    ring: Sequence[int], pair: tuple[int, int]
) -> tuple[list[int], list[int], list[int]]:
    """Atoms between the pair on the short way, and outward from either."""
    size = len(ring)
    start, end = ring.index(pair[0]), ring.index(pair[1])
    steps = (end - start) % size
    if steps > size - steps:
        start, steps = end, size - steps
    between = [ring[(start + k) % size] for k in range(1, steps)]
    outside = range(1, size - steps)
    first_side = [ring[(start - k) % size] for k in outside]
    second_side = [ring[(start + steps + k) % size] for k in outside]
    return between, first_side, second_side


def _aromatic_rings(frame: Frame) -> list[tuple[int, ...]]:
    return [ring for ring in frame.rings if all(map(frame.is_aromatic, ring))]


def _position(
    frame: Frame, ring: Sequence[int], index: int
) -> tuple[Floats, Floats, Floats]:
    """Ring atom, group class and physical numbers of one ring position."""
    element = frame.element(index)
    outside = frame.others(index, *ring)
    is_fused = sum(index in other for other in frame.rings) > 1
    is_fused_aromatic = is_fused and any(
        index in other and set(other) != set(ring) for other in _aromatic_rings(frame)
    )
    atom = np.array(
        [
            element == 7,
            element == 8,
            element == 16,
            frame.atom(index).GetFormalCharge(),
            element == 7 and frame.n_hydrogens(index) > 0,
            is_fused_aromatic,
            is_fused and not is_fused_aromatic,
        ],
        dtype=np.float64,
    )
    groups = np.zeros(len(GROUPS))
    if not outside:
        return atom, groups, np.zeros(_N_PHYSICAL)
    group = ring_group(frame, index, outside[0])
    if not is_fused_aromatic:
        groups[GROUPS.index(group)] = 1.0
    return atom, groups, _physical(frame, index, outside[0], group)


def _physical(frame: Frame, index: int, outside: int, group: str) -> Floats:
    beyond = frame.others(outside, index)
    charge = sum(frame.atom(i).GetFormalCharge() for i in (outside, *beyond))
    return np.array(
        [
            _HUGGINS.get(frame.element(outside), 0.4),
            _PI.get(group, 0.0),
            charge,
            1.0,
            len(beyond),
        ],
        dtype=np.float64,
    )


def ring_group(frame: Frame, ring_atom: int, outside: int) -> str:
    """Class of a group at an aromatic ring, one of ``GROUPS``."""
    element = frame.element(outside)
    if element == 6:
        return _carbon_group(frame, ring_atom, outside)
    if element == 7:
        return _nitrogen_group(frame, ring_atom, outside)
    if element == 8:
        return "O"
    if element == 16:
        return "SO2" if frame.atom(outside).GetTotalDegree() > 2 else "S"
    return _HALOGENS.get(element, "other")


def _carbon_group(frame: Frame, ring_atom: int, outside: int) -> str:
    if frame.is_aromatic(outside):
        return "aryl"
    beyond = frame.others(outside, ring_atom)
    orders = {n: frame.bond_order(outside, n) for n in beyond}
    if 3 in orders.values():
        return "CN"
    doubled = [n for n, order in orders.items() if order == 2]
    if doubled:
        hetero = any(frame.element(n) in (7, 8, 16) for n in doubled)
        return "acyl" if hetero else "vinyl"
    has_hetero = any(frame.element(n) in (7, 8, 9, 17) for n in beyond)
    return "alkyl with hetero atom" if has_hetero else "alkyl"


def _nitrogen_group(frame: Frame, ring_atom: int, outside: int) -> str:
    if frame.is_aromatic(outside):
        return "N aromatic"
    beyond = frame.others(outside, ring_atom)
    if frame.atom(outside).GetFormalCharge() > 0:
        return "NO2" if any(frame.element(n) == 8 for n in beyond) else "N+"
    is_acyl = any(
        frame.element(far) in (8, 16) and frame.bond_order(near, far) == 2
        for near in beyond
        for far in frame.others(near, outside)
    )
    return "N acyl" if is_acyl else "N"
