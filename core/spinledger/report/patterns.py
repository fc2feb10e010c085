"""Splitting patterns as printed, and the couplings that belong to their letters.

Couplings in Hz.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from spinledger.values.ledger import Entry, EntryCoupling, Ledger

# Protons that a letter stands for: a doublet comes from one, a triplet from two.
_PROTONS: Mapping[str, int] = {
    "d": 1,
    "t": 2,
    "q": 3,
    "quint": 4,
    "quin": 4,
    "p": 4,
    "pent": 4,
    "sext": 5,
    "hex": 5,
    "sept": 6,
    "hept": 6,
    "oct": 7,
    "non": 8,
    "nonet": 8,
}
_LETTERS = re.compile(r"quint|quin|pent|sext|hex|sept|hept|oct|nonet|non|[dtqp]")
_PREFIXES = ("br", "app", "ps")


@dataclass(frozen=True, slots=True, kw_only=True)
class PrintedCoupling:
    """One J of a pattern: its value and the claims on the other side."""

    j_hz: float
    partners: tuple[str, ...]


def letters_of(pattern: str) -> tuple[str, ...]:
    """Splitting letters of a pattern, largest J first; empty for s, m and others.

    Examples
    --------
    >>> letters_of("dqd")
    ('d', 'q', 'd')
    >>> letters_of("br s"), letters_of("AA′XX′"), letters_of("app quint")
    ((), (), ('quint',))
    """
    core = "".join(word for word in pattern.split() if word not in _PREFIXES)
    found = _LETTERS.findall(core)
    return tuple(found) if "".join(found) == core else ()


def printed_couplings(ledger: Ledger, entry: Entry) -> tuple[PrintedCoupling, ...]:
    """The couplings to print beside a pattern, one a letter, largest first.

    Each coupling is matched with the same one of the partner's entry and
    rounded once, so that both rows print one number. Where one letter comes
    from several partners (a sextet from CH2 and CH3), their mean is printed.

    Parameters
    ----------
    ledger : Ledger
    entry : Entry

    Returns
    -------
    tuple of PrintedCoupling
        Empty for singlets, multiplets and patterns that are not first order.
    """
    letters = letters_of(entry.multiplicity or "")
    waiting = sorted(
        (one for one in entry.couplings if one.determined and one.j_hz is not None),
        key=lambda one: -abs(one.j_hz or 0.0),
    )
    printed: list[PrintedCoupling] = []
    for letter in letters:
        taken = _take(waiting, _PROTONS[letter], ledger)
        if not taken:
            break
        printed.append(_mean(ledger, entry, taken))
    return tuple(printed)


def matched_j_hz(ledger: Ledger, entry: Entry, coupling: EntryCoupling) -> float:
    """|J| of a coupling, the same from both sides, rounded once to 0.1 Hz.

    Raises
    ------
    ValueError
        If the coupling is not determined.
    """
    if coupling.j_hz is None:
        raise ValueError("coupling: an undetermined J has no value to print")
    other = _other_side(ledger, entry, coupling)
    values = [abs(coupling.j_hz)]
    if other is not None and other.j_hz is not None:
        values.append(abs(other.j_hz))
    return _rounded(sum(values) / len(values))


def _take(
    waiting: list[EntryCoupling], n_protons: int, ledger: Ledger
) -> list[EntryCoupling]:
    taken: list[EntryCoupling] = []
    while waiting and n_protons > 0:
        coupling = waiting.pop(0)
        taken.append(coupling)
        n_protons -= _protons_of(ledger, coupling.partner)
    return taken


def _mean(
    ledger: Ledger, entry: Entry, taken: Sequence[EntryCoupling]
) -> PrintedCoupling:
    weights = [_protons_of(ledger, one.partner) for one in taken]
    total = sum(
        weight * matched_j_hz(ledger, entry, one)
        for weight, one in zip(weights, taken, strict=True)
    )
    return PrintedCoupling(
        j_hz=_rounded(total / sum(weights)),
        partners=tuple(one.partner for one in taken),
    )


def _other_side(
    ledger: Ledger, entry: Entry, coupling: EntryCoupling
) -> EntryCoupling | None:
    """The same coupling in the partner's row; J and J' are told by their order."""
    mine = [one for one in entry.couplings if one.partner == coupling.partner]
    rank = next(i for i, one in enumerate(mine) if one is coupling)
    partner = next(
        (one for one in ledger.entries if one.claim == coupling.partner), None
    )
    if partner is None:
        return None
    theirs = [one for one in partner.couplings if one.partner == entry.claim]
    return theirs[rank] if rank < len(theirs) else None


def _protons_of(ledger: Ledger, label: str) -> int:
    return next((one.protons for one in ledger.entries if one.claim == label), 1)


def _rounded(j_hz: float) -> float:
    # A tiny push settles halves the same way on every machine.
    return round(j_hz + 1e-9, 1)
