"""Published proton lists read from journal text.

Shifts in ppm, couplings in Hz, fields in MHz.
"""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass
from pathlib import Path

from spinledger.errors import FileError
from spinledger.processing.solvents import canonical_solvent

_DASH = r"[-\u2010-\u2015\u2212]"
_NUMBER = r"\d+(?:\.\d+)?"
# Two levels of brackets: labels like H-2' (eq) stand inside the outer ones.
_INSIDE = r"\((?P<inside>(?:[^()]|\([^()]*\))*)\)"
# A shift or a range of two; a range's dash must not be taken for a minus.
_ITEM = re.compile(
    rf"(?<![\w.])(?P<first>{_DASH}?{_NUMBER})"
    rf"(?:\s*(?:{_DASH}|to)\s*(?P<second>{_DASH}?{_NUMBER}))?"
    rf"\s*(?:ppm)?\s*{_INSIDE}"
)
_COUNT = re.compile(r"^(?:(?P<times>\d+)\s*[x×]\s*)?(?P<count>\d+(?:\.\d+)?)\s*H$")
_J = re.compile(
    r"^(?:[\d⁰¹²³⁴⁵⁶⁷⁸⁹]*\s*)J(?:\s*[_(]?[\w,'′()\-/]*?\)?)?\s*(?:=|:)?\s*(?P<rest>[\d.].*)$"
)
_FIELD = re.compile(rf"(?P<field>{_NUMBER})\s*MHz", re.IGNORECASE)
_PATTERN = re.compile(
    r"^(?:(?:br\.?|broad|app\.?|apparent|ps\.?)\s*)*"
    r"(?:s|bs|brs|m|br|[dtqp](?:[dtqp])*|(?:[dtq]|quint?|pent|sext?|sept?|hept?|oct|"
    r"nonet|non|m)+|singlet|doublet|triplet|quartet|quintet|sextet|septet|heptet|"
    r"multiplet|AB\s?q(?:uartet)?|AA[’'′]XX[’'′]|AA[’'′]BB[’'′])\.?$",
    re.IGNORECASE,
)
_WORDS = {
    "singlet": "s",
    "doublet": "d",
    "triplet": "t",
    "quartet": "q",
    "quintet": "quint",
    "quin": "quint",
    "pent": "quint",
    "p": "quint",
    "sextet": "sext",
    "sex": "sext",
    "septet": "sept",
    "sep": "sept",
    "heptet": "sept",
    "hept": "sept",
    "hep": "sept",
    "multiplet": "m",
    "bs": "br s",
    "brs": "br s",
    "br": "br s",
}


class PublishedListError(FileError, ValueError):
    """A text holds no proton list that can be read."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ListedSignal:
    """One item of a list; both ends are equal where one shift is given.

    Attributes
    ----------
    low_ppm, high_ppm : float, ppm
    n_protons : float or None
    multiplicity : str or None
        In the spelling of this program: br s, quint, sept.
    couplings_hz : tuple of float, Hz
        |J|, largest first.
    label : str
        Assignment as printed, or the claims of a ledger.
    """

    low_ppm: float
    high_ppm: float
    n_protons: float | None = None
    multiplicity: str | None = None
    couplings_hz: tuple[float, ...] = ()
    label: str = ""

    @property
    def shift_ppm(self) -> float:
        """The shift, or the middle of the range."""
        return (self.low_ppm + self.high_ppm) / 2


@dataclass(frozen=True, slots=True, kw_only=True)
class SignalList:
    """A list of signals with its conditions as far as they are known."""

    signals: tuple[ListedSignal, ...]
    solvent: str | None = None
    field_mhz: float | None = None


def read_published(path: Path) -> SignalList:
    """Proton list of a text file.

    Raises
    ------
    PublishedListError
        If the file cannot be read or holds no list.
    """
    try:
        text = path.read_bytes().decode("utf-8-sig", errors="replace")
    except OSError as error:
        reason = error.strerror or "it cannot be read"
        raise PublishedListError(path, f"it could not be read ({reason})") from error
    found = parse_published(text)
    if not found.signals:
        raise PublishedListError(
            path,
            "no proton list was found; it should read like "
            '"1H NMR (400 MHz, CDCl3) δ 4.19 (q, J = 7.1 Hz, 2H), ..."',
        )
    return found


def parse_published(text: str) -> SignalList:
    """Proton list in journal text, of ACS or European form.

    Only the part from "1H NMR" (or δH) to a following 13C list is read.

    Parameters
    ----------
    text : str

    Returns
    -------
    SignalList
        Without signals where there is none.

    Examples
    --------
    >>> found = parse_published(
    ...     "1H NMR (400 MHz, CDCl3) d 7.35-7.28 (m, 5H), 1.24 (t, J = 7.1 Hz, 3H)"
    ... )
    >>> [(one.high_ppm, one.multiplicity, one.n_protons) for one in found.signals]
    [(7.35, 'm', 5.0), (1.24, 't', 3.0)]
    """
    # Superscript and subscript digits become plain ones.
    plain = unicodedata.normalize("NFKC", text)
    part = _proton_part(" ".join(plain.split()))
    signals = []
    for match in _ITEM.finditer(part):
        signal = _signal(match)
        if signal is not None:
            signals.append(signal)
    head = part[: _first_item(part)]
    field = _FIELD.search(head)
    return SignalList(
        signals=tuple(sorted(signals, key=lambda one: -one.shift_ppm)),
        solvent=_solvent(head),
        field_mhz=None if field is None else float(field["field"]),
    )


def _proton_part(text: str) -> str:
    start = re.search(r"(?:1|¹)\s*H[\s-]*(?:\{[^}]*\}\s*)?NMR|δ\s*H|d\s?H\s*\(", text)
    begun = text[start.start() :] if start else text
    end = re.search(r"(?:13|¹³)\s*C[\s-]*(?:\{[^}]*\}\s*)?NMR|δ\s*C\b", begun)
    return begun[: end.start()] if end else begun


def _first_item(part: str) -> int:
    for match in _ITEM.finditer(part):
        if _signal(match) is not None:
            return match.start()
    return len(part)


def _signal(match: re.Match[str]) -> ListedSignal | None:
    """Signal of an item; None if the brackets hold neither count nor pattern."""
    count: float | None = None
    pattern: str | None = None
    couplings: list[float] = []
    labels: list[str] = []
    in_couplings = False
    for piece in _pieces(match["inside"]):
        j_match = _J.match(piece)
        if j_match is not None:
            couplings += _values(j_match["rest"])
            in_couplings = True
        elif (counted := _COUNT.match(piece)) is not None and count is None:
            count = float(counted["count"]) * int(counted["times"] or 1)
            in_couplings = False
        elif in_couplings and re.match(rf"^{_NUMBER}(?:\s|Hz|$)", piece):
            couplings += _values(piece)
        elif pattern is None and _PATTERN.match(piece):
            pattern = _spelled(piece)
            in_couplings = False
        else:
            labels.append(piece)
            in_couplings = False
    if count is None and pattern is None:
        return None
    first = _float(match["first"])
    second = first if match["second"] is None else _float(match["second"])
    return ListedSignal(
        low_ppm=min(first, second),
        high_ppm=max(first, second),
        n_protons=count,
        multiplicity=pattern,
        couplings_hz=tuple(sorted(couplings, reverse=True)),
        label=", ".join(labels),
    )


def _pieces(inside: str) -> list[str]:
    """Items between commas and semicolons; "and" joins couplings only."""
    parts = re.split(r"[,;](?![^()]*\))|\band\b|&", inside)
    return [part.strip() for part in parts if part.strip()]


def _values(text: str) -> list[float]:
    return [float(one) for one in re.findall(_NUMBER, text.split("Hz", maxsplit=1)[0])]


def _spelled(pattern: str) -> str:
    text = re.sub(r"\s+", " ", pattern.strip().rstrip("."))
    text = re.sub(r"^(?:br\.?|broad)\s*(?=\S)", "br ", text, flags=re.IGNORECASE)
    text = re.sub(
        r"^(?:app\.?|apparent|ps\.?)\s*(?=\S)", "app ", text, flags=re.IGNORECASE
    )
    prefix, _, core = text.rpartition(" ")
    if core.lower() in ("s", "singlet") and pattern.lower() in ("bs", "brs"):
        return "br s"
    spelled = _WORDS.get(core.lower(), core)
    if spelled == "br s":
        return spelled
    return f"{prefix} {spelled}".strip()


def _solvent(head: str) -> str | None:
    for word in re.split(r"[\s,;:()/]+", head):
        stripped = word.strip(".[]")
        if len(stripped) >= 3 and (found := canonical_solvent(stripped)) is not None:
            return found
    return None


def _float(text: str) -> float:
    return float(re.sub(_DASH, "-", text))
