"""Reference by click: a line of the spectrum is set to its known shift."""

from __future__ import annotations

from spinledger.processing.solvents import residual_lines
from spinledger.project.edits import SetReference
from spinledger_app.handlers.context import Context
from spinledger_app.presenters.wording import say
from spinledger_app.views.reference_hand import ReferenceHand

# Known shifts further off than this are not what was clicked (common practice).
_SUGGEST_WITHIN_PPM = 0.5
_TMS_PPM = 0.0


def suggested_ppm(line_ppm: float, solvent: str | None) -> float:
    """Known shift nearest to a line, of TMS or the solvent; else its own place."""
    known = [_TMS_PPM, *(one.shift_ppm for one in residual_lines(solvent))]
    nearest = min(known, key=lambda ppm: abs(ppm - line_ppm))
    return nearest if abs(nearest - line_ppm) <= _SUGGEST_WITHIN_PPM else line_ppm


class ReferenceHandlers:
    """Asks for a line by click and for its shift in place."""

    def __init__(self, context: Context) -> None:
        self.window, self.bench = context.window, context.bench
        self.hand = ReferenceHand(self.window.lanes)
        self.hand.line_chosen.connect(self._ask)
        self.hand.missed.connect(self._tell_missed)
        self.hand.typed.connect(self._take)
        self.hand.given_up.connect(self.leave)
        self.bench.session.project_changed.connect(lambda *_: self.hand.leave())

    def begin(self) -> None:
        """Wait for the click at a line, or take that of the marked region."""
        if self.bench.project.evidence is None:
            return
        self.hand.begin()
        region = self.window.lanes.region_ppm
        if region is not None:
            self.hand.choose_near(sum(region) / 2)
            return
        self.window.status.show_message(
            say("Click the line whose shift is known. Esc lets go.")
        )

    def leave(self) -> None:
        """Ask no longer."""
        self.hand.leave()
        self.window.lanes.setFocus()

    def _ask(self, line_ppm: float) -> None:
        evidence = self.bench.project.evidence
        if evidence is not None:
            self.hand.ask(line_ppm, suggested_ppm(line_ppm, evidence.solvent))

    def _tell_missed(self) -> None:
        self.window.status.show_message(
            say("There is no line there; click nearer to one, or zoom in."),
            is_error=True,
        )

    def _take(self, line_ppm: float, text: str) -> None:
        try:
            value = float(text.replace("−", "-").replace(",", "."))
        except ValueError:
            self.window.status.show_message(
                say("A shift is a number in ppm."), is_error=True
            )
            return
        self.leave()
        self.bench.edit(SetReference(line_ppm=line_ppm, to_ppm=value))
