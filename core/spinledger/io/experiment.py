"""What a place holds, told from the headers without reading the data."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from spinledger.io import normalise


@dataclass(frozen=True, slots=True, kw_only=True)
class Experiment:
    """One acquisition, or one processed spectrum, found in a place.

    Attributes
    ----------
    name : str
        How the place calls it: the folder or file name.
    path : pathlib.Path
        Folder or file to give to the reader.
    format_name : str
        In the user's words: "Bruker folder", "JCAMP-DX FID", ...
    n_dimensions : int or None
        None where the header does not tell.
    nucleus : str or None
        "1H", "13C", ... of the observed dimension; None if not told.
    summary : str
        One line for a list: nucleus, field, pulse program, solvent, date.
    has_fid, has_spectrum : bool
        Whether there is a FID, and the maker's processed spectrum.
    spectrometer_frequency_mhz : float or None, MHz
    acquired_on : str or None
        ISO 8601 date.
    kind : str
        Short name of the reader that takes it.
    """

    name: str
    path: Path
    format_name: str
    n_dimensions: int | None
    nucleus: str | None
    summary: str
    has_fid: bool = True
    has_spectrum: bool = False
    spectrometer_frequency_mhz: float | None = None
    acquired_on: str | None = None
    kind: str = ""

    @property
    def may_be_proton_1d(self) -> bool:
        """Whether this can be the 1D proton experiment a user means."""
        return self.n_dimensions in (1, None) and self.nucleus in ("1H", None)


def summary_line(*parts: str | None) -> str:
    """Join the parts that are known, each as one short printable line."""
    return ", ".join(normalise.shown(part) for part in parts if part)


def field_text(spectrometer_frequency_mhz: float | None) -> str | None:
    """Field for a list, in whole MHz."""
    if spectrometer_frequency_mhz is None or not spectrometer_frequency_mhz > 0:
        return None
    return f"{spectrometer_frequency_mhz:.0f} MHz"
