"""One spelling for nuclei, dates, angles and temperatures; nmrglue's faults at the border."""

import struct
import warnings
from pathlib import Path

import pytest

from spinledger.errors import SpectrumFormatError
from spinledger.io import normalise
from spinledger.io.border import vendor_border


@pytest.mark.parametrize(
    ("written", "nucleus"),
    [
        ("1H", "1H"),
        ("^1H", "1H"),
        ("<1H>", "1H"),
        ("H1", "1H"),
        ("1h", "1H"),
        ("Proton", "1H"),
        ("hydrogen atom", "1H"),
        ("H-1", "1H"),
        ("13C", "13C"),
        ("C13", "13C"),
        ("Carbon13", "13C"),
        ("carbon-13", "13C"),
        ("2H", "2H"),
        ("Deuterium", "2H"),
        ("Phosphorus31", "31P"),
        ("Si29", "29Si"),
        ("off", None),
        ("<>", None),
        ("", None),
        (None, None),
    ],
)
def test_nuclei_in_one_spelling(written: str | None, nucleus: str | None) -> None:
    assert normalise.nucleus_name(written) == nucleus


@pytest.mark.parametrize(
    ("text", "date"),
    [
        ("2006/01/31 09:24:52+0000", "2006-01-31"),
        ("2023-11-14T12:00:00.000", "2023-11-14"),
        ("20130513T112833", "2013-05-13"),
        ("05 Nov 2007 17:38:45", "2007-11-05"),
        ("13-AUG-2024 00:1", "2024-08-13"),
        ("May 13 2013", "2013-05-13"),
        ("November 2, 2021", "2021-11-02"),
        ("11/12/2010", None),  # day or month first: nobody can tell
        ("2010/13/40", None),
        ("", None),
        (None, None),
    ],
)
def test_dates_in_iso_form(text: str | None, date: str | None) -> None:
    assert normalise.iso_date(text) == date


def test_dates_from_seconds() -> None:
    # Coordinated time: 1 700 000 000 s after 1970 is 2023-11-14 22:13:20.
    assert normalise.iso_date_from_seconds(1.7e9) == "2023-11-14"
    assert normalise.iso_date_from_seconds(0.0) is None
    assert normalise.iso_date_from_seconds(1e300) is None


@pytest.mark.parametrize(
    ("program", "angle_deg"),
    [
        ("zg30", 30.0),
        ("zg30.dj", 30.0),
        ("zg60", 60.0),
        ("zg", 90.0),
        ("zgcppr", 90.0),
        ("noesygppr1d", 90.0),
        ("cosygpqf", None),
        (None, None),
    ],
)
def test_flip_angle_by_the_name_of_the_program(
    program: str | None, angle_deg: float | None
) -> None:
    assert normalise.flip_angle_deg(program) == angle_deg


def test_header_text_is_shown_as_one_short_line() -> None:
    assert normalise.shown("a\n##b\0c\t d") == "a ##b c d"
    assert len(normalise.shown("x" * 500)) == 40


@pytest.mark.parametrize(
    "fault",
    [
        KeyError(14),
        IndexError("list index out of range"),
        ValueError("bad"),
        struct.error("unpack requires a buffer"),
        AssertionError(),
        OverflowError("too large"),
    ],
)
def test_faults_of_nmrglue_become_one_sentence(fault: Exception) -> None:
    raises = pytest.raises(SpectrumFormatError, match="is damaged")
    with raises as caught, vendor_border(Path("x")):
        raise fault
    assert caught.value.__cause__ is fault


def test_warnings_of_nmrglue_do_not_pass_the_border() -> None:
    with vendor_border(Path("x")):
        warnings.warn("JCAMP-DX key without value", UserWarning, stacklevel=1)


def test_own_errors_pass_the_border_unchanged() -> None:
    own = SpectrumFormatError(Path("y"), "is empty")
    with pytest.raises(SpectrumFormatError) as caught, vendor_border(Path("x")):
        raise own
    assert caught.value is own
