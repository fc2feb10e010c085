"""One predicted coupling between two nuclei, before sharing by symmetry; in Hz."""

from __future__ import annotations

from dataclasses import dataclass, replace

from spinledger.prediction.couplings.tables import rule


@dataclass(frozen=True, slots=True, kw_only=True)
class Estimate:
    """A predicted coupling of one pair of nuclei.

    Attributes
    ----------
    j_hz, j_sd_hz : float, Hz
        Value with sign, and its sd from rule and conformer doubt.
    kind : str
    is_rigid : bool
        Whether the drawing fixes the value.
    source : str
    """

    j_hz: float
    j_sd_hz: float
    kind: str
    is_rigid: bool
    source: str

    def changed(self, *, j_hz: float, j_sd_hz: float | None = None) -> Estimate:
        """The same rule with another value."""
        sd_hz = self.j_sd_hz if j_sd_hz is None else j_sd_hz
        return replace(self, j_hz=j_hz, j_sd_hz=sd_hz)


def from_table(
    key: str, kind: str, *, is_rigid: bool, j_hz: float | None = None
) -> Estimate:
    """Estimate from a row of the rule table.

    Parameters
    ----------
    key : str
        Row of data/rules.csv.
    kind : str
        Kind for the user.
    is_rigid : bool
    j_hz : float, optional
        Replaces the row's typical value, whose sd still holds.

    Raises
    ------
    KeyError
        If the table has no such row.
    """
    row = rule(key)
    return Estimate(
        j_hz=row.j_hz if j_hz is None else j_hz,
        j_sd_hz=row.j_sd_hz,
        kind=kind,
        is_rigid=is_rigid,
        source=f"table: {key} [{row.source}]",
    )
