"""nmrML files: FIDs and processed spectra.

Read with the standard library: nmrglue 0.12 needs one more package for it, knows
neither of the byte formats that some converters write, and inflates without limit.

References
----------
.. [1] D. Schober, D. Jacob, M. Wilson et al., Anal. Chem. 90 (2018) 649-656,
   doi:10.1021/acs.analchem.7b02795 (the format).
"""

from __future__ import annotations

import base64
import binascii
import zlib
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import numpy.typing as npt

from spinledger.errors import SpectrumFormatError
from spinledger.io import normalise
from spinledger.io.checksum import file_sha256
from spinledger.io.experiment import Experiment, field_text, summary_line
from spinledger.io.limits import MAX_POINTS, MAX_TEXT_BYTES, read_bytes
from spinledger.io.normalise import shown
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
from spinledger.values.acquisition import Fid, MakerSpectrum, Metadata

KIND = "nmrml"
FID_NAME = "nmrML FID"
SPECTRUM_NAME = "nmrML spectrum"

_MAX_DATA_BYTES = 16 * MAX_POINTS
# Two tags an element; assignments of a large molecule take a few thousand.
_MAX_TAGS = 400_000


def is_file_head(head: bytes) -> bool:
    """Whether a file begins as nmrML does."""
    return head.lstrip()[:1] == b"<" and b"<nmrML" in head


def describe(path: Path) -> Experiment:
    """What the file holds, by its parameters."""
    document = _parse(path)
    nucleus = document.nucleus
    frequency_mhz = document.value("effectiveExcitationField")
    return Experiment(
        name=path.name,
        path=path,
        format_name=FID_NAME if document.fid is not None else SPECTRUM_NAME,
        n_dimensions=document.n_dimensions,
        nucleus=nucleus,
        summary=summary_line(
            nucleus, field_text(frequency_mhz), document.pulse_program, None
        ),
        has_fid=document.fid is not None,
        has_spectrum=document.spectrum is not None,
        spectrometer_frequency_mhz=frequency_mhz,
        kind=KIND,
    )


def read(path: Path, *, prefer_processed: bool = False) -> Fid | MakerSpectrum:
    """FID of the file, or its spectrum if preferred or the only one.

    Raises
    ------
    SpectrumFormatError
        If the data are not 1D proton data, damaged, or lack a parameter.
    """
    document = _parse(path)
    if document.n_dimensions != 1:
        raise SpectrumFormatError(
            path, "holds 2D or arrayed data; give the 1D proton spectrum of this sample"
        )
    nucleus, notes = normalise.require_proton(path, document.nucleus)
    frequency_mhz = check_frequency(path, document.value("effectiveExcitationField"))
    has_spectrum = document.spectrum is not None
    if document.fid is not None and not (prefer_processed and has_spectrum):
        return _read_fid(path, document, frequency_mhz, nucleus, notes)
    if has_spectrum:
        return _read_spectrum(path, document, frequency_mhz, nucleus, notes)
    raise SpectrumFormatError(
        path, "holds parameters but no data; export it again with the FID"
    )


def _local(tag: object) -> str:
    """Tag without its name space."""
    return tag.rpartition("}")[2] if isinstance(tag, str) else ""


@dataclass(frozen=True, slots=True, eq=False)
class _Document:
    root: ElementTree.Element

    def every(self, *names: str) -> Iterator[ElementTree.Element]:
        """Elements of these local names, in the order of the file."""
        return (node for node in self.root.iter() if _local(node.tag) in names)

    def first(self, *names: str) -> ElementTree.Element | None:
        return next(self.every(*names), None)

    def value(self, name: str) -> float | None:
        """Number in the "value" attribute of the first element of that name."""
        node = self.first(name)
        return None if node is None else parse_number(node.get("value", ""))

    @property
    def fid(self) -> ElementTree.Element | None:
        return self.first("fidData")

    @property
    def spectrum(self) -> ElementTree.Element | None:
        return self.first("spectrumDataArray")

    @property
    def n_dimensions(self) -> int:
        is_many = self.first("acquisitionMultiD", "spectrumMultiD") is not None
        return 2 if is_many or sum(1 for _ in self.every("fidData")) > 1 else 1

    @property
    def nucleus(self) -> str | None:
        node = self.first("acquisitionNucleus")
        return normalise.nucleus_name(None if node is None else node.get("name"))

    @property
    def pulse_program(self) -> str | None:
        for sequence in self.every("pulseSequence"):
            for node in sequence:
                if node.get("name") == "Pulse Program":
                    return node.get("value") or None
        return None

    @property
    def is_varian(self) -> bool:
        """Whether the FID came from a Varian or Agilent instrument."""
        for node in self.every("cvParam", "sourceFile"):
            name = node.get("name", "").lower()
            if name == "procpar" or name.startswith(("varian", "agilent")):
                return True
        return False


def _parse(path: Path) -> _Document:
    content = read_bytes(path, MAX_TEXT_BYTES)
    # nmrML needs no document type; declared entities only serve to blow up parsers.
    if b"<!DOCTYPE" in content[:4096] or b"<!ENTITY" in content[:4096]:
        raise SpectrumFormatError(
            path, "declares XML entities, which nmrML never does; export it again"
        )
    if content.count(b"<") > _MAX_TAGS:
        raise SpectrumFormatError(
            path, f"holds more than {_MAX_TAGS} XML tags; give the 1D spectrum alone"
        )
    try:
        return _Document(ElementTree.fromstring(content))
    except (ElementTree.ParseError, ValueError, LookupError) as fault:
        raise SpectrumFormatError(
            path, "is not complete XML; export or copy it again"
        ) from fault


# ---- numbers


def _decode(path: Path, node: ElementTree.Element) -> bytes:
    try:
        packed = base64.b64decode("".join((node.text or "").split()))
    except (binascii.Error, ValueError) as fault:
        raise SpectrumFormatError(
            path, "has data that are not base64; export it again"
        ) from fault
    if node.get("compressed", "").lower() != "true":
        return packed
    inflater = zlib.decompressobj()
    try:
        plain = inflater.decompress(packed, _MAX_DATA_BYTES + 1)
    except zlib.error as fault:
        raise SpectrumFormatError(
            path, "has damaged compressed data; export it again"
        ) from fault
    if len(plain) > _MAX_DATA_BYTES:
        raise SpectrumFormatError(
            path, f"unpacks to more than the {MAX_POINTS} points a 1D spectrum can have"
        )
    return plain


def _numbers(path: Path, node: ElementTree.Element) -> npt.NDArray[np.float64]:
    """Plain numbers of a data element; complex ones as alternate parts."""
    written = node.get("byteFormat", "").lower()
    if "int" in written:  # "class java.lang.Integer": big-endian, by the Java writer
        width, kind = (8, "i8") if "int64" in written else (4, "i4")
        order = "<" if written.startswith("int") else ">"
    elif written in ("complex64", "float32", "class java.lang.float"):
        width, kind, order = 4, "f4", "<"
    elif written in ("complex128", "float64", "class java.lang.double"):
        width, kind, order = 8, "f8", "<"
    else:
        raise SpectrumFormatError(
            path, f"has the unknown byte format {shown(written)!r}; export it again"
        )
    content = _decode(path, node)
    content = content[: len(content) // width * width]
    if kind.startswith("f"):
        order = _likelier_float_order(content, kind)
    return as_floats(np.frombuffer(content, order + kind))


def _likelier_float_order(content: bytes, kind: str) -> str:
    """Byte order in which the exponents spread less; swapped bytes scatter them."""
    spreads: dict[str, float] = {}
    for order in "<>":
        with np.errstate(invalid="ignore", over="ignore"):
            values = np.abs(as_floats(np.frombuffer(content, order + kind)[:65536]))
        usable = values[np.isfinite(values) & (values > 0)]
        lost = np.count_nonzero(~np.isfinite(values))
        spreads[order] = (
            float(np.std(np.log10(usable))) if usable.size else 1e3
        ) + 10.0 * float(lost)
    return ">" if spreads[">"] < spreads["<"] else "<"


# ---- values


def _metadata(
    path: Path,
    document: _Document,
    frequency_mhz: float,
    *,
    nucleus: str,
    format_name: str,
    notes: tuple[str, ...],
) -> Metadata:
    acquisition = document.first("acquisitionParameterSet")
    scans = None if acquisition is None else acquisition.get("numberOfScans")
    solvent = document.first("solvent", "fieldFrequencyLock")
    angle_deg = normalise.flip_angle_deg(document.pulse_program)
    return Metadata(
        source_name=path.name,
        sha256=file_sha256(path),
        format_name=format_name,
        nucleus=nucleus,
        spectrometer_frequency_mhz=frequency_mhz,
        solvent=None if solvent is None else solvent.get("name") or None,
        temperature_k=normalise.kelvin(document.value("sampleAcquisitionTemperature")),
        n_scans=normalise.count(parse_number(scans or "")),
        pulse_program=document.pulse_program,
        pulse_length_us=normalise.positive(document.value("pulseWidth")),
        pulse_angle_deg=angle_deg,
        relaxation_delay_s=normalise.positive(document.value("relaxationDelay")),
        notes=notes,
    )


def _read_fid(
    path: Path,
    document: _Document,
    frequency_mhz: float,
    nucleus: str,
    notes: tuple[str, ...],
) -> Fid:
    node = document.fid
    if node is None:
        raise SpectrumFormatError(path, "holds no FID; export it again with the FID")
    width_hz = check_width(path, document.value("sweepWidth"))
    numbers = _numbers(path, node)
    raw = complex_from_parts(numbers[0::2], numbers[1::2])
    samples, sample_notes = check_fid_samples(
        path, np.conj(raw) if document.is_varian else raw, None
    )
    # Written with the unit MHz, yet in Hz from the base frequency.
    offset_hz = document.value("irradiationFrequencyOffset")
    delay = document.value("groupDelay") or 0.0
    if not 0 <= delay < samples.size / 2:
        delay = 0.0
    return Fid(
        metadata=_metadata(
            path,
            document,
            frequency_mhz,
            nucleus=nucleus,
            format_name=FID_NAME,
            notes=(*notes, *sample_notes),
        ),
        samples=samples,
        spectral_width_hz=width_hz,
        carrier_ppm=plausible_carrier(
            None if offset_hz is None else offset_hz / frequency_mhz
        ),
        group_delay_points=delay,
    )


def _read_spectrum(
    path: Path,
    document: _Document,
    frequency_mhz: float,
    nucleus: str,
    notes: tuple[str, ...],
) -> MakerSpectrum:
    node, axis = document.spectrum, document.first("xAxis")
    if node is None:
        raise SpectrumFormatError(path, "holds no spectrum; export it again")
    numbers = _numbers(path, node)
    if "complex" in node.get("byteFormat", "").lower():
        # Pairs of shift and intensity, as converters write them.
        numbers = numbers[: numbers.size // 2 * 2]
        shifts_ppm, values = numbers[0::2], numbers[1::2]
        first_ppm, last_ppm = (
            (float(shifts_ppm[0]), float(shifts_ppm[-1])) if values.size else (0, 0)
        )
    else:
        values = numbers
        first, last = (
            None if axis is None else parse_number(axis.get(name, ""))
            for name in ("startValue", "endValue")
        )
        if first is None or last is None:
            raise SpectrumFormatError(
                path, "does not state its shift axis; export it again"
            )
        first_ppm, last_ppm = first, last
    if values.size < 2:
        raise SpectrumFormatError(path, "holds an empty spectrum; export it again")
    spectrum = make_spectrum(
        path,
        values,
        imaginary=None,
        first_point_ppm=first_ppm,
        step_hz=(last_ppm - first_ppm) / (values.size - 1) * frequency_mhz,
        spectrometer_frequency_mhz=frequency_mhz,
    )
    return MakerSpectrum(
        metadata=_metadata(
            path,
            document,
            frequency_mhz,
            nucleus=nucleus,
            format_name=SPECTRUM_NAME,
            notes=notes,
        ),
        spectrum=spectrum,
    )
