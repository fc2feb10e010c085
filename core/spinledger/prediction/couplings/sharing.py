"""Coupling parameters from pair estimates: sharing by symmetry and swap partners."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

from spinledger.prediction.couplings.estimate import Estimate
from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.symmetry import Key, PairSymmetry
from spinledger.values.claim import CouplingClaim, Particle

#: Couplings over four bonds and more that are smaller than this are left out.
SMALLEST_HZ = 0.15

Group = tuple[str, int]


@dataclass(frozen=True, slots=True, kw_only=True)
class PairEstimate:
    """Estimate of one particle pair.

    Attributes
    ----------
    pair : (int, int)
        Particle indices.
    bonds : int
    estimate : Estimate
    """

    pair: tuple[int, int]
    bonds: int
    estimate: Estimate


def merged(estimates: Iterable[Estimate]) -> Estimate:
    """Mean of estimates that fast motion or symmetry averages."""
    items = list(estimates)
    j_hz = math.fsum(item.j_hz for item in items) / len(items)
    sd_hz = math.fsum(item.j_sd_hz for item in items) / len(items)
    return replace(items[0], j_hz=j_hz, j_sd_hz=sd_hz)


def shared_couplings(
    frame: Frame, particles: Sequence[Particle], found: Sequence[PairEstimate]
) -> tuple[CouplingClaim, ...]:
    """One coupling claim for every set of pairs that symmetry makes the same.

    Parameters
    ----------
    frame : Frame
    particles : sequence of Particle
    found : sequence of PairEstimate

    Returns
    -------
    tuple of CouplingClaim
        Sorted by bonds, then by pairs, with swap partners linked.
    """
    groups = _particle_groups(frame, particles)
    buckets: dict[tuple[Group, Group, int], list[PairEstimate]] = defaultdict(list)
    for item in found:
        first, second = sorted(groups[index] for index in item.pair)
        buckets[first, second, item.bonds].append(item)
    symmetry = PairSymmetry(frame)
    claims = [
        _claim(members)
        for bucket in buckets.values()
        for members in _classes(bucket, particles, groups, symmetry)
    ]
    kept = [c for c in claims if c.bonds <= 3 or abs(c.j_hz) >= SMALLEST_HZ]
    kept.sort(key=lambda claim: (claim.bonds, claim.pairs))
    return _linked(kept, frame, particles, groups)


def _particle_groups(frame: Frame, particles: Sequence[Particle]) -> list[Group]:
    """Claim of each particle, or the constitutional class of a hetero nucleus."""
    ranks = frame.constitutional_ranks
    return [
        ("claim", particle.claim)
        if particle.claim is not None
        else (particle.nucleus, ranks[particle.hydrogens[0]])
        for particle in particles
    ]


def _classes(
    bucket: list[PairEstimate],
    particles: Sequence[Particle],
    groups: Sequence[Group],
    symmetry: PairSymmetry,
) -> list[list[PairEstimate]]:
    """Split pairs of the same two claims into those that symmetry exchanges.

    Particles of one claim that symmetry does not exchange are averaged by
    something else, a tautomer for instance, and then so are their couplings.
    """
    if len(bucket) == 1 or _is_averaged(bucket, particles, groups, symmetry):
        return [bucket]
    classes: dict[Key, list[PairEstimate]] = defaultdict(list)
    for item in bucket:
        first, second = sorted(item.pair, key=lambda index: groups[index])
        key = symmetry.pair_key(
            particles[first],
            particles[second],
            is_ordered=groups[first] != groups[second],
        )
        classes[key].append(item)
    return list(classes.values())


def _is_averaged(
    bucket: list[PairEstimate],
    particles: Sequence[Particle],
    groups: Sequence[Group],
    symmetry: PairSymmetry,
) -> bool:
    keys: dict[Group, set[Key]] = defaultdict(set)
    for item in bucket:
        for index in item.pair:
            if groups[index][0] == "claim":
                keys[groups[index]].add(symmetry.particle_key(particles[index]))
    return any(len(found) > 1 for found in keys.values())


def _claim(members: list[PairEstimate]) -> CouplingClaim:
    estimate = merged(item.estimate for item in members)
    return CouplingClaim(
        pairs=tuple(sorted(item.pair for item in members)),
        j_hz=round(estimate.j_hz, 3),
        j_sd_hz=round(estimate.j_sd_hz, 3),
        kind=estimate.kind,
        bonds=members[0].bonds,
        is_rigid=estimate.is_rigid,
        source=estimate.source,
    )


def _linked(
    claims: Sequence[CouplingClaim],
    frame: Frame,
    particles: Sequence[Particle],
    groups: Sequence[Group],
) -> tuple[CouplingClaim, ...]:
    """The claims with their swap partners filled in."""
    ends = [
        tuple(sorted(groups[index] for index in claim.pairs[0])) for claim in claims
    ]
    partners = _primed_partners(claims, ends)
    diastereotopic = _diastereotopic_groups(frame, particles, groups)
    for index in range(len(claims)):
        if index not in partners:
            other = _exchanged(index, claims, ends, diastereotopic)
            if other is not None and other not in partners:
                partners[index], partners[other] = other, index
    return tuple(
        replace(claim, swaps_with=partners.get(index))
        for index, claim in enumerate(claims)
    )


def _primed_partners(
    claims: Sequence[CouplingClaim], ends: Sequence[tuple[Group, ...]]
) -> dict[int, int]:
    """J and J' between the same two groups: over as many bonds, or the only two."""
    partners: dict[int, int] = {}
    by_ends: dict[tuple[Group, ...], list[int]] = defaultdict(list)
    for index, end in enumerate(ends):
        if claims[index].bonds >= 3:
            by_ends[end].append(index)
    for end, indices in by_ends.items():
        by_bonds: dict[int, list[int]] = defaultdict(list)
        for index in indices:
            by_bonds[claims[index].bonds].append(index)
        couples = [found for found in by_bonds.values() if len(found) == 2]
        if not couples and len(indices) == 2 and end[0] != end[1]:
            couples = [indices]
        for one, other in couples:
            partners[one], partners[other] = other, one
    return partners


def _diastereotopic_groups(
    frame: Frame, particles: Sequence[Particle], groups: Sequence[Group]
) -> dict[Group, Group]:
    """The other claim of a pair: on the same atoms, or the only other one alike."""
    hydrogens: dict[Group, set[int]] = defaultdict(set)
    for particle, group in zip(particles, groups, strict=True):
        if particle.claim is not None:
            hydrogens[group].update(particle.hydrogens)
    by_rank: dict[tuple[int, ...], list[Group]] = defaultdict(list)
    by_carrier: dict[tuple[int, ...], list[Group]] = defaultdict(list)
    for group, atoms in hydrogens.items():
        ranks = {frame.constitutional_ranks[a] for a in atoms}
        by_rank[tuple(sorted(ranks))].append(group)
        by_carrier[tuple(sorted({frame.carrier(a) for a in atoms}))].append(group)
    pairs: dict[Group, Group] = {}
    for alike in (*by_rank.values(), *by_carrier.values()):
        if len(alike) == 2:
            pairs[alike[0]], pairs[alike[1]] = alike[1], alike[0]
    return pairs


def _exchanged(
    index: int,
    claims: Sequence[CouplingClaim],
    ends: Sequence[tuple[Group, ...]],
    pairs: dict[Group, Group],
) -> int | None:
    """Coupling that this one becomes when the leading pair is exchanged."""
    first, second = ends[index]
    choices = [
        (min(group, pairs[group]), pairs[group], rest)
        for group, rest in ((first, second), (second, first))
        if group in pairs and pairs[group] != rest
    ]
    if not choices:
        return None
    _, replaced, rest = min(choices)
    wanted = tuple(sorted((replaced, rest)))
    for other, end in enumerate(ends):
        same_kind = claims[other].bonds == claims[index].bonds
        if end == wanted and same_kind and other != index:
            return other
    return None
