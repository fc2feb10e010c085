"""Builds the program: fonts, look, window, bench and working processes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from PySide6.QtCore import QCoreApplication, QSettings, QStandardPaths, QTimer
from PySide6.QtWidgets import QApplication

from spinledger.project.document import Project
from spinledger_app import tasks
from spinledger_app.bench import Bench
from spinledger_app.desk import Desk
from spinledger_app.languages import Words, chosen, table_of
from spinledger_app.recovery import Autosave, left_behind
from spinledger_app.settings import BenchSettings
from spinledger_app.theme import LIGHT, Look, load_fonts
from spinledger_app.views.main_window import MainWindow
from spinledger_app.workers import WorkerPool

_FIRST_SIZE = (1366, 768)


@dataclass(slots=True, kw_only=True)
class Parts:
    """The living parts of one window; kept alive by whoever holds this."""

    window: MainWindow
    bench: Bench
    desk: Desk
    pool: WorkerPool
    look: Look
    settings: BenchSettings


def build(store: QSettings, *, solvent: str | None = None) -> Parts:
    """Make a window with everything behind it, not yet shown.

    Parameters
    ----------
    store : QSettings
        Where settings are kept.
    solvent : str, optional
        Of spectra that are opened.
    """
    load_fonts()
    QApplication.setStyle("Fusion")
    settings = BenchSettings(store)
    look = Look(tokens=LIGHT, text_scale=settings.text_scale)
    window = MainWindow(look)
    pool = WorkerPool()
    bench = Bench(pool)
    if solvent is not None:
        options = replace(Project().options, solvent=solvent)
        bench.session.replace(Project(options=options), None)
    desk = Desk(window, bench, settings, look)
    window.resize(*_FIRST_SIZE)
    geometry = settings.geometry("window")
    if geometry is not None:
        window.restoreGeometry(geometry)
    sizes = settings.panel_sizes
    if sizes is not None:
        window.take_sizes(*sizes)
    return Parts(
        window=window, bench=bench, desk=desk, pool=pool, look=look, settings=settings
    )


def _recovery_folder() -> Path:
    place = QStandardPaths.writableLocation(
        QStandardPaths.StandardLocation.AppLocalDataLocation
    )
    return Path(place) / "recovery"


def run(*, places: Sequence[str], structure: str | None, solvent: str | None) -> int:
    """Show the window and go on until it is closed; gives the exit code."""
    app = QApplication.instance() or QApplication([])
    QCoreApplication.setOrganizationName("spinledger")
    QCoreApplication.setApplicationName("spinledger-bench")
    store = QSettings()
    words = Words(table_of(chosen(BenchSettings(store).language)))
    QCoreApplication.installTranslator(words)
    parts = build(store, solvent=solvent)
    folder = _recovery_folder()
    found = left_behind(folder)
    autosave = Autosave(parts.bench.session, parts.pool, folder)
    parts.desk.closing.connect(autosave.close)
    parts.window.show()
    parts.window.show_spectrum(False)
    if found and not places:
        parts.desk.offer_left_behind(found)
    # Manager and processes start after the window is up.
    QTimer.singleShot(0, lambda: parts.pool.start(tasks.WARM_UPS))
    parts.desk.open_later(list(places), structure)
    code = app.exec()
    parts.pool.close()
    return code
