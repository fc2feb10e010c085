"""Every form of JCAMP-DX data table against worked examples and another decoder."""

import numpy as np
import pytest
from nmrglue.fileio import jcampdx as nmrglue_jcampdx

from spinledger.io.asdf import TableError, decode_table

# One series in each form, after the worked example of the JCAMP-DX 4.24 paper.
SERIES = [1000.0, 2000.0, 2001.0, 2002.0, 2003.0, 2003.0, 2003.0]
FORMS = {
    "AFFN": "1 1000 2000 2001 2002 2003 2003 2003",
    "AFFN with exponents": "1 1.0E+03 2.0E3 2001 2002. 2.003e+3 2003 2003",
    "PAC": "1+1000+2000+2001+2002+2003+2003+2003",
    "SQZ": "1A000B000B001B002B003B003B003",
    "DIF": "1A000J000JJJ%%",
    "SQZ with DUP": "1A000B000B001B002B003U",
    "DIF with DUP": "1A000J000JU%T",
}


def decode(
    *lines: str, max_points: int = 1000, decimal_commas: bool = False
) -> list[float]:
    ordinates = decode_table(
        lines, max_points=max_points, decimal_commas=decimal_commas
    )
    return ordinates.values.tolist()


@pytest.mark.parametrize("form", FORMS)
def test_every_form_gives_the_same_series(form: str) -> None:
    assert decode(FORMS[form]) == SERIES


def test_negative_digits_carry_their_sign() -> None:
    assert decode("0a5B5j1%") == [-15.0, 25.0, 14.0, 14.0]
    assert decode("0-15+25-3") == [-15.0, 25.0, -3.0]
    assert decode("0-15 +25-3") == [-15.0, 25.0, -3.0]
    assert decode("0 -15+25 -3") == [-15.0, 25.0, -3.0]


def test_check_value_after_differences_is_dropped() -> None:
    # Line 2 repeats 2003, the last ordinate of line 1, and goes on from it.
    assert decode("1A000J000JJJ", "4B003J0") == [1000, 2000, 2001, 2002, 2003, 2013]


def test_check_value_after_repeated_differences_is_dropped() -> None:
    assert decode("1A0JU", "4A3J") == [10, 11, 12, 13, 14]


def test_line_after_squeezed_values_is_not_a_check() -> None:
    assert decode("1A0A0", "3A0B0") == [10, 10, 10, 20]


def test_last_line_may_be_the_check_alone() -> None:
    assert decode("1A0JJ", "3A2") == [10, 11, 12]


def test_wrong_check_value_is_counted() -> None:
    ordinates = decode_table(["1A0J", "2B0J"], max_points=10)
    assert ordinates.n_failed_checks == 1


def test_decimal_commas_are_read_as_points() -> None:
    assert decode("0,5 1,25 -3,5", decimal_commas=True) == [1.25, -3.5]
    assert decode("4226,7D6D7", decimal_commas=True) == [46.0, 47.0]


def test_commas_separate_where_points_are_decimal() -> None:
    assert decode("0.5,1.25,-3.5") == [1.25, -3.5]


@pytest.mark.parametrize("lines", [("1A0S999999999",), ("1A0JZ99999999",)])
def test_absurd_repeat_counts_are_refused_before_expanding(lines: tuple[str]) -> None:
    with pytest.raises(TableError, match="more than 1000 points"):
        decode(*lines)


@pytest.mark.parametrize(
    ("line", "reason"),
    [
        ("1J5", "begins with a difference"),
        ("1S5", "begins with a repeat count"),
        ("1A0#5", "unknown form"),
        ("xA0B0", "unknown form"),
        ("1A0.0.0B0", "bad number"),
        ("1 ? 5", "unreadable"),
        ("", "empty"),
    ],
)
def test_damaged_tables_say_what_is_wrong(line: str, reason: str) -> None:
    with pytest.raises(TableError, match=reason):
        decode(line)


def packed_lines(values: list[int], per_line: int, *, differences: bool) -> list[str]:
    """Encoder written from the tables of digits, for the round trip below."""
    squeezed = {True: "@ABCDEFGHI", False: "@abcdefghi"}
    different = {True: "%JKLMNOPQR", False: "%jklmnopqr"}

    def word(value: int, digits: dict[bool, str]) -> str:
        text = str(abs(value))
        return digits[value >= 0][int(text[0])] + text[1:]

    lines, start = [], 0
    while start < len(values):
        line = str(start) + word(values[start], squeezed)
        stop = min(start + per_line, len(values))
        for index in range(start + 1, stop):
            step = values[index] - values[index - 1]
            line += (
                word(step, different) if differences else word(values[index], squeezed)
            )
        lines.append(line)
        # In DIF form the last value comes again as the first of the next line.
        start = stop - 1 if differences and stop < len(values) else stop
    return lines


@pytest.mark.parametrize("differences", [True, False])
@pytest.mark.parametrize("seed", range(5))
def test_packed_tables_agree_with_an_independent_decoder(
    seed: int, *, differences: bool
) -> None:
    rng = np.random.default_rng(seed)
    values = np.rint(rng.normal(0, 10.0 ** rng.integers(1, 8), 500)).astype(int)
    lines = packed_lines(values.tolist(), 12, differences=differences)
    assert decode(*lines) == values.tolist()
    other, _ = nmrglue_jcampdx._parse_data("(X++(Y..Y))\n" + "\n".join(lines))
    np.testing.assert_array_equal(other, values)
