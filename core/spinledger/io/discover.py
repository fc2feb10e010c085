"""Finds what a folder holds, by content, in a walk of bounded length."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from pathlib import Path

from spinledger.errors import SpectrumFormatError
from spinledger.io import (
    bruker,
    columns,
    jcamp,
    jeol,
    nmrml,
    spinsolve,
    varian,
)
from spinledger.io.experiment import Experiment
from spinledger.io.limits import read_head
from spinledger.values.acquisition import Acquired

_MAX_DEPTH = 8
_MAX_PLACES = 20_000
# Files that say nothing without the parameter file beside them.
_DATA_FILES = frozenset({"fid", "ser", "1r", "2rr", "data.1d"})


@dataclass(frozen=True, slots=True, kw_only=True)
class Reader:
    """The functions of one format."""

    kind: str
    describe: Callable[[Path], Experiment]
    read: Callable[..., Acquired]


_FOLDER_READERS = (
    (
        bruker.is_dataset,
        Reader(kind=bruker.KIND, describe=bruker.describe, read=bruker.read),
    ),
    (
        varian.is_dataset,
        Reader(kind=varian.KIND, describe=varian.describe, read=varian.read),
    ),
    (
        spinsolve.is_dataset,
        Reader(kind=spinsolve.KIND, describe=spinsolve.describe, read=spinsolve.read),
    ),
)
# In the order of trust: a binary of the maker, then exports, then plain text.
_FILE_READERS = (
    (jeol.is_file_head, Reader(kind=jeol.KIND, describe=jeol.describe, read=jeol.read)),
    (
        jcamp.is_file_head,
        Reader(kind=jcamp.KIND, describe=jcamp.describe, read=jcamp.read),
    ),
    (
        nmrml.is_file_head,
        Reader(kind=nmrml.KIND, describe=nmrml.describe, read=nmrml.read),
    ),
    (
        columns.is_file_head,
        Reader(kind=columns.KIND, describe=columns.describe, read=columns.read),
    ),
)


def folder_reader(folder: Path) -> Reader | None:
    """Reader of the folder itself, if it is one data set."""
    return next((reader for fits, reader in _FOLDER_READERS if fits(folder)), None)


def file_reader(path: Path) -> Reader | None:
    """Reader of a file, told from its first bytes."""
    head = read_head(path)
    return next((reader for fits, reader in _FILE_READERS if fits(head)), None)


def reader_of(experiment: Experiment) -> Reader:
    """Reader that described the experiment."""
    readers = (reader for _, reader in (*_FOLDER_READERS, *_FILE_READERS))
    return next(reader for reader in readers if reader.kind == experiment.kind)


def experiments_below(folder: Path) -> tuple[Experiment, ...]:
    """Everything readable in a folder and its sub-folders, in the order of names.

    Damaged data sets are passed over here; if one is all there is, reading it tells
    why. Text in columns counts only where nothing else is found, for it may be any
    table.

    Raises
    ------
    SpectrumFormatError
        If the only data set is damaged, or the folder is too large to search.
    """
    found: list[Experiment] = []
    faults: list[SpectrumFormatError] = []
    orphans: list[str] = []
    zips: list[str] = []
    for path, reader in _walk(folder):
        if reader is None:
            orphans += [path.name] if path.name in _DATA_FILES else []
            zips += [path.name] if path.suffix.lower() == ".zip" else []
            continue
        try:
            found.append(reader.describe(path))
        except SpectrumFormatError as fault:
            faults.append(fault)
    better = [experiment for experiment in found if experiment.kind != columns.KIND]
    if not better and faults:
        raise faults[0]
    if not found and orphans:
        raise SpectrumFormatError(
            folder,
            f"holds a {orphans[0]} file without the parameter file beside it (acqus, "
            "procs or procpar); copy the whole experiment folder",
        )
    if not found and zips:
        raise SpectrumFormatError(
            folder, f"holds the zip file {zips[0]}; give that file, or unpack it"
        )
    return tuple(
        replace(experiment, name=_relative_name(folder, experiment.path))
        for experiment in better or found
    )


def trust_rank(experiment: Experiment) -> int:
    """Place of the format in the order of trust: the makers' own data first."""
    readers = [reader for _, reader in (*_FOLDER_READERS, *_FILE_READERS)]
    return [reader.kind for reader in readers].index(experiment.kind)


def _relative_name(folder: Path, path: Path) -> str:
    """Name that tells experiments of several sub-folders apart."""
    return path.name if path == folder else path.relative_to(folder).as_posix()


def _walk(folder: Path) -> Iterator[tuple[Path, Reader | None]]:
    """Data set folders, which are not searched further, and all other files."""
    n_places = 0
    stack = [(folder, 0)]
    while stack:
        here, depth = stack.pop()
        reader = folder_reader(here)
        if reader is not None:
            yield here, reader
            continue
        below: list[tuple[Path, int]] = []
        for entry in _entries(here):
            n_places += 1
            if n_places > _MAX_PLACES:
                raise SpectrumFormatError(
                    folder,
                    f"holds more than {_MAX_PLACES} files; give the folder of the "
                    "experiment itself",
                )
            path = here / entry.name
            if entry.is_dir(follow_symlinks=False):
                below.append((path, depth + 1))
            elif _is_file(entry):
                yield path, file_reader(path)
        stack += [place for place in reversed(below) if place[1] <= _MAX_DEPTH]


def _is_file(entry: os.DirEntry[str]) -> bool:
    """Whether an entry is a plain file; a link in a circle is none."""
    try:
        return entry.is_file()
    except OSError:
        return False


def _entries(folder: Path) -> list[os.DirEntry[str]]:
    """Entries in natural order (2 before 10); empty if the folder is locked."""
    try:
        with os.scandir(folder) as entries:
            return sorted(entries, key=lambda entry: _natural(entry.name))
    except OSError:
        return []


def _natural(name: str) -> tuple[bool, int, str]:
    is_number = name.isdecimal() and name.isascii() and len(name) < 10
    return (not is_number, int(name) if is_number else 0, name)
