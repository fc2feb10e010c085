"""JEOL Delta files (.jdf): FIDs and processed spectra.

The records are laid out as nmrglue's jeol module has them, but read here: nmrglue
0.12 fails on older files (units of mega and larger), on titles that are not UTF-8,
and multiplies text parameters by powers of ten.
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
from spinledger.io.checksum import file_sha256
from spinledger.io.experiment import Experiment, field_text, summary_line
from spinledger.io.limits import MAX_BINARY_BYTES, check_point_count, read_bytes
from spinledger.io.samples import (
    as_floats,
    check_fid_samples,
    check_frequency,
    check_width,
    complex_from_parts,
    make_spectrum,
    plausible_carrier,
)
from spinledger.values.acquisition import Fid, MakerSpectrum, Metadata

KIND = "jeol"
FID_NAME = "JEOL file"
SPECTRUM_NAME = "JEOL spectrum"
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
_SECOND, _HERTZ, _PPM, _CELSIUS, _KELVIN = 28, 13, 26, 4, 14
_AXIS_REAL, _AXIS_COMPLEX = 1, 3
_TEXT, _INTEGER, _FLOAT = 0, 1, 2


def is_file_head(head: bytes) -> bool:
    """Whether a file begins as JEOL files do."""
    return head.startswith(MAGIC)


def describe(path: Path) -> Experiment:
    """What the file holds, by its header."""
    file = _read_file(path)
    parameters = file.parameters
    nucleus = _nucleus(file)
    frequency_mhz = _frequency_mhz(file)
    acquired_on = _date(parameters)
    return Experiment(
        name=path.name,
        path=path,
        format_name=FID_NAME if file.is_fid else SPECTRUM_NAME,
        n_dimensions=file.n_dimensions,
        nucleus=nucleus,
        summary=summary_line(
            nucleus,
            field_text(frequency_mhz),
            parameters.text("experiment"),
            parameters.text("solvent"),
            acquired_on,
        ),
        has_fid=file.is_fid,
        has_spectrum=not file.is_fid,
        spectrometer_frequency_mhz=frequency_mhz,
        acquired_on=acquired_on,
        kind=KIND,
    )


def read(path: Path, *, prefer_processed: bool = False) -> Fid | MakerSpectrum:  # noqa: ARG001 - one call for all readers
    """FID or spectrum of the file, whichever it holds.

    Raises
    ------
    SpectrumFormatError
        If the data are not 1D proton data, damaged, or lack a parameter.
    """
    file = _read_file(path)
    if file.n_dimensions != 1:
        raise SpectrumFormatError(
            path, "holds 2D or arrayed data; give the 1D proton file of this sample"
        )
    nucleus, notes = normalise.require_proton(path, _nucleus(file))
    frequency_mhz = check_frequency(path, _frequency_mhz(file))
    if file.is_fid:
        return _read_fid(path, file, frequency_mhz, nucleus, notes)
    return _read_spectrum(path, file, frequency_mhz, nucleus, notes)


# ---- file, header, parameters


@dataclass(frozen=True, slots=True, kw_only=True)
class _Parameter:
    value: str | float | None
    unit_base: int


@dataclass(frozen=True, slots=True)
class _Parameters:
    """Parameters by lower-case name, values in SI units (or ppm, degrees)."""

    found: dict[str, _Parameter]

    def text(self, *names: str) -> str | None:
        for name in names:
            parameter = self.found.get(name)
            if parameter and isinstance(parameter.value, str) and parameter.value:
                return parameter.value
        return None

    def number(self, *names: str) -> float | None:
        for name in names:
            parameter = self.found.get(name)
            if parameter is not None and isinstance(parameter.value, float):
                return parameter.value
        return None

    def temperature_k(self, *names: str) -> float | None:
        for name in names:
            value, parameter = self.number(name), self.found.get(name)
            if value is None or parameter is None:
                continue
            if parameter.unit_base == _KELVIN:
                return normalise.kelvin(value)
            return normalise.kelvin_from_celsius(value)
        return None


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class _File:
    header: Any  # one record of _HEADER
    parameters: _Parameters
    content: bytes

    @property
    def n_dimensions(self) -> int:
        return int(np.count_nonzero(self.header["axis_types"]))

    @property
    def is_fid(self) -> bool:
        return int(self.header["unit_bases"][1]) not in (_PPM, _HERTZ)


def _read_file(path: Path) -> _File:
    content = read_bytes(path, MAX_BINARY_BYTES)
    if not content.startswith(MAGIC) or len(content) < _HEADER.itemsize:
        raise SpectrumFormatError(
            path, "is not a complete JEOL file; copy it from the spectrometer again"
        )
    header = np.frombuffer(content, _HEADER, count=1)[0]
    return _File(
        header=header, parameters=_read_parameters(content, header), content=content
    )


def _read_parameters(content: bytes, header: Any) -> _Parameters:
    order = "<" if header["little_endian"] == 1 else ">"
    start = int(header["parameters_at"])
    n_records = (len(content) - start - 16) // 64
    if n_records < 1:
        return _Parameters({})
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
    found: dict[str, _Parameter] = {}
    for item in records:
        name = _plain_text(bytes(item["name"])).lower()
        if name:
            found.setdefault(
                name,
                _Parameter(
                    value=_value(item, order), unit_base=int(item["units"][1] & 0x7F)
                ),
            )
    return _Parameters(found)


def _value(item: Any, order: str) -> str | float | None:
    raw = item["value"].tobytes()
    if item["type"] == _TEXT:
        return _plain_text(raw)
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


def _plain_text(raw: bytes) -> str:
    """Text up to the first zero byte, in whichever encoding it was written."""
    raw = raw.split(b"\0", 1)[0]
    for encoding in ("utf-8", "shift_jis"):
        try:
            return raw.decode(encoding).strip()
        except UnicodeDecodeError:
            continue
    return raw.decode("latin-1").strip()


# ---- facts


def _nucleus(file: _File) -> str | None:
    axis_title = _plain_text(bytes(file.header["axis_titles"][0]))
    return normalise.nucleus_name(
        file.parameters.text("x_domain")
    ) or normalise.nucleus_name(axis_title)


def _frequency_mhz(file: _File) -> float | None:
    base_mhz = float(file.header["base_mhz"][0])
    if math.isfinite(base_mhz) and base_mhz > 0:
        return base_mhz
    frequency_hz = file.parameters.number("x_freq")
    return None if frequency_hz is None else frequency_hz / 1e6


def _date(parameters: _Parameters) -> str | None:
    return normalise.iso_date(parameters.text("actual_start_timestamp"))


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


def _metadata(
    path: Path,
    file: _File,
    frequency_mhz: float,
    nucleus: str,
    notes: tuple[str, ...],
) -> Metadata:
    parameters = file.parameters
    pulse_s = parameters.number("x_pulse")
    return Metadata(
        source_name=path.name,
        sha256=file_sha256(path),
        format_name=FID_NAME if file.is_fid else SPECTRUM_NAME,
        nucleus=nucleus,
        spectrometer_frequency_mhz=frequency_mhz,
        solvent=parameters.text("solvent"),
        temperature_k=parameters.temperature_k("temp_get", "temp_set"),
        n_scans=normalise.count(parameters.number("total_scans", "scans")),
        pulse_program=parameters.text("experiment"),
        pulse_length_us=normalise.positive(None if pulse_s is None else pulse_s * 1e6),
        pulse_angle_deg=normalise.positive(parameters.number("x_angle")),
        relaxation_delay_s=normalise.positive(parameters.number("relaxation_delay")),
        acquired_on=_date(parameters),
        title=_plain_text(bytes(file.header["title"])) or None,
        notes=notes,
    )


# ---- data


def _sections(
    path: Path, file: _File
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64] | None, int]:
    """Real part, imaginary part if there is one, and the declared length."""
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
    real = numbers[:n_stored][kept]
    imaginary = numbers[n_stored:][kept] if n_sections == 2 else None
    return real, imaginary, kept.stop - kept.start


def _read_fid(
    path: Path,
    file: _File,
    frequency_mhz: float,
    nucleus: str,
    notes: tuple[str, ...],
) -> Fid:
    real, imaginary, n_declared = _sections(path, file)
    if imaginary is None:
        raise SpectrumFormatError(
            path, "holds only the real part of its FID; export it with both parts"
        )
    # JEOL's frequencies run the other way round: the conjugate has our sense.
    samples, sample_notes = check_fid_samples(
        path, complex_from_parts(real, -imaginary), n_declared
    )
    delay, delay_notes = _delay(file.parameters, samples.size)
    return Fid(
        metadata=_metadata(
            path, file, frequency_mhz, nucleus, (*notes, *sample_notes, *delay_notes)
        ),
        samples=samples,
        spectral_width_hz=check_width(path, _width_hz(file, n_declared)),
        carrier_ppm=plausible_carrier(file.parameters.number("x_offset")),
        group_delay_points=delay,
    )


def _width_hz(file: _File, n_points: int) -> float | None:
    """Width from the time axis, else from the sweep."""
    start, stop = (
        float(file.header[name][0]) for name in ("axis_starts", "axis_stops")
    )
    span_s = stop - start
    if math.isfinite(span_s) and span_s > 0:
        return (n_points - 1) / span_s
    return file.parameters.number("x_sweep")


def _delay(parameters: _Parameters, n_points: int) -> tuple[float, tuple[str, ...]]:
    if (parameters.text("digital_filter") or "").upper() == "FALSE":
        return 0.0, ()
    delay = digital_filter_delay(parameters.text("orders"), parameters.text("factors"))
    if delay is None:
        return 0.0, (
            "The file does not tell the delay of the digital filter; "
            "it was taken as zero.",
        )
    return (delay, ()) if delay < n_points / 2 else (0.0, ())


def _read_spectrum(
    path: Path,
    file: _File,
    frequency_mhz: float,
    nucleus: str,
    notes: tuple[str, ...],
) -> MakerSpectrum:
    real, imaginary, n_declared = _sections(path, file)
    first, last = (
        float(file.header[name][0]) for name in ("axis_starts", "axis_stops")
    )
    if int(file.header["unit_bases"][1]) == _HERTZ:
        first, last = first / frequency_mhz, last / frequency_mhz
    if real.size < n_declared / 2 or not math.isfinite(first - last):
        raise SpectrumFormatError(
            path, "is cut short or has no shift axis; copy it from the spectrometer"
        )
    spectrum = make_spectrum(
        path,
        real,
        imaginary=imaginary,
        first_point_ppm=first,
        step_hz=(last - first) / (n_declared - 1) * frequency_mhz,
        spectrometer_frequency_mhz=frequency_mhz,
    )
    return MakerSpectrum(
        metadata=_metadata(path, file, frequency_mhz, nucleus, notes),
        spectrum=spectrum,
    )
