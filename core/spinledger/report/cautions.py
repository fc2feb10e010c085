"""Cautions to print where they apply, and the doubt of the reported shifts.

Shifts in ppm, times in s, angles in degrees.
"""

from __future__ import annotations

import math

from spinledger.report.words import outgoing
from spinledger.values.ledger import Ledger

# Concentration and temperature move a shift by this much, whatever the fit
# says (common practice: 0.005 to 0.02 ppm).
_CONDITIONS_PPM = 0.005
_UNKNOWN_CONDITIONS_PPM = 0.01
# A full relaxation needs about five longest T1; 3 s each is typical of small
# molecules (common practice).
_QUANTITATIVE_DELAY_S = 15.0
_QUANTITATIVE_ANGLE_DEG = 80.0


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
    """Every caution that applies, the ledger's own first, none twice.

    Parameters
    ----------
    ledger : Ledger

    Returns
    -------
    tuple of str
        One sentence each.
    """
    found = [
        *ledger.cautions,
        *_fixed(ledger),
        *_integrals(ledger),
        *_model_values(ledger),
        *_assumptions(ledger),
        *ledger.evidence.quality.doubts,
    ]
    return tuple(dict.fromkeys(outgoing(sentence) for sentence in found if sentence))


def _fixed(ledger: Ledger) -> list[str]:
    tested = len(ledger.contenders)
    others = {
        0: "no other structure was tested",
        1: "only the listed contender was tested",
    }
    return [
        "Consistent is not proven: "
        f"{others.get(tested, 'only the listed contenders were tested')}.",
        "A proton spectrum in an achiral solvent says nothing of absolute "
        "configuration or enantiomeric excess (relative configuration only), and "
        "nothing of content without protons.",
        "The sd in brackets is the precision of the fit and takes the assignment "
        "as right.",
    ]


def _integrals(ledger: Ledger) -> list[str]:
    metadata = ledger.evidence.metadata
    sentences = []
    angle, delay = metadata.pulse_angle_deg, metadata.relaxation_delay_s
    is_long = delay is not None and delay >= _QUANTITATIVE_DELAY_S
    is_full = angle is not None and angle >= _QUANTITATIVE_ANGLE_DEG
    if not (is_long and is_full):
        known = ", ".join(
            words
            for words in (
                "" if angle is None else f"{angle:.0f}° pulse",
                "" if delay is None else f"{delay:.3g} s delay",
            )
            if words
        )
        why = f" ({known})" if known else " (pulse and delay are not in the file)"
        sentences.append(
            f"Integrals can be wrong by 5 to 10 % with this pulse and delay{why}; "
            "no purity is given."
        )
    if ledger.evidence.presaturated:
        sentences.append(
            "Water was presaturated: signals beside it and those of neighbours that "
            "exchange are too small."
        )
    return sentences


def _model_values(ledger: Ledger) -> list[str]:
    sentences = []
    if any(one.group and one.group.kind == "shared" for one in ledger.entries):
        sentences.append(
            "Where claims share one signal, the parts come from the line-shape fit; "
            "only their sum is measured."
        )
    if any(one.group and one.group.kind == "interchangeable" for one in ledger.entries):
        sentences.append(
            "Entries marked interchangeable may stand the other way round; the "
            "spectrum does not decide."
        )
    placed = [one for one in ledger.entries if one.shift_ppm is not None]
    if any(not j.determined for one in placed for j in one.couplings):
        sentences.append("Couplings that the data do not determine are withheld.")
    return sentences


def _assumptions(ledger: Ledger) -> list[str]:
    evidence = ledger.evidence
    sentences = []
    if evidence.solvent is None:
        sentences.append("The solvent is not known; predictions are wider for that.")
    elif evidence.solvent_seen is None and evidence.solvent_header is None:
        sentences.append(
            f"The solvent {evidence.solvent} was given; the spectrum does not show it."
        )
    if evidence.reference.by in ("header", "match"):
        sentences.append(
            "No reference line was seen: the whole scale may be shifted by "
            f"{evidence.reference.sd_ppm:.2g} ppm or more."
        )
    if evidence.metadata.temperature_k is None:
        sentences.append("The temperature is not in the file.")
    if ledger.edits:
        count = len(ledger.edits)
        sentences.append(
            f"{count} hand edit{'s were' if count > 1 else ' was'} made; edits raise "
            "the agreement."
        )
    return sentences
