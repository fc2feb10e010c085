"""How a claim set is solved: parts whole or in clusters; Hz."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.spins.basis import Topology
from spinledger.spins.clusters import (
    Cluster,
    Effort,
    cut_part,
    diagonalisation_cost,
    part_cost,
)
from spinledger.spins.engine import SpinEngine
from spinledger.spins.merging import Bond, Site, SpinPart

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Push:
    """A site and a spin that is coupled to it but does not flip with it here.

    Attributes
    ----------
    site : int
        Place in the piece.
    near, far : int
        Claims of the site and of the other.
    coupling : int
    n_spins : int
        Of the other.
    """

    site: int
    near: int
    far: int
    coupling: int
    n_spins: int


@dataclass(frozen=True, slots=True, eq=False)
class Piece:
    """A part, or a cluster of one, with its engine and its place in the claims.

    Attributes
    ----------
    engine : SpinEngine
    site_claims : tuple of int or None
        None for hetero nuclei.
    bond_couplings : numpy.ndarray of int
    row_claims : tuple of int
        Claims whose lines are taken from here.
    row_protons : tuple of float
    count : int
        Symmetric copies.
    pushes : tuple of Push
        What the cuts would move.
    """

    engine: SpinEngine
    site_claims: tuple[int | None, ...]
    bond_couplings: Integers
    row_claims: tuple[int, ...]
    row_protons: tuple[float, ...]
    count: int
    pushes: tuple[Push, ...] = ()

    @property
    def columns(self) -> Integers:
        """Claim of every site; hetero sites (never asked for) give 0."""
        return np.array([0 if c is None else c for c in self.site_claims])

    def frequencies_hz(self, shifts_hz: Floats, couplings_hz: Floats) -> Floats:
        """Frequency of every site, moved by the spins that it does not flip with.

        Notes
        -----
        Two weakly mixed spins push each other apart by (D - |gap|) / 2, D =
        hypot(gap, J), in whatever state they are; that is all that is left of a
        flip-flop term to second order in J / gap. What the push does to the
        derivatives is of the fourth order and left out.
        """
        frequencies = np.array(shifts_hz[self.columns])
        frequencies[[c is None for c in self.site_claims]] = 0.0
        for push in self.pushes:
            gap = shifts_hz[push.near] - shifts_hz[push.far]
            distance = np.hypot(gap, couplings_hz[push.coupling])
            moved = 0.5 * push.n_spins * (distance - abs(gap))
            frequencies[push.site] += np.copysign(moved, gap)
        return frequencies


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Plan:
    """How a claim set is solved: which pieces, and the error of the cuts.

    Attributes
    ----------
    pieces : tuple
    singlets : tuple of (int, float)
        Claims with one line, and its protons.
    error_share : float
        Estimated error of the cuts as a share of the tallest line at 1 Hz
        width; 0 if nothing was cut.
    effort : Effort
    """

    pieces: tuple[Piece, ...]
    singlets: tuple[tuple[int, float], ...]
    error_share: float
    effort: Effort

    @property
    def is_cut(self) -> bool:
        """True if some part was too large to solve whole."""
        return self.error_share > 0.0

    @property
    def drawn_claims(self) -> tuple[int, ...]:
        """Claims that have lines, ascending."""
        drawn = {claim for claim, _ in self.singlets}
        for piece in self.pieces:
            drawn.update(piece.row_claims)
        return tuple(sorted(drawn))

    @property
    def moving_claims(self) -> tuple[int, ...]:
        """Claims whose shift changes some line, ascending."""
        moving = {claim for claim, _ in self.singlets}
        for piece in self.pieces:
            moving.update(claim for claim in piece.site_claims if claim is not None)
        return tuple(sorted(moving))

    @property
    def couplings(self) -> tuple[int, ...]:
        """Coupling parameters that change some line, ascending."""
        found: set[int] = set()
        for piece in self.pieces:
            found.update(piece.bond_couplings.tolist())
        return tuple(sorted(found))

    @property
    def cost(self) -> float:
        """Cost of diagonalising, about microseconds."""
        return float(
            sum(
                diagonalisation_cost(
                    piece.engine.topology.n_spins, piece.engine.topology.species
                )
                for piece in self.pieces
            )
        )

    @property
    def exact_slope_cost(self) -> float:
        """Cost of the derivatives of intensities, about microseconds."""
        return float(sum(piece.engine.slope_cost for piece in self.pieces))


def make_plan(
    parts: tuple[SpinPart, ...],
    shifts: Floats,
    couplings: Floats,
    *,
    without: frozenset[int],
    effort: Effort,
) -> Plan:
    """Plan for some parts near the given parameters, Hz."""
    pieces: list[Piece] = []
    singlets: list[tuple[int, float]] = []
    error = 0.0
    for part in parts:
        if part.is_singlet:
            site = part.sites[0]
            if site.claim is not None and site.claim not in without:
                singlets.append((site.claim, float(site.n_spins * part.count)))
            continue
        if part_cost(part) <= effort.exact_cost:
            everything = tuple(range(len(part.sites)))
            clusters: tuple[Cluster, ...] = (
                Cluster(
                    members=everything,
                    weak=frozenset(),
                    detected=everything,
                    error_share=0.0,
                ),
            )
        else:
            frequencies = np.array(
                [0.0 if s.claim is None else shifts[s.claim] for s in part.sites]
            )
            values = couplings[[bond.coupling for bond in part.bonds]]
            clusters = cut_part(part, frequencies, values, effort=effort)
        error = max([error, *(cluster.error_share for cluster in clusters)])
        made = [_make_piece(part, cluster, without) for cluster in clusters]
        pieces.extend(piece for piece in made if piece is not None)
    return Plan(
        pieces=tuple(pieces), singlets=tuple(singlets), error_share=error, effort=effort
    )


def _make_piece(
    part: SpinPart, cluster: Cluster, without: frozenset[int]
) -> Piece | None:
    sites = [part.sites[k] for k in cluster.members]
    seen = [
        k in cluster.detected and site.claim is not None and site.claim not in without
        for k, site in zip(cluster.members, sites, strict=True)
    ]
    rows = sorted(
        {
            site.claim
            for site, s in zip(sites, seen, strict=True)
            if s and site.claim is not None
        }
    )
    if not rows:
        return None
    place = {k: index for index, k in enumerate(cluster.members)}
    bonds = [bond for bond in part.bonds if _shows(bond, cluster)]
    topology = Topology(
        n_spins=tuple(site.n_spins for site in sites),
        species=tuple(
            1000 + k if k in cluster.weak else part.sites[k].species
            for k in cluster.members
        ),
        pairs=tuple((place[bond.first], place[bond.second]) for bond in bonds),
        detected=_rows_of_sites(sites, seen, rows, cluster=cluster),
    )
    protons = [0.0] * len(rows)
    for site, row in zip(sites, topology.detected, strict=True):
        if 0 <= row < len(rows):
            protons[row] += site.n_spins
    return Piece(
        engine=SpinEngine(topology),
        site_claims=tuple(site.claim for site in sites),
        bond_couplings=np.array([bond.coupling for bond in bonds], dtype=np.int64),
        row_claims=tuple(rows),
        row_protons=tuple(protons),
        count=part.count,
        pushes=_pushes(part, cluster, place),
    )


def _pushes(
    part: SpinPart, cluster: Cluster, place: dict[int, int]
) -> tuple[Push, ...]:
    """Couplings of flipping members to protons that are weak or left out."""
    strong = set(cluster.members) - cluster.weak
    found = []
    for bond in part.bonds:
        for own, other in ((bond.first, bond.second), (bond.second, bond.first)):
            near, far = part.sites[own].claim, part.sites[other].claim
            is_cut = own in strong and other not in strong
            if is_cut and near is not None and far is not None:
                found.append(
                    Push(
                        site=place[own],
                        near=near,
                        far=far,
                        coupling=bond.coupling,
                        n_spins=part.sites[other].n_spins,
                    )
                )
    return tuple(found)


def _rows_of_sites(
    sites: list[Site], seen: list[bool], rows: list[int], *, cluster: Cluster
) -> tuple[int, ...]:
    """Row of every site; protons that are not reported share one more row.

    The intensity of a line is T_row T_total, and the total is that of all
    protons, reported here or not. Sites that do not flip have no line in common
    with the others.
    """
    found = []
    for number, site, is_seen in zip(cluster.members, sites, seen, strict=True):
        if site.claim is None or (number in cluster.weak and not is_seen):
            found.append(-1)
        elif is_seen:
            found.append(rows.index(site.claim))
        else:
            found.append(len(rows))
    return tuple(found)


def _shows(bond: Bond, cluster: Cluster) -> bool:
    """True if a coupling lies inside and touches a site that flips."""
    inside = bond.first in cluster.members and bond.second in cluster.members
    return inside and not (bond.first in cluster.weak and bond.second in cluster.weak)
