"""The row of tools over the drawing: 28 px buttons, one of them chosen."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace
from functools import partial

from PySide6.QtCore import QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import (
    QPainter,
    QPainterPath,
    QPaintEvent,
    QPen,
)
from PySide6.QtWidgets import QButtonGroup, QHBoxLayout, QMenu, QWidget

from spinledger_app.painting.icons import paint_icon
from spinledger_app.painting.ink import Face, Ink
from spinledger_app.presenters.wording import say
from spinledger_app.sketch.gestures import ELEMENT_KEYS, Kit, Tool
from spinledger_app.theme import Look
from spinledger_app.views.controls import IconButton

_STROKE = 1.5
_ELEMENTS = (
    *("C", "N", "O", "F", "P", "S", "Cl", "Br", "I", "H", "D"),
    *("B", "Si", "Se", "Na", "K", "Li"),
)


def tool_names() -> dict[Tool, str]:
    """Name and key of every tool, as its tool tip says it."""
    return {
        Tool.PICK: say("Select, move, turn (Q)"),
        Tool.BOND: say("Bond (G)"),
        Tool.WEDGE: say("Wedge (W)"),
        Tool.RING: say("Ring (R); 3 to 8, or A for aromatic"),
        Tool.ELEMENT: say("Element (E), or its letter"),
        Tool.CHARGE: say("Charge (K), or + and -"),
        Tool.ERASE: say("Delete (X)"),
    }


class ToolButton(IconButton):
    """One tool; shows the ring size, element or charge that it is set to."""

    kit: Kit = Kit()

    def __init__(self, look: Look, tool: Tool, parent: QWidget) -> None:
        super().__init__(look, tool.value, tool_names()[tool], parent=parent)
        self.tool = tool
        self.setCheckable(True)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint ground and icon."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        if self.isChecked():
            ink.box(QRectF(self.rect()), fill="selected", edge="accent")
        elif self.underMouse():
            ink.fill(QRectF(self.rect()), "hover", 4)
        offset = (self.width() - 16) / 2
        painter.translate(offset, offset)
        self._paint_icon(ink)
        painter.end()

    def _paint_icon(self, ink: Ink) -> None:
        own: dict[Tool, Callable[[Ink], None]] = {
            Tool.BOND: _paint_bond,
            Tool.WEDGE: _paint_wedge,
            Tool.RING: self._paint_ring,
            Tool.ELEMENT: self._paint_element,
            Tool.CHARGE: self._paint_charge,
        }
        if self.tool in own:
            own[self.tool](ink)
        else:
            name = {Tool.PICK: "pick", Tool.ERASE: "cross"}[self.tool]
            paint_icon(ink, name, 0, 0, "ink")

    def _paint_ring(self, ink: Ink) -> None:
        size = self.kit.ring_size
        turn = -math.pi / 2 if size % 4 else math.pi / size
        path = QPainterPath()
        for k in range(size):
            angle = turn + 2 * math.pi * k / size
            corner = QPointF(8 + 7 * math.cos(angle), 8 + 7 * math.sin(angle))
            path.lineTo(corner) if k else path.moveTo(corner)
        path.closeSubpath()
        ink.stroke(path, "ink", _STROKE, mitred=True)
        if self.kit.is_aromatic:
            circle = QPainterPath()
            circle.addEllipse(QPointF(8, 8), 3, 3)
            ink.stroke(circle, "ink", 1.2)

    def _paint_element(self, ink: Ink) -> None:
        face = Face(size=14, weight=600)
        baseline = 8 + self.look.metrics(14, 600).capHeight() / 2
        ink.text(8, baseline, self.kit.element, face, align="centre")

    def _paint_charge(self, ink: Ink) -> None:
        first, second = ((2, 5, 8), (9, 12, 15))
        plus, minus = (first, second) if self.kit.charge_step > 0 else (second, first)
        ink.line((plus[0], 6), (plus[2], 6), "ink", _STROKE)
        ink.line((plus[1], 3), (plus[1], 9), "ink", _STROKE)
        ink.line((minus[0], 11), (minus[2], 11), "ink", _STROKE)


class Toolbar(QWidget):
    """All tools; arrows go from one to the next, Tab leaves the row."""

    kit_wanted = Signal(object)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self._kit = Kit()
        self._group = QButtonGroup(self)
        self._row = row = QHBoxLayout(self)
        row.setContentsMargins(12, 4, 12, 4)
        row.setSpacing(4)
        self.buttons: dict[Tool, ToolButton] = {}
        for tool in Tool:
            button = ToolButton(look, tool, self)
            self._group.addButton(button)
            self.buttons[tool] = button
            row.addWidget(button)
            button.clicked.connect(lambda _=False, one=tool: self._choose(one))
        row.addStretch(1)
        self.setAccessibleName(say("Drawing tools"))
        self.show_kit(self._kit)

    def show_kit(self, kit: Kit) -> None:
        """Show which tool is chosen and what it is set to."""
        self._kit = kit
        for button in self.buttons.values():
            button.kit = kit
            # The row is one stop of Tab; Qt's arrows go on inside the group.
            is_chosen = button.tool is kit.tool
            button.setFocusPolicy(
                Qt.FocusPolicy.StrongFocus if is_chosen else Qt.FocusPolicy.ClickFocus
            )
            button.update()
        self.buttons[kit.tool].setChecked(True)

    def retune(self) -> None:
        """Take the look's text size again."""
        for button in self.buttons.values():
            button.retune()

    def sizeHint(self) -> QSize:
        """One row of buttons."""
        return QSize(240, self.look.px(28) + 8)

    def _choose(self, tool: Tool) -> None:
        """Choose a tool; the one that is chosen already changes its setting."""
        kit = self._kit
        if tool is not kit.tool:
            self.kit_wanted.emit(replace(kit, tool=tool))
        elif tool is Tool.CHARGE:
            self.kit_wanted.emit(replace(kit, charge_step=-kit.charge_step))
        elif tool in (Tool.RING, Tool.ELEMENT):
            button = self.buttons[tool]
            menu = self.ring_menu() if tool is Tool.RING else self.element_menu()
            menu.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
            menu.popup(button.mapToGlobal(button.rect().bottomLeft()))

    def ring_menu(self) -> QMenu:
        """Sizes of the ring tool."""
        menu = QMenu(self)
        kinds = [(6, True), *((size, False) for size in range(3, 9))]
        for size, is_aromatic in kinds:
            name, key = say("Ring of {0}"), str(size)
            if is_aromatic:
                name, key = say("Aromatic ring of {0}"), "A"
            action = menu.addAction(f"{name.replace('{0}', str(size))}\t{key}")
            kit = replace(
                self._kit, tool=Tool.RING, ring_size=size, is_aromatic=is_aromatic
            )
            action.triggered.connect(partial(self.kit_wanted.emit, kit))
        return menu

    def element_menu(self) -> QMenu:
        """Elements of the element tool."""
        keys = {element: key.upper() for key, element in ELEMENT_KEYS.items()}
        menu = QMenu(self)
        for element in _ELEMENTS:
            action = menu.addAction(f"{element}\t{keys.get(element, '')}".strip())
            kit = replace(self._kit, tool=Tool.ELEMENT, element=element)
            action.triggered.connect(partial(self.kit_wanted.emit, kit))
        return menu


def _paint_bond(ink: Ink) -> None:
    path = QPainterPath(QPointF(2, 12))
    path.lineTo(8, 5)
    path.lineTo(14, 12)
    ink.painter.setPen(QPen(ink.colour("ink"), _STROKE))
    ink.painter.drawPath(path)


def _paint_wedge(ink: Ink) -> None:
    path = QPainterPath(QPointF(2, 14))
    path.lineTo(9.5, 2.5)
    path.lineTo(13.5, 6.5)
    path.closeSubpath()
    ink.area(path, "ink")
