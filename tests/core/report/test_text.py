"""Experimental-section text against the conventions of the journals.

Each convention is a row of the table of text conventions (common practice of
the ACS and RSC journals, from memory).
"""

import csv
import re
from dataclasses import replace

from invented_ledger import invented_ledger, overlapped_ledger, with_entry
from shared_data import shared
from spinledger.report.patterns import letters_of, printed_couplings
from spinledger.report.text import (
    TextOptions,
    experimental_runs,
    experimental_text,
    reference_sentence,
    standing_sentence,
)
from spinledger.values.ledger import EntryCoupling, Ledger

NO_BREAK = "\u00a0"


def plain(ledger: Ledger, options: TextOptions | None = None) -> str:
    return experimental_text(ledger, options).replace(NO_BREAK, " ")


def test_sentence_reads_as_printed_in_a_journal() -> None:
    # Written by hand from the invented values.
    assert plain(invented_ledger()) == (
        "¹H NMR (400 MHz, CDCl₃) δ 4.19 (dqd, J = 8.6, 6.3, 3.4 Hz, 1H, 3-H), "
        "4.17 (q, J = 7.1 Hz, 2H, 1′-H), 2.96 (br s, 1H, 3-OH), "
        "2.49 (dd, J = 16.5, 3.4 Hz, 1H, 2-HA), 2.42 (dd, J = 16.5, 8.6 Hz, 1H, 2-HB), "
        "1.27 (t, J = 7.1 Hz, 3H, 2′-H), 1.22 (d, J = 6.3 Hz, 3H, 4-H)."
    )


def test_a_mixture_prints_the_protons_found() -> None:
    ledger = with_entry(
        invented_ledger(), "4-H", species=1, integral_protons=1.086, protons=3
    )
    assert "(d, J = 6.3 Hz, 1.09H, 4-H)" in plain(ledger)


def test_conventions_of_the_table_hold() -> None:
    with shared("reference", "text_conventions_1h.csv").open(encoding="utf-8") as file:
        rules = {row["item"]: row for row in csv.DictReader(file)}
    text = plain(invented_ledger())
    opener = rules["line opener"]["form"].replace("1H", "¹H").replace("CDCl3", "CDCl₃")
    assert text.startswith(opener.split(" d ")[0])
    assert rules["shift digits"]["form"].startswith("0.01 ppm for 1H")
    shifts = [float(one) for one in re.findall(r"(\d+\.\d+) \(", text)]
    assert all(
        len(one.partition(".")[2]) == 2 for one in re.findall(r"(\d+\.\d+) \(", text)
    )
    assert rules["order"]["form"].startswith("high to low")
    assert shifts == sorted(shifts, reverse=True)
    assert rules["J digits"]["form"] == "0.1 Hz"
    for listed in re.findall(r"J = ([\d., ]+) Hz", text):
        values = [one.strip() for one in listed.split(",")]
        assert all(len(one.partition(".")[2]) == 1 for one in values)
        assert [float(one) for one in values] == sorted(
            map(float, values), reverse=True
        )
    example = rules["range for m"]["form"]  # 7.35-7.28 (m, 5H), en dash, larger first
    assert re.fullmatch(r"\d\.\d\d-\d\.\d\d \(m, \dH\)", example)
    assert "4.23–4.13 (m, 3H" in plain(overlapped_ledger())
    codes = rules["multiplicity codes"]["form"] + rules["multiplicity codes"]["note"]
    for code in ("quint", "sext", "sept", "ddt"):
        assert code in codes
        assert letters_of(code)


def test_unresolved_overlap_is_one_range_with_the_sum_of_protons() -> None:
    text = plain(overlapped_ledger(), TextOptions(with_assignment=False))
    assert "δ 4.23–4.13 (m, 3H), 2.49" in text
    assert "dqd" not in text


def test_resolved_overlap_is_marked_as_a_fit() -> None:
    text = plain(overlapped_ledger(), TextOptions(resolve_overlap=True))
    assert text.count("from line-shape fit") == 2
    assert "4.19 (dqd, J = 8.6, 6.3, 3.4 Hz, 1H, 3-H, from line-shape fit)" in text


def test_exchanged_and_missing_claims_and_strays_are_left_out() -> None:
    text = plain(overlapped_ledger())
    assert "OH" not in text
    assert "7.26" not in text
    assert "2.12" not in text


def test_units_and_signs_are_held_together() -> None:
    text = experimental_text(invented_ledger())
    assert f"400{NO_BREAK}MHz" in text
    assert f"J{NO_BREAK}={NO_BREAK}8.6, 6.3, 3.4{NO_BREAK}Hz" in text
    assert f"br{NO_BREAK}s" in text
    assert " Hz" not in text


def test_j_alone_is_italic() -> None:
    italic = [run.text for run in experimental_runs(invented_ledger()) if run.is_italic]
    assert italic
    assert set(italic) == {"J"}


def test_signs_of_couplings_stay_inside() -> None:
    text = plain(invented_ledger())
    assert "16.5" in text
    assert "−16.5" not in text
    assert "-16.5" not in text


def test_rsc_form_puts_the_count_first_and_joins_couplings_with_and() -> None:
    text = plain(invented_ledger(), TextOptions(style="rsc", with_assignment=False))
    assert text.startswith("δH (400 MHz; CDCl₃) 4.19 (1H, dqd, J 8.6, 6.3 and 3.4 Hz)")


def test_partners_print_the_same_j_even_where_their_entries_differ() -> None:
    ledger = invented_ledger()

    def changed(claim: str, partner: str, j_hz: float) -> Ledger:
        entry = next(one for one in ledger.entries if one.claim == claim)
        couplings = tuple(
            replace(one, j_hz=j_hz) if one.partner == partner else one
            for one in entry.couplings
        )
        return with_entry(ledger, claim, couplings=couplings)

    # 7.14 and 7.16 alone would print as 7.1 and 7.2; the mean is 7.15.
    ledger = changed("1'-H", "2'-H", 7.14)
    ledger = changed("2'-H", "1'-H", 7.16)
    printed = re.findall(r"[qt], J = (7\.\d)", plain(ledger))
    assert len(printed) == 2
    assert printed[0] == printed[1]


def test_one_letter_from_two_partners_prints_their_weighted_mean() -> None:
    # The middle of a propyl chain: CH2 and CH3 make one sextet.
    def coupling(partner: str, j_hz: float) -> EntryCoupling:
        return EntryCoupling(
            partner=partner,
            j_hz=j_hz,
            j_sd_hz=0.02,
            determined=True,
            predicted_j_hz=7.0,
            predicted_j_sd_hz=1.0,
            kind="vicinal chain",
        )

    ledger = with_entry(
        invented_ledger(),
        "3-H",
        multiplicity="sext",
        couplings=(coupling("1'-H", 6.8), coupling("2'-H", 7.4)),
    )
    entry = next(one for one in ledger.entries if one.claim == "3-H")
    (printed,) = printed_couplings(ledger, entry)
    # (2 x 6.8 + 3 x 7.4) / 5 = 7.16.
    assert printed.j_hz == 7.2
    assert set(printed.partners) == {"1'-H", "2'-H"}


def test_letters_are_read_largest_first_and_m_has_none() -> None:
    assert letters_of("ddt") == ("d", "d", "t")
    assert letters_of("qd") == ("q", "d")
    assert letters_of("br d") == ("d",)
    assert letters_of("app t") == ("t",)
    assert letters_of("dquint") == ("d", "quint")
    for pattern in ("m", "s", "br s", "AA′XX′", "AA'BB'", ""):
        assert letters_of(pattern) == ()


def test_a_multiplet_is_a_range_without_couplings() -> None:
    ledger = with_entry(invented_ledger(), "2-HA", multiplicity="m")
    assert re.search(r"2\.52–2\.46 \(m, 1H, 2-HA\)", plain(ledger))


def test_reference_is_stated() -> None:
    assert reference_sentence(invented_ledger()).replace(NO_BREAK, " ") == (
        "Shifts are given relative to internal TMS (0.00 ppm)."
    )


def test_text_of_an_unsupported_structure_says_so() -> None:
    ledger = invented_ledger()
    assert standing_sentence(ledger) == ""
    for state, word in (("undecided", "provisional"), ("not reconciled", "comparison")):
        verdict = replace(ledger.verdict, state=state)  # type: ignore[arg-type]
        assert word in standing_sentence(replace(ledger, verdict=verdict))


def test_low_field_last_is_an_option() -> None:
    text = plain(invented_ledger(), TextOptions(high_shift_first=False))
    shifts = [float(one) for one in re.findall(r"(\d+\.\d+) \(", text)]
    assert shifts == sorted(shifts)
