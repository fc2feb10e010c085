"""Varian and Agilent folders: fid with procpar.

The parameter file is read here and not by nmrglue 0.12, which stops at the older
ones with an IndexError; the bits of the binary header are nmrglue's.
"""

from __future__ import annotations

import re
import struct
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import numpy.typing as npt

from spinledger.errors import SpectrumFormatError
from spinledger.io import normalise
from spinledger.io.checksum import folder_sha256
from spinledger.io.experiment import Experiment, field_text, summary_line
from spinledger.io.limits import (
    MAX_BINARY_BYTES,
    MAX_HEADER_BYTES,
    check_point_count,
    read_bytes,
    read_text,
)
from spinledger.io.records import parse_number
from spinledger.io.samples import (
    as_floats,
    check_fid_samples,
    check_frequency,
    check_width,
    complex_from_parts,
    plausible_carrier,
)
from spinledger.values.acquisition import Fid, Metadata

KIND = "varian"
FORMAT_NAME = "Varian/Agilent folder"

_FILE_HEADER_BYTES = 32
_BLOCK_HEADER_BYTES = 28
# Name, subtype, basic type, then numbers: the first line of every parameter.
_PARAMETER = re.compile(r"([A-Za-z_]\w*)\s+\d+\s+([12])(?:\s+\S+){3,}\s*")
_QUOTED = re.compile(r'"((?:[^"\\]|\\.)*)"?')


def is_dataset(folder: Path) -> bool:
    """Whether the folder is one Varian or Agilent experiment."""
    return (folder / "procpar").is_file() and (folder / "fid").is_file()


def describe(folder: Path) -> Experiment:
    """What the experiment is, by its parameters."""
    procpar = _read_procpar(folder / "procpar")
    nucleus = normalise.nucleus_name(procpar.text("tn"))
    frequency_mhz = procpar.number("reffrq", "sfrq")
    acquired_on = _date(procpar)
    return Experiment(
        name=folder.name,
        path=folder,
        format_name=FORMAT_NAME,
        n_dimensions=2 if _is_arrayed(procpar) else 1,
        nucleus=nucleus,
        summary=summary_line(
            nucleus,
            field_text(frequency_mhz),
            procpar.text("seqfil", "pslabel"),
            procpar.text("solvent"),
            acquired_on,
        ),
        spectrometer_frequency_mhz=frequency_mhz,
        acquired_on=acquired_on,
        kind=KIND,
    )


def read(folder: Path, *, prefer_processed: bool = False) -> Fid:  # noqa: ARG001 - one call for all readers
    """FID of the folder; the maker's spectrum is not kept in such folders.

    Raises
    ------
    SpectrumFormatError
        If the data are not 1D proton data, damaged, or lack a parameter.
    """
    header, binary = folder / "procpar", folder / "fid"
    procpar = _read_procpar(header)
    if _is_arrayed(procpar):
        raise SpectrumFormatError(folder, _ARRAYED)
    nucleus, nucleus_notes = normalise.require_proton(
        folder, normalise.nucleus_name(procpar.text("tn"))
    )
    width_hz = check_width(header, procpar.number("sw"))
    frequency_mhz = check_frequency(header, procpar.number("reffrq", "sfrq"))
    raw, n_declared = _read_trace(binary)
    # Varian's frequencies run the other way round: the conjugate has our sense.
    samples, notes = check_fid_samples(binary, np.conj(raw), n_declared)
    return Fid(
        metadata=_metadata(
            folder, procpar, frequency_mhz, nucleus, (*nucleus_notes, *notes)
        ),
        samples=samples,
        spectral_width_hz=width_hz,
        carrier_ppm=_carrier_ppm(procpar, width_hz, frequency_mhz),
    )


_ARRAYED = (
    "holds a 2D or arrayed experiment; give the folder of the 1D proton "
    "experiment of this sample"
)


@dataclass(frozen=True, slots=True)
class _Procpar:
    """First line of values of every parameter."""

    values: dict[str, list[str]] = field(default_factory=dict)

    def text(self, *names: str) -> str | None:
        """First value that is not empty."""
        for name in names:
            for value in self.values.get(name, ()):
                if value.strip():
                    return value.strip()
        return None

    def number(self, *names: str) -> float | None:
        """First value that is a finite number."""
        for name in names:
            for value in self.values.get(name, ()):
                number = parse_number(value)
                if number is not None:
                    return number
        return None


def _read_procpar(path: Path) -> _Procpar:
    lines = read_text(path, MAX_HEADER_BYTES).split("\n")
    values: dict[str, list[str]] = {}
    for index, line in enumerate(lines[:-1]):
        head = _PARAMETER.fullmatch(line)
        if head is None or head[1] in values:
            continue
        _, _, rest = lines[index + 1].strip().partition(" ")
        values[head[1]] = _QUOTED.findall(rest) if head[2] == "2" else rest.split()
    if not values:
        raise SpectrumFormatError(
            path,
            "holds no parameters; copy the whole experiment folder again",
        )
    return _Procpar(values)


def _is_arrayed(procpar: _Procpar) -> bool:
    return any((procpar.number(name) or 0) > 1 for name in ("ni", "ni2", "arraydim"))


def _read_trace(path: Path) -> tuple[npt.NDArray[np.complexfloating], int]:
    """Complex points of the first trace, and how many there should be."""
    content = read_bytes(path, MAX_BINARY_BYTES)
    if len(content) < _FILE_HEADER_BYTES + _BLOCK_HEADER_BYTES:
        raise SpectrumFormatError(
            path, "is cut short within its header; copy the experiment folder again"
        )
    # nmrglue takes a second to import: only where there is such a file.
    from nmrglue.fileio import varian as nmrglue_varian  # noqa: PLC0415

    header = nmrglue_varian.fileheader2dic(
        struct.unpack(">6i2hi", content[:_FILE_HEADER_BYTES])
    )
    if header["S_SPEC"]:
        raise SpectrumFormatError(
            path, "holds a spectrum instead of a FID; copy the raw data folder"
        )
    if header["nblocks"] * header["ntraces"] > 1:
        raise SpectrumFormatError(path.parent, _ARRAYED)
    n_declared = check_point_count(path, header["np"] / 2)
    start = _FILE_HEADER_BYTES + _BLOCK_HEADER_BYTES * max(1, header["nbheaders"])
    if start > len(content):
        raise SpectrumFormatError(
            path, "has a damaged header; copy the experiment folder again"
        )
    # find_dtype knows i2, i4 and f4, all big-endian.
    kind = np.dtype(nmrglue_varian.find_dtype(header))
    n_numbers = min(2 * n_declared, (len(content) - start) // kind.itemsize)
    numbers = np.frombuffer(content, kind, count=n_numbers // 2 * 2, offset=start)
    real, imaginary = as_floats(numbers[0::2]), as_floats(numbers[1::2])
    return complex_from_parts(real, imaginary), n_declared


def _carrier_ppm(
    procpar: _Procpar, width_hz: float, frequency_mhz: float
) -> float | None:
    """Shift of the centre, from the reference line or the reference frequency.

    The right edge stands at rfp - rfl Hz, rfl being where the reference line is
    and rfp its frequency.
    """
    line_hz, shift_hz = procpar.number("rfl"), procpar.number("rfp")
    if line_hz is not None and shift_hz is not None:
        return plausible_carrier((width_hz / 2 - line_hz + shift_hz) / frequency_mhz)
    transmitter_mhz, reference_mhz = procpar.number("sfrq"), procpar.number("reffrq")
    if transmitter_mhz is None or reference_mhz is None:
        return None
    return plausible_carrier((transmitter_mhz / reference_mhz - 1) * 1e6)


def _date(procpar: _Procpar) -> str | None:
    for name in ("time_run", "time_complete", "date"):
        dated = normalise.iso_date(procpar.text(name))
        if dated:
            return dated
    return None


def _metadata(
    folder: Path,
    procpar: _Procpar,
    frequency_mhz: float,
    nucleus: str,
    notes: tuple[str, ...],
) -> Metadata:
    pulse_us = normalise.positive(procpar.number("pw"))
    right_angle_us = normalise.positive(procpar.number("pw90"))
    return Metadata(
        source_name=folder.name,
        sha256=folder_sha256(folder, [folder / "procpar", folder / "fid"]),
        format_name=FORMAT_NAME,
        nucleus=nucleus,
        spectrometer_frequency_mhz=frequency_mhz,
        solvent=procpar.text("solvent"),
        temperature_k=normalise.kelvin_from_celsius(procpar.number("temp")),
        n_scans=normalise.count(procpar.number("ct"))
        or normalise.count(procpar.number("nt")),
        pulse_program=procpar.text("seqfil", "pslabel"),
        pulse_length_us=pulse_us,
        pulse_angle_deg=(
            90.0 * pulse_us / right_angle_us if pulse_us and right_angle_us else None
        ),
        relaxation_delay_s=normalise.positive(procpar.number("d1")),
        acquired_on=_date(procpar),
        title=_title(folder, procpar),
        notes=notes,
    )


def _title(folder: Path, procpar: _Procpar) -> str | None:
    """Sample name, else the first line of the user's text file."""
    named = procpar.text("samplename")
    if named or not (folder / "text").is_file():
        return named
    text = read_text(folder / "text", MAX_HEADER_BYTES)
    lines = [line.strip() for line in text.split("\n") if line.strip()]
    return lines[0][:200] if lines else None
