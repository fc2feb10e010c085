"""``spinledger compare``: a ledger against a published proton list."""

from __future__ import annotations

import argparse
import json
import sys
from dataclasses import asdict

from spinledger.report.compare import (
    ComparedPair,
    ListComparison,
    compare_lists,
    list_of_json,
)
from spinledger.report.json_ledger import LedgerFileError, read_ledger_json
from spinledger.report.published import ListedSignal, read_published
from spinledger.report.words import plain


def run(arguments: argparse.Namespace) -> int:
    """Run the command."""
    tree = read_ledger_json(arguments.ledger)
    published = read_published(arguments.published)
    try:
        mine = list_of_json(tree)
    except (KeyError, TypeError) as error:
        raise LedgerFileError(
            arguments.ledger, f"an entry is not as schema 1 has it ({error})"
        ) from error
    comparison = compare_lists(mine, published)
    if arguments.json:
        text = json.dumps(asdict(comparison), indent=1, ensure_ascii=False)
        sys.stdout.write(text + "\n")
        return 0
    sys.stdout.write(_text(comparison))
    return 0


def _text(comparison: ListComparison) -> str:
    lines = [
        f"common offset {plain(comparison.offset_ppm, 3, sign='+')} ppm (here minus published), "
        "taken out of every difference",
        *comparison.remarks,
        f"{'here':>15s} {'published':>15s} {'diff/ppm':>9s}  J/Hz here/published",
    ]
    lines += [_pair(one) for one in comparison.pairs]
    lines += [f"only here:      {_signal(one)}" for one in comparison.only_mine]
    lines += [f"only published: {_signal(one)}" for one in comparison.only_published]
    return "\n".join(lines) + "\n"


def _pair(pair: ComparedPair) -> str:
    couplings = ", ".join(
        f"{mine:.1f}/{theirs:.1f}" for mine, theirs in pair.couplings_hz
    )
    remarks = f"  [{'; '.join(pair.remarks)}]" if pair.remarks else ""
    return (
        f"{_place(pair.mine, 3):>15s} {_place(pair.published, 2):>15s} "
        f"{plain(pair.difference_ppm, 3, sign='+'):>9s}  {couplings}  {pair.mine.label}{remarks}"
    )


def _signal(signal: ListedSignal) -> str:
    count = "" if signal.n_protons is None else f"{signal.n_protons:g} H"
    parts = (_place(signal, 2), signal.multiplicity or "", count, signal.label)
    return ", ".join(part for part in parts if part)


def _place(signal: ListedSignal, digits: int) -> str:
    if signal.low_ppm == signal.high_ppm:
        return plain(signal.high_ppm, digits)
    return f"{plain(signal.high_ppm, 2)}-{plain(signal.low_ppm, 2)}"
