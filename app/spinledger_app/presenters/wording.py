"""Numbers and chemical names in the typography of the bench."""

from __future__ import annotations

import re
from collections.abc import Iterable

from PySide6.QtCore import QCoreApplication

MINUS = "\N{MINUS SIGN}"
_SUBSCRIPTS = str.maketrans("0123456789", "₀₁₂₃₄₅₆₇₈₉")
_FORMULA_DIGITS = re.compile(r"(?<=[A-Za-z)])\d+")
_SOLVENT_NAMES = {
    "CDCl3": "CDCl₃",
    "D2O": "D₂O",
    "CD3OD": "CD₃OD",
    "DMSO-d6": "DMSO-d₆",
    "acetone-d6": "acetone-d₆",
    "C6D6": "C₆D₆",
    "CD3CN": "CD₃CN",
    "CD2Cl2": "CD₂Cl₂",
    "THF-d8": "THF-d₈",
    "toluene-d8": "toluene-d₈",
    "pyridine-d5": "pyridine-d₅",
}


def say(text: str) -> str:
    """Text in the user's language."""
    return QCoreApplication.translate("bench", text)


def number(value: float, places: int) -> str:
    """Decimal number with a real minus sign; no minus before zero."""
    shown = f"{value:.{places}f}"
    if float(shown) == 0:
        shown = shown.lstrip("-")
    return shown.replace("-", MINUS)


def signed(value: float, places: int) -> str:
    """Decimal number with its sign, also when it is positive."""
    shown = number(value, places)
    return shown if shown.startswith(MINUS) or float(shown) == 0 else f"+{shown}"


def shift_sd(value_ppm: float, sd_ppm: float) -> str:
    """Predicted shift with its sd, in as many places as the sd deserves."""
    places = 1 if sd_ppm >= 0.3 else 2
    return f"{number(value_ppm, places)} ± {sd_ppm:.{places}f}"


def protons(value: float) -> str:
    """Proton count with two places and its unit."""
    return f"{number(value, 2)} H"


def whole_protons(value: float) -> str:
    """Claimed proton count with its unit: 12 H, or 2.5 H for shares."""
    return f"{value:g} H"


def couplings(values_hz: tuple[float, ...], places: int) -> str:
    """J values without sign, larger first, as they stand in a row."""
    ordered = sorted((abs(value) for value in values_hz), reverse=True)
    return ", ".join(f"{value:.{places}f}" for value in ordered)


def chemical(text: str) -> str:
    """Formula with subscript digits, for names such as CHCl3 or D2O.

    Words that are not plain formulae come back as they are.
    """
    if "/" in text:
        return "/".join(chemical(part) for part in text.split("/"))
    if text in _SOLVENT_NAMES:
        return _SOLVENT_NAMES[text]
    if re.fullmatch(r"(?:[A-Z][a-z]?\d*|\((?:[A-Z][a-z]?\d*)+\)\d*)+", text):
        return _FORMULA_DIGITS.sub(lambda m: m.group().translate(_SUBSCRIPTS), text)
    return text


def sentences(texts: Iterable[str]) -> str:
    """Reasons as running text: each with a capital and a full stop."""
    made = []
    for text in texts:
        plain = text.strip()
        if plain:
            stop = "" if plain[-1] in ".!?" else "."
            made.append(plain[:1].upper() + plain[1:] + stop)
    return " ".join(made)


def formula(text: str) -> str:
    """Molecular formula with subscript digits."""
    return text.translate(_SUBSCRIPTS)
