"""Magritek Spinsolve folders: data.1d or fid.1d with acqu.par.

The parameters are read here: nmrglue 0.12 stops at a line without a value. The
layout of the .1d files is nmrglue's.
"""

from __future__ import annotations

import struct
from dataclasses import replace
from pathlib import Path

import numpy as np
import numpy.typing as npt

from spinledger.errors import SpectrumFormatError
from spinledger.io import normalise
from spinledger.io.border import vendor_border
from spinledger.io.checksum import folder_sha256
from spinledger.io.experiment import Experiment, field_text, summary_line
from spinledger.io.limits import (
    MAX_BINARY_BYTES,
    MAX_HEADER_BYTES,
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
    make_spectrum,
    plausible_carrier,
)
from spinledger.io.sense import in_sense_of
from spinledger.values.acquisition import Fid, MakerSpectrum, Metadata

KIND = "spinsolve"
FORMAT_NAME = "Spinsolve folder"

_PARAMETERS = "acqu.par"
_FIDS = ("data.1d", "fid.1d")
_SPECTRA = ("spectrum_processed.1d", "spectrum.1d")
_HEADER_BYTES = 32


def is_dataset(folder: Path) -> bool:
    """Whether the folder is one Spinsolve experiment."""
    names = (*_FIDS, *_SPECTRA)
    return (folder / _PARAMETERS).is_file() and any(
        (folder / name).is_file() for name in names
    )


def describe(folder: Path) -> Experiment:
    """What the experiment is, by its parameters."""
    parameters = _read_parameters(folder / _PARAMETERS)
    nucleus = normalise.nucleus_name(parameters.get("rxChannel"))
    frequency_mhz = _number(parameters, "b1Freq")
    acquired_on = normalise.iso_date(parameters.get("startTime"))
    return Experiment(
        name=folder.name,
        path=folder,
        format_name=FORMAT_NAME,
        n_dimensions=1,
        nucleus=nucleus,
        summary=summary_line(
            nucleus,
            field_text(frequency_mhz),
            _program(parameters),
            parameters.get("Solvent"),
            acquired_on,
        ),
        has_fid=_existing(folder, _FIDS) is not None,
        has_spectrum=_existing(folder, _SPECTRA) is not None,
        spectrometer_frequency_mhz=frequency_mhz,
        acquired_on=acquired_on,
        kind=KIND,
    )


def read(folder: Path, *, prefer_processed: bool = False) -> Fid | MakerSpectrum:
    """FID of the folder, or the maker's spectrum if preferred or the only one.

    Raises
    ------
    SpectrumFormatError
        If the data are not 1D proton data, damaged, or lack a parameter.
    """
    header = folder / _PARAMETERS
    parameters = _read_parameters(header)
    nucleus, notes = normalise.require_proton(
        folder, normalise.nucleus_name(parameters.get("rxChannel"))
    )
    frequency_mhz = check_frequency(header, _number(parameters, "b1Freq"))
    fid, spectrum = _existing(folder, _FIDS), _existing(folder, _SPECTRA)
    taken = spectrum if fid is None or (prefer_processed and spectrum) else fid
    if taken is None:
        raise SpectrumFormatError(
            folder, "holds parameters but no data; copy the whole experiment folder"
        )
    metadata = _metadata(
        folder, [header, taken], parameters, frequency_mhz, nucleus, notes
    )
    if taken == spectrum:
        return _read_spectrum(taken, metadata)
    return _read_fid(taken, spectrum, parameters, metadata)


def _existing(folder: Path, names: tuple[str, ...]) -> Path | None:
    return next(
        (folder / name for name in names if (folder / name).is_file()),
        None,
    )


def _read_parameters(path: Path) -> dict[str, str]:
    parameters: dict[str, str] = {}
    for line in read_text(path, MAX_HEADER_BYTES).split("\n"):
        name, equals, value = line.partition("=")
        if equals:
            parameters.setdefault(name.strip(), value.strip().strip('"').strip())
    return parameters


def _number(parameters: dict[str, str], name: str) -> float | None:
    return parse_number(parameters.get(name, ""))


def _program(parameters: dict[str, str]) -> str | None:
    return parameters.get("Protocol") or parameters.get("expName") or None


def _metadata(
    folder: Path,
    used: list[Path],
    parameters: dict[str, str],
    frequency_mhz: float,
    nucleus: str,
    notes: tuple[str, ...],
) -> Metadata:
    solvent = parameters.get("Solvent") or None
    repetition_ms = _number(parameters, "repTime")
    acquisition_s = _number(parameters, "totalAcquisitionTime")
    delay_s = (
        repetition_ms / 1e3 - acquisition_s
        if repetition_ms is not None and acquisition_s is not None
        else None
    )
    return Metadata(
        source_name=folder.name,
        sha256=folder_sha256(folder, used),
        format_name=FORMAT_NAME,
        nucleus=nucleus,
        spectrometer_frequency_mhz=frequency_mhz,
        solvent=None if solvent is not None and solvent.lower() == "none" else solvent,
        n_scans=normalise.count(_number(parameters, "nrScans")),
        pulse_program=_program(parameters),
        pulse_length_us=normalise.positive(_number(parameters, "pulseLength")),
        pulse_angle_deg=normalise.positive(_number(parameters, "pulseAngle")),
        relaxation_delay_s=normalise.positive(delay_s),
        acquired_on=normalise.iso_date(parameters.get("startTime")),
        title=parameters.get("Sample") or None,
        notes=notes,
    )


def _read_1d(path: Path) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.complex128]]:
    """Axis and complex values of a .1d file."""
    content = read_bytes(path, MAX_BINARY_BYTES)
    n_numbers = (len(content) - _HEADER_BYTES) // 4
    if n_numbers < 3:
        raise SpectrumFormatError(
            path, "is cut short; copy the experiment folder again"
        )
    lengths = struct.unpack_from("<4i", content, 16)
    if lengths[1] > 1 or lengths[2] > 1:
        raise SpectrumFormatError(
            path.parent,
            "holds a 2D or arrayed experiment; give the 1D proton experiment",
        )
    if n_numbers % 3:
        raise SpectrumFormatError(
            path, "is cut short or damaged; copy the experiment folder again"
        )
    # nmrglue takes a second to import: only where there is such a file.
    from nmrglue.fileio import spinsolve as nmrglue_spinsolve  # noqa: PLC0415

    with vendor_border(path):
        header, values = nmrglue_spinsolve.read(
            str(path.parent), specfile=path.name, acqupar="", procpar=""
        )
    parts = complex_from_parts(as_floats(values.real), as_floats(values.imag))
    return as_floats(header["spectrum"]["xaxis"]), parts


def _read_fid(
    path: Path, beside: Path | None, parameters: dict[str, str], metadata: Metadata
) -> Fid:
    header = path.parent / _PARAMETERS
    width_khz = _number(parameters, "bandwidth")
    width_hz = check_width(header, None if width_khz is None else width_khz * 1e3)
    _, values = _read_1d(path)
    samples, notes = check_fid_samples(path, values, None)
    lowest_hz = _number(parameters, "lowestFrequency")
    frequency_mhz = metadata.spectrometer_frequency_mhz
    fid = Fid(
        metadata=replace(metadata, notes=(*metadata.notes, *notes)),
        samples=samples,
        spectral_width_hz=width_hz,
        carrier_ppm=plausible_carrier(
            None if lowest_hz is None else (lowest_hz + width_hz / 2) / frequency_mhz
        ),
    )
    if beside is None:
        return fid
    return in_sense_of(fid, _read_spectrum(beside, metadata).spectrum)


def _read_spectrum(path: Path, metadata: Metadata) -> MakerSpectrum:
    axis, values = _read_1d(path)
    frequency_mhz = metadata.spectrometer_frequency_mhz
    # No proton spectrum spans 200 ppm: such an axis is in Hz.
    is_hz = abs(float(axis[-1] - axis[0])) > 200
    axis_ppm = axis / frequency_mhz if is_hz else axis
    spectrum = make_spectrum(
        path,
        values.real,
        imaginary=values.imag,
        first_point_ppm=float(axis_ppm[0]),
        step_hz=float(axis_ppm[-1] - axis_ppm[0]) / (axis_ppm.size - 1) * frequency_mhz,
        spectrometer_frequency_mhz=frequency_mhz,
    )
    return MakerSpectrum(metadata=metadata, spectrum=spectrum)
