"""The bench's work: what is opened, solved, edited and written; no widgets."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from pathlib import Path

from PySide6.QtCore import QObject, QTimer, Signal

from spinledger.errors import StructureError
from spinledger.project.constraints import reconcile_options, standing_constraints
from spinledger.project.document import (
    Project,
    ProjectOptions,
    open_spectrum,
    open_structure,
    with_evidence,
    with_layout,
    with_ledger,
    with_options,
    with_tick,
    without_structure,
)
from spinledger.project.edits import Edit, SetRecipe, apply_edit
from spinledger.project.labels import relabel_ledger, shown_labels
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import Ledger
from spinledger.values.recipe import Recipe
from spinledger.values.structure import Structure
from spinledger_app import tasks
from spinledger_app.lanes.scene import LaneScene
from spinledger_app.presenters.scenes import SceneStore
from spinledger_app.presenters.structure import Drawing
from spinledger_app.presenters.wording import say
from spinledger_app.selection import Selection
from spinledger_app.workers import WorkerPool
from spinledger_app.writing import WritingBench, now

_RESOLVE_AFTER_MS = 60


class Bench(WritingBench):
    """Runs the work behind the window and tells what came of it.

    Signals
    -------
    unreadable : str sentence
        Data could not be read; empty when they could.
    shown : none
        Something to show has changed: project, scene, drawing or thumbnails.
    first_ledger : none
        A spectrum and a structure have met for the first time.
    """

    unreadable = Signal(str)
    shown = Signal()
    first_ledger = Signal()

    def __init__(self, pool: WorkerPool, parent: QObject | None = None) -> None:
        super().__init__(pool, parent)
        self.selection = Selection()
        self.scenes = SceneStore()
        self.drawing: Drawing | None = None
        self.thumbnails: dict[str, Drawing] = {}
        self.is_full_tested = False
        self.last_fault_place: Path | None = None
        self.drawn_here: Structure | None = None
        self._drawn_smiles: str | None = None
        self._timer = QTimer(self)
        self._timer.setSingleShot(True)
        self._timer.setInterval(_RESOLVE_AFTER_MS)
        self._timer.timeout.connect(self.solve)
        self.session.project_changed.connect(self._follow)

    @property
    def scene(self) -> LaneScene | None:
        """What the lanes show."""
        return self.scenes.scene_of(self.project)

    @property
    def is_stale(self) -> bool:
        """Whether the ledger that is shown was solved before the last edits."""
        project = self.project
        return project.ledger is not None and project.needs_ledger

    # -- opening -----------------------------------------------------------------

    def open_data(self, path: Path) -> None:
        """Read a data set; the structure that is open stays."""
        self.told.emit(say("Reading {0} …").replace("{0}", path.name), False)
        options = self.project.options

        def done(read: tasks.ReadSpectrum) -> None:
            self.unreadable.emit("")
            self.last_fault_place = None
            when = now()
            self.selection.clear()
            self.session.apply(
                say("open {0}").replace("{0}", path.name),
                lambda project: with_evidence(
                    open_spectrum(
                        project, read.acquired, source_path=str(path), when=when
                    ),
                    read.evidence,
                ),
            )
            self._tell_read(read.evidence)
            self._solve_soon()

        def failed(sentence: str) -> None:
            self.last_fault_place = path
            self.unreadable.emit(sentence)
            self._fail(sentence)

        self.pool.run(
            tasks.read_spectrum,
            path,
            options,
            done=done,
            failed=failed,
            told=self._tell_stage,
            lane="read",
            prepare=self._prepare_read,
        )

    def _prepare_read(self, read: tasks.ReadSpectrum) -> tasks.ReadSpectrum:
        self.scenes.prepare(read.evidence, None)
        return read

    def _tell_read(self, evidence: Evidence) -> None:
        doubts = evidence.quality.doubts
        words = say("Read and processed.")
        self.told.emit(f"{words} {doubts[0]}" if doubts else words, False)

    def take_structure(self, text: str) -> None:
        """Take a structure from SMILES, InChI, molfile text or a file's path."""

        def done(read: tasks.ReadClaim) -> None:
            when = now()
            self.drawing = read.drawing
            self._drawn_smiles = read.structure.smiles
            self.selection.clear()
            self.session.apply(
                say("take structure"),
                lambda project: open_structure(project, read.structure, when=when),
            )
            self.told.emit(say("Structure taken."), False)
            self._solve_soon()

        self.pool.run(
            tasks.read_claim, text, done=done, failed=self._fail, lane="structure"
        )

    def take_drawing(self, block: str) -> None:
        """Take what was drawn in the sketch, a molfile; empty removes the structure.

        The structure is remembered as ``drawn_here``, so that the sketch does not
        show again what it shows already.
        """
        from spinledger.structure.read import (  # noqa: PLC0415 - loads RDKit
            read_structure,
        )
        from spinledger_app.presenters.drawing import (  # noqa: PLC0415 - as above
            is_same_but_for_layout,
        )

        when = now()
        if not block:
            self.selection.clear()
            self.session.apply(
                say("remove the structure"),
                lambda project: without_structure(project, when=when),
            )
            return
        try:
            structure = read_structure(block)
        except StructureError as error:
            self._fail(error.reason)
            return
        before = self.project.structure
        if before is not None and is_same_but_for_layout(before, structure):
            laid = with_layout(self.project, structure)
            self.drawn_here = laid.structure
            self.session.apply(say("move atoms"), lambda _: laid)
            return
        self.drawn_here = structure
        self.selection.clear()
        self.session.apply(
            say("draw"), lambda project: open_structure(project, structure, when=when)
        )
        self._solve_soon()

    def open_project(self, path: Path) -> None:
        """Open a project file."""

        def done(project: Project) -> None:
            self.selection.clear()
            self.session.replace(project, path)
            self.told.emit(say("Opened {0}.").replace("{0}", path.name), False)
            self._solve_soon()

        self._load(path, done)

    def open_left_behind(self, path: Path) -> None:
        """Open autosaved work; it counts as unsaved, and its file goes away."""

        def done(project: Project) -> None:
            self.selection.clear()
            self.session.replace(project, None)
            self.session.forget_saved()
            path.unlink(missing_ok=True)
            self.told.emit(say("Opened what was not saved. Save it now."), False)
            self._solve_soon()

        self._load(path, done)

    def _load(self, path: Path, done: Callable[[Project], None]) -> None:
        self.pool.run(
            tasks.load,
            path,
            done=done,
            failed=self._fail,
            lane="read",
            prepare=self._prepare_project,
        )

    def _prepare_project(self, project: Project) -> Project:
        if project.evidence is not None:
            constraints = standing_constraints(project)
            self.scenes.prepare(
                project.evidence, project.ledger, constraints.excluded_ppm
            )
        return project

    def new_project(self) -> None:
        """Start with nothing."""
        self.pool.cancel()
        self.selection.clear()
        self.session.replace(Project(), None)
        self.told.emit(say("Ready"), False)

    def set_solvent(self, solvent: str | None) -> None:
        """Say which solvent it is; the spectrum is processed again."""
        options = replace(self.project.options, solvent=solvent)
        self._set_options(say("set solvent"), options)

    def add_contender(self, text: str) -> None:
        """Test another structure beside the claimed one."""

        def done(read: tasks.ReadClaim) -> None:
            structure = read.structure
            self.thumbnails[structure.smiles] = read.drawing
            options = self.project.options
            known = {one.smiles for one in options.contenders}
            if structure.smiles in known:
                self.told.emit(say("This contender is tested already."), False)
                return
            contenders = (*options.contenders, structure)
            self._set_options(
                say("add a contender"), replace(options, contenders=contenders)
            )

        self.pool.run(
            tasks.read_claim, text, done=done, failed=self._fail, lane="contender"
        )

    def drop_contender(self, smiles: str) -> None:
        """Test a structure no longer that was added by hand."""
        options = self.project.options
        kept = tuple(one for one in options.contenders if one.smiles != smiles)
        self._set_options(say("drop a contender"), replace(options, contenders=kept))

    def tick_contender(self, smiles: str, is_ticked: bool) -> None:
        """List a contender in the report, or no longer."""
        what = say("tick a contender") if is_ticked else say("untick a contender")
        self.session.apply(
            what, lambda project: with_tick(project, smiles, is_ticked=is_ticked)
        )

    def set_n_contenders(self, number: int | None) -> None:
        """Say how many isomers are enumerated; None leaves it to the program."""
        options = replace(self.project.options, n_contenders=number)
        self._set_options(say("number of isomers"), options)

    def set_side_text(self, text: str) -> None:
        """Take side evidence as it was typed; empty takes it away."""
        options = replace(self.project.options, side_text=text)
        self._set_options(say("side evidence"), options)

    def _set_options(self, what: str, options: ProjectOptions) -> None:
        when = now()
        self.session.apply(
            what, lambda project: with_options(project, options, when=when)
        )
        self._solve_soon()

    # -- editing -----------------------------------------------------------------

    def edit(self, edit: Edit) -> None:
        """Carry out a hand edit as one undo step, and solve again by itself."""
        self.edit_all((edit,))

    def edit_all(self, edits: Sequence[Edit], label: str = "") -> None:
        """Several hand edits as one undo step."""
        if not edits:
            return
        when = now()

        def change(project: Project) -> Project:
            for one in edits:
                project = apply_edit(project, one, when=when)
            return project

        words = label or edits[0].description
        try:
            is_done = self.session.apply(words, change)
        except ValueError as error:
            self._fail(str(error))
            return
        if is_done:
            self.told.emit(
                say("1 step can be undone: {0}").replace("{0}", words), False
            )
            self._solve_soon()

    def set_recipe(self, recipe: Recipe | None, what: str) -> None:
        """Process with another recipe; None gives it back to the program."""
        self.edit(SetRecipe(recipe=recipe, what=what))

    # -- solving -----------------------------------------------------------------

    def _solve_soon(self) -> None:
        if self.project.needs_evidence or self.project.needs_ledger:
            self._timer.start()

    def solve(self) -> None:
        """Bring evidence and ledger up to date, the quick answer first."""
        self._timer.stop()
        project = self.project
        if project.needs_evidence:
            self._gather(project)
        elif project.needs_ledger:
            self._reconcile(project, is_quick=True)

    def refine(self) -> None:
        """Solve in full, whether anything changed or not."""
        project = self.project
        if project.evidence is None or project.structure is None:
            self._fail(say("A spectrum and a structure are needed first."))
        elif project.needs_ledger:
            self.solve()
        else:
            self._reconcile(project, is_quick=False)

    def _gather(self, project: Project) -> None:
        acquired = project.acquired
        if acquired is None:
            return

        def done(evidence: Evidence) -> None:
            if self.session.absorb(
                project, lambda current: with_evidence(current, evidence)
            ):
                self._tell_read(evidence)
                self._solve_soon()

        def prepare(evidence: Evidence) -> Evidence:
            self.scenes.prepare(evidence, None)
            return evidence

        self.pool.run(
            tasks.gather,
            acquired,
            project.options,
            project.recipe,
            done=done,
            failed=self._fail,
            told=self._tell_stage,
            lane="solve",
            prepare=prepare,
        )

    def _reconcile(self, project: Project, *, is_quick: bool) -> None:
        evidence, structure = project.evidence, project.structure
        assert evidence is not None
        assert structure is not None
        options = reconcile_options(project)
        if is_quick:
            options = replace(options, quick=True)
        excluded = options.constraints.excluded_ppm
        labels = shown_labels(project)

        def prepare(ledger: Ledger) -> Ledger:
            shown = relabel_ledger(ledger, labels)
            if _is_same_spectrum(shown.evidence, evidence):
                shown = replace(shown, evidence=evidence)
            self.scenes.prepare(shown.evidence, shown, excluded)
            return shown

        def done(ledger: Ledger) -> None:
            self._take_ledger(project, ledger, is_quick=is_quick)

        self.pool.run(
            tasks.solve,
            evidence,
            structure,
            options,
            done=done,
            failed=self._fail,
            told=self._tell_stage,
            lane="solve",
            prepare=prepare,
        )

    def _take_ledger(self, asked: Project, ledger: Ledger, *, is_quick: bool) -> None:
        is_first = asked.ledger is None
        when = now()

        def change(project: Project) -> Project:
            solved = with_ledger(project, ledger, when=when)
            # The quick answer is not yet the one for the record.
            return replace(solved, audit=project.audit) if is_quick else solved

        self.is_full_tested = not is_quick
        if not self.session.absorb(asked, change):
            return
        if is_first:
            self.first_ledger.emit()
        self._draw_contenders(ledger)
        is_quick_wanted = self.project.options.is_quick
        if is_quick and not is_quick_wanted and self.project.ledger is not None:
            self._reconcile(self.project, is_quick=False)
        else:
            self.told.emit(say("Solved."), False)

    def cancel(self) -> None:
        """Stop what runs; nothing is changed."""
        self.pool.cancel()
        self.progressed.emit(None)
        self.told.emit(say("Cancelled. Nothing was changed."), False)

    # -- drawings ----------------------------------------------------------------

    def _follow(self, before: Project, after: Project) -> None:
        structure = after.structure
        if structure is None:
            self.drawing = self._drawn_smiles = None
        elif structure is not before.structure and (
            self._drawn_smiles != structure.smiles
        ):
            self._draw(structure.smiles, after)
        if after.ledger is not None and after.ledger is not before.ledger:
            self._draw_contenders(after.ledger)
        if after.needs_evidence or after.needs_ledger:
            self._solve_soon()
        self.shown.emit()

    def _draw(self, smiles: str, project: Project) -> None:
        self._drawn_smiles = smiles

        def done(drawing: Drawing) -> None:
            self.drawing = drawing
            self.shown.emit()

        self.pool.run(
            tasks.draw_structure,
            project.structure,
            done=done,
            failed=self._fail,
            lane="draw",
        )

    def _draw_contenders(self, ledger: Ledger) -> None:
        wanted = [
            one.smiles for one in ledger.contenders if one.smiles not in self.thumbnails
        ]
        if not wanted:
            return

        def done(drawings: dict[str, Drawing]) -> None:
            self.thumbnails.update(drawings)
            self.shown.emit()

        self.pool.run(
            tasks.draw_smiles, wanted, done=done, failed=self._fail, lane="thumbnails"
        )


def _is_same_spectrum(one: Evidence, other: Evidence) -> bool:
    """Whether two evidences are copies; pickling makes them so."""
    return (
        one.reference == other.reference
        and one.recipe == other.recipe
        and one.spectrum.n_points == other.spectrum.n_points
        and one.spectrum.first_point_ppm == other.spectrum.first_point_ppm
        and one.signals == other.signals
        and one.strays == other.strays
    )
