"""What every handler works on."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from spinledger_app.bench import Bench
from spinledger_app.settings import BenchSettings
from spinledger_app.theme import Look
from spinledger_app.views.main_window import MainWindow


@dataclass(slots=True, eq=False, kw_only=True)
class Context:
    """The living parts of one window.

    Attributes
    ----------
    show_all, show_view : callable
        Show the project, or only the view, as it stands.
    last_ppm : float or None
        Shift under the mouse in the lanes, when it was last there.
    """

    window: MainWindow
    bench: Bench
    settings: BenchSettings
    look: Look
    show_all: Callable[[], None]
    show_view: Callable[[], None]
    last_ppm: float | None = None
