"""Shifts and couplings of one ledger by label, to be set beside others; ppm and Hz."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from spinledger.values.ledger import Ledger

# Fitted sds hold for the noise; shim and overlap add this much [common practice].
COUPLING_FLOOR_HZ = 0.08
# Spectra in one solvent at one temperature: concentration, pH and salt move shifts
# by this much, in water more [common practice].
SHIFT_SD_PPM = 0.01
SHIFT_SD_WATER_PPM = 0.02

CouplingKey = tuple[str, str, int]


@dataclass(frozen=True, slots=True, kw_only=True)
class Figure:
    """A fitted value with its sd."""

    value: float
    sd: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Table:
    """What one ledger found.

    Attributes
    ----------
    shifts_ppm : dict of str to Figure
        Placed claims.
    couplings_hz : dict of (str, str, int) to Figure
        |J| of determined couplings; labels in order, and a number where two
        claims have several couplings (J and J').
    turned : tuple of (str, str)
        Claims taken the other way round than the ledger has them.
    """

    shifts_ppm: dict[str, Figure]
    couplings_hz: dict[CouplingKey, Figure]
    turned: tuple[tuple[str, str], ...] = ()


def table_of(ledger: Ledger) -> Table:
    """Shifts and determined couplings of a ledger."""
    shifts = {
        one.claim: Figure(value=one.shift_ppm, sd=one.shift_sd_ppm or 0.0)
        for one in ledger.entries
        if one.shift_ppm is not None
    }
    couplings = {}
    for entry in ledger.entries:
        counts: dict[str, int] = {}
        for one in entry.couplings:
            number = counts.get(one.partner, 0)
            counts[one.partner] = number + 1
            if one.j_hz is None or one.j_sd_hz is None:
                continue
            sd = float(np.hypot(one.j_sd_hz, COUPLING_FLOOR_HZ))
            key = coupling_key(entry.claim, one.partner, number)
            couplings[key] = Figure(value=abs(one.j_hz), sd=sd)
    return Table(shifts_ppm=shifts, couplings_hz=couplings)


def coupling_key(claim: str, partner: str, number: int = 0) -> CouplingKey:
    """Key of a coupling, the same from both sides."""
    first, second = sorted((claim, partner))
    return first, second, number


def turned(table: Table, pair: tuple[str, str]) -> Table:
    """Table with two claims the other way round."""
    names = {pair[0]: pair[1], pair[1]: pair[0]}

    def new(label: str) -> str:
        return names.get(label, label)

    return replace(
        table,
        shifts_ppm={new(key): one for key, one in table.shifts_ppm.items()},
        couplings_hz={
            coupling_key(new(a), new(b), k): one
            for (a, b, k), one in table.couplings_hz.items()
        },
        turned=(*table.turned, pair),
    )


def exchangeable_pairs(ledger: Ledger) -> Iterator[tuple[str, str]]:
    """Claims that one spectrum alone may have the wrong way round."""
    seen = set()
    partners = {one.label: one.pair for one in ledger.claims.claims}
    for entry in ledger.entries:
        names = set()
        if (pair := partners.get(entry.claim)) is not None:
            names.add(pair)
        if entry.group is not None and entry.group.kind == "interchangeable":
            names.update(entry.group.partners)
        for name in sorted(names):
            key = tuple(sorted((entry.claim, name)))
            if key not in seen:
                seen.add(key)
                yield key[0], key[1]


def disagreement(one: Table, other: Table, shift_sd_ppm: float | None) -> float:
    """Capped sum of squared residuals between two tables.

    Parameters
    ----------
    one, other : Table
    shift_sd_ppm : float or None
        None where the two solvents or temperatures differ: then only couplings.
    """
    total = 0.0
    for key, mine in one.couplings_hz.items():
        theirs = other.couplings_hz.get(key)
        if theirs is not None:
            total += _capped(mine.value - theirs.value, np.hypot(mine.sd, theirs.sd))
    if shift_sd_ppm is None:
        return total
    offset = zero_offset(one, other)
    for label, mine in one.shifts_ppm.items():
        theirs = other.shifts_ppm.get(label)
        if theirs is not None:
            total += _capped(mine.value - theirs.value - offset, shift_sd_ppm)
    return total


def zero_offset(one: Table, other: Table) -> float:
    """Median difference of the shifts: what the two references differ by."""
    apart = [
        mine.value - other.shifts_ppm[label].value
        for label, mine in one.shifts_ppm.items()
        if label in other.shifts_ppm
    ]
    return float(np.median(apart)) if apart else 0.0


def _capped(apart: float, sd: float) -> float:
    # 25: beyond five sd a value is wrong, however far.
    return min(float((apart / sd) ** 2), 25.0)


def brought_in_order(
    ledger: Ledger, main: Table, *, shift_sd_ppm: float | None
) -> Table:
    """Table of a ledger with look-alike claims in the order that suits the main one.

    Only a gain of more than 4 (two sd) turns a pair round.
    """
    table = table_of(ledger)
    pairs = list(exchangeable_pairs(ledger))
    for _ in range(len(pairs)):
        now = disagreement(main, table, shift_sd_ppm)
        tries = [turned(table, pair) for pair in pairs]
        costs = [disagreement(main, one, shift_sd_ppm) for one in tries]
        if not costs or min(costs) > now - 4.0:
            break
        table = tries[int(np.argmin(costs))]
    return table
