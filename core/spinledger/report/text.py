"""The experimental-section sentence in journal form.

Shifts in ppm, couplings in Hz. Text comes as runs, because J is set in italic.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from spinledger.report.patterns import PrintedCoupling, letters_of, printed_couplings
from spinledger.report.words import (
    NO_BREAK,
    fixed,
    label_glyphs,
    nominal_mhz,
    shift_range,
    solvent_glyphs,
)
from spinledger.values.ledger import Entry, Ledger


@dataclass(frozen=True, slots=True, kw_only=True)
class TextOptions:
    """Choices of journal form.

    Attributes
    ----------
    style : {"acs", "rsc"}
        "4.19 (dqd, J = 8.6, 6.3, 3.4 Hz, 1H, H3)" or
        "4.19 (1H, dqd, J 8.6, 6.3 and 3.4 Hz, H3)" (both common practice).
    high_shift_first : bool
    with_assignment : bool
        Print the claim's label as the last item.
    with_exchangeable : bool
        List OH and NH that are seen.
    resolve_overlap : bool
        Print the parts of an unresolved overlap, marked "from line-shape fit",
        instead of one range.
    shift_digits, j_digits : int
        Two decimals and one decimal are the journals' rule for protons.
    """

    style: Literal["acs", "rsc"] = "acs"
    high_shift_first: bool = True
    with_assignment: bool = True
    with_exchangeable: bool = True
    resolve_overlap: bool = False
    shift_digits: int = 2
    j_digits: int = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class Run:
    """A stretch of text in one style."""

    text: str
    is_italic: bool = False


def experimental_runs(
    ledger: Ledger, options: TextOptions | None = None
) -> tuple[Run, ...]:
    """The sentence as runs of plain and italic text.

    Entries that are not observed or exchanged, and everything that no claim
    owns, are left out. Claims that share one unresolved signal are one item, a
    range with the sum of their protons.

    Parameters
    ----------
    ledger : Ledger
    options : TextOptions, optional

    Returns
    -------
    tuple of Run
        Units, "J =" and "br s" are held together by no-break spaces.

    References
    ----------
    .. [1] Order of items, digits and codes: common practice of the ACS and RSC
       journals, from memory.
    """
    chosen = options or TextOptions()
    items = [_item(ledger, group, chosen) for group in signal_groups(ledger, chosen)]
    items = items if chosen.high_shift_first else items[::-1]
    runs: list[Run] = [*_opener(ledger, chosen)]
    for index, item in enumerate(items):
        runs.append(Run(text=", " if index else NO_BREAK))
        runs.extend(item)
    if not items:
        runs.append(Run(text=f"{NO_BREAK}no assigned signals"))
    runs.append(Run(text="."))
    return _joined(runs)


def experimental_text(ledger: Ledger, options: TextOptions | None = None) -> str:
    """The sentence as plain Unicode text."""
    return "".join(run.text for run in experimental_runs(ledger, options))


def reference_sentence(ledger: Ledger) -> str:
    """How the shift scale was set, as a journal wants it said."""
    reference = ledger.evidence.reference
    at = (
        ""
        if reference.line_ppm is None
        else f" ({fixed(reference.line_ppm, 2)}{NO_BREAK}ppm)"
    )
    solvent = solvent_glyphs(ledger.evidence.solvent or "solvent")
    words = {
        "TMS": f"Shifts are given relative to internal TMS{at}.",
        "DSS": f"Shifts are given relative to internal DSS{at}.",
        "TSP": f"Shifts are given relative to internal TSP{at}, which moves with pH.",
        "solvent": f"Shifts are referenced to the residual signal of {solvent}{at}.",
        "water": f"Shifts are referenced to the water line{at}.",
        "match": "Shifts are set so that the claims agree best; no reference was seen.",
        "header": "Shifts are as the file's header gives them; no reference was seen.",
        "user": f"Shifts are referenced to a line that was set by hand{at}.",
    }
    return words.get(reference.by, f"Shifts are referenced to {reference.by}{at}.")


def standing_sentence(ledger: Ledger) -> str:
    """What must stand beside the text where the structure is not supported, else ""."""
    words = {
        "undecided": "The spectrum does not decide on this structure; the assignment "
        "is provisional.",
        "not reconciled": "This assignment is inconsistent with the drawn structure; "
        "the text is for comparison only.",
        "not judged": "Nothing could be compared; this is not an assignment.",
    }
    return words.get(ledger.verdict.state, "")


def signal_groups(
    ledger: Ledger, options: TextOptions | None = None
) -> tuple[tuple[Entry, ...], ...]:
    """Observed entries, those of one unresolved signal together, by falling shift.

    Parameters
    ----------
    ledger : Ledger
    options : TextOptions, optional

    Returns
    -------
    tuple of tuple of Entry
    """
    chosen = options or TextOptions()
    seen = [
        entry
        for entry in ledger.entries
        if entry.state in ("settled", "disputed")
        and entry.shift_ppm is not None
        and (chosen.with_exchangeable or not _is_exchangeable(ledger, entry))
    ]
    groups: list[list[Entry]] = []
    for entry in sorted(seen, key=lambda one: -(one.shift_ppm or 0.0)):
        home = None if chosen.resolve_overlap else _home(groups, entry)
        if home is None:
            groups.append([entry])
        else:
            home.append(entry)
    return tuple(tuple(group) for group in groups)


def _home(groups: Sequence[list[Entry]], entry: Entry) -> list[Entry] | None:
    """Group that already holds a claim which shares the entry's signal."""
    for group in groups:
        if any(_shares(entry, one) or _shares(one, entry) for one in group):
            return group
    return None


def _shares(entry: Entry, other: Entry) -> bool:
    group = entry.group
    return (
        group is not None and group.kind == "shared" and other.claim in group.partners
    )


def _opener(ledger: Ledger, options: TextOptions) -> tuple[Run, ...]:
    metadata = ledger.evidence.metadata
    field = f"{nominal_mhz(metadata.spectrometer_frequency_mhz)}{NO_BREAK}MHz"
    solvent = ledger.evidence.solvent
    parts = [field, *([solvent_glyphs(solvent)] if solvent else [])]
    if options.style == "rsc":
        return (
            Run(text="δ", is_italic=True),
            Run(text=f"H{NO_BREAK}({'; '.join(parts)})"),
        )
    return (Run(text=f"¹H{NO_BREAK}NMR ({', '.join(parts)}) δ"),)


def _item(
    ledger: Ledger, group: tuple[Entry, ...], options: TextOptions
) -> tuple[Run, ...]:
    pattern = _pattern(group)
    count = _count(ledger, group)
    names = " and ".join(label_glyphs(entry.claim) for entry in group)
    if len(group) > 2:
        names = ", ".join(label_glyphs(entry.claim) for entry in group)
    couplings = printed_couplings(ledger, group[0]) if len(group) == 1 else ()
    middle = [[Run(text=pattern.replace(" ", NO_BREAK))]]
    if couplings:
        middle.append(_j_runs(couplings, options))
    counted = [[Run(text=count)]]
    pieces = counted + middle if options.style == "rsc" else middle + counted
    if options.with_assignment:
        pieces.append(
            [Run(text=names.replace(" ", NO_BREAK) if len(group) < 3 else names)]
        )
    if options.resolve_overlap and _is_shared(group):
        pieces.append([Run(text="from line-shape fit")])
    runs: list[Run] = [Run(text=f"{_place(group, pattern, options)} (")]
    for index, piece in enumerate(pieces):
        runs.extend([Run(text=", ")] if index else [])
        runs.extend(piece)
    return (*runs, Run(text=")"))


def _count(ledger: Ledger, group: tuple[Entry, ...]) -> str:
    """Number of protons; of a mixture what was found, since shares are not whole."""
    found = [one.integral_protons for one in group if one.integral_protons is not None]
    is_mixture = any(entry.species for entry in ledger.entries)
    if is_mixture and len(found) == len(group):
        return f"{fixed(sum(found), 2)}H"
    return f"{sum(entry.protons for entry in group)}H"


def _pattern(group: tuple[Entry, ...]) -> str:
    if len(group) > 1:
        return "m"
    return group[0].multiplicity or "m"


def _place(group: tuple[Entry, ...], pattern: str, options: TextOptions) -> str:
    """One shift, or the range of what is not resolved into letters."""
    ranges = [entry.range_ppm for entry in group if entry.range_ppm is not None]
    is_resolved = bool(letters_of(pattern)) or pattern.endswith("s")
    if is_resolved or not ranges:
        return fixed(group[0].shift_ppm or 0.0, options.shift_digits)
    low = min(one[0] for one in ranges)
    high = max(one[1] for one in ranges)
    text = shift_range(low, high, digits=options.shift_digits)
    first, _, second = text.partition("–")
    return first if first == second else text


def _j_runs(couplings: Sequence[PrintedCoupling], options: TextOptions) -> list[Run]:
    values = [fixed(one.j_hz, options.j_digits) for one in couplings]
    if options.style == "rsc":
        listed = ", ".join(values[:-1])
        text = f"{listed} and {values[-1]}" if listed else values[0]
        return [
            Run(text="J", is_italic=True),
            Run(text=f"{NO_BREAK}{text}{NO_BREAK}Hz"),
        ]
    return [
        Run(text="J", is_italic=True),
        Run(text=f"{NO_BREAK}={NO_BREAK}{', '.join(values)}{NO_BREAK}Hz"),
    ]


def _is_shared(group: tuple[Entry, ...]) -> bool:
    return any(one.group is not None and one.group.kind == "shared" for one in group)


def _is_exchangeable(ledger: Ledger, entry: Entry) -> bool:
    return any(
        claim.label == entry.claim and claim.is_exchangeable
        for claim in ledger.claims.claims
    )


def _joined(runs: Sequence[Run]) -> tuple[Run, ...]:
    """Neighbouring runs of one style made one."""
    joined: list[Run] = []
    for run in runs:
        if joined and joined[-1].is_italic == run.is_italic:
            joined[-1] = Run(text=joined[-1].text + run.text, is_italic=run.is_italic)
        elif run.text:
            joined.append(run)
    return tuple(joined)
