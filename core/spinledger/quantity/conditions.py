"""Whether pulse and delay allow a quantity to be read from integrals; s and degrees."""

from __future__ import annotations

import math
from dataclasses import dataclass

from spinledger.values.ledger import Ledger

# Singlets of small molecules in thin solvents relax this slowly [common practice].
ASSUMED_T1_S = 5.0
DELAYS_PER_T1 = 5.0
_ANGLE_TOLERANCE_DEG = 10.0
# What a 90 degree pulse leaves after five T1.
MOST_SATURATION = math.exp(-DELAYS_PER_T1)


@dataclass(frozen=True, slots=True, kw_only=True)
class PulseConditions:
    """What the user knows better than the file; None leaves the file's value.

    Attributes
    ----------
    pulse_angle_deg : float or None
    delay_s : float or None
        Between the end of one acquisition and the next pulse.
    t1_s : float or None
        Longest T1 of all signals that are compared, measured.
    """

    pulse_angle_deg: float | None = None
    delay_s: float | None = None
    t1_s: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Allowance:
    """Whether a quantity may be given, and under which assumptions.

    Attributes
    ----------
    refusals : tuple of str
        Why not, one sentence each; empty where it may.
    notes : tuple of str
        What was assumed.
    saturation : float
        Largest share of a signal that incomplete relaxation takes away.
    """

    refusals: tuple[str, ...]
    notes: tuple[str, ...]
    saturation: float


def saturation(angle_deg: float, repetition_s: float, t1_s: float) -> float:
    """Share of a signal that is lost to incomplete relaxation.

    Parameters
    ----------
    angle_deg : float, degrees
    repetition_s : float, s
        From pulse to pulse.
    t1_s : float, s

    Notes
    -----
    Steady state without transverse memory [1]_: 1 - (1 - E)/(1 - E cos a) with
    E = exp(-repetition/T1).

    References
    ----------
    .. [1] R. R. Ernst, W. A. Anderson, Rev. Sci. Instrum. 37 (1966) 93,
       doi:10.1063/1.1719961.

    Examples
    --------
    >>> round(saturation(90.0, 25.0, 5.0), 4), round(saturation(30.0, 2.0, 5.0), 3)
    (0.0067, 0.214)
    """
    if not (repetition_s >= 0 and t1_s > 0):
        raise ValueError(f"times must be >= 0, T1 > 0: {repetition_s!r}, {t1_s!r}")
    decay = math.exp(-repetition_s / t1_s)
    return 1.0 - (1.0 - decay) / (
        1.0 - decay * math.cos(math.radians(angle_deg)) or 1.0
    )


def allowance(ledger: Ledger, known: PulseConditions | None = None) -> Allowance:
    """Whether the integrals of a ledger's spectrum are quantities.

    Without a measured T1 a 90 degree pulse and a delay of five assumed T1 are
    asked for. With one, any pulse is accepted that saturates no more than that.
    The acquisition time is not counted, which errs on the safe side.

    Parameters
    ----------
    ledger : Ledger
    known : PulseConditions, optional
    """
    given = known or PulseConditions()
    metadata = ledger.evidence.metadata
    angle = given.pulse_angle_deg or metadata.pulse_angle_deg
    delay = given.delay_s or metadata.relaxation_delay_s
    refusals = _unfit(ledger)
    notes: list[str] = []
    t1 = given.t1_s
    if t1 is None:
        t1 = ASSUMED_T1_S
        notes.append(
            f"No T1 was given; {t1:g} s is assumed for the slowest proton, as is common "
            "for small molecules."
        )
    if angle is None:
        refusals.append("The pulse angle is not in the file and was not given.")
    if delay is None:
        refusals.append("The delay between scans is not in the file and was not given.")
    lost = 1.0
    if angle is not None and delay is not None:
        lost = saturation(angle, delay, t1)
        is_measured = given.t1_s is not None
        refusals += _pulse_faults(angle, delay, t1, is_measured=is_measured)
    return Allowance(refusals=tuple(refusals), notes=tuple(notes), saturation=lost)


def _unfit(ledger: Ledger) -> list[str]:
    """Faults of spectrum and ledger that no delay mends."""
    found = []
    state = ledger.verdict.state
    if state == "not reconciled":
        found.append("The spectrum is inconsistent with the drawn structure.")
    if state == "not judged" or ledger.model is None:
        found.append("The structure could not be compared with the spectrum.")
    if ledger.evidence.presaturated:
        found.append(
            "Water was suppressed; saturation takes intensity from signals near it and "
            "from protons that exchange with it."
        )
    clipped = [one for one in ledger.evidence.quality.doubts if "clip" in one.lower()]
    found += clipped
    return found


def _pulse_faults(
    angle_deg: float, delay_s: float, t1_s: float, *, is_measured: bool
) -> list[str]:
    lost = saturation(angle_deg, delay_s, t1_s)
    percent = f"{100 * lost:.1f} %"
    if is_measured:
        if lost <= MOST_SATURATION * (1 + 1e-9):
            return []
        return [
            f"A pulse of {angle_deg:g}° every {delay_s:g} s takes up to {percent} from a "
            f"signal with T1 = {t1_s:g} s; {100 * MOST_SATURATION:.1f} % is the most."
        ]
    found = []
    if abs(angle_deg - 90.0) > _ANGLE_TOLERANCE_DEG:
        found.append(
            f"The pulse is {angle_deg:g}°; a quantity needs 90°, or a measured T1."
        )
    needed = DELAYS_PER_T1 * t1_s
    if delay_s < needed * (1 - 1e-9):
        found.append(
            f"The delay is {delay_s:g} s; {needed:g} s are needed, five times a T1 of "
            f"{t1_s:g} s. Up to {percent} of a signal may be missing."
        )
    return found
