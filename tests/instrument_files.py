"""Small data sets in the makers' layouts, written for the tests from one known FID."""

from __future__ import annotations

import base64
import struct
import zlib
from pathlib import Path

import numpy as np
import numpy.typing as npt

WIDTH_HZ = 5000.0
FREQUENCY_MHZ = 400.13
CARRIER_PPM = 5.0
LINES_HZ = (-1200.0, 310.0)

ComplexArray = npt.NDArray[np.complex128]


def known_fid(
    n_points: int = 1024, *, lines_hz: tuple[float, ...] = LINES_HZ
) -> ComplexArray:
    """Decaying lines at carrier + f Hz as exp(+2 pi i f t), whole numbers."""
    times_s = np.arange(n_points) / WIDTH_HZ
    fid = sum(
        (height + 1) * np.exp((2j * np.pi * line - 8.0) * times_s)
        for height, line in enumerate(lines_hz)
    )
    return np.asarray(np.round(1e4 * fid.real) + 1j * np.round(1e4 * fid.imag))


def interleaved(fid: ComplexArray, kind: str) -> bytes:
    """Real and imaginary numbers in turn."""
    numbers = np.empty(2 * fid.size)
    numbers[0::2], numbers[1::2] = fid.real, fid.imag
    return numbers.astype(kind).tobytes()


def acqus_text(**changed: object) -> str:
    """A Bruker parameter file; None leaves a parameter out."""
    values: dict[str, object] = {
        "AQ_mod": 3,
        "BF1": FREQUENCY_MHZ,
        "BYTORDA": 0,
        "D": "(0..3)\n0 1.5 0.03 0",
        "DATE": 1700000000,  # 2023-11-14
        "DECIM": 1,
        "DSPFVS": 20,
        "DTYPA": 0,
        "GRPDLY": 0,
        "NS": 16,
        "NUC1": "<1H>",
        "O1": CARRIER_PPM * FREQUENCY_MHZ,
        "P": "(0..3)\n0 12.0 0 0",
        "PULPROG": "<zg30>",
        "SFO1": FREQUENCY_MHZ + CARRIER_PPM * FREQUENCY_MHZ * 1e-6,
        "SOLVENT": "<CDCl3>",
        "SW_h": WIDTH_HZ,
        "TD": 2048,
        "TE": 298.15,
    } | changed
    rows = [f"##${key}= {value}" for key, value in values.items() if value is not None]
    return "\n".join(["##TITLE= Parameter file", *rows, "##END=", ""])


def write_bruker(
    folder: Path,
    fid: ComplexArray | None = None,
    *,
    kind: str = "<i4",
    **changed: object,
) -> Path:
    """A Bruker experiment folder with its FID."""
    fid = known_fid() if fid is None else fid
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "acqus").write_text(acqus_text(**({"TD": 2 * fid.size} | changed)))
    (folder / "fid").write_bytes(interleaved(fid, kind))
    return folder


def write_pdata(
    folder: Path, real: npt.NDArray[np.float64], *, exponent: int = 0, **changed: object
) -> Path:
    """The maker's spectrum of a Bruker folder, whole numbers times 2**exponent."""
    place = folder / "pdata" / "1"
    place.mkdir(parents=True)
    values: dict[str, object] = {
        "AXNUC": "<1H>",
        "BYTORDP": 0,
        "DTYPP": 0,
        "NC_proc": exponent,
        "OFFSET": 11.0,
        "SF": FREQUENCY_MHZ,
        "SI": real.size,
        "SW_p": WIDTH_HZ,
    } | changed
    rows = [f"##${key}= {value}" for key, value in values.items() if value is not None]
    (place / "procs").write_text("\n".join(["##TITLE= x", *rows, "##END=", ""]))
    (place / "1r").write_bytes(real.astype("<i4").tobytes())
    return place


def write_varian(
    folder: Path, fid: ComplexArray | None = None, **changed: object
) -> Path:
    """A Varian folder; its frequencies run the other way round."""
    fid = known_fid() if fid is None else fid
    folder.mkdir(parents=True, exist_ok=True)
    values: dict[str, object] = {
        "sw": WIDTH_HZ,
        "sfrq": FREQUENCY_MHZ * (1 + CARRIER_PPM * 1e-6),
        "reffrq": FREQUENCY_MHZ,
        "rfl": WIDTH_HZ / 2 - CARRIER_PPM * FREQUENCY_MHZ,
        "rfp": 0,
        "np": 2 * fid.size,
        "ct": 16,
        "d1": 1.5,
        "pw": 4.0,
        "pw90": 12.0,
        "temp": 25.0,
        "arraydim": 1,
        "tn": "H1",
        "solvent": "cdcl3",
        "seqfil": "s2pul",
        "time_run": "20231114T120000",
    } | changed
    (folder / "procpar").write_text(
        "".join(procpar_entry(name, value) for name, value in values.items())
    )
    status = 0x1 | 0x4  # data present, 32-bit whole numbers
    size = 4 * 2 * fid.size
    header = struct.pack(">6i2hi", 1, 1, 2 * fid.size, 4, size, size + 28, 0, status, 1)
    body = interleaved(np.conj(fid), ">i4")
    (folder / "fid").write_bytes(header + bytes(28) + body)
    return folder


def procpar_entry(name: str, value: object) -> str:
    """Three lines of a procpar file."""
    if isinstance(value, str):
        return f'{name} 2 2 8 0 0 2 1 0 1 64\n1 "{value}"\n0 \n'
    return f"{name} 1 1 1e18 -1e18 0 2 1 0 1 64\n1 {value!r} \n0 \n"


def write_jeol(path: Path, fid: ComplexArray | None = None, **changed: object) -> Path:
    """A little-endian JEOL file; its frequencies run the other way round."""
    fid = known_fid() if fid is None else fid
    values: dict[str, object] = {
        "x_domain": "Proton",
        "x_offset": CARRIER_PPM,
        "x_sweep": WIDTH_HZ,
        "solvent": "CHLOROFORM-D",
        "experiment": "proton.jxp",
        "scans": 16,
        "digital_filter": "TRUE",
        "orders": "2 41 73",
        "factors": "6 2",
        "actual_start_timestamp": "14-NOV-2023",
    } | changed
    records = b"".join(jeol_record(name, value) for name, value in values.items())
    parameters = struct.pack("<4I", 64, 0, len(values) - 1, len(records)) + records
    data_at = 1360 + len(parameters)
    header = bytearray(1360)
    header[0:8], header[8], header[12] = b"JEOL.NMR", 1, 1
    header[14] = 0b00_000001  # 64-bit, one dimension
    header[24] = 3  # complex
    header[32:34] = bytes((0x01, 28))  # seconds
    header[48 : 48 + 5] = b"title"
    struct.pack_into(">8I", header, 176, fid.size, *(1,) * 7)
    struct.pack_into(">I", header, 240, fid.size - 1)
    struct.pack_into(">d", header, 336, (fid.size - 1) / WIDTH_HZ)
    header[808 : 808 + 6] = b"Proton"
    struct.pack_into(">d", header, 1064, FREQUENCY_MHZ)
    struct.pack_into(">I", header, 1212, 1360)
    struct.pack_into(">I", header, 1284, data_at)
    body = fid.real.astype("<f8").tobytes() + (-fid.imag).astype("<f8").tobytes()
    path.write_bytes(bytes(header) + parameters + body)
    return path


def jeol_record(name: str, value: object) -> bytes:
    """One 64-byte parameter record."""
    if isinstance(value, str):
        kind, raw = 0, value.encode().ljust(16, b"\0")
    elif isinstance(value, int):
        kind, raw = 1, struct.pack("<i12x", value)
    else:
        kind, raw = 2, struct.pack("<d8x", value)
    return struct.pack("<4xh10x16si28s", 0, raw, kind, name.encode())


def jcamp_fid_text(fid: ComplexArray | None = None, **changed: object) -> str:
    """A JCAMP-DX FID as NTUPLES, plain numbers, with the labels of one exporter."""
    fid = known_fid() if fid is None else fid
    n_points = fid.size
    labels: dict[str, object] = {
        "TITLE": "sample",
        "JCAMP-DX": "5.01",
        "DATA TYPE": "NMR FID",
        "DATA CLASS": "NTUPLES",
        ".OBSERVE FREQUENCY": FREQUENCY_MHZ,
        ".OBSERVE NUCLEUS": "^1H",
        ".SOLVENT NAME": "CDCl3",
        "$AQ_mod": 3,
        "$BF1": FREQUENCY_MHZ,
        "$O1": CARRIER_PPM * FREQUENCY_MHZ,
        "VAR_NAME": "TIME, FID/REAL, FID/IMAG, PAGE NUMBER",
        "SYMBOL": "X, R, I, N",
        "VAR_DIM": f"{n_points}, {n_points}, {n_points}, 2",
        "UNITS": "SECONDS, ARBITRARY UNITS, ARBITRARY UNITS, ",
        "FIRST": "0, 0, 0, 1",
        "LAST": f"{(n_points - 1) / WIDTH_HZ!r}, 0, 0, 2",
        "FACTOR": f"{1 / WIDTH_HZ!r}, 1, 1, 1",
    } | changed
    head = [
        f"##{label}= {value}" for label, value in labels.items() if value is not None
    ]
    pages = []
    for number, (symbol, part) in enumerate(
        (("R", fid.real), ("I", fid.imag)), start=1
    ):
        rows = "\n".join(f"{index} {value:.0f}" for index, value in enumerate(part))
        pages += [
            f"##PAGE= N={number}",
            f"##DATA TABLE= (X++({symbol}..{symbol})), XYDATA",
        ]
        pages.append(rows)
    return "\n".join([*head, *pages, "##END NTUPLES=", "##END=", ""])


def jcamp_spectrum_text(table: str, **changed: object) -> str:
    """A JCAMP-DX spectrum as XYDATA around a given table."""
    labels: dict[str, object] = {
        "TITLE": "sample",
        "JCAMP-DX": "5.00",
        "DATA TYPE": "NMR SPECTRUM",
        "DATA CLASS": "XYDATA",
        ".OBSERVE FREQUENCY": 300.0,
        ".OBSERVE NUCLEUS": "^1H",
        "XUNITS": "HZ",
        "XFACTOR": 1,
        "YFACTOR": 1,
        "FIRSTX": 3000.0,
        "LASTX": 0.0,
        "NPOINTS": 101,
        ".SHIFT REFERENCE": "INTERNAL, TMS, 101, 0.0",
    } | changed
    head = [
        f"##{label}= {value}" for label, value in labels.items() if value is not None
    ]
    return "\n".join([*head, "##XYDATA= (X++(Y..Y))", table, "##END=", ""])


def write_nmrml(
    path: Path,
    fid: ComplexArray | None = None,
    *,
    byte_format: str = "Complex128",
    maker: str = "Bruker NMR instrument",
    nucleus: str = "hydrogen atom",
    head: str = "",
) -> Path:
    """An nmrML file; Complex128 is compressed, everything else is not."""
    fid = known_fid() if fid is None else fid
    is_complex = byte_format.lower() == "complex128"
    plain = interleaved(fid, "<f8" if is_complex else ">i4")
    packed = base64.b64encode(zlib.compress(plain) if is_complex else plain).decode()
    path.write_text(
        f"""<?xml version="1.0"?>{head}
<nmrML xmlns="http://nmrml.org/schema" version="1.0.rc1">
<instrumentConfigurationList><instrumentConfiguration id="a">
<cvParam cvRef="NMRCV" accession="NMR:1" name="{maker}"/>
</instrumentConfiguration></instrumentConfigurationList>
<acquisition><acquisition1D><acquisitionParameterSet numberOfScans="16">
<sampleAcquisitionTemperature value="298.15"/><relaxationDelay value="1.5"/>
<pulseSequence><userParam name="Pulse Program" value="zg30"/></pulseSequence>
<groupDelay value="0"/>
<DirectDimensionParameterSet numberOfDataPoints="{2 * fid.size}">
<acquisitionNucleus name="{nucleus}"/>
<effectiveExcitationField value="{FREQUENCY_MHZ}" unitName="megaHertz"/>
<sweepWidth value="{WIDTH_HZ}" unitName="hertz"/>
<irradiationFrequencyOffset value="{CARRIER_PPM * FREQUENCY_MHZ}" unitName="megaHertz"/>
</DirectDimensionParameterSet></acquisitionParameterSet>
<fidData compressed="{str(is_complex).lower()}" encodedLength="{len(packed)}"
 byteFormat="{byte_format}">{packed}</fidData>
</acquisition1D></acquisition></nmrML>
"""
    )
    return path


def write_spinsolve(
    folder: Path, fid: ComplexArray | None = None, **changed: object
) -> Path:
    """A Spinsolve folder with its FID."""
    fid = known_fid() if fid is None else fid
    folder.mkdir(parents=True, exist_ok=True)
    values: dict[str, object] = {
        "Sample": '"tube 7"',
        "Solvent": '"CDCl3"',
        "startTime": '"2023-11-14T12:00:00.000"',
        "b1Freq": f"{FREQUENCY_MHZ}d",
        "bandwidth": WIDTH_HZ / 1e3,
        "lowestFrequency": CARRIER_PPM * FREQUENCY_MHZ - WIDTH_HZ / 2,
        "nrScans": 16,
        "repTime": 3000,
        "totalAcquisitionTime": 1.5,
        "pulseLength": 12.0,
        "pulseAngle": 90,
        "rxChannel": '"1H"',
        "Protocol": '"1D PROTON"',
        "Comment": "",
    } | changed
    (folder / "acqu.par").write_text(
        "".join(f"{key:30}= {value}\n" for key, value in values.items())
    )
    times_ms = (np.arange(fid.size) / WIDTH_HZ * 1e3).astype("<f4")
    (folder / "data.1d").write_bytes(
        spinsolve_header(fid.size) + times_ms.tobytes() + interleaved(fid, "<f4")
    )
    return folder


def spinsolve_header(n_points: int) -> bytes:
    """The 32 bytes before the axis of a .1d file."""
    return b"SORPATAD1.1V" + struct.pack("<5i", 504, n_points, 1, 1, 1)
