"""One door for all formats: find by content what a place holds, and read it."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np

from spinledger.errors import SpectrumFormatError
from spinledger.io import archive, bruker
from spinledger.io.checksum import file_sha256
from spinledger.io.discover import (
    Reader,
    experiments_below,
    file_reader,
    folder_reader,
    reader_of,
    trust_rank,
)
from spinledger.io.experiment import Experiment
from spinledger.io.limits import MISSING, read_head
from spinledger.io.sense import agreement, in_sense_of
from spinledger.values.acquisition import Acquired, Fid, MakerSpectrum

__all__ = ["Experiment", "list_experiments", "read_acquired"]

# Fields of one acquisition agree to the digits that exporters keep.
_FIELD_TOLERANCE = 1e-4
# More candidates than this are a collection, not copies of one acquisition.
_MAX_COPIES = 6
# Own spectra agree with their FID to 0.69 or better, others of the same field and
# solvent mostly below this.
_LEAST_AGREEMENT = 0.5


def read_acquired(path: Path, *, prefer_processed: bool = False) -> Acquired:
    """FID, or the maker's spectrum, of the one 1D proton experiment in a place.

    Parameters
    ----------
    path : pathlib.Path
        A data file or data set folder of any known maker or standard, a zip of
        those, or a folder above. Told by content; names and extensions do not
        matter.
    prefer_processed : bool
        Take the maker's spectrum where there is one as well as a FID.

    Returns
    -------
    Fid or MakerSpectrum

    Raises
    ------
    SpectrumFormatError
        If there is no such experiment, or more than one, or it is damaged.

    Notes
    -----
    Nothing is ever written to the place that is read.
    """
    path = Path(path)
    _require_existing(path)
    if path.is_dir():
        return _read_folder(path, prefer_processed=prefer_processed)
    if archive.is_file_head(read_head(path)):
        return _read_zip(path, prefer_processed=prefer_processed)
    reader, place = _reader_and_place(path)
    return reader.read(place, prefer_processed=prefer_processed)


def list_experiments(path: Path) -> tuple[Experiment, ...]:
    """What a place holds, told from the headers.

    Parameters
    ----------
    path : pathlib.Path
        File, folder or zip. Paths of experiments in a zip are those inside it.

    Raises
    ------
    SpectrumFormatError
        If the place is missing or holds nothing that can be read.
    """
    path = Path(path)
    _require_existing(path)
    if path.is_dir():
        return _found_below(path)
    if not archive.is_file_head(read_head(path)):
        reader, place = _reader_and_place(path)
        return (reader.describe(place),)
    with archive.unpacked(path) as folder:
        try:
            found = _found_below(folder)
        except SpectrumFormatError as fault:
            raise SpectrumFormatError(path, fault.reason) from fault
        return tuple(
            replace(experiment, path=path / experiment.path.relative_to(folder))
            for experiment in found
        )


def _require_existing(path: Path) -> None:
    try:
        is_there = path.exists()
    except (OSError, ValueError) as fault:  # a name that no file can have
        raise SpectrumFormatError(path, MISSING) from fault
    if not is_there:
        raise SpectrumFormatError(path, MISSING)
    if not path.is_dir() and not path.is_file():  # opening a pipe would wait
        raise SpectrumFormatError(
            path, "is not a file or folder; copy the data to a disk and give that"
        )


def _reader_and_place(path: Path) -> tuple[Reader, Path]:
    """Reader of a file; a member of a data set folder stands for the folder."""
    around = folder_reader(path.parent)
    own = file_reader(path)
    is_member = bruker.is_parameter_file(path) or own is None
    if around is not None and is_member:
        return around, path.parent
    if own is None:
        raise SpectrumFormatError(
            path,
            "is not an NMR data file of a kind that can be read; give a data folder, "
            "or export the spectrum as JCAMP-DX",
        )
    return own, path


def _found_below(folder: Path) -> tuple[Experiment, ...]:
    own = folder_reader(folder)
    if own is not None:
        return (own.describe(folder),)
    found = experiments_below(folder)
    if not found:
        raise SpectrumFormatError(
            folder,
            "holds no NMR data that can be read; give the folder of the experiment, "
            "or export the spectrum as JCAMP-DX",
        )
    return found


def _read_zip(path: Path, *, prefer_processed: bool) -> Acquired:
    with archive.unpacked(path) as folder:
        try:
            acquired = _read_folder(folder, prefer_processed=prefer_processed)
        except SpectrumFormatError as fault:
            # The temporary folder means nothing to the user: name the zip.
            raise SpectrumFormatError(path, fault.reason) from fault
    metadata = replace(
        acquired.metadata, source_name=path.name, sha256=file_sha256(path)
    )
    return replace(acquired, metadata=metadata)


def _read_folder(folder: Path, *, prefer_processed: bool) -> Acquired:
    own = folder_reader(folder)
    if own is not None:
        return own.read(folder, prefer_processed=prefer_processed)
    found = _found_below(folder)
    if len(found) == 1:
        return _read(found[0], prefer_processed=prefer_processed)
    usable = [experiment for experiment in found if experiment.may_be_proton_1d]
    if not usable:
        raise SpectrumFormatError(
            folder,
            f"holds {len(found)} experiments but none is a 1D proton spectrum: "
            f"{_names(found)}; give the proton data",
        )
    if len(usable) == 1:
        acquired = _read(usable[0], prefer_processed=prefer_processed)
        return _noted(
            acquired,
            f"Of {len(found)} experiments in the folder, {usable[0].name} was taken as "
            "the only 1D proton one.",
        )
    return _read_copies(folder, usable, prefer_processed=prefer_processed)


def _read(experiment: Experiment, *, prefer_processed: bool) -> Acquired:
    reader = reader_of(experiment)
    return reader.read(experiment.path, prefer_processed=prefer_processed)


def _noted(acquired: Acquired, note: str) -> Acquired:
    metadata = replace(acquired.metadata, notes=(*acquired.metadata.notes, note))
    return replace(acquired, metadata=metadata)


def _names(experiments: tuple[Experiment, ...] | list[Experiment]) -> str:
    shown = [f"{item.name} ({item.summary})" for item in experiments[:6]]
    more = len(experiments) - len(shown)
    return ", ".join(shown) + (f" and {more} more" if more else "")


# ---- several files of one acquisition


def _read_copies(
    folder: Path, usable: list[Experiment], *, prefer_processed: bool
) -> Acquired:
    """One acquisition that lies there in several forms, else an error."""
    first, *others = usable
    is_one_field = all(_same_acquisition(first, other) for other in others)
    if len(usable) > _MAX_COPIES or not is_one_field:
        raise _too_many(folder, usable)
    with_fid = sorted((item for item in usable if item.has_fid), key=trust_rank)
    spectra = [item for item in usable if not item.has_fid]
    if len(spectra) > 1 or not with_fid:
        raise _too_many(folder, usable)
    fids = [_read(item, prefer_processed=False) for item in with_fid]
    leader = fids[0]
    if not all(_same_fid(leader, other) for other in fids[1:]):
        raise _too_many(folder, usable)
    beside = _read(spectra[0], prefer_processed=True) if spectra else None
    if beside is not None and not _belongs(leader, beside):
        raise _too_many(folder, usable)
    if prefer_processed:
        return beside or _read(_with_spectrum(with_fid), prefer_processed=True)
    if beside is None:
        return leader
    return _noted(
        _in_makers_sense(leader, beside),
        f"{spectra[0].name} was taken as the processed form of the same data.",
    )


def _with_spectrum(copies: list[Experiment]) -> Experiment:
    """The most trusted copy that has a processed spectrum, else the most trusted."""
    return next((item for item in copies if item.has_spectrum), copies[0])


def _too_many(folder: Path, usable: list[Experiment]) -> SpectrumFormatError:
    return SpectrumFormatError(
        folder,
        f"holds {len(usable)} proton experiments: {_names(usable)}; give one of them",
    )


def _same_acquisition(one: Experiment, other: Experiment) -> bool:
    """Whether field and date do not contradict each other."""
    fields = (one.spectrometer_frequency_mhz, other.spectrometer_frequency_mhz)
    if fields[0] is None or fields[1] is None or fields[1] <= 0:
        return False
    same_field = abs(fields[0] / fields[1] - 1) < _FIELD_TOLERANCE
    dates = {one.acquired_on, other.acquired_on} - {None}
    return same_field and len(dates) < 2


def _same_fid(one: Acquired, other: Acquired) -> bool:
    """Whether two readings hold the same samples, on any scale."""
    if not isinstance(one, Fid) or not isinstance(other, Fid):
        return False
    if one.samples.size != other.samples.size:
        return False
    overlap = abs(np.vdot(one.samples, other.samples))
    norms = np.linalg.norm(one.samples) * np.linalg.norm(other.samples)
    return bool(overlap > 0.9999 * norms)


def _belongs(leader: Acquired, beside: Acquired) -> bool:
    """Whether a spectrum can be the processed form of the FID."""
    if not isinstance(leader, Fid) or not isinstance(beside, MakerSpectrum):
        return False
    return agreement(leader, beside.spectrum).best > _LEAST_AGREEMENT


def _in_makers_sense(leader: Acquired, beside: Acquired) -> Acquired:
    """FID turned to agree with the spectrum beside it, where that is clear."""
    if not isinstance(leader, Fid) or not isinstance(beside, MakerSpectrum):
        return leader
    return in_sense_of(leader, beside.spectrum)
