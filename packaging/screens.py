"""Make the pictures of the bench: ``python packaging/screens.py OUT``.

Runs offscreen on the sample data, through the same reading and solving as the
program itself. With SPINLEDGER_SHARED set, or ``../shared`` beside the repo, three
acquired spectra are shown too. Pictures are PNG, named by state, size and theme.
"""

from __future__ import annotations

import argparse
import json
import os
import subprocess
import sys
import tempfile
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

ROOT = Path(__file__).resolve().parents[1]
SAMPLES = ROOT / "sample_data"
SHARED = Path(os.environ.get("SPINLEDGER_SHARED", ROOT.parent / "shared"))
ACQUIRED = ("br_l-tryptophan_bmse000050", "br_l-leucine_bmse000042", "jc_estragole")

if TYPE_CHECKING:
    from spinledger_app.application import Parts


@dataclass(frozen=True, slots=True, kw_only=True)
class Shot:
    """One picture: its name, what is shown, how large and in which theme."""

    name: str
    show: Callable[[Studio], None]
    size: tuple[int, int] = (1366, 768)
    theme: str = "light"
    scale: int = 1


class Studio:
    """A window and the projects that are put on it."""

    def __init__(self, folder: Path) -> None:
        from PySide6.QtCore import QSettings
        from PySide6.QtWidgets import QApplication

        from spinledger_app.application import build

        self.app = QApplication.instance() or QApplication([])
        store = QSettings(str(folder / "settings.ini"), QSettings.Format.IniFormat)
        self.parts: Parts = build(store)
        self.parts.window.show()

    def settle(self) -> None:
        """Let events, layouts and deferred deletions run."""
        from PySide6.QtCore import QEvent

        for _ in range(9):
            self.app.processEvents()
            self.app.sendPostedEvents(None, QEvent.Type.DeferredDelete.value)

    def open(self, data: Path, structure: str | None, *, is_quick: bool = True) -> None:
        """Read, process and solve, then show; nothing runs elsewhere."""
        from spinledger.project.document import (
            Project,
            open_spectrum,
            open_structure,
            with_evidence,
            with_ledger,
        )
        from spinledger.reconcile.options import ReconcileOptions
        from spinledger.structure.read import read_structure
        from spinledger_app import tasks
        from spinledger_app.presenters.drawing import drawing_of

        bench = self.parts.bench
        when = "2026-12-01T12:00:00+00:00"
        project = Project()
        read = tasks.read_spectrum(_say, _never, data, project.options)
        project = open_spectrum(
            project, read.acquired, source_path=str(data), when=when
        )
        project = with_evidence(project, read.evidence)
        bench.drawing = None
        if structure is not None:
            claimed = tasks.read_claim(_say, _never, structure)
            project = open_structure(project, claimed.structure, when=when)
            bench.drawing = claimed.drawing
            options = ReconcileOptions(quick=is_quick)
            ledger = tasks.solve(
                _say, _never, read.evidence, claimed.structure, options
            )
            project = with_ledger(project, ledger, when=when)
            bench.thumbnails = {
                one.smiles: drawing_of(read_structure(one.smiles))
                for one in ledger.contenders
            }
            bench._drawn_smiles = claimed.structure.smiles
        bench.is_full_tested = not is_quick
        bench.session.replace(project, None)
        bench._timer.stop()
        self.parts.desk.show_all()
        self.settle()


def _say(_stage: str, _fraction: float) -> None:
    return None


def _never() -> bool:
    return False


def empty(studio: Studio) -> None:
    """Nothing is open."""
    studio.parts.bench.new_project()


def opened(studio: Studio) -> None:
    """A spectrum without a structure."""
    studio.open(SAMPLES / "batch-117", None)
    studio.parts.window.lanes.set_folded(False)


def solved(studio: Studio) -> None:
    """The sample ester, solved in full."""
    hydroxy_ester = str(SAMPLES / "structures" / "hydroxy-ester.mol")
    studio.open(SAMPLES / "batch-117", hydroxy_ester, is_quick=False)


def folded(studio: Studio) -> None:
    """Empty stretches folded away."""
    studio.parts.window.lanes.set_folded(True)


def continuous(studio: Studio) -> None:
    """The continuous axis with integral curves."""
    studio.parts.window.lanes.set_folded(False)


def zoomed(studio: Studio) -> None:
    """The two protons beside the stereocentre."""
    studio.parts.window.lanes.zoom_to(2.38, 2.53)


def claim_selected(studio: Studio) -> None:
    """One claim taken up, its row unfolded."""
    studio.parts.bench.selection.select("2-HB")
    studio.parts.window.lanes.zoom_to(2.38, 2.53)


def contenders(studio: Studio) -> None:
    """A card of another structure pointed at, its menu open beside it."""
    studio.parts.window.lanes.set_folded(True)
    cards = studio.parts.window.contenders.cards
    if cards:
        cards[0].setFocus()


def sketching(studio: Studio) -> None:
    """A bond about to be drawn from an atom of the sample's structure."""
    from spinledger_app.sketch.gestures import Kit, Spot, Tool

    editor = studio.parts.window.sketch.editor
    editor.choose(Kit(tool=Tool.BOND))
    studio.parts.window.sketch.tags.hide()
    editor.canvas.spot = Spot(atom=0)
    editor.canvas.update()


def phasing(studio: Studio) -> None:
    """The phase set by hand, a few degrees off."""
    studio.parts.window.lanes.set_folded(False)
    studio.parts.desk.do("phase")
    studio.parts.desk.process.phasing.hand.turned.emit(24.0, 0.0)


def disputed(studio: Studio) -> None:
    """The wrong isomer's structure on the same spectrum."""
    wrong = str(SAMPLES / "structures" / "wrong-isomer.mol")
    studio.open(SAMPLES / "batch-117", wrong)
    studio.parts.window.lanes.set_folded(True)
    ledger = studio.parts.bench.project.ledger
    assert ledger is not None
    doubtful = [e.claim for e in ledger.entries if e.state in ("disputed", "open")]
    studio.parts.bench.selection.select(doubtful[0] if doubtful else None)


def _acquired(name: str) -> Callable[[Studio], None]:
    def show(studio: Studio) -> None:
        project = studio.parts.bench.project
        if name in (project.source_path or "") and project.ledger is not None:
            return  # solved for the picture before
        folder = SHARED / "acquired" / name
        facts = json.loads((folder / "truth.json").read_text())
        studio.open(folder / "raw", str(facts["smiles"]))
        studio.parts.window.lanes.set_folded(True)

    return show


def shots() -> list[Shot]:
    """Every picture, in an order that solves each spectrum once."""
    made = [
        Shot(name="empty", show=empty),
        Shot(name="empty", show=empty, theme="dark"),
        Shot(name="opened", show=opened),
        Shot(name="solved", show=solved, scale=1),
        Shot(name="folded", show=folded, theme="dark", size=(1920, 1080)),
        Shot(name="continuous", show=continuous),
        Shot(name="zoomed", show=zoomed),
        Shot(name="zoomed", show=zoomed, theme="dark"),
        Shot(name="selected", show=claim_selected),
        Shot(name="contrast", show=folded, theme="high contrast"),
        Shot(name="contenders", show=contenders),
        Shot(name="sketching", show=sketching),
        Shot(name="phasing", show=phasing),
        Shot(name="folded", show=folded),
        Shot(name="disputed", show=disputed),
        Shot(name="disputed", show=disputed, theme="dark"),
        Shot(name="solved", show=solved, size=(1920, 1080), scale=2),
        Shot(name="zoomed", show=zoomed, size=(1920, 1080), scale=2, theme="dark"),
    ]
    if (SHARED / "acquired").is_dir():
        made += [
            Shot(name=name.split("_")[1], show=_acquired(name), size=size, theme=theme)
            for name in ACQUIRED
            for size, theme in (((1920, 1080), "light"), ((1366, 768), "dark"))
        ]
    return made


def take(out: Path, scale: int) -> None:
    """Take the pictures of one screen scale."""
    with tempfile.TemporaryDirectory() as folder:
        studio = Studio(Path(folder))
        window = studio.parts.window
        for shot in shots():
            if shot.scale != scale:
                continue
            window.resize(*shot.size)
            studio.parts.desk.view.take_theme(shot.theme)
            studio.parts.bench.selection.clear()
            studio.settle()
            studio.parts.desk.do("let_go")
            window.lanes.go_home()
            shot.show(studio)
            studio.settle()
            if shot.name != "empty":
                window.ring.rest()
            window.lanes.finish_easing()
            studio.settle()
            picture = window.grab()
            width, height = picture.width(), picture.height()
            theme = shot.theme.replace(" ", "-")
            path = out / f"{shot.name}-{theme}-{width}x{height}.png"
            if not picture.save(str(path)):
                raise SystemExit(f"{path}: the picture could not be written")
            print(path)


def main() -> int:
    """Take all pictures; each screen scale needs a process of its own."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("out", type=Path, help="folder for the pictures")
    parser.add_argument("--scale", type=int, help=argparse.SUPPRESS)
    arguments = parser.parse_args()
    arguments.out.mkdir(parents=True, exist_ok=True)
    if arguments.scale is not None:
        take(arguments.out, arguments.scale)
        return 0
    for scale in (1, 2):
        environment = {**os.environ, "QT_SCALE_FACTOR": str(scale)}
        command = [sys.executable, __file__, str(arguments.out), "--scale", str(scale)]
        done = subprocess.run(command, env=environment, check=False)
        if done.returncode != 0:
            return done.returncode
    return 0


if __name__ == "__main__":
    sys.exit(main())
