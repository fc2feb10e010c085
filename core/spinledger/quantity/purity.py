"""Content of the drawn compound by an internal standard; masses in mg."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from rdkit.Chem.Descriptors import MolWt  # type: ignore[attr-defined]  # RDKit

from spinledger.quantity.budget import Budget, Input, combine
from spinledger.quantity.conditions import Allowance, PulseConditions, allowance
from spinledger.quantity.integrals import Area, LeftOut, area_at, claim_areas
from spinledger.structure.read import molecule
from spinledger.values.ledger import Ledger

# Relative standard uncertainties [common practice]: phase and baseline of a well
# processed spectrum; one signal alone, whose spread is not seen; molar masses.
_PROCESSING = 0.003
_SINGLE_SIGNAL = 0.01
_MOLAR_MASS = 5e-5


@dataclass(frozen=True, slots=True, kw_only=True)
class InternalStandard:
    """What was weighed in beside the sample.

    Attributes
    ----------
    name : str
    molar_mass : float, g/mol
    n_protons : int
        Of the signal that is integrated.
    shift_ppm : float, ppm
        Where that signal stands.
    purity, purity_u : float
        Mass fraction of the certificate, and its standard uncertainty.
    """

    name: str
    molar_mass: float
    n_protons: int
    shift_ppm: float
    purity: float = 1.0
    purity_u: float = 0.0

    def __post_init__(self) -> None:
        if not (self.molar_mass > 0 and self.n_protons > 0):
            raise ValueError("the standard needs a molar mass and protons > 0")
        if not 0 < self.purity <= 1:
            raise ValueError(f"purity must lie in (0, 1], got {self.purity!r}")


@dataclass(frozen=True, slots=True, kw_only=True)
class Weighings:
    """Masses in the tube, mg, each with the balance's standard uncertainty."""

    sample_mg: float
    standard_mg: float
    u_mg: float

    def __post_init__(self) -> None:
        if not (self.sample_mg > 0 and self.standard_mg > 0 and self.u_mg >= 0):
            raise ValueError("masses must be > 0 mg and their uncertainty >= 0 mg")


@dataclass(frozen=True, slots=True, kw_only=True)
class Purity:
    """Mass fraction of the compound in the sample, or why there is none.

    Attributes
    ----------
    budget : Budget or None
        Value 1 is pure; None where it is refused.
    refusals, notes : tuple of str
    signals : tuple of Area
        That were used.
    left_out : tuple of LeftOut
    standard : InternalStandard
    weighings : Weighings
    """

    budget: Budget | None
    refusals: tuple[str, ...]
    notes: tuple[str, ...]
    signals: tuple[Area, ...]
    left_out: tuple[LeftOut, ...]
    standard: InternalStandard
    weighings: Weighings


def purity(
    ledger: Ledger,
    standard: InternalStandard,
    weighings: Weighings,
    known: PulseConditions | None = None,
) -> Purity:
    """Purity of the drawn compound against an internal standard.

    Parameters
    ----------
    ledger : Ledger
    standard : InternalStandard
    weighings : Weighings
    known : PulseConditions, optional
        Pulse angle, delay and T1 where the user knows better than the file.

    Notes
    -----
    P = (A/N)_x / (A/N)_s * M_x / M_s * m_s / m_x * P_s [1]_, with factors of
    value one for incomplete relaxation, line tails and processing.

    References
    ----------
    .. [1] F. Malz, H. Jancke, J. Pharm. Biomed. Anal. 38 (2005) 813-823,
       doi:10.1016/j.jpba.2005.01.043.
    """
    allowed = allowance(ledger, known)
    signals, left_out = claim_areas(ledger)
    reference = area_at(ledger, standard.shift_ppm)
    refusals = [*allowed.refusals, *_faults(ledger, standard, signals, reference)]
    budget = None
    if not refusals and reference is not None:
        budget = combine(
            inputs_of(
                _Measured(signals, reference, allowed),
                standard,
                weighings,
                molar_mass=float(MolWt(molecule(ledger.structure))),
            )
        )
    return Purity(
        budget=budget,
        refusals=tuple(refusals),
        notes=(*allowed.notes, *_remarks(budget)),
        signals=signals,
        left_out=left_out,
        standard=standard,
        weighings=weighings,
    )


@dataclass(frozen=True, slots=True)
class _Measured:
    """What the spectrum gives."""

    signals: tuple[Area, ...]
    reference: Area
    allowed: Allowance


def _faults(
    ledger: Ledger,
    standard: InternalStandard,
    signals: Sequence[Area],
    reference: Area | None,
) -> list[str]:
    found = []
    if reference is None:
        found.append(
            f"No signal that stands clear was found at {standard.shift_ppm:g} ppm, where "
            f"{standard.name} is said to be."
        )
    if not signals:
        found.append("No signal of the compound stands clear of all others.")
    if len(ledger.claims.species_shares) > 1:
        found.append("Several species share the signals; their sum is not formed yet.")
    return found


def _remarks(budget: Budget | None) -> tuple[str, ...]:
    if budget is not None and budget.value - budget.expanded > 1.0:
        return (
            "More than everything was found: a mass, the standard or an integral is "
            "wrong.",
        )
    return ()


def inputs_of(
    measured: _Measured,
    standard: InternalStandard,
    weighings: Weighings,
    *,
    molar_mass: float,
) -> tuple[Input, ...]:
    """Inputs of the measurement equation, in its order."""
    signals, reference = measured.signals, measured.reference
    per_proton, u_per_proton, how = area_per_proton(signals)
    tails = (*(one.tails for one in signals), reference.tails)
    return (
        Input(
            name="Area per proton of the compound, A/N",
            value=per_proton,
            unit="a.u.",
            standard_uncertainty=u_per_proton,
            exponent=1,
            source=how,
        ),
        Input(
            name=f"Area per proton of {standard.name}",
            value=reference.area / standard.n_protons,
            unit="a.u.",
            standard_uncertainty=reference.noise_sd / standard.n_protons,
            exponent=-1,
            source="noise",
        ),
        _factor("Phase and baseline", _PROCESSING, "common practice"),
        # Half of what was added for the tails may be wrong, one way or the other.
        _factor(
            "Line tails", max(tails) / 2 / math.sqrt(3), "half the correction", True
        ),
        _factor(
            "Incomplete relaxation",
            measured.allowed.saturation / math.sqrt(3),
            "pulse angle, delay and T1",
            True,
        ),
        _exact("Molar mass of the compound", molar_mass, 1),
        _exact(f"Molar mass of {standard.name}", standard.molar_mass, -1),
        _weighed(f"Mass of {standard.name}", weighings.standard_mg, weighings.u_mg, 1),
        _weighed("Mass of the sample", weighings.sample_mg, weighings.u_mg, -1),
        Input(
            name=f"Purity of {standard.name}",
            value=standard.purity,
            unit="",
            standard_uncertainty=standard.purity_u,
            exponent=1,
            source="certificate",
        ),
    )


def area_per_proton(signals: Sequence[Area]) -> tuple[float, float, str]:
    """Area of one proton from all signals, its uncertainty, and where that is from.

    The uncertainty is the larger of the noise and the standard error that the
    spread of the signals shows; a signal alone gets one percent instead.
    """
    protons = np.array([one.n_protons for one in signals], dtype=np.float64)
    areas = np.array([one.area for one in signals])
    value = float(areas.sum() / protons.sum())
    noise = float(np.sqrt(sum(one.noise_sd**2 for one in signals)) / protons.sum())
    if len(signals) < 2:
        return value, max(noise, _SINGLE_SIGNAL * value), "one signal alone"
    weights = protons / protons.sum()
    # Unbiased weighted variance of the signals about their mean, over how many
    # equal ones they are worth.
    spread = float((weights * (areas / protons - value) ** 2).sum())
    worth = float((weights**2).sum())
    standard_error = math.sqrt(spread / (1.0 - worth) * worth)
    if standard_error > noise:
        return value, standard_error, f"spread of {len(signals)} signals"
    return value, noise, "noise"


def _factor(name: str, u: float, source: str, is_flat: bool = False) -> Input:
    return Input(
        name=name,
        value=1.0,
        unit="",
        standard_uncertainty=u,
        exponent=1,
        source=source,
        distribution="rectangular" if is_flat else "normal",
    )


def _exact(name: str, value: float, exponent: int) -> Input:
    return Input(
        name=name,
        value=value,
        unit="g/mol",
        standard_uncertainty=_MOLAR_MASS * value,
        exponent=1 if exponent > 0 else -1,
        source="standard atomic weights",
    )


def _weighed(name: str, value: float, u: float, exponent: int) -> Input:
    return Input(
        name=name,
        value=value,
        unit="mg",
        standard_uncertainty=u,
        exponent=1 if exponent > 0 else -1,
        source="balance",
    )
