"""What the bench writes: project files, reports, the sentence; and how it tells."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING

from PySide6.QtCore import QObject, Signal

from spinledger.project.document import Project
from spinledger_app import tasks
from spinledger_app.presenters.wording import say
from spinledger_app.session import Session
from spinledger_app.workers import WorkerPool

if TYPE_CHECKING:
    from spinledger.report.context import ReportContext


def now() -> str:
    """Time of the wall clock, ISO 8601 with its zone."""
    return datetime.now(UTC).isoformat(timespec="seconds")


class WritingBench(QObject):
    """Holds the open project and writes it; the work on it is its child's.

    Signals
    -------
    told : str sentence, bool is_error
    progressed : float, or None when nothing runs
    saved : str path
    reported : tuple of paths
    sentence_ready : str
    """

    told = Signal(str, bool)
    progressed = Signal(object)
    saved = Signal(str)
    reported = Signal(object)
    sentence_ready = Signal(str)

    def __init__(self, pool: WorkerPool, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.pool = pool
        self.session = Session()
        self.pool.busy_changed.connect(self._on_busy)

    @property
    def project(self) -> Project:
        """The open project."""
        return self.session.project

    def save(self, path: Path) -> None:
        """Save the project file."""
        project = self.project

        def done(_path: Path) -> None:
            self.session.mark_saved(project, path)
            self.told.emit(say("Saved {0}.").replace("{0}", path.name), False)
            self.saved.emit(str(path))

        self.pool.run(
            tasks.save, project, path, done=done, failed=self._fail, lane="save"
        )

    def write_report(self, folder: Path, formats: Sequence[str]) -> None:
        """Write the report into a folder."""
        self._write(tasks.write_report, folder, tuple(formats))

    def write_pdf(self, path: Path) -> None:
        """Write the report as PDF."""
        self._write(tasks.write_pdf, path)

    def _write(self, task: Callable[..., object], place: Path, *more: object) -> None:
        ledger = self.project.ledger
        if ledger is None:
            self._fail(say("There is no ledger to report yet."))
            return
        context = self.report_context()

        def done(result: object) -> None:
            paths = result if isinstance(result, tuple) else (result,)
            words = say("Report written to {0}.").replace("{0}", str(place))
            self.told.emit(words, False)
            self.reported.emit(paths)

        self.pool.run(
            task,
            ledger,
            place,
            *more,
            context,
            done=done,
            failed=self._fail,
            told=self._tell_stage,
            lane="report",
        )

    def report_context(self) -> ReportContext:
        """What the report says beside the ledger: sample, date, audit."""
        from spinledger.report.context import context_of  # noqa: PLC0415 - loads much

        day = datetime.now(UTC).astimezone()
        return context_of(self.project, date=f"{day.day} {day:%B %Y}")

    def ask_sentence(self) -> None:
        """Make the experimental-section text; told by ``sentence_ready``."""
        ledger = self.project.ledger
        if ledger is None:
            self._fail(say("There is no ledger to report yet."))
            return
        self.pool.run(
            tasks.experimental_sentence,
            ledger,
            done=self.sentence_ready.emit,
            failed=self._fail,
            lane="sentence",
        )

    def _tell_stage(self, stage: str, fraction: float) -> None:
        self.told.emit(say(stage[:1].upper() + stage[1:]) + " …", False)
        self.progressed.emit(min(max(fraction, 0.02), 1.0))

    def _on_busy(self, is_busy: bool) -> None:
        self.progressed.emit(0.02 if is_busy else None)

    def _fail(self, sentence: str) -> None:
        self.told.emit(sentence, True)
