"""A project solved as far as it is stale: evidence, then ledger."""

from __future__ import annotations

from collections.abc import Callable

from spinledger.detection.evidence import gather_evidence
from spinledger.project.constraints import reconcile_options
from spinledger.project.document import Project, with_evidence, with_ledger
from spinledger.project.labels import relabel_ledger, shown_labels
from spinledger.reconcile.run import reconcile

Progress = Callable[[str, float], None]
Cancelled = Callable[[], bool]


def solve(
    project: Project,
    *,
    when: str,
    progress: Progress | None = None,
    cancelled: Cancelled | None = None,
) -> Project:
    """Project with evidence and ledger that obey its recipe, options and edits.

    What is current is kept; a project that needs nothing is returned itself.

    Parameters
    ----------
    project : Project
    when : str
        ISO 8601 time for the audit trail.
    progress : callable, optional
        Called with a stage in words and a fraction from 0 to 1.
    cancelled : callable, optional
        Asked now and then; true stops the work.

    Raises
    ------
    CancelledError
        If the user stopped; the project given is unchanged.
    EvidenceError, StructureError
        If nothing can be compared.
    """
    project = solve_evidence(project, progress=progress)
    if project.evidence is None or project.structure is None:
        return project
    if not project.needs_ledger:
        return project
    ledger = reconcile(
        project.evidence,
        project.structure,
        options=reconcile_options(project),
        progress=progress,
        cancelled=cancelled,
    )
    return with_ledger(
        project, relabel_ledger(ledger, shown_labels(project)), when=when
    )


def solve_evidence(project: Project, *, progress: Progress | None = None) -> Project:
    """Project whose spectrum is processed by its recipe, or automatically."""
    if not project.needs_evidence or project.acquired is None:
        return project
    if progress is not None:
        progress("processing the spectrum", 0.0)
    evidence = gather_evidence(
        project.acquired,
        solvent=project.options.solvent,
        temperature_k=project.options.temperature_k,
        recipe=project.recipe,
    )
    return with_evidence(project, evidence)
