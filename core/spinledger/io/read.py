"""One door for all formats: find by content what a place holds, and read it."""

from __future__ import annotations

from pathlib import Path

from spinledger.errors import SpectrumFormatError
from spinledger.io import bruker, jcamp
from spinledger.io.experiment import Experiment
from spinledger.io.limits import MISSING, read_head
from spinledger.values.acquisition import Acquired


def read_acquired(path: Path, *, prefer_processed: bool = False) -> Acquired:
    """FID, or the maker's spectrum, of the one 1D proton experiment in a place.

    Parameters
    ----------
    path : pathlib.Path
        Dataset folder, data file, or a folder above.
    prefer_processed : bool
        Take the maker's spectrum where there is one as well as a FID.

    Raises
    ------
    SpectrumFormatError
        If there is no such experiment, or more than one, or it is damaged.
    """
    if not path.exists():
        raise SpectrumFormatError(path, MISSING)
    if path.is_dir():
        if bruker.is_dataset(path):
            return bruker.read(path, prefer_processed=prefer_processed)
        raise SpectrumFormatError(path, "holds no NMR data that can be read")
    if read_head(path).lstrip()[:7].upper() == b"##TITLE":
        return jcamp.read(path, prefer_processed=prefer_processed)
    raise SpectrumFormatError(path, "is not an NMR data file that can be read")


def list_experiments(path: Path) -> tuple[Experiment, ...]:
    """What a place holds, without reading the data."""
    if bruker.is_dataset(path):
        return (bruker.describe(path),)
    return (jcamp.describe(path),)
