"""What the hand edits ask of match and fit, after replaying them in order.

Shifts in ppm, couplings in Hz.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace
from functools import partial

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
    SetIntegral,
    SwapClaims,
    UnlinkClaim,
)
from spinledger.project.labels import automatic_label
from spinledger.reconcile.options import (
    Constraints,
    DeclaredImpurity,
    FixedCoupling,
    Pin,
    ReconcileOptions,
)
from spinledger.reconcile.side_reading import read_side_evidence

Range = tuple[float, float]


class _Standing:
    """The wishes that stand while the edits are replayed."""

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


def standing_constraints(project: Project) -> Constraints:
    """Constraints that stand after replaying the hand edits in order.

    Parameters
    ----------
    project : Project

    Returns
    -------
    Constraints
        Claims by the labels the program gives them, whatever is shown.
    """
    standing = _Standing()
    for edit in project.edits:
        _replay(standing, edit)
    automatic = partial(automatic_label, project)
    return Constraints(
        pins=tuple(
            Pin(claim=automatic(name), low_ppm=pin.low_ppm, high_ppm=pin.high_ppm)
            for name, pin in standing.claims.items()
            if pin is not None
        ),
        absent=tuple(
            automatic(name) for name, pin in standing.claims.items() if pin is None
        ),
        fixed_couplings=tuple(
            FixedCoupling(
                claim=automatic(one.claim),
                partner=automatic(one.partner),
                j_hz=one.j_hz,
            )
            for one in standing.couplings.values()
        ),
        excluded_ppm=tuple(standing.excluded),
        impurities=tuple(_declared(one) for one in standing.impurities),
    )


def standing_proton_area(project: Project) -> float | None:
    """Area of one proton by the last integral that was set by hand.

    Signals count whose middle lies in the stretch; None where none was set, or
    the spectrum has no signal there.
    """
    evidence = project.evidence
    mine = [edit for edit in project.edits if isinstance(edit, SetIntegral)]
    if evidence is None or not mine:
        return None
    last = mine[-1]
    area = sum(
        signal.area
        for signal in evidence.signals
        if last.low_ppm <= (signal.low_ppm + signal.high_ppm) / 2 <= last.high_ppm
    )
    return area / last.protons if area > 0 else None


def reconcile_options(project: Project) -> ReconcileOptions:
    """Options of a reconciliation as the project asks for it.

    Raises
    ------
    SideEvidenceError
        If the side evidence cannot be understood.
    """
    options = project.options
    constraints = standing_constraints(project)
    if options.side_text.strip():
        side = read_side_evidence(options.side_text)
        constraints = replace(constraints, side=side)
    return ReconcileOptions(
        ph=options.ph,
        temperature_k=options.temperature_k,
        species=options.species,
        companions=options.companions,
        contenders=options.contenders,
        n_contenders=options.n_contenders,
        quick=options.is_quick,
        constraints=constraints,
    )


def _declared(edit: MarkImpurity) -> DeclaredImpurity:
    why = f"{edit.name}, declared by hand" if edit.name else "declared by hand"
    return DeclaredImpurity(low_ppm=edit.low_ppm, high_ppm=edit.high_ppm, why=why)


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
