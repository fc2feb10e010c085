"""Scenes that were made lately, so that undo and redo show at once."""

from __future__ import annotations

import threading
from dataclasses import dataclass

from spinledger.project.constraints import standing_constraints, standing_proton_area
from spinledger.project.document import Project
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import Ledger
from spinledger_app.lanes.scene import LaneScene
from spinledger_app.presenters.lanes import lane_scene

_MOST_KEPT = 5

_Ranges = tuple[tuple[float, float], ...]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class _Kept:
    evidence: Evidence
    ledger: Ledger | None
    excluded_ppm: _Ranges
    proton_area: float | None
    scene: LaneScene


class SceneStore:
    """Keeps the last scenes; may be filled from a background thread."""

    def __init__(self) -> None:
        self._kept: list[_Kept] = []
        self._lock = threading.Lock()

    def scene_of(self, project: Project) -> LaneScene | None:
        """Scene of a project, made now if it is not at hand."""
        if project.evidence is None:
            return None
        ledger = project.ledger
        if ledger is not None and ledger.evidence is not project.evidence:
            ledger = None  # of an older spectrum or another processing
        excluded = standing_constraints(project).excluded_ppm
        area = standing_proton_area(project) if ledger is None else None
        return self.prepare(project.evidence, ledger, excluded, area)

    def prepare(
        self,
        evidence: Evidence,
        ledger: Ledger | None,
        excluded_ppm: _Ranges = (),
        proton_area: float | None = None,
    ) -> LaneScene:
        """Scene of evidence and ledger, made if it is not at hand."""
        with self._lock:
            for kept in self._kept:
                if (
                    kept.evidence is evidence
                    and kept.ledger is ledger
                    and kept.excluded_ppm == excluded_ppm
                    and kept.proton_area == proton_area
                ):
                    self._kept.remove(kept)
                    self._kept.insert(0, kept)  # the one used last goes last
                    return kept.scene
            measured = next(
                (k.scene.measured for k in self._kept if k.evidence is evidence), None
            )
        scene = lane_scene(
            evidence,
            ledger,
            measured=measured,
            excluded_ppm=excluded_ppm,
            unit_area=proton_area,
        )
        kept = _Kept(
            evidence=evidence,
            ledger=ledger,
            excluded_ppm=excluded_ppm,
            proton_area=proton_area,
            scene=scene,
        )
        with self._lock:
            self._kept = [kept, *self._kept[: _MOST_KEPT - 1]]
        return scene
