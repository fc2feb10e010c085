"""Side evidence from plain text; shifts in ppm.

One heading a block, then values in almost any form::

    carbons: 9                        (lines counted, solvent left out)
    types: 1 CH3, 0 CH2, 5 CH, 3 C    (counted by DEPT)
    13C: 171.2 C, 60.5 CH2, 14.2      (a list; the types may be left out)
    DEPT: CH3: 14.2, 20.9; CH2: 60.5  (no lines without protons)
    HSQC: 4.12/60.5 CH2, 1.26/14.2
    COSY: 4.12-1.26

A heading may stand alone above its lines. A line that begins with # is a
remark. Pairs may be joined by a slash, hyphen, arrow, comma or blanks.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

from spinledger.errors import SideEvidenceError
from spinledger.reconcile.side_evidence import (
    ANY_COUNT,
    CosyPeak,
    HsqcPeak,
    ListedCarbon,
    ProtonCounts,
    SideEvidence,
)

TYPED = "side evidence"
_MOST_CARBONS = 200
_PROTON_LIMITS_PPM = (-10.0, 30.0)
_CARBON_LIMITS_PPM = (-60.0, 260.0)

_HEADINGS = {
    "count": ("carbon count", "carbon lines", "13c count", "carbons"),
    "types": ("dept counts", "dept count", "types", "counts"),
    "dept": (r"dept(?:-?\d+)?", "apt"),
    "carbon list": ("13c nmr", "13c", "c13", "carbon"),
    "hsqc": ("hsqc", "hmqc"),
    "cosy": (r"1h,?[- ]?1h cosy", "h,h-cosy", "dqf-cosy", "cosy"),
}
_HEADING = re.compile(
    "|".join(
        rf"(?P<{name.replace(' ', '_')}>{'|'.join(words)})"
        for name, words in _HEADINGS.items()
    )
    + r"(?=[\s:=(]|$)",
    re.IGNORECASE,
)
_NUMBER = r"-?\d+(?:\.\d+)?"
_TYPE = r"CH3|CH2|CH|Cq|C|up|down|[sdtq]"
_TOKEN = re.compile(rf"(?P<type>(?:{_TYPE})(?![A-Za-z0-9]))|(?P<number>{_NUMBER})")
_COUNTS: dict[str, ProtonCounts] = {
    "ch3": frozenset({3}),
    "ch2": frozenset({2}),
    "ch": frozenset({1}),
    "c": frozenset({0}),
    "cq": frozenset({0}),
    "up": frozenset({1, 3}),
    "down": frozenset({2}),
    # Multiplets of an off-resonance decoupled spectrum.
    "s": frozenset({0}),
    "d": frozenset({1}),
    "t": frozenset({2}),
    "q": frozenset({3}),
}
_PLAIN = str.maketrans("₀₁₂₃₄₅₆₇₈₉¹³−–—", "012345678913---")


def side_evidence_from(text_or_path: str) -> SideEvidence:
    """Side evidence from a file, or from the text itself.

    Parameters
    ----------
    text_or_path : str
        Text is taken for a file unless it holds a heading and a value.

    Raises
    ------
    SideEvidenceError
        If the file cannot be read, or a line cannot be understood.
    """
    is_text = "\n" in text_or_path or _is_headed(text_or_path)
    if is_text and not Path(text_or_path.split("\n", 1)[0][:200]).is_file():
        return read_side_evidence(text_or_path)
    path = Path(text_or_path)
    try:
        text = path.read_bytes().decode("utf-8-sig", errors="replace")
    except OSError as error:
        reason = error.strerror or "it cannot be read"
        raise SideEvidenceError(
            text_or_path, f"the side evidence could not be read ({reason})"
        ) from error
    return read_side_evidence(text, source=path.name)


def _is_headed(text: str) -> bool:
    found = _HEADING.match(text.translate(_PLAIN).strip())
    return found is not None and any(c.isdigit() for c in text[found.end() :])


def read_side_evidence(text: str, *, source: str = TYPED) -> SideEvidence:
    """Side evidence from its text form.

    Parameters
    ----------
    text : str
        As told at the head of this module.
    source : str
        Named in errors.

    Raises
    ------
    SideEvidenceError
        If a line cannot be understood, or there is nothing in the text.

    Examples
    --------
    >>> found = read_side_evidence("carbons: 4; HSQC: 4.12/60.5, 1.26/14.2")
    >>> len(found.carbons), found.hsqc[0].carbon_ppm
    (4, 60.5)
    """
    reader = _Reader(source)
    for number, line in enumerate(_lines(text), start=1):
        reader.take(line, number)
    found = reader.finished()
    if found.is_empty:
        raise SideEvidenceError(
            source,
            "there is nothing in it; write for example 'carbons: 9' or "
            "'HSQC: 4.12/60.5, 1.26/14.2'",
        )
    return found


def _lines(text: str) -> Iterator[str]:
    """Lines in plain letters; a heading after a semicolon begins a new one."""
    for raw in text.translate(_PLAIN).splitlines():
        line = raw.strip()
        if line.startswith("#"):
            yield ""
            continue
        start = 0
        for match in re.finditer(r";\s*", line):
            if _HEADING.match(line, match.end()):
                yield line[start : match.start()]
                start = match.end()
        yield line[start:]


@dataclass(slots=True)
class _Reader:
    """Blocks read so far."""

    source: str
    block: str = ""
    counted: list[ListedCarbon] = field(default_factory=list)
    listed: list[ListedCarbon] = field(default_factory=list)
    hsqc: list[HsqcPeak] = field(default_factory=list)
    cosy: list[CosyPeak] = field(default_factory=list)
    has_quaternary: bool = False

    def take(self, line: str, number: int) -> None:
        """Read one line."""
        found = _HEADING.match(line)
        if found is not None:
            self.block = str(found.lastgroup)
            line = line[found.end() :].lstrip(" :=")
        values = _without_asides(line)
        if not re.search(r"\d", values):
            if values.strip(" .:,;"):
                raise self._fault(number, f"{line!r} holds no value")
            return
        readers = {
            "count": self._count,
            "types": self._types,
            "dept": self._list,
            "carbon_list": self._list,
            "hsqc": self._pairs,
            "cosy": self._pairs,
        }
        if self.block not in readers:
            raise self._fault(
                number,
                f"{line!r} stands under no heading; begin with carbons, types, 13C, "
                "DEPT, HSQC or COSY",
            )
        readers[self.block](values, number)

    def finished(self) -> SideEvidence:
        """All that was read; a list of lines goes before a bare count."""
        return SideEvidence(
            carbons=tuple(self.listed or self.counted),
            shows_quaternary=self.has_quaternary or not self.listed,
            hsqc=tuple(self.hsqc),
            cosy=tuple(self.cosy),
        )

    def _count(self, values: str, number: int) -> None:
        numbers = re.findall(_NUMBER, values)
        if len(numbers) != 1 or not numbers[0].isdigit():
            raise self._fault(number, "the carbon count must be one whole number")
        self._add_counted(int(numbers[0]), ANY_COUNT, number)

    def _types(self, values: str, number: int) -> None:
        tokens = list(_TOKEN.finditer(values))
        kinds = [one["type"] for one in tokens if one["type"]]
        numbers = [one["number"] for one in tokens if one["number"]]
        if len(kinds) != len(numbers) or not all(one.isdigit() for one in numbers):
            raise self._fault(
                number, "write a whole number with every type, as in '2 CH3, 3 CH2'"
            )
        for kind, count in zip(kinds, numbers, strict=True):
            self._add_counted(int(count), _COUNTS[kind.lower()], number)

    def _add_counted(self, count: int, kind: ProtonCounts, number: int) -> None:
        if len(self.counted) + count > _MOST_CARBONS:
            raise self._fault(number, f"more than {_MOST_CARBONS} carbons are listed")
        self.counted += [ListedCarbon(n_protons=kind)] * count

    def _list(self, values: str, number: int) -> None:
        self.has_quaternary |= self.block == "carbon_list"
        group = ANY_COUNT
        for item in re.split(r"[,;\t]", _with_points(values)):
            headed = re.match(rf"\s*({_TYPE})\s*[:=]", item)
            if headed is not None:
                group = _COUNTS[headed[1].lower()]
                item = item[headed.end() :]  # noqa: PLW2901 - the rest of the item
            for shift, kind in self._items(item, number):
                low, high = _CARBON_LIMITS_PPM
                self._check(shift, low, high, number)
                self.listed.append(
                    ListedCarbon(shift_ppm=shift, n_protons=kind or group)
                )
        if len(self.listed) > _MOST_CARBONS:
            raise self._fault(number, f"more than {_MOST_CARBONS} carbons are listed")

    def _items(
        self, item: str, number: int
    ) -> Iterator[tuple[float, ProtonCounts | None]]:
        """Shifts of an item with their types, whichever comes first."""
        tokens = list(_TOKEN.finditer(item))
        if tokens and tokens[0]["type"]:
            kind = _COUNTS[tokens[0]["type"].lower()]
            shifts = [float(one["number"]) for one in tokens if one["number"]]
            if not shifts:
                raise self._fault(number, f"{item.strip()!r} holds no shift")
            yield from ((shift, kind) for shift in shifts)
            return
        for place, token in enumerate(tokens):
            if token["number"]:
                after = tokens[place + 1] if place + 1 < len(tokens) else None
                kind_after = after["type"] if after is not None else None
                yield (
                    float(token["number"]),
                    _COUNTS[kind_after.lower()] if kind_after else None,
                )

    def _pairs(self, values: str, number: int) -> None:
        for numbers, kind in self._pair_items(_with_points(values), number):
            if self.block == "cosy":
                for shift in numbers:
                    self._check(shift, *_PROTON_LIMITS_PPM, number)
                if numbers[0] != numbers[1]:
                    self.cosy.append(
                        CosyPeak(first_ppm=max(numbers), second_ppm=min(numbers))
                    )
                continue
            # A carbon lies higher on its scale than its proton on its own.
            proton, carbon = min(numbers), max(numbers)
            self._check(proton, *_PROTON_LIMITS_PPM, number)
            self._check(carbon, *_CARBON_LIMITS_PPM, number)
            self.hsqc.append(
                HsqcPeak(proton_ppm=proton, carbon_ppm=carbon, n_protons=kind)
            )

    def _pair_items(
        self, values: str, number: int
    ) -> Iterator[tuple[tuple[float, float], ProtonCounts]]:
        joined = re.sub(r"(?<=\d)\s*(?:->|→|/|×|:|-|x)\s*(?=\d)", " ", values)
        for chunk in joined.split(";"):
            items = [one for one in re.split(r"[,\t]", chunk) if one.strip()]
            counts = [len(re.findall(rf"(?<![A-Za-z]){_NUMBER}", one)) for one in items]
            if any(count % 2 for count in counts):
                items = [chunk]
            for item in items:
                yield from self._pairs_of(item, number)

    def _pairs_of(
        self, item: str, number: int
    ) -> Iterator[tuple[tuple[float, float], ProtonCounts]]:
        tokens = list(_TOKEN.finditer(item))
        numbers = [float(one["number"]) for one in tokens if one["number"]]
        kinds = [_COUNTS[one["type"].lower()] for one in tokens if one["type"]]
        if len(numbers) % 2:
            raise self._fault(
                number,
                f"{item.strip()!r} is no pair; write two shifts, as in 4.12/1.26",
            )
        n_pairs = len(numbers) // 2
        of_pair = kinds if len(kinds) == n_pairs else [ANY_COUNT] * n_pairs
        for place, kind in enumerate(of_pair):
            yield (numbers[2 * place], numbers[2 * place + 1]), kind

    def _check(self, shift: float, low: float, high: float, number: int) -> None:
        if not low <= shift <= high:
            raise self._fault(
                number, f"{shift:g} ppm is no shift from {low:g} to {high:g}"
            )

    def _fault(self, number: int, reason: str) -> SideEvidenceError:
        return SideEvidenceError(self.source, f"line {number}: {reason}")


def _without_asides(line: str) -> str:
    """Values alone: no "(101 MHz, CDCl3)", no signs, units or counts like 2C."""
    bare = re.sub(r"\([^)]*(?:MHz|Cl|D2O|DMSO|solvent)[^)]*\)", " ", line)
    bare = re.sub(r"(?<=\()\s*[2-9]\s*(?:[x×]\s*|C\b\s*,?)", " ", bare)
    bare = re.sub(r"\bppm\b|δ[CH]?|[()\[\]]", " ", bare)
    return re.sub(r"\.(?=\s|$)", " ", bare)


def _with_points(values: str) -> str:
    """Decimal commas as points, where a line has no point and only lone commas."""
    is_decimal = (
        "." not in values
        and re.search(r"\d,\d", values)
        and not re.search(r"\d,\d+,\d", values)
    )
    return re.sub(r"(?<=\d),(?=\d)", ".", values) if is_decimal else values
