"""Project files (.sledger): a zip of JSON and arrays, saved whole or not at all."""

from __future__ import annotations

import hashlib
import io
import json
import os
import tempfile
import zipfile
import zlib
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from spinledger.errors import FileError, OutputError
from spinledger.project.codec import Encoder, decode
from spinledger.project.document import Project, SampleSpectrum

SCHEMA = 1
MIME_TYPE = "application/vnd.spinledger.project+zip"
SUFFIX = ".sledger"
_DOCUMENT = "project.json"
_MANIFEST = "manifest.json"
# 4 GiB: more than any project holds; a crafted archive must not fill the memory.
_LARGEST_BYTES = 4 * 1024**3
# What zipfile raises on hurt archives: bad data, unknown method, encrypted flag.
_ZIP_FAULTS = (
    zipfile.BadZipFile,
    zlib.error,
    EOFError,
    ValueError,
    KeyError,
    NotImplementedError,
    RuntimeError,
)


class ProjectFileError(FileError, ValueError):
    """A project file is damaged, too new, or no project file at all."""


def save_project(project: Project, path: Path) -> None:
    """Write a project file beside its target and move it into place.

    A crash at any moment leaves either the old file or the new one.

    Parameters
    ----------
    project : Project
    path : pathlib.Path
        Usually with the suffix .sledger.

    Raises
    ------
    OutputError
        If the file cannot be written there.
    """
    content = _packed(project)
    try:
        _write_atomically(content, path)
    except OSError as error:
        reason = error.strerror or "it cannot be written"
        raise OutputError(
            path, f"the project could not be saved ({reason}); choose another place"
        ) from error


def load_project(path: Path) -> Project:
    """Read a project file.

    Parameters
    ----------
    path : pathlib.Path

    Returns
    -------
    Project

    Raises
    ------
    ProjectFileError
        If the file is missing, damaged, newer than this version, or something
        else altogether.
    """
    try:
        with zipfile.ZipFile(path) as archive:
            return _unpacked(archive, path)
    except FileNotFoundError as error:
        raise ProjectFileError(path, "there is no such file") from error
    except ProjectFileError:
        raise
    except _ZIP_FAULTS as error:
        raise ProjectFileError(
            path, "this is not a project file, or it is damaged; open a saved copy"
        ) from error
    except OSError as error:
        reason = error.strerror or "it cannot be read"
        raise ProjectFileError(
            path, f"the file could not be read ({reason})"
        ) from error


def _packed(project: Project) -> bytes:
    encoder = Encoder()
    ledger = project.ledger
    shared = ledger is not None and ledger.evidence is project.evidence
    # The ledger holds the same evidence; it is written once.
    slim = replace(project, others=tuple(map(_without_twin, project.others)))
    tree = encoder.encode(replace(slim, evidence=None) if shared else slim)
    entries = {
        _DOCUMENT: _json_bytes(
            {"schema": SCHEMA, "evidence_of_ledger": shared, "project": tree}
        )
    }
    for name, array in encoder.arrays.items():
        entries[_array_entry(name)] = _npy_bytes(array)
    hashes = {name: hashlib.sha256(data).hexdigest() for name, data in entries.items()}
    manifest = _json_bytes({"schema": SCHEMA, "sha256": hashes})
    return _zipped({**entries, _MANIFEST: manifest})


def _zipped(entries: dict[str, bytes]) -> bytes:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:
        # First and stored, so that the type is told without unpacking.
        archive.writestr(_info("mimetype"), MIME_TYPE, zipfile.ZIP_STORED)
        for name, data in entries.items():
            archive.writestr(_info(name), data, zipfile.ZIP_DEFLATED, 1)
    return stream.getvalue()


def _info(name: str) -> zipfile.ZipInfo:
    # A fixed date: the same project gives the same bytes.
    return zipfile.ZipInfo(name, (1980, 1, 1, 0, 0, 0))


def _write_atomically(content: bytes, path: Path) -> None:
    handle, name = tempfile.mkstemp(
        dir=path.parent, prefix=f".{path.name}.", suffix=".part"
    )
    temporary = Path(name)
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(content)
            stream.flush()
            os.fsync(stream.fileno())
        temporary.replace(path)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise
    _sync_folder(path.parent)


def _sync_folder(folder: Path) -> None:
    if os.name != "posix":  # other systems cannot open a folder
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)


def _unpacked(archive: zipfile.ZipFile, path: Path) -> Project:
    names = set(archive.namelist())
    if "mimetype" not in names or _MANIFEST not in names:
        raise ProjectFileError(path, "this is a zip file, but no project file")
    if sum(info.file_size for info in archive.infolist()) > _LARGEST_BYTES:
        raise ProjectFileError(path, "the file claims to hold more than 4 GiB")
    if archive.read("mimetype").decode("ascii", "replace") != MIME_TYPE:
        raise ProjectFileError(path, "this is a zip file, but no project file")
    manifest = _json_entry(archive, _MANIFEST, path)
    _check_schema(manifest, path)
    entries = _checked_entries(archive, manifest, path)
    try:
        return _decoded(entries)
    except (ValueError, KeyError, AttributeError) as error:
        raise ProjectFileError(
            path, f"the contents do not fit together ({error}); open a saved copy"
        ) from error


def _check_schema(manifest: dict[str, Any], path: Path) -> None:
    schema = manifest.get("schema")
    if not isinstance(schema, int) or schema < 1:
        raise ProjectFileError(path, "the schema number is missing or wrong")
    if schema > SCHEMA:
        raise ProjectFileError(
            path,
            f"it was saved by a newer version (schema {schema}); update Spin Ledger",
        )


def _checked_entries(
    archive: zipfile.ZipFile, manifest: dict[str, Any], path: Path
) -> dict[str, bytes]:
    hashes = manifest.get("sha256")
    if not isinstance(hashes, dict) or _DOCUMENT not in hashes:
        raise ProjectFileError(path, "the list of contents is damaged")
    entries: dict[str, bytes] = {}
    for name, expected in hashes.items():
        try:
            data = archive.read(name)
        except _ZIP_FAULTS as error:
            raise _damaged(path, name) from error
        if hashlib.sha256(data).hexdigest() != expected:
            raise _damaged(path, name)
        entries[name] = data
    return entries


def _damaged(path: Path, name: str) -> ProjectFileError:
    return ProjectFileError(
        path, f"the part {name} is damaged or missing; open a saved copy"
    )


def _decoded(entries: dict[str, bytes]) -> Project:
    arrays = {
        _array_name(name): _array_from(data)
        for name, data in entries.items()
        if name.startswith("arrays/")
    }
    tree = json.loads(entries[_DOCUMENT])
    project = decode(tree["project"], arrays)
    if not isinstance(project, Project):
        raise ValueError("no project inside")
    project = replace(project, others=tuple(map(_with_twin, project.others)))
    if tree.get("evidence_of_ledger") and project.ledger is not None:
        return replace(project, evidence=project.ledger.evidence)
    return project


def _without_twin(spectrum: SampleSpectrum) -> SampleSpectrum:
    """Spectrum without the evidence that its ledger holds already."""
    ledger = spectrum.ledger
    if ledger is None or ledger.evidence is not spectrum.evidence:
        return spectrum
    return replace(spectrum, evidence=None)


def _with_twin(spectrum: SampleSpectrum) -> SampleSpectrum:
    if spectrum.evidence is not None or spectrum.ledger is None:
        return spectrum
    return replace(spectrum, evidence=spectrum.ledger.evidence)


def _json_entry(archive: zipfile.ZipFile, name: str, path: Path) -> dict[str, Any]:
    try:
        tree = json.loads(archive.read(name))
    except _ZIP_FAULTS as error:
        raise _damaged(path, name) from error
    if not isinstance(tree, dict):
        raise _damaged(path, name)
    return tree


def _json_bytes(tree: Any) -> bytes:
    text = json.dumps(tree, ensure_ascii=False, allow_nan=False, indent=1)
    return text.encode("utf-8")


def _array_entry(name: str) -> str:
    return f"arrays/{name}.npy"


def _array_name(entry: str) -> str:
    return entry.removeprefix("arrays/").removesuffix(".npy")


def _npy_bytes(array: npt.NDArray[Any]) -> bytes:
    stream = io.BytesIO()
    np.save(stream, np.ascontiguousarray(array), allow_pickle=False)
    return stream.getvalue()


def _array_from(data: bytes) -> npt.NDArray[Any]:
    array: npt.NDArray[Any] = np.load(io.BytesIO(data), allow_pickle=False)
    return array
