"""A published proton list beside the ledger: rows, remarks and text to copy."""

from __future__ import annotations

from typing import TYPE_CHECKING

from spinledger_app.presenters.wording import number, say

if TYPE_CHECKING:
    from spinledger.report.compare import ComparedPair, ListComparison
    from spinledger.report.published import ListedSignal


def published_head() -> tuple[str, ...]:
    """Names of the columns."""
    return (
        say("Here"),
        say("Published"),
        say("Difference, ppm"),
        say("J here / published, Hz"),
        say("Remarks"),
    )


def published_rows(comparison: ListComparison) -> list[tuple[str, ...]]:
    """Pairs by falling shift, then what stands on one side only."""
    rows = [_pair(pair) for pair in comparison.pairs]
    rows += [
        (_place(one), "", "", "", say("only here")) for one in comparison.only_mine
    ]
    rows += [
        ("", _place(one), "", "", say("only published"))
        for one in comparison.only_published
    ]
    return rows


def published_words(comparison: ListComparison) -> str:
    """The common offset, and what else must be known to read the differences."""
    offset = say(
        "A common offset of {offset} ppm (here minus published) is taken out of every difference."
    ).format(offset=number(comparison.offset_ppm, 3))
    return " ".join((offset, *(f"{one.rstrip('.')}." for one in comparison.remarks)))


def published_tsv(comparison: ListComparison) -> str:
    """Head and rows, tabs between cells."""
    rows = [published_head(), *published_rows(comparison)]
    return "\n".join("\t".join(cells) for cells in rows)


def _pair(pair: ComparedPair) -> tuple[str, ...]:
    couplings = ", ".join(
        f"{number(mine, 1)} / {number(theirs, 1)}" for mine, theirs in pair.couplings_hz
    )
    return (
        _named(pair.mine),
        _place(pair.published),
        number(pair.difference_ppm, 3),
        couplings,
        "; ".join(pair.remarks),
    )


def _named(signal: ListedSignal) -> str:
    return f"{_place(signal)}  {signal.label}".rstrip()


def _place(signal: ListedSignal) -> str:
    if signal.low_ppm == signal.high_ppm:
        return number(signal.high_ppm, 3)
    return f"{number(signal.high_ppm, 2)}–{number(signal.low_ppm, 2)}"
