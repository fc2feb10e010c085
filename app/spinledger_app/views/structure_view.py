"""The sketch: heading with formula and mass, the structure editor, tags over it."""

from __future__ import annotations

from PySide6.QtCore import QRectF, QSize, Signal
from PySide6.QtGui import QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QVBoxLayout, QWidget

from spinledger.errors import StructureError
from spinledger.values.structure import Structure
from spinledger_app.painting.ink import SECOND, STRONG, Ink
from spinledger_app.presenters.tags import Tag
from spinledger_app.presenters.wording import formula, say
from spinledger_app.sketch.editor import StructureEditor
from spinledger_app.sketch.gestures import Kit, Tool
from spinledger_app.theme import Look
from spinledger_app.views.controls import BenchButton, IconButton
from spinledger_app.views.structure_tags import TagLayer

_MARGIN = 16
_HEAD_PX = 36
_LEAST_PX = (240, 220)


class SketchPanel(QWidget):
    """Heading over the editor; tags of the claims lie over the drawing.

    Signals
    -------
    paste_wanted, copy_wanted : none
    structure_drawn : str
        Molfile of what was drawn; empty once nothing is drawn.
    """

    paste_wanted = Signal()
    copy_wanted = Signal()
    structure_drawn = Signal(str)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self._mass = ""
        self._shown: Structure | None = None
        self.editor = StructureEditor(look, self)
        self.editor.keeps_history = False
        self.canvas = self.editor.canvas
        self.tags = TagLayer(self.canvas, self)
        self.paste = IconButton(
            look, "paste", say("Paste structure (Ctrl+V)"), parent=self
        )
        self.copy = IconButton(
            look, "copy", say("Copy structure as SMILES"), parent=self
        )
        self.first = BenchButton(look, say("Paste structure"), parent=self.canvas)
        self.first.setToolTip(say("Take SMILES, InChI or a molfile from the clipboard"))
        self._column = column = QVBoxLayout(self)
        column.setContentsMargins(0, look.px(_HEAD_PX) + 1, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.editor, 1)
        for button in (self.paste, self.first):
            button.clicked.connect(self.paste_wanted)
        self.copy.clicked.connect(self.copy_wanted)
        self.editor.structure_changed.connect(self._tell_drawing)
        self.editor.history_changed.connect(self._follow_drawing)
        self.canvas.view_changed.connect(self._place_first)
        for source in (self.editor.toolbar, self.canvas):
            source.kit_wanted.connect(lambda _: self.tags.lay_out())
        self.editor.setMinimumSize(look.px(_LEAST_PX[0]), look.px(180))
        self.setMinimumSize(look.px(_LEAST_PX[0]), look.px(_LEAST_PX[1]))
        self._follow_drawing()

    def show_structure(self, structure: Structure | None, *, is_own: bool) -> None:
        """Show the claimed structure.

        Parameters
        ----------
        structure : Structure or None
        is_own : bool
            It was drawn here just now: the drawing stays as it is.

        Raises
        ------
        StructureError
            If it cannot be drawn; the drawing is empty then.
        """
        if structure is self._shown:
            return
        self._shown = structure
        if is_own:
            return
        self.tags.show_tags((), {})
        block = "" if structure is None else structure.molblock
        try:
            self.editor.show_structure(block, is_anew=True)
        except StructureError:
            self.editor.show_structure("", is_anew=True)
            raise
        finally:
            self._choose_tool()
            self._follow_drawing()

    def _choose_tool(self) -> None:
        """Select where a structure came from outside, draw where there is none."""
        tool = Tool.PICK if self.editor.drawing.atoms else Tool.BOND
        if self.canvas.kit.tool is not tool:
            self.editor.choose(Kit(tool=tool))

    def show_claims(
        self, tags: tuple[Tag, ...], tips: dict[str, str], foot: tuple[str, str]
    ) -> None:
        """Show tags over the structure and remarks under it."""
        self.tags.show_tags(tags, tips)
        self.editor.show_remark(*foot)

    def show_mass(self, mass: str) -> None:
        """Molar mass beside the formula."""
        self._mass = mass
        self.update()

    def _tell_drawing(self, text: str) -> None:
        self.tags.show_tags((), {})  # they name the structure before
        self.structure_drawn.emit(text)

    def _follow_drawing(self) -> None:
        has_atoms = bool(self.editor.drawing.atoms)
        self.copy.setVisible(has_atoms)
        self.first.setVisible(not has_atoms)
        self.tags.lay_out()
        self._place_first()
        self.update()

    def retune(self) -> None:
        """Take the look's text size again."""
        for button in (self.paste, self.copy):
            button.retune()
        self._column.setContentsMargins(0, self.look.px(_HEAD_PX) + 1, 0, 0)
        self.editor.retune()
        self.editor.setMinimumSize(self.look.px(_LEAST_PX[0]), self.look.px(180))
        self.setMinimumSize(self.look.px(_LEAST_PX[0]), self.look.px(_LEAST_PX[1]))
        self._place_icons()
        self._place_first()
        self.tags.lay_out()

    def sizeHint(self) -> QSize:
        """As tall as there is room."""
        return QSize(256, 400)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep the icons at the right of the heading."""
        self._place_icons()
        super().resizeEvent(event)

    def _place_icons(self) -> None:
        px = self.look.px
        self.paste.move(self.width() - px(28) - 8, px(4))
        self.copy.move(self.width() - px(56) - 12, px(4))

    def _place_first(self) -> None:
        hint = self.first.sizeHint()
        x = (self.canvas.width() - hint.width()) // 2
        y = self.canvas.height() // 2 + self.look.px(32)
        self.first.setGeometry(x, y, hint.width(), hint.height())

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the heading."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        px = self.look.px
        ink.fill(QRectF(self.rect()), "panel")
        width = ink.text(_MARGIN, px(24), say("Sketch"), STRONG)
        left = _MARGIN + width + 12
        right = self.copy.x() - 6 if self.copy.isVisible() else self.paste.x() - 6
        known = formula(self.canvas.meaning.formula)
        remark = f"{known}  {self._mass}".strip() if known else ""
        ink.text(left, px(24), remark, SECOND, max_width=right - left)
        ink.hline(0, self.width(), px(_HEAD_PX))
        painter.end()
