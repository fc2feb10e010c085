"""First-order splitting trees, held against the exact spectrum; Hz."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass
from math import comb

import numpy as np
import numpy.typing as npt

from spinledger.spins.first_order import Sticks, is_read_off, owned_lines
from spinledger.spins.multiplicity import multiplicity_of
from spinledger.spins.network import ClaimNetwork
from spinledger.spins.synthesis import (
    FrequencyAxis,
    LineList,
    LineShape,
    add_to,
    draw,
)
from spinledger.values.arrays import locked_floats
from spinledger.values.claim import ClaimSet

Floats = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]


@dataclass(frozen=True, slots=True, kw_only=True)
class TreeLevel:
    """One splitting: ``n_spins`` partners that split by the same J.

    Attributes
    ----------
    coupling_hz : float, Hz
        |J|; the mean where J of different partners coincide.
    n_spins : int
    partners : tuple of str
        Claim labels, or the nucleus of a hetero partner.
    couplings : tuple of int
        Coupling parameters.
    is_accidental : bool
        Different couplings that happen to be equal within the resolution.
    """

    coupling_hz: float
    n_spins: int
    partners: tuple[str, ...]
    couplings: tuple[int, ...]
    is_accidental: bool


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Tree:
    """Splitting tree of one claim beside its exact lines.

    Attributes
    ----------
    claim : str
    centre_hz : float, Hz
    levels : tuple of TreeLevel
        Largest J first.
    leaves_hz, leaf_protons : numpy.ndarray, shape (n_leaves,)
        First-order lines, by rising frequency.
    lines_hz, line_protons : numpy.ndarray, shape (n_lines,)
        Exact lines.
    departure : float
        Half the area between exact and first-order spectrum at the given line
        width, as a share of the claim: 0 the same, 1 nothing in common.
    roof : float
        Exact intensity above the centre minus that below, as a share.
    is_first_order : bool
        Every line stands at a leaf and every leaf has its line, so that the
        spacings read J; a common displacement of all lines and unequal
        intensities (the roof) are allowed.
    spin_system : str or None
        "AA'XX'" or "AA'BB'" where the claim is half of one.
    multiplicity : str
    """

    claim: str
    centre_hz: float
    levels: tuple[TreeLevel, ...]
    leaves_hz: Floats
    leaf_protons: Floats
    lines_hz: Floats
    line_protons: Floats
    departure: float
    roof: float
    is_first_order: bool
    spin_system: str | None
    multiplicity: str

    def __post_init__(self) -> None:
        for name in ("leaves_hz", "leaf_protons", "lines_hz", "line_protons"):
            object.__setattr__(self, name, locked_floats(getattr(self, name), name))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Resolution:
    """How finely a measured multiplet can be read.

    Attributes
    ----------
    width_hz : float, Hz
        Full width of a line; splittings under half of it are not resolved.
    determined : numpy.ndarray of bool or None, shape (n_couplings,)
        Couplings that are known; a resolved splitting by an unknown one makes
        the multiplicity "m".
    """

    width_hz: float = 1.0
    determined: Flags | None = None


def splitting_tree(
    claims: ClaimSet | ClaimNetwork,
    claim_index: int,
    shifts_hz: Floats,
    couplings_hz: Floats,
    *,
    resolution: Resolution | None = None,
    absent: frozenset[int] = frozenset(),
) -> Tree:
    """Tree of one claim from the parameters that its exact lines come from.

    Parameters
    ----------
    claims : ClaimSet or ClaimNetwork
        A network saves compiling where several trees are wanted.
    claim_index : int
    shifts_hz : numpy.ndarray, shape (n_claims,), Hz
    couplings_hz : numpy.ndarray, shape (n_couplings,), Hz
    resolution : Resolution, optional
        1 Hz width and all couplings known if not given.
    absent : frozenset of int
        Exchangeable claims that are not there and split nothing.

    Raises
    ------
    ValueError
        If the claim is silent: it has no particle.
    """
    network = claims if isinstance(claims, ClaimNetwork) else ClaimNetwork(claims)
    fine = resolution or Resolution()
    without = frozenset(absent) - {claim_index}
    splittings = _splittings(network.claims, claim_index, without)
    levels = _levels(splittings, couplings_hz, 0.5 * fine.width_hz)
    claim = network.claims.claims[claim_index]
    centre = float(shifts_hz[claim_index])
    leaves, weights = _leaves(centre, levels)
    plan = network.plan(shifts_hz, couplings_hz, without=without)
    exact = network.lines(shifts_hz, couplings_hz, plan=plan)
    own = exact.claim == claim_index
    lines, protons = exact.frequencies_hz[own], exact.protons[own]
    leaf_protons = weights * float(protons.sum())
    system = _spin_system(network.claims, claim_index, shifts_hz, couplings_hz)
    is_first_order = is_read_off(
        Sticks(leaves, leaf_protons),
        owned_lines(exact, claim_index, bin_hz=plan.effort.bin_hz),
        width_hz=fine.width_hz,
        largest_shift_hz=0.5 * max((level.coupling_hz for level in levels), default=0),
    ) and (system is None or _is_one_triplet(levels))
    return Tree(
        claim=claim.label,
        centre_hz=centre,
        levels=levels,
        leaves_hz=leaves,
        leaf_protons=leaf_protons,
        lines_hz=lines,
        line_protons=protons,
        departure=_departure(
            Sticks(leaves, leaf_protons), Sticks(lines, protons), fine.width_hz
        ),
        roof=_roof(lines, protons, centre),
        is_first_order=is_first_order,
        spin_system=system,
        multiplicity=multiplicity_of(
            [(level.n_spins, level.is_accidental) for level in levels],
            is_first_order=is_first_order and _all_known(levels, fine),
            spin_system=system,
        ),
    )


def first_order_levels(
    claims: ClaimSet,
    claim_index: int,
    couplings_hz: Floats,
    *,
    finest_hz: float,
    absent: frozenset[int] = frozenset(),
) -> tuple[TreeLevel, ...]:
    """Levels of a claim's tree alone, without the exact spectrum.

    Parameters
    ----------
    claims : ClaimSet
    claim_index : int
    couplings_hz : numpy.ndarray, shape (n_couplings,), Hz
        NaN where a coupling is not known; it makes no level.
    finest_hz : float, Hz
        Couplings under this, or closer than this, are not told apart.
    absent : frozenset of int
        Exchangeable claims that are not there and split nothing.

    Returns
    -------
    tuple of TreeLevel
        Largest J first; the same that `splitting_tree` draws.

    Raises
    ------
    ValueError
        If the claim is silent: it has no particle.
    """
    splittings = _splittings(claims, claim_index, frozenset(absent) - {claim_index})
    known = tuple(s for s in splittings if np.isfinite(couplings_hz[s.coupling]))
    return _levels(known, couplings_hz, finest_hz)


def first_order_lines(
    centre_hz: float, levels: tuple[TreeLevel, ...]
) -> tuple[Floats, Floats]:
    """Places (Hz, rising) and shares (sum 1) of the leaves of some levels."""
    return _leaves(centre_hz, levels)


@dataclass(frozen=True, slots=True)
class _Splitting:
    """One coupling of the claim's first particle to spins of one kind."""

    coupling: int
    n_spins: int
    partner: str


def _splittings(
    claims: ClaimSet, claim_index: int, without: frozenset[int]
) -> tuple[_Splitting, ...]:
    own = [k for k, p in enumerate(claims.particles) if p.claim == claim_index]
    if not own:
        raise ValueError(
            f"claim_index: {claims.claims[claim_index].label} is silent, it has no tree"
        )
    found: dict[tuple[int, str], int] = defaultdict(int)
    for index, coupling in enumerate(claims.couplings):
        for a, b in coupling.pairs:
            if own[0] not in (a, b):
                continue
            partner = claims.particles[b if a == own[0] else a]
            if partner.claim == claim_index:
                continue
            if partner.claim is None:
                name = partner.nucleus
            elif (
                partner.claim in without
                and claims.claims[partner.claim].is_exchangeable
            ):
                continue
            else:
                name = claims.claims[partner.claim].label
            found[index, name] += partner.n_spins
    return tuple(_Splitting(k, n, name) for (k, name), n in found.items())


def _levels(
    splittings: tuple[_Splitting, ...], couplings_hz: Floats, finest_hz: float
) -> tuple[TreeLevel, ...]:
    """Levels by falling J; couplings closer than can be resolved coalesce."""
    ordered = sorted(splittings, key=lambda s: -abs(float(couplings_hz[s.coupling])))
    groups: list[list[_Splitting]] = []
    for one in ordered:
        size = abs(float(couplings_hz[one.coupling]))
        if size < finest_hz:
            continue
        if groups and _mean(groups[-1], couplings_hz) - size < finest_hz:
            groups[-1].append(one)
        else:
            groups.append([one])
    return tuple(
        TreeLevel(
            coupling_hz=_mean(group, couplings_hz),
            n_spins=sum(one.n_spins for one in group),
            partners=tuple(one.partner for one in group),
            couplings=tuple(one.coupling for one in group),
            is_accidental=len({one.coupling for one in group}) > 1,
        )
        for group in groups
    )


def _mean(group: list[_Splitting], couplings_hz: Floats) -> float:
    total = sum(one.n_spins * abs(float(couplings_hz[one.coupling])) for one in group)
    return total / sum(one.n_spins for one in group)


def _leaves(centre_hz: float, levels: tuple[TreeLevel, ...]) -> tuple[Floats, Floats]:
    leaves, weights = np.array([centre_hz]), np.ones(1)
    for level in levels:
        n = level.n_spins
        steps = (np.arange(n + 1) - n / 2.0) * level.coupling_hz
        shares = np.array([comb(n, k) for k in range(n + 1)]) / 2.0**n
        leaves = np.add.outer(leaves, steps).ravel()
        weights = np.multiply.outer(weights, shares).ravel()
    order = np.argsort(leaves, kind="stable")
    return leaves[order], weights[order]


def _departure(tree: Sticks, exact: Sticks, width_hz: float) -> float:
    """Half the area between both spectra over the area of the claim."""
    both = np.concatenate([tree.frequencies, exact.frequencies])
    step = width_hz / 8.0
    margin = 20.0 * width_hz
    n_points = int((float(np.ptp(both)) + 2.0 * margin) / step) + 2
    axis = FrequencyAxis(
        first_hz=float(both.max()) + margin, step_hz=step, n_points=n_points
    )
    difference = np.zeros(n_points)
    for sticks, sign in ((tree, 1.0), (exact, -1.0)):
        lines = LineList(frequencies_hz=sticks.frequencies, protons=sticks.protons)
        images = draw(lines, axis, width_hz=width_hz, shape=LineShape())
        add_to(difference, images, amplitude=sign)
    return float(0.5 * np.abs(difference).sum() * step / tree.protons.sum())


def _roof(lines: Floats, protons: Floats, centre_hz: float) -> float:
    total = float(np.abs(protons).sum())
    return float((protons * np.sign(lines - centre_hz)).sum()) / total


def _is_one_triplet(levels: tuple[TreeLevel, ...]) -> bool:
    """J and J' run together: the only first-order look of half a four-spin system."""
    return len(levels) == 1 and levels[0].n_spins == 2


def _all_known(levels: tuple[TreeLevel, ...], fine: Resolution) -> bool:
    if fine.determined is None:
        return True
    return all(bool(fine.determined[k]) for level in levels for k in level.couplings)


# Above this many times its couplings a shift difference makes X of B.
_WEAK_RATIO = 10.0


def _spin_system(
    claims: ClaimSet, claim_index: int, shifts_hz: Floats, couplings_hz: Floats
) -> str | None:
    """Name of the four-spin system that the claim is half of, if it is."""
    own = [k for k, p in enumerate(claims.particles) if p.claim == claim_index]
    links: dict[int, set[int]] = defaultdict(set)
    by_pair: dict[tuple[int, int], int] = {}
    for index, coupling in enumerate(claims.couplings):
        for a, b in coupling.pairs:
            links[a].add(b)
            links[b].add(a)
            by_pair[min(a, b), max(a, b)] = index
    members = set(own)
    for k in own:
        members |= links[k]
    others = {claims.particles[k].claim for k in members} - {claim_index}
    if len(own) != 2 or len(members) != 4 or len(others) != 1 or None in others:
        return None
    if any(claims.particles[k].n_spins != 1 for k in members):
        return None
    if any(not links[k] <= members for k in members):
        return None
    partners = sorted(members - set(own))
    across = {by_pair.get((min(own[0], k), max(own[0], k))) for k in partners}
    if len(across) != 2:
        return None
    largest = max(abs(float(couplings_hz[k])) for k in across if k is not None)
    other = others.pop()
    gap = abs(float(shifts_hz[claim_index] - shifts_hz[other or 0]))
    return "AA′XX′" if gap > _WEAK_RATIO * largest else "AA′BB′"
