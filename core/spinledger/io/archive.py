"""Zip files of data sets, unpacked into a temporary folder within fixed limits."""

from __future__ import annotations

import tempfile
import zipfile
import zlib
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path, PurePosixPath

from spinledger.errors import SpectrumFormatError

MAX_ENTRIES = 20_000
MAX_UNPACKED_BYTES = 2**29
MAX_ENTRY_BYTES = 2**28
_CHUNK_BYTES = 2**18


def is_file_head(head: bytes) -> bool:
    """Whether a file begins as zip files do."""
    return head.startswith((b"PK\x03\x04", b"PK\x05\x06"))


@contextmanager
def unpacked(path: Path) -> Iterator[Path]:
    """Temporary folder with the contents of a zip; gone when the block ends.

    Entries that would land outside the folder, links, and encrypted entries are
    refused. Sizes are counted while unpacking, so a header that lies about them
    does not help a bomb.

    Raises
    ------
    SpectrumFormatError
        If the zip is damaged, encrypted, unsafe or too large.
    """
    with tempfile.TemporaryDirectory(prefix="spinledger-") as folder:
        try:
            with zipfile.ZipFile(path) as archive:
                _unpack(path, archive, Path(folder))
        except _ZIP_FAULTS as fault:
            raise SpectrumFormatError(
                path, "is a damaged zip file; make or copy it again"
            ) from fault
        yield Path(folder)


_ZIP_FAULTS = (
    zipfile.BadZipFile,
    zlib.error,
    EOFError,
    NotImplementedError,
    OSError,
    RuntimeError,
    UnicodeError,
    OverflowError,
    LookupError,
)


def _unpack(path: Path, archive: zipfile.ZipFile, folder: Path) -> None:
    entries = [entry for entry in archive.infolist() if not entry.is_dir()]
    if len(entries) > MAX_ENTRIES:
        raise SpectrumFormatError(
            path, f"holds more than {MAX_ENTRIES} files; unpack it and give one folder"
        )
    left = MAX_UNPACKED_BYTES
    for entry in entries:
        if entry.flag_bits & 0x1:
            raise SpectrumFormatError(
                path, "is locked with a password; unpack it and give the folder"
            )
        if entry.compress_type not in (zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED):
            raise SpectrumFormatError(
                path, "is packed in an unusual way; unpack it and give the folder"
            )
        target = folder.joinpath(*_safe_parts(path, entry.filename))
        target.parent.mkdir(parents=True, exist_ok=True)
        left -= _write_entry(path, archive, entry, target, min(left, MAX_ENTRY_BYTES))


def _safe_parts(path: Path, name: str) -> tuple[str, ...]:
    """Parts of an entry's path that stay inside the folder."""
    parts = PurePosixPath(name.replace("\\", "/")).parts
    is_unsafe = (
        not parts
        or any(part in ("..", "/") or ":" in part or "\0" in part for part in parts)
        or len(parts) > 40
    )
    if is_unsafe:
        raise SpectrumFormatError(
            path,
            "holds entries that would be written outside their folder; it was not "
            "unpacked, so ask its sender for a clean one",
        )
    return parts


def _write_entry(
    path: Path,
    archive: zipfile.ZipFile,
    entry: zipfile.ZipInfo,
    target: Path,
    limit_bytes: int,
) -> int:
    """Unpack one entry and return its size; stop at the limit."""
    written = 0
    with archive.open(entry) as source, target.open("xb") as sink:
        while chunk := source.read(_CHUNK_BYTES):
            written += len(chunk)
            if written > limit_bytes:
                raise SpectrumFormatError(
                    path,
                    f"unpacks to more than {MAX_UNPACKED_BYTES // 2**20} MiB; unpack "
                    "it yourself and give the folder of the 1D proton experiment",
                )
            sink.write(chunk)
    return written
