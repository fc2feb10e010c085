"""JCAMP-DX files: FIDs and spectra, NTUPLES and XYDATA, in every ASDF form.

The labels and tables are read here and not by nmrglue 0.12, which expands repeat
counts without limit, takes decimal commas for separators, and tells the wrong
width for FIDs.

References
----------
.. [1] A. N. Davies, P. Lampen, Appl. Spectrosc. 47 (1993) 1093-1099,
   doi:10.1366/0003702934067874 (JCAMP-DX for NMR).
.. [2] P. Lampen, J. Lambert, R. J. Lancashire, R. S. McDonald, P. S. McIntyre,
   D. N. Rutledge, T. Froehlich, A. N. Davies, Pure Appl. Chem. 71 (1999)
   1549-1556, doi:10.1351/pac199971081549 (.SHIFT REFERENCE).
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from spinledger.errors import SpectrumFormatError
from spinledger.io import normalise
from spinledger.io.asdf import TableError
from spinledger.io.checksum import file_sha256
from spinledger.io.experiment import Experiment, field_text, summary_line
from spinledger.io.jcamp_tables import Columns, read_columns
from spinledger.io.limits import (
    MAX_TEXT_BYTES,
    decode_text,
    read_text,
)
from spinledger.io.normalise import shown
from spinledger.io.records import Block, parse_blocks, parse_number, plain_label
from spinledger.io.samples import (
    check_fid_samples,
    check_frequency,
    check_width,
    complex_from_parts,
    make_spectrum,
    plausible_carrier,
)
from spinledger.io.sense import SENSE_UNKNOWN, in_sense_of
from spinledger.values.acquisition import Fid, MakerSpectrum, Metadata

KIND = "jcamp"
FID_NAME = "JCAMP-DX FID"
SPECTRUM_NAME = "JCAMP-DX spectrum"


def is_file_head(head: bytes) -> bool:
    """Whether a file begins with a JCAMP-DX title, remarks before it apart."""
    lines = decode_text(head).split("\n")
    written = (line.strip() for line in lines)
    first = next((line for line in written if line and not line.startswith("$$")), "")
    return first.startswith("##") and plain_label(first[2:7]) == "TITLE"


def describe(path: Path) -> Experiment:
    """What the file holds, by its labels."""
    blocks = _data_blocks(path)
    shown = blocks.fid or blocks.spectrum
    if shown is None:
        raise SpectrumFormatError(path, _nothing_here(blocks))
    nucleus = _nucleus(shown)
    return Experiment(
        name=path.name,
        path=path,
        format_name=FID_NAME if blocks.fid else SPECTRUM_NAME,
        n_dimensions=2 if blocks.is_multidimensional else 1,
        nucleus=nucleus,
        summary=summary_line(
            nucleus,
            field_text(_observe_mhz(shown)),
            shown.text(".PULSE SEQUENCE", "$PULPROG"),
            _solvent(shown),
            _date(shown),
        ),
        has_fid=blocks.fid is not None,
        has_spectrum=blocks.spectrum is not None,
        spectrometer_frequency_mhz=_observe_mhz(shown),
        acquired_on=_date(shown),
        kind=KIND,
    )


def read(path: Path, *, prefer_processed: bool = False) -> Fid | MakerSpectrum:
    """FID of the file, or its spectrum if preferred or the only one.

    Raises
    ------
    SpectrumFormatError
        If there are no 1D proton data, or they are damaged or lack a parameter.
    """
    blocks = _data_blocks(path)
    if blocks.is_multidimensional:
        raise SpectrumFormatError(
            path, "holds 2D or arrayed data; give the 1D proton spectrum of this sample"
        )
    if blocks.n_fids > 1 or (blocks.n_fids == 0 and blocks.n_spectra > 1):
        raise SpectrumFormatError(
            path, "holds several spectra; save the proton spectrum to its own file"
        )
    try:
        if blocks.fid is None and blocks.spectrum is not None:
            return _read_spectrum(path, blocks.spectrum)
        if blocks.fid is not None and blocks.spectrum is not None:
            spectrum = _read_spectrum(path, blocks.spectrum)
            if prefer_processed:
                return spectrum
            # Exporters differ in the sense of the FID: the spectrum beside it tells.
            return in_sense_of(_read_fid(path, blocks.fid), spectrum.spectrum)
        if blocks.fid is not None:
            return _read_fid(path, blocks.fid)
    except TableError as fault:
        raise SpectrumFormatError(path, f"cannot be used: {fault}") from fault
    raise SpectrumFormatError(path, _nothing_here(blocks))


@dataclass(frozen=True, slots=True, kw_only=True)
class _DataBlocks:
    fid: Block | None
    spectrum: Block | None
    n_fids: int
    n_spectra: int
    is_multidimensional: bool
    other_types: tuple[str, ...]


def _data_blocks(path: Path) -> _DataBlocks:
    blocks = parse_blocks(read_text(path, MAX_TEXT_BYTES))
    typed = [(_data_type(block), block) for block in blocks]
    fids = [block for kind, block in typed if kind.endswith("NMRFID")]
    spectra = [
        block
        for kind, block in typed
        if kind.endswith("NMRSPECTRUM") or (not kind and _has_table(block))
    ]
    # A collection may hold other nuclei too: the proton data are meant.
    fids, spectra = _proton_only(fids), _proton_only(spectra)
    many = any(kind.startswith("ND") for kind, _ in typed) or any(
        (block.number("NUM DIM") or 1) > 1 for _, block in typed
    )
    return _DataBlocks(
        fid=fids[0] if fids else None,
        spectrum=spectra[0] if spectra else None,
        n_fids=len(fids),
        n_spectra=len(spectra),
        is_multidimensional=many,
        other_types=tuple(
            sorted({block.text("DATA TYPE") or "" for _, block in typed} - {""})
        ),
    )


def _proton_only(blocks: list[Block]) -> list[Block]:
    """The proton blocks where there are some, else all."""
    return [block for block in blocks if _nucleus(block) == "1H"] or blocks


def _data_type(block: Block) -> str:
    return plain_label(block.text("DATA TYPE") or "")


def _has_table(block: Block) -> bool:
    return any(label in block.values for label in ("XYDATA", "DATATABLE", "XYPOINTS"))


def _nothing_here(blocks: _DataBlocks) -> str:
    if blocks.other_types:
        kinds = ", ".join(shown(kind).lower() for kind in blocks.other_types[:3])
        return (
            f"holds {kinds} but no NMR spectrum or FID; export the spectrum itself "
            "as JCAMP-DX"
        )
    return "is not a complete JCAMP-DX file; export it again"


# ---- facts of the header


def _observe_mhz(block: Block) -> float | None:
    return block.number("$BF1", "$SF", ".OBSERVE FREQUENCY", "$SFO1", "$SFRQ")


def _nucleus(block: Block) -> str | None:
    for label in (".OBSERVE NUCLEUS", "$NUC1", "$NUCLEUS", ".NUCLEUS", "$TN"):
        text = block.text(label)
        nucleus = normalise.nucleus_name(text.split(",")[0] if text else None)
        if nucleus:
            return nucleus
    return None


def _solvent(block: Block) -> str | None:
    return block.text(".SOLVENT NAME", "$SOLVENT", "SOLVENT")


def _date(block: Block) -> str | None:
    dated = normalise.iso_date(block.text("LONG DATE", "LONGDATE"))
    return (
        dated
        or normalise.iso_date_from_seconds(block.number("$DATE"))
        or normalise.iso_date(block.text("DATE"))
    )


def _metadata(
    path: Path,
    block: Block,
    frequency_mhz: float,
    *,
    format_name: str,
    notes: tuple[str, ...],
) -> Metadata:
    nucleus, nucleus_notes = normalise.require_proton(path, _nucleus(block))
    program = block.text(".PULSE SEQUENCE", "$PULPROG")
    angle_deg = normalise.flip_angle_deg(program)
    pulse_us = normalise.positive(block.element("$P", 1))
    if pulse_us is not None and angle_deg is not None:
        pulse_us *= angle_deg / 90.0
    return Metadata(
        source_name=path.name,
        sha256=file_sha256(path),
        format_name=format_name,
        nucleus=nucleus,
        spectrometer_frequency_mhz=frequency_mhz,
        solvent=_solvent(block),
        temperature_k=normalise.kelvin(block.number("$TE"))
        or normalise.kelvin_from_label(block.number("TEMPERATURE", ".TEMPERATURE")),
        n_scans=normalise.count(block.number(".AVERAGES", "$NS")),
        pulse_program=program,
        pulse_length_us=pulse_us,
        pulse_angle_deg=angle_deg,
        relaxation_delay_s=normalise.positive(block.element("$D", 1)),
        acquired_on=_date(block),
        title=block.text("TITLE"),
        notes=(*nucleus_notes, *notes),
    )


# ---- FID


def _read_fid(path: Path, block: Block) -> Fid:
    columns = read_columns(path, block)
    if columns.imaginary is None:
        raise SpectrumFormatError(
            path,
            "holds only the real part of its FID; export it again with real and "
            "imaginary data",
        )
    frequency_mhz = check_frequency(path, _observe_mhz(block))
    width_hz, width_notes = _fid_width(path, block, columns)
    samples, notes = check_fid_samples(
        path,
        complex_from_parts(columns.real, columns.imaginary),
        columns.n_declared,
    )
    delay, delay_notes = _fid_delay(block, samples.size)
    if not _is_from_bruker(block):
        delay_notes = (*delay_notes, SENSE_UNKNOWN)
    metadata = _metadata(
        path,
        block,
        frequency_mhz,
        format_name=FID_NAME,
        notes=(*width_notes, *notes, *delay_notes),
    )
    return Fid(
        metadata=metadata,
        samples=samples,
        spectral_width_hz=width_hz,
        carrier_ppm=_fid_carrier(block, frequency_mhz),
        group_delay_points=delay,
    )


def _is_from_bruker(block: Block) -> bool:
    """Whether the labels are Bruker's, whose exports all have one sense."""
    return block.number("$AQ_mod", "$DECIM", "$BYTORDA") is not None


def _fid_width(
    path: Path, block: Block, columns: Columns
) -> tuple[float, tuple[str, ...]]:
    """Width from the dwell time of the axis; the makers' own label confirms it."""
    told_hz = block.number("$SW_h", "$SWH", "$SPECTRALWIDTH")
    dwell_s = columns.step_x
    scale = 1e-3 if columns.units in ("MS", "MILLISECONDS", "MSEC") else 1.0
    if dwell_s is None or not abs(dwell_s) > 0:
        return check_width(path, told_hz), ()
    width_hz = 1.0 / (abs(dwell_s) * scale)
    if told_hz is None:
        return check_width(path, width_hz), ()
    # The label has more digits than a rounded time axis: prefer it when they agree.
    if abs(width_hz / told_hz - 1) < 5e-3:
        return check_width(path, told_hz), ()
    return check_width(path, width_hz), (
        f"The header states a width of {told_hz:.6g} Hz but its time axis one of "
        f"{width_hz:.6g} Hz; the axis was believed.",
    )


def _fid_carrier(block: Block, frequency_mhz: float) -> float | None:
    offset_hz = block.number("$O1")
    if offset_hz is not None:
        return plausible_carrier(offset_hz / frequency_mhz)
    centre_mhz = block.number("$SFO1")
    base_mhz = block.number("$BF1", "$SF")
    if centre_mhz is not None and base_mhz is not None:
        return plausible_carrier((centre_mhz - base_mhz) / base_mhz * 1e6)
    return None


def _fid_delay(block: Block, n_points: int) -> tuple[float, tuple[str, ...]]:
    if block.number("$DIGMOD") == 0:
        return 0.0, ()
    delay = normalise.bruker_group_delay(
        block.number("$DECIM"), block.number("$DSPFVS"), block.number("$GRPDLY")
    )
    if delay is None or not delay < n_points / 2:
        return 0.0, (
            "The header does not tell a usable delay of the digital filter; "
            "it was taken as zero.",
        )
    return delay, ()


# ---- spectrum


def _read_spectrum(path: Path, block: Block) -> MakerSpectrum:
    columns = read_columns(path, block)
    if columns.units.startswith(("S", "MS", "MICROS")) and columns.units != "":
        raise SpectrumFormatError(
            path, "has a time axis but calls itself a spectrum; export it again"
        )
    observe_mhz = check_frequency(
        path, block.number("$SF", ".OBSERVE FREQUENCY", "$BF1", "$SFO1")
    )
    step_x = columns.step_x
    if step_x is None or columns.first_x is None or step_x == 0:
        raise SpectrumFormatError(
            path, "does not state its axis (FIRSTX and LASTX); export it again"
        )
    axis = _shift_axis(block, columns.first_x, step_x, columns, observe_mhz)
    spectrum = make_spectrum(
        path,
        columns.real,
        imaginary=columns.imaginary,
        first_point_ppm=axis.first_ppm,
        step_hz=axis.step_hz,
        spectrometer_frequency_mhz=observe_mhz,
    )
    metadata = _metadata(
        path,
        block,
        observe_mhz,
        format_name=SPECTRUM_NAME,
        notes=(*columns.notes, *axis.notes),
    )
    return MakerSpectrum(metadata=metadata, spectrum=spectrum)


@dataclass(frozen=True, slots=True, kw_only=True)
class _ShiftAxis:
    first_ppm: float
    step_hz: float
    notes: tuple[str, ...] = ()


def _shift_axis(
    block: Block, first_x: float, step_x: float, columns: Columns, observe_mhz: float
) -> _ShiftAxis:
    """Axis from, in this order: ppm abscissae, OFFSET, shift reference, Hz from 0."""
    if columns.units == "PPM":
        return _ShiftAxis(first_ppm=first_x, step_hz=step_x * observe_mhz)
    offset_ppm = block.number("$OFFSET")
    if offset_ppm is not None and block.number("$SF") is not None:
        return _ShiftAxis(
            first_ppm=offset_ppm if step_x < 0 else first_x / observe_mhz,
            step_hz=step_x,
        )
    hz_axis = _ShiftAxis(first_ppm=first_x / observe_mhz, step_hz=step_x)
    reference = _shift_reference(block)
    if reference is None:
        return _ShiftAxis(
            first_ppm=hz_axis.first_ppm,
            step_hz=step_x,
            notes=("The file has no shift reference; 0 Hz was taken as 0 ppm.",),
        )
    index, shift_ppm = reference
    referenced_ppm = shift_ppm - (index - 1) * step_x / observe_mhz
    # The reference is rounded, the Hz axis is not: take the axis where they agree.
    if abs(referenced_ppm - hz_axis.first_ppm) < 0.005:
        return hz_axis
    return _ShiftAxis(first_ppm=referenced_ppm, step_hz=step_x)


def _shift_reference(block: Block) -> tuple[float, float] | None:
    """Point number (from 1) and shift from ".SHIFT REFERENCE"."""
    text = block.text(".SHIFT REFERENCE")
    if text is None:
        return None
    items = [item.strip() for item in text.split(",")]
    if len(items) < 4:
        return None
    point, shift_ppm = parse_number(items[2]), parse_number(items[3])
    return None if point is None or shift_ppm is None else (point, shift_ppm)
