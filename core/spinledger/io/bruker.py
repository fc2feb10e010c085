"""Bruker folders: fid with acqus, and the maker's spectrum in pdata.

The parameter files are read here and not by nmrglue 0.12, whose parser waits for
ever on a file that ends inside a text or an array; the binary layouts and the
table of filter delays are nmrglue's.

References
----------
.. [1] J. J. Helmus, C. P. Jaroniec, J. Biomol. NMR 55 (2013) 355-367,
   doi:10.1007/s10858-013-9718-x.
"""

from __future__ import annotations

from dataclasses import dataclass
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
from spinledger.io.records import Block, parse_parameters
from spinledger.io.samples import (
    as_floats,
    check_fid_samples,
    check_frequency,
    check_width,
    complex_from_parts,
    make_spectrum,
    plausible_carrier,
    scaled,
)
from spinledger.values.acquisition import Fid, MakerSpectrum, Metadata

KIND = "bruker"
FORMAT_NAME = "Bruker folder"


def is_dataset(folder: Path) -> bool:
    """Whether the folder is one Bruker experiment, or one of its pdata folders."""
    if _acquisition_header(folder) is not None:
        names = ("fid", "ser", "pdata")
        return any((folder / name).exists() for name in names)
    return is_processed_folder(folder)


def _acquisition_header(folder: Path) -> Path | None:
    """Parameters as they were when the data were written, else as set before."""
    paths = (folder / "acqus", folder / "acqu")
    return next((path for path in paths if path.is_file()), None)


def is_processed_folder(folder: Path) -> bool:
    """Whether the folder is a pdata folder with procs and a spectrum."""
    names = ("1r", "2rr", "3rrr")
    return (folder / "procs").is_file() and any(
        (folder / name).is_file() for name in names
    )


_MEMBERS = frozenset({"acqus", "acqu", "fid", "ser", "procs", "proc", "1r", "1i"})


def is_parameter_file(path: Path) -> bool:
    """Whether the file is part of a Bruker folder, so that the folder is meant."""
    return path.name in _MEMBERS


def describe(folder: Path) -> Experiment:
    """What the experiment is, by its headers."""
    place = _locate(folder)
    acqus = _parameters(place.acqus)
    nucleus = _nucleus(acqus)
    return Experiment(
        name=folder.name,
        path=folder,
        format_name=FORMAT_NAME,
        n_dimensions=_n_dimensions(place),
        nucleus=nucleus,
        summary=summary_line(
            nucleus,
            field_text(acqus.number("$BF1", "$SFO1")),
            acqus.text("$PULPROG"),
            acqus.text("$SOLVENT"),
            normalise.iso_date_from_seconds(acqus.number("$DATE")),
        ),
        has_fid=place.fid is not None,
        has_spectrum=place.processed is not None,
        spectrometer_frequency_mhz=acqus.number("$BF1", "$SFO1"),
        acquired_on=normalise.iso_date_from_seconds(acqus.number("$DATE")),
        kind=KIND,
    )


def read(folder: Path, *, prefer_processed: bool = False) -> Fid | MakerSpectrum:
    """FID of the folder, or the maker's spectrum if preferred or the only one.

    Raises
    ------
    SpectrumFormatError
        If the data are not 1D proton data, damaged, or lack a parameter.
    """
    place = _locate(folder)
    if _n_dimensions(place) == 2:
        raise SpectrumFormatError(
            folder,
            "holds a 2D or arrayed experiment; give the folder of the 1D proton "
            "experiment of this sample",
        )
    acqus = _parameters(place.acqus)
    normalise.require_proton(folder, _nucleus(acqus))
    if place.fid is None or (prefer_processed and place.processed is not None):
        return _read_processed(place, acqus)
    sampled = acqus.number("$AQ_mod")
    if sampled in (0, 2):
        return _read_instead(place, acqus)
    return _read_fid(place, acqus)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Place:
    """Where the parts of one experiment lie; None for what is not there."""

    folder: Path
    acqus: Path | None
    fid: Path | None
    ser: Path | None
    processed: Path | None  # the pdata folder


def _locate(folder: Path) -> _Place:
    if is_processed_folder(folder):
        return _Place(
            folder=folder,
            acqus=_acquisition_header(folder.parent.parent),
            fid=None,
            ser=None,
            processed=folder,
        )
    fid, ser = folder / "fid", folder / "ser"
    return _Place(
        folder=folder,
        acqus=_acquisition_header(folder),
        fid=fid if fid.is_file() else None,
        ser=ser if ser.is_file() else None,
        processed=_first_processed(folder / "pdata"),
    )


def _first_processed(pdata: Path) -> Path | None:
    """The pdata folder of the lowest number that holds a 1D spectrum."""
    try:
        numbers = sorted(
            int(child.name)
            for child in pdata.iterdir()
            if child.name.isdecimal() and len(child.name) < 10
        )
    except OSError:
        return None
    for number in numbers:
        child = pdata / str(number)
        if (child / "procs").is_file() and (child / "1r").is_file():
            return child
    return None


def _n_dimensions(place: _Place) -> int | None:
    """1, 2 for anything more, or None where there are no data."""
    if place.fid is not None:
        return 1
    if place.ser is not None:
        return 2
    if place.processed is not None:
        return 1 if (place.processed / "1r").is_file() else 2
    return 2 if any(place.folder.glob("pdata/*/2rr")) else None


def _parameters(path: Path | None) -> Block:
    if path is None:
        return Block()
    return parse_parameters(read_text(path, MAX_HEADER_BYTES))


def _nucleus(acqus: Block) -> str | None:
    return normalise.nucleus_name(acqus.text("$NUC1")) or normalise.nucleus_name(
        acqus.text("$NUCLEUS")
    )


def _read_fid(place: _Place, acqus: Block) -> Fid:
    fid, header = place.fid, place.acqus
    if fid is None or header is None:
        raise SpectrumFormatError(
            place.folder,
            "holds no fid file with its acqus file; copy the whole experiment folder",
        )
    width_hz = check_width(header, _width_hz(acqus))
    frequency_mhz = check_frequency(header, acqus.number("$BF1", "$SFO1"))
    n_declared = _declared_points(header, acqus)
    raw = _read_numbers(fid, acqus, "$BYTORDA", "$DTYPA")
    even = raw.size // 2 * 2
    values = complex_from_parts(raw[0:even:2], raw[1:even:2])
    samples, notes = check_fid_samples(fid, values, n_declared)
    delay, delay_notes = _delay(acqus, samples)
    offset_hz = acqus.number("$O1")
    return Fid(
        metadata=_metadata(
            place, acqus, [header, fid], frequency_mhz, (*notes, *delay_notes)
        ),
        samples=samples,
        spectral_width_hz=width_hz,
        carrier_ppm=plausible_carrier(
            None if offset_hz is None else offset_hz / frequency_mhz
        ),
        group_delay_points=delay,
    )


def _width_hz(acqus: Block) -> float | None:
    """Width in Hz, else from ppm."""
    told_hz = acqus.number("$SW_h")
    width_ppm, transmitter_mhz = acqus.number("$SW"), acqus.number("$SFO1")
    if told_hz is not None or width_ppm is None or transmitter_mhz is None:
        return told_hz
    return width_ppm * transmitter_mhz


def _declared_points(header: Path, acqus: Block) -> int | None:
    """Complex points by TD, which counts real and imaginary numbers apart."""
    n_numbers = acqus.number("$TD")
    return None if n_numbers is None else check_point_count(header, n_numbers // 2)


def _delay(
    acqus: Block, samples: npt.NDArray[np.complex128]
) -> tuple[float, tuple[str, ...]]:
    if acqus.number("$DIGMOD") == 0:  # analogue filter
        return 0.0, ()
    delay = normalise.bruker_group_delay(
        acqus.number("$DECIM"), acqus.number("$DSPFVS"), acqus.number("$GRPDLY")
    )
    if delay is None:
        return 0.0, (
            "The header does not tell the delay of the digital filter; "
            "it was taken as zero.",
        )
    if not delay < samples.size / 2:
        return 0.0, (
            f"The header tells a filter delay of {delay:.6g} points, longer than "
            "half the FID; it was taken as zero.",
        )
    return delay, ()


_DTYPES = {0: "i4", 2: "f8"}


def _read_numbers(
    path: Path, block: Block, order_label: str, type_label: str
) -> npt.NDArray[np.float64]:
    """Plain numbers of a binary file in the layout that its header tells."""
    code = block.number(type_label)
    kind = _DTYPES.get(0 if code is None else int(code))
    if kind is None:
        raise SpectrumFormatError(
            path,
            f"has the unknown number type {code:.6g} in its header; "
            "export the data anew from the spectrometer program",
        )
    content = read_bytes(path, MAX_BINARY_BYTES)
    size = int(kind[1])
    content = content[: len(content) // size * size]
    order = block.number(order_label)
    if order is None:
        return _likelier_order(content, kind)
    return as_floats(np.frombuffer(content, (">" if order == 1 else "<") + kind))


def _likelier_order(content: bytes, kind: str) -> npt.NDArray[np.float64]:
    """Numbers in the byte order that gives the smaller ones.

    Swapped bytes turn small integers into huge ones; a FID is mostly small.
    """
    with np.errstate(invalid="ignore", over="ignore"):
        both = [as_floats(np.frombuffer(content, order + kind)) for order in "<>"]
        little, big = (np.median(np.abs(values)) for values in both)
    return both[1] if big < little else both[0]


def _read_instead(place: _Place, acqus: Block) -> MakerSpectrum:
    """The maker's spectrum, where the FID was sampled in a way not read here."""
    if place.processed is None:
        raise SpectrumFormatError(
            place.folder,
            "was acquired without simultaneous quadrature detection and has no "
            "processed spectrum; process it at the spectrometer and give that",
        )
    note = (
        "The FID was acquired without simultaneous quadrature detection; "
        "the maker's processed spectrum was taken."
    )
    return _read_processed(place, acqus, notes=(note,))


def _read_processed(
    place: _Place, acqus: Block, *, notes: tuple[str, ...] = ()
) -> MakerSpectrum:
    folder = place.processed
    if folder is None:
        raise SpectrumFormatError(
            place.folder,
            "holds parameters but neither a FID nor a processed spectrum; "
            "copy the whole experiment folder",
        )
    header, real_path, imaginary_path = folder / "procs", folder / "1r", folder / "1i"
    procs = _parameters(header)
    nucleus = normalise.nucleus_name(procs.text("$AXNUC")) or _nucleus(acqus)
    normalise.require_proton(place.folder, nucleus)
    frequency_mhz = check_frequency(header, procs.number("$SF"))
    width_hz = check_width(header, procs.number("$SW_p"))
    first_ppm = procs.number("$OFFSET")
    if first_ppm is None:
        raise SpectrumFormatError(
            header, "does not state OFFSET, the shift of the first point; export anew"
        )
    n_declared = procs.number("$SI")
    real, short_notes = _processed_part(real_path, procs, n_declared)
    imaginary = None
    used = [header, real_path]
    if imaginary_path.is_file():
        imaginary, _ = _processed_part(imaginary_path, procs, n_declared)
        used.append(imaginary_path)
    # The axis is laid out for SI points even when the file ends early.
    step_hz = width_hz / (real.size if n_declared is None else n_declared)
    spectrum = make_spectrum(
        real_path,
        real,
        imaginary=imaginary,
        first_point_ppm=first_ppm,
        step_hz=-step_hz,
        spectrometer_frequency_mhz=frequency_mhz,
    )
    if place.acqus is not None and place.acqus.is_relative_to(place.folder):
        used.append(place.acqus)
    metadata = _metadata(
        place, acqus, used, frequency_mhz, (*notes, *short_notes), nucleus=nucleus
    )
    return MakerSpectrum(metadata=metadata, spectrum=spectrum)


def _processed_part(
    path: Path, procs: Block, n_declared: float | None
) -> tuple[npt.NDArray[np.float64], tuple[str, ...]]:
    """One component on the absolute scale, as read_pdata(scale_data=True) gives."""
    values = _read_numbers(path, procs, "$BYTORDP", "$DTYPP")
    exponent = procs.number("$NC_proc") or 0.0
    scale = 2.0 ** max(-100.0, min(100.0, exponent))
    notes: tuple[str, ...] = ()
    if n_declared is not None:
        n_points = check_point_count(path, n_declared)
        if values.size < n_points / 2:
            raise SpectrumFormatError(
                path,
                f"holds only {values.size} of the {n_points} points that its header "
                "declares; copy the data from the spectrometer again",
            )
        if values.size < n_points:
            notes = (
                f"The maker's spectrum is cut short: {values.size} of {n_points} "
                "points are there.",
            )
        values = values[:n_points]
    return scaled(values, scale), notes


def _metadata(
    place: _Place,
    acqus: Block,
    used: list[Path],
    frequency_mhz: float,
    notes: tuple[str, ...],
    *,
    nucleus: str | None = None,
) -> Metadata:
    proton, nucleus_notes = normalise.require_proton(
        place.folder, nucleus or _nucleus(acqus)
    )
    scans = acqus.number("$NS")
    program = acqus.text("$PULPROG")
    angle_deg = normalise.flip_angle_deg(program)
    right_angle_us = normalise.positive(acqus.element("$P", 1))
    return Metadata(
        source_name=place.folder.name,
        sha256=folder_sha256(place.folder, used),
        format_name=FORMAT_NAME,
        nucleus=proton,
        spectrometer_frequency_mhz=frequency_mhz,
        solvent=acqus.text("$SOLVENT"),
        temperature_k=normalise.kelvin(acqus.number("$TE")),
        n_scans=normalise.count(scans),
        pulse_program=program,
        pulse_length_us=_applied_us(right_angle_us, angle_deg),
        pulse_angle_deg=angle_deg,
        relaxation_delay_s=normalise.positive(acqus.element("$D", 1)),
        acquired_on=normalise.iso_date_from_seconds(acqus.number("$DATE")),
        title=_title(place),
        notes=(*nucleus_notes, *notes),
    )


def _applied_us(right_angle_us: float | None, angle_deg: float | None) -> float | None:
    """Length of the pulse applied: P1 is the 90 degree pulse, zg30 gives a third."""
    if right_angle_us is None or angle_deg is None:
        return right_angle_us
    return right_angle_us * angle_deg / 90.0


def _title(place: _Place) -> str | None:
    """First line of the user's title, which lies beside the processed data."""
    if place.processed is None or not (place.processed / "title").is_file():
        return None
    text = read_text(place.processed / "title", MAX_HEADER_BYTES)
    lines = [line.strip() for line in text.split("\n") if line.strip()]
    return lines[0][:200] if lines else None
