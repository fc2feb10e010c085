"""A ledger against a published list: shifts, counts, patterns and couplings.

Shifts in ppm, couplings in Hz.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.optimize import linear_sum_assignment

from spinledger.report.published import ListedSignal, SignalList
from spinledger.values.ledger import Entry, Ledger

# Solvent, concentration and reference move a whole list by less than this.
_LARGEST_OFFSET_PPM = 0.30
# Beyond this, after the offset, two signals are not the same one.
_FARTHEST_PPM = 0.25
_SHIFT_SCALE_PPM = 0.02
_COUNT_COST = 1.0
_PATTERN_COST = 0.3
_UNMATCHED_COST = 6.0


@dataclass(frozen=True, slots=True, kw_only=True)
class ComparedPair:
    """One signal on both sides.

    Attributes
    ----------
    mine, published : ListedSignal
    difference_ppm : float, ppm
        Mine minus published, the common offset taken out.
    couplings_hz : tuple of (mine, published), Hz
        Couplings that were put together, largest first.
    remarks : tuple of str
        What differs in count, pattern or number of couplings.
    """

    mine: ListedSignal
    published: ListedSignal
    difference_ppm: float
    couplings_hz: tuple[tuple[float, float], ...]
    remarks: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class ListComparison:
    """Result of a comparison.

    Attributes
    ----------
    pairs : tuple of ComparedPair
        By falling shift.
    only_mine, only_published : tuple of ListedSignal
    offset_ppm : float, ppm
        Median of mine minus published; taken out of every difference.
    remarks : tuple of str
        Solvent mismatch and the like.
    """

    pairs: tuple[ComparedPair, ...]
    only_mine: tuple[ListedSignal, ...]
    only_published: tuple[ListedSignal, ...]
    offset_ppm: float
    remarks: tuple[str, ...]


def compare_lists(mine: SignalList, published: SignalList) -> ListComparison:
    """Put two lists together, one common offset taken out.

    The offset is searched where the lists agree best and then set to the
    median difference of the pairs; pairs are those of least total cost.

    Parameters
    ----------
    mine, published : SignalList

    Returns
    -------
    ListComparison
    """
    offset = _best_offset(mine.signals, published.signals)
    for _ in range(5):
        pairs = _pairs(mine.signals, published.signals, offset)
        if not pairs:
            break
        gaps = [_gap(mine.signals[i], published.signals[j], 0.0) for i, j in pairs]
        refined = float(np.median(gaps))
        if abs(refined - offset) < 1e-6:
            break
        offset = refined
    pairs = _pairs(mine.signals, published.signals, offset)
    return ListComparison(
        pairs=tuple(
            _compared(mine.signals[i], published.signals[j], offset) for i, j in pairs
        ),
        only_mine=_others(mine.signals, {i for i, _ in pairs}),
        only_published=_others(published.signals, {j for _, j in pairs}),
        offset_ppm=offset,
        remarks=_conditions(mine, published),
    )


def list_of_ledger(ledger: Ledger) -> SignalList:
    """Observed entries of a ledger as a list; a shared signal is one range."""
    evidence = ledger.evidence
    return SignalList(
        signals=_grouped([_facts(entry) for entry in ledger.entries]),
        solvent=evidence.solvent,
        field_mhz=evidence.metadata.spectrometer_frequency_mhz,
    )


def list_of_json(tree: dict[str, Any]) -> SignalList:
    """The same from the tree of a ledger.json.

    Raises
    ------
    KeyError
        If an entry lacks a key of schema 1.
    """
    spectrum = tree.get("spectrum") or {}
    return SignalList(
        signals=_grouped(tree["entries"]),
        solvent=spectrum.get("solvent"),
        field_mhz=spectrum.get("field_mhz"),
    )


def _facts(entry: Entry) -> dict[str, Any]:
    group = entry.group
    return {
        "claim": entry.claim,
        "protons": entry.protons,
        "shift_ppm": entry.shift_ppm,
        "range_ppm": entry.range_ppm,
        "multiplicity": entry.multiplicity,
        "group": group and {"kind": group.kind, "with": list(group.partners)},
        "couplings": [{"j_hz": one.j_hz} for one in entry.couplings],
    }


def _grouped(entries: Sequence[dict[str, Any]]) -> tuple[ListedSignal, ...]:
    seen = [entry for entry in entries if entry["shift_ppm"] is not None]
    groups: list[list[dict[str, Any]]] = []
    for entry in sorted(seen, key=lambda one: -float(one["shift_ppm"])):
        home = next(
            (group for group in groups if any(_shares(entry, one) for one in group)),
            None,
        )
        if home is None:
            groups.append([entry])
        else:
            home.append(entry)
    return tuple(_listed(group) for group in groups)


def _shares(one: dict[str, Any], other: dict[str, Any]) -> bool:
    def names(entry: dict[str, Any], label: str) -> bool:
        group = entry.get("group")
        return bool(group and group["kind"] == "shared" and label in group["with"])

    return names(one, other["claim"]) or names(other, one["claim"])


def _listed(group: Sequence[dict[str, Any]]) -> ListedSignal:
    ranges = [entry["range_ppm"] for entry in group if entry["range_ppm"]]
    shifts = [float(entry["shift_ppm"]) for entry in group]
    is_range = len(group) > 1 and ranges
    values = (
        [abs(one["j_hz"]) for one in group[0]["couplings"] if one["j_hz"] is not None]
        if len(group) == 1
        else []
    )
    return ListedSignal(
        low_ppm=min(one[0] for one in ranges) if is_range else min(shifts),
        high_ppm=max(one[1] for one in ranges) if is_range else max(shifts),
        n_protons=float(sum(entry["protons"] for entry in group)),
        multiplicity=group[0]["multiplicity"] if len(group) == 1 else "m",
        couplings_hz=tuple(sorted(values, reverse=True)),
        label=", ".join(entry["claim"] for entry in group),
    )


def _best_offset(
    mine: Sequence[ListedSignal], published: Sequence[ListedSignal]
) -> float:
    """Offset, among the differences of single pairs, that costs least in all."""
    candidates = {0.0} | {
        gap
        for one in mine
        for other in published
        if abs(gap := _gap(one, other, 0.0)) <= _LARGEST_OFFSET_PPM
    }
    # A small price on the offset itself keeps it at zero where that does as well.
    return min(
        sorted(candidates, key=abs),
        key=lambda offset: _total(mine, published, offset) + abs(offset),
    )


def _total(
    mine: Sequence[ListedSignal], published: Sequence[ListedSignal], offset: float
) -> float:
    if not mine or not published:
        return 0.0
    costs = _costs(mine, published, offset)
    rows, columns = linear_sum_assignment(costs)
    return float(costs[rows, columns].sum())


def _costs(
    mine: Sequence[ListedSignal], published: Sequence[ListedSignal], offset: float
) -> np.ndarray[Any, np.dtype[np.float64]]:
    return np.array(
        [[_cost(one, other, offset) for other in published] for one in mine]
    )


def _cost(one: ListedSignal, other: ListedSignal, offset: float) -> float:
    gap = abs(_gap(one, other, offset))
    if gap > _FARTHEST_PPM:
        return _UNMATCHED_COST
    cost = min(gap / _SHIFT_SCALE_PPM, 4.0)
    if one.n_protons and other.n_protons and one.n_protons != other.n_protons:
        cost += _COUNT_COST
    if (
        one.multiplicity
        and other.multiplicity
        and one.multiplicity != other.multiplicity
    ):
        cost += _PATTERN_COST
    return min(cost, _UNMATCHED_COST - 1e-9)


def _gap(one: ListedSignal, other: ListedSignal, offset: float) -> float:
    """Mine minus published; nothing where a shift lies in the other's range."""
    low, high = other.low_ppm + offset, other.high_ppm + offset
    if one.low_ppm == one.high_ppm and low <= one.low_ppm <= high and low < high:
        return 0.0
    if (
        low == high
        and one.low_ppm <= low <= one.high_ppm
        and one.low_ppm < one.high_ppm
    ):
        return 0.0
    return one.shift_ppm - other.shift_ppm - offset


def _pairs(
    mine: Sequence[ListedSignal], published: Sequence[ListedSignal], offset: float
) -> list[tuple[int, int]]:
    if not mine or not published:
        return []
    costs = _costs(mine, published, offset)
    rows, columns = linear_sum_assignment(costs)
    return [
        (int(i), int(j))
        for i, j in zip(rows, columns, strict=True)
        if costs[i, j] < _UNMATCHED_COST
    ]


def _compared(one: ListedSignal, other: ListedSignal, offset: float) -> ComparedPair:
    return ComparedPair(
        mine=one,
        published=other,
        difference_ppm=_gap(one, other, offset),
        couplings_hz=_coupled(one.couplings_hz, other.couplings_hz),
        remarks=tuple(_remarks(one, other)),
    )


def _coupled(
    mine: Sequence[float], published: Sequence[float]
) -> tuple[tuple[float, float], ...]:
    """Couplings of least total difference; a published value is used once."""
    if not mine or not published:
        return ()
    gaps = np.abs(np.subtract.outer(np.array(mine), np.array(published)))
    rows, columns = linear_sum_assignment(gaps)
    pairs = [
        (mine[int(i)], published[int(j)]) for i, j in zip(rows, columns, strict=True)
    ]
    return tuple(sorted(pairs, reverse=True))


def _remarks(one: ListedSignal, other: ListedSignal) -> list[str]:
    remarks = []
    if one.n_protons and other.n_protons and one.n_protons != other.n_protons:
        remarks.append(f"{one.n_protons:g} H here, {other.n_protons:g} H published")
    if (
        one.multiplicity
        and other.multiplicity
        and one.multiplicity != other.multiplicity
    ):
        remarks.append(f"{one.multiplicity} here, {other.multiplicity} published")
    return remarks


def _others(
    signals: Sequence[ListedSignal], used: set[int]
) -> tuple[ListedSignal, ...]:
    return tuple(one for rank, one in enumerate(signals) if rank not in used)


def _conditions(mine: SignalList, published: SignalList) -> tuple[str, ...]:
    remarks = []
    if published.solvent is None:
        remarks.append("The published list names no solvent.")
    elif mine.solvent is not None and mine.solvent != published.solvent:
        remarks.append(
            f"The solvents differ: {mine.solvent} here, {published.solvent} published; "
            "shifts cannot be compared closely."
        )
    fields = mine.field_mhz, published.field_mhz
    if fields[0] and fields[1] and abs(fields[0] - fields[1]) > 5:
        remarks.append(
            f"The fields differ: {fields[0]:.0f} MHz here, {fields[1]:.0f} MHz "
            "published; second-order patterns may look different."
        )
    return tuple(remarks)
