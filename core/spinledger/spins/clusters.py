"""Cuts of large spin systems: overlapping clusters, each exact inside; Hz."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from itertools import product
from math import inf

import numpy as np
import numpy.typing as npt

from spinledger.spins.basis import spin_content
from spinledger.spins.merging import SpinPart

Floats = npt.NDArray[np.float64]


# Steepest slope of a Lorentz line of 1 Hz full width, as a share of its height
# per Hz: 3 sqrt(3) / 4. Turns a displacement into an error of the spectrum.
_STEEPEST_SLOPE = 1.299

# The estimates are of first order; on 75 random chains
# and rings of 7 to 9 spins the true error was at most 0.62 times the bound.
_SAFETY = 1.5


@dataclass(frozen=True, slots=True, kw_only=True)
class Effort:
    """How much a simulation may cost.

    Attributes
    ----------
    exact_cost : float
        Parts up to this cost (about microseconds of diagonalising on one
        2020s core) are solved whole.
    cluster_cost : float
        Largest cost of one cluster of a part that is cut.
    tolerance_hz : float, Hz
        Spins whose estimated effect on a line is smaller are left out.
    flip_tolerance_hz : float, Hz
        Spins whose flip-flop terms have a smaller effect go without them; what
        these do in the mean is put in by moving their partners.
    smallest : float
        Lines below this share of their claim are dropped (sums are restored).
    bin_hz : float, Hz
        Lines of one claim closer than this are merged at their centroid.
    """

    exact_cost: float = 40_000.0
    cluster_cost: float = 8_000.0
    tolerance_hz: float = 0.01
    flip_tolerance_hz: float = 0.05
    smallest: float = 1e-5
    bin_hz: float = 0.02


FULL_EFFORT = Effort()
QUICK_EFFORT = Effort(
    exact_cost=4_000.0,
    cluster_cost=1_500.0,
    tolerance_hz=0.2,
    flip_tolerance_hz=0.2,
    smallest=3e-4,
    bin_hz=0.2,
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Cluster:
    """Some sites of a part, solved together.

    Attributes
    ----------
    members : tuple of int
        Site numbers, ascending.
    weak : frozenset of int
        Members that couple through I_z I_z alone (their exchange of spin with
        the rest changes no detected line by more than the tolerance).
    detected : tuple of int
        Members whose lines are taken from here.
    error_share : float
        Estimated error by what was left out, as a share of the tallest line at
        1 Hz width.
    """

    members: tuple[int, ...]
    weak: frozenset[int]
    detected: tuple[int, ...]
    error_share: float


def diagonalisation_cost(n_spins: tuple[int, ...], species: tuple[int, ...]) -> float:
    """Cost of diagonalising all blocks, about microseconds (fitted, +- 20 %)."""
    kinds: dict[int, list[int]] = {}
    for n, label in zip(n_spins, species, strict=True):
        kinds.setdefault(label, []).append(n)
    return _cost_of_kinds(tuple(sorted(tuple(sorted(n)) for n in kinds.values())))


@lru_cache(maxsize=16384)
def _cost_of_kinds(kinds: tuple[tuple[int, ...], ...]) -> float:
    """Cost for the particles of every species, in any order."""
    sizes = np.array([1.0])
    weights = np.array([1.0])
    for n_spins in kinds:
        here, counts = _block_sizes(n_spins)
        sizes = np.multiply.outer(sizes, here).ravel()
        weights = np.multiply.outer(weights, counts).ravel()
    # Measured with OpenBLAS on one core; only the ratio of parts matters.
    cost = 10.0 + 1.1 * sizes + 0.09 * sizes**2 + 2.5e-4 * sizes**3
    return 1.0 + float(weights @ cost)


@lru_cache(maxsize=4096)
def _block_sizes(n_spins: tuple[int, ...]) -> tuple[Floats, Floats]:
    """Distinct block sizes and how many blocks have each."""
    found: dict[int, int] = {}
    for chosen in product(*(spin_content(n) for n in n_spins)):
        distribution = np.ones(1)
        for twice_s, _ in chosen:
            distribution = np.convolve(distribution, np.ones(twice_s + 1))
        for size in distribution.astype(int).tolist():
            found[size] = found.get(size, 0) + 1
    sizes = sorted(found)
    return np.array(sizes, dtype=float), np.array(
        [found[s] for s in sizes], dtype=float
    )


def part_cost(part: SpinPart) -> float:
    """Cost of solving a part whole; infinite where counting it is hopeless."""
    if sum(len(spin_content(site.n_spins)) > 1 for site in part.sites) > 10:
        return inf
    if len(part.sites) > 24:
        return inf
    return diagonalisation_cost(
        tuple(site.n_spins for site in part.sites),
        tuple(site.species for site in part.sites),
    )


def cut_part(
    part: SpinPart,
    frequencies_hz: Floats,
    couplings_hz: Floats,
    *,
    effort: Effort,
) -> tuple[Cluster, ...]:
    """Clusters that together detect every proton site of a part once.

    Parameters
    ----------
    part : SpinPart
    frequencies_hz : numpy.ndarray, shape (n_sites,), Hz
    couplings_hz : numpy.ndarray, shape (n_bonds,), Hz
    effort : Effort

    Notes
    -----
    For each detected site i, the effect of a site k that hangs on j is
    estimated as effect(j) theta_jk^2 + following(j) |J_jk|, theta = J / D, D =
    hypot(J, nu_j - nu_k): k matters if it mixes with a partner of i, or if it
    moves a site that i's lines follow. They follow j by theta_ij^2 along the
    path, and by effect(j) theta_jk^2 / 2 D where j and k are mixed, since
    moving one of them turns the mixture. Sites are taken by falling effect
    while they fit; a site whose flip-flop effect is under its tolerance takes
    part through I_z I_z alone, which is cheap.
    """
    network = _Mixing(part, frequencies_hz, couplings_hz)
    protons = [k for k, site in enumerate(part.sites) if site.claim is not None]
    single = [_grow(network, site, effort) for site in protons]
    single.sort(key=lambda c: (-_cost(part, c.members, c.weak), c.detected))
    merged: list[Cluster] = []
    for cluster in single:
        for index, other in enumerate(merged):
            union = _union(part, other, cluster, effort=effort)
            if union is not None:
                merged[index] = union
                break
        else:
            merged.append(cluster)
    return tuple(merged)


class _Mixing:
    """Couplings and mixing of a part as dense tables."""

    def __init__(
        self, part: SpinPart, frequencies_hz: Floats, couplings_hz: Floats
    ) -> None:
        n_sites = len(part.sites)
        self.part = part
        self.coupling = np.zeros((n_sites, n_sites))
        self.theta = np.zeros((n_sites, n_sites))
        # How fast the mixture of two sites turns, per Hz: theta^2 over their
        # distance hypot(J, nu_a - nu_b).
        self.turning = np.zeros((n_sites, n_sites))
        for bond, value in zip(part.bonds, couplings_hz.tolist(), strict=True):
            a, b = bond.first, bond.second
            mixing = 0.0
            if part.sites[a].species == part.sites[b].species and value:
                gap = frequencies_hz[a] - frequencies_hz[b]
                distance = float(np.hypot(value, gap))
                mixing = abs(value) / distance
                self.turning[a, b] = self.turning[b, a] = mixing**2 / distance
            self.coupling[a, b] = self.coupling[b, a] = abs(value)
            self.theta[a, b] = self.theta[b, a] = mixing


@dataclass(frozen=True, slots=True, eq=False)
class _Reach:
    """What every site does to the lines of one site.

    Attributes
    ----------
    effect : numpy.ndarray, Hz
        Displacement if the site were left out.
    mixing : numpy.ndarray
        Product of theta along the path.
    """

    effect: Floats
    mixing: Floats


def _reach(network: _Mixing, origin: int) -> _Reach:
    n_sites = network.theta.shape[0]
    effect, mixing = np.zeros(n_sites), np.zeros(n_sites)
    # Displacement of the lines for each Hz that a site is moved.
    following = np.zeros(n_sites)
    effect[origin] = inf
    mixing[origin] = following[origin] = 1.0
    done = np.zeros(n_sites, dtype=bool)
    for _ in range(n_sites):
        open_effect = np.where(done, -1.0, effect)
        j = int(open_effect.argmax())
        if open_effect[j] <= 0.0:
            break
        done[j] = True
        carried = 0.0 if j == origin else effect[j]
        theta = network.theta[j]
        # Moving one of two mixed sites turns their mixture.
        turning = 0.5 * carried * network.turning[j]
        following[j] = max(following[j], float(turning.max()))
        onward = carried * theta**2 + following[j] * network.coupling[j]
        effect = np.where(done, effect, np.maximum(effect, onward))
        mixing = np.where(done, mixing, np.maximum(mixing, mixing[j] * theta))
        passed = np.maximum(following[j] * theta**2, turning)
        following = np.where(done, following, np.maximum(following, passed))
    return _Reach(effect, mixing)


def _flip_effects(network: _Mixing, reach: _Reach, origin: int) -> Floats:
    """Displacement of the detected lines if a site's flip-flop terms are left out."""
    carried = reach.effect.copy()
    carried[origin] = 0.0
    theta, coupling = network.theta, network.coupling
    through = carried[:, None] * theta**2
    through += reach.mixing[:, None] * coupling * theta
    flips: Floats = through.max(axis=0)
    return flips


def _grow(network: _Mixing, origin: int, effort: Effort) -> Cluster:
    reach = _reach(network, origin)
    flips = _flip_effects(network, reach, origin)
    order = [int(k) for k in np.argsort(-reach.effect, kind="stable")]
    part = network.part
    members = [origin]
    weak: set[int] = set()
    left_out, unflipped = 0.0, 0.0
    for k in order[1:]:
        if reach.effect[k] < effort.tolerance_hz:
            left_out += float(reach.effect[k])
            continue
        for is_weak in (flips[k] < effort.flip_tolerance_hz, True):
            trial = frozenset(weak | {k}) if is_weak else frozenset(weak)
            if _cost(part, (*members, k), trial) <= effort.cluster_cost:
                members.append(k)
                weak = set(trial)
                unflipped += _unflipped_error(network, reach, k, flips) * is_weak
                break
        else:
            left_out += float(reach.effect[k])
    return Cluster(
        members=tuple(sorted(members)),
        weak=frozenset(weak),
        detected=(origin,),
        error_share=_SAFETY * (_STEEPEST_SLOPE * left_out + unflipped),
    )


def _unflipped_error(
    network: _Mixing, reach: _Reach, site: int, flips: Floats
) -> float:
    """Share of error by a site without flip-flop terms: places and intensities."""
    intensities = float((reach.mixing * network.theta[:, site]).max())
    return _STEEPEST_SLOPE * float(flips[site]) + intensities


def _cost(part: SpinPart, members: tuple[int, ...], weak: frozenset[int]) -> float:
    return diagonalisation_cost(
        tuple(part.sites[k].n_spins for k in members),
        tuple(1000 + k if k in weak else part.sites[k].species for k in members),
    )


def _union(
    part: SpinPart, first: Cluster, second: Cluster, *, effort: Effort
) -> Cluster | None:
    """Both in one, if that is allowed and cheaper than one after the other."""
    members = tuple(sorted(set(first.members) | set(second.members)))
    strong = (set(first.members) - first.weak) | (set(second.members) - second.weak)
    weak = frozenset(set(members) - strong)
    cost = _cost(part, members, weak)
    apart = _cost(part, first.members, first.weak) + _cost(
        part, second.members, second.weak
    )
    if cost > effort.cluster_cost or cost > apart:
        return None
    return Cluster(
        members=members,
        weak=weak,
        detected=tuple(sorted(set(first.detected) | set(second.detected))),
        error_share=max(first.error_share, second.error_share),
    )
