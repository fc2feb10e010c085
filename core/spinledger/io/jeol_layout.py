"""Layout of JEOL Delta files: header, parameters, data sections, filter delay.

Offsets and codes are those of nmrglue's jeol module.

References
----------
.. [1] J. J. Helmus, C. P. Jaroniec, J. Biomol. NMR 55 (2013) 355-367,
   doi:10.1007/s10858-013-9718-x.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from spinledger.errors import SpectrumFormatError
from spinledger.io import normalise
from spinledger.io.limits import MAX_BINARY_BYTES, check_point_count, read_bytes
from spinledger.io.samples import as_floats

MAGIC = b"JEOL.NMR"

_HEADER = np.dtype(
    {
        "names": [
            "little_endian",
            "n_dimensions",
            "data_type",
            "axis_types",
            "unit_bases",
            "title",
            "points",
            "starts",
            "stops",
            "axis_starts",
            "axis_stops",
            "axis_titles",
            "base_mhz",
            "parameters_at",
            "data_at",
        ],
        "formats": [
            "u1",
            "u1",
            "u1",
            ("u1", 8),
            ("u1", 16),
            "S124",
            (">u4", 8),
            (">u4", 8),
            (">u4", 8),
            (">f8", 8),
            (">f8", 8),
            ("S32", 8),
            (">f8", 8),
            ">u4",
            ">u4",
        ],
        "offsets": [
            *(8, 12, 14, 24, 32, 48, 176, 208),
            *(240, 272, 336, 808, 1064, 1212, 1284),
        ],
        "itemsize": 1360,
    }
)
# Codes of units; degrees Celsius are 4 and the default for temperatures.
HERTZ, _PPM, _KELVIN = 13, 26, 14
_AXIS_REAL, _AXIS_COMPLEX = 1, 3
_TEXT, _INTEGER, _FLOAT = 0, 1, 2


@dataclass(frozen=True, slots=True, kw_only=True)
class JeolParameter:
    """One parameter: text or number (in SI units, ppm or degrees), and its unit."""

    value: str | float | None
    unit_base: int


@dataclass(frozen=True, slots=True)
class JeolParameters:
    """Parameters by lower-case name, values in SI units (or ppm, degrees)."""

    found: dict[str, JeolParameter]

    def text(self, *names: str) -> str | None:
        """First of the named parameters that is a text and not empty."""
        for name in names:
            parameter = self.found.get(name)
            if parameter and isinstance(parameter.value, str) and parameter.value:
                return parameter.value
        return None

    def number(self, *names: str) -> float | None:
        """First of the named parameters that is a number."""
        for name in names:
            parameter = self.found.get(name)
            if parameter is not None and isinstance(parameter.value, float):
                return parameter.value
        return None

    def temperature_k(self, *names: str) -> float | None:
        """First of the named parameters as a temperature, K."""
        for name in names:
            value, parameter = self.number(name), self.found.get(name)
            if value is None or parameter is None:
                continue
            if parameter.unit_base == _KELVIN:
                return normalise.kelvin(value)
            return normalise.kelvin_from_celsius(value)
        return None


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class JeolFile:
    """A whole file in memory with its header taken apart."""

    header: Any  # one record of _HEADER
    parameters: JeolParameters
    content: bytes

    @property
    def n_dimensions(self) -> int:
        """Number of axes."""
        return int(np.count_nonzero(self.header["axis_types"]))

    @property
    def is_fid(self) -> bool:
        """Whether the first axis is of time."""
        return int(self.header["unit_bases"][1]) not in (_PPM, HERTZ)


def read_file(path: Path) -> JeolFile:
    """Header and parameters of a file.

    Raises
    ------
    SpectrumFormatError
        If it is not a whole JEOL file.
    """
    content = read_bytes(path, MAX_BINARY_BYTES)
    if not content.startswith(MAGIC) or len(content) < _HEADER.itemsize:
        raise SpectrumFormatError(
            path, "is not a complete JEOL file; copy it from the spectrometer again"
        )
    header = np.frombuffer(content, _HEADER, count=1)[0]
    return JeolFile(
        header=header, parameters=_read_parameters(content, header), content=content
    )


def _read_parameters(content: bytes, header: Any) -> JeolParameters:
    order = "<" if header["little_endian"] == 1 else ">"
    start = int(header["parameters_at"])
    n_records = (len(content) - start - 16) // 64
    if n_records < 1:
        return JeolParameters({})
    declared = int(np.frombuffer(content, order + "u4", count=4, offset=start)[2])
    record = np.dtype(
        [
            ("class", "u1", 4),
            ("scaler", order + "i2"),
            ("units", "u1", 10),
            ("value", "V16"),
            ("type", order + "i4"),
            ("name", "S28"),
        ]
    )
    records = np.frombuffer(
        content, record, count=min(n_records, declared + 1, 10_000), offset=start + 16
    )
    found: dict[str, JeolParameter] = {}
    for item in records:
        name = plain_text(bytes(item["name"])).lower()
        if name:
            found.setdefault(
                name,
                JeolParameter(
                    value=_value(item, order), unit_base=int(item["units"][1] & 0x7F)
                ),
            )
    return JeolParameters(found)


def _value(item: Any, order: str) -> str | float | None:
    raw = item["value"].tobytes()
    if item["type"] == _TEXT:
        return plain_text(raw)
    if item["type"] == _INTEGER:
        return float(np.frombuffer(raw, order + "i4", count=1)[0])
    if item["type"] != _FLOAT:
        return None
    value = float(np.frombuffer(raw, order + "f8", count=1)[0])
    exponent = int(item["scaler"]) + _prefix_exponent(int(item["units"][0]))
    if not math.isfinite(value) or abs(exponent) > 60:
        return None
    return value * 10.0**exponent


def _prefix_exponent(unit_byte: int) -> int:
    """Power of ten of a unit's prefix: its high nibble, signed, in thousands."""
    nibble = unit_byte >> 4
    signed = nibble - 16 if nibble >= 8 else nibble
    return -3 * signed


def plain_text(raw: bytes) -> str:
    """Text up to the first zero byte, in whichever encoding it was written."""
    raw = raw.split(b"\0", 1)[0]
    for encoding in ("utf-8", "shift_jis"):
        try:
            return raw.decode(encoding).strip()
        except UnicodeDecodeError:
            continue
    return raw.decode("latin-1").strip()


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Sections:
    """Data of a file, as many points as are there, and how many there should be."""

    real: npt.NDArray[np.float64]
    imaginary: npt.NDArray[np.float64] | None
    n_declared: int


def read_sections(path: Path, file: JeolFile) -> Sections:
    """Real part, and imaginary part if there is one.

    Raises
    ------
    SpectrumFormatError
        If the axis is of an unknown kind or of absurd length.
    """
    header = file.header
    axis_type = int(header["axis_types"][0])
    if axis_type not in (_AXIS_REAL, _AXIS_COMPLEX):
        raise SpectrumFormatError(
            path, "has an unknown kind of axis; export it as JCAMP-DX and give that"
        )
    n_stored = check_point_count(path, int(header["points"][0]))
    order = "<" if header["little_endian"] == 1 else ">"
    kind = np.dtype(order + ("f8" if header["data_type"] >> 6 == 0 else "f4"))
    start = int(header["data_at"])
    n_sections = 2 if axis_type == _AXIS_COMPLEX else 1
    n_there = max(0, (len(file.content) - start) // kind.itemsize)
    numbers = as_floats(
        np.frombuffer(
            file.content,
            kind,
            count=min(n_there, n_sections * n_stored),
            offset=min(start, len(file.content)),
        )
    )
    # The sections follow one another: a cut file loses the imaginary part first.
    first, last = int(header["starts"][0]), int(header["stops"][0])
    kept = slice(first, last + 1) if first <= last < n_stored else slice(0, n_stored)
    return Sections(
        real=numbers[:n_stored][kept],
        imaginary=numbers[n_stored:][kept] if n_sections == 2 else None,
        n_declared=kept.stop - kept.start,
    )


def digital_filter_delay(orders: str | None, factors: str | None) -> float | None:
    """Delay of the cascade of decimating filters, points after the last one.

    Parameters
    ----------
    orders : str or None
        Number of stages and then the order of each, in columns of equal width.
    factors : str or None
        Decimation factor of each stage.

    Returns
    -------
    float or None
        Sum over the stages of (order - 1)/2 divided by the product of that and
        all later factors; None if the text does not hold that.

    Notes
    -----
    Each linear-phase stage delays by half its length at its input rate; the
    factors that follow turn this into points at the output rate. From memory.

    Examples
    --------
    >>> round(digital_filter_delay("2 41 73", "6 2"), 2)
    19.67
    """
    if not (orders and orders.strip()) or not factors:
        return None
    count, *numbers = orders.split()
    has_spaces = bool(numbers)
    if not has_spaces:  # then the count is the first digit
        count, numbers = count[0], [count[1:]]
    if not (count.isdecimal() and count.isascii()) or not 1 <= int(count) <= 9:
        return None
    if has_spaces and len(numbers) != int(count):
        return None
    lengths = _stage_numbers(numbers, int(count))
    rates = _stage_numbers(factors.split(), int(count))
    if lengths is None or rates is None:
        return None
    if min(rates) < 1 or min(lengths) < 1:
        return None
    return sum(
        (length - 1) / 2 / math.prod(rates[stage:])
        for stage, length in enumerate(lengths)
    )


def _stage_numbers(words: list[str], n_stages: int) -> list[int] | None:
    """One number a stage, apart by spaces or in columns of equal width."""
    if not all(word.isdecimal() and word.isascii() for word in words):
        return None
    if len(words) == n_stages:
        return [int(word) for word in words]
    if len(words) != 1 or len(words[0]) % n_stages:
        return None
    width = len(words[0]) // n_stages
    columns = (words[0][i * width : (i + 1) * width] for i in range(n_stages))
    return [int(column) for column in columns]
