"""Small windows that ask or tell: sample, report, processing, keys, about."""

from __future__ import annotations

import platform
from collections.abc import Sequence
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

from PySide6.QtWidgets import (
    QCheckBox,
    QComboBox,
    QDialog,
    QDialogButtonBox,
    QDoubleSpinBox,
    QFileDialog,
    QFormLayout,
    QHBoxLayout,
    QLabel,
    QLineEdit,
    QPlainTextEdit,
    QPushButton,
    QTextBrowser,
    QVBoxLayout,
    QWidget,
)

from spinledger import __version__
from spinledger.errors import SideEvidenceError
from spinledger.processing.solvents import canonical_solvent, solvent_names
from spinledger.project.document import Sample
from spinledger.reconcile.side_reading import read_side_evidence
from spinledger.values.evidence import Evidence
from spinledger.values.recipe import Apodize, Recipe, Step
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look

_MOST_LISTED = 400
_MOST_DIGITS = 5
_PACKAGES = (
    ("PySide6_Essentials", "LGPL-3.0-only"),
    ("rdkit", "BSD-3-Clause"),
    ("numpy", "BSD-3-Clause"),
    ("scipy", "BSD-3-Clause"),
    ("nmrglue", "BSD-3-Clause"),
    ("pybaselines", "BSD-3-Clause"),
    ("lightgbm", "MIT"),
    ("font-source-sans-pro", "OFL-1.1 (Source Sans)"),
)
_FIXED_CAUTIONS = (
    "Consistent is not proven; only the listed contenders were tested.",
    "A spectrum in an achiral solvent says nothing of absolute configuration or "
    "enantiomeric excess: relative configuration only.",
    "Fitted uncertainties assume that the assignment is right.",
    "Content without protons (silica, most salts, residual deuterated solvent) is "
    "not seen.",
)


class BenchDialog(QDialog):
    """Column with a title, a body and buttons."""

    def __init__(self, look: Look, title: str, parent: QWidget | None) -> None:
        super().__init__(parent)
        self.look = look
        self.setWindowTitle(title)
        self.column = QVBoxLayout(self)
        self.column.setContentsMargins(20, 18, 20, 16)
        self.column.setSpacing(12)
        heading = QLabel(title)
        heading.setFont(look.font(16, 600))
        self.column.addWidget(heading)

    def add_buttons(self, accept: str | None) -> QDialogButtonBox:
        """Cancel and a word to go on with, or only Close."""
        kinds = QDialogButtonBox.StandardButton
        if accept is None:
            box = QDialogButtonBox(kinds.Close)
        else:
            box = QDialogButtonBox(kinds.Ok | kinds.Cancel)
            box.button(kinds.Ok).setText(accept)
        box.accepted.connect(self.accept)
        box.rejected.connect(self.reject)
        self.column.addWidget(box)
        return box


class _AskDialog(BenchDialog):
    """One field."""

    def __init__(
        self, look: Look, title: str, words: str, text: str, parent: QWidget
    ) -> None:
        super().__init__(look, title, parent)
        label = QLabel(words)
        self.field = QLineEdit(text)
        self.field.setMinimumWidth(look.px(380))
        self.field.setAccessibleName(words)
        label.setBuddy(self.field)
        self.column.addWidget(label)
        self.column.addWidget(self.field)
        self.add_buttons(say("Take it"))
        self.field.selectAll()
        self.field.setFocus()


def ask_text(
    look: Look, parent: QWidget, title: str, words: str, text: str = ""
) -> str | None:
    """Ask for a line of text; None when it was cancelled."""
    dialog = _AskDialog(look, title, words, text, parent)
    return dialog.field.text().strip() if dialog.exec() else None


def ask_whole(
    look: Look, parent: QWidget, title: str, words: str, text: str
) -> int | None:
    """Ask for a whole number: -1 for an empty field, None when it was cancelled."""
    given = ask_text(look, parent, title, words, text)
    if given is None:
        return None
    if not given:
        return -1
    return int(given) if given.isdecimal() and len(given) < _MOST_DIGITS else None


def ask_solvent(look: Look, parent: QWidget, evidence: Evidence) -> str | None:
    """Ask for the solvent: its name, "" for what the spectrum shows, or None."""
    dialog = BenchDialog(look, say("Solvent"), parent)
    seen = evidence.solvent_seen or say("nothing clear")
    header = evidence.solvent_header or say("nothing")
    words = QLabel(
        say("The spectrum shows {0}; the header says {1}.")
        .replace("{0}", seen)
        .replace("{1}", header)
    )
    words.setWordWrap(True)
    choice = QComboBox()
    choice.setAccessibleName(say("Solvent"))
    choice.addItem(say("as the spectrum shows"), "")
    for name in solvent_names():
        choice.addItem(name, name)
    known = canonical_solvent(evidence.solvent or "")
    index = choice.findData(known) if known else 0
    choice.setCurrentIndex(max(index, 0))
    dialog.column.addWidget(words)
    dialog.column.addWidget(choice)
    dialog.add_buttons(say("Process again"))
    return str(choice.currentData()) if dialog.exec() else None


class SampleDialog(BenchDialog):
    """What the label of the tube says."""

    _NAMES = (
        "name", "batch", "project", "submitted_by", "operator",
        "laboratory", "prepared", "remark",
    )  # fmt: skip

    def __init__(self, look: Look, sample: Sample, parent: QWidget) -> None:
        super().__init__(look, say("Sample and batch"), parent)
        words = (
            say("Sample"),
            say("Batch"),
            say("Project"),
            say("Submitted by"),
            say("Operator"),
            say("Laboratory"),
            say("Prepared"),
            say("Remark"),
        )
        form = QFormLayout()
        form.setSpacing(8)
        self._sample = sample
        self._fields = {}
        for name, word in zip(self._NAMES, words, strict=True):
            field = QLineEdit(getattr(sample, name))
            field.setMinimumWidth(look.px(300))
            field.setAccessibleName(word)
            form.addRow(word, field)
            self._fields[name] = field
        self.column.addLayout(form)
        self.add_buttons(say("Take it"))

    def sample(self) -> Sample:
        """The sample as it stands in the fields."""
        values = {name: field.text().strip() for name, field in self._fields.items()}
        return Sample(**values, sign_offs=self._sample.sign_offs)


class SideDialog(BenchDialog):
    """Side evidence: carbon list, HSQC and COSY pairs, as typed or pasted."""

    def __init__(self, look: Look, text: str, parent: QWidget) -> None:
        super().__init__(look, say("Side evidence"), parent)
        words = QLabel(
            say(
                "One kind a line, for example 13C: 170.9, 60.5 or carbons: 4; "
                "HSQC: 4.12/60.5, 1.26/14.2; COSY: 4.12/1.26."
            )
        )
        words.setWordWrap(True)
        self.box = QPlainTextEdit(text)
        self.box.setTabChangesFocus(True)
        self.box.setMinimumSize(look.px(420), look.px(150))
        self.box.setAccessibleName(say("Side evidence"))
        self.fault = QLabel()
        self.fault.setWordWrap(True)
        words.setBuddy(self.box)
        for part in (words, self.box, self.fault):
            self.column.addWidget(part)
        self.add_buttons(say("Take it"))
        self.box.setFocus()

    def text(self) -> str:
        """What is typed; empty for no side evidence."""
        return self.box.toPlainText().strip()

    def accept(self) -> None:
        """Close, unless the text cannot be understood; the reason stands below it."""
        if self.text():
            try:
                read_side_evidence(self.text())
            except SideEvidenceError as error:
                self.fault.setText(str(error))
                return
        super().accept()


class ReportDialog(BenchDialog):
    """Folder and formats of a report."""

    _FORMATS = (
        ("html", "HTML"),
        ("docx", "DOCX"),
        ("xlsx", "XLSX"),
        ("csv", "CSV"),
        ("text", "TXT"),
        ("svg", "SVG"),
        ("nmredata", "NMReDATA"),
        ("jcamp", "JCAMP-DX"),
    )
    _FIRST = ("html", "csv", "text", "svg")

    def __init__(self, look: Look, folder: str, parent: QWidget) -> None:
        super().__init__(look, say("Report"), parent)
        self._folder = QLineEdit(str(Path(folder) / "report") if folder else "")
        self._folder.setMinimumWidth(look.px(340))
        self._folder.setAccessibleName(say("Folder"))
        choose = QPushButton(say("Choose…"))
        choose.clicked.connect(self._choose)
        row = QHBoxLayout()
        row.addWidget(self._folder, 1)
        row.addWidget(choose)
        self.column.addWidget(QLabel(say("Folder; it is made if it is not there")))
        self.column.addLayout(row)
        self._boxes = {}
        boxes = QHBoxLayout()
        for name, word in self._FORMATS:
            box = QCheckBox(word)
            box.setChecked(name in self._FIRST)
            boxes.addWidget(box)
            self._boxes[name] = box
        self.column.addLayout(boxes)
        note = QLabel(say("ledger.json is always written beside them."))
        note.setFont(look.font(13))
        self.column.addWidget(note)
        self.add_buttons(say("Write report"))

    def _choose(self) -> None:
        chosen = QFileDialog.getExistingDirectory(
            self, say("Folder of the report"), self._folder.text()
        )
        if chosen:
            self._folder.setText(chosen)

    def folder(self) -> str:
        """Where to write."""
        return self._folder.text().strip()

    def formats(self) -> tuple[str, ...]:
        """What to write; the ledger itself last."""
        chosen = [name for name, box in self._boxes.items() if box.isChecked()]
        return (*chosen, "json")


class RecipeDialog(BenchDialog):
    """A processing step that is changed by hand."""

    can_change = True

    def recipe(self) -> Recipe:
        """The recipe as it stands in the fields."""
        raise NotImplementedError

    def what(self) -> str:
        """One phrase for the undo list."""
        raise NotImplementedError


class WindowDialog(RecipeDialog):
    """Exponential or resolution-enhancing window."""

    _KINDS = ("exponential", "lorentz_to_gauss", "none")

    def __init__(self, look: Look, recipe: Recipe, parent: QWidget) -> None:
        super().__init__(look, say("Window"), parent)
        self._recipe = recipe
        step = recipe.find(Apodize)
        self.can_change = isinstance(step, Apodize)
        self.kind = QComboBox()
        words = (say("exponential"), say("Lorentz to Gauss"), say("none"))
        for kind, word in zip(self._KINDS, words, strict=True):
            self.kind.addItem(word, kind)
        self.broadening = _hertz(-5.0)
        self.gaussian = _hertz(0.0)
        if isinstance(step, Apodize):
            self.kind.setCurrentIndex(max(0, self.kind.findData(step.kind)))
            self.broadening.setValue(step.line_broadening_hz)
            self.gaussian.setValue(step.gaussian_hz)
        form = QFormLayout()
        form.addRow(say("Kind"), self.kind)
        form.addRow(say("Broadening"), self.broadening)
        form.addRow(say("Gaussian width"), self.gaussian)
        self.column.addLayout(form)
        self.add_buttons(say("Process again"))

    def recipe(self) -> Recipe:
        """The recipe with the new window."""
        new = Apodize(
            kind=self.kind.currentData(),
            line_broadening_hz=self.broadening.value(),
            gaussian_hz=self.gaussian.value(),
        )
        steps: Sequence[Step] = [
            new if isinstance(step, Apodize) else step for step in self._recipe.steps
        ]
        return Recipe(steps=tuple(steps))

    def what(self) -> str:
        """One phrase for the undo list."""
        return (
            say("window {0}, {1} Hz")
            .replace("{0}", self.kind.currentText())
            .replace("{1}", f"{self.broadening.value():.2f}")
        )


def _hertz(least: float) -> QDoubleSpinBox:
    box = QDoubleSpinBox()
    box.setRange(least, 50.0)
    box.setDecimals(2)
    box.setSingleStep(0.1)
    box.setSuffix(" Hz")
    return box


class FileListDialog(BenchDialog):
    """The files of a place that could not be read."""

    def __init__(self, look: Look, place: Path, parent: QWidget) -> None:
        super().__init__(look, say("Files in {0}").replace("{0}", place.name), parent)
        text = QPlainTextEdit("\n".join(_listing(place)))
        text.setReadOnly(True)
        text.setMinimumSize(look.px(520), look.px(320))
        self.column.addWidget(text)
        self.add_buttons(None)


def _listing(place: Path) -> list[str]:
    if not place.exists():
        return [say("There is no such place.")]
    if place.is_file():
        return [f"{place.name}  {place.stat().st_size} bytes"]
    lines = []
    for file in sorted(place.rglob("*")):
        if file.is_file():
            lines.append(f"{file.relative_to(place)}  {file.stat().st_size} bytes")
        if len(lines) >= _MOST_LISTED:
            lines.append("…")
            break
    return lines or [say("The folder is empty.")]


class KeysDialog(BenchDialog):
    """Keys and gestures in one table."""

    def __init__(self, look: Look, parent: QWidget) -> None:
        super().__init__(look, say("Keys and gestures"), parent)
        browser = QTextBrowser()
        browser.setFont(look.font(14))
        browser.setHtml(_keys_html())
        browser.setMinimumSize(look.px(620), look.px(440))
        self.column.addWidget(browser)
        self.add_buttons(None)


def _keys_html() -> str:
    rows = (
        (say("Click a signal, then a proton or row"), say("puts them together")),
        (say("Drag a root along the axis"), say("moves a claim; it snaps to lines, Alt lets it go free")),
        (say("Drag a branch"), say("changes its J; Alt lets it go free")),
        (say("Drag over the lanes"), say("marks a region and measures it in Hz and ppm")),
        (say("Wheel, Shift + wheel, Ctrl + wheel"), say("zoom, pan, height")),
        (say("Double click"), say("looks at the signal under the cursor")),
        ("Home, Backspace, F", say("all of the axis, the view before, fold")),
        ("+, −, Alt + ←, Alt + →", say("zoom and pan from the keyboard")),
        ("←, →, Enter, Space", say("signal to signal, take it up, look at it")),
        ("S, P, U, L", say("swap, put elsewhere, take off, look at the selected claim")),
        ("N, B, F2, F3", say("next and previous claim, type J, rename")),
        ("X, M", say("leave a region out, mark it as an impurity")),
        ("R, Ctrl+.", say("refine, cancel")),
        ("T, Shift+T, O, Ctrl+D", say("next and previous spectrum of the sample, the others behind it, add one")),
        ("W, F9", say("claims at another field, fold the left panels")),
        (say("Phase: drag, Shift + drag, click"), say("zero order, first order, pivot")),
        ("Esc", say("lets go of what is taken up")),
        ("Tab", say("panel to panel; arrows go inside")),
    )  # fmt: skip
    cells = "".join(
        f"<tr><td style='padding:3px 18px 3px 0'><b>{keys}</b></td><td>{what}</td></tr>"
        for keys, what in rows
    )
    return f"<table>{cells}</table>"


class AboutDialog(BenchDialog):
    """What this is, its cautions and the licences of its parts."""

    def __init__(self, look: Look, cautions: tuple[str, ...], parent: QWidget) -> None:
        super().__init__(look, "Spin Ledger", parent)
        browser = QTextBrowser()
        browser.setFont(look.font(14))
        browser.setOpenExternalLinks(False)
        browser.setHtml(_about_html(cautions))
        browser.setMinimumSize(look.px(600), look.px(420))
        self.column.addWidget(browser)
        self.add_buttons(None)


def _about_html(cautions: tuple[str, ...]) -> str:
    every = dict.fromkeys((*_FIXED_CAUTIONS, *cautions))
    listed = "".join(f"<li>{say(one)}</li>" for one in every)
    parts = "".join(
        f"<tr><td style='padding-right:18px'>{name} {_version(name)}</td>"
        f"<td>{licence}</td></tr>"
        for name, licence in _PACKAGES
    )
    about = say(
        "Reconciles an acquired proton spectrum with a claimed structure, entry by entry."
    )
    return (
        f"<p>{say('Version')} {__version__}, Python {platform.python_version()}. {about}</p>"
        f"<h4>{say('Cautions')}</h4><ul>{listed}</ul>"
        f"<h4>{say('Licences')}</h4><p>Spin Ledger: Apache-2.0</p><table>{parts}</table>"
    )


def _version(name: str) -> str:
    try:
        return version(name)
    except PackageNotFoundError:
        return ""
