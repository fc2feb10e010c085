"""Menus at the mouse: of a claim, of the lanes, of a contender."""

from __future__ import annotations

from PySide6.QtCore import QPoint
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import QMenu

from spinledger_app.handlers.context import Context
from spinledger_app.handlers.overlays import OverlayHandlers
from spinledger_app.lanes.targets import Target
from spinledger_app.presenters.wording import say

_CLAIM = ("look_at_claim", "", "put", "swap", "unlink", "release", "")
_CLAIM_MORE = ("type_j", "free_j", "rename")
_LANES = ("exclude", "include", "impurity", "integral", "reference", "")
_LANES_MORE = ("fold", "home", "back", "", "copy_picture")
_SKETCH = ("paste", "open_structure", "type_structure")


class MenuHandlers:
    """Pops menus up; their entries are those of the action table."""

    def __init__(self, context: Context, overlays: OverlayHandlers) -> None:
        self.context, self.overlays = context, overlays
        self.window, self.bench = context.window, context.bench

    def _pop_up(self, names: tuple[str, ...], place: QPoint) -> None:
        menu = QMenu(self.window)
        for name in names:
            if name:
                menu.addAction(self.window.actions_by_name[name])
            else:
                menu.addSeparator()
        menu.popup(place)

    def of_claim(self, claim: str, place: QPoint) -> None:
        """Menu of a claim, or of the sketch where there is none."""
        if not claim:
            self._pop_up(_SKETCH, place)
            return
        self.bench.selection.select(claim)
        self._pop_up((*_CLAIM, *_CLAIM_MORE), place)

    def of_lanes(self, target: Target, ppm: float | None, place: QPoint) -> None:
        """Menu of what lies under the mouse in the lanes."""
        self.context.last_ppm = ppm
        if target.claim is not None and target.kind in ("root", "branch", "tree"):
            self.of_claim(target.claim, place)
            return
        self.bench.selection.hover(target.claim, target.signal)
        self._pop_up((*_LANES, *_LANES_MORE), place)

    def of_contender(self, smiles: str) -> None:
        """Menu of a contender."""
        menu = QMenu(self.window)
        take = menu.addAction(say("Claim this structure instead"))
        take.triggered.connect(lambda: self.bench.take_structure(smiles))
        added = {one.smiles for one in self.bench.project.options.contenders}
        if smiles in added:
            drop = menu.addAction(say("Test it no longer"))
            drop.triggered.connect(lambda: self.bench.drop_contender(smiles))
        tick = menu.addAction(say("List it in the report"))
        tick.setCheckable(True)
        tick.setChecked(smiles in self.bench.project.ticked)
        tick.triggered.connect(lambda on: self.bench.tick_contender(smiles, on))
        lay = menu.addAction(say("Lay over the spectrum"))
        ledger = self.bench.project.ledger
        names = {} if ledger is None else {c.smiles: c.name for c in ledger.contenders}
        name = names.get(smiles) or smiles
        lay.triggered.connect(lambda: self.overlays.compare(smiles, name))
        copy = menu.addAction(say("Copy SMILES"))
        copy.triggered.connect(lambda: QGuiApplication.clipboard().setText(smiles))
        menu.popup(self.window.cursor().pos())
