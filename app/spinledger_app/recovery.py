"""Autosave beside the project, and work that a crash left behind; times in s."""

from __future__ import annotations

import uuid
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path

from PySide6.QtCore import QLockFile, QObject, QTimer

from spinledger.project.document import Project
from spinledger_app import tasks
from spinledger_app.session import Session
from spinledger_app.workers import WorkerPool

SUFFIX = ".sledger"
_AFTER_MS = 20_000
_STALE_PARTS = ".*.part"


@dataclass(frozen=True, slots=True, kw_only=True)
class LeftBehind:
    """A project that was not saved when its program ended."""

    path: Path
    saved_at: datetime


class Autosave(QObject):
    """Saves the open project into a folder of its own while it is unsaved.

    Each running window holds a lock file; what has none belongs to a program
    that ended without closing.

    Parameters
    ----------
    session : Session
    pool : WorkerPool
    folder : pathlib.Path
        Made if it is not there.
    after_ms : int, ms
        How long after a change it is saved; more changes wait with it.
    """

    def __init__(
        self,
        session: Session,
        pool: WorkerPool,
        folder: Path,
        *,
        after_ms: int = _AFTER_MS,
    ) -> None:
        super().__init__(session)
        self._session, self._pool = session, pool
        self._folder = folder
        self._saved: Project | None = None
        folder.mkdir(parents=True, exist_ok=True)
        self.path = folder / f"{uuid.uuid4().hex}{SUFFIX}"
        self._lock = QLockFile(str(self.path.with_suffix(".lock")))
        self._lock.setStaleLockTime(0)  # held as long as the process lives
        self._lock.tryLock(0)
        self._timer = QTimer(self)
        self._timer.setSingleShot(True)
        self._timer.setInterval(after_ms)
        self._timer.timeout.connect(self.save_now)
        session.project_changed.connect(lambda _before, _after: self._wait())
        session.unsaved_changed.connect(lambda _: self._wait())

    def _wait(self) -> None:
        if not self._session.is_unsaved:
            self._timer.stop()
            self.path.unlink(missing_ok=True)
        elif not self._timer.isActive():
            self._timer.start()

    def save_now(self) -> None:
        """Save what is unsaved, in the background and without a word."""
        project = self._session.project
        if not self._session.is_unsaved or project is self._saved:
            return
        self._saved = project
        self._pool.run(
            tasks.save,
            project,
            self.path,
            done=self._done,
            failed=self._failed,
            lane="autosave",
            is_quiet=True,
        )

    def _done(self, _path: Path) -> None:
        if not self._session.is_unsaved:
            self.path.unlink(missing_ok=True)

    def _failed(self, _sentence: str) -> None:
        self._saved = None
        self._timer.start()

    def close(self) -> None:
        """The window closes as it should: nothing is left behind."""
        self._timer.stop()
        self._pool.cancel("autosave")
        self.path.unlink(missing_ok=True)
        self._lock.unlock()


def left_behind(folder: Path) -> list[LeftBehind]:
    """Projects whose programs ended without closing, newest first.

    Half-written files and locks of nobody are swept away.
    """
    if not folder.is_dir():
        return []
    found = []
    for path in folder.glob(f"*{SUFFIX}"):
        if _is_free(path):
            saved_at = datetime.fromtimestamp(path.stat().st_mtime, UTC)
            found.append(LeftBehind(path=path, saved_at=saved_at))
    for lock in folder.glob("*.lock"):
        if not lock.with_suffix(SUFFIX).exists() and _is_free(lock):
            lock.unlink(missing_ok=True)
    if not list(folder.glob("*.lock")):
        for part in folder.glob(_STALE_PARTS):
            part.unlink(missing_ok=True)
    return sorted(found, key=lambda one: one.saved_at, reverse=True)


def _is_free(path: Path) -> bool:
    """Whether no living program holds the lock of an autosaved file."""
    lock = QLockFile(str(path.with_suffix(".lock")))
    lock.setStaleLockTime(0)
    if not lock.tryLock(0):
        return False
    lock.unlock()
    return True


def discard(found: list[LeftBehind]) -> None:
    """Remove projects that are not wanted any more."""
    for one in found:
        one.path.unlink(missing_ok=True)
