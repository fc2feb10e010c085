"""Labelled data records: labels, comments, blocks, arrays, decimal commas."""

import pytest

from spinledger.io.records import (
    parse_blocks,
    parse_number,
    parse_parameters,
    plain_label,
)


def test_labels_differ_only_in_letters_and_digits() -> None:
    # The standard's own example: these four are one label.
    spellings = ("XUNITS", "xunits", "xUNITS", "X-UNITS", "X_UNITS", "X / UNITS")
    assert {plain_label(label) for label in spellings} == {"XUNITS"}


@pytest.mark.parametrize(
    ("text", "number"),
    [
        ("300.13", 300.13),
        (" <42> ", 42.0),
        ("60,25", 60.25),
        ("-1,5e3", -1500.0),
        ("1.0D+02", 100.0),
        (".5", 0.5),
        ("43.79d", 43.79),
        ("25 degC", 25.0),
        ("nan", None),
        ("1e999", None),
        ("off", None),
        ("", None),
    ],
)
def test_numbers_are_read_as_written(text: str, number: float | None) -> None:
    assert parse_number(text) == number


def test_comments_end_values_and_continuation_lines_belong_to_them() -> None:
    block = parse_parameters("##A= 5 $$ remark\n##TEXT= one\ntwo $$ x\n\nthree\n##B=6")
    assert block.number("A") == 5
    assert block.text("TEXT") == "one\ntwo \nthree"
    assert block.number("B") == 6


def test_arrays_are_read_by_index_over_line_ends() -> None:
    block = parse_parameters("##$P= (0..4)\n0 8.5\n9.25 0 7\n##$D=(0..1) 1 2\n")
    assert [block.element("$P", index) for index in (1, 2, 4, 5)] == [
        8.5,
        9.25,
        7,
        None,
    ]
    assert block.element("$D", 1) == 2
    assert block.element("$NONE", 1) is None


def test_unfinished_text_and_array_end_with_the_file() -> None:
    block = parse_parameters("##$SOLVENT= <CDCl3\n##$P= (0..63)\n0 8.5")
    assert block.text("$SOLVENT") == "<CDCl3"
    assert block.element("$P", 1) == 8.5
    assert block.element("$P", 40) is None


def test_blocks_nest_and_unclosed_ones_are_kept() -> None:
    text = "##TITLE= outer\n##TITLE= inner\n##X= 1\n##END=\n##Y= 2\n"
    inner, outer = parse_blocks(text)
    assert (inner.text("TITLE"), inner.number("X"), inner.number("Y")) == (
        "inner",
        1,
        None,
    )
    assert (outer.text("TITLE"), outer.number("Y")) == ("outer", 2)


def test_lists_split_at_commas_but_not_at_decimal_ones() -> None:
    plain = parse_blocks("##TITLE=\n##FIRST= 0,1.5,2\n##END=")[0]
    assert plain.listed("FIRST") == ["0", "1.5", "2"]
    text = "##TITLE=\n##.OBSERVE FREQUENCY= 60,25\n##FIRST= 0,5, 1,25, 2\n##END="
    decimal = parse_blocks(text)[0]
    assert decimal.has_decimal_commas
    assert [parse_number(item) for item in decimal.listed("FIRST")] == [0.5, 1.25, 2.0]
