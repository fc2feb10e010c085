"""Ordinates of JCAMP-DX data tables in every form: AFFN, PAC, SQZ, DIF and DUP.

References
----------
.. [1] R. S. McDonald, P. A. Wilks, Appl. Spectrosc. 42 (1988) 151-162,
   doi:10.1366/0003702884428734 (compressed forms; digits from memory).
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt


class TableError(ValueError):
    """A data table that cannot be decoded; the text says why."""


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Ordinates:
    """Decoded table.

    Attributes
    ----------
    values : numpy.ndarray, shape (n_points,)
        Ordinates before the factor of the header.
    n_failed_checks : int
        Lines whose first ordinate does not repeat the last one of the line
        before, as the DIF form demands.
    """

    values: npt.NDArray[np.float64]
    n_failed_checks: int


_SQZ = {"@": "0"} | {
    letter: sign + str(digit)
    for sign, letters in (("", "ABCDEFGHI"), ("-", "abcdefghi"))
    for digit, letter in enumerate(letters, start=1)
}
_DIF = {"%": "0"} | {
    letter: sign + str(digit)
    for sign, letters in (("", "JKLMNOPQR"), ("-", "jklmnopqr"))
    for digit, letter in enumerate(letters, start=1)
}
_DUP = {letter: str(digit) for digit, letter in enumerate("STUVWXYZs", start=1)}

# E and e alone may be exponents; any other pseudo-digit proves a packed form.
_PACKED_SIGN = re.compile(r"[@%A-DF-Za-df-s]")
_ABSCISSA = re.compile(r"\s*[+-]?(?:\d+(?:[.,]\d*)?|[.,]\d+)")
_PACKED_TOKEN = re.compile(r"[@%A-Za-s+-][0-9.]*|[0-9.]+")
_FOREIGN = re.compile(r"[^\s@%A-Za-s0-9.,+-]")
_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?")


def decode_table(
    lines: Iterable[str], *, max_points: int, decimal_commas: bool = False
) -> Ordinates:
    """Decode the lines below "(X++(Y..Y))".

    Parameters
    ----------
    lines : iterable of str
        Each begins with the abscissa of its first ordinate.
    max_points : int
        Decoding stops with an error beyond this many ordinates.
    decimal_commas : bool
        Whether a comma is the decimal sign instead of a separator.

    Raises
    ------
    TableError
        If there is no table, a character that no form knows, or too many points.
    """
    rows = [line for line in lines if line.strip()]
    if not rows:
        raise TableError("the data table is empty")
    if decimal_commas:
        rows = [row.replace(",", ".") for row in rows]
    if any(_PACKED_SIGN.search(row) for row in rows):
        return _decode_packed(rows, max_points)
    return _decode_plain(rows, max_points)


def _decode_plain(rows: list[str], max_points: int) -> Ordinates:
    values: list[float] = []
    for row in rows:
        if "?" in row:
            raise TableError("the data table has points marked as unreadable")
        values.extend(_plain_ordinates(row))
        if len(values) > max_points:
            raise TableError(_too_many(max_points))
    return Ordinates(values=np.array(values), n_failed_checks=0)


def _plain_ordinates(row: str) -> list[float]:
    """Numbers of a row after the first; the pattern is only for signs in between."""
    words = row.replace(",", " ").split()
    try:
        numbers = [float(word) for word in words]
    except ValueError:
        numbers = []
    if len(numbers) < 2:
        numbers = [float(word) for word in _NUMBER.findall(row)]
    return numbers[1:]


def _too_many(max_points: int) -> str:
    return f"the data table holds more than {max_points} points"


@dataclass(slots=True)
class _Unpacker:
    """State while the tokens of a packed table go by."""

    max_points: int
    values: list[float] = field(default_factory=list)
    step: float | None = None  # of the last ordinate, if it was a difference
    n_failed_checks: int = 0

    def row(self, row: str) -> None:
        """Take in one line, its abscissa first."""
        start = _ABSCISSA.match(row)
        if start is None or _FOREIGN.search(row):
            raise TableError(f"the data table has an unknown form at {row[:20]!r}")
        # After a difference the next line repeats the last ordinate as a check.
        is_check = self.step is not None
        for token in _PACKED_TOKEN.findall(row, start.end()):
            if is_check and token[0] in _DIF:
                is_check = False
            self._token(token, is_check=is_check)
            is_check = False

    def _token(self, token: str, *, is_check: bool) -> None:
        lead = token[0]
        if lead in _DUP:
            self._repeat(int(_DUP[lead] + _digits(token)))
        elif lead in _DIF:
            if not self.values:
                raise TableError("the data table begins with a difference")
            self.step = _as_number(_DIF[lead] + token[1:])
            self.values.append(self.values[-1] + self.step)
        else:
            number = _as_number(_SQZ.get(lead, lead) + token[1:])
            if is_check:
                self.n_failed_checks += number != self.values[-1]
            else:
                self.values.append(number)
            self.step = None
        if len(self.values) > self.max_points:
            raise TableError(_too_many(self.max_points))

    def _repeat(self, count: int) -> None:
        if not self.values:
            raise TableError("the data table begins with a repeat count")
        if count + len(self.values) > self.max_points + 1:
            raise TableError(_too_many(self.max_points))
        step = self.step or 0.0
        for _ in range(count - 1):
            self.values.append(self.values[-1] + step)


def _digits(token: str) -> str:
    rest = token[1:]
    if len(rest) > 9 or "." in rest:
        raise TableError(f"the data table has a bad repeat count {token[:12]!r}")
    return rest


def _as_number(text: str) -> float:
    try:
        return float(text)
    except ValueError as fault:
        raise TableError(f"the data table has a bad number {text[:20]!r}") from fault


def _decode_packed(rows: list[str], max_points: int) -> Ordinates:
    unpacker = _Unpacker(max_points=max_points)
    for row in rows:
        unpacker.row(row)
    return Ordinates(
        values=np.array(unpacker.values), n_failed_checks=unpacker.n_failed_checks
    )
