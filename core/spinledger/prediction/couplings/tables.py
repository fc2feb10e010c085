"""Literature tables of the coupling rules, read once; values in Hz."""

from __future__ import annotations

import csv
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from types import MappingProxyType


@dataclass(frozen=True, slots=True, kw_only=True)
class RuleRow:
    """A typical coupling with its spread.

    Attributes
    ----------
    j_hz, j_sd_hz : float, Hz
    source : str
        Citation key of data/SOURCE.md.
    """

    j_hz: float
    j_sd_hz: float
    source: str


@cache
def _rules() -> Mapping[str, RuleRow]:
    return MappingProxyType(
        {
            row["key"]: RuleRow(
                j_hz=float(row["j_hz"]),
                j_sd_hz=float(row["j_sd_hz"]),
                source=row["source"],
            )
            for row in _rows("rules.csv")
        }
    )


def rule(key: str) -> RuleRow:
    """Row of the rule table.

    Raises
    ------
    KeyError
        If there is no such row.
    """
    return _rules()[key]


@cache
def substituent_electronegativity(group: str) -> float:
    """Group electronegativity lambda on Altona's scale, H = 0.

    Raises
    ------
    KeyError
        If the table has no such group.
    """
    return _lambdas()[group]


@cache
def _lambdas() -> Mapping[str, float]:
    return MappingProxyType(
        {row["group"]: float(row["lambda"]) for row in _rows("lambda.csv")}
    )


@cache
def vinyl_shift_hz(group: str) -> tuple[float, float, float]:
    """Change of the gem, cis and trans couplings of ethylene by one substituent, Hz.

    Raises
    ------
    KeyError
        If the table has no such group.
    """
    row = _vinyl_rows()[group]
    reference = _vinyl_rows()["H"]
    gem, cis, trans = (value - base for value, base in zip(row, reference, strict=True))
    return gem, cis, trans


@cache
def _vinyl_rows() -> Mapping[str, tuple[float, float, float]]:
    return MappingProxyType(
        {
            row["group"]: (
                float(row["gem_hz"]),
                float(row["cis_hz"]),
                float(row["trans_hz"]),
            )
            for row in _rows("vinyl.csv")
        }
    )


def _rows(name: str) -> list[dict[str, str]]:
    text = files(__package__).joinpath("data", name).read_text(encoding="utf-8")
    return list(csv.DictReader(text.splitlines()))
