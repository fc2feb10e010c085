"""SHA-256 of what was read."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable
from pathlib import Path

from spinledger.errors import SpectrumFormatError

_CHUNK_BYTES = 2**20


def file_sha256(path: Path) -> str:
    """SHA-256 of the bytes of a file, hexadecimal."""
    digest = hashlib.sha256()
    _feed(digest, path)
    return digest.hexdigest()


def folder_sha256(folder: Path, files: Iterable[Path]) -> str:
    """SHA-256 over the files read from a dataset folder, hexadecimal.

    The files are taken in the order of their paths relative to the folder;
    each adds its path (UTF-8, forward slashes), a zero byte, and its bytes.
    Other files of the folder do not count: the sum stays the same when the
    maker's program processes the data again.
    """
    digest = hashlib.sha256()
    named = sorted((file.relative_to(folder).as_posix(), file) for file in files)
    for name, file in named:
        digest.update(name.encode("utf-8", errors="surrogateescape") + b"\0")
        _feed(digest, file)
    return digest.hexdigest()


def _feed(digest: hashlib._Hash, path: Path) -> None:
    try:
        with path.open("rb") as stream:
            while chunk := stream.read(_CHUNK_BYTES):
                digest.update(chunk)
    except OSError as fault:
        raise SpectrumFormatError(
            path, "could not be read to its end; check the drive and try again"
        ) from fault
