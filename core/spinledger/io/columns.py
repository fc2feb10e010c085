"""Plain text in columns: shift and intensity, or shift, real and imaginary part.

Numbers may be apart by commas, semicolons, tabs or spaces, with points or commas
as decimal signs. Lines without numbers are remarks; one of them has to tell the
spectrometer frequency, for example "# 400.13 MHz".
"""

from __future__ import annotations

import re
import warnings
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import numpy.typing as npt

from spinledger.errors import SpectrumFormatError
from spinledger.io import normalise
from spinledger.io.checksum import file_sha256
from spinledger.io.experiment import Experiment, field_text, summary_line
from spinledger.io.limits import (
    MAX_POINTS,
    MAX_TEXT_BYTES,
    MIN_POINTS,
    decode_text,
    read_text,
)
from spinledger.io.samples import check_frequency, make_spectrum
from spinledger.values.acquisition import MakerSpectrum, Metadata

KIND = "columns"
FORMAT_NAME = "text in columns"

_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"
_ROW = re.compile(rf"\s*{_NUMBER}(?:(?:\s*[,;\t]\s*|\s+){_NUMBER}){{1,2}}\s*[,;]?\s*")
_FREQUENCY = re.compile(r"(\d+(?:[.,]\d+)?)\s{0,3}MHz", re.IGNORECASE)
_NAMED_FREQUENCY = re.compile(
    r"(?:frequency|sfo1|bf1|field)[^0-9\n]{0,20}(\d+(?:[.,]\d+)?)", re.IGNORECASE
)
_SOLVENT = re.compile(r"solvent\W{1,3}([\w-]+)", re.IGNORECASE)
_NUCLEUS = re.compile(r"nucleus\W{1,3}([\w^]+)", re.IGNORECASE)
# Steps of a written axis differ by its rounding; a peak list's by far more.
_STEP_TOLERANCE = 0.25
# Wider than any proton spectrum in ppm: such an axis is in Hz.
_WIDEST_PPM = 200.0
# Longer lines are never rows; also keeps the pattern above fast.
_LONGEST_ROW = 200


def is_file_head(head: bytes) -> bool:
    """Whether a file begins as text with rows of two or three numbers."""
    if b"\0" in head and not head.startswith((b"\xff\xfe", b"\xfe\xff")):
        return False
    lines = decode_text(head).split("\n")[:-1]  # the last one may be cut
    rows = [line for line in lines if line.strip()]
    numeric = sum(_is_row(line) for line in rows)
    return numeric >= 8 and numeric >= len(rows) / 2


def describe(path: Path) -> Experiment:
    """What the file holds, by its remarks."""
    table = _read_table(path)
    return Experiment(
        name=path.name,
        path=path,
        format_name=FORMAT_NAME,
        n_dimensions=1,
        nucleus=table.nucleus,
        summary=summary_line(
            table.nucleus, field_text(table.frequency_mhz), table.solvent
        ),
        has_fid=False,
        has_spectrum=True,
        spectrometer_frequency_mhz=table.frequency_mhz,
        kind=KIND,
    )


def read(path: Path, *, prefer_processed: bool = False) -> MakerSpectrum:  # noqa: ARG001 - one call for all readers
    """Spectrum from the columns of a text file.

    Raises
    ------
    SpectrumFormatError
        If the rows are not an evenly spaced spectrum, or no remark tells the
        spectrometer frequency.
    """
    table = _read_table(path)
    nucleus, notes = normalise.require_proton(path, table.nucleus)
    if table.frequency_mhz is None:
        raise SpectrumFormatError(
            path,
            "does not tell the spectrometer frequency; add a first line such as "
            '"# 400.13 MHz"',
        )
    frequency_mhz = check_frequency(path, table.frequency_mhz)
    numbers = table.numbers
    axis_ppm = numbers[:, 0]
    if table.is_hz or abs(axis_ppm[-1] - axis_ppm[0]) > _WIDEST_PPM:
        axis_ppm = axis_ppm / frequency_mhz
        notes = (*notes, "The first column was taken as Hz.")
    step_ppm = _even_step(path, axis_ppm)
    spectrum = make_spectrum(
        path,
        numbers[:, 1],
        imaginary=numbers[:, 2] if numbers.shape[1] == 3 else None,
        first_point_ppm=float(axis_ppm[0]),
        step_hz=step_ppm * frequency_mhz,
        spectrometer_frequency_mhz=frequency_mhz,
    )
    metadata = Metadata(
        source_name=path.name,
        sha256=file_sha256(path),
        format_name=FORMAT_NAME,
        nucleus=nucleus,
        spectrometer_frequency_mhz=frequency_mhz,
        solvent=table.solvent,
        notes=notes,
    )
    return MakerSpectrum(metadata=metadata, spectrum=spectrum)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class _Table:
    numbers: npt.NDArray[np.float64]
    frequency_mhz: float | None
    solvent: str | None
    nucleus: str | None
    is_hz: bool


def _is_row(line: str) -> bool:
    return len(line) <= _LONGEST_ROW and (
        _ROW.fullmatch(line) is not None
        or _ROW.fullmatch(_with_points(line)) is not None
    )


def _with_points(line: str) -> str:
    """Decimal commas turned into points; columns must then be apart otherwise."""
    return re.sub(r"(?<=\d),(?=\d)", ".", line)


def _has_decimal_commas(rows: list[str]) -> bool:
    """Whether the first rows make sense only with commas as decimal signs."""
    some = rows[:50]
    has_other_separator = all(
        re.search(r"[;\t]|\d\s+[+-]?\d", row.strip()) for row in some
    )
    return has_other_separator and any(re.search(r"\d,\d", row) for row in some)


def _read_table(path: Path) -> _Table:
    lines = read_text(path, MAX_TEXT_BYTES).split("\n")
    start = next((index for index, line in enumerate(lines) if _is_row(line)), 0)
    rows = [line for line in lines[start:] if line.strip()]
    if not MIN_POINTS <= len(rows) <= MAX_POINTS:
        raise SpectrumFormatError(
            path,
            f"holds {len(rows)} rows of numbers, outside {MIN_POINTS} to {MAX_POINTS}; "
            "give the spectrum with all its points",
        )
    remarks = "\n".join(line[:500] for line in lines[max(0, start - 200) : start])
    nucleus = _NUCLEUS.search(remarks)
    solvent = _SOLVENT.search(remarks)
    return _Table(
        numbers=_numbers(path, rows),
        frequency_mhz=_frequency_mhz(remarks),
        solvent=solvent[1] if solvent else None,
        nucleus=normalise.nucleus_name(nucleus[1] if nucleus else None),
        is_hz=re.search(r"\bhz\b", remarks, re.IGNORECASE) is not None
        and re.search(r"\bppm\b", remarks, re.IGNORECASE) is None,
    )


def _numbers(path: Path, rows: list[str]) -> npt.NDArray[np.float64]:
    """Numbers of all rows, shape (n_rows, 2 or 3)."""
    comma = "." if _has_decimal_commas(rows) else " "
    separators = str.maketrans({",": comma, ";": " ", "\t": " "})
    width = len(rows[0].translate(separators).split())
    if width not in (2, 3):
        raise SpectrumFormatError(path, _RAGGED)
    plain = "\n".join(rows).translate(separators)
    try:
        with warnings.catch_warnings():
            # numpy only warns where the text stops being numbers.
            warnings.simplefilter("error", DeprecationWarning)
            flat = np.fromstring(plain, dtype=np.float64, sep=" ")
    except (DeprecationWarning, ValueError) as fault:
        bad = next((row for row in rows if not _is_row(row)), rows[-1])
        raise SpectrumFormatError(
            path,
            f"has a row that is not of numbers, {normalise.shown(bad)!r}; export two "
            "columns, shift and intensity",
        ) from fault
    if flat.size != width * len(rows):
        raise SpectrumFormatError(path, _RAGGED)
    return flat.reshape(-1, width)


_RAGGED = "has rows of different length; export two columns, shift and intensity"


def _frequency_mhz(remarks: str) -> float | None:
    for pattern in (_FREQUENCY, _NAMED_FREQUENCY):
        match = pattern.search(remarks)
        if match:
            return float(match[1].replace(",", "."))
    return None


def _even_step(path: Path, axis_ppm: npt.NDArray[np.float64]) -> float:
    mean_step = float(axis_ppm[-1] - axis_ppm[0]) / (axis_ppm.size - 1)
    even = axis_ppm[0] + mean_step * np.arange(axis_ppm.size)
    # Against an even axis, so that rounding does not add up along the file.
    off = float(np.max(np.abs(axis_ppm - even)))
    if mean_step == 0 or off > max(_STEP_TOLERANCE * abs(mean_step), 6e-5):
        raise SpectrumFormatError(
            path,
            "has shifts that are not evenly spaced, as in a peak list; export the "
            "spectrum with all its points",
        )
    return mean_step
