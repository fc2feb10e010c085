"""The spectra of a sample in words: roles, tabs, and what a shake pair says."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from spinledger.project.document import Project, SampleSpectrum
from spinledger.project.spectra import spectra
from spinledger.sample.roles import ROLES, Role
from spinledger_app.presenters.ledger import LedgerText
from spinledger_app.presenters.wording import chemical, say, sentences

if TYPE_CHECKING:
    from spinledger.sample.shake import Shake


@dataclass(frozen=True, slots=True, kw_only=True)
class TabText:
    """One tab; ``spoken`` says all of it, ``tip`` also why it has its role."""

    key: int
    role: Role
    words: str
    tip: str
    spoken: str
    is_shown: bool


def role_words() -> dict[Role, str]:
    """Roles in the user's language, in the order of the menu."""
    words = (
        say("Main spectrum"),
        say("D₂O shake"),
        say("Other solvent"),
        say("Other field"),
        say("Other temperature"),
        say("Reference"),
        say("Starting material"),
        say("Crude"),
    )
    return dict(zip(ROLES, words, strict=True))


def tabs(project: Project) -> tuple[TabText, ...]:
    """A tab for every spectrum in the order of coming; none for a single one."""
    rows = spectra(project)
    if len(rows) < 2:
        return ()
    return tuple(_tab(one, is_shown=one.key == project.key) for one in rows)


def _tab(one: SampleSpectrum, *, is_shown: bool) -> TabText:
    role = role_words()[one.role]
    conditions = _conditions(one)
    name = one.source_name or say("Unnamed spectrum")
    return TabText(
        key=one.key,
        role=one.role,
        words=", ".join((role, *conditions)),
        tip="\n".join(part for part in (name, one.role_why) if part),
        spoken=", ".join((name, role, *conditions)),
        is_shown=is_shown,
    )


def _conditions(one: SampleSpectrum) -> tuple[str, ...]:
    """Solvent, field and, where it was set by hand, temperature."""
    evidence = one.evidence
    solvent = one.solvent if evidence is None else evidence.solvent
    metadata = one.acquired.metadata if one.acquired is not None else None
    if metadata is None and evidence is not None:
        metadata = evidence.metadata
    if solvent is None and metadata is not None:
        solvent = metadata.solvent
    parts = [chemical(solvent)] if solvent else []
    if metadata is not None:
        parts.append(f"{metadata.spectrometer_frequency_mhz:.0f} MHz")
    if one.temperature_k is not None:
        parts.append(f"{one.temperature_k:g} K")
    return tuple(parts)


def shaken_spectrum(project: Project) -> SampleSpectrum | None:
    """The shake that belongs to the shown spectrum, where both can be compared."""
    if project.ledger is None or project.needs_ledger or project.role == "D2O shake":
        return None
    shaken = [one for one in project.others if one.role == "D2O shake"]
    return next((one for one in shaken if one.evidence is not None), None)


def with_shake(text: LedgerText, shake: Shake) -> LedgerText:
    """Ledger whose rows also say what the shake did to their claim."""
    told = fraction_sentences(shake)
    rows = tuple(
        replace(
            row,
            sentences=(*row.sentences, told[row.claim]),
            spoken=f"{row.spoken} {told[row.claim]}",
        )
        if row.claim in told
        else row
        for row in text.rows
    )
    return replace(text, rows=rows)


def fraction_sentences(shake: Shake) -> dict[str, str]:
    """What the pair says of the claims that lost or kept their protons, by claim."""
    owners: Sequence[tuple[str, ...]] = [
        *(one.claims for one in shake.losses),
        *(one.claims for one in shake.fractions),
    ]
    told = zip(owners, shake.sentences(), strict=False)
    return {claim: sentences((words,)) for claims, words in told for claim in claims}
