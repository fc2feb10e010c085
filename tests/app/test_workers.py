"""Work in other processes: results, progress, cancel, errors in words."""

from __future__ import annotations

import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path

import pytest
from errands import add, burst, die, refuse, wait_for_cancel
from pytestqt.qtbot import QtBot

from spinledger.errors import SpectrumFormatError
from spinledger_app.workers import WorkerPool, sentence_of


@pytest.fixture(scope="module")
def pool(qapp: object) -> Iterator[WorkerPool]:
    made = WorkerPool()
    made.start()
    yield made
    made.close()


def outcome(qtbot: QtBot, pool: WorkerPool, task: object, *arguments: object) -> str:
    said: list[str] = []
    pool.run(
        task,  # type: ignore[arg-type]
        *arguments,
        done=lambda result: said.append(f"done {result}"),
        failed=lambda sentence: said.append(f"failed {sentence}"),
    )
    qtbot.waitUntil(lambda: bool(said), timeout=30_000)
    return said[0]


def test_a_result_and_its_progress_come_back(qtbot: QtBot, pool: WorkerPool) -> None:
    told: list[float] = []
    done: list[int] = []
    pool.run(
        add,
        2,
        3,
        done=done.append,
        failed=pytest.fail,
        told=lambda _stage, fraction: told.append(fraction),
    )
    qtbot.waitUntil(lambda: bool(done), timeout=30_000)
    assert done == [5]
    assert told == sorted(told)
    assert len(told) >= 2


def test_errors_come_back_as_one_sentence(qtbot: QtBot, pool: WorkerPool) -> None:
    assert outcome(qtbot, pool, refuse) == (
        "failed tube.dx: There is no spectrum in it."
    )


def test_an_unforeseen_error_is_said_to_be_one(
    qtbot: QtBot, pool: WorkerPool, caplog: pytest.LogCaptureFixture
) -> None:
    said = outcome(qtbot, pool, burst)
    assert "not foreseen" in said
    assert "ZeroDivisionError" in said
    assert caplog.records  # and stands in the log with its traceback


def test_cancel_stops_the_work_and_tells_nothing(
    qtbot: QtBot, pool: WorkerPool
) -> None:
    said: list[str] = []
    pool.run(
        wait_for_cancel,
        done=lambda _: said.append("done"),
        failed=said.append,
        lane="solve",
    )
    qtbot.wait(300)
    pool.cancel("solve")
    assert not pool.is_busy
    # The process is free again well before the task's own ten seconds.
    assert outcome(qtbot, pool, add, 1, 1) == "done 2"
    assert said == []


def test_a_newer_job_on_a_lane_replaces_the_older(
    qtbot: QtBot, pool: WorkerPool
) -> None:
    done: list[int] = []
    for value in (1, 10):
        pool.run(
            add,
            value,
            0,
            done=done.append,
            failed=pytest.fail,
            lane="solve",
        )
    qtbot.waitUntil(lambda: bool(done), timeout=30_000)
    qtbot.wait(400)
    assert done == [10]


def test_results_can_be_prepared_outside_the_window(
    qtbot: QtBot, pool: WorkerPool
) -> None:
    done: list[str] = []
    pool.run(
        add,
        1,
        2,
        done=done.append,
        failed=pytest.fail,
        prepare=lambda result: f"prepared {result}",
    )
    qtbot.waitUntil(lambda: bool(done), timeout=30_000)
    assert done == ["prepared 3"]


def test_sentences_of_our_own_errors_are_taken_as_they_are() -> None:
    error = SpectrumFormatError(Path("a.fid"), "It is empty.")
    assert sentence_of(error) == "a.fid: It is empty."


def test_a_process_that_dies_is_told_and_replaced(
    qtbot: QtBot, pool: WorkerPool
) -> None:
    said = outcome(qtbot, pool, die)
    assert said.startswith("failed The working process ended")
    assert outcome(qtbot, pool, add, 2, 2) == "done 4"


ORPHANER = """
import os, sys, time
os.environ["QT_QPA_PLATFORM"] = "offscreen"
sys.path.insert(0, sys.argv[1])
from errands import wait_for_cancel
from PySide6.QtCore import QCoreApplication
from spinledger_app.workers import WorkerPool

if __name__ == "__main__":
    app = QCoreApplication([])
    pool = WorkerPool()
    pool.start()
    pool.run(wait_for_cancel, done=print, failed=print)
    begun = time.monotonic()
    while pool._executor is None or not pool._executor._processes:
        app.processEvents()
        time.sleep(0.01)
    time.sleep(1.0)
    print(*pool._executor._processes, flush=True)
    os._exit(1)  # as if it were killed
"""


def test_working_processes_end_with_a_killed_window(tmp_path: Path) -> None:
    script = tmp_path / "orphaner.py"
    script.write_text(ORPHANER)
    folder = str(Path(__file__).parent)
    run = subprocess.run(
        [sys.executable, str(script), folder],
        capture_output=True,
        text=True,
        check=False,
        timeout=60,
    )
    pids = [int(word) for word in run.stdout.split()]
    assert pids
    deadline = time.monotonic() + 20
    while any(Path(f"/proc/{pid}").exists() for pid in pids):
        assert time.monotonic() < deadline, "a working process lives on"
        time.sleep(0.05)
