"""Plain sentences about claims, strays and verdicts.

Shifts in ppm, couplings in Hz.
"""

from __future__ import annotations

from spinledger.reconcile.coarse import MASKED_KINDS
from spinledger.values.claim import Claim, ClaimSet
from spinledger.values.evidence import Evidence

_LONG = {
    "s": "a singlet",
    "d": "a doublet",
    "t": "a triplet",
    "q": "a quartet",
    "quint": "a quintet",
    "sext": "a sextet",
    "sept": "a septet",
    "m": "a multiplet",
}
_SHORT = {"s": "singlet", "d": "doublet", "t": "triplet", "q": "quartet"}


def pattern(multiplicity: str) -> str:
    """A multiplicity in words: "dq" is "a doublet of quartets".

    Examples
    --------
    >>> pattern("dq")
    'a doublet of quartets'
    >>> pattern("ddd")
    'a doublet of doublets of doublets'
    """
    if multiplicity in _LONG:
        return _LONG[multiplicity]
    if multiplicity and all(letter in _SHORT for letter in multiplicity):
        words = [_SHORT[letter] for letter in multiplicity]
        return f"a {words[0]} of " + " of ".join(f"{word}s" for word in words[1:])
    return f"a signal ({multiplicity})" if multiplicity else "a signal"


def reach(claim: Claim) -> tuple[float, float]:
    """Two sd to both sides of a prediction, at least 0.15 ppm."""
    half = max(2.0 * claim.shift_sd_ppm, 0.15)
    return claim.shift_ppm - half, claim.shift_ppm + half


def open_reason(claim: Claim, multiplicity: str) -> str:
    """Why a claim is open."""
    low, high = reach(claim)
    return (
        f"{claim.label} is expected near {claim.shift_ppm:.1f} ppm as "
        f"{pattern(multiplicity)}; nothing of that shape lies between "
        f"{low:.1f} and {high:.1f} ppm"
    )


def shift_reason(claim: Claim, shift_ppm: float, z: float) -> str:
    """Why a shift is disputed."""
    return (
        f"{claim.label} stands at {shift_ppm:z.2f} ppm where "
        f"{claim.shift_ppm:z.2f} ± {claim.shift_sd_ppm:.2f} ppm is predicted "
        f"({abs(z):.1f} sd)"
    )


def coupling_reason(claims: ClaimSet, coupling: int, j_hz: float) -> str:
    """Why a coupling is disputed."""
    one = claims.couplings[coupling]
    names = []
    for number in one.pairs[0]:
        owner = claims.particles[number].claim
        names.append(
            claims.particles[number].nucleus
            if owner is None
            else claims.claims[owner].label
        )
    return (
        f"J({names[0]}, {names[1]}) is {abs(j_hz):.1f} Hz; the drawing "
        f"({one.kind}) asks for {abs(one.j_hz):.1f} ± {one.j_sd_hz:.1f} Hz"
    )


def amplitude_reason(claim: Claim, integral_protons: float) -> str:
    """Why an integral is disputed."""
    return (
        f"{claim.label} integrates to {integral_protons:.2f} H "
        f"where {claim.n_protons} H are claimed"
    )


def misfit_reason(claim: Claim) -> str:
    """Why a shape is disputed."""
    return f"the shape of {claim.label} is not that of the signal it was put to"


def hidden_reason(evidence: Evidence, shift_ppm: float) -> str:
    """Why a claim under a mask is silent."""
    for stray in evidence.strays:
        if stray.kind in MASKED_KINDS and (
            stray.low_ppm - 0.05 <= shift_ppm <= stray.high_ppm + 0.05
        ):
            return (
                f"lies under the {stray.kind} line between {stray.low_ppm:z.2f} "
                f"and {stray.high_ppm:z.2f} ppm"
            )
    return f"lies in a stretch that is left out, near {shift_ppm:z.2f} ppm"


def optional_reason(claim: Claim) -> str:
    """Why an exchangeable claim that was not found is silent."""
    return (
        f"{claim.label} may be too broad to see or exchanged; its absence is no "
        "evidence"
    )
