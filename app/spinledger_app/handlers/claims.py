"""Claims and signals: put together, swap, type, drop."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import Qt

from spinledger.project.edits import (
    FixCoupling,
    ReleaseClaim,
    ReleaseCoupling,
    RenameLabel,
    UnlinkClaim,
)
from spinledger_app.handlers.context import Context
from spinledger_app.handlers.reference import ReferenceHandlers
from spinledger_app.presenters.gestures import (
    drop_root,
    entry_of,
    put_together,
    swap,
    swap_partner,
    typed_couplings,
)
from spinledger_app.presenters.wording import say
from spinledger_app.views import dialogs
from spinledger_app.views.published_list import PublishedListDialog


class ClaimHandlers:
    """What clicks and drags on claims and signals do."""

    def __init__(self, context: Context, reference: ReferenceHandlers) -> None:
        self.context, self.reference = context, reference
        self.window, self.bench = context.window, context.bench
        self.settings, self.look = context.settings, context.look

    def actions(self) -> dict[str, Callable[[], None]]:
        """Handlers by the names of the action table."""
        return {
            "put": self.put,
            "swap": self.swap,
            "unlink": self.unlink,
            "release": self.release,
            "rename": self.rename,
            "type_j": self.type_j,
            "free_j": self.free_j,
            "next_claim": self.next_claim,
            "previous_claim": self.previous_claim,
            "refine": self.refine,
            "let_go": self.let_go,
            "add_contender": self.add_contender,
            "side_evidence": self.side_evidence,
            "published_list": self.published_list,
            "n_contenders": self.set_n_contenders,
            "cancel": self.cancel,
        }

    def click_signal(self, key: str) -> None:
        """Take a signal up, or put a waiting claim to it."""
        selection, scene = self.bench.selection, self.bench.scene
        marks = selection.marks
        mark = scene.signal(key) if scene is not None and key else None
        if mark is None:
            selection.let_go()
        elif marks.waiting_claim is not None:
            claim = marks.waiting_claim
            selection.choose(None)
            self.bench.edit(put_together(mark, claim))
        elif marks.chosen_signal == key:
            selection.choose(None)
        else:
            if len(mark.claims) == 1:
                selection.select(mark.claims[0])
            if self.bench.project.ledger is not None:
                selection.choose(key)

    def click_claim(self, claim: str) -> None:
        """Select a claim, or put the chosen signal to it."""
        selection, scene = self.bench.selection, self.bench.scene
        marks = selection.marks
        mark = (
            scene.signal(marks.chosen_signal)
            if scene is not None and marks.chosen_signal is not None
            else None
        )
        is_known = entry_of(self.bench.project.ledger, claim) is not None
        if mark is not None and is_known and claim not in mark.claims:
            selection.choose(None)
            selection.select(claim)
            self.bench.edit(put_together(mark, claim))
        elif marks.selected == claim and mark is None:
            selection.select(None)
        else:
            selection.choose(None)
            selection.select(claim)

    def drop_root(self, claim: str, shift_ppm: float) -> None:
        """A tree's root was dropped along the axis."""
        scene = self.bench.scene
        if scene is not None:
            self.bench.selection.select(claim)
            self.bench.edit(drop_root(scene, claim, shift_ppm))

    def drop_branch(self, claim: str, level: int, j_hz: float) -> None:
        """A branch was dragged to another J."""
        scene = self.bench.scene
        tree = None if scene is None else scene.tree_of(claim)
        if tree is None or not 0 <= level < len(tree.levels):
            return
        partner = tree.levels[level].partner
        self.bench.selection.select(claim)
        self.bench.edit(FixCoupling(claim=claim, partner=partner, j_hz=round(j_hz, 3)))

    @property
    def _claim(self) -> str:
        return self.bench.selection.marks.selected or ""

    def put(self) -> None:
        """Let the selected claim wait for a signal."""
        self.bench.selection.wait_for_signal(self._claim)
        self.window.lanes.setFocus(Qt.FocusReason.OtherFocusReason)

    def swap(self) -> None:
        """Exchange the selected claim with its partner."""
        ledger = self.bench.project.ledger
        partner = swap_partner(ledger, self._claim) if ledger is not None else None
        edit = swap(ledger, self._claim, partner) if ledger and partner else None
        if edit is not None:
            self.bench.edit(edit)
        else:
            self.window.status.show_message(
                say("{0} has no partner to exchange with.").replace("{0}", self._claim),
                is_error=True,
            )

    def unlink(self) -> None:
        """Take the selected claim off its signal."""
        self.bench.edit(UnlinkClaim(claim=self._claim))

    def release(self) -> None:
        """Give the selected claim back to the program."""
        self.bench.edit(ReleaseClaim(claim=self._claim))

    def rename(self) -> None:
        """Ask for another label."""
        text = dialogs.ask_text(
            self.look, self.window, say("Rename"), say("Label"), self._claim
        )
        if text:
            claim = self._claim
            self.bench.selection.select(None)
            self.bench.edit(RenameLabel(claim=claim, label=text))

    def type_j(self) -> None:
        """Open the field over the selected row's J values."""
        row = self.window.ledger.row_of(self._claim)
        if row is not None:
            row.edit_couplings()

    def free_j(self) -> None:
        """Let the fit find the selected claim's couplings again."""
        held = {
            (edit.claim, edit.partner)
            for edit in self.bench.project.edits
            if isinstance(edit, FixCoupling)
        }
        mine = [pair for pair in held if self._claim in pair]
        edits = [ReleaseCoupling(claim=a, partner=b) for a, b in sorted(mine)]
        self.bench.edit_all(edits)

    def take_couplings(self, claim: str, text: str) -> None:
        """Take J values that were typed in a row."""
        entry = entry_of(self.bench.project.ledger, claim)
        if entry is None:
            return
        try:
            edits = typed_couplings(entry, text)
        except ValueError as error:
            self.window.status.show_message(str(error), is_error=True)
            return
        label = say("J of {0} typed").replace("{0}", claim)
        self.bench.edit_all(edits, label)

    def take_shift(self, claim: str, text: str) -> None:
        """Take a shift that was typed in a row."""
        scene = self.bench.scene
        try:
            shift = float(text.replace("−", "-").replace(",", "."))
        except ValueError:
            self.window.status.show_message(
                say("A shift is a number in ppm."), is_error=True
            )
            return
        if scene is not None:
            self.bench.edit(drop_root(scene, claim, shift))

    def next_claim(self) -> None:
        """Select the next claim."""
        self._step_claim(1)

    def previous_claim(self) -> None:
        """Select the claim before."""
        self._step_claim(-1)

    def _step_claim(self, by: int) -> None:
        rows = [row.claim for row in self.window.ledger.rows]
        if rows:
            now = self.bench.selection.marks.selected
            index = rows.index(now) + by if now in rows else (0 if by > 0 else -1)
            self.bench.selection.select(rows[index % len(rows)])

    def refine(self) -> None:
        """Solve the ledger in full."""
        self.bench.refine()

    def let_go(self) -> None:
        """Let go of the last thing that was begun: a strip, a region, a choice."""
        lanes = self.window.lanes
        if self.reference.hand.is_active:
            self.reference.leave()
        elif self.window.phase_strip.isVisible():
            self.window.phase_strip.given_up.emit()
        elif lanes.overlays or self.window.field_strip.isVisible():
            self.window.field_strip.given_up.emit()
        elif lanes.region_ppm is not None:
            lanes.region_ppm = None
            lanes.update()
        else:
            self.bench.selection.let_go()

    def add_contender(self) -> None:
        """Ask for another structure to test beside the claimed one."""
        text = dialogs.ask_text(
            self.look, self.window, say("Add a contender"), say("SMILES or InChI")
        )
        if text:
            self.bench.add_contender(text)

    def set_n_contenders(self) -> None:
        """Ask how many isomers are enumerated and tested."""
        now = self.bench.project.options.n_contenders
        number = dialogs.ask_whole(
            self.look,
            self.window,
            say("Isomers to test"),
            say("How many close isomers are tested; empty leaves it to the program"),
            "" if now is None else str(now),
        )
        if number is not None:
            self.bench.set_n_contenders(number if number >= 0 else None)

    def side_evidence(self) -> None:
        """Ask for carbon list, HSQC and COSY pairs."""
        now = self.bench.project.options.side_text
        dialog = dialogs.SideDialog(self.look, now, self.window)
        if dialog.exec():
            self.bench.set_side_text(dialog.text())

    def published_list(self) -> None:
        """Put a pasted proton list beside the ledger."""
        ledger = self.bench.project.ledger
        if ledger is not None:
            PublishedListDialog(self.look, ledger, self.window).open()

    def cancel(self) -> None:
        """Stop what runs."""
        self.bench.cancel()
