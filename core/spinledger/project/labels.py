"""Claim labels as shown: a renaming reaches the ledger and every earlier edit."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import fields, replace
from typing import Any

from spinledger.project.document import Project, SampleSpectrum
from spinledger.values.claim import ClaimSet
from spinledger.values.geometry import Geometry
from spinledger.values.ledger import Entry, Ledger, Model

_EDIT_FIELDS_WITH_LABELS = ("claim", "partner")


def shown_labels(project: Project) -> dict[str, str]:
    """Shown label by automatic label, for claims that were renamed."""
    return dict(project.labels)


def automatic_label(project: Project, label: str) -> str:
    """Label that the program gave to the claim that is shown as ``label``."""
    for automatic, shown in project.labels:
        if shown == label:
            return automatic
    return label


def rename(project: Project, claim: str, label: str) -> Project:
    """Project in which the claim shown as ``claim`` is shown as ``label``.

    Raises
    ------
    ValueError
        If the label is empty or taken, or there is no such claim.
    """
    new = label.strip()
    if not new:
        raise ValueError("label: a claim needs a label")
    known = _known_labels(project)
    if claim not in known:
        raise ValueError(f"claim: there is no claim {claim!r}")
    if new == claim:
        return project
    if new in known:
        raise ValueError(f"label: {new!r} is taken by another claim")
    automatic = automatic_label(project, claim)
    others = tuple(pair for pair in project.labels if pair[0] != automatic)
    kept = others if new == automatic else (*others, (automatic, new))
    renamed = {claim: new}
    was_current = (
        project.ledger is not None and project.ledger.edits == project.solving_edits
    )
    changed = replace(
        project,
        labels=kept,
        edits=tuple(relabel_edit(edit, renamed) for edit in project.edits),
    )
    changed = replace(
        changed, others=tuple(_relabel_spectrum(one, renamed) for one in project.others)
    )
    if project.ledger is None:
        return changed
    ledger = relabel_ledger(project.ledger, renamed)
    if was_current:  # the edits read differently now, but ask for the same
        ledger = replace(ledger, edits=changed.solving_edits)
    return replace(changed, ledger=ledger)


def _relabel_spectrum(
    spectrum: SampleSpectrum, renamed: Mapping[str, str]
) -> SampleSpectrum:
    """The same for a spectrum of the sample that is not shown."""
    before = tuple(one.description for one in spectrum.edits if one.needs_solving)
    edits = tuple(relabel_edit(edit, renamed) for edit in spectrum.edits)
    ledger = spectrum.ledger
    if ledger is not None:
        was_current = ledger.edits == before
        ledger = relabel_ledger(ledger, renamed)
        if was_current:
            after = tuple(one.description for one in edits if one.needs_solving)
            ledger = replace(ledger, edits=after)
    return replace(spectrum, edits=edits, ledger=ledger)


def relabel_ledger(ledger: Ledger, labels: Mapping[str, str]) -> Ledger:
    """Ledger with claims renamed wherever they are named; the rest is shared.

    Sentences (reasons, why) that were written before keep their wording.
    """
    if not labels:
        return ledger

    def new(label: str) -> str:
        return labels.get(label, label)

    return replace(
        ledger,
        claims=_relabel_claims(ledger.claims, new),
        entries=tuple(_relabel_entry(entry, new) for entry in ledger.entries),
        model=_relabel_model(ledger.model, new),
        geometry=_relabel_geometry(ledger.geometry, new),
    )


def relabel_edit(edit: Any, labels: Mapping[str, str]) -> Any:
    """Edit with claims renamed; edits that name none are returned as they are."""
    changes: dict[str, Any] = {}
    for field in fields(edit):
        value = getattr(edit, field.name)
        if field.name in _EDIT_FIELDS_WITH_LABELS:
            changes[field.name] = labels.get(value, value)
        elif hasattr(value, "description"):  # the pins inside a swap
            changes[field.name] = relabel_edit(value, labels)
    return replace(edit, **changes) if changes else edit


def _known_labels(project: Project) -> set[str]:
    if project.ledger is None:
        return {shown for _, shown in project.labels}
    return {claim.label for claim in project.ledger.claims.claims} | {
        entry.claim for entry in project.ledger.entries
    }


def _relabel_claims(claims: ClaimSet, new: Callable[[str], str]) -> ClaimSet:
    renamed = tuple(
        replace(
            claim,
            label=new(claim.label),
            pair=None if claim.pair is None else new(claim.pair),
        )
        for claim in claims.claims
    )
    return replace(claims, claims=renamed)


def _relabel_geometry(
    geometry: Geometry | None, new: Callable[[str], str]
) -> Geometry | None:
    if geometry is None:
        return None
    renamed = tuple(
        replace(one, first=new(one.first), second=new(one.second))
        for one in geometry.dihedrals
    )
    return replace(geometry, dihedrals=renamed)


def _relabel_entry(entry: Entry, new: Callable[[str], str]) -> Entry:
    group = entry.group
    if group is not None:
        group = replace(group, partners=tuple(new(one) for one in group.partners))
    couplings = tuple(
        replace(coupling, partner=new(coupling.partner)) for coupling in entry.couplings
    )
    return replace(entry, claim=new(entry.claim), couplings=couplings, group=group)


def _relabel_model(model: Model | None, new: Callable[[str], str]) -> Model | None:
    if model is None:
        return None
    lines = tuple(replace(one, claim=new(one.claim)) for one in model.claim_lines)
    return replace(model, claim_lines=lines)
