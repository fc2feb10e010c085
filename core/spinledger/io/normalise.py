"""One spelling for what makers write in many: nuclei, dates, flip angles, delays."""

from __future__ import annotations

import datetime
import math
import re
from pathlib import Path

from spinledger.errors import SpectrumFormatError

_MASS_FIRST = re.compile(r"(\d{1,3})\s*-?\s*([A-Za-z]{1,2})")
_MASS_LAST = re.compile(r"([A-Za-z]{1,2})\s*-?\s*(\d{1,3})")
_WORD_MASS = re.compile(r"([A-Za-z]+)\s*-?\s*(\d{1,3})?")
# Symbol and the isotope meant where none is named.
_ELEMENTS = {
    "proton": ("H", "1"),
    "hydrogen": ("H", "1"),
    "h": ("H", "1"),
    "deuterium": ("H", "2"),
    "lithium": ("Li", "7"),
    "boron": ("B", "11"),
    "carbon": ("C", "13"),
    "nitrogen": ("N", "15"),
    "oxygen": ("O", "17"),
    "fluorine": ("F", "19"),
    "sodium": ("Na", "23"),
    "aluminium": ("Al", "27"),
    "aluminum": ("Al", "27"),
    "silicon": ("Si", "29"),
    "phosphorus": ("P", "31"),
    "selenium": ("Se", "77"),
    "tin": ("Sn", "119"),
    "platinum": ("Pt", "195"),
}


def shown(text: str, longest: int = 40) -> str:
    """Text of a header as it may stand in a sentence: one line, printable, short."""
    plain = "".join(sign if sign.isprintable() else " " for sign in text)
    return " ".join(plain.split())[:longest]


def nucleus_name(written: str | None) -> str | None:
    """Nucleus in the form "1H" from "^1H", "H1", "Proton", "<13C>" and the like.

    Text that names no nucleus ("off", "") gives None; an unknown word is kept.

    Examples
    --------
    >>> nucleus_name("^1H"), nucleus_name("Proton"), nucleus_name("C13")
    ('1H', '1H', '13C')
    """
    if written is None:
        return None
    cleaned = written.strip().strip("<>^\"'").strip()
    if not cleaned or cleaned.lower() in {"off", "none", "undefined", "unknown"}:
        return None
    word = _WORD_MASS.fullmatch(re.sub(r"\s*atom$", "", cleaned, flags=re.IGNORECASE))
    element = _ELEMENTS.get(word[1].lower()) if word else None
    if word and element:
        return (word[2] or element[1]) + element[0]
    first = _MASS_FIRST.fullmatch(cleaned)
    if first:
        return first[1] + first[2].capitalize()
    last = _MASS_LAST.fullmatch(cleaned)
    if last:
        return last[2] + last[1].capitalize()
    return cleaned


def require_proton(path: Path, nucleus: str | None) -> tuple[str, tuple[str, ...]]:
    """Check that data are proton data: the nucleus and the notes to it.

    Raises
    ------
    SpectrumFormatError
        If the nucleus is another one.
    """
    if nucleus is None:
        return "1H", ("The file does not name the nucleus; it was taken as 1H.",)
    if nucleus != "1H":
        raise SpectrumFormatError(
            path,
            f"holds {shown(nucleus, 12)} data and only 1H can be reconciled; "
            "give the proton spectrum of this sample",
        )
    return nucleus, ()


def bruker_group_delay(
    decimation: float | None, firmware: float | None, delay_points: float | None
) -> float | None:
    """Digital-filter delay of Bruker data, points, may be fractional.

    Parameters
    ----------
    decimation, firmware, delay_points : float or None
        DECIM, DSPFVS and GRPDLY of the header.

    Returns
    -------
    float or None
        None where the header asks for a delay that it does not tell.

    References
    ----------
    .. [1] Table of delays by decimation and firmware version as in nmrglue
       (J. J. Helmus, C. P. Jaroniec, J. Biomol. NMR 55 (2013) 355-367,
       doi:10.1007/s10858-013-9718-x).
    """
    if delay_points is not None and delay_points > 0:
        return delay_points
    if decimation is None or decimation <= 1:
        return 0.0
    # nmrglue takes a second to import: only the older files need its table.
    from nmrglue.fileio.bruker import bruker_dsp_table  # noqa: PLC0415

    by_decimation = bruker_dsp_table.get(round(firmware or 0), {})
    found = by_decimation.get(round(decimation))
    return None if found is None else float(found)


def iso_date_from_seconds(seconds: float | None) -> str | None:
    """ISO 8601 date (UTC) of a time in seconds since 1970, None if implausible."""
    # 1980: before that no spectrometer wrote such files; 2100: a broken clock.
    if seconds is None or not 315532800 < seconds < 4102444800:
        return None
    moment = datetime.datetime.fromtimestamp(seconds, tz=datetime.UTC)
    return moment.date().isoformat()


_YEAR_FIRST = re.compile(r"(\d{4})[-/.]?(\d{2})[-/.]?(\d{2})")
_MONTHS = [
    "jan",
    "feb",
    "mar",
    "apr",
    "may",
    "jun",
    "jul",
    "aug",
    "sep",
    "oct",
    "nov",
    "dec",
]
_MONTH_WORD = re.compile(r"(\d{1,2})[ -]+([A-Za-z]{3})[a-z]*[ ,-]+(\d{4})")
_WORD_MONTH = re.compile(r"([A-Za-z]{3})[a-z]*[ -]+(\d{1,2})[ ,-]+(\d{4})")


def iso_date(text: str | None) -> str | None:
    """ISO 8601 date from text such as "2006/01/31 09:24" or "05 Nov 2007".

    All-digit forms with the year last are ambiguous and give None.

    Examples
    --------
    >>> iso_date("2006/01/31 09:24:52+0000"), iso_date("05 Nov 2007 17:38:45")
    ('2006-01-31', '2007-11-05')
    """
    if text is None:
        return None
    year_first = _YEAR_FIRST.match(text.strip())
    if year_first:
        return _valid_date(int(year_first[1]), int(year_first[2]), int(year_first[3]))
    day_first = _MONTH_WORD.search(text)
    if day_first and day_first[2].lower() in _MONTHS:
        month = _MONTHS.index(day_first[2].lower()) + 1
        return _valid_date(int(day_first[3]), month, int(day_first[1]))
    month_first = _WORD_MONTH.search(text)
    if month_first and month_first[1].lower() in _MONTHS:
        month = _MONTHS.index(month_first[1].lower()) + 1
        return _valid_date(int(month_first[3]), month, int(month_first[2]))
    return None


def _valid_date(year: int, month: int, day: int) -> str | None:
    try:
        return datetime.date(year, month, day).isoformat()
    except ValueError:
        return None


_RIGHT_ANGLE_PROGRAMS = frozenset(
    {"zg", "zgpr", "zgcppr", "zg2d", "zgesgp", "noesypr1d", "noesygppr1d"}
)


def flip_angle_deg(pulse_program: str | None) -> float | None:
    """Flip angle that the usual name of a one-pulse experiment states, degrees.

    "zg30" turns by 30 degrees, "zg60" by 60, plain "zg" and its presaturation
    forms by 90 (common practice); other names give None.
    """
    if pulse_program is None:
        return None
    name = pulse_program.strip().lower()
    if name.startswith("zg30"):
        return 30.0
    if name.startswith("zg60"):
        return 60.0
    if name in _RIGHT_ANGLE_PROGRAMS:
        return 90.0
    return None


def kelvin(value: float | None) -> float | None:
    """Temperature in K if it is one that a liquid sample can have."""
    return value if value is not None and 100 < value < 600 else None


def kelvin_from_label(value: float | None) -> float | None:
    """Temperature in K from a label whose unit files disagree on.

    The standard has degrees Celsius, some exporters write K; no liquid sample is
    above 200 degrees Celsius or below 200 K.
    """
    if value is not None and value > 200:
        return kelvin(value)
    return kelvin_from_celsius(value)


def kelvin_from_celsius(value: float | None) -> float | None:
    """Temperature in K from degrees Celsius, None if implausible."""
    return None if value is None else kelvin(value + 273.15)


def positive(value: float | None) -> float | None:
    """The value if it is finite and above zero, else None."""
    return value if value is not None and math.isfinite(value) and value > 0 else None


def count(value: float | None) -> int | None:
    """A positive whole number below a thousand million, else None."""
    return int(value) if value is not None and 1 <= value < 1e9 else None
