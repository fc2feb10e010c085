"""Scenes that were made lately, so that undo and redo show at once."""

from __future__ import annotations

import threading
from dataclasses import dataclass

from spinledger.project.constraints import standing_constraints
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
        return self.prepare(project.evidence, ledger, excluded)

    def prepare(
        self,
        evidence: Evidence,
        ledger: Ledger | None,
        excluded_ppm: _Ranges = (),
    ) -> LaneScene:
        """Scene of evidence and ledger, made if it is not at hand."""
        with self._lock:
            for kept in self._kept:
                if (
                    kept.evidence is evidence
                    and kept.ledger is ledger
                    and (kept.excluded_ppm == excluded_ppm)
                ):
                    self._kept.remove(kept)
                    self._kept.insert(0, kept)  # the one used last goes last
                    return kept.scene
            measured = next(
                (k.scene.measured for k in self._kept if k.evidence is evidence), None
            )
        scene = lane_scene(
            evidence, ledger, measured=measured, excluded_ppm=excluded_ppm
        )
        kept = _Kept(
            evidence=evidence, ledger=ledger, excluded_ppm=excluded_ppm, scene=scene
        )
        with self._lock:
            self._kept = [kept, *self._kept[: _MOST_KEPT - 1]]
        return scene
