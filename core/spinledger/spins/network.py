"""A claim set compiled for simulation: every claim's own lines, Hz and protons."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

import numpy as np
import numpy.typing as npt

from spinledger.spins.clusters import FULL_EFFORT, Effort
from spinledger.spins.condense import condense_row, join
from spinledger.spins.engine import EngineLines
from spinledger.spins.merging import SpinPart, separate_parts
from spinledger.spins.plan import Piece, Plan, make_plan
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


# A fit asks for the plan of its start at every stage.
_MOST_CUT_PLANS = 16


@dataclass(slots=True, eq=False)
class _Memory:
    """Results that depend on the claims alone, kept while the network lives."""

    parts: dict[frozenset[int], tuple[SpinPart, ...]] = field(default_factory=dict)
    whole: dict[tuple[frozenset[int], Effort], Plan] = field(default_factory=dict)
    cut: dict[tuple[frozenset[int], Effort, bytes], Plan] = field(default_factory=dict)


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
        shifts = np.asarray(shifts_hz, dtype=np.float64)
        couplings = np.asarray(couplings_hz, dtype=np.float64)
        place = (without, effort, shifts.tobytes() + couplings.tobytes())
        known = memory.whole.get((without, effort)) or memory.cut.get(place)
        if known is not None:
            return known
        plan = make_plan(
            memory.parts[gone], shifts, couplings, without=without, effort=effort
        )
        if not plan.is_cut:
            memory.whole[without, effort] = plan
            return plan
        if len(memory.cut) >= _MOST_CUT_PLANS:
            del memory.cut[next(iter(memory.cut))]
        memory.cut[place] = plan
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


def _piece_lines(
    piece: Piece,
    shifts: Floats,
    couplings: Floats,
    *,
    effort: Effort,
    wanted: _Wanted,
) -> list[_RowLines]:
    lines = piece.engine.lines(
        piece.frequencies_hz(shifts, couplings),
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
    piece: Piece, lines: EngineLines, *, n_claims: int
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
