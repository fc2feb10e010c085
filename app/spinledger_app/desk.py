"""Ties window and bench together: shows the project, hands wishes on."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from PySide6.QtCore import QObject, QPointF, QTimer, Signal
from PySide6.QtGui import QCloseEvent, QGuiApplication
from PySide6.QtWidgets import QAbstractButton, QMessageBox, QToolTip

from spinledger.errors import StructureError
from spinledger_app.bench import Bench
from spinledger_app.handlers.claims import ClaimHandlers
from spinledger_app.handlers.context import Context
from spinledger_app.handlers.files import FileHandlers
from spinledger_app.handlers.menus import MenuHandlers
from spinledger_app.handlers.overlays import OverlayHandlers
from spinledger_app.handlers.process import ProcessHandlers
from spinledger_app.handlers.spectra import SpectrumHandlers
from spinledger_app.handlers.view import ViewHandlers
from spinledger_app.lanes.targets import Target
from spinledger_app.languages import NAMES, chosen
from spinledger_app.places import Kind, example_place, kind_of
from spinledger_app.presenters import contenders as contender_words
from spinledger_app.presenters.cursor import cursor_text, title, view_text
from spinledger_app.presenters.gestures import by_hand, row_actions
from spinledger_app.presenters.ledger import ledger_text
from spinledger_app.presenters.recipe import chips
from spinledger_app.presenters.tags import structure_foot, structure_tags, tag_tips
from spinledger_app.presenters.wording import say
from spinledger_app.recovery import LeftBehind, discard
from spinledger_app.selection import Marks
from spinledger_app.settings import BenchSettings
from spinledger_app.theme import Look
from spinledger_app.views.main_window import MainWindow

TEXT_SCALES = {"text_100": 1.0, "text_115": 1.15, "text_130": 1.3}
THEME_ACTIONS = {
    "theme_desktop": "desktop",
    "theme_light": "light",
    "theme_dark": "dark",
    "theme_contrast": "high contrast",
}
_TIP_BELOW_PX = 48


class Desk(QObject):
    """Shows the bench's state in the window, and the window's wishes to the bench.

    Parameters
    ----------
    window : MainWindow
    bench : Bench
    settings : BenchSettings
    look : Look

    Signals
    -------
    closing : none
        The window closes for good.
    """

    closing = Signal()

    def __init__(
        self, window: MainWindow, bench: Bench, settings: BenchSettings, look: Look
    ) -> None:
        super().__init__(window)
        self.window = window
        self.bench = bench
        self.settings = settings
        self.look = look
        self.context = Context(
            window=window,
            bench=bench,
            settings=settings,
            look=look,
            show_all=self.show_all,
            show_view=self._show_view,
        )
        self.files = FileHandlers(self.context)
        self.view = ViewHandlers(self.context)
        self.process = ProcessHandlers(self.context)
        self.claims = ClaimHandlers(self.context, self.process.reference)
        self.overlays = OverlayHandlers(self.context)
        self.spectra = SpectrumHandlers(self.context)
        self.menus = MenuHandlers(self.context, self.overlays)
        self._handlers = {
            **self.files.actions(),
            **self.view.actions(),
            **self.process.actions(),
            **self.claims.actions(),
            **self.overlays.actions(),
            **self.spectra.actions(),
        }
        # The panels follow the lanes, each in a turn of its own, so that no turn of
        # the event loop lasts long.
        self._steps: list[Callable[[], None]] = []
        self._later = QTimer(self)
        self._later.setInterval(0)
        self._later.timeout.connect(self._show_next)
        self._wire_bench()
        self._wire_window()
        self._wire_panels()
        self._wire_lanes()
        window.lanes.shows_integrals = settings.shows_integrals
        if settings.lane_shares is not None:
            window.lanes.set_shares(settings.lane_shares)
        self.view.take_theme(settings.theme)
        window.fold_left(settings.folds_left)
        self.show_all()
        window.status.show_message(say("Ready"))

    # -- wiring --------------------------------------------------------------------

    def _wire_bench(self) -> None:
        bench, window = self.bench, self.window
        bench.told.connect(
            lambda text, is_error: window.status.show_message(text, is_error=is_error)
        )
        bench.progressed.connect(window.status.show_progress)
        bench.progressed.connect(window.recipe.show_progress)
        bench.unreadable.connect(window.lanes_empty.show_fault)
        bench.shown.connect(self.show_all)
        bench.first_ledger.connect(self.view.fold_when_solved)
        bench.sentence_ready.connect(self.files.take_sentence)
        bench.saved.connect(self.settings.add_recent)
        bench.saved.connect(lambda _: self._show_title())
        bench.selection.changed.connect(self._show_marks)
        bench.session.unsaved_changed.connect(lambda _: self._show_title())
        bench.pool.busy_changed.connect(lambda _: self._show_abilities())

    def _wire_window(self) -> None:
        window = self.window
        window.action_wanted.connect(self.do)
        window.places_dropped.connect(self._take_drop)
        window.text_dropped.connect(self.bench.take_structure)
        window.close_wanted.connect(self._close)
        window.status.cancel_wanted.connect(self.bench.cancel)
        empty = window.lanes_empty
        empty.open_wanted.connect(self.files.open)
        empty.example_wanted.connect(self.files.example)
        empty.list_wanted.connect(self.files.show_file_list)
        empty.example_button.setVisible(example_place() is not None)
        window.recent_menu.aboutToShow.connect(self.files.fill_recent)
        hints = QGuiApplication.styleHints()
        hints.colorSchemeChanged.connect(
            lambda _: self.view.take_theme(self.settings.theme)
        )

    def _take_drop(self, places: list[str]) -> None:
        """Data go to the open sample if wanted; all else is opened."""
        data = [one for one in places if kind_of(Path(one)) is Kind.DATA]
        has_spectrum = self.bench.project.evidence is not None
        if not has_spectrum and len(data) < 2:
            self.files.open_places(places)
            return
        self.files.open_places([one for one in places if one not in data])
        if data and has_spectrum:
            self.spectra.offer([Path(one) for one in data])
        else:
            self.spectra.add([Path(one) for one in data])

    def _wire_panels(self) -> None:
        window, selection = self.window, self.bench.selection
        claims = self.claims
        sketch, ledger = window.sketch, window.ledger
        sketch.paste_wanted.connect(self.files.paste)
        sketch.copy_wanted.connect(self.files.copy_smiles)
        sketch.structure_drawn.connect(self.bench.take_drawing)
        editor = sketch.editor
        editor.structure_text_rejected.connect(
            lambda text: window.status.show_message(text, is_error=True)
        )
        editor.picture_wanted.connect(self.files.save_structure_picture)
        editor.undo_wanted.connect(lambda: self.do("undo"))
        editor.redo_wanted.connect(lambda: self.do("redo"))
        for panel in (sketch.tags, ledger):
            panel.claim_clicked.connect(claims.click_claim)
            panel.claim_hovered.connect(selection.hover)
            panel.menu_wanted.connect(self.menus.of_claim)
        ledger.stray_clicked.connect(self.view.look_at_signal)
        ledger.stray_hovered.connect(lambda key: selection.hover(None, key))
        ledger.action_wanted.connect(self.do_for_claim)
        ledger.couplings_typed.connect(claims.take_couplings)
        ledger.shift_typed.connect(claims.take_shift)
        window.ribbon.place_wanted.connect(self.view.go_to_ppm)
        window.ribbon.window_wanted.connect(self.view.go_to_window)
        window.recipe.chip_clicked.connect(self.process.open_chip)
        window.contenders.add_wanted.connect(lambda: self.do("add_contender"))
        window.contenders.card_activated.connect(self.menus.of_contender)
        window.contenders.ticked.connect(self.bench.tick_contender)

    def _wire_lanes(self) -> None:
        lanes, claims = self.window.lanes, self.claims
        lanes.target_hovered.connect(self._hover_lanes)
        lanes.signal_clicked.connect(claims.click_signal)
        lanes.claim_clicked.connect(claims.click_claim)
        lanes.root_dropped.connect(claims.drop_root)
        lanes.branch_dropped.connect(claims.drop_branch)
        lanes.menu_wanted.connect(self.menus.of_lanes)
        lanes.region_marked.connect(self.view.measure)
        lanes.view_changed.connect(self._show_view)

    # -- showing -------------------------------------------------------------------

    def show_all(self) -> None:
        """Show the project as it stands."""
        bench, window = self.bench, self.window
        project = bench.project
        scene = bench.scene
        window.show_spectrum(scene is not None)
        if scene is not window.lanes.scene:
            window.lanes.show_scene(scene)
            window.ribbon.show_scene(scene)
        window.recipe.show_chips(chips(project.acquired, project.evidence))
        self._show_view()
        self._show_title()
        self._show_abilities()
        self._steps = [
            self.spectra.show,
            self._show_structure,
            self._show_ledger,
            self._show_contenders,
            lambda: self._show_marks(Marks(), self.bench.selection.marks),
        ]
        self._later.start()

    def _show_next(self) -> None:
        """Show the next of the panels; the lanes were painted before."""
        if self._steps:
            self._steps.pop(0)()
        if not self._steps:
            self._later.stop()

    def _show_structure(self) -> None:
        project, window, bench = self.bench.project, self.window, self.bench
        drawn, bench.drawn_here = bench.drawn_here, None
        structure = project.structure
        window.show_structure_size(structure is not None)
        sketch = window.sketch
        try:
            is_own = structure is not None and structure is drawn
            sketch.show_structure(structure, is_own=is_own)
        except StructureError as error:
            window.status.show_message(error.reason, is_error=True)
        drawing = bench.drawing if structure is not None else None
        sketch.show_mass(drawing.mass if drawing is not None else "")
        sketch.show_claims(
            structure_tags(project), tag_tips(project), structure_foot(project, drawing)
        )

    def _show_ledger(self) -> None:
        project, window = self.bench.project, self.window
        ledger = project.ledger
        if ledger is None:
            window.ledger.show_empty()
            return
        text = ledger_text(
            ledger,
            is_stale=self.bench.is_stale,
            before=project.verdict_before_edits if project.edits else None,
            pinned=tuple(by_hand(project)),
        )
        text = self.spectra.ledger_text(text)
        window.ledger.show_ledger(text, row_actions(project))

    def _show_contenders(self) -> None:
        project, window = self.bench.project, self.window
        ledger = project.ledger
        window.contenders.show_can_add(project.structure is not None)
        if ledger is None:
            words = (
                contender_words.before_structure()
                if project.structure is None
                else contender_words.waiting()
            )
            window.contenders.show_contenders(words)
            return
        window.contenders.show_contenders(
            contender_words.contenders_text(ledger, is_tested=self.bench.is_full_tested)
        )
        window.contenders.show_thumbnails(self.bench.thumbnails)
        window.contenders.show_ticks(project.ticked)

    def _show_marks(self, before: Marks, marks: Marks) -> None:
        window, scene = self.window, self.bench.scene
        window.lanes.show_marks(marks)
        window.ledger.show_marks(marks)
        partners: tuple[str, ...] = ()
        pointed = marks.hovered or marks.selected
        if scene is not None and pointed is not None:
            partners = scene.partners.get(pointed, ())
        window.sketch.tags.show_marks(marks, partners)
        if (before.selected is None) != (marks.selected is None):
            self._show_abilities()
        if marks.waiting_claim not in (None, before.waiting_claim):
            words = say("Click the signal that belongs to {0}. Esc lets go.")
            window.status.show_message(words.replace("{0}", marks.waiting_claim or ""))

    def _show_view(self) -> None:
        lanes = self.window.lanes
        self.window.ribbon.show_map(lanes.camera.map if lanes.camera else None)
        self.window.status.show_view(view_text(lanes.scene, lanes.camera, lanes.map))
        self._show_checks()

    def _show_title(self) -> None:
        session = self.bench.session
        project = session.project
        name = session.path.name if session.path is not None else None
        text = title(project, name)
        has_work = project.evidence is not None or project.structure is not None
        mark = "• " if session.is_unsaved and has_work else ""
        self.window.menu_row.show_title(mark + text, can_work=has_work)
        self.window.setWindowTitle(f"{mark}{text} – Spin Ledger")

    def _show_abilities(self) -> None:
        bench = self.bench
        project = bench.project
        stack = bench.session.undo_stack
        has_claim = bench.selection.marks.selected is not None
        abilities = {
            "spectrum": project.evidence is not None,
            "spectra": bool(project.others),
            "structure": project.structure is not None,
            "ledger": project.ledger is not None,
            "claim": project.ledger is not None and has_claim,
            "undo": stack.canUndo(),
            "redo": stack.canRedo(),
            "busy": bench.pool.is_busy,
        }
        self.window.show_abilities({name for name, is_so in abilities.items() if is_so})

    def _show_checks(self) -> None:
        lanes = self.window.lanes
        checks = {
            "fold": lanes.is_folded,
            "own_gains": lanes.has_own_gains,
            "integrals": lanes.shows_integrals,
            "ghosts": self.settings.shows_ghosts,
            "left_panels": self.window.left_column.is_folded,
        }
        theme = self.settings.theme
        checks |= {name: theme == one for name, one in THEME_ACTIONS.items()}
        scale = self.look.text_scale
        checks |= {name: scale == one for name, one in TEXT_SCALES.items()}
        language = chosen(self.settings.language)
        checks |= {f"language_{code}": language == code for code in NAMES}
        self.window.show_checks(checks)

    # -- wishes ----------------------------------------------------------------------

    def do(self, name: str) -> None:
        """Carry out an action of the table by its name."""
        if name in THEME_ACTIONS:
            self.settings.theme = THEME_ACTIONS[name]
            self.view.take_theme(self.settings.theme)
        elif name in TEXT_SCALES:
            self.view.take_text_scale(TEXT_SCALES[name])
        else:
            self._handlers[name]()
        self._show_abilities()
        self._show_checks()

    def do_for_claim(self, name: str, claim: str) -> None:
        """One of a row's actions."""
        if self.bench.selection.marks.selected != claim:
            self.bench.selection.select(claim)
        self.do(name)

    def _hover_lanes(self, target: Target, ppm: float | None, place: QPointF) -> None:
        self.context.last_ppm = ppm
        self.bench.selection.hover(target.claim, target.signal)
        scene = self.bench.scene
        self.window.status.show_cursor(cursor_text(scene, target, ppm))
        mark = scene.signal(target.signal) if scene and target.signal else None
        if mark is not None and place.y() < _TIP_BELOW_PX and not place.isNull():
            lanes = self.window.lanes
            QToolTip.showText(lanes.mapToGlobal(place.toPoint()), mark.tip, lanes)

    def _close(self, event: QCloseEvent) -> None:
        if not self.files.may_lose():
            event.ignore()
            return
        self.settings.set_geometry("window", self.window.saveGeometry())
        self.settings.lane_shares = self.window.lanes.shares
        self.settings.panel_sizes = self.window.sizes_by_hand
        self.closing.emit()
        self.bench.pool.close()
        event.accept()

    def offer_left_behind(self, found: list[LeftBehind]) -> None:
        """Ask whether work that a crash left behind is wanted."""
        newest = found[0]
        local = newest.saved_at.astimezone()
        box = QMessageBox(self.window)
        box.setText(say("The program ended before this was saved."))
        words = say("Work of {0} was kept. Open it?")
        box.setInformativeText(words.replace("{0}", f"{local:%Y-%m-%d %H:%M}"))
        roles = QMessageBox.ButtonRole
        wanted = box.addButton(say("Open it"), roles.AcceptRole)
        unwanted = box.addButton(say("Throw it away"), roles.DestructiveRole)
        box.addButton(say("Later"), roles.RejectRole)

        def take(button: QAbstractButton) -> None:
            if button is wanted:
                self.bench.open_left_behind(newest.path)
            elif button is unwanted:
                discard(found)

        box.buttonClicked.connect(take)
        box.open()

    def open_later(self, places: list[str], structure: str | None) -> None:
        """Open what the command line named, once the window is up."""

        def open_now() -> None:
            if structure is not None:
                self.bench.take_structure(structure)
            self.files.open_places([str(Path(place)) for place in places])

        QTimer.singleShot(0, open_now)
