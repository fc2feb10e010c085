"""Theme, text size, folding, and going about the axis."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication

from spinledger_app.handlers.context import Context
from spinledger_app.lanes.layout import DEFAULT_SHARES
from spinledger_app.presenters.line_list import region_text
from spinledger_app.presenters.wording import say
from spinledger_app.theme import DARK, HIGH_CONTRAST, LIGHT
from spinledger_app.views import dialogs


class ViewHandlers:
    """What the View and Help menus do."""

    def __init__(self, context: Context) -> None:
        self.context = context
        self.window, self.bench = context.window, context.bench
        self.settings, self.look = context.settings, context.look

    def actions(self) -> dict[str, Callable[[], None]]:
        """Handlers by the names of the action table."""
        return {
            "look_at_claim": self.look_at_claim,
            "fold": self.fold,
            "own_gains": self.own_gains,
            "integrals": self.integrals,
            "home": self.home,
            "back": self.back,
            "default_sizes": self.default_sizes,
            "left_panels": self.left_panels,
            "language_en": lambda: self.take_language("en"),
            "language_de": lambda: self.take_language("de"),
            "keys": self.keys,
            "about": self.about,
        }

    def take_theme(self, name: str) -> None:
        """Show another theme; "desktop" follows the desktop."""
        if name == "desktop":
            scheme = QGuiApplication.styleHints().colorScheme()
            name = "dark" if scheme == Qt.ColorScheme.Dark else "light"
        tokens = {"dark": DARK, "high contrast": HIGH_CONTRAST}.get(name, LIGHT)
        self.look.tokens = tokens
        self.window.show_look()
        self.context.show_view()

    def take_text_scale(self, scale: float) -> None:
        """Show another text size."""
        self.settings.text_scale = scale
        self.look.set_text_scale(scale)
        self.window.show_look()
        self.window.reset_sizes()
        self.context.show_all()

    def go_to_ppm(self, ppm: float) -> None:
        """Look at the signal at a shift, or go there."""
        lanes, scene = self.window.lanes, self.bench.scene
        if lanes.camera is None or scene is None:
            return
        mark = scene.signal_at(ppm)
        if mark is not None:
            lanes.zoom_to(mark.low_ppm, mark.high_ppm)
        elif lanes.camera.map.x_of(ppm) is not None and not lanes.camera.is_at_home:
            camera = lanes.camera
            lanes.go_to(replace(camera, map=camera.map.centred_on(ppm)))
        else:
            lanes.zoom_to(ppm - 0.15, ppm + 0.15)

    def go_to_window(self, low: float, high: float) -> None:
        """Look at a part of the axis."""
        lanes = self.window.lanes
        if lanes.camera is not None and high - low > 1e-3:
            lanes.fit_gain(low, high)
            lanes.go_to(lanes.camera.on_window(low, high))

    def look_at_signal(self, key: str) -> None:
        """Look at one signal."""
        scene = self.bench.scene
        mark = None if scene is None else scene.signal(key)
        if mark is not None:
            self.window.lanes.zoom_to(mark.low_ppm, mark.high_ppm)

    def look_at_claim(self) -> None:
        """Zoom to the selected claim."""
        scene, claim = self.bench.scene, self.bench.selection.marks.selected
        tree = scene.tree_of(claim) if scene is not None and claim else None
        if tree is not None:
            tips = [leaf.tip_ppm for leaf in tree.leaves] or [tree.root_ppm]
            self.window.lanes.zoom_to(min(tips), max(tips))

    def fold(self) -> None:
        """Go between the folded and the continuous axis; remembered."""
        is_folded = not self.window.lanes.is_folded
        self.settings.folds_when_solved = is_folded
        self.window.lanes.set_folded(is_folded)
        self.context.show_view()

    def own_gains(self) -> None:
        """Give every stretch its own gain, or all the same."""
        self.window.lanes.set_own_gains(not self.window.lanes.has_own_gains)

    def integrals(self) -> None:
        """Show or hide the integral curves."""
        is_shown = not self.window.lanes.shows_integrals
        self.settings.shows_integrals = is_shown
        self.window.lanes.set_integrals(is_shown)

    def home(self) -> None:
        """All of the axis."""
        self.window.lanes.go_home()

    def back(self) -> None:
        """The view before."""
        self.window.lanes.go_back()

    def default_sizes(self) -> None:
        """Panels and lanes at their default sizes."""
        self.window.lanes.set_shares(DEFAULT_SHARES)
        self.window.reset_sizes()

    def left_panels(self) -> None:
        """Fold the left panels to a rail, or open them; remembered."""
        is_folded = not self.window.left_column.is_folded
        self.settings.folds_left = is_folded
        self.window.fold_left(is_folded)
        if not is_folded:
            self.window.sketch.canvas.setFocus(Qt.FocusReason.OtherFocusReason)

    def measure(self, low_ppm: float, high_ppm: float) -> None:
        """Say how wide a marked region is."""
        scene = self.bench.scene
        if scene is not None:
            words = region_text(low_ppm, high_ppm, scene.frequency_mhz)
            self.window.status.show_message(words)

    def fold_when_solved(self) -> None:
        """Fold the axis once there is a ledger, unless chosen otherwise."""
        if self.settings.folds_when_solved and not self.window.lanes.is_folded:
            self.window.lanes.set_folded(True)
            self.context.show_view()

    def take_language(self, code: str) -> None:
        """Remember another language; every text is made anew at the next start."""
        self.settings.language = code
        self.window.status.show_message(
            say("The language changes when the program starts again.")
        )

    def keys(self) -> None:
        """Show keys and gestures."""
        dialogs.KeysDialog(self.look, self.window).exec()

    def about(self) -> None:
        """Show what this is, its cautions and licences."""
        ledger = self.bench.project.ledger
        cautions = ledger.cautions if ledger is not None else ()
        dialogs.AboutDialog(self.look, cautions, self.window).exec()
