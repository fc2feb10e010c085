"""What the hand edits ask of match and fit, after replaying them in order.

Shifts in ppm, couplings in Hz.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from spinledger.project.document import Project
from spinledger.project.edits import (
    Edit,
    ExcludeRegion,
    FixCoupling,
    IncludeRegion,
    MarkImpurity,
    PinClaim,
    ReleaseClaim,
    ReleaseCoupling,
    SwapClaims,
    UnlinkClaim,
)

Range = tuple[float, float]


@dataclass(frozen=True, slots=True, kw_only=True)
class Constraints:
    """The standing wishes of the user; later edits have replaced earlier ones.

    Attributes
    ----------
    pins : tuple of PinClaim
        One per pinned claim.
    absent : tuple of str
        Claims said to be not found.
    couplings : tuple of FixCoupling
        One per held coupling.
    excluded_ppm : tuple of (low_ppm, high_ppm)
    impurities : tuple of MarkImpurity
    """

    pins: tuple[PinClaim, ...] = ()
    absent: tuple[str, ...] = ()
    couplings: tuple[FixCoupling, ...] = ()
    excluded_ppm: tuple[Range, ...] = ()
    impurities: tuple[MarkImpurity, ...] = ()

    @property
    def is_empty(self) -> bool:
        """Nothing is asked for."""
        return self == Constraints()


class _Standing:
    """The wishes while the edits are replayed."""

    def __init__(self) -> None:
        self.claims: dict[str, PinClaim | None] = {}
        self.couplings: dict[frozenset[str], FixCoupling] = {}
        self.excluded: list[Range] = []
        self.impurities: list[MarkImpurity] = []

    def pin(self, edit: PinClaim) -> None:
        self.claims[edit.claim] = edit

    def unlink(self, edit: UnlinkClaim) -> None:
        self.claims[edit.claim] = None

    def release(self, edit: ReleaseClaim) -> None:
        self.claims.pop(edit.claim, None)

    def swap(self, edit: SwapClaims) -> None:
        self.pin(edit.first)
        self.pin(edit.second)

    def fix(self, edit: FixCoupling) -> None:
        self.couplings[frozenset((edit.claim, edit.partner))] = edit

    def free(self, edit: ReleaseCoupling) -> None:
        self.couplings.pop(frozenset((edit.claim, edit.partner)), None)

    def exclude(self, edit: ExcludeRegion) -> None:
        self.excluded.append((edit.low_ppm, edit.high_ppm))

    def include(self, edit: IncludeRegion) -> None:
        self.excluded = [one for one in self.excluded if not _touch(one, edit)]
        self.impurities = [
            one
            for one in self.impurities
            if not _touch((one.low_ppm, one.high_ppm), edit)
        ]

    def mark(self, edit: MarkImpurity) -> None:
        self.impurities.append(edit)


def constraints(project: Project) -> Constraints:
    """Standing constraints of a project, its edits replayed in order.

    Parameters
    ----------
    project : Project

    Returns
    -------
    Constraints
        Claims are named as shown.
    """
    standing = _Standing()
    for edit in project.edits:
        _replay(standing, edit)
    return Constraints(
        pins=tuple(pin for pin in standing.claims.values() if pin is not None),
        absent=tuple(name for name, pin in standing.claims.items() if pin is None),
        couplings=tuple(standing.couplings.values()),
        excluded_ppm=tuple(standing.excluded),
        impurities=tuple(standing.impurities),
    )


def _replay(standing: _Standing, edit: Edit) -> None:
    steps: Mapping[type, Callable[..., None]] = {
        PinClaim: standing.pin,
        UnlinkClaim: standing.unlink,
        ReleaseClaim: standing.release,
        SwapClaims: standing.swap,
        FixCoupling: standing.fix,
        ReleaseCoupling: standing.free,
        ExcludeRegion: standing.exclude,
        IncludeRegion: standing.include,
        MarkImpurity: standing.mark,
    }
    step = steps.get(type(edit))
    if step is not None:  # the others have changed the project already
        step(edit)


def _touch(stretch: Range, edit: IncludeRegion) -> bool:
    return stretch[0] < edit.high_ppm and edit.low_ppm < stretch[1]
