"""Files and folders the user gives: what they are, and where the example lies."""

from __future__ import annotations

import enum
import zipfile
from dataclasses import dataclass
from pathlib import Path

_STRUCTURE_ENDINGS = frozenset(
    {".mol", ".mdl", ".sdf", ".sd", ".smi", ".smiles", ".inchi", ".cdxml"}
)
_PROJECT_ENDING = ".sledger"
_EXAMPLE = ("sample_data", "batch-117")
_EXAMPLE_STRUCTURE = ("sample_data", "structures", "hydroxy-ester.mol")


class Kind(enum.Enum):
    """What a place holds."""

    PROJECT = enum.auto()
    STRUCTURE = enum.auto()
    DATA = enum.auto()


@dataclass(frozen=True, slots=True, kw_only=True)
class Example:
    """The sample spectrum and the structure on its label."""

    data: Path
    structure: Path


def kind_of(path: Path) -> Kind:
    """What a place is, by its name and first bytes."""
    ending = path.suffix.lower()
    if ending in _STRUCTURE_ENDINGS:
        return Kind.STRUCTURE
    if ending == _PROJECT_ENDING or _is_project(path):
        return Kind.PROJECT
    return Kind.DATA


def _is_project(path: Path) -> bool:
    if not path.is_file() or not zipfile.is_zipfile(path):
        return False
    with zipfile.ZipFile(path) as archive:
        names = archive.namelist()
    return bool(names) and names[0] == "mimetype" and "project.json" in names


def example_place() -> Example | None:
    """The example beside the program; None where it was not installed."""
    for folder in Path(__file__).resolve().parents:
        data, structure = (
            folder.joinpath(*_EXAMPLE),
            folder.joinpath(*_EXAMPLE_STRUCTURE),
        )
        if data.exists() and structure.exists():
            return Example(data=data, structure=structure)
    return None
