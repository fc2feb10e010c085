"""Labelled data records ("##LABEL= value"), the text form of JCAMP-DX and Bruker.

References
----------
.. [1] R. S. McDonald, P. A. Wilks, Appl. Spectrosc. 42 (1988) 151-162,
   doi:10.1366/0003702884428734 (labels, comments, blocks).
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import dataclass, field

# No file of spectra comes near; a damaged one must not fill the memory.
_MAX_BLOCKS = 10_000
_LABEL_NOISE = str.maketrans("", "", " -_/\t")
_PLAIN_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eEdD][+-]?\d+)?")
_COMMA_NUMBER = re.compile(r"[+-]?\d+,\d+(?:[eE][+-]?\d+)?")
_RANGE = re.compile(r"\(\s*\d+\s*\.\.\s*\d+\s*\)")
# Where a decimal comma shows: these never hold a list.
_SCALAR_LABELS = (
    ".OBSERVEFREQUENCY",
    "FIRSTX",
    "LASTX",
    "DELTAX",
    "XFACTOR",
    "YFACTOR",
    "MAXX",
    "MINX",
    ".ACQUISITIONTIME",
)


def plain_label(label: str) -> str:
    """Label for comparison: upper case, no space, dash, slash, underscore [1]_."""
    return label.translate(_LABEL_NOISE).upper()


def parse_number(text: str) -> float | None:
    """Number at the start of a value; a comma may stand for the decimal point.

    Returns None where there is no finite number.

    Examples
    --------
    >>> parse_number("<300.13> "), parse_number("60,25 MHz"), parse_number("off")
    (300.13, 60.25, None)
    """
    cleaned = text.strip().strip("<>").strip()
    comma = _COMMA_NUMBER.match(cleaned)
    if comma:
        value = float(comma.group().replace(",", "."))
    else:
        plain = _PLAIN_NUMBER.match(cleaned)
        if plain is None:
            return None
        value = float(plain.group().translate(str.maketrans("dD", "ee")))
    return value if math.isfinite(value) else None


@dataclass(frozen=True, slots=True)
class Block:
    """Records of one block, from its TITLE to its END.

    Attributes
    ----------
    values : dict of str to list of str
        Text after the equals sign, comments removed, in the order of the file;
        keys are plain labels.
    """

    values: dict[str, list[str]] = field(default_factory=dict)

    def text(self, *labels: str) -> str | None:
        """First non-empty value of the first label that has one, brackets off."""
        for label in labels:
            for value in self.values.get(plain_label(label), ()):
                cleaned = value.strip()
                if cleaned.startswith("<") and ">" in cleaned:
                    cleaned = cleaned[1 : cleaned.index(">")].strip()
                if cleaned:
                    return cleaned
        return None

    def number(self, *labels: str) -> float | None:
        """First finite number among the labels, or None."""
        for label in labels:
            for value in self.values.get(plain_label(label), ()):
                number = parse_number(value)
                if number is not None:
                    return number
        return None

    def element(self, label: str, index: int) -> float | None:
        """One number of an array "(0..n) a b c ...", or None."""
        text = self.text(label)
        match = _RANGE.match(text) if text else None
        if text is None or match is None:
            return None
        items = text[match.end() :].split(None, index + 1)
        return parse_number(items[index]) if len(items) > index else None

    def listed(self, label: str) -> list[str]:
        """Items of a comma-separated list; decimal commas inside are kept."""
        text = self.text(label)
        if text is None:
            return []
        if self.has_decimal_commas:
            return [item.strip() for item in re.split(r",\s+|;|\s{2,}", text)]
        return [item.strip() for item in text.split(",")]

    @property
    def has_decimal_commas(self) -> bool:
        """Whether the header writes 300,13 for 300.13."""
        return any(
            _COMMA_NUMBER.fullmatch(value.strip())
            for label in _SCALAR_LABELS
            for value in self.values.get(label, ())
        )


def parse_blocks(text: str) -> list[Block]:
    """All blocks of a file, inner ones first as they end; open ones are closed.

    Text before the first TITLE belongs to no block and is passed over.
    """
    done: list[Block] = []
    stack: list[Block] = []
    n_blocks = 0
    for label, value in _records(text):
        if label == "TITLE":
            n_blocks += 1
            if n_blocks > _MAX_BLOCKS:
                break
            stack.append(Block())
        if label == "END" and stack:
            done.append(stack.pop())
        elif stack:
            stack[-1].values.setdefault(label, []).append(value)
    return done + stack[::-1]


def parse_parameters(text: str) -> Block:
    """Records of a parameter file as one block."""
    block = Block()
    for label, value in _records(text):
        block.values.setdefault(label, []).append(value)
    return block


def _records(text: str) -> Iterator[tuple[str, str]]:
    label: str | None = None
    lines: list[str] = []
    for raw in text.split("\n"):
        line = raw.split("$$", 1)[0]
        if line.lstrip().startswith("##") and "=" in line:
            if label is not None:
                yield label, "\n".join(lines)
            name, _, value = line.lstrip()[2:].partition("=")
            label, lines = plain_label(name), [value]
        elif label is not None and line.strip():
            lines.append(line)
    if label is not None:
        yield label, "\n".join(lines)
