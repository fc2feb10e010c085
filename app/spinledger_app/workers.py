"""Core calls in another process: progress, cancel, errors handed back in words."""

from __future__ import annotations

import contextlib
import itertools
import logging
import multiprocessing
import multiprocessing.connection
import os
import signal
import threading
import time
from collections.abc import Callable, Sequence
from concurrent.futures import Future, ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from dataclasses import dataclass, field
from multiprocessing.managers import SyncManager
from queue import Empty
from typing import Any

from PySide6.QtCore import QObject, QTimer, Signal

from spinledger.errors import CancelledError, SpinLedgerError

_POLL_MS = 30
_TELL_EVERY_S = 0.03
_N_PROCESSES = 2
_LOWER_PRIORITY = 5
_LONGEST_START_S = 10.0
_ONE_THREAD = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")

logger = logging.getLogger(__name__)


@dataclass(slots=True, eq=False)
class Job:
    """One call that runs elsewhere.

    Attributes
    ----------
    lane : str
        A new job on a lane supersedes the older one there.
    """

    number: int
    lane: str
    task: Callable[..., Any]
    arguments: tuple[Any, ...]
    done: Callable[[Any], None]
    failed: Callable[[str], None]
    told: Callable[[str, float], None]
    prepare: Callable[[Any], Any] | None = None
    is_quiet: bool = False
    event: Any = None
    future: Future[Any] | None = field(default=None)
    is_superseded: bool = False


class WorkerPool(QObject):
    """Runs tasks in other processes and hands results to the window's thread.

    Signals
    -------
    busy_changed : bool
        Whether anything the user waits for is running.
    """

    busy_changed = Signal(bool)
    _arrived = Signal(object, object, object)
    _ready = Signal()

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._numbers = itertools.count(1)
        self._jobs: dict[int, Job] = {}
        self._waiting: list[Job] = []
        self._manager: SyncManager | None = None
        self._queue: Any = None
        self._executor: ProcessPoolExecutor | None = None
        self._is_closed = False
        self._starter: threading.Thread | None = None
        self._timer = QTimer(self)
        self._timer.setInterval(_POLL_MS)
        self._timer.timeout.connect(self._drain)
        self._arrived.connect(self._take)
        self._ready.connect(self._submit_waiting)

    def start(self, warm_ups: Sequence[Callable[..., Any]] = ()) -> None:
        """Start manager and processes in the background, after the window shows.

        Each of the ``warm_ups`` runs in a process of its own, so that what the
        first tasks need is loaded while the user looks about.
        """
        self._starter = threading.Thread(
            target=self._start, args=(warm_ups,), name="worker start", daemon=True
        )
        self._starter.start()

    def _start(self, warm_ups: Sequence[Callable[..., Any]]) -> None:
        context = multiprocessing.get_context("spawn")
        manager = SyncManager(ctx=context)
        manager.start(_ignore_interrupts)
        executor = ProcessPoolExecutor(
            max_workers=_N_PROCESSES, mp_context=context, initializer=_calm_down
        )
        self._queue = manager.Queue()
        self._executor = executor
        self._manager = manager
        for warm_up in () if self._is_closed else warm_ups:
            executor.submit(_run, warm_up, (), 0, self._queue, manager.Event())
        self._ready.emit()

    def run(  # noqa: PLR0913 - a call and all that may come of it
        self,
        task: Callable[..., Any],
        *arguments: Any,
        done: Callable[[Any], None],
        failed: Callable[[str], None],
        told: Callable[[str, float], None] = lambda _stage, _fraction: None,
        lane: str = "",
        prepare: Callable[[Any], Any] | None = None,
        is_quiet: bool = False,
    ) -> Job:
        """Run ``task(progress, cancelled, *arguments)`` in another process.

        Parameters
        ----------
        done : callable
            Called with the result in the window's thread.
        failed : callable
            Called with one sentence; not when it was cancelled or superseded.
        told : callable
            Called with a stage in words and a fraction from 0 to 1.
        lane : str
            An unfinished job on the same lane is cancelled; its result is dropped.
        prepare : callable, optional
            Run on the result in a background thread of this process.
        is_quiet : bool
            Nobody waits for it: it does not count as busy.
        """
        if lane:
            self.cancel(lane)
        job = Job(
            number=next(self._numbers),
            lane=lane,
            task=task,
            arguments=arguments,
            done=done,
            failed=failed,
            told=told,
            prepare=prepare,
            is_quiet=is_quiet,
        )
        if self._is_closed:
            job.is_superseded = True
            return job
        was_busy = self.is_busy
        self._jobs[job.number] = job
        if self._executor is None or self._manager is None:
            self._waiting.append(job)
        else:
            self._submit(job)
        if self.is_busy and not was_busy:
            self.busy_changed.emit(True)
        return job

    def cancel(self, lane: str | None = None) -> None:
        """Stop the jobs of a lane, or all."""
        for job in list(self._jobs.values()):
            if lane is None or job.lane == lane:
                job.is_superseded = True
                if job.event is not None:
                    job.event.set()
                if job.future is not None:
                    job.future.cancel()
                self._drop(job)

    @property
    def is_busy(self) -> bool:
        """Whether any job that somebody waits for is unfinished."""
        return any(not job.is_quiet for job in self._jobs.values())

    def close(self) -> None:
        """Stop everything; for the end of the program."""
        if self._is_closed:
            return
        self._is_closed = True
        self.cancel()
        self._timer.stop()
        if self._starter is not None:
            self._starter.join(_LONGEST_START_S)
        before = set(multiprocessing.active_children())
        if self._executor is not None:
            self._executor.shutdown(wait=False, cancel_futures=True)
        if self._manager is not None:
            self._manager.shutdown()
        # What still computes cannot be of use to anybody now.
        for process in before & set(multiprocessing.active_children()):
            process.terminate()

    def _submit_waiting(self) -> None:
        waiting, self._waiting = self._waiting, []
        for job in waiting:
            if not job.is_superseded:
                self._submit(job)

    def _submit(self, job: Job) -> None:
        assert self._executor is not None
        assert self._manager is not None
        job.event = self._manager.Event()
        try:
            job.future = self._executor.submit(
                _run, job.task, job.arguments, job.number, self._queue, job.event
            )
        except BrokenProcessPool:
            self._restart()
            job.future = self._executor.submit(
                _run, job.task, job.arguments, job.number, self._queue, job.event
            )
        job.future.add_done_callback(lambda future: self._finish(job, future))
        self._timer.start()

    def _restart(self) -> None:
        context = multiprocessing.get_context("spawn")
        self._executor = ProcessPoolExecutor(
            max_workers=_N_PROCESSES, mp_context=context, initializer=_calm_down
        )

    def _finish(self, job: Job, future: Future[Any]) -> None:
        """Called in a thread of the executor."""
        if future.cancelled() or self._is_closed:
            return
        error = future.exception()
        result = None
        if error is None:
            result = future.result()
            if job.prepare is not None and not job.is_superseded:
                try:
                    result = job.prepare(result)
                except Exception as fault:  # noqa: BLE001 - told to the user below
                    error = fault
        with contextlib.suppress(RuntimeError):  # the window is gone
            self._arrived.emit(job, result, error)

    def _take(self, job: Job, result: Any, error: BaseException | None) -> None:
        """Called in the window's thread."""
        self._drain()
        is_wanted = job.number in self._jobs and not job.is_superseded
        self._drop(job)
        if not is_wanted or isinstance(error, CancelledError):
            return
        if error is None:
            job.done(result)
        else:
            job.failed(sentence_of(error))

    def _drop(self, job: Job) -> None:
        if self._jobs.pop(job.number, None) is None:
            return
        if not self._jobs:
            self._timer.stop()
        if not job.is_quiet and not self.is_busy:
            self.busy_changed.emit(False)

    def _drain(self) -> None:
        if self._queue is None:
            return
        latest: dict[int, tuple[str, float]] = {}
        with contextlib.suppress(EOFError, OSError):
            for _ in range(self._queue.qsize()):
                try:
                    number, stage, fraction = self._queue.get_nowait()
                except Empty:
                    break
                latest[number] = (stage, fraction)
        for number, (stage, fraction) in latest.items():
            job = self._jobs.get(number)
            if job is not None:
                job.told(stage, fraction)


def sentence_of(error: BaseException) -> str:
    """One sentence for the user; what was not foreseen is logged in full."""
    if isinstance(error, SpinLedgerError):
        return str(error)
    if isinstance(error, BrokenProcessPool):
        return (
            "The working process ended without a word, perhaps for lack of memory; "
            "try again."
        )
    logger.error("unforeseen error in a task", exc_info=error)
    return f"This went wrong and was not foreseen: {type(error).__name__}: {error}"


def _ignore_interrupts() -> None:
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    _end_with_parent()


def _end_with_parent() -> None:
    """Let this process end when the window's process does, however that ends."""
    parent = multiprocessing.parent_process()
    if parent is None:
        return

    def watch() -> None:
        multiprocessing.connection.wait([parent.sentinel])
        os._exit(0)

    threading.Thread(target=watch, name="parent watch", daemon=True).start()


def _calm_down() -> None:
    """Let the window have the processor first; called once in each process."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    _end_with_parent()
    for name in _ONE_THREAD:
        os.environ[name] = "1"
    if hasattr(os, "nice"):
        os.nice(_LOWER_PRIORITY)


def _run(
    task: Callable[..., Any],
    arguments: tuple[Any, ...],
    number: int,
    queue: Any,
    event: Any,
) -> Any:
    """Run a task in the working process."""
    last_s = 0.0

    def progress(stage: str, fraction: float) -> None:
        nonlocal last_s
        now_s = time.monotonic()
        if now_s - last_s >= _TELL_EVERY_S or fraction >= 1:
            last_s = now_s
            queue.put((number, stage, fraction))

    asked_s = 0.0
    answer = False

    def cancelled() -> bool:
        nonlocal asked_s, answer
        now_s = time.monotonic()
        if now_s - asked_s >= _TELL_EVERY_S:
            asked_s = now_s
            answer = bool(event.is_set())
        return answer

    return task(progress, cancelled, *arguments)
