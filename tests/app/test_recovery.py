"""Autosave, and what a program that was killed leaves behind."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest
from pytestqt.qtbot import QtBot

from spinledger.project.document import Project
from spinledger.project.storage import load_project, save_project
from spinledger.values.structure import Structure
from spinledger_app.recovery import Autosave, discard, left_behind
from spinledger_app.session import Session
from spinledger_app.workers import WorkerPool

STRUCTURE = Structure(given="CCO", molblock="", smiles="CCO")
KILLS = 6


@pytest.fixture(scope="module")
def pool(qapp: object) -> Iterator[WorkerPool]:
    made = WorkerPool()
    made.start()
    yield made
    made.close()


def changed(session: Session) -> None:
    session.apply("s", lambda project: replace(project, structure=STRUCTURE))


def test_unsaved_work_is_kept_and_goes_when_it_is_saved(
    qtbot: QtBot, pool: WorkerPool, tmp_path: Path
) -> None:
    session = Session()
    autosave = Autosave(session, pool, tmp_path, after_ms=20)
    changed(session)
    qtbot.waitUntil(autosave.path.exists, timeout=30_000)
    assert load_project(autosave.path).structure == STRUCTURE
    assert not pool.is_busy  # nobody has to wait for it
    session.mark_saved(session.project, tmp_path / "x.sledger")
    assert not autosave.path.exists()
    autosave.close()


def test_what_a_living_program_holds_is_not_offered(
    qtbot: QtBot, pool: WorkerPool, tmp_path: Path
) -> None:
    session = Session()
    autosave = Autosave(session, pool, tmp_path, after_ms=20)
    changed(session)
    qtbot.waitUntil(autosave.path.exists, timeout=30_000)
    assert left_behind(tmp_path) == []
    autosave.close()
    assert left_behind(tmp_path) == []  # closed as it should be
    assert not autosave.path.exists()


def test_what_is_left_behind_is_offered_newest_first(tmp_path: Path) -> None:
    for index, name in enumerate(("old", "new")):
        path = tmp_path / f"{name}.sledger"
        save_project(Project(name=name, structure=STRUCTURE), path)
        os.utime(path, (1_000_000 + index, 1_000_000 + index))
    (tmp_path / ".old.sledger.x.part").write_bytes(b"half")
    found = left_behind(tmp_path)
    assert [one.path.stem for one in found] == ["new", "old"]
    assert not list(tmp_path.glob(".*.part"))
    discard(found)
    assert left_behind(tmp_path) == []


WRITER = """
import sys
from pathlib import Path
from dataclasses import replace
from spinledger.project.document import Project
from spinledger.project.storage import save_project
from spinledger.values.structure import Structure
target = Path(sys.argv[1])
project = Project(structure=Structure(given="C" * 40000, molblock="x" * 400000, smiles="C"))
n = 0
while True:
    save_project(replace(project, name=f"save {n}"), target)
    n += 1
    print(n, flush=True)
"""


def test_a_kill_while_saving_loses_nothing(tmp_path: Path) -> None:
    target = tmp_path / "tube.sledger"
    for kill in range(KILLS):
        writer = subprocess.Popen(
            [sys.executable, "-c", WRITER, str(target)],
            stdout=subprocess.PIPE,
            text=True,
        )
        assert writer.stdout is not None
        writer.stdout.readline()  # one save is complete
        # At a different moment of a save each time.
        time.sleep(0.002 + 0.0071 * kill)
        writer.send_signal(signal.SIGKILL)
        writer.wait()
        writer.stdout.close()
        assert load_project(target).name.startswith("save ")
