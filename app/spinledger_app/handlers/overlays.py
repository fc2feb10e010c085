"""Other spectra over the evidence: a contender's, or the claims at another field."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt
from PySide6.QtCore import QTimer

from spinledger.project.constraints import reconcile_options
from spinledger_app import tasks
from spinledger_app.handlers.context import Context
from spinledger_app.lanes.overlay_layer import N_OVERLAYS
from spinledger_app.lanes.pyramid import Pyramid
from spinledger_app.lanes.scene import Trace
from spinledger_app.presenters.what_if import WhatIf, what_if
from spinledger_app.presenters.wording import say

_ASK_AFTER_MS = 40


class OverlayHandlers:
    """Asks for a spectrum elsewhere and lays it over the evidence."""

    def __init__(self, context: Context) -> None:
        self.window, self.bench = context.window, context.bench
        self._asked: WhatIf | None = None
        self._compared: dict[str, Trace] = {}
        self._field_mhz = 0.0
        self._timer = QTimer(self.window)
        self._timer.setSingleShot(True)
        self._timer.setInterval(_ASK_AFTER_MS)
        self._timer.timeout.connect(self._ask_field)
        strip = self.window.field_strip
        strip.field_wanted.connect(self._take_field)
        strip.given_up.connect(self.leave)
        self.bench.session.project_changed.connect(lambda *_: self.leave())

    def actions(self) -> dict[str, Callable[[], None]]:
        """Handlers by the names of the action table."""
        return {"what_if": self.begin_field, "no_overlay": self.leave}

    def begin_field(self) -> None:
        """Open the slider at the spectrum's own field."""
        ledger = self.bench.project.ledger
        self._asked = None if ledger is None else what_if(ledger)
        if ledger is None or self._asked is None:
            self.window.status.show_message(
                say("There is no model of the spectrum yet."), is_error=True
            )
            return
        frequency = ledger.evidence.spectrum.spectrometer_frequency_mhz
        strip = self.window.field_strip
        strip.show_field(frequency)
        strip.show()
        strip.slider.setFocus()
        self._take_field(frequency)

    def _take_field(self, frequency_mhz: float) -> None:
        self._field_mhz = frequency_mhz
        self._timer.start()

    def _ask_field(self) -> None:
        asked = self._asked
        if asked is None:
            return
        self.bench.pool.run(
            tasks.claims_at_field,
            asked,
            self._field_mhz,
            done=self._lay,
            failed=self._fail,
            lane="overlay",
            is_quiet=True,
            prepare=self._trace_of,
        )

    def compare(self, smiles: str, name: str) -> None:
        """Fit a contender quickly and lay its model over the evidence.

        Two may lie there together; a third takes the place of the older one.
        """
        project = self.bench.project
        if project.evidence is None:
            return

        def done(trace: Trace) -> None:
            self.window.field_strip.hide()
            others = {key: old for key, old in self._compared.items() if key != name}
            kept = list(others.items())[-(N_OVERLAYS - 1) :]
            self._compared = {**dict(kept), name: trace}
            self.window.lanes.show_overlays(*self._compared.values())
            self.window.status.show_message(self._compared_words())

        self.window.status.show_message(say("Fitting {0} …").replace("{0}", name))
        self.bench.pool.run(
            tasks.model_of,
            project.evidence,
            smiles,
            reconcile_options(project),
            done=done,
            failed=self._fail,
            lane="overlay",
            prepare=self._trace_of,
        )

    def _compared_words(self) -> str:
        names = list(self._compared)
        words = (
            say("{0} lies over the spectrum; Esc takes it away.")
            if len(names) == 1
            else say("{0} (solid) and {1} (dashed) lie over the spectrum.")
        )
        for place, name in enumerate(names):
            words = words.replace(f"{{{place}}}", name)
        return words

    def leave(self) -> None:
        """Take the overlays away."""
        self._timer.stop()
        self._asked = None
        self._compared = {}
        self.bench.pool.cancel("overlay")
        self.window.field_strip.hide()
        self.window.lanes.show_overlays()

    def _trace_of(self, values: npt.NDArray[np.float64]) -> Trace:
        evidence = self.bench.project.evidence
        assert evidence is not None
        return Trace(
            pyramid=Pyramid(values),
            first_point_ppm=evidence.spectrum.first_point_ppm,
            step_ppm=evidence.spectrum.step_ppm,
        )

    def _lay(self, trace: Trace) -> None:
        self._compared = {}
        self.window.lanes.show_overlays(trace)

    def _fail(self, sentence: str) -> None:
        self.window.status.show_message(sentence, is_error=True)
