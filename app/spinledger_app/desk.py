"""Ties window and bench together: every signal, every action's handler."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from PySide6.QtCore import QObject, QPoint, QPointF, Qt, QTimer
from PySide6.QtGui import QCloseEvent, QGuiApplication, QPixmap
from PySide6.QtWidgets import QFileDialog, QMenu, QMessageBox, QToolTip

from spinledger.project.edits import (
    ExcludeRegion,
    FixCoupling,
    IncludeRegion,
    MarkImpurity,
    ReleaseClaim,
    ReleaseCoupling,
    RenameLabel,
    SetReference,
    UnlinkClaim,
)
from spinledger.project.document import with_sample

from spinledger_app.bench import Bench
from spinledger_app.lanes.targets import Target
from spinledger_app.places import Kind, example_place, kind_of
from spinledger_app.presenters import contenders as contender_words
from spinledger_app.presenters.clipboard import structure_text, table_html, table_tsv
from spinledger_app.presenters.cursor import cursor_text, title, view_text
from spinledger_app.presenters.gestures import (
    by_hand,
    drop_root,
    entry_of,
    put_together,
    row_actions,
    swap,
    swap_partner,
    typed_couplings,
)
from spinledger_app.presenters.ledger import ledger_text
from spinledger_app.presenters.recipe import chips
from spinledger_app.presenters.tags import structure_foot, structure_tags, tag_tips
from spinledger_app.presenters.wording import say
from spinledger_app.selection import Marks
from spinledger_app.settings import BenchSettings
from spinledger_app.theme import DARK, HIGH_CONTRAST, LIGHT, Look
from spinledger_app.views import dialogs
from spinledger_app.views.main_window import MainWindow

_TEXT_SCALES = {"text_100": 1.0, "text_115": 1.15, "text_130": 1.3}
_THEME_ACTIONS = {
    "theme_desktop": "desktop",
    "theme_light": "light",
    "theme_dark": "dark",
    "theme_contrast": "high contrast",
}


class Desk(QObject):
    """Shows the bench's state in the window, and the window's wishes to the bench.

    Parameters
    ----------
    window : MainWindow
    bench : Bench
    settings : BenchSettings
    look : Look
    """

    def __init__(
        self, window: MainWindow, bench: Bench, settings: BenchSettings, look: Look
    ) -> None:
        super().__init__(window)
        self.window = window
        self.bench = bench
        self.settings = settings
        self.look = look
        self._last_ppm: float | None = None
        self._wire_bench()
        self._wire_window()
        self._wire_panels()
        window.lanes.shows_integrals = settings.shows_integrals
        if settings.lane_shares is not None:
            window.lanes.set_shares(settings.lane_shares)
        self.take_theme(settings.theme)
        self.show_all()

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
        bench.first_ledger.connect(self._fold_when_solved)
        bench.sentence_ready.connect(self._take_sentence)
        bench.saved.connect(self.settings.add_recent)
        bench.saved.connect(lambda _: self._show_title())
        bench.selection.changed.connect(self._show_marks)
        bench.session.unsaved_changed.connect(lambda _: self._show_title())
        bench.pool.busy_changed.connect(lambda _: self._show_abilities())

    def _wire_window(self) -> None:
        window = self.window
        window.action_wanted.connect(self.do)
        window.places_dropped.connect(self.open_places)
        window.text_dropped.connect(self.bench.take_structure)
        window.close_wanted.connect(self._close)
        window.status.cancel_wanted.connect(self.bench.cancel)
        window.lanes_empty.open_wanted.connect(lambda: self.do("open"))
        window.lanes_empty.example_wanted.connect(lambda: self.do("example"))
        window.lanes_empty.list_wanted.connect(self._show_file_list)
        window.lanes_empty.example_button.setVisible(example_place() is not None)
        window.recent_menu.aboutToShow.connect(self._fill_recent)
        hints = QGuiApplication.styleHints()
        hints.colorSchemeChanged.connect(lambda _: self.take_theme(self.settings.theme))

    def _wire_panels(self) -> None:
        window, selection = self.window, self.bench.selection
        window.sketch.paste_wanted.connect(lambda: self.do("paste"))
        window.sketch.copy_wanted.connect(lambda: self.do("copy_smiles"))
        window.sketch.canvas.claim_clicked.connect(self.click_claim)
        window.sketch.canvas.claim_hovered.connect(lambda c: selection.hover(c))
        window.sketch.canvas.menu_wanted.connect(self._claim_menu)
        window.ledger.claim_clicked.connect(self.click_claim)
        window.ledger.claim_hovered.connect(lambda c: selection.hover(c))
        window.ledger.stray_clicked.connect(self._look_at_signal)
        window.ledger.stray_hovered.connect(lambda key: selection.hover(None, key))
        window.ledger.action_wanted.connect(self.do_for_claim)
        window.ledger.couplings_typed.connect(self._take_couplings)
        window.ledger.shift_typed.connect(self._take_shift)
        window.ledger.menu_wanted.connect(self._claim_menu)
        lanes = window.lanes
        lanes.target_hovered.connect(self._hover_lanes)
        lanes.signal_clicked.connect(self.click_signal)
        lanes.claim_clicked.connect(self.click_claim)
        lanes.root_dropped.connect(self.drop_root)
        lanes.branch_dropped.connect(self.drop_branch)
        lanes.region_marked.connect(lambda _low, _high: self._show_abilities())
        lanes.menu_wanted.connect(self._lane_menu)
        lanes.view_changed.connect(self._show_view)
        window.ribbon.place_wanted.connect(self._go_to_ppm)
        window.ribbon.window_wanted.connect(self._go_to_window)
        window.recipe.chip_clicked.connect(self._open_chip)
        window.contenders.card_activated.connect(self._contender_menu)

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
        self._show_structure()
        self._show_ledger()
        self._show_marks(Marks(), bench.selection.marks)
        self._show_view()
        self._show_title()
        self._show_abilities()

    def _show_structure(self) -> None:
        project, window = self.bench.project, self.window
        window.show_structure_size(project.structure is not None)
        if project.structure is None or self.bench.drawing is None:
            window.sketch.show_structure(None)
            return
        window.sketch.show_structure(
            self.bench.drawing,
            structure_tags(project),
            tag_tips(project),
            structure_foot(project, self.bench.drawing),
        )

    def _show_ledger(self) -> None:
        project, window = self.bench.project, self.window
        ledger = project.ledger
        if ledger is None:
            window.ledger.show_empty()
            words = (
                contender_words.before_structure()
                if project.structure is None
                else contender_words.waiting()
            )
            window.contenders.show_contenders(words)
            return
        held = by_hand(project)
        text = ledger_text(
            ledger,
            is_stale=self.bench.is_stale,
            before=project.verdict_before_edits if project.edits else None,
            pinned=tuple(held),
        )
        window.ledger.show_ledger(text, row_actions(project))
        window.contenders.show_contenders(
            contender_words.contenders_text(ledger, is_tested=self.bench.is_full_tested)
        )
        window.contenders.show_thumbnails(self.bench.thumbnails)

    def _show_marks(self, before: Marks, marks: Marks) -> None:
        window, scene = self.window, self.bench.scene
        window.lanes.show_marks(marks)
        window.ledger.show_marks(marks)
        partners: tuple[str, ...] = ()
        pointed = marks.hovered or marks.selected
        if scene is not None and pointed is not None:
            partners = scene.partners.get(pointed, ())
        window.sketch.canvas.show_marks(marks, partners)
        if (before.selected is None) != (marks.selected is None):
            self._show_abilities()
        if marks.waiting_claim is not None:
            words = say("Click the signal that belongs to {0}. Esc lets go.")
            window.status.show_message(words.replace("{0}", marks.waiting_claim))

    def _show_view(self) -> None:
        lanes = self.window.lanes
        self.window.ribbon.show_map(lanes.camera.map if lanes.camera else None)
        self.window.status.show_view(view_text(lanes.scene, lanes.camera, lanes.map))
        self._show_checks()

    def _show_title(self) -> None:
        session = self.bench.session
        name = session.path.name if session.path is not None else None
        text = title(session.project, name)
        has_work = (
            session.project.evidence is not None
            or session.project.structure is not None
        )
        mark = "• " if session.is_unsaved and has_work else ""
        self.window.menu_row.show_title(mark + text, can_work=has_work)
        self.window.setWindowTitle(f"{mark}{text} – Spin Ledger")

    def _show_abilities(self) -> None:
        bench = self.bench
        project = bench.project
        abilities = set()
        if project.evidence is not None:
            abilities.add("spectrum")
        if project.structure is not None:
            abilities.add("structure")
        if project.ledger is not None:
            abilities.add("ledger")
        if bench.selection.marks.selected is not None and project.ledger is not None:
            abilities.add("claim")
        if bench.session.undo_stack.canUndo():
            abilities.add("undo")
        if bench.session.undo_stack.canRedo():
            abilities.add("redo")
        if bench.pool.is_busy:
            abilities.add("busy")
        self.window.show_abilities(abilities)

    def _show_checks(self) -> None:
        lanes = self.window.lanes
        checks = {
            "fold": lanes.is_folded,
            "own_gains": lanes.has_own_gains,
            "integrals": lanes.shows_integrals,
        }
        theme = self.settings.theme
        checks |= {name: theme == one for name, one in _THEME_ACTIONS.items()}
        scale = self.look.text_scale
        checks |= {name: scale == one for name, one in _TEXT_SCALES.items()}
        self.window.show_checks(checks)

    def take_theme(self, name: str) -> None:
        """Show another theme; "desktop" follows the desktop."""
        if name == "desktop":
            scheme = QGuiApplication.styleHints().colorScheme()
            name = "dark" if scheme == Qt.ColorScheme.Dark else "light"
        tokens = {"dark": DARK, "high contrast": HIGH_CONTRAST}.get(name, LIGHT)
        self.look.tokens = tokens
        self.window.show_look()
        self._show_checks()

    def take_text_scale(self, scale: float) -> None:
        """Show another text size."""
        self.settings.text_scale = scale
        self.look.set_text_scale(scale)
        self.window.show_look()
        self.window.reset_sizes()
        self.show_all()

    def _fold_when_solved(self) -> None:
        if self.settings.folds_when_solved and not self.window.lanes.is_folded:
            self.window.lanes.set_folded(True)
            self._show_view()

    # -- clicks ----------------------------------------------------------------------

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

    def _hover_lanes(self, target: Target, ppm: float | None, place: QPointF) -> None:
        self._last_ppm = ppm
        self.bench.selection.hover(target.claim, target.signal)
        scene = self.bench.scene
        self.window.status.show_cursor(cursor_text(scene, target, ppm))
        mark = scene.signal(target.signal) if scene and target.signal else None
        if mark is not None and place.y() < 48 and not place.isNull():
            lanes = self.window.lanes
            QToolTip.showText(lanes.mapToGlobal(place.toPoint()), mark.tip, lanes)

    def do_for_claim(self, name: str, claim: str) -> None:
        """One of a row's actions."""
        if self.bench.selection.marks.selected != claim:
            self.bench.selection.select(claim)
        self.do(name)

    # -- going places ------------------------------------------------------------------

    def _go_to_ppm(self, ppm: float) -> None:
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

    def _go_to_window(self, low: float, high: float) -> None:
        lanes = self.window.lanes
        if lanes.camera is not None and high - low > 1e-3:
            lanes.fit_gain(low, high)
            lanes.go_to(lanes.camera.on_window(low, high))

    def _look_at_signal(self, key: str) -> None:
        scene = self.bench.scene
        mark = None if scene is None else scene.signal(key)
        if mark is not None:
            self.window.lanes.zoom_to(mark.low_ppm, mark.high_ppm)

    def do_look_at_claim(self) -> None:
        """Zoom to the selected claim."""
        scene, claim = self.bench.scene, self.bench.selection.marks.selected
        tree = scene.tree_of(claim) if scene is not None and claim else None
        if tree is not None:
            tips = [leaf.tip_ppm for leaf in tree.leaves] or [tree.root_ppm]
            self.window.lanes.zoom_to(min(tips), max(tips))

    # -- actions -----------------------------------------------------------------------

    def do(self, name: str) -> None:
        """Carry out an action of the table by its name."""
        if name in _THEME_ACTIONS:
            self.settings.theme = _THEME_ACTIONS[name]
            self.take_theme(self.settings.theme)
        elif name in _TEXT_SCALES:
            self.take_text_scale(_TEXT_SCALES[name])
        else:
            getattr(self, f"do_{name}")()
        self._show_abilities()
        self._show_checks()

    def open_places(self, places: list[str]) -> None:
        """Open dropped or given files and folders, each by what it is."""
        for place in places:
            path = Path(place)
            match kind_of(path):
                case Kind.PROJECT:
                    self.bench.open_project(path)
                    self.settings.add_recent(str(path))
                case Kind.STRUCTURE:
                    self.bench.take_structure(str(path))
                case Kind.DATA:
                    self.bench.open_data(path)
                    self.settings.add_recent(str(path))

    def _chosen_place(self, chosen: str) -> str:
        if chosen:
            self.settings.last_folder = str(Path(chosen).parent)
        return chosen

    def do_new(self) -> None:
        """Start with nothing, after asking for what is unsaved."""
        if self._may_lose():
            self.bench.new_project()

    def do_open(self) -> None:
        """Choose a data or project file."""
        chosen, _ = QFileDialog.getOpenFileName(
            self.window, say("Open data or project"), self.settings.last_folder
        )
        if self._chosen_place(chosen):
            self.open_places([chosen])

    def do_open_folder(self) -> None:
        """Choose a data folder."""
        chosen = QFileDialog.getExistingDirectory(
            self.window, say("Open data folder"), self.settings.last_folder
        )
        if self._chosen_place(chosen):
            self.open_places([chosen])

    def do_example(self) -> None:
        """Open the sample spectrum with its structure."""
        place = example_place()
        if place is not None:
            self.bench.open_data(place.data)
            self.bench.take_structure(str(place.structure))

    def _fill_recent(self) -> None:
        menu = self.window.recent_menu
        menu.clear()
        for place in self.settings.recent:
            action = menu.addAction(place)
            action.triggered.connect(
                lambda _=False, place=place: self.open_places([place])
            )
        if not self.settings.recent:
            menu.addAction(say("Nothing was opened yet")).setEnabled(False)

    def _show_file_list(self) -> None:
        place = self.bench.last_fault_place
        if place is not None:
            dialogs.FileListDialog(self.look, place, self.window).exec()

    def do_save(self) -> None:
        """Save where the project was saved before, or ask."""
        path = self.bench.session.path
        if path is None:
            self.do_save_as()
        else:
            self.bench.save(path)

    def do_save_as(self) -> None:
        """Ask where to save, then save."""
        name = self.bench.project.source_name or self.bench.project.name
        start = str(Path(self.settings.last_folder) / f"{Path(name).stem}.sledger")
        chosen, _ = QFileDialog.getSaveFileName(
            self.window, say("Save project"), start, "Spin Ledger (*.sledger)"
        )
        if self._chosen_place(chosen):
            path = Path(chosen)
            self.bench.save(path if path.suffix else path.with_suffix(".sledger"))

    def do_sample(self) -> None:
        """Edit what the label of the tube says."""
        dialog = dialogs.SampleDialog(self.look, self.bench.project.sample, self.window)
        if dialog.exec():
            sample = dialog.sample()
            self.bench.session.apply(
                say("sample and batch"), lambda project: with_sample(project, sample)
            )

    def do_report(self) -> None:
        """Ask for a folder and formats, then write the report."""
        dialog = dialogs.ReportDialog(self.look, self.settings.last_folder, self.window)
        if dialog.exec() and dialog.folder():
            self.settings.last_folder = dialog.folder()
            self.bench.write_report(Path(dialog.folder()), dialog.formats())

    def do_pdf(self) -> None:
        """Ask for a file, then write the report as PDF."""
        start = str(Path(self.settings.last_folder) / "report.pdf")
        chosen, _ = QFileDialog.getSaveFileName(
            self.window, say("Report as PDF"), start, "PDF (*.pdf)"
        )
        if self._chosen_place(chosen):
            self.bench.write_pdf(Path(chosen))

    def do_quit(self) -> None:
        """Close the window."""
        self.window.close()

    def do_undo(self) -> None:
        """Take the last step back."""
        self.bench.session.undo_stack.undo()

    def do_redo(self) -> None:
        """Do the step again that was taken back."""
        self.bench.session.undo_stack.redo()

    def do_paste(self) -> None:
        """Take a structure, or data files, from the clipboard."""
        data = QGuiApplication.clipboard().mimeData()
        places = [url.toLocalFile() for url in data.urls() if url.isLocalFile()]
        text = structure_text(data)
        if places:
            self.open_places(places)
        elif text:
            self.bench.take_structure(text)
        else:
            self.window.status.show_message(
                say(
                    "The clipboard holds no structure; copy SMILES or a molfile first."
                ),
                is_error=True,
            )

    def do_open_structure(self) -> None:
        """Choose a structure file."""
        chosen, _ = QFileDialog.getOpenFileName(
            self.window,
            say("Open structure file"),
            self.settings.last_folder,
            say("Structures") + " (*.mol *.sdf *.smi *.smiles *.inchi *.txt)",
        )
        if self._chosen_place(chosen):
            self.bench.take_structure(chosen)

    def do_type_structure(self) -> None:
        """Ask for a SMILES."""
        text = dialogs.ask_text(
            self.look, self.window, say("Structure"), say("SMILES or InChI")
        )
        if text:
            self.bench.take_structure(text)

    def do_copy_picture(self) -> None:
        """Put a picture of the lanes on the clipboard, twice as fine as the screen."""
        lanes = self.window.lanes
        picture = QPixmap(lanes.size() * 2)
        picture.setDevicePixelRatio(2)
        lanes.cursor_x = None
        lanes.render(picture)
        QGuiApplication.clipboard().setPixmap(picture)
        self.window.status.show_message(say("Picture copied."))

    def do_copy_sentence(self) -> None:
        """Put the experimental-section text on the clipboard."""
        self.bench.ask_sentence()

    def _take_sentence(self, text: str) -> None:
        QGuiApplication.clipboard().setText(text)
        self.window.status.show_message(say("Experimental sentence copied."))

    def do_copy_table(self) -> None:
        """Put the assignment table on the clipboard, as text and as a table."""
        ledger = self.bench.project.ledger
        if ledger is not None:
            data = dialogs.table_data(table_tsv(ledger), table_html(ledger))
            QGuiApplication.clipboard().setMimeData(data)
            self.window.status.show_message(say("Assignment table copied."))

    def do_copy_smiles(self) -> None:
        """Put the structure's SMILES on the clipboard."""
        structure = self.bench.project.structure
        if structure is not None:
            QGuiApplication.clipboard().setText(structure.smiles)
            self.window.status.show_message(say("SMILES copied."))

    def do_fold(self) -> None:
        """Go between the folded and the continuous axis; remembered."""
        is_folded = not self.window.lanes.is_folded
        self.settings.folds_when_solved = is_folded
        self.window.lanes.set_folded(is_folded)
        self._show_view()

    def do_own_gains(self) -> None:
        """Give every stretch its own gain, or all the same."""
        self.window.lanes.set_own_gains(not self.window.lanes.has_own_gains)

    def do_integrals(self) -> None:
        """Show or hide the integral curves."""
        is_shown = not self.window.lanes.shows_integrals
        self.settings.shows_integrals = is_shown
        self.window.lanes.set_integrals(is_shown)

    def do_home(self) -> None:
        """All of the axis."""
        self.window.lanes.go_home()

    def do_back(self) -> None:
        """The view before."""
        self.window.lanes.go_back()

    def do_default_sizes(self) -> None:
        """Panels and lanes at their default sizes."""
        self.window.reset_sizes()

    # -- processing ----------------------------------------------------------------

    def do_solvent(self) -> None:
        """Ask for the solvent."""
        evidence = self.bench.project.evidence
        if evidence is None:
            return
        chosen = dialogs.ask_solvent(self.look, self.window, evidence)
        if chosen is not None:
            self.bench.set_solvent(chosen or None)

    def do_phase(self) -> None:
        """Change the phase by hand."""
        self._process(dialogs.PhaseDialog)

    def do_window(self) -> None:
        """Change the window of the FID."""
        self._process(dialogs.WindowDialog)

    def _process(self, kind: type[dialogs.RecipeDialog]) -> None:
        evidence = self.bench.project.evidence
        if evidence is None:
            return
        dialog = kind(self.look, evidence.recipe, self.window)
        if not dialog.can_change:
            self.window.status.show_message(
                say("This spectrum came processed; there is no such step to change."),
                is_error=True,
            )
        elif dialog.exec():
            recipe = dialog.recipe()
            if recipe != evidence.recipe:
                self.bench.set_recipe(recipe, dialog.what())

    def do_automatic(self) -> None:
        """Give the processing back to the program."""
        self.bench.set_recipe(None, say("processed automatically again"))

    def do_reference(self) -> None:
        """Ask for the shift of the line that was clicked or is marked."""
        lanes = self.window.lanes
        near = self._last_ppm if self._last_ppm is not None else 0.0
        if lanes.region_ppm is not None:
            near = sum(lanes.region_ppm) / 2
        scene = self.bench.scene
        feet = [foot.shift_ppm for foot in scene.feet] if scene is not None else []
        line = min(feet, key=lambda ppm: abs(ppm - near), default=near)
        value = dialogs.ask_number(
            self.look,
            self.window,
            say("Set the shift of a line"),
            say("The line at {0} ppm belongs at (ppm)").replace("{0}", f"{line:.4f}"),
            line,
        )
        if value is not None:
            self.bench.edit(SetReference(line_ppm=line, to_ppm=value))

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

    def do_exclude(self) -> None:
        """Leave a region out."""
        region = self._region()
        if region is not None:
            self.bench.selection.choose(None)
            self.bench.edit(ExcludeRegion(low_ppm=region[0], high_ppm=region[1]))

    def do_include(self) -> None:
        """Take a region in again."""
        region = self._region()
        if region is not None:
            self.bench.edit(IncludeRegion(low_ppm=region[0], high_ppm=region[1]))

    def do_impurity(self) -> None:
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

    def _open_chip(self, step: int) -> None:
        evidence = self.bench.project.evidence
        if evidence is None or step < 0:
            self.do_solvent()
            return
        name = type(evidence.recipe.steps[step]).__name__
        handler = {
            "Phase": self.do_phase,
            "Apodize": self.do_window,
            "Reference": self.do_reference,
        }.get(name)
        if handler is not None:
            handler()
        else:
            self.window.status.show_message(
                say("This step has nothing to set by hand.")
            )

    # -- claims ----------------------------------------------------------------------

    @property
    def _claim(self) -> str:
        return self.bench.selection.marks.selected or ""

    def do_put(self) -> None:
        """Let the selected claim wait for a signal."""
        self.bench.selection.wait_for_signal(self._claim)
        self.window.lanes.setFocus(Qt.FocusReason.OtherFocusReason)

    def do_swap(self) -> None:
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

    def do_unlink(self) -> None:
        """Take the selected claim off its signal."""
        self.bench.edit(UnlinkClaim(claim=self._claim))

    def do_release(self) -> None:
        """Give the selected claim back to the program."""
        self.bench.edit(ReleaseClaim(claim=self._claim))

    def do_rename(self) -> None:
        """Ask for another label."""
        text = dialogs.ask_text(
            self.look, self.window, say("Rename"), say("Label"), self._claim
        )
        if text:
            claim = self._claim
            self.bench.selection.select(None)
            self.bench.edit(RenameLabel(claim=claim, label=text))

    def do_type_j(self) -> None:
        """Open the field over the selected row's J values."""
        row = self.window.ledger.row_of(self._claim)
        if row is not None:
            row.edit_couplings()

    def do_free_j(self) -> None:
        """Let the fit find the selected claim's couplings again."""
        held = {
            (edit.claim, edit.partner)
            for edit in self.bench.project.edits
            if isinstance(edit, FixCoupling)
        }
        mine = [pair for pair in held if self._claim in pair]
        edits = [ReleaseCoupling(claim=a, partner=b) for a, b in sorted(mine)]
        self.bench.edit_all(edits)

    def _take_couplings(self, claim: str, text: str) -> None:
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

    def _take_shift(self, claim: str, text: str) -> None:
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

    def do_next_claim(self) -> None:
        """Select the next claim."""
        self._step_claim(1)

    def do_previous_claim(self) -> None:
        """Select the claim before."""
        self._step_claim(-1)

    def _step_claim(self, by: int) -> None:
        rows = [row.claim for row in self.window.ledger.rows]
        if rows:
            now = self.bench.selection.marks.selected
            index = rows.index(now) + by if now in rows else (0 if by > 0 else -1)
            self.bench.selection.select(rows[index % len(rows)])

    def do_refine(self) -> None:
        """Solve the ledger in full."""
        self.bench.refine()

    def do_cancel(self) -> None:
        """Stop what runs."""
        self.bench.cancel()

    # -- menus at the mouse --------------------------------------------------------------

    def _menu_of(self, names: tuple[str, ...], place: QPoint) -> None:
        menu = QMenu(self.window)
        for name in names:
            if name:
                menu.addAction(self.window.actions_by_name[name])
            else:
                menu.addSeparator()
        menu.popup(place)

    def _claim_menu(self, claim: str, place: QPoint) -> None:
        if not claim:
            self._menu_of(("paste", "open_structure", "type_structure"), place)
            return
        self.bench.selection.select(claim)
        names = ("look_at_claim", "", "put", "swap", "unlink", "release", "")
        self._menu_of((*names, "type_j", "free_j", "rename"), place)

    def _lane_menu(self, target: Target, ppm: float | None, place: QPoint) -> None:
        self._last_ppm = ppm
        if target.claim is not None and target.kind in ("root", "branch", "tree"):
            self._claim_menu(target.claim, place)
            return
        self.bench.selection.hover(target.claim, target.signal)
        names = ("exclude", "include", "impurity", "reference", "")
        self._menu_of((*names, "fold", "home", "back", "", "copy_picture"), place)

    def _contender_menu(self, smiles: str) -> None:
        menu = QMenu(self.window)
        take = menu.addAction(say("Claim this structure instead"))
        take.triggered.connect(lambda: self.bench.take_structure(smiles))
        copy = menu.addAction(say("Copy SMILES"))
        copy.triggered.connect(lambda: QGuiApplication.clipboard().setText(smiles))
        menu.popup(self.window.cursor().pos())

    # -- help and end ------------------------------------------------------------------

    def do_keys(self) -> None:
        """Show keys and gestures."""
        dialogs.KeysDialog(self.look, self.window).exec()

    def do_about(self) -> None:
        """Show what this is, its cautions and licences."""
        ledger = self.bench.project.ledger
        cautions = ledger.cautions if ledger is not None else ()
        dialogs.AboutDialog(self.look, cautions, self.window).exec()

    def _may_lose(self) -> bool:
        """Whether what is unsaved may go; asks where something is."""
        if not self.bench.session.is_unsaved:
            return True
        box = QMessageBox(self.window)
        box.setText(say("Save the project first?"))
        box.setInformativeText(
            say("What was changed since the last save is lost else.")
        )
        buttons = QMessageBox.StandardButton
        box.setStandardButtons(buttons.Save | buttons.Discard | buttons.Cancel)
        answer = box.exec()
        if answer == buttons.Save:
            self.do_save()
            return False  # saved in the background; the user goes on then
        return answer == buttons.Discard

    def _close(self, event: QCloseEvent) -> None:
        if not self._may_lose():
            event.ignore()
            return
        self.settings.set_geometry("window", self.window.saveGeometry())
        self.settings.lane_shares = self.window.lanes.shares
        self.bench.pool.close()
        event.accept()

    def open_later(self, places: list[str], structure: str | None) -> None:
        """Open what the command line named, once the window is up."""

        def open_now() -> None:
            if structure is not None:
                self.bench.take_structure(structure)
            self.open_places(places)

        QTimer.singleShot(0, open_now)
