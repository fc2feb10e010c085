"""Claims made ready for simulation: equivalent particles merged, parts separated."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.spins.engine import connected_parts
from spinledger.values.claim import ClaimSet


@dataclass(frozen=True, slots=True, kw_only=True)
class Site:
    """One composite particle after merging.

    Attributes
    ----------
    claim : int or None
        Claim whose shift it has; None for a hetero nucleus.
    n_spins : int
    species : int
        0 for protons; hetero nuclei that are equivalent share a number.
    """

    claim: int | None
    n_spins: int
    species: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Bond:
    """A coupling between two sites, and which parameter gives its value."""

    first: int
    second: int
    coupling: int


@dataclass(frozen=True, slots=True, kw_only=True)
class SpinPart:
    """A connected part of the claims, occurring ``count`` times over.

    Attributes
    ----------
    sites : tuple of Site
    bonds : tuple of Bond
        Site numbers count inside the part.
    count : int
        Symmetric copies that have the same lines.
    """

    sites: tuple[Site, ...]
    bonds: tuple[Bond, ...]
    count: int

    @property
    def is_singlet(self) -> bool:
        """True if no coupling shows: one claim, and only couplings within it."""
        return len({site.claim for site in self.sites}) == 1 and all(
            site.claim is not None for site in self.sites
        )


_Table = dict[tuple[int, int], int]


def separate_parts(
    claims: ClaimSet, removed: frozenset[int] = frozenset()
) -> tuple[SpinPart, ...]:
    """Merged, connected parts of a claim set that hold a proton.

    Parameters
    ----------
    claims : ClaimSet
    removed : frozenset of int
        Claims whose particles are not there at all (exchanged).

    Notes
    -----
    Particles of one claim with the same couplings to everything else are
    magnetically equivalent and become one composite particle; couplings inside
    it do not show. A part of one claim alone is a singlet for the same reason.
    """
    live = [
        index
        for index, particle in enumerate(claims.particles)
        if particle.claim is None or particle.claim not in removed
    ]
    table = _coupling_table(claims, set(live))
    groups = _equivalent_groups(claims, live, table)
    group_of = {particle: k for k, members in enumerate(groups) for particle in members}
    merged: _Table = {}
    for (a, b), coupling in table.items():
        first, second = sorted((group_of[a], group_of[b]))
        if first != second:
            merged[first, second] = coupling
    species = _species(claims, groups, merged)
    sites = [
        Site(
            claim=claims.particles[members[0]].claim,
            n_spins=sum(claims.particles[k].n_spins for k in members),
            species=species[index],
        )
        for index, members in enumerate(groups)
    ]
    return _distinct_parts(sites, merged)


def _coupling_table(claims: ClaimSet, live: set[int]) -> _Table:
    table: _Table = {}
    for index, coupling in enumerate(claims.couplings):
        for a, b in coupling.pairs:
            if a in live and b in live:
                table[min(a, b), max(a, b)] = index
    return table


def _partners(table: _Table) -> dict[int, list[tuple[int, int]]]:
    partners: dict[int, list[tuple[int, int]]] = defaultdict(list)
    for (a, b), coupling in table.items():
        partners[a].append((b, coupling))
        partners[b].append((a, coupling))
    return partners


def _equivalent_groups(
    claims: ClaimSet, live: list[int], table: _Table
) -> list[tuple[int, ...]]:
    """Magnetically equivalent particles, in order of first member."""
    kind = {k: (claims.particles[k].nucleus, claims.particles[k].claim) for k in live}
    partners = _partners(table)
    by_signature: dict[object, list[int]] = defaultdict(list)
    for k in live:
        outside = sorted((p, c) for p, c in partners[k] if kind[p] != kind[k])
        by_signature[kind[k], tuple(outside)].append(k)
    groups: list[tuple[int, ...]] = []
    for members in by_signature.values():
        insiders = [k for k in live if kind[k] == kind[members[0]]]
        if _is_uniform(members, insiders, table):
            groups.append(tuple(members))
        else:
            groups.extend((k,) for k in members)
    return sorted(groups)


def _is_uniform(members: list[int], insiders: list[int], table: _Table) -> bool:
    """True if all members couple alike to the others of their claim."""
    others = [k for k in insiders if k not in members]
    return all(
        len({table.get((min(k, other), max(k, other))) for k in members}) == 1
        for other in others
    )


def _species(
    claims: ClaimSet, groups: list[tuple[int, ...]], merged: _Table
) -> list[int]:
    """0 for protons; hetero groups with the same set of couplings are equivalent."""
    partners = _partners(merged)
    numbers: dict[object, int] = {}
    species = []
    for index, members in enumerate(groups):
        first = claims.particles[members[0]]
        if first.claim is not None:
            species.append(0)
            continue
        couplings = tuple(sorted(c for _, c in partners[index]))
        key = (first.nucleus, couplings or index)
        species.append(numbers.setdefault(key, len(numbers) + 1))
    return species


def _distinct_parts(sites: list[Site], merged: _Table) -> tuple[SpinPart, ...]:
    linked: npt.NDArray[np.bool_] = np.zeros((len(sites), len(sites)), dtype=np.bool_)
    for a, b in merged:
        linked[a, b] = linked[b, a] = True
    found: dict[tuple[tuple[Site, ...], tuple[Bond, ...]], int] = {}
    for members in connected_parts(linked):
        if all(sites[k].claim is None for k in members):
            continue
        part = _canonical(members, sites, merged)
        found[part] = found.get(part, 0) + 1
    return tuple(
        _without_hidden_couplings(SpinPart(sites=part[0], bonds=part[1], count=count))
        for part, count in found.items()
    )


def _canonical(
    members: Iterable[int], sites: list[Site], merged: _Table
) -> tuple[tuple[Site, ...], tuple[Bond, ...]]:
    """Sites in an order that symmetric copies share."""
    partners = _partners(merged)
    order = sorted(
        members,
        key=lambda k: (
            sites[k].species,
            -1 if sites[k].claim is None else sites[k].claim,
            sites[k].n_spins,
            sorted(c for _, c in partners[k]),
        ),
    )
    place = {k: index for index, k in enumerate(order)}
    bonds = []
    for (a, b), coupling in merged.items():
        if a in place:
            first, second = sorted((place[a], place[b]))
            bonds.append(Bond(first=first, second=second, coupling=coupling))
    bonds.sort(key=lambda bond: (bond.first, bond.second))
    return tuple(sites[k] for k in order), tuple(bonds)


def _without_hidden_couplings(part: SpinPart) -> SpinPart:
    if not part.is_singlet:
        return part
    total = Site(
        claim=part.sites[0].claim,
        n_spins=sum(site.n_spins for site in part.sites),
        species=part.sites[0].species,
    )
    return SpinPart(sites=(total,), bonds=(), count=part.count)
