"""JEOL Delta files (.jdf): FIDs and processed spectra.

The records are laid out as nmrglue's jeol module has them, but read here: nmrglue
0.12 fails on older files (units of mega and larger), on titles that are not UTF-8,
and multiplies text parameters by powers of ten.
"""

from __future__ import annotations

import math
from pathlib import Path

from spinledger.errors import SpectrumFormatError
from spinledger.io import normalise
from spinledger.io.checksum import file_sha256
from spinledger.io.experiment import Experiment, field_text, summary_line
from spinledger.io.jeol_layout import (
    HERTZ,
    MAGIC,
    JeolFile,
    JeolParameters,
    digital_filter_delay,
    plain_text,
    read_file,
    read_sections,
)
from spinledger.io.samples import (
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


def is_file_head(head: bytes) -> bool:
    """Whether a file begins as JEOL files do."""
    return head.startswith(MAGIC)


def describe(path: Path) -> Experiment:
    """What the file holds, by its header."""
    file = read_file(path)
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
    file = read_file(path)
    if file.n_dimensions != 1:
        raise SpectrumFormatError(
            path, "holds 2D or arrayed data; give the 1D proton file of this sample"
        )
    nucleus, notes = normalise.require_proton(path, _nucleus(file))
    frequency_mhz = check_frequency(path, _frequency_mhz(file))
    if file.is_fid:
        return _read_fid(path, file, frequency_mhz, nucleus, notes)
    return _read_spectrum(path, file, frequency_mhz, nucleus, notes)


# ---- facts


def _nucleus(file: JeolFile) -> str | None:
    axis_title = plain_text(bytes(file.header["axis_titles"][0]))
    return normalise.nucleus_name(
        file.parameters.text("x_domain")
    ) or normalise.nucleus_name(axis_title)


def _frequency_mhz(file: JeolFile) -> float | None:
    base_mhz = float(file.header["base_mhz"][0])
    if math.isfinite(base_mhz) and base_mhz > 0:
        return base_mhz
    frequency_hz = file.parameters.number("x_freq")
    return None if frequency_hz is None else frequency_hz / 1e6


def _date(parameters: JeolParameters) -> str | None:
    return normalise.iso_date(parameters.text("actual_start_timestamp"))


def _metadata(
    path: Path,
    file: JeolFile,
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
        title=plain_text(bytes(file.header["title"])) or None,
        notes=notes,
    )


# ---- data


def _read_fid(
    path: Path,
    file: JeolFile,
    frequency_mhz: float,
    nucleus: str,
    notes: tuple[str, ...],
) -> Fid:
    sections = read_sections(path, file)
    if sections.imaginary is None:
        raise SpectrumFormatError(
            path, "holds only the real part of its FID; export it with both parts"
        )
    # JEOL's frequencies run the other way round: the conjugate has our sense.
    samples, sample_notes = check_fid_samples(
        path,
        complex_from_parts(sections.real, -sections.imaginary),
        sections.n_declared,
    )
    delay, delay_notes = _delay(file.parameters, samples.size)
    return Fid(
        metadata=_metadata(
            path, file, frequency_mhz, nucleus, (*notes, *sample_notes, *delay_notes)
        ),
        samples=samples,
        spectral_width_hz=check_width(path, _width_hz(file, sections.n_declared)),
        carrier_ppm=plausible_carrier(file.parameters.number("x_offset")),
        group_delay_points=delay,
    )


def _width_hz(file: JeolFile, n_points: int) -> float | None:
    """Width from the time axis, else from the sweep."""
    start, stop = (
        float(file.header[name][0]) for name in ("axis_starts", "axis_stops")
    )
    span_s = stop - start
    if math.isfinite(span_s) and span_s > 0:
        return (n_points - 1) / span_s
    return file.parameters.number("x_sweep")


def _delay(parameters: JeolParameters, n_points: int) -> tuple[float, tuple[str, ...]]:
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
    file: JeolFile,
    frequency_mhz: float,
    nucleus: str,
    notes: tuple[str, ...],
) -> MakerSpectrum:
    sections = read_sections(path, file)
    first, last = (
        float(file.header[name][0]) for name in ("axis_starts", "axis_stops")
    )
    if int(file.header["unit_bases"][1]) == HERTZ:
        first, last = first / frequency_mhz, last / frequency_mhz
    if sections.real.size < sections.n_declared / 2 or not math.isfinite(first - last):
        raise SpectrumFormatError(
            path, "is cut short or has no shift axis; copy it from the spectrometer"
        )
    spectrum = make_spectrum(
        path,
        sections.real,
        imaginary=sections.imaginary,
        first_point_ppm=first,
        step_hz=(last - first) / (sections.n_declared - 1) * frequency_mhz,
        spectrometer_frequency_mhz=frequency_mhz,
    )
    return MakerSpectrum(
        metadata=_metadata(path, file, frequency_mhz, nucleus, notes),
        spectrum=spectrum,
    )
