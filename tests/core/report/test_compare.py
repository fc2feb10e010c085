"""Published lists: reading journal text, and comparing it with a ledger."""

from pathlib import Path

import pytest

from invented_ledger import invented_ledger, overlapped_ledger
from spinledger.report.compare import compare_lists, list_of_json, list_of_ledger
from spinledger.report.json_ledger import ledger_to_json
from spinledger.report.published import (
    ListedSignal,
    PublishedListError,
    SignalList,
    parse_published,
    read_published,
)
from spinledger.report.text import TextOptions, experimental_text

Facts = tuple[float, float, float | None, str | None, tuple[float, ...]]


def facts(text: str) -> list[Facts]:
    return [
        (s.high_ppm, s.low_ppm, s.n_protons, s.multiplicity, s.couplings_hz)
        for s in parse_published(text).signals
    ]


# Forms as they stand in journals (common practice); read by eye.
FORMS: list[tuple[str, list[Facts]]] = [
    (
        "¹H NMR (400 MHz, CDCl₃) δ 7.35–7.28 (m, 5H), 4.19 (dqd, J = 8.6, 6.3, 3.4 Hz, "
        "1H, H3), −0.05 (s, 9H).",
        [
            (7.35, 7.28, 5, "m", ()),
            (4.19, 4.19, 1, "dqd", (8.6, 6.3, 3.4)),
            (-0.05, -0.05, 9, "s", ()),
        ],
    ),
    (
        "δH(400 MHz; CDCl3) 4.19 (1 H, dqd, J 8.6, 6.3 and 3.4, 3-H), "
        "3.31 (2 x 3H, s, OMe); δC(100 MHz; CDCl3) 170.1 (C), 65.2 (1 C, CH)",
        [(4.19, 4.19, 1, "dqd", (8.6, 6.3, 3.4)), (3.31, 3.31, 6, "s", ())],
    ),
    (
        "1H-NMR (DMSO-d6, 300 MHz): 9.56 (bs, 2H, OH), 7.39 (d, 2H, J = 8.5 Hz, H-2', "
        "H-6'), 6.38 (d, J(H,H) = 2.0 Hz, 2H). 13C NMR: 158.4 (d, 2C)",
        [
            (9.56, 9.56, 2, "br s", ()),
            (7.39, 7.39, 2, "d", (8.5,)),
            (6.38, 6.38, 2, "d", (2.0,)),
        ],
    ),
    (
        "1H NMR (600 MHz, CD3OD) 2.72 (td, 3J = 13.5, 2J = 4.4 Hz, 1H), 1.25 (app t, "
        "J=7.1Hz, 3H), 1.20 (br. s., 1 H), 0.9 (quintet, J = 7 Hz, 2H)",
        [
            (2.72, 2.72, 1, "td", (13.5, 4.4)),
            (1.25, 1.25, 3, "app t", (7.1,)),
            (1.20, 1.20, 1, "br s", ()),
            (0.9, 0.9, 2, "quint", (7.0,)),
        ],
    ),
]


@pytest.mark.parametrize(("text", "expected"), FORMS)
def test_journal_forms_are_read(text: str, expected: list[Facts]) -> None:
    assert facts(text) == expected


@pytest.mark.parametrize(
    ("text", "solvent", "field"),
    [
        (FORMS[0][0], "CDCl3", 400.0),
        (FORMS[2][0], "DMSO-d6", 300.0),
        (FORMS[3][0], "CD3OD", 600.0),
        ("1H NMR 3.4 (s, 3H)", None, None),
    ],
)
def test_conditions_are_read(
    text: str, solvent: str | None, field: float | None
) -> None:
    found = parse_published(text)
    assert (found.solvent, found.field_mhz) == (solvent, field)


@pytest.mark.parametrize("style", ["acs", "rsc"])
def test_our_own_text_reads_back(style: str) -> None:
    options = TextOptions(style=style)  # type: ignore[arg-type]
    back = parse_published(experimental_text(invented_ledger(), options))
    assert [one.high_ppm for one in back.signals] == [
        4.19,
        4.17,
        2.96,
        2.49,
        2.42,
        1.27,
        1.22,
    ]
    assert sum(one.n_protons or 0 for one in back.signals) == 12
    assert back.signals[0].couplings_hz == (8.6, 6.3, 3.4)


def test_text_without_a_list_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "list.txt"
    path.write_text("The product was a colourless oil (3.2 g, 81 %).")
    with pytest.raises(PublishedListError, match="no proton list was found"):
        read_published(path)
    with pytest.raises(PublishedListError, match="No such file"):
        read_published(tmp_path / "absent.txt")


def moved(signals: SignalList, by_ppm: float) -> SignalList:
    return SignalList(
        signals=tuple(
            ListedSignal(
                low_ppm=one.low_ppm + by_ppm,
                high_ppm=one.high_ppm + by_ppm,
                n_protons=one.n_protons,
                multiplicity=one.multiplicity,
                couplings_hz=one.couplings_hz,
                label=one.label,
            )
            for one in signals.signals
        ),
        solvent=signals.solvent,
        field_mhz=signals.field_mhz,
    )


@pytest.mark.parametrize("offset", [-0.21, -0.03, 0.0, 0.04, 0.25])
def test_common_offset_is_found_and_taken_out(offset: float) -> None:
    mine = list_of_ledger(invented_ledger())
    result = compare_lists(mine, moved(mine, -offset))
    assert result.offset_ppm == pytest.approx(offset, abs=1e-9)
    assert len(result.pairs) == 7
    assert all(one.mine.label == one.published.label for one in result.pairs)
    assert max(abs(one.difference_ppm) for one in result.pairs) < 1e-9


def test_one_wrong_shift_does_not_move_the_offset() -> None:
    mine = list_of_ledger(invented_ledger())
    published = parse_published(
        "1H NMR (400 MHz, CDCl3) 4.20 (dqd, J = 8.6, 6.3, 3.4 Hz, 1H), 4.18 (q, J = 7.2 "
        "Hz, 2H), 2.50 (dd, J = 16.5, 3.4 Hz, 1H), 2.33 (dd, J = 16.5, 8.6 Hz, 1H), "
        "1.28 (t, J = 7.2 Hz, 3H), 1.23 (d, J = 6.3 Hz, 3H)"
    )
    result = compare_lists(mine, published)
    # Five of six lie 0.007 to 0.012 under the printed ones (two decimals).
    assert result.offset_ppm == pytest.approx(-0.01, abs=0.003)
    gaps = {one.mine.label: one.difference_ppm for one in result.pairs}
    assert gaps["2-HB"] == pytest.approx(0.089 + 0.01, abs=0.004)
    assert [one.label for one in result.only_mine] == ["3-OH"]
    couplings = {one.mine.label: one.couplings_hz for one in result.pairs}
    assert couplings["1'-H"] == ((7.13, 7.2),)


def test_missing_signals_counts_and_patterns_are_said() -> None:
    mine = list_of_ledger(invented_ledger())
    published = parse_published(
        "1H NMR (300 MHz, DMSO-d6) 4.19 (m, 1H), 4.17 (q, J = 7.1 Hz, 2H), 2.49 (m, 2H), "
        "1.27 (t, 3H), 1.22 (d, 3H), 7.80 (s, 1H)"
    )
    result = compare_lists(mine, published)
    assert [one.high_ppm for one in result.only_published] == [7.80]
    assert {one.label for one in result.only_mine} == {"3-OH", "2-HB"}
    remarks = " ".join(" ".join(one.remarks) for one in result.pairs)
    assert "1 H here, 2 H published" in remarks
    assert "dqd here, m published" in remarks
    said = " ".join(result.remarks)
    assert "The solvents differ: CDCl3 here, DMSO-d6 published" in said
    assert "The fields differ: 400 MHz here, 300 MHz published" in said


def test_a_shift_inside_a_published_range_agrees() -> None:
    mine = list_of_ledger(invented_ledger())
    published = parse_published("1H NMR (CDCl3) 4.25-4.10 (m, 1H), 1.27 (t, 3H)")
    result = compare_lists(mine, published)
    pair = next(one for one in result.pairs if one.published.low_ppm == 4.10)
    assert pair.difference_ppm == 0.0


def test_ledger_and_its_json_give_the_same_list() -> None:
    for ledger in (invented_ledger(), overlapped_ledger()):
        assert list_of_json(ledger_to_json(ledger)) == list_of_ledger(ledger)
    shared = list_of_ledger(overlapped_ledger()).signals[0]
    assert (shared.low_ppm, shared.high_ppm, shared.n_protons) == (4.13, 4.23, 3)
