"""Cautions to print where they apply, and the doubt of the reported shifts, ppm."""

from __future__ import annotations

import math

from spinledger.report.words import outgoing
from spinledger.values.ledger import Ledger

# Concentration and temperature move a shift by this much, whatever the fit
# says (common practice: 0.005 to 0.02 ppm).
_CONDITIONS_PPM = 0.005
_UNKNOWN_CONDITIONS_PPM = 0.01


def accuracy_ppm(ledger: Ledger) -> float:
    """Doubt of the reported shifts beside the fit: scale, concentration, temperature.

    Returns
    -------
    float, ppm
        The reference's sd and the doubt of the conditions in quadrature; 0.005
        ppm where the temperature is known, else 0.01 ppm (common practice).
    """
    is_known = ledger.evidence.metadata.temperature_k is not None
    conditions = _CONDITIONS_PPM if is_known else _UNKNOWN_CONDITIONS_PPM
    return math.hypot(ledger.evidence.reference.sd_ppm, conditions)


def printed_cautions(ledger: Ledger) -> tuple[str, ...]:
    """Every caution that applies: the ledger's own, then those of any report.

    Parameters
    ----------
    ledger : Ledger

    Returns
    -------
    tuple of str
        One sentence each, none twice.
    """
    found = [
        *ledger.cautions,
        "a proton spectrum in an achiral solvent says nothing of absolute "
        "configuration, of enantiomeric excess, or of content without protons",
        *_open_order(ledger),
        *_hand_edits(ledger),
    ]
    return tuple(dict.fromkeys(outgoing(sentence) for sentence in found if sentence))


def _open_order(ledger: Ledger) -> list[str]:
    if any(one.group and one.group.kind == "interchangeable" for one in ledger.entries):
        return [
            "entries marked interchangeable may stand the other way round; the "
            "spectrum does not decide"
        ]
    return []


def _hand_edits(ledger: Ledger) -> list[str]:
    count = len(ledger.edits)
    if not count:
        return []
    made = "1 hand edit was" if count == 1 else f"{count} hand edits were"
    return [f"{made} made; edits raise the agreement"]
