"""Values of a joint ledger, and what its parts ask of each other; ppm and Hz."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from spinledger.processing.solvents import is_aqueous
from spinledger.sample.refit import Refit
from spinledger.sample.roles import Role, same_temperature
from spinledger.sample.shake import Shake
from spinledger.sample.tables import SHIFT_SD_PPM, SHIFT_SD_WATER_PPM, Figure, table_of
from spinledger.values.ledger import Entry, Ledger, VerdictState

# Chance below which couplings are said to disagree.
DISAGREE_P = 0.001


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Witness:
    """One spectrum of the sample, reconciled by itself."""

    name: str
    role: Role
    ledger: Ledger


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """A spectrum's place in the joint ledger.

    Attributes
    ----------
    name : str
    role : str
    solvent : str or None
    field_mhz : float, MHz
    temperature_k : float or None, K
    state : str
        Its own verdict.
    probability : float or None
    counts : bool
        Whether its values go into the shared ones.
    turned : tuple of (str, str)
        Claims taken the other way round than its own ledger has them.
    refit : Refit or None
        Where it was fitted again with the couplings of the others.
    """

    name: str
    role: Role
    solvent: str | None
    field_mhz: float
    temperature_k: float | None
    state: VerdictState
    probability: float | None
    counts: bool
    turned: tuple[tuple[str, str], ...]
    refit: Refit | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Cell:
    """A claim in one spectrum; no shift where it is not seen there."""

    shift_ppm: float | None
    shift_sd_ppm: float | None
    state: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """A claim with one cell a spectrum; None where it is not claimed."""

    claim: str
    protons: int
    cells: tuple[Cell | None, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class SharedCoupling:
    """|J| that all spectra share.

    Attributes
    ----------
    claim, partner : str
    number : int
        Tells J from J' of one pair.
    j_hz, sd_hz : float, Hz
        Weighted mean; the sd is widened by the scatter.
    values : tuple of Figure or None
        One a spectrum, None where that one does not determine it.
    chi2 : float
        Of the values about the mean.
    n_values : int
    agrees : bool
    """

    claim: str
    partner: str
    number: int
    j_hz: float
    sd_hz: float
    values: tuple[Figure | None, ...]
    chi2: float
    n_values: int
    agrees: bool


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class JointLedger:
    """All spectra of a sample in one ledger.

    Attributes
    ----------
    columns : tuple of Column
    rows : tuple of Row
    couplings : tuple of SharedCoupling
    shakes : tuple of Shake
    state, probability
        Of the sample, see :func:`joint_state`.
    reasons : tuple of str
        Sentences, the most important first.
    """

    columns: tuple[Column, ...]
    rows: tuple[Row, ...]
    couplings: tuple[SharedCoupling, ...]
    shakes: tuple[Shake, ...]
    state: VerdictState
    probability: float | None
    reasons: tuple[str, ...]


def same_conditions(one: Ledger, other: Ledger) -> bool:
    """Whether two spectra share solvent and temperature, so that shifts compare."""
    first, second = one.evidence, other.evidence
    return first.solvent == second.solvent and same_temperature(
        first.metadata.temperature_k, second.metadata.temperature_k
    )


def combined(
    values: Sequence[Figure], *, extra_sd: float = 0.0
) -> tuple[float, float, float]:
    """Inverse-variance mean, its sd (widened by the scatter), and the chi-square."""
    numbers = np.array([one.value for one in values])
    weights = 1.0 / np.array([one.sd**2 + extra_sd**2 for one in values])
    mean = float(np.sum(weights * numbers) / np.sum(weights))
    chi2 = float(np.sum(weights * (numbers - mean) ** 2))
    degrees = max(len(values) - 1, 1)
    sd = float(1.0 / np.sqrt(np.sum(weights)) * max(1.0, np.sqrt(chi2 / degrees)))
    return mean, sd, chi2


def shift_sd_between(one: Ledger, other: Ledger) -> float | None:
    """Sd in ppm of a shift from one to the other; None where it is free to move."""
    if not same_conditions(one, other):
        return None
    return SHIFT_SD_WATER_PPM if is_aqueous(one.evidence.solvent) else SHIFT_SD_PPM


def main_index(witnesses: Sequence[Witness], counting: Sequence[bool]) -> int:
    """Index of the spectrum that determines the most couplings."""
    known = [
        len(table_of(one.ledger).couplings_hz) if counts else -1
        for one, counts in zip(witnesses, counting, strict=True)
    ]
    return int(np.argmax(known))


def entry_of(ledger: Ledger, label: str) -> Entry | None:
    """Entry of a claim, or None where it is not claimed."""
    return next((one for one in ledger.entries if one.claim == label), None)
