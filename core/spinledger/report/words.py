"""Outgoing words and numbers: what a report prints for states, values and sd."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping

from spinledger.values.ledger import Entry, Ledger, Verdict, VerdictState

MINUS = "\u2212"
NO_BREAK = "\u00a0"
_STATES: Mapping[str, str] = {
    "settled": "assigned",
    "disputed": "inconsistent",
    "open": "not observed",
    "silent": "not observed",
}
_VERDICTS: Mapping[VerdictState, str] = {
    "reconciled": "Consistent with the drawn structure",
    "undecided": "Undecided",
    "not reconciled": "Inconsistent with the drawn structure",
    "not judged": "Not judged",
}
# A state is told by the words around it: "the fit has settled" is none.
_SAID_OF = r"(?P<said>\b(?:is|are|was|were|be|stays?|remains?|counts? as) )"
_NAMED = r"(?P<named> (?:entry|entries|claims?|couplings?)\b)"
_BENCH_WORDS = (
    (re.compile(r"\bnot reconciled\b"), "inconsistent with the drawn structure"),
    (re.compile(r"\breconciled\b"), "consistent with the drawn structure"),
    (re.compile(rf"{_SAID_OF}settled\b"), r"\g<said>assigned"),
    (re.compile(rf"{_SAID_OF}disputed\b"), r"\g<said>inconsistent"),
    (re.compile(rf"\bsettled{_NAMED}"), r"assigned\g<named>"),
    (re.compile(rf"\bdisputed{_NAMED}"), r"inconsistent\g<named>"),
)
# A sign in front of a figure, not the hyphen of a name or of a range.
_NEGATIVE = re.compile(r"(?<![\w.)\]\u2013-])-(?=\d)(?P<figure>\d+(?:\.\d+)?)")
_SUBSCRIPTS = str.maketrans("0123456789", "₀₁₂₃₄₅₆₇₈₉")
_SOLVENT_DIGITS = re.compile(r"(?<=[A-Za-z)])(\d+)")


def outgoing_state(ledger: Ledger, entry: Entry) -> str:
    """Word for the state of an entry as it leaves the laboratory.

    Returns
    -------
    str
        assigned, inconsistent, not observed, or exchanged.
    """
    if entry.state == "silent" and _is_exchangeable(ledger, entry):
        return "exchanged"
    return _STATES[entry.state]


def outgoing_verdict(verdict: Verdict) -> str:
    """Words for the verdict, with a capital."""
    return _VERDICTS[verdict.state]


def outgoing_word(verdict: str) -> str:
    """Words for a verdict's state as it stands in a file; unknown ones stay."""
    return next(
        (words for state, words in _VERDICTS.items() if state == verdict), verdict
    )


def outgoing(sentence: str) -> str:
    """Sentence as it leaves: outgoing words for those of the bench, capital, stop."""
    for pattern, word in _BENCH_WORDS:
        sentence = pattern.sub(word, sentence)
    return as_sentence(real_minus(sentence))


def real_minus(sentence: str) -> str:
    """Sentence with real minus signs, and zero without a sign.

    Examples
    --------
    >>> real_minus("the line at -0.000 ppm, 2-HA, residual -1.4 sd")
    'the line at 0.000 ppm, 2-HA, residual −1.4 sd'
    """

    def sign(match: re.Match[str]) -> str:
        figure = match["figure"]
        return figure if float(figure) == 0 else f"{MINUS}{figure}"

    return _NEGATIVE.sub(sign, sentence)


def as_sentence(text: str) -> str:
    """Text with a capital in front and a full stop behind; labels stay as they are.

    Examples
    --------
    >>> as_sentence("all 5 H agree"), as_sentence("2-HA stands alone.")
    ('All 5 H agree.', '2-HA stands alone.')
    """
    stripped = text.strip()
    if not stripped:
        return ""
    first = stripped.split()[0]
    if first.isalpha() and first.islower():
        stripped = stripped[0].upper() + stripped[1:]
    return stripped if stripped[-1] in ".?:;" else f"{stripped}."


def signed(value: float, digits: int) -> str:
    """Fixed-point text with its sign, a real minus; zero has none."""
    text = f"{value:+.{digits}f}"
    return text[1:] if float(text) == 0 else _minus(text)


def fixed(value: float, digits: int) -> str:
    """Fixed-point text with a real minus sign; never minus zero."""
    text = f"{value:.{digits}f}"
    return text.lstrip("-") if float(text) == 0 else _minus(text)


def with_sd(value: float, sd: float | None, *, digits: int) -> str:
    """Value with its sd in brackets, in units of the last digit: 4.1903(1).

    Parameters
    ----------
    value : float
    sd : float or None
        None, zero or something not finite leaves the bracket out.
    digits : int
        Most decimals to print. The sd is rounded up at its first digit, so
        that it never looks smaller than it is.
    """
    if sd is None or not math.isfinite(sd) or sd <= 0:
        return fixed(value, digits)
    # The sd keeps one digit; nine tenths of a unit still round up to one.
    decimals = min(digits, max(0, -math.floor(math.log10(sd))))
    units = math.ceil(sd * 10**decimals - 1e-9)
    if units >= 10 and decimals > 0:
        decimals -= 1
        units = math.ceil(units / 10)
    return f"{fixed(value, decimals)}({units})"


def plain(value: float, digits: int, *, sign: str = "") -> str:
    """Fixed-point text for files that programs read; never minus zero.

    Examples
    --------
    >>> plain(-0.0004, 3), plain(-1.5, 1), plain(1.5, 1, sign="+")
    ('0.000', '-1.5', '+1.5')
    """
    return f"{value:{sign}z.{digits}f}"


def plus_minus(value: float, sd: float, *, digits: int = 2) -> str:
    """Value and sd as 4.11 ± 0.11."""
    return f"{fixed(value, digits)} ± {fixed(sd, digits)}"


def shift_range(low_ppm: float, high_ppm: float, *, digits: int = 2) -> str:
    """Range with an en dash, larger shift first: 4.23–4.13."""
    return f"{fixed(high_ppm, digits)}–{fixed(low_ppm, digits)}"


def solvent_glyphs(solvent: str) -> str:
    """Solvent name with real subscripts: CDCl₃, D₂O, DMSO-d₆."""
    text = re.sub(r"(?<=-d)(\d+)", lambda m: m[1].translate(_SUBSCRIPTS), solvent)
    return _SOLVENT_DIGITS.sub(lambda m: m[1].translate(_SUBSCRIPTS), text)


def label_glyphs(label: str) -> str:
    """Claim label with real primes: 1′-H for 1'-H."""
    return label.replace("'", "\u2032")


def nominal_mhz(frequency_mhz: float) -> str:
    """Field as printed in a journal: 400 for 400.13 MHz, 61 for a benchtop's."""
    tens = round(frequency_mhz / 10) * 10
    # Within 1 MHz of a round ten it is a nominal field (common practice).
    nominal = tens if abs(frequency_mhz - tens) <= 1.0 else round(frequency_mhz)
    return str(nominal)


def protons(count: float) -> str:
    """Number of protons with its unit: 3.01 H."""
    return f"{fixed(count, 2)}{NO_BREAK}H"


def whole(value: float) -> str:
    """Number without decimals where it has none: 12, 11.5."""
    return fixed(value, 0) if abs(value - round(value)) < 5e-3 else fixed(value, 2)


def _is_exchangeable(ledger: Ledger, entry: Entry) -> bool:
    return any(
        claim.label == entry.claim and claim.is_exchangeable
        for claim in ledger.claims.claims
    )


def _minus(text: str) -> str:
    return text.replace("-", MINUS)
