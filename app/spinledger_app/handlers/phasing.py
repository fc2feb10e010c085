"""The phase set by hand: live on the lanes, one undo step once it is taken."""

from __future__ import annotations

from spinledger.values.evidence import Evidence
from spinledger.values.recipe import Phase
from spinledger_app.handlers.context import Context
from spinledger_app.presenters.phasing import PhaseSetting, PhaseTrial, with_setting
from spinledger_app.presenters.wording import number, say
from spinledger_app.views.phase_strip import PhaseHand


class PhaseHandlers:
    """Begins, follows and ends setting the phase."""

    def __init__(self, context: Context) -> None:
        self.window, self.bench = context.window, context.bench
        self._trial: PhaseTrial | None = None
        self._evidence: Evidence | None = None
        self._setting: PhaseSetting | None = None
        self.hand = PhaseHand(self.window.lanes)
        strip = self.window.phase_strip
        self.hand.turned.connect(self._turn)
        self.hand.pivoted.connect(self._pivot)
        strip.setting_typed.connect(self._take_typed)
        strip.taken.connect(self.take)
        strip.given_up.connect(self.leave)
        self.bench.session.project_changed.connect(lambda *_: self._check())

    def begin(self) -> None:
        """Let the phase be dragged; the pivot starts at the tallest line."""
        evidence = self.bench.project.evidence
        if evidence is None:
            return
        if not isinstance(evidence.recipe.find(Phase), Phase):
            self.window.status.show_message(
                say("This spectrum came processed; there is no such step to change."),
                is_error=True,
            )
            return
        self._evidence = evidence
        self._trial = PhaseTrial(evidence)
        place = self._trial.place_of(self._trial.tallest_ppm())
        self._setting = self._trial.start.pivoted(place)
        self.hand.is_active = True
        self.window.phase_strip.show()
        self.window.phase_strip.phase0.setFocus()
        self.window.status.show_message(
            say("Drag up or down: zero order. Shift: first order. Click: pivot.")
        )
        self._show()

    def take(self) -> None:
        """Process with the phase as it stands, as one undo step."""
        setting, evidence = self._setting, self._evidence
        is_changed = self._trial is not None and setting != self._trial.start
        self._end()
        if setting is None or evidence is None or not is_changed:
            return
        what = (
            say("phase {0}°, {1}°")
            .replace("{0}", number(setting.phase0_deg, 1))
            .replace("{1}", number(setting.phase1_deg, 1))
        )
        self.bench.set_recipe(with_setting(evidence.recipe, setting), what)

    def leave(self) -> None:
        """Leave the phase as it was."""
        self._end()
        self.window.status.show_message(say("The phase was left as it was."))

    def _end(self) -> None:
        self._trial = self._setting = self._evidence = None
        self.hand.is_active = False
        self.window.phase_strip.hide()
        self.window.lanes.show_trial(None, None)

    def _check(self) -> None:
        """End where the spectrum is another one now."""
        if self._trial is not None and (
            self.bench.project.evidence is not self._evidence
        ):
            self._end()

    def _turn(self, phase0_deg: float, phase1_deg: float) -> None:
        if self._setting is not None:
            self._setting = self._setting.turned(phase0_deg, phase1_deg)
            self._show()

    def _pivot(self, shift_ppm: float) -> None:
        if self._setting is not None and self._trial is not None:
            self._setting = self._setting.pivoted(self._trial.place_of(shift_ppm))
            self._show()

    def _take_typed(self, phase0_deg: float, phase1_deg: float) -> None:
        if self._setting is not None:
            self._setting = PhaseSetting(
                phase0_deg=phase0_deg, phase1_deg=phase1_deg, pivot=self._setting.pivot
            )
            self._show()

    def _show(self) -> None:
        trial, setting = self._trial, self._setting
        if trial is None or setting is None:
            return
        pivot_ppm = trial.shift_of(setting.pivot)
        self.window.phase_strip.show_setting(setting, pivot_ppm)
        self.window.lanes.show_trial(trial.trace(setting), pivot_ppm)
