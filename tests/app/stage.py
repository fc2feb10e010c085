"""A window with an invented project on it, for tests and pictures."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import invented
from PySide6.QtCore import QEvent, QSettings
from PySide6.QtGui import QImage
from PySide6.QtWidgets import QApplication

from spinledger.project.document import Project
from spinledger.structure.read import read_structure
from spinledger.values.ledger import Ledger
from spinledger_app.application import Parts, build
from spinledger_app.presenters.drawing import drawing_of


def stage(folder: Path, *, size: tuple[int, int] = (1366, 768)) -> Parts:
    """A shown window without working processes."""
    store = QSettings(str(folder / "settings.ini"), QSettings.Format.IniFormat)
    parts = build(store)
    parts.window.resize(*size)
    parts.window.show()
    settle()
    return parts


def settle() -> None:
    """Let events, layouts and deferred deletions run."""
    app = QApplication.instance()
    assert app is not None
    for _ in range(9):
        app.processEvents()
        app.sendPostedEvents(None, QEvent.Type.DeferredDelete.value)


def put_on(parts: Parts, ledger: Ledger | None, *, has_structure: bool = True) -> None:
    """Open a project with a ledger, as if it had just been solved."""
    seen = invented.evidence() if ledger is None else ledger.evidence
    structure = read_structure(invented.SMILES)
    if ledger is not None:
        ledger = replace(ledger, structure=structure)
        parts.bench.thumbnails = {
            one.smiles: drawing_of(read_structure(one.smiles))
            for one in ledger.contenders
        }
    project = Project(
        name="batch-117",
        source_name="batch-117",
        acquired=invented.maker_spectrum(),
        structure=structure if has_structure else None,
        evidence=seen,
        ledger=ledger,
    )
    parts.bench.drawing = drawing_of(structure) if has_structure else None
    parts.bench.is_full_tested = True
    parts.bench._drawn_smiles = structure.smiles
    parts.bench.session.replace(project, None)
    parts.bench._timer.stop()
    parts.desk.show_all()
    settle()


def picture(parts: Parts) -> QImage:
    """What the window shows."""
    settle()
    parts.window.lanes._stop_easing()
    parts.window.lanes.refresh()
    settle()
    return parts.window.grab().toImage()


def take_down(parts: Parts) -> None:
    """Close the window and its processes."""
    parts.pool.close()
    parts.window.hide()
    parts.window.deleteLater()
    settle()
