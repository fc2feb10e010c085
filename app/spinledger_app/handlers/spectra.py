"""The spectra of the sample: adding, stepping, roles, ghosts, the shake pair."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING

from PySide6.QtCore import QPoint
from PySide6.QtGui import QAction, QActionGroup
from PySide6.QtWidgets import QFileDialog, QMenu

from spinledger.project.document import Project, SampleSpectrum, with_evidence
from spinledger.project.spectra import (
    add_spectrum,
    remove_spectrum,
    set_role,
    show_spectrum,
    spectra,
    spectrum_of,
    step_spectrum,
)
from spinledger.sample.roles import Role
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import Ledger
from spinledger_app import tasks
from spinledger_app.handlers.context import Context
from spinledger_app.lanes.overlay_layer import Ghost
from spinledger_app.presenters.ledger import LedgerText
from spinledger_app.presenters.spectra import (
    role_words,
    shaken_spectrum,
    tabs,
    with_shake,
)
from spinledger_app.presenters.wording import say
from spinledger_app.writing import now

if TYPE_CHECKING:
    from spinledger.sample.shake import Shake


class SpectrumHandlers:
    """What the row of tabs and the entries for spectra do."""

    def __init__(self, context: Context) -> None:
        self.context = context
        self.window, self.bench = context.window, context.bench
        self.settings = context.settings
        self._ghosts: list[tuple[Evidence, Ghost]] = []
        self._pair: tuple[Ledger, Evidence] | None = None
        self._shake: Shake | None = None
        row = self.window.spectrum_tabs
        row.spectrum_wanted.connect(self.show_one)
        row.menu_wanted.connect(self.open_menu)
        row.removal_wanted.connect(self.remove)

    def actions(self) -> dict[str, Callable[[], None]]:
        """Handlers by the names of the action table."""
        return {
            "add_spectrum": self.choose,
            "add_spectrum_folder": self.choose_folder,
            "next_spectrum": lambda: self.step(1),
            "previous_spectrum": lambda: self.step(-1),
            "ghosts": self.toggle_ghosts,
        }

    # -- adding ----------------------------------------------------------------------

    def choose(self) -> None:
        """Choose data files of the same sample."""
        chosen, _ = QFileDialog.getOpenFileNames(
            self.window, say("Add spectrum"), self.settings.last_folder
        )
        if chosen:
            self.settings.last_folder = str(Path(chosen[0]).parent)
            self.add([Path(one) for one in chosen])

    def choose_folder(self) -> None:
        """Choose a data folder of the same sample."""
        chosen = QFileDialog.getExistingDirectory(
            self.window, say("Add spectrum folder"), self.settings.last_folder
        )
        if chosen:
            self.settings.last_folder = str(Path(chosen).parent)
            self.add([Path(chosen)])

    def add(self, places: list[Path]) -> None:
        """Read spectra of the same sample, one after the other."""
        if not places:
            return
        path, rest = places[0], places[1:]
        message = say("Reading {0} …").replace("{0}", path.name)
        self.window.status.show_message(message)
        options = replace(
            self.bench.project.options,
            solvent=None,
            temperature_k=None,
            prefer_processed=False,
        )

        def done(read: tasks.ReadSpectrum) -> None:
            self._take(path, read)
            self.add(rest)

        def failed(sentence: str) -> None:
            self._fail(sentence)
            self.add(rest)

        self.bench.pool.run(
            tasks.read_spectrum, path, options, done=done, failed=failed
        )

    def _take(self, path: Path, read: tasks.ReadSpectrum) -> None:
        when = now()

        def change(project: Project) -> Project:
            shown = project.key
            added = add_spectrum(
                project, read.acquired, source_path=str(path), when=when
            )
            new = spectra(added)[-1].key
            added = with_evidence(show_spectrum(added, new), read.evidence)
            return show_spectrum(added, shown if spectra(project) else new)

        if self._apply(say("add {0}").replace("{0}", path.name), change):
            new = spectra(self.bench.project)[-1]
            words = say("{0} added: {1}.").replace("{0}", path.name)
            role = role_words()[new.role]
            self.window.status.show_message(words.replace("{1}", role))
            self.settings.add_recent(str(path))

    def offer(self, places: list[Path]) -> None:
        """Ask at the mouse whether dropped data belong to the open sample."""
        menu = QMenu(self.window)
        menu.setAccessibleName(say("Dropped data"))
        menu.addAction(say("Add to this sample")).triggered.connect(
            lambda: self.add(places)
        )
        menu.addAction(say("Open instead of the shown spectrum")).triggered.connect(
            lambda: self.bench.open_data(places[0])
        )
        menu.popup(self.window.cursor().pos())

    # -- going about -----------------------------------------------------------------

    def show_one(self, key: int) -> None:
        """Show the spectrum of a tab."""
        self._apply(say("show a spectrum"), lambda project: show_spectrum(project, key))

    def step(self, steps: int) -> None:
        """Show the next spectrum or the one before, round and round."""
        self._apply(
            say("show a spectrum"), lambda project: step_spectrum(project, steps)
        )

    def remove(self, key: int) -> None:
        """Take a spectrum out of the sample."""
        when = now()
        self._apply(
            say("take a spectrum out"),
            lambda project: remove_spectrum(project, key, when=when),
        )

    def set_role(self, key: int, role: Role) -> None:
        """Say what a spectrum is for."""
        when = now()
        self._apply(
            say("set the role"), lambda project: set_role(project, key, role, when=when)
        )

    def open_menu(self, key: int, place: QPoint) -> None:
        """Menu of a tab: its role, and the way out of the sample."""
        menu = QMenu(self.window)
        group = QActionGroup(menu)
        now_role = spectrum_of(self.bench.project, key).role
        for role, words in role_words().items():
            entry = QAction(words, menu)
            entry.setCheckable(True)
            entry.setChecked(role == now_role)
            entry.triggered.connect(partial(self._role_chosen, key, role))
            group.addAction(entry)
            menu.addAction(entry)
        menu.addSeparator()
        out = menu.addAction(say("Take out of the sample"))
        out.triggered.connect(lambda: self.remove(key))
        menu.popup(place)

    def _role_chosen(self, key: int, role: Role, _is_on: bool = True) -> None:
        self.set_role(key, role)

    def _apply(self, label: str, change: Callable[[Project], Project]) -> bool:
        before = self.bench.project.key
        try:
            is_done = self.bench.session.apply(label, change)
        except ValueError as error:
            self._fail(str(error))
            return False
        if self.bench.project.key != before:
            self.bench.selection.clear()
        return is_done

    def _fail(self, sentence: str) -> None:
        self.window.status.show_message(sentence, is_error=True)

    # -- showing ---------------------------------------------------------------------

    def show(self) -> None:
        """Show tabs, ghosts and the shake pair of the project as it stands."""
        project = self.bench.project
        self.window.spectrum_tabs.show_tabs(tabs(project))
        self._show_ghosts(project)
        self._ask_shake(project)

    def toggle_ghosts(self) -> None:
        """Draw the sample's other spectra behind the shown one, or no longer."""
        self.settings.shows_ghosts = not self.settings.shows_ghosts
        self._show_ghosts(self.bench.project)

    def _show_ghosts(self, project: Project) -> None:
        ghosts: tuple[Ghost, ...] = ()
        if self.settings.shows_ghosts and project.evidence is not None:
            found = [
                (one.evidence, self._ghost(one))
                for one in project.others
                if one.evidence is not None
            ]
            self._ghosts = [(seen, ghost) for seen, ghost in found]
            ghosts = tuple(ghost for _, ghost in self._ghosts)
        self.window.lanes.show_ghosts(ghosts)

    def _ghost(self, one: SampleSpectrum) -> Ghost:
        assert one.evidence is not None
        for evidence, ghost in self._ghosts:
            if evidence is one.evidence:
                return ghost
        scene = self.bench.scenes.prepare(one.evidence, None)
        return Ghost(trace=scene.measured, full_height=scene.full_height)

    def ledger_text(self, text: LedgerText) -> LedgerText:
        """Ledger with what the shake pair says, where there is one."""
        shaken = shaken_spectrum(self.bench.project)
        if self._shake is None or self._pair is None or shaken is None:
            return text
        is_of = (
            self._pair[0] is self.bench.project.ledger
            and self._pair[1] is shaken.evidence
        )
        return with_shake(text, self._shake) if is_of else text

    def _ask_shake(self, project: Project) -> None:
        shaken, ledger = shaken_spectrum(project), project.ledger
        if shaken is None or ledger is None or shaken.evidence is None:
            return
        pair = (ledger, shaken.evidence)
        if self._pair is not None and (
            self._pair[0] is pair[0] and self._pair[1] is pair[1]
        ):
            return
        self._pair, self._shake = pair, None
        self.bench.pool.run(
            tasks.shake,
            *pair,
            done=partial(self._take_shake, pair),
            failed=self._fail,
            lane="shake",
            is_quiet=True,
        )

    def _take_shake(self, pair: tuple[Ledger, Evidence], shake: Shake) -> None:
        if self._pair is pair:
            self._shake = shake
            self.context.show_all()
            told = shake.sentences()
            if told:
                self.window.status.show_message(told[0])
