"""The open project: one frozen value that the program holds and swaps.

Shifts in ppm, couplings in Hz, temperatures in K; times are ISO 8601 text that
enters as an argument.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from spinledger.sample.roles import Role
from spinledger.values.acquisition import Acquired
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import Ledger, Verdict
from spinledger.values.recipe import Recipe
from spinledger.values.structure import Structure

if TYPE_CHECKING:
    from spinledger.project.edits import Edit


@dataclass(frozen=True, slots=True, kw_only=True)
class ProjectOptions:
    """What the user told the program beside spectrum and structure.

    Attributes
    ----------
    solvent : str or None
        Name as in the table of solvents; None leaves it to the spectrum.
    ph : float or None
    temperature_k : float or None, K
    prefer_processed : bool
        Take the maker's processed spectrum where there is also a FID.
    n_contenders : int or None
        Enumerated isomers to test; None for the program's own choice.
    is_quick : bool
        Leave out what takes long (contenders, advice).
    species, companions, contenders : tuple of Structure
        What else is claimed, what else may be in the tube, and what to test
        beside the claimed structure.
    side_text : str
        Carbon list, HSQC and COSY pairs as typed or pasted; empty for none.
    """

    solvent: str | None = None
    ph: float | None = None
    temperature_k: float | None = None
    prefer_processed: bool = False
    n_contenders: int | None = None
    is_quick: bool = False
    species: tuple[Structure, ...] = ()
    companions: tuple[Structure, ...] = ()
    contenders: tuple[Structure, ...] = ()
    side_text: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class SignOff:
    """One signature line: who did what, and when."""

    role: str
    name: str
    when: str
    remark: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Sample:
    """What the label of the tube says; all of it is the user's own text."""

    name: str = ""
    batch: str = ""
    project: str = ""
    submitted_by: str = ""
    operator: str = ""
    laboratory: str = ""
    prepared: str = ""
    remark: str = ""
    sign_offs: tuple[SignOff, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class AuditLine:
    """One thing that was done, in order; ``when`` is ISO 8601 with its zone."""

    when: str
    what: str
    by_hand: bool = False


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class SampleSpectrum:
    """One spectrum of the sample with everything that is its own.

    Attributes
    ----------
    key : int
        Unique in the project, in the order of coming.
    role : str
        What it is for, see :data:`spinledger.sample.roles.ROLES`.
    role_why : str
        One sentence; "Set by hand." where the user chose.
    source_name, source_path, acquired, recipe, evidence, ledger
        As of a project.
    verdict_before_edits : Verdict or None
    edits : tuple of Edit
    solvent : str or None
    temperature_k : float or None, K
    prefer_processed : bool
    """

    key: int
    role: Role = "main"
    role_why: str = ""
    source_name: str | None = None
    source_path: str | None = None
    acquired: Acquired | None = None
    recipe: Recipe | None = None
    evidence: Evidence | None = None
    ledger: Ledger | None = None
    verdict_before_edits: Verdict | None = None
    edits: tuple[Edit, ...] = ()
    solvent: str | None = None
    temperature_k: float | None = None
    prefer_processed: bool = False


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Project:
    """Everything that is open: evidence side, claims side, edits and records.

    A sample may have several spectra. One is shown: its recipe, evidence, ledger
    and edits stand in the project's own fields; the others wait in ``others``.

    Attributes
    ----------
    name : str
        Shown in the title; "Untitled" before the first save.
    source_name : str or None
        Name of the file or folder the spectrum came from.
    source_path : str or None
        Where it lay when it was read: a hint for the user, never needed again,
        because ``acquired`` holds the samples themselves.
    acquired : Acquired or None
    recipe : Recipe or None
        Set by hand; None leaves processing to the program.
    structure : Structure or None
    evidence : Evidence or None
    ledger : Ledger or None
        As it was solved last, with labels as shown.
    verdict_before_edits : Verdict or None
        What the program said by itself; stays visible after hand edits.
    options : ProjectOptions
    sample : Sample
    edits : tuple of Edit
        Every hand edit in order.
    labels : tuple of (str, str)
        Automatic claim label and the label that is shown instead.
    audit : tuple of AuditLine
    key, role, role_why
        Of the spectrum that is shown.
    others : tuple of SampleSpectrum
        The sample's other spectra.
    ticked : tuple of str
        SMILES of the contenders that the report lists; none for all of them.
    """

    name: str = "Untitled"
    source_name: str | None = None
    source_path: str | None = None
    acquired: Acquired | None = None
    recipe: Recipe | None = None
    structure: Structure | None = None
    evidence: Evidence | None = None
    ledger: Ledger | None = None
    verdict_before_edits: Verdict | None = None
    options: ProjectOptions = ProjectOptions()
    sample: Sample = Sample()
    edits: tuple[Edit, ...] = ()
    labels: tuple[tuple[str, str], ...] = ()
    audit: tuple[AuditLine, ...] = ()
    key: int = 0
    role: Role = "main"
    role_why: str = ""
    others: tuple[SampleSpectrum, ...] = ()
    ticked: tuple[str, ...] = ()

    @property
    def needs_evidence(self) -> bool:
        """The spectrum has to be processed (again) before it can be judged."""
        if self.acquired is None:
            return False
        if self.evidence is None:
            return True
        return self.recipe is not None and self.evidence.recipe != self.recipe

    @property
    def needs_ledger(self) -> bool:
        """Spectrum and structure are here, and the ledger is missing or stale."""
        if self.structure is None or (self.acquired is None and self.evidence is None):
            return False
        if self.ledger is None or self.needs_evidence:
            return True
        return (
            self.ledger.evidence is not self.evidence
            or self.ledger.edits != self.solving_edits
        )

    @property
    def solving_edits(self) -> tuple[str, ...]:
        """Descriptions of the edits that a new ledger has to obey, in order."""
        return tuple(edit.description for edit in self.edits if edit.needs_solving)


def open_spectrum(
    project: Project, acquired: Acquired, *, source_path: str, when: str
) -> Project:
    """Project with a new spectrum; what was derived from the old one is dropped.

    Parameters
    ----------
    project : Project
    acquired : Acquired
    source_path : str
        Where it was read from.
    when : str
        ISO 8601 time.
    """
    metadata = acquired.metadata
    line = AuditLine(
        when=when,
        what=f"Read {metadata.source_name} ({metadata.format_name}, "
        f"SHA-256 {metadata.sha256}).",
    )
    return replace(
        project,
        source_name=metadata.source_name,
        source_path=source_path,
        acquired=acquired,
        recipe=None,
        evidence=None,
        ledger=None,
        verdict_before_edits=None,
        edits=(),
        audit=(*project.audit, line),
    )


def open_structure(project: Project, structure: Structure, *, when: str) -> Project:
    """Project with a new claimed structure; edits of the old claims are dropped."""
    line = AuditLine(when=when, what=f"Structure {structure.smiles} taken.")
    return _with_structure(project, structure, line)


def _with_structure(
    project: Project, structure: Structure | None, line: AuditLine
) -> Project:
    """What another structure leaves of a project."""
    return replace(
        project,
        structure=structure,
        ledger=None,
        verdict_before_edits=None,
        labels=(),
        edits=_without_claims(project.edits),
        others=_without_ledgers(project.others),
        ticked=(),
        audit=(*project.audit, line),
    )


def _without_claims(edits: tuple[Edit, ...]) -> tuple[Edit, ...]:
    return tuple(edit for edit in edits if not edit.names_claims)


def _unsolved(spectrum: SampleSpectrum) -> SampleSpectrum:
    return replace(spectrum, ledger=None)


def _without_ledgers(
    spectra: tuple[SampleSpectrum, ...],
) -> tuple[SampleSpectrum, ...]:
    """Other spectra of the sample before any structure was claimed."""
    return tuple(
        replace(
            _unsolved(one), verdict_before_edits=None, edits=_without_claims(one.edits)
        )
        for one in spectra
    )


def with_layout(project: Project, structure: Structure) -> Project:
    """Project whose structure is drawn otherwise; claims and ledger stay.

    Raises
    ------
    ValueError
        If it is another structure.
    """
    before = project.structure
    if before is None or before.smiles != structure.smiles:
        raise ValueError("structure: a layout cannot change what is drawn")
    return replace(project, structure=replace(before, molblock=structure.molblock))


def without_structure(project: Project, *, when: str) -> Project:
    """Project without a claimed structure, its ledger and the edits of its claims."""
    if project.structure is None:
        return project
    line = AuditLine(when=when, what=f"Structure {project.structure.smiles} removed.")
    return _with_structure(project, None, line)


def with_evidence(project: Project, evidence: Evidence) -> Project:
    """Project with the processed spectrum; a ledger of older evidence goes stale."""
    return replace(project, evidence=evidence)


def with_ledger(project: Project, ledger: Ledger, *, when: str) -> Project:
    """Project with a solved ledger (labels as shown) and the evidence it used."""
    before = project.verdict_before_edits
    if not project.solving_edits:
        before = ledger.verdict
    solved = replace(ledger, edits=project.solving_edits)
    line = AuditLine(when=when, what=f"Solved: {ledger.verdict.state}.")
    return replace(
        project,
        evidence=ledger.evidence,
        ledger=solved,
        verdict_before_edits=before,
        audit=(*project.audit, line),
    )


def with_sample(project: Project, sample: Sample) -> Project:
    """Project with new sample fields; the same project if nothing changed."""
    return project if sample == project.sample else replace(project, sample=sample)


def with_tick(project: Project, smiles: str, *, is_ticked: bool) -> Project:
    """Project with a contender ticked for the report, or ticked no longer."""
    if (smiles in project.ticked) == is_ticked:
        return project
    kept = tuple(one for one in project.ticked if one != smiles)
    return replace(project, ticked=(*kept, smiles) if is_ticked else kept)


def with_options(project: Project, options: ProjectOptions, *, when: str) -> Project:
    """Project with new options; what depends on them has to be solved again."""
    if options == project.options:
        return project
    line = AuditLine(when=when, what=_difference(project.options, options))
    return replace(
        project,
        options=options,
        evidence=None
        if _processing_differs(project.options, options)
        else (project.evidence),
        ledger=None,
        others=tuple(map(_unsolved, project.others))
        if _claims_differ(project.options, options)
        else project.others,
        audit=(*project.audit, line),
    )


def _processing_differs(before: ProjectOptions, after: ProjectOptions) -> bool:
    names = ("solvent", "temperature_k", "prefer_processed")
    return any(getattr(before, name) != getattr(after, name) for name in names)


def _claims_differ(before: ProjectOptions, after: ProjectOptions) -> bool:
    """Whether options changed that all spectra of the sample share."""
    own = ("solvent", "temperature_k", "prefer_processed")
    plain = dict.fromkeys(own)
    return replace(before, **plain) != replace(after, **plain)  # type: ignore[arg-type]  # only compared


def _difference(before: ProjectOptions, after: ProjectOptions) -> str:
    words = {
        "solvent": "solvent",
        "ph": "pH",
        "temperature_k": "temperature in K",
        "prefer_processed": "maker's processed spectrum",
        "n_contenders": "number of contenders",
        "is_quick": "quick",
        "species": "further species",
        "companions": "companions",
        "contenders": "contenders",
        "side_text": "side evidence",
    }
    parts = [
        f"{word} {_in_words(getattr(after, name))}"
        for name, word in words.items()
        if getattr(before, name) != getattr(after, name)
    ]
    return f"Options set: {', '.join(parts)}."


def _in_words(value: object) -> str:
    if isinstance(value, tuple):
        return " ".join(one.smiles for one in value) or "none"
    return "left to the program" if value is None else str(value)
