"""The ledger: entries, balance, verdict; what ledger.json (schema 1) holds."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt

from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence, Stray
from spinledger.values.geometry import Geometry
from spinledger.values.structure import Structure

State = Literal["settled", "disputed", "open", "silent"]
VerdictState = Literal["reconciled", "undecided", "not reconciled", "not judged"]


@dataclass(frozen=True, slots=True, kw_only=True)
class EntryCoupling:
    """A coupling as one entry sees it.

    ``j_hz`` carries its sign where it is determined; None when undetermined,
    with ``sum_hz`` where only the sum with its partner parameter is known.
    """

    partner: str
    j_hz: float | None
    j_sd_hz: float | None
    determined: bool
    predicted_j_hz: float
    predicted_j_sd_hz: float
    kind: str
    sum_hz: float | None = None
    is_disputed: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class EntryGroup:
    """Claims whose order (interchangeable) or parts (shared) the data leave open."""

    kind: Literal["interchangeable", "shared"]
    partners: tuple[str, ...]
    odds: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Entry:
    """One row: a claim, what it is put to, and the residuals (in sd)."""

    claim: str
    atoms: tuple[int, ...]
    species: int
    protons: int
    state: State
    predicted_shift_ppm: float
    predicted_shift_sd_ppm: float
    shift_ppm: float | None = None
    shift_sd_ppm: float | None = None
    range_ppm: tuple[float, float] | None = None
    integral_protons: float | None = None
    integral_sd_protons: float | None = None
    multiplicity: str | None = None
    predicted_multiplicity: str = ""
    width_hz: float | None = None
    couplings: tuple[EntryCoupling, ...] = ()
    group: EntryGroup | None = None
    shift_residual_sd: float | None = None
    integral_residual_sd: float | None = None
    j_residual_sd: float | None = None
    why: str = ""
    reasons: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Balance:
    """Protons claimed (exchangeables left out) against protons found."""

    claimed: float
    found: float
    scale_signal: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Verdict:
    """The answer, its calibrated probability, and the reasons, most important first."""

    state: VerdictState
    probability: float | None
    prior: float
    likelihood_ratio: float | None
    unique: bool
    reasons: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Contender:
    """Another structure that could own the same spectrum."""

    name: str
    smiles: str
    origin: Literal["given", "enumerated"]
    probability: float | None
    verdict: VerdictState
    excluded: bool
    why: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Advice:
    """A further measurement, what it would separate and what to look for.

    Attributes
    ----------
    measurement : str
    expected_discrimination : float
        In sd: the square root of twice the expected log odds.
    look_for : str
        One sentence.
    expected_log_odds : float
        Natural, mean over the contenders it is meant for.
    against : tuple of str
        SMILES of the contenders that it separates; empty where it settles a
        point of the ledger itself.
    """

    measurement: str
    expected_discrimination: float
    look_for: str
    expected_log_odds: float = 0.0
    against: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class SideFinding:
    """What one kind of side evidence said of the structure.

    Attributes
    ----------
    kind : str
        "carbons", "HSQC" or "COSY".
    sentence : str
    cost : float
        Natural log odds taken off the structure; 0 where it agrees.
    """

    kind: str
    sentence: str
    cost: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class ClaimLines:
    """Fitted exact lines of one claim: shifts in ppm, areas in protons."""

    claim: str
    shifts_ppm: npt.NDArray[np.float64]
    protons: npt.NDArray[np.float64]
    width_hz: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Model:
    """The fitted model on the evidence's own axis.

    Attributes
    ----------
    intensities : numpy.ndarray, shape (n_points,)
        Sum over all claims and modelled strays, without the local baseline.
    claim_lines : tuple of ClaimLines
        One per placed claim.
    area_per_proton : float
        Intensity * Hz of one proton.
    """

    intensities: npt.NDArray[np.float64]
    claim_lines: tuple[ClaimLines, ...]
    area_per_proton: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Ledger:
    """Everything that one reconciliation came to."""

    evidence: Evidence
    structure: Structure
    claims: ClaimSet
    entries: tuple[Entry, ...]
    strays: tuple[Stray, ...]
    balance: Balance
    verdict: Verdict
    model: Model | None
    contenders: tuple[Contender, ...] = ()
    advice: tuple[Advice, ...] = ()
    edits: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    side: tuple[SideFinding, ...] = ()
    geometry: Geometry | None = None
