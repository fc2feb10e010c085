"""Data tables of JCAMP-DX blocks with the axis that the header lays under them.

References
----------
.. [1] A. N. Davies, P. Lampen, Appl. Spectrosc. 47 (1993) 1093-1099,
   doi:10.1366/0003702934067874 (NTUPLES and XYDATA for NMR).
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import numpy.typing as npt

from spinledger.errors import SpectrumFormatError
from spinledger.io.asdf import Ordinates, TableError, decode_table
from spinledger.io.limits import MAX_POINTS, check_point_count
from spinledger.io.records import Block, parse_number, plain_label
from spinledger.io.samples import scaled


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Columns:
    """Decoded ordinates with the axis that the header lays under them.

    Attributes
    ----------
    real, imaginary : numpy.ndarray, shape (n_points,)
        In the order of the file; there may be no imaginary part.
    first_x, last_x : float or None
        Abscissae of the first and last declared point, in ``units``.
    units : str
        Upper case: "HZ", "PPM", "SECONDS", ...
    n_declared : int
        Points by the header.
    notes : tuple of str
        What does not add up, one sentence each.
    """

    real: npt.NDArray[np.float64]
    imaginary: npt.NDArray[np.float64] | None
    first_x: float | None
    last_x: float | None
    units: str
    n_declared: int
    notes: tuple[str, ...]

    @property
    def step_x(self) -> float | None:
        """Step of the axis from first to last declared point."""
        if self.first_x is None or self.last_x is None or self.n_declared < 2:
            return None
        return (self.last_x - self.first_x) / (self.n_declared - 1)


def read_columns(path: Path, block: Block) -> Columns:
    """Numbers of the block's data tables, scaled, with their axis.

    Raises
    ------
    SpectrumFormatError
        If there is no table, or its length contradicts the header.
    TableError
        If a table cannot be decoded.
    """
    if "DATATABLE" in block.values:
        return _ntuples(path, block)
    if "XYDATA" in block.values:
        return _xydata(path, block)
    if "XYPOINTS" in block.values:
        return _xypoints(block)
    raise SpectrumFormatError(
        path, "has a header but no data table; export it again with the data"
    )


def _decode(table: str, block: Block) -> tuple[str, Ordinates]:
    form, _, body = table.partition("\n")
    ordinates = decode_table(
        body.split("\n"),
        max_points=MAX_POINTS,
        decimal_commas=block.has_decimal_commas,
    )
    return plain_label(form), ordinates


def _checked(
    path: Path, ordinates: Ordinates, n_declared: float | None
) -> tuple[int, tuple[str, ...]]:
    """Declared number of points, and notes on what does not add up."""
    n_there = ordinates.values.size
    n_points = n_there if n_declared is None else check_point_count(path, n_declared)
    notes: list[str] = []
    if ordinates.n_failed_checks:
        notes.append(
            f"{ordinates.n_failed_checks} check values of the data table do not agree; "
            "the file may be damaged."
        )
    if n_there < n_points / 2:
        raise SpectrumFormatError(
            path,
            f"holds only {n_there} of the {n_points} points that its header declares; "
            "export it again",
        )
    if n_there != n_points:
        notes.append(f"The header declares {n_points} points, {n_there} are there.")
    return n_points, tuple(notes)


def _xydata(path: Path, block: Block) -> Columns:
    tables = block.values["XYDATA"]
    _, ordinates = _decode(tables[0], block)
    n_points, notes = _checked(path, ordinates, block.number("NPOINTS"))
    first_x = block.number("FIRSTX")
    last_x = block.number("LASTX")
    delta_x = block.number("DELTAX")
    if last_x is None and first_x is not None and delta_x is not None:
        last_x = first_x + delta_x * (n_points - 1)
    return Columns(
        real=scaled(ordinates.values[:n_points], block.number("YFACTOR")),
        imaginary=None,
        first_x=first_x,
        last_x=last_x,
        units=(block.text("XUNITS") or "").upper(),
        n_declared=n_points,
        notes=notes,
    )


def _xypoints(block: Block) -> Columns:
    """Pairs of abscissa and ordinate, accepted where evenly spaced."""
    _, _, body = block.values["XYPOINTS"][0].partition("\n")
    if block.has_decimal_commas:
        body = body.replace(",", ".")
    words = re.split(r"[\s,;]+", body.strip(), maxsplit=2 * MAX_POINTS)
    numbers = np.array(
        [value for word in words if (value := parse_number(word)) is not None]
    )
    if numbers.size < 4 or numbers.size % 2:
        raise TableError("the table of points is damaged")
    x, y = numbers[0::2], numbers[1::2]
    steps = np.diff(x)
    if np.ptp(steps) > 0.01 * abs(float(np.mean(steps))):
        raise TableError("the points are not evenly spaced, as in a peak list")
    factor_x = block.number("XFACTOR")
    return Columns(
        real=scaled(y, block.number("YFACTOR")),
        imaginary=None,
        first_x=float(x[0]) * (1.0 if factor_x is None else factor_x),
        last_x=float(x[-1]) * (1.0 if factor_x is None else factor_x),
        units=(block.text("XUNITS") or "").upper(),
        n_declared=x.size,
        notes=(),
    )


_PAGE_VARIABLE = re.compile(r"\+\+\(?([A-Z])")


def _ntuples(path: Path, block: Block) -> Columns:
    symbols = [symbol.upper() for symbol in block.listed("SYMBOL")]
    names = [plain_label(name) for name in block.listed("VAR_NAME")]
    parts: dict[str, npt.NDArray[np.float64]] = {}
    n_points = 0
    notes: tuple[str, ...] = ()
    for table in block.values["DATATABLE"]:
        form, ordinates = _decode(table, block)
        symbol = _page_symbol(form)
        if symbol in parts:
            raise SpectrumFormatError(
                path,
                "holds an array of traces; save the 1D proton spectrum to its own file",
            )
        n_points, notes = _checked(
            path, ordinates, _variable(block, symbols, symbol, "VAR_DIM")
        )
        factor = _variable(block, symbols, symbol, "FACTOR")
        parts[symbol] = scaled(ordinates.values[:n_points], factor)
    real_symbol, imaginary_symbol = _real_and_imaginary(symbols, names, list(parts))
    x_symbol = symbols[0] if symbols else "X"
    position = symbols.index(x_symbol) if x_symbol in symbols else 0
    units = block.listed("UNITS")
    return Columns(
        real=parts[real_symbol],
        imaginary=None if imaginary_symbol is None else parts[imaginary_symbol],
        first_x=_variable(block, symbols, x_symbol, "FIRST"),
        last_x=_variable(block, symbols, x_symbol, "LAST"),
        units=units[position].upper() if position < len(units) else "",
        n_declared=n_points,
        notes=notes,
    )


def _page_symbol(form: str) -> str:
    """Symbol of the ordinate from a form such as "(X++(R..R)), XYDATA"."""
    match = _PAGE_VARIABLE.search(form)
    return match[1] if match else "R"


def _variable(
    block: Block, symbols: list[str], symbol: str, label: str
) -> float | None:
    items = block.listed(label)
    if symbol not in symbols or symbols.index(symbol) >= len(items):
        return None
    return parse_number(items[symbols.index(symbol)])


def _real_and_imaginary(
    symbols: list[str], names: list[str], found: list[str]
) -> tuple[str, str | None]:
    """Which page symbols are the real and the imaginary part."""
    named = dict(zip(symbols, names, strict=False))
    imaginary = [
        symbol for symbol in found if symbol == "I" or "IMAG" in named.get(symbol, "")
    ]
    real = [symbol for symbol in found if symbol not in imaginary]
    if not real:
        raise TableError("only the imaginary part is there")
    return real[0], imaginary[0] if imaginary else None
