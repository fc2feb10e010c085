"""Tags and remarks of the structure panel."""

from __future__ import annotations

from spinledger.project.document import Project
from spinledger.values.claim import Claim
from spinledger_app.presenters.ledger import row_text
from spinledger_app.presenters.structure import Drawing
from spinledger_app.presenters.wording import chemical, say, shift_sd

Tag = tuple[str, str, tuple[int, ...]]


def structure_tags(project: Project) -> tuple[Tag, ...]:
    """One tag a claim: (claim, state, atoms); none before the first ledger."""
    ledger = project.ledger
    if ledger is None or project.structure is None:
        return ()
    return tuple((entry.claim, entry.state, entry.atoms) for entry in ledger.entries)


def tag_tips(project: Project) -> dict[str, str]:
    """Tool tips of the tags: the row in words, and how the shift is known."""
    ledger = project.ledger
    if ledger is None:
        return {}
    claims = {claim.label: claim for claim in ledger.claims.claims}
    return {
        entry.claim: "\n".join(
            part
            for part in (
                row_text(entry).spoken.replace("; ", "\n"),
                _source(claims.get(entry.claim)),
            )
            if part
        )
        for entry in ledger.entries
    }


def _source(claim: Claim | None) -> str:
    if claim is None:
        return ""
    shift = shift_sd(claim.shift_ppm, claim.shift_sd_ppm)
    parts = [
        say("predicted {0} ppm").replace("{0}", shift),
        claim.shift_source,
        claim.why,
    ]
    return "; ".join(part for part in parts if part)


def structure_foot(project: Project, drawing: Drawing | None) -> tuple[str, str]:
    """Remarks under the structure: solvent left, configuration right."""
    solvent = None
    if project.evidence is not None:
        solvent = project.evidence.solvent
    solvent = solvent or project.options.solvent
    left = f"{say('Solvent')} {chemical(solvent)}" if solvent else ""
    stereo = drawing.stereo if drawing is not None else ""
    right = f"{stereo} {say('as drawn')}" if stereo else ""
    return left, right
