"""No sign in front of a printed zero, in any form that leaves."""

import re
from dataclasses import replace
from pathlib import Path

import pytest

from invented_ledger import invented_ledger, with_entry
from spinledger.report.compare import ListComparison
from spinledger.report.context import ReportContext
from spinledger.report.write import FILE_NAMES, write_reports
from spinledger.values.ledger import Ledger

MINUS_ZERO = re.compile(r"(?<![\w.])[-\u2212+]0(?:\.0*)?(?![\d.]*[1-9])(?![\w.])")


def nearly_nothing() -> Ledger:
    """A ledger whose numbers round to zero from below."""
    tiny = -4e-9
    ledger = with_entry(
        invented_ledger(),
        "4-H",
        shift_ppm=tiny,
        range_ppm=(tiny, tiny / 2),
        integral_protons=tiny,
        shift_residual_sd=tiny,
        integral_residual_sd=tiny,
        j_residual_sd=tiny,
    )
    strays = tuple(
        replace(one, why="Satellite of the line at -0.000 ppm.")
        for one in ledger.strays
    )
    return replace(ledger, strays=strays)


@pytest.mark.parametrize("name", ["csv", "text", "html", "nmredata"])
def test_zero_has_no_sign(name: str, tmp_path: Path) -> None:
    comparison = ListComparison(
        offset_ppm=-1e-7, pairs=(), only_mine=(), only_published=(), remarks=()
    )
    context = ReportContext(comparison=comparison)
    write_reports(nearly_nothing(), tmp_path, formats=(name,), context=context)
    text = (tmp_path / FILE_NAMES[name]).read_text("utf-8")
    # Drawings and style sheets hold coordinates, not words; molfiles, their own.
    text = re.sub(
        r"<svg.*?</svg>|<style.*?</style>|^.*M  END", "", text, flags=re.DOTALL
    )
    found = MINUS_ZERO.search(text)
    assert found is None, text[max(0, found.start() - 40) : found.end() + 20]


def test_minus_zero_is_found_by_the_pattern() -> None:
    for text in ("at -0.000 ppm", "+0.0 sd", "\u22120.00", "(-0,"):
        assert MINUS_ZERO.search(text)
    for text in ("-0.001", "2-HA", "10-0", "+0.04"):
        assert not MINUS_ZERO.search(text)
