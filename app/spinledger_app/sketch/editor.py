"""The structure editor as one widget: tools, drawing surface, and a line of words."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from PySide6.QtCore import QMimeData, QRectF, QSize, Qt, Signal
from PySide6.QtGui import (
    QContextMenuEvent,
    QDragEnterEvent,
    QDropEvent,
    QGuiApplication,
    QKeyEvent,
    QKeySequence,
    QPainter,
    QPaintEvent,
)
from PySide6.QtWidgets import QMenu, QVBoxLayout, QWidget

from spinledger.errors import OutputError, StructureError
from spinledger_app.clipboard import leave_plain_text
from spinledger_app.painting.ink import SECOND, SECOND_INK, Ink
from spinledger_app.presenters.wording import formula, say
from spinledger_app.sketch.canvas import SketchCanvas
from spinledger_app.sketch.chemistry import from_text, meaning
from spinledger_app.sketch.drawing import EMPTY, Drawing, merged, part
from spinledger_app.sketch.gestures import Edit, Kit
from spinledger_app.sketch.molfile import molblock
from spinledger_app.sketch.toolbar import Toolbar
from spinledger_app.sketch.transfer import (
    holds_structure,
    mime_data,
    svg,
    text_of,
)
from spinledger_app.sketch.words import tool_hint
from spinledger_app.theme import Look

_FOOT_PX = 44
_MARGIN_PX = 16


class StructureEditor(QWidget):
    """Draws structures; tells each sound drawing as a molfile.

    Attributes
    ----------
    structure_changed : Signal(str)
        Molfile of the drawing after every edit that leaves it sound; an empty
        text once nothing is drawn. Nothing is told while an atom breaks a
        valence rule; the fault is shown in place.
    structure_text_rejected : Signal(str)
        One sentence about a pasted or dropped text that is no structure.
    picture_wanted : Signal()
        The picture is to be saved; whoever hears it asks for a file and calls
        :meth:`save_svg`.
    history_changed : Signal()
        What can be undone or redone is another.
    undo_wanted, redo_wanted : Signal()
        Where whoever embeds the editor keeps the way back (``keeps_history`` is
        False), told instead of stepping back alone.
    """

    structure_changed = Signal(str)
    structure_text_rejected = Signal(str)
    picture_wanted = Signal()
    history_changed = Signal()
    undo_wanted = Signal()
    redo_wanted = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.keeps_history = True
        self._remark = ("", "")
        self._told = ""
        self._shown = ""
        self._rejection = ""
        self.toolbar = Toolbar(look, self)
        self.canvas = SketchCanvas(look, self)
        self._column = column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, look.px(_FOOT_PX))
        column.setSpacing(1)
        column.addWidget(self.toolbar)
        column.addWidget(self.canvas, 1)
        self.toolbar.kit_wanted.connect(self.choose)
        self.canvas.kit_wanted.connect(self.choose)
        self.canvas.drawing_changed.connect(self._take_drawing)
        app = QGuiApplication.instance()
        assert isinstance(app, QGuiApplication)
        app.aboutToQuit.connect(leave_plain_text)
        self.setAcceptDrops(True)
        self.setFocusProxy(self.canvas)
        self.setAccessibleName(say("Sketch"))
        self.setMinimumSize(look.px(240), look.px(240))

    @property
    def drawing(self) -> Drawing:
        """The drawing as it stands."""
        return self.canvas.drawing

    @property
    def undo_label(self) -> str:
        """Name of the edit that would be taken back; empty if there is none."""
        return self.canvas.history.undo_label

    @property
    def redo_label(self) -> str:
        """Name of the edit that would be made again; empty if there is none."""
        return self.canvas.history.redo_label

    def show_structure(self, text: str, *, is_anew: bool = False) -> None:
        """Show a structure from outside, without a way back to the one before.

        The structure that is drawn already, in whatever text, changes nothing: its
        layout and its undo steps stay, unless it is to be shown anew.

        Parameters
        ----------
        text : str
            Molfile, SMILES or InChI; empty for an empty drawing.

        Raises
        ------
        StructureError
            If the text cannot be read as a structure.
        """
        if not is_anew and text in (self._told, self._shown):
            return
        drawing = from_text(text) if text.strip() else EMPTY
        smiles = self.canvas.meaning.smiles
        self._shown = text
        if not is_anew and smiles and meaning(drawing).smiles == smiles:
            return
        self._told = text
        self._rejection = ""
        self.canvas.show_drawing(drawing)
        self.history_changed.emit()
        self.update()

    def choose(self, kit: Kit) -> None:
        """Choose a tool and its settings."""
        self.canvas.kit = kit
        self.canvas.update()
        self.toolbar.show_kit(kit)
        self.update()

    def show_remark(self, left: str, right: str) -> None:
        """Say something about the structure under it, at the left and the right."""
        self._remark = (left, right)
        self.update()

    def undo(self) -> None:
        """Take the last edit back, or ask whoever keeps the way back to do so.

        A drawing with a fault was never told; the way back from it is here.
        """
        if self.keeps_history or self.canvas.meaning.faults:
            self.canvas.undo()
        else:
            self.undo_wanted.emit()

    def redo(self) -> None:
        """Make the edit again that was taken back."""
        if self.keeps_history or self.canvas.meaning.faults:
            self.canvas.redo()
        else:
            self.redo_wanted.emit()

    def clean_up(self) -> None:
        """Lay the structure out anew."""
        self.canvas.clean_up()

    def insert_text(self, text: str) -> bool:
        """Put a structure beside what is drawn, selected; False if it is none.

        A text that cannot be read changes nothing and is told in one sentence.
        """
        try:
            pasted = from_text(text)
        except StructureError as error:
            self._reject(error.reason)
            return False
        n_before = len(self.drawing.atoms)
        drawing = merged(self.drawing, pasted)
        new = (
            frozenset(range(n_before, len(drawing.atoms))) if n_before else frozenset()
        )
        self.canvas.apply(Edit(label="Paste", drawing=drawing), select=new)
        self.canvas.fit()
        return True

    def paste(self) -> None:
        """Insert the structure on the clipboard."""
        self._insert_data(QGuiApplication.clipboard().mimeData())

    def copy(self) -> None:
        """Put the selection, else the whole drawing, on the clipboard."""
        drawing = self.drawing
        if self.canvas.selected:
            drawing = part(drawing, self.canvas.selected)
        if drawing.atoms:
            QGuiApplication.clipboard().setMimeData(mime_data(drawing, self.look))

    def cut(self) -> None:
        """Copy the selection, then delete it."""
        if self.canvas.selected:
            self.copy()
            self.canvas.delete()

    def save_svg(self, path: Path) -> None:
        """Write the drawing as a vector picture.

        Raises
        ------
        OutputError
            If the file cannot be written.
        """
        try:
            path.write_bytes(svg(self.drawing, self.look))
        except OSError as error:
            raise OutputError(
                path, "The picture cannot be written here; choose another folder."
            ) from error

    def retune(self) -> None:
        """Take the look's text size and colours again."""
        self.toolbar.retune()
        self._column.setContentsMargins(0, 0, 0, self.look.px(_FOOT_PX))
        self.setMinimumSize(self.look.px(240), self.look.px(240))
        self.canvas.fit()
        self.update()

    def sizeHint(self) -> QSize:
        """As tall as there is room."""
        return QSize(256, 400)

    def _take_drawing(self) -> None:
        self._rejection = ""
        self.history_changed.emit()
        self.update()
        if self.canvas.meaning.faults:
            return
        text = molblock(self.drawing) if self.drawing.atoms else ""
        if text != self._told:
            self._told, self._shown = text, text
            self.structure_changed.emit(text)

    def _insert_data(self, data: QMimeData) -> None:
        try:
            text = text_of(data)
        except StructureError as error:
            self._reject(error.reason)
            return
        if not text.strip():
            self._reject(say("The clipboard holds no structure."))
            return
        self.insert_text(text)

    def _reject(self, sentence: str) -> None:
        self._rejection = sentence
        self.structure_text_rejected.emit(sentence)
        self.update()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Undo, redo, copy, cut, paste, select all, clean up."""
        keys = QKeySequence.StandardKey
        acts: tuple[tuple[QKeySequence.StandardKey, Callable[[], None]], ...] = (
            (keys.Undo, self.undo),
            (keys.Redo, self.redo),
            (keys.Copy, self.copy),
            (keys.Cut, self.cut),
            (keys.Paste, self.paste),
            (keys.SelectAll, self.select_all),
        )
        for standard, act in acts:
            if event.matches(standard):
                act()
                return
        is_ctrl = event.modifiers() == Qt.KeyboardModifier.ControlModifier
        others = {int(Qt.Key.Key_Y): self.redo, int(Qt.Key.Key_L): self.clean_up}
        if is_ctrl and event.key() in others:
            others[event.key()]()
            return
        super().keyPressEvent(event)

    def select_all(self) -> None:
        """Select every atom."""
        self.canvas.select(frozenset(range(len(self.drawing.atoms))))

    def menu(self) -> QMenu:
        """All that can be done with the whole drawing, with its keys."""
        menu = QMenu(self)
        is_embedded = not self.keeps_history
        has_atoms, undo, redo = bool(self.drawing.atoms), say("Undo"), say("Redo")
        entries: tuple[tuple[str, str, Callable[[], None], bool], ...] = (
            (undo, "Ctrl+Z", self.undo, bool(self.undo_label) or is_embedded),
            (redo, "Ctrl+Y", self.redo, bool(self.redo_label) or is_embedded),
            ("", "", self.undo, False),
            (say("Cut"), "Ctrl+X", self.cut, bool(self.canvas.selected)),
            (say("Copy"), "Ctrl+C", self.copy, has_atoms),
            (say("Paste"), "Ctrl+V", self.paste, True),
            (say("Select all"), "Ctrl+A", self.select_all, has_atoms),
            ("", "", self.undo, False),
            (say("Clean up"), "Ctrl+L", self.clean_up, has_atoms),
            (say("Show all"), "Home", self.canvas.fit, has_atoms),
            (say("Clear"), "", self.clear, has_atoms),
            (say("Save picture…"), "", self.picture_wanted.emit, has_atoms),
        )
        for name, key, act, is_enabled in entries:
            if not name:
                menu.addSeparator()
                continue
            action = menu.addAction(f"{name}\t{key}")
            action.setEnabled(is_enabled)
            action.triggered.connect(act)
        return menu

    def clear(self) -> None:
        """Delete all that is drawn; can be undone."""
        self.canvas.apply(Edit(label="Clear", drawing=EMPTY))

    def contextMenuEvent(self, event: QContextMenuEvent) -> None:
        """Offer what can be done with the drawing."""
        menu = self.menu()
        menu.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        menu.popup(event.globalPos())

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        """Accept what may be a structure."""
        if holds_structure(event.mimeData()):
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        """Insert what was dropped."""
        event.acceptProposedAction()
        self._insert_data(event.mimeData())

    def foot(self) -> str:
        """The line under the drawing: a fault, a refusal, or what the tool does."""
        if self._rejection:
            return self._rejection
        if self.canvas.meaning.faults:
            return self.canvas.meaning.faults[0].sentence
        return tool_hint(self.canvas.kit)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the ground, a rule under the tools, and the line of words."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        ink.fill(QRectF(self.rect()), "panel")
        top = self.height() - px(_FOOT_PX)
        ink.hline(0, self.width(), top)
        ink.hline(0, self.width(), self.canvas.y() - 1)
        is_told = bool(self._rejection or self.canvas.meaning.faults)
        width = self.width() - 2 * _MARGIN_PX
        if not is_told and self.canvas.meaning.formula:
            left, right = self._remark
            if not left and not right:
                left = formula(self.canvas.meaning.formula)
            taken = ink.text(
                _MARGIN_PX, top + px(17), left, SECOND_INK, max_width=width
            )
            ink.text(
                self.width() - _MARGIN_PX, top + px(17), right, SECOND, align="right",
                max_width=width - taken - 10,
            )  # fmt: skip
            ink.text(_MARGIN_PX, top + px(34), self.foot(), SECOND, max_width=width)
        else:
            face = SECOND_INK if is_told else SECOND
            ink.wrapped(_MARGIN_PX, top + px(17), width, self.foot(), face, max_lines=2)
        painter.end()
