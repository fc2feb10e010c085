"""How much a reader may take in; sizes in bytes, lengths in points."""

from __future__ import annotations

import os
from pathlib import Path

from spinledger.errors import SpectrumFormatError

# The longest FIDs of ordinary 1D work hold 2**20 points; the limits leave room
# above that and keep any reader under 1 GiB of memory.
MAX_POINTS = 2**21
MAX_BINARY_BYTES = 2**25 + 2**20
MAX_TEXT_BYTES = 2**25
MAX_HEADER_BYTES = 2**22
MAX_LINES = 2**21
MIN_POINTS = 64


def read_bytes(path: Path, limit_bytes: int) -> bytes:
    """Bytes of a file that is not longer than the limit.

    Raises
    ------
    SpectrumFormatError
        If the file is missing, not readable, or longer than the limit.
    """
    try:
        with path.open("rb") as stream:
            size_bytes = os.fstat(stream.fileno()).st_size
            taken = stream.read(limit_bytes + 1) if size_bytes <= limit_bytes else None
    except FileNotFoundError as fault:
        raise SpectrumFormatError(path, MISSING) from fault
    except OSError as fault:
        raise SpectrumFormatError(
            path, f"cannot be opened ({_cause(fault)}); check the path and the rights"
        ) from fault
    # A device or pipe reports size 0 and goes on for ever: hence the second test.
    if taken is None or len(taken) > limit_bytes:
        raise SpectrumFormatError(
            path,
            f"is larger than the {limit_bytes // 2**20} MiB that a 1D proton "
            "data file can take; give the 1D experiment itself",
        )
    return taken


MISSING = "does not exist; check the path"


def _cause(fault: OSError) -> str:
    return (fault.strerror or type(fault).__name__).lower()


def read_head(path: Path, n_bytes: int = 4096) -> bytes:
    """First bytes of a file; empty if it cannot be read."""
    try:
        with path.open("rb") as stream:
            return stream.read(n_bytes)
    except OSError:
        return b""


def read_text(path: Path, limit_bytes: int) -> str:
    """Text of a file in whichever common encoding, lines ended by newlines only.

    Raises
    ------
    SpectrumFormatError
        If the file cannot be read, or has too many bytes or lines.
    """
    content = read_bytes(path, limit_bytes)
    # Each line costs an object: a file of line ends alone would fill the memory.
    if content.count(b"\n") + content.count(b"\r") > 2 * MAX_LINES:
        raise SpectrumFormatError(
            path, f"holds more than {MAX_LINES} lines; give the 1D spectrum alone"
        )
    return decode_text(content).replace("\r\n", "\n").replace("\r", "\n")


def decode_text(content: bytes) -> str:
    """Text of a header or table in whichever common encoding it was written."""
    if content.startswith((b"\xff\xfe", b"\xfe\xff")):
        return content.decode("utf-16", errors="replace")
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError:
        return content.decode("cp1252", errors="replace")


def check_point_count(path: Path, n_points: float) -> int:
    """Number of points as int, if it is one that a 1D data set can have.

    Raises
    ------
    SpectrumFormatError
        If the number is not finite, too small or absurdly large.
    """
    if not MIN_POINTS <= n_points <= MAX_POINTS:  # false for NaN as well
        shown = f"{n_points:.15g}"
        raise SpectrumFormatError(
            path,
            f"declares {shown} data points, outside {MIN_POINTS} to {MAX_POINTS}; "
            "the file is damaged or not a 1D spectrum, so export it anew",
        )
    return int(n_points)
