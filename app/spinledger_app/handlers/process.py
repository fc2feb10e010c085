"""Processing by hand, and regions of the spectrum."""

from __future__ import annotations

from collections.abc import Callable

from spinledger.project.edits import (
    ExcludeRegion,
    IncludeRegion,
    MarkImpurity,
    SetIntegral,
)
from spinledger_app.handlers.context import Context
from spinledger_app.handlers.phasing import PhaseHandlers
from spinledger_app.handlers.reference import ReferenceHandlers
from spinledger_app.presenters.wording import say
from spinledger_app.views import dialogs
from spinledger_app.views.line_list import LineListDialog


class ProcessHandlers:
    """What the Process menu and the chips do."""

    def __init__(self, context: Context) -> None:
        self.context = context
        self.window, self.bench = context.window, context.bench
        self.settings, self.look = context.settings, context.look
        self.phasing = PhaseHandlers(context)
        self.reference = ReferenceHandlers(context)

    def actions(self) -> dict[str, Callable[[], None]]:
        """Handlers by the names of the action table."""
        return {
            "solvent": self.solvent,
            "phase": self.phasing.begin,
            "window": self.apodization,
            "automatic": self.automatic,
            "reference": self.reference.begin,
            "exclude": self.exclude,
            "include": self.include,
            "impurity": self.impurity,
            "integral": self.integral,
            "line_list": self.line_list,
        }

    def solvent(self) -> None:
        """Ask for the solvent."""
        evidence = self.bench.project.evidence
        if evidence is None:
            return
        chosen = dialogs.ask_solvent(self.look, self.window, evidence)
        if chosen is not None:
            self.bench.set_solvent(chosen or None)

    def apodization(self) -> None:
        """Change the window of the FID."""
        evidence = self.bench.project.evidence
        if evidence is None:
            return
        dialog = dialogs.WindowDialog(self.look, evidence.recipe, self.window)
        if not dialog.can_change:
            self.window.status.show_message(
                say("This spectrum came processed; there is no such step to change."),
                is_error=True,
            )
        elif dialog.exec():
            recipe = dialog.recipe()
            if recipe != evidence.recipe:
                self.bench.set_recipe(recipe, dialog.what())

    def automatic(self) -> None:
        """Give the processing back to the program."""
        self.bench.set_recipe(None, say("processed automatically again"))

    def _region(self) -> tuple[float, float] | None:
        """The marked region, else the signal that is chosen or pointed at."""
        lanes, scene = self.window.lanes, self.bench.scene
        if lanes.region_ppm is not None:
            return lanes.region_ppm
        marks = self.bench.selection.marks
        key = marks.chosen_signal or marks.hovered_signal
        mark = scene.signal(key) if scene is not None and key else None
        if mark is None:
            self.window.status.show_message(
                say("Drag over a region, or click a signal first."), is_error=True
            )
            return None
        return mark.low_ppm, mark.high_ppm

    def exclude(self) -> None:
        """Leave a region out."""
        region = self._region()
        if region is not None:
            self.bench.selection.choose(None)
            self.bench.edit(ExcludeRegion(low_ppm=region[0], high_ppm=region[1]))

    def include(self) -> None:
        """Take a region in again."""
        region = self._region()
        if region is not None:
            self.bench.edit(IncludeRegion(low_ppm=region[0], high_ppm=region[1]))

    def impurity(self) -> None:
        """Mark a region as something else in the tube."""
        region = self._region()
        if region is None:
            return
        name = dialogs.ask_text(
            self.look, self.window, say("Impurity"), say("What is it? May stay empty.")
        )
        if name is not None:
            self.bench.selection.choose(None)
            self.bench.edit(
                MarkImpurity(low_ppm=region[0], high_ppm=region[1], name=name)
            )

    def integral(self) -> None:
        """Say how many protons a signal or the marked region counts."""
        region = self._region()
        if region is None:
            return
        if self.bench.project.ledger is not None:
            self.window.status.show_message(
                say("The ledger takes the scale of the integrals from all its claims."),
                is_error=True,
            )
            return
        text = dialogs.ask_text(
            self.look,
            self.window,
            say("Integral"),
            say("How many protons the signal counts"),
            "1",
        )
        if text is None:
            return
        try:
            edit = SetIntegral(
                low_ppm=region[0],
                high_ppm=region[1],
                protons=float(text.replace(",", ".")),
            )
        except ValueError:
            self.window.status.show_message(
                say("The number of protons is a number above zero."), is_error=True
            )
            return
        self.bench.edit(edit)

    def line_list(self) -> None:
        """Show every line of the spectrum."""
        evidence = self.bench.project.evidence
        if evidence is not None:
            LineListDialog(self.look, evidence, self.window).open()

    def open_chip(self, step: int) -> None:
        """Open what a chip of the recipe lets one change."""
        evidence = self.bench.project.evidence
        if evidence is None or step < 0:
            self.solvent()
            return
        name = type(evidence.recipe.steps[step]).__name__
        handler = {
            "Phase": self.phasing.begin,
            "Apodize": self.apodization,
            "Reference": self.reference.begin,
        }.get(name)
        if handler is not None:
            handler()
        else:
            self.window.status.show_message(
                say("This step has nothing to set by hand.")
            )
