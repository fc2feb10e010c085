"""Owner of the open project and of the way back; the only place it is replaced."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from PySide6.QtCore import QObject, Signal
from PySide6.QtGui import QUndoCommand, QUndoStack

from spinledger.project.document import Project


class Session(QObject):
    """Holds one project value and swaps it; every swap by hand is one undo step.

    Signals
    -------
    project_changed : before, after
    unsaved_changed : bool
    """

    project_changed = Signal(object, object)
    unsaved_changed = Signal(bool)

    def __init__(self, project: Project | None = None) -> None:
        super().__init__()
        self.undo_stack = QUndoStack(self)
        self.path: Path | None = None
        # One project a position of the undo stack, so that a result that comes
        # later can be put into the step that asked for it.
        self._states: list[Project] = [project if project is not None else Project()]
        self._shown = 0
        self._saved: Project | None = self._states[0]

    @property
    def project(self) -> Project:
        """The current project."""
        return self._states[self._shown]

    @property
    def is_unsaved(self) -> bool:
        """Whether there is anything that a closed window would lose."""
        project = self.project
        is_empty = project.acquired is None and project.structure is None
        return project is not self._saved and not is_empty

    def apply(self, label: str, edit: Callable[[Project], Project]) -> bool:
        """Run an edit as one undo step; without effect it leaves none.

        Raises
        ------
        ValueError
            If the edit cannot be carried out; nothing is changed then.
        """
        after = edit(self.project)
        if after is self.project:
            return False
        del self._states[self._shown + 1 :]
        self._states.append(after)
        self.undo_stack.push(_Step(self, label, self._shown, self._shown + 1))
        return True

    def absorb(self, asked: Project, edit: Callable[[Project], Project]) -> bool:
        """Put a result into the state that asked for it; no undo step.

        Parameters
        ----------
        asked : Project
            The very project that the work was started for.
        edit : callable
            Result into project.

        Returns
        -------
        bool
            False where that state is gone; the result is dropped then.
        """
        for index, state in enumerate(self._states):
            if state is asked:
                after = edit(state)
                self._states[index] = after
                if self._saved is asked:
                    self._saved = None if after is not asked else asked
                if index == self._shown:
                    self._tell(state)
                return True
        return False

    def replace(self, project: Project, path: Path | None) -> None:
        """Open another project; the way back starts anew."""
        before = self.project
        self.undo_stack.clear()
        self._states = [project]
        self._shown = 0
        self.path = path
        self._saved = project
        self._tell(before)

    def mark_saved(self, project: Project, path: Path) -> None:
        """Remember that a project now stands in a file."""
        self.path = path
        self._saved = project
        self.unsaved_changed.emit(self.is_unsaved)

    def forget_saved(self) -> None:
        """Count what is open as unsaved."""
        self._saved = None
        self.unsaved_changed.emit(self.is_unsaved)

    def show_state(self, index: int) -> None:
        """Show the project of one undo position; called by the undo stack."""
        before = self.project
        self._shown = index
        if self.project is not before:
            self._tell(before)

    def _tell(self, before: Project) -> None:
        self.project_changed.emit(before, self.project)
        self.unsaved_changed.emit(self.is_unsaved)


class _Step(QUndoCommand):
    """From one position to the next."""

    def __init__(self, session: Session, label: str, before: int, after: int) -> None:
        super().__init__(label)
        self._session, self._before, self._after = session, before, after

    def redo(self) -> None:
        """Show the later project."""
        self._session.show_state(self._after)

    def undo(self) -> None:
        """Show the earlier project."""
        self._session.show_state(self._before)
