"""Hand edits: frozen values, each a pure change from project to project.

Shifts in ppm, couplings in Hz. Claims are named by the label that is shown.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import ClassVar

from spinledger.project.document import AuditLine, Project
from spinledger.project.labels import rename
from spinledger.values.recipe import Recipe, Reference


class _Edit:
    """What all edits share; those that only ask the solver change nothing else.

    Attributes
    ----------
    needs_solving : bool
        Whether the ledger has to be solved again.
    names_claims : bool
        Whether it falls away when another structure is taken.
    """

    __slots__ = ()
    needs_solving: ClassVar[bool] = True
    names_claims: ClassVar[bool] = True

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        raise NotImplementedError

    def change(self, project: Project) -> Project:
        """Project with the edit carried out, beside its record in ``edits``."""
        return project


@dataclass(frozen=True, slots=True, kw_only=True)
class PinClaim(_Edit):
    """Put a claim to a signal: its shift must come out inside the range.

    Attributes
    ----------
    claim : str
    shift_ppm : float, ppm
        Where to start; usually the middle of the signal or where it was dropped.
    low_ppm, high_ppm : float, ppm
        Range of the signal.
    """

    claim: str
    shift_ppm: float
    low_ppm: float
    high_ppm: float

    def __post_init__(self) -> None:
        _check_range(self.low_ppm, self.high_ppm)

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return f"{self.claim} put to the signal at {self.shift_ppm:.3f} ppm"


@dataclass(frozen=True, slots=True, kw_only=True)
class UnlinkClaim(_Edit):
    """Take a claim off its signal: it counts as not found."""

    claim: str

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return f"{self.claim} taken off its signal"


@dataclass(frozen=True, slots=True, kw_only=True)
class ReleaseClaim(_Edit):
    """Give a claim back to the program after a pin or an unlinking."""

    claim: str

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return f"{self.claim} given back to the program"


@dataclass(frozen=True, slots=True, kw_only=True)
class SwapClaims(_Edit):
    """Exchange the signals of two claims, for example of a diastereotopic pair.

    Each pin holds the place that the *other* claim had before.
    """

    first: PinClaim
    second: PinClaim

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return f"{self.first.claim} and {self.second.claim} exchanged"


@dataclass(frozen=True, slots=True, kw_only=True)
class FixCoupling(_Edit):
    """Hold the coupling between two claims at a value."""

    claim: str
    partner: str
    j_hz: float

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return f"J({self.claim}, {self.partner}) held at {self.j_hz:.2f} Hz"


@dataclass(frozen=True, slots=True, kw_only=True)
class ReleaseCoupling(_Edit):
    """Let the fit find a coupling again."""

    claim: str
    partner: str

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return f"J({self.claim}, {self.partner}) given back to the fit"


@dataclass(frozen=True, slots=True, kw_only=True)
class ExcludeRegion(_Edit):
    """Leave a stretch of the spectrum out of match, fit and balance."""

    low_ppm: float
    high_ppm: float

    names_claims: ClassVar[bool] = False

    def __post_init__(self) -> None:
        _check_range(self.low_ppm, self.high_ppm)

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return f"{self.high_ppm:.3f} to {self.low_ppm:.3f} ppm left out"


@dataclass(frozen=True, slots=True, kw_only=True)
class IncludeRegion(_Edit):
    """Take back exclusions and impurity marks that touch this stretch."""

    low_ppm: float
    high_ppm: float

    names_claims: ClassVar[bool] = False

    def __post_init__(self) -> None:
        _check_range(self.low_ppm, self.high_ppm)

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return f"{self.high_ppm:.3f} to {self.low_ppm:.3f} ppm taken in again"


@dataclass(frozen=True, slots=True, kw_only=True)
class MarkImpurity(_Edit):
    """Say that a stretch belongs to something else in the tube."""

    low_ppm: float
    high_ppm: float
    name: str = ""

    names_claims: ClassVar[bool] = False

    def __post_init__(self) -> None:
        _check_range(self.low_ppm, self.high_ppm)

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        what = self.name or "impurity"
        return f"{self.high_ppm:.3f} to {self.low_ppm:.3f} ppm marked as {what}"


@dataclass(frozen=True, slots=True, kw_only=True)
class SetIntegral(_Edit):
    """Say how many protons the signals of a stretch count.

    It scales the integrals of a spectrum alone; a ledger takes its scale from all
    of its claims.

    Attributes
    ----------
    low_ppm, high_ppm : float, ppm
    protons : float
        More than zero.
    """

    low_ppm: float
    high_ppm: float
    protons: float

    needs_solving: ClassVar[bool] = False
    names_claims: ClassVar[bool] = False

    def __post_init__(self) -> None:
        _check_range(self.low_ppm, self.high_ppm)
        if not 0 < self.protons < math.inf:
            raise ValueError(f"protons must be > 0, got {self.protons!r}")

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return (
            f"{self.high_ppm:.3f} to {self.low_ppm:.3f} ppm set to "
            f"{self.protons:g} protons"
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class SetReference(_Edit):
    """Say what the shift of one line is; the whole axis moves with it.

    Attributes
    ----------
    line_ppm : float, ppm
        Where the line stands now.
    to_ppm : float, ppm
        Where it belongs.
    """

    line_ppm: float
    to_ppm: float

    names_claims: ClassVar[bool] = False

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return f"line at {self.line_ppm:.4f} ppm set to {self.to_ppm:.4f} ppm"

    def change(self, project: Project) -> Project:
        """Project with the reference in its recipe moved; the evidence goes stale.

        Raises
        ------
        ValueError
            If there is no recipe yet that could be moved.
        """
        recipe = _recipe_in_use(project)
        if recipe is None:
            raise ValueError("SetReference: the spectrum has not been processed yet")
        return replace(project, recipe=_referenced(recipe, self))


@dataclass(frozen=True, slots=True, kw_only=True)
class SetRecipe(_Edit):
    """Process the spectrum with this recipe; None gives it back to the program."""

    recipe: Recipe | None
    what: str

    names_claims: ClassVar[bool] = False

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return self.what

    def change(self, project: Project) -> Project:
        """Project with the recipe; the evidence goes stale if it differs."""
        if self.recipe is None:
            return replace(project, recipe=None, evidence=None)
        return replace(project, recipe=self.recipe)


@dataclass(frozen=True, slots=True, kw_only=True)
class RenameLabel(_Edit):
    """Show a claim under another label, in the ledger and in every edit."""

    claim: str
    label: str

    needs_solving: ClassVar[bool] = False

    @property
    def description(self) -> str:
        """One phrase for the undo list and the audit trail."""
        return f"{self.claim} renamed {self.label}"

    def change(self, project: Project) -> Project:
        """Project with the label everywhere.

        Raises
        ------
        ValueError
            If the label is empty or taken, or there is no such claim.
        """
        return rename(project, self.claim, self.label)


Edit = (
    PinClaim
    | UnlinkClaim
    | ReleaseClaim
    | SwapClaims
    | FixCoupling
    | ReleaseCoupling
    | ExcludeRegion
    | IncludeRegion
    | MarkImpurity
    | SetIntegral
    | SetReference
    | SetRecipe
    | RenameLabel
)


def apply_edit(project: Project, edit: Edit, *, when: str) -> Project:
    """Project with one hand edit done and written into the audit trail.

    An edit that repeats the last one returns the project itself, so that a
    gesture without effect leaves no undo step.

    Parameters
    ----------
    project : Project
    edit : Edit
    when : str
        ISO 8601 time.

    Raises
    ------
    ValueError
        If the edit cannot be carried out; the text says why.
    """
    if project.edits and project.edits[-1] == edit:
        return project
    changed = edit.change(project)
    line = AuditLine(when=when, what=f"{edit.description}.", by_hand=True)
    return replace(changed, edits=(*changed.edits, edit), audit=(*changed.audit, line))


def _check_range(low_ppm: float, high_ppm: float) -> None:
    if not low_ppm < high_ppm:
        raise ValueError(
            f"low_ppm must be < high_ppm, got {low_ppm!r} and {high_ppm!r}"
        )


def _recipe_in_use(project: Project) -> Recipe | None:
    if project.recipe is not None:
        return project.recipe
    return None if project.evidence is None else project.evidence.recipe


def _referenced(recipe: Recipe, edit: SetReference) -> Recipe:
    move_ppm = edit.to_ppm - edit.line_ppm
    before = recipe.find(Reference)
    offset_ppm = before.offset_ppm if isinstance(before, Reference) else 0.0
    step = Reference(
        offset_ppm=offset_ppm + move_ppm,
        by="user",
        # 0.002 ppm: how well a line is set by hand (common practice).
        sd_ppm=0.002,
        line_ppm=edit.to_ppm,
        why=f"The line at {edit.line_ppm:.4f} ppm was set to {edit.to_ppm:.4f} by hand.",
    )
    others = tuple(one for one in recipe.steps if not isinstance(one, Reference))
    return Recipe(steps=(*others, step))
