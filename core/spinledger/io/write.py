"""Processed spectra out: JCAMP-DX 6.00 and plain CSV, moved into place when whole.

References
----------
.. [1] A. N. Davies, P. Lampen, Appl. Spectrosc. 47 (1993) 1093-1099,
   doi:10.1366/0003702934067874 (NMR SPECTRUM labels).
"""

from __future__ import annotations

import os
import secrets
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import IO

import numpy as np
import numpy.typing as npt

from spinledger import __version__
from spinledger.errors import OutputError
from spinledger.values.acquisition import Metadata
from spinledger.values.spectrum import Spectrum

# Largest ordinate written: 2**30 fits the 32-bit integers that old readers use,
# and its last digit is 1e-9 of the strongest line, far below any noise.
_LARGEST = 2**30
_LINE_LENGTH = 80
_SQUEEZED = {"+": "@ABCDEFGHI", "-": "@abcdefghi"}


def write_csv(spectrum: Spectrum, path: Path) -> None:
    """Write shift and intensity in two columns under the header "ppm,intensity".

    Parameters
    ----------
    spectrum : Spectrum
    path : pathlib.Path
        Target; replaced in one step when the file is whole.

    Raises
    ------
    OutputError
        If the file cannot be written.

    Notes
    -----
    Intensities are written with 17 digits and shifts with 9 decimals.
    """

    def fill(stream: IO[str]) -> None:
        stream.write("ppm,intensity\n")
        for shift_ppm, intensity in zip(
            spectrum.shifts_ppm.tolist(), spectrum.intensities.tolist(), strict=True
        ):
            stream.write(f"{shift_ppm:.9f},{intensity!r}\n")

    _write_beside(Path(path), fill)


def write_jcamp(spectrum: Spectrum, metadata: Metadata, path: Path) -> None:
    """Write a spectrum as JCAMP-DX 6.00, NMR SPECTRUM, XYDATA in SQZ form.

    Parameters
    ----------
    spectrum : Spectrum
        Its real part is written.
    metadata : Metadata
        Header facts; unknown ones are left out.
    path : pathlib.Path
        Target; replaced in one step when the file is whole.

    Raises
    ------
    OutputError
        If the file cannot be written, or the intensities are not finite.

    Notes
    -----
    Ordinates are whole numbers up to 2**30 times a factor, so a value read back
    differs by at most half the factor, 5e-10 of the largest. The axis is in Hz
    with 0 Hz at 0 ppm, first point first, and is exact to 12 digits.
    """
    if not np.all(np.isfinite(spectrum.intensities)):
        raise OutputError(
            Path(path), "cannot be written: the spectrum has values that are not finite"
        )
    factor, ordinates = _whole_numbers(spectrum.intensities)
    first_hz = spectrum.first_point_ppm * spectrum.spectrometer_frequency_mhz

    def fill(stream: IO[str]) -> None:
        for label, value in _header(spectrum, metadata, factor, ordinates):
            stream.write(f"##{label}= {value}\n")
        stream.write("##XYDATA= (X++(Y..Y))\n")
        for line in _table(ordinates, first_hz, spectrum.step_hz):
            stream.write(line + "\n")
        stream.write("##END=\n")

    _write_beside(Path(path), fill)


def _whole_numbers(
    intensities: npt.NDArray[np.float64],
) -> tuple[float, npt.NDArray[np.int64]]:
    """Factor and integers whose product is the spectrum."""
    largest = float(np.max(np.abs(intensities)))
    factor = largest / _LARGEST if largest > 0 else 1.0
    # The factor as printed is the one a reader will use.
    factor = float(f"{factor:.12e}")
    return factor, np.rint(intensities / factor).astype(np.int64)


def _header(
    spectrum: Spectrum,
    metadata: Metadata,
    factor: float,
    ordinates: npt.NDArray[np.int64],
) -> Iterator[tuple[str, object]]:
    """Labels and values in the order of the standard [1]_."""
    frequency_mhz = spectrum.spectrometer_frequency_mhz
    first_hz = spectrum.first_point_ppm * frequency_mhz
    last_hz = first_hz - spectrum.step_hz * (spectrum.n_points - 1)
    yield "TITLE", _one_line(metadata.title or metadata.source_name)
    yield "JCAMP-DX", "6.00"
    yield "DATA TYPE", "NMR SPECTRUM"
    yield "DATA CLASS", "XYDATA"
    yield "ORIGIN", f"Spin Ledger {__version__}"
    yield "OWNER", "not stated"
    if metadata.acquired_on is not None:
        yield "LONG DATE", metadata.acquired_on.replace("-", "/")
    yield ".OBSERVE FREQUENCY", f"{frequency_mhz:.12g}"
    yield ".OBSERVE NUCLEUS", "^" + metadata.nucleus
    if metadata.solvent is not None:
        yield ".SOLVENT NAME", _one_line(metadata.solvent)
    if metadata.pulse_program is not None:
        yield ".PULSE SEQUENCE", _one_line(metadata.pulse_program)
    if metadata.n_scans is not None:
        yield ".AVERAGES", metadata.n_scans
    if metadata.temperature_k is not None:
        yield "$TE", f"{metadata.temperature_k:.10g}"
    yield ".SHIFT REFERENCE", f"INTERNAL, , 1, {spectrum.first_point_ppm:.9f}"
    yield "XUNITS", "HZ"
    yield "YUNITS", "ARBITRARY UNITS"
    yield "FIRSTX", f"{first_hz:.12g}"
    yield "LASTX", f"{last_hz:.12g}"
    yield "DELTAX", f"{-spectrum.step_hz:.15g}"
    yield "XFACTOR", 1
    yield "YFACTOR", f"{factor:.12e}"
    yield "MAXY", f"{int(ordinates.max()) * factor:.12g}"
    yield "MINY", f"{int(ordinates.min()) * factor:.12g}"
    yield "FIRSTY", f"{int(ordinates[0]) * factor:.12g}"
    yield "NPOINTS", spectrum.n_points


def _one_line(text: str) -> str:
    """Text without line ends or remark signs, short enough for a label."""
    cleaned = " ".join(text.replace("$$", "$").split())
    return cleaned[:200] or "not stated"


def _table(
    ordinates: npt.NDArray[np.int64], first_hz: float, step_hz: float
) -> Iterator[str]:
    """Lines of squeezed ordinates, each led by the abscissa of its first point."""
    line, n_words = f"{first_hz:.4f}", 0
    for index, value in enumerate(ordinates.tolist()):
        digits = str(abs(value))
        word = _SQUEEZED["-" if value < 0 else "+"][int(digits[0])] + digits[1:]
        if n_words and len(line) + len(word) > _LINE_LENGTH:
            yield line
            line, n_words = f"{first_hz - index * step_hz:.4f}", 0
        line += word
        n_words += 1
    yield line


def _write_beside(path: Path, fill: Callable[[IO[str]], None]) -> None:
    """Fill a temporary file in the target's folder and move it into place."""
    partial = path.parent / f".spinledger-{secrets.token_hex(8)}.part"
    try:
        try:
            with partial.open("x", encoding="utf-8", newline="\n") as stream:
                fill(stream)
                stream.flush()
                os.fsync(stream.fileno())
            partial.replace(path)
        finally:
            partial.unlink(missing_ok=True)
    except OSError as fault:
        raise OutputError(
            path,
            f"cannot be written ({(fault.strerror or 'unknown fault').lower()}); "
            "choose another folder",
        ) from fault
