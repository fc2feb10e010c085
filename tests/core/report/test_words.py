"""Numbers and words of a report, against hand-written examples."""

from dataclasses import replace

import pytest

from invented_ledger import invented_ledger, overlapped_ledger
from spinledger.report.words import (
    fixed,
    nominal_mhz,
    outgoing,
    outgoing_state,
    signed,
    solvent_glyphs,
    with_sd,
)


@pytest.mark.parametrize(
    ("value", "sd", "digits", "text"),
    [
        (4.1903, 0.0001, 4, "4.1903(1)"),
        (4.19034, 0.00004, 4, "4.1903(1)"),  # never smaller than one unit
        (2.960, 0.002, 4, "2.960(2)"),
        (2.960, 0.0021, 4, "2.960(3)"),  # rounded up
        (16.5, 0.02, 2, "16.50(2)"),
        (7.1, 0.96, 2, "7(1)"),  # 9.6 tenths round up to one unit
        (7.1, 0.2, 2, "7.1(2)"),
        (7.1, 12.0, 2, "7(12)"),
        (7.1, None, 2, "7.10"),
        (7.1, 0.0, 2, "7.10"),
        (-0.01234, 0.0005, 4, "−0.0123(5)"),
    ],
)
def test_sd_in_brackets_counts_units_of_the_last_digit(
    value: float, sd: float | None, digits: int, text: str
) -> None:
    assert with_sd(value, sd, digits=digits) == text


def test_minus_is_the_real_sign_and_zero_has_none() -> None:
    assert fixed(-1.5, 1) == "\u22121.5"
    assert fixed(-0.001, 2) == "0.00"
    assert signed(-1.44, 1) == "\u22121.4"
    assert signed(0.9, 1) == "+0.9"


@pytest.mark.parametrize(
    ("frequency", "text"),
    [(400.13, "400"), (599.77, "600"), (300.13, "300"), (61.2, "61"), (499.84, "500")],
)
def test_field_is_printed_as_journals_do(frequency: float, text: str) -> None:
    assert nominal_mhz(frequency) == text


@pytest.mark.parametrize(
    ("name", "text"),
    [
        ("CDCl3", "CDCl₃"),
        ("D2O", "D₂O"),
        ("DMSO-d6", "DMSO-d₆"),
        ("C2D2Cl4", "C₂D₂Cl₄"),
        ("CD3CO2D", "CD₃CO₂D"),
    ],
)
def test_solvents_get_subscripts(name: str, text: str) -> None:
    assert solvent_glyphs(name) == text


def test_only_outgoing_words_leave_the_laboratory() -> None:
    ledger = overlapped_ledger()
    words = {one.claim: outgoing_state(ledger, one) for one in ledger.entries}
    assert words["2'-H"] == "assigned"
    assert words["4-H"] == "inconsistent"
    assert words["3-OH"] == "exchanged"
    assert outgoing("4-H is disputed, not reconciled.") == (
        "4-H is inconsistent, inconsistent with the drawn structure."
    )


def test_words_that_only_look_like_states_stay() -> None:
    assert outgoing("the fit had not settled in time") == (
        "The fit had not settled in time."
    )
    assert outgoing("an open chain") == "An open chain."
    assert outgoing("two disputed claims") == "Two inconsistent claims."


def test_fragments_become_sentences_and_labels_stay() -> None:
    assert outgoing("all 5 H agree") == "All 5 H agree."
    assert outgoing("β-H stands alone") == "β-H stands alone."
    assert outgoing("") == ""


def test_a_hidden_carbon_proton_is_not_said_to_be_exchanged() -> None:
    ledger = invented_ledger()
    hidden = next(one for one in ledger.entries if one.claim == "4-H")
    assert outgoing_state(ledger, replace(hidden, state="silent")) == "not observed"
