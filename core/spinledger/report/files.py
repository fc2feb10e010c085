"""Result files written beside their target and moved into place when all are whole."""

from __future__ import annotations

import os
import shutil
import tempfile
from collections.abc import Mapping
from pathlib import Path

from spinledger.errors import OutputError


def check_writable(folder: Path) -> None:
    """Make sure that results can be written, before the long work begins.

    Nothing is left behind: the folder is not made yet.

    Raises
    ------
    OutputError
        If the folder is a file, or neither it nor its parent can be written to.
    """
    if folder.exists() and not folder.is_dir():
        raise OutputError(folder, "this is a file; give a folder for the results")
    place = folder
    while not place.exists():
        place = place.parent
    if not place.is_dir():
        raise OutputError(folder, f"{place} is a file; give another folder")
    try:
        with tempfile.TemporaryFile(dir=place):
            return
    except OSError as error:
        raise _unwritable(folder, error) from error


def write_files(folder: Path, contents: Mapping[str, bytes]) -> None:
    """Write files into a folder, all of them or none.

    They are written into a hidden folder beside their place first. A new
    folder then appears as a whole; in a folder that is there already each file
    replaces its forerunner and all other files stay.

    Parameters
    ----------
    folder : pathlib.Path
    contents : mapping of str to bytes
        File names and what they hold, in the order in which they are moved.

    Raises
    ------
    OutputError
        If anything cannot be written; then nothing has changed.
    """
    check_writable(folder)
    for name in contents:
        if (folder / name).is_dir():
            raise OutputError(
                folder / name, "a folder stands where this file belongs; move it away"
            )
    made = _make_parents(folder)
    staging: Path | None = None
    try:
        home = folder if folder.is_dir() else folder.parent
        staging = Path(
            tempfile.mkdtemp(prefix=f".{folder.name}.", suffix=".part", dir=home)
        )
        for name, content in contents.items():
            _write_through(staging / name, content)
        _move(staging, folder, list(contents))
    except OSError as error:
        _clean(staging, made)
        raise _unwritable(folder, error) from error
    _clean(staging, [])


def write_file(path: Path, content: bytes) -> None:
    """Write one file beside its target and move it into place.

    Raises
    ------
    OutputError
        If it cannot be written.
    """
    try:
        handle, name = tempfile.mkstemp(
            prefix=f".{path.name}.", suffix=".part", dir=path.parent
        )
    except OSError as error:
        raise _unwritable(path, error) from error
    temporary = Path(name)
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(content)
            stream.flush()
            os.fsync(stream.fileno())
        temporary.chmod(0o666 & ~_umask())
        temporary.replace(path)
    except OSError as error:
        temporary.unlink(missing_ok=True)
        raise _unwritable(path, error) from error


def _make_parents(folder: Path) -> list[Path]:
    """Parents that were missing and are there now, outermost first."""
    missing: list[Path] = []
    parent = folder.parent
    while not parent.exists():
        missing.insert(0, parent)
        parent = parent.parent
    try:
        for one in missing:
            one.mkdir()
    except OSError as error:
        raise _unwritable(folder, error) from error
    return missing


def _write_through(path: Path, content: bytes) -> None:
    with path.open("wb") as stream:
        stream.write(content)
        stream.flush()
        os.fsync(stream.fileno())


def _move(staging: Path, folder: Path, names: list[str]) -> None:
    if folder.is_dir():
        for name in names:
            (staging / name).replace(folder / name)
        return
    staging.chmod(0o777 & ~_umask())
    staging.replace(folder)


def _umask() -> int:
    """The user's mask for new files; reading it means setting it for a moment."""
    mask = os.umask(0)
    os.umask(mask)
    return mask


def _clean(staging: Path | None, made: list[Path]) -> None:
    """Take away the hidden folder, and the parents that were made for nothing."""
    if staging is not None:
        shutil.rmtree(staging, ignore_errors=True)
    for parent in reversed(made):
        if parent.is_dir() and not any(parent.iterdir()):
            parent.rmdir()


def _unwritable(path: Path, error: OSError) -> OutputError:
    why = error.strerror or "no reason given"
    return OutputError(
        path, f"results cannot be written there ({why}); choose another place"
    )
