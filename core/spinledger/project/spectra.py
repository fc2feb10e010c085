"""The spectra of a sample: pure changes from project to project, each one undo step.

Temperatures in K; times are ISO 8601 text that enters as an argument.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from spinledger.project.document import (
    AuditLine,
    Project,
    SampleSpectrum,
    open_spectrum,
)
from spinledger.sample.roles import ROLES, Role, guess_role
from spinledger.values.acquisition import Acquired, Metadata

Progress = Callable[[str, float], None]
Cancelled = Callable[[], bool]


def spectra(project: Project) -> tuple[SampleSpectrum, ...]:
    """All spectra of the sample in the order of coming, the shown one included."""
    if project.acquired is None and project.evidence is None and not project.others:
        return ()
    return tuple(sorted((_shown(project), *project.others), key=lambda one: one.key))


def spectrum_of(project: Project, key: int) -> SampleSpectrum:
    """Spectrum by its key.

    Raises
    ------
    ValueError
        If the sample has no such spectrum.
    """
    for one in spectra(project):
        if one.key == key:
            return one
    raise ValueError(f"key: the sample has no spectrum {key!r}")


def main_spectrum(project: Project) -> SampleSpectrum | None:
    """The spectrum the others are compared with: the first one in the main role."""
    rows = spectra(project)
    named = next((one for one in rows if one.role == "main"), None)
    return named or (rows[0] if rows else None)


def add_spectrum(
    project: Project,
    acquired: Acquired,
    *,
    source_path: str,
    when: str,
    role: Role | None = None,
    again: bool = False,
) -> Project:
    """Project with one more spectrum of its sample; the shown one stays shown.

    Parameters
    ----------
    project : Project
        Without a spectrum the new one becomes the main one and is shown.
    acquired : Acquired
    source_path : str
    when : str
    role : str, optional
        Guessed from solvent, date and name if not given.
    again : bool
        Take data that are in the sample already once more.

    Raises
    ------
    ValueError
        If the same data are in the sample already.
    """
    rows = spectra(project)
    metadata = acquired.metadata
    for one in rows:
        if not again and _is_of(one, metadata):
            raise ValueError(
                f"{metadata.source_name}: this spectrum is in the sample already"
            )
    if not rows:
        opened = open_spectrum(project, acquired, source_path=source_path, when=when)
        return replace(opened, role=role or "main")
    why = "Set by hand."
    if role is None:
        main = main_spectrum(project)
        guess = guess_role(
            metadata,
            _metadata(main),
            main_solvent=_solvent(main),
        )
        role, why = guess.role, guess.why
    new = SampleSpectrum(
        key=max(one.key for one in rows) + 1,
        role=role,
        role_why=why,
        source_name=metadata.source_name,
        source_path=source_path,
        acquired=acquired,
    )
    line = AuditLine(
        when=when,
        what=f"Read {metadata.source_name} ({metadata.format_name}, "
        f"SHA-256 {metadata.sha256}) as {role}.",
    )
    return replace(project, others=(*project.others, new), audit=(*project.audit, line))


def show_spectrum(project: Project, key: int) -> Project:
    """Project that shows another spectrum; the same project if it is shown already.

    Raises
    ------
    ValueError
        If the sample has no such spectrum.
    """
    if key == project.key:
        return project
    new = spectrum_of(project, key)
    rest = tuple(one for one in spectra(project) if one.key != key)
    return _with_shown(replace(project, others=rest), new)


def step_spectrum(project: Project, steps: int = 1) -> Project:
    """Project that shows the next spectrum (or the one before), round and round."""
    keys = [one.key for one in spectra(project)]
    if len(keys) < 2:
        return project
    return show_spectrum(project, keys[(keys.index(project.key) + steps) % len(keys)])


def remove_spectrum(project: Project, key: int, *, when: str) -> Project:
    """Project without one of its spectra; the next one is shown where it was shown.

    Raises
    ------
    ValueError
        If the sample has no such spectrum, or only this one.
    """
    gone = spectrum_of(project, key)
    if not project.others:
        raise ValueError("key: the only spectrum of a sample cannot be taken away")
    if key == project.key:
        project = step_spectrum(project)
    line = AuditLine(
        when=when, what=f"{gone.source_name} taken out of the sample.", by_hand=True
    )
    rest = tuple(one for one in project.others if one.key != key)
    return replace(project, others=rest, audit=(*project.audit, line))


def set_role(project: Project, key: int, role: Role, *, when: str) -> Project:
    """Project in which a spectrum has another role; itself if it has it already.

    A sample has one main spectrum: the one before becomes a reference.

    Raises
    ------
    ValueError
        If the role or the spectrum is not known.
    """
    if role not in ROLES:
        raise ValueError(f"role: must be one of {', '.join(ROLES)}, got {role!r}")
    before = spectrum_of(project, key)
    if before.role == role:
        return project

    def changed(one: SampleSpectrum) -> SampleSpectrum:
        if one.key == key:
            return replace(one, role=role, role_why="Set by hand.")
        if role == "main" and one.role == "main":
            why = f"{before.source_name} was made the main spectrum."
            return replace(one, role="reference", role_why=why)
        return one

    line = AuditLine(
        when=when, what=f"{before.source_name} set to {role}.", by_hand=True
    )
    project = _mapped(project, changed)
    return replace(project, audit=(*project.audit, line))


def set_conditions(
    project: Project,
    key: int,
    *,
    solvent: str | None,
    temperature_k: float | None,
    when: str,
) -> Project:
    """Project in which a spectrum has its own solvent and temperature.

    What was derived from it is dropped, the hand edits stay.

    Raises
    ------
    ValueError
        If the sample has no such spectrum.
    """
    before = spectrum_of(project, key)
    if (before.solvent, before.temperature_k) == (solvent, temperature_k):
        return project

    def changed(one: SampleSpectrum) -> SampleSpectrum:
        if one.key != key:
            return one
        return replace(
            one,
            solvent=solvent,
            temperature_k=temperature_k,
            evidence=None,
            ledger=None,
        )

    words = [solvent or "solvent left to the program"]
    words += [] if temperature_k is None else [f"{temperature_k:g} K"]
    line = AuditLine(
        when=when, what=f"{before.source_name}: {', '.join(words)}.", by_hand=True
    )
    project = _mapped(project, changed)
    return replace(project, audit=(*project.audit, line))


def solve_all(
    project: Project,
    *,
    when: str,
    progress: Progress | None = None,
    cancelled: Cancelled | None = None,
) -> Project:
    """Project with evidence and ledger of every spectrum; the shown one stays shown.

    A spectrum in the role of starting material or crude is processed only: it
    does not claim the structure.

    Raises
    ------
    CancelledError
        If the user stopped; the project given is unchanged.
    EvidenceError, StructureError
        If nothing can be compared.
    """
    from spinledger.project.solve import (  # noqa: PLC0415 - loads all of the fit
        solve,
        solve_evidence,
    )

    shown = project.key
    for one in spectra(project):
        project = show_spectrum(project, one.key)
        if one.role in ("starting material", "crude"):
            project = solve_evidence(project, progress=progress)
        else:
            project = solve(project, when=when, progress=progress, cancelled=cancelled)
    return show_spectrum(project, shown)


def _is_of(one: SampleSpectrum, metadata: Metadata) -> bool:
    return one.acquired is not None and one.acquired.metadata.sha256 == metadata.sha256


def _shown(project: Project) -> SampleSpectrum:
    return SampleSpectrum(
        key=project.key,
        role=project.role,
        role_why=project.role_why,
        source_name=project.source_name,
        source_path=project.source_path,
        acquired=project.acquired,
        recipe=project.recipe,
        evidence=project.evidence,
        ledger=project.ledger,
        verdict_before_edits=project.verdict_before_edits,
        edits=project.edits,
        solvent=project.options.solvent,
        temperature_k=project.options.temperature_k,
        prefer_processed=project.options.prefer_processed,
    )


def _with_shown(project: Project, one: SampleSpectrum) -> Project:
    return replace(
        project,
        key=one.key,
        role=one.role,
        role_why=one.role_why,
        source_name=one.source_name,
        source_path=one.source_path,
        acquired=one.acquired,
        recipe=one.recipe,
        evidence=one.evidence,
        ledger=one.ledger,
        verdict_before_edits=one.verdict_before_edits,
        edits=one.edits,
        options=replace(
            project.options,
            solvent=one.solvent,
            temperature_k=one.temperature_k,
            prefer_processed=one.prefer_processed,
        ),
    )


def _mapped(
    project: Project, change: Callable[[SampleSpectrum], SampleSpectrum]
) -> Project:
    """Project with every spectrum changed, the shown one in its place."""
    project = replace(project, others=tuple(change(one) for one in project.others))
    return _with_shown(project, change(_shown(project)))


def _metadata(one: SampleSpectrum | None) -> Metadata | None:
    if one is None:
        return None
    if one.acquired is not None:
        return one.acquired.metadata
    return None if one.evidence is None else one.evidence.metadata


def _solvent(one: SampleSpectrum | None) -> str | None:
    if one is None:
        return None
    return one.evidence.solvent if one.evidence is not None else one.solvent
