"""What a spectrum is for in its sample, guessed from name, solvent and date.

Frequencies in MHz, temperatures in K.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import date
from typing import Literal, get_args

from spinledger.processing.solvents import canonical_solvent, is_aqueous
from spinledger.values.acquisition import Metadata

Role = Literal[
    "main",
    "D2O shake",
    "other solvent",
    "other field",
    "other temperature",
    "reference",
    "starting material",
    "crude",
]
ROLES: tuple[Role, ...] = get_args(Role)

# Fields of one nominal size differ by less, temperatures by less [common practice].
SAME_FIELD_SHARE = 0.02
SAME_TEMPERATURE_K = 3.0
# A tube that is shaken is measured again soon; a reference lies long before.
REFERENCE_DAYS = 14

_WORDS: tuple[tuple[Role, str], ...] = (
    (
        "D2O shake",
        r"shak(e|en|ing)|d2o[ _-]*(shake|add|exch)|\+ *d2o|heavy water|deuter\w* exch",
    ),
    ("starting material", r"\b(sm|s\.m\.|starting|educt|edukt|precursor)\b"),
    ("crude", r"\b(crude|raw product|reaction mixture|rxn|roh\w*)\b"),
    ("reference", r"\b(ref|reference|standard|std|authentic|retained)\b"),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class RoleGuess:
    """A role with the reason in one sentence."""

    role: Role
    why: str


def guess_role(
    metadata: Metadata,
    main: Metadata | None,
    *,
    solvent: str | None = None,
    main_solvent: str | None = None,
) -> RoleGuess:
    """What a new spectrum of a sample is for.

    Parameters
    ----------
    metadata : Metadata
        Of the new spectrum.
    main : Metadata or None
        Of the main spectrum; None where the new one is the first.
    solvent, main_solvent : str, optional
        In use, where it is known better than from the headers.
    """
    if main is None:
        return RoleGuess(role="main", why="It is the first spectrum of the sample.")
    named = _by_name(metadata)
    here = canonical_solvent(solvent or metadata.solvent or "")
    there = canonical_solvent(main_solvent or main.solvent or "")
    is_shake = named is not None and named.role == "D2O shake"
    if named is not None and not (is_shake and is_aqueous(there)):
        return named
    if here is not None and there is not None and here != there:
        why = f"It is in {here}, the main spectrum in {there}."
        return RoleGuess(role="other solvent", why=why)
    return _by_conditions(metadata, main)


def _by_name(metadata: Metadata) -> RoleGuess | None:
    text = f"{metadata.source_name} {metadata.title or ''}".lower()
    text = re.sub(r"[_\-.]+", " ", text)
    for role, words in _WORDS:
        found = re.search(words, text)
        if found is not None:
            why = f'Its name or title says "{found.group(0).strip()}".'
            return RoleGuess(role=role, why=why)
    return None


def _by_conditions(metadata: Metadata, main: Metadata) -> RoleGuess:
    field, main_field = (one.spectrometer_frequency_mhz for one in (metadata, main))
    if not same_field(field, main_field):
        why = f"It was measured at {field:.0f} MHz, the main one at {main_field:.0f}."
        return RoleGuess(role="other field", why=why)
    if not same_temperature(metadata.temperature_k, main.temperature_k):
        why = f"It was measured at {metadata.temperature_k:.0f} K."
        return RoleGuess(role="other temperature", why=why)
    days = _days_between(metadata.acquired_on, main.acquired_on)
    if days is not None and days >= REFERENCE_DAYS:
        why = (
            f"It was measured {days} days before the main one, at the same conditions."
        )
        return RoleGuess(role="reference", why=why)
    why = "Solvent, field and temperature are those of the main spectrum."
    return RoleGuess(role="reference", why=why)


def same_field(one_mhz: float, other_mhz: float) -> bool:
    """Whether two spectrometers have one nominal field."""
    return abs(one_mhz - other_mhz) <= SAME_FIELD_SHARE * max(one_mhz, other_mhz)


def same_temperature(one_k: float | None, other_k: float | None) -> bool:
    """Whether two temperatures agree; an unknown one does not speak against it."""
    if one_k is None or other_k is None:
        return True
    return abs(one_k - other_k) <= SAME_TEMPERATURE_K


def _days_between(earlier: str | None, later: str | None) -> int | None:
    try:
        first = date.fromisoformat((earlier or "")[:10])
        second = date.fromisoformat((later or "")[:10])
    except ValueError:  # no date, or one in words
        return None
    return (second - first).days
