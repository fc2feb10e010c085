"""What the user may ask of a reconciliation: hand edits, companions, limits.

Shifts in ppm, couplings in Hz, times in s.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from spinledger.reconcile.side_evidence import SideEvidence
from spinledger.values.structure import Structure


@dataclass(frozen=True, slots=True, kw_only=True)
class Pin:
    """A claim that the user put to a stretch of the spectrum."""

    claim: str
    low_ppm: float
    high_ppm: float

    def __post_init__(self) -> None:
        if not self.low_ppm < self.high_ppm:
            raise ValueError(
                f"low_ppm must be < high_ppm, got {self.low_ppm!r}, {self.high_ppm!r}"
            )


@dataclass(frozen=True, slots=True, kw_only=True)
class FixedCoupling:
    """A coupling between two claims that the user holds at a value."""

    claim: str
    partner: str
    j_hz: float


@dataclass(frozen=True, slots=True, kw_only=True)
class DeclaredImpurity:
    """A stretch that the user knows to be something else."""

    low_ppm: float
    high_ppm: float
    why: str = "declared an impurity by hand"


@dataclass(frozen=True, slots=True, kw_only=True)
class Constraints:
    """Hand edits that match and refine must keep to.

    Attributes
    ----------
    pins : tuple of Pin
    fixed_couplings : tuple of FixedCoupling
    excluded_ppm : tuple of (low_ppm, high_ppm)
        Stretches that take no part; a claim in one of them is hidden.
    impurities : tuple of DeclaredImpurity
        Stretches that take no part and are booked as strays.
    absent : tuple of str
        Claims that the user took off their signal: they stay open.
    side : SideEvidence or None
        Carbon list, HSQC and COSY pairs; no edit, but heeded like one.
    """

    pins: tuple[Pin, ...] = ()
    fixed_couplings: tuple[FixedCoupling, ...] = ()
    excluded_ppm: tuple[tuple[float, float], ...] = ()
    impurities: tuple[DeclaredImpurity, ...] = ()
    absent: tuple[str, ...] = ()
    side: SideEvidence | None = None

    @property
    def is_empty(self) -> bool:
        """Whether nothing was edited by hand."""
        return not (
            self.pins
            or self.absent
            or self.fixed_couplings
            or self.excluded_ppm
            or self.impurities
        )

    def sentences(self) -> tuple[str, ...]:
        """Plain sentences for the audit trail, one a hand edit."""
        pinned = [
            f"{pin.claim} put between {pin.low_ppm:z.3f} and {pin.high_ppm:z.3f} ppm"
            for pin in self.pins
        ]
        taken_off = [f"{claim} taken off its signal" for claim in self.absent]
        fixed = [
            f"J({one.claim}, {one.partner}) held at {one.j_hz:.2f} Hz"
            for one in self.fixed_couplings
        ]
        left_out = [
            f"{low:z.3f} to {high:z.3f} ppm left out" for low, high in self.excluded_ppm
        ]
        declared = [
            f"{one.low_ppm:z.3f} to {one.high_ppm:z.3f} ppm: {one.why}"
            for one in self.impurities
        ]
        return (*pinned, *taken_off, *fixed, *left_out, *declared)


@dataclass(frozen=True, slots=True, kw_only=True)
class ReconcileOptions:
    """How a reconciliation is to be done.

    Attributes
    ----------
    ph, temperature_k : float or None
        Of the sample; None takes the claims' defaults or the header.
    species : tuple of Structure
        Further structures that share the tube and belong to the claim.
    companions : tuple of Structure
        What else may be in the tube (reagents, solvents, by-products); their
        signals are strays, never entries.
    contenders : tuple of Structure
        Structures of the user's own to test beside the enumerated ones.
    n_contenders : int or None
        Enumerated isomers to test; None takes a few within the time budget.
    quick : bool
        Fewer hypotheses refined, no enumerated contenders, no advice.
    constraints : Constraints
    time_budget_s : float, s
        After this the best so far is given, and it is said.
    seed : int
    """

    ph: float | None = None
    temperature_k: float | None = None
    species: tuple[Structure, ...] = ()
    companions: tuple[Structure, ...] = ()
    contenders: tuple[Structure, ...] = ()
    n_contenders: int | None = None
    quick: bool = False
    constraints: Constraints = field(default_factory=Constraints)
    time_budget_s: float = 45.0
    seed: int = 7

    def __post_init__(self) -> None:
        if not self.time_budget_s > 0:
            raise ValueError(f"time_budget_s must be > 0, got {self.time_budget_s!r}")
        if self.n_contenders is not None and self.n_contenders < 0:
            raise ValueError(f"n_contenders must be >= 0, got {self.n_contenders!r}")


@dataclass(frozen=True, slots=True, kw_only=True)
class Candidate:
    """A structure to rank; ``structure`` is None where it did not parse."""

    name: str
    smiles: str
    structure: Structure | None
    reason: str = ""
