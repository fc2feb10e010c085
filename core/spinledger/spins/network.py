"""A claim set compiled for simulation: every claim's own lines, Hz and protons."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

import numpy as np
import numpy.typing as npt

from spinledger.spins.basis import Topology
from spinledger.spins.clusters import (
    FULL_EFFORT,
    Cluster,
    Effort,
    cut_part,
    diagonalisation_cost,
    part_cost,
)
from spinledger.spins.condense import condense_row, join
from spinledger.spins.engine import EngineLines, SpinEngine
from spinledger.spins.merging import Bond, Site, SpinPart, separate_parts
from spinledger.values.claim import ClaimSet

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]

# Derivatives of frequencies, and of intensities.
_Wanted = tuple[bool, bool | Literal["shared"]]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class ClaimLineSet:
    """Lines of all claims, each with its owner.

    Attributes
    ----------
    frequencies_hz : numpy.ndarray, shape (n_lines,), Hz
    protons : numpy.ndarray, shape (n_lines,)
        The sum over the lines of a claim is its number of protons.
    claim : numpy.ndarray of int, shape (n_lines,)
        Ascending.
    d_frequency : numpy.ndarray or None, shape (n_lines, n_claims + n_couplings)
        Hz per Hz, by every claim's shift, then by every coupling.
    d_protons : numpy.ndarray or None, same shape, protons per Hz
    error_bound : float
        Estimated error as a share of the tallest line at 1 Hz width; 0 for an
        exact result.
    """

    frequencies_hz: Floats
    protons: Floats
    claim: Integers
    d_frequency: Floats | None
    d_protons: Floats | None
    error_bound: float


@dataclass(frozen=True, slots=True, eq=False)
class _Piece:
    """A part, or a cluster of one, with its engine and its place in the claims."""

    engine: SpinEngine
    site_claims: tuple[int | None, ...]
    bond_couplings: Integers
    row_claims: tuple[int, ...]
    row_protons: tuple[float, ...]
    count: int

    @property
    def columns(self) -> Integers:
        """Claim of every site; hetero sites (never asked for) give 0."""
        return np.array([0 if c is None else c for c in self.site_claims])


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

    pieces: tuple[_Piece, ...]
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


@dataclass(slots=True, eq=False)
class _Memory:
    """Results that depend on the claims alone, kept while the network lives."""

    parts: dict[frozenset[int], tuple[SpinPart, ...]] = field(default_factory=dict)
    whole: dict[tuple[frozenset[int], Effort], Plan] = field(default_factory=dict)


class ClaimNetwork:
    """The spin systems of a claim set.

    Parameters
    ----------
    claims : ClaimSet
        Silent claims have no particles and give no lines.

    Notes
    -----
    Species of a mixture, and parts without couplings between them, are solved
    apart. Parts that cost too much are cut into overlapping clusters; every
    proton is detected in exactly one, so that sums stay right.
    """

    def __init__(self, claims: ClaimSet) -> None:
        self.claims = claims
        self.n_claims = len(claims.claims)
        self.n_couplings = len(claims.couplings)
        self._memory = _Memory()

    def plan(
        self,
        shifts_hz: Floats,
        couplings_hz: Floats,
        *,
        without: frozenset[int] = frozenset(),
        effort: Effort = FULL_EFFORT,
    ) -> Plan:
        """How to solve the claims near the given parameters.

        Only systems that are cut depend on the parameters. A fit keeps one plan
        over its steps, so that its model is smooth.

        Parameters
        ----------
        shifts_hz : numpy.ndarray, shape (n_claims,), Hz
        couplings_hz : numpy.ndarray, shape (n_couplings,), Hz
        without : frozenset of int
            Claims that show no lines; exchangeable ones couple no more either.
        effort : Effort
        """
        gone = frozenset(k for k in without if self.claims.claims[k].is_exchangeable)
        memory = self._memory
        if gone not in memory.parts:
            memory.parts[gone] = separate_parts(self.claims, gone)
        known = memory.whole.get((without, effort))
        if known is not None:
            return known
        plan = _make_plan(
            memory.parts[gone],
            np.asarray(shifts_hz, dtype=np.float64),
            np.asarray(couplings_hz, dtype=np.float64),
            without=without,
            effort=effort,
        )
        if not plan.is_cut:
            memory.whole[without, effort] = plan
        return plan

    def lines(
        self,
        shifts_hz: Floats,
        couplings_hz: Floats,
        *,
        derivatives: bool = False,
        intensity_derivatives: bool | Literal["shared"] = False,
        without: frozenset[int] = frozenset(),
        plan: Plan | None = None,
    ) -> ClaimLineSet:
        """Lines of all claims at the given shifts and couplings.

        Parameters
        ----------
        shifts_hz : numpy.ndarray, shape (n_claims,), Hz
            Shift times spectrometer frequency.
        couplings_hz : numpy.ndarray, shape (n_couplings,), Hz
        derivatives : bool
            Also give ``d_frequency``.
        intensity_derivatives : bool or "shared"
            Also give ``d_frequency`` and ``d_protons`` (dearer). "shared" gives
            ``d_protons`` whose sum over the claims is exact and whose split is
            that of the intensities: enough to steer a fit, and much cheaper.
        without : frozenset of int
            Claims that show no lines; exchangeable ones couple no more either.
            Not looked at where a plan is given.
        plan : Plan or None
            From :meth:`plan`; made for these parameters at full effort if not
            given.

        Raises
        ------
        ValueError
            If a parameter array has the wrong length.
        """
        shifts = np.asarray(shifts_hz, dtype=np.float64)
        couplings = np.asarray(couplings_hz, dtype=np.float64)
        self._check(shifts, couplings)
        if plan is None:
            plan = self.plan(shifts, couplings, without=without)
        wanted = (derivatives or bool(intensity_derivatives), intensity_derivatives)
        groups = [
            group
            for piece in plan.pieces
            for group in _piece_lines(
                piece, shifts, couplings, effort=plan.effort, wanted=wanted
            )
        ]
        return self._assemble(groups, plan, shifts, wanted=wanted)

    def claims_of(self, coupling: int) -> frozenset[int]:
        """Claims that a coupling joins."""
        particles = self.claims.particles
        owners = (particles[k].claim for k in self.claims.couplings[coupling].pairs[0])
        return frozenset(owner for owner in owners if owner is not None)

    def parameters_of(self, plan: Plan) -> npt.NDArray[np.bool_]:
        """Which parameters each claim's lines depend on.

        Returns
        -------
        numpy.ndarray of bool, shape (n_claims, n_claims + n_couplings)
        """
        depends = np.zeros(
            (self.n_claims, self.n_claims + self.n_couplings), dtype=np.bool_
        )
        for claim, _ in plan.singlets:
            depends[claim, claim] = True
        for piece in plan.pieces:
            columns = [c for c in piece.site_claims if c is not None]
            columns += (self.n_claims + piece.bond_couplings).tolist()
            for claim in piece.row_claims:
                depends[claim, columns] = True
        return depends

    def _check(self, shifts: Floats, couplings: Floats) -> None:
        if shifts.shape != (self.n_claims,):
            raise ValueError(f"shifts_hz: need ({self.n_claims},), got {shifts.shape}")
        if couplings.shape != (self.n_couplings,):
            raise ValueError(
                f"couplings_hz: need ({self.n_couplings},), got {couplings.shape}"
            )

    def _assemble(
        self,
        groups: list[_RowLines],
        plan: Plan,
        shifts: Floats,
        *,
        wanted: _Wanted,
    ) -> ClaimLineSet:
        n_parameters = self.n_claims + self.n_couplings
        for claim, protons in plan.singlets:
            groups.append(
                _RowLines(
                    claim,
                    shifts[claim : claim + 1],
                    np.array([protons]),
                    np.array([claim]),
                    np.ones((1, 1)) if wanted[0] else None,
                    np.zeros((1, 1)) if wanted[1] else None,
                )
            )
        groups.sort(key=lambda group: group.claim)
        sizes = [group.frequencies.size for group in groups]
        d_frequency = np.zeros((sum(sizes), n_parameters)) if wanted[0] else None
        d_protons = np.zeros((sum(sizes), n_parameters)) if wanted[1] else None
        begin = 0
        for group, size in zip(groups, sizes, strict=True):
            rows = slice(begin, begin + size)
            if d_frequency is not None and group.d_frequency is not None:
                d_frequency[rows, group.columns] = group.d_frequency
            if d_protons is not None and group.d_protons is not None:
                d_protons[rows, group.columns] = group.d_protons
            begin += size
        return ClaimLineSet(
            frequencies_hz=join([group.frequencies for group in groups]),
            protons=join([group.protons for group in groups]),
            claim=np.repeat([group.claim for group in groups], sizes).astype(np.int64),
            d_frequency=d_frequency,
            d_protons=d_protons,
            error_bound=min(1.0, plan.error_share),
        )


@dataclass(frozen=True, slots=True, eq=False)
class _RowLines:
    claim: int
    frequencies: Floats
    protons: Floats
    columns: Integers
    d_frequency: Floats | None  # (n_lines, n_columns)
    d_protons: Floats | None


def _make_plan(
    parts: tuple[SpinPart, ...],
    shifts: Floats,
    couplings: Floats,
    *,
    without: frozenset[int],
    effort: Effort,
) -> Plan:
    pieces: list[_Piece] = []
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
) -> _Piece | None:
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
    return _Piece(
        engine=SpinEngine(topology),
        site_claims=tuple(site.claim for site in sites),
        bond_couplings=np.array([bond.coupling for bond in bonds], dtype=np.int64),
        row_claims=tuple(rows),
        row_protons=tuple(protons),
        count=part.count,
    )


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


def _piece_lines(
    piece: _Piece,
    shifts: Floats,
    couplings: Floats,
    *,
    effort: Effort,
    wanted: _Wanted,
) -> list[_RowLines]:
    frequencies = shifts[piece.columns]
    frequencies[[c is None for c in piece.site_claims]] = 0.0
    lines = piece.engine.lines(
        frequencies,
        couplings[piece.bond_couplings],
        smallest=effort.smallest,
        n_rows=len(piece.row_claims),
        derivatives=wanted[0],
        intensity_derivatives=wanted[1],
    )
    lines, columns = _onto_claims(piece, lines, n_claims=shifts.size)
    rows = []
    for row, claim in enumerate(piece.row_claims):
        condensed = condense_row(
            lines,
            row,
            protons=piece.row_protons[row],
            smallest=effort.smallest,
            bin_hz=effort.bin_hz,
        )
        d_protons = condensed.d_protons
        rows.append(
            _RowLines(
                claim,
                condensed.frequencies,
                condensed.protons * piece.count,
                columns,
                condensed.d_frequency,
                None if d_protons is None else d_protons * piece.count,
            )
        )
    return rows


def _onto_claims(
    piece: _Piece, lines: EngineLines, *, n_claims: int
) -> tuple[EngineLines, Integers]:
    """Derivatives by claims and coupling parameters, which several sites share."""
    if lines.d_frequencies is None:
        return lines, np.zeros(0, dtype=np.int64)
    places = [-1 if claim is None else claim for claim in piece.site_claims] + (
        n_claims + piece.bond_couplings
    ).tolist()
    columns = sorted({place for place in places if place >= 0})
    fold = np.zeros((len(places), len(columns)), dtype=np.float32)
    for local, place in enumerate(places):
        if place >= 0:
            fold[local, columns.index(place)] = 1.0
    d_intensities, d_moments = lines.d_intensities, lines.d_moments
    folded = EngineLines(
        frequencies_hz=lines.frequencies_hz,
        intensities=lines.intensities,
        d_frequencies=lines.d_frequencies @ fold,
        d_intensities=None if d_intensities is None else d_intensities @ fold,
        d_moments=None if d_moments is None else d_moments @ fold,
        row_factors=lines.row_factors,
    )
    return folded, np.array(columns, dtype=np.int64)
