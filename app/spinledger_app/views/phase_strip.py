"""Phase by hand: a strip over the lanes, and drags on the lanes while it shows."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QObject, QPointF, QSize, Qt, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent
from PySide6.QtWidgets import QDoubleSpinBox, QHBoxLayout, QLabel, QWidget

from spinledger_app.presenters.phasing import PhaseSetting
from spinledger_app.presenters.wording import number, say
from spinledger_app.theme import Look
from spinledger_app.views.controls import BenchButton
from spinledger_app.views.lanes_view import LanesView

_HEIGHT_PX = 44
_CLICK_PX = 4.0
# A whole turn for about the height of the lanes.
_DEG_PER_PX = 0.5
_FIRST_DEG_PER_PX = 1.0


class PhaseStrip(QWidget):
    """Both orders as numbers, the pivot, and what to do with them.

    Signals
    -------
    setting_typed : float zero order, float first order, degrees
    taken, given_up : none
    """

    setting_typed = Signal(float, float)
    taken = Signal()
    given_up = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.phase0 = _degrees(say("Zero order, degrees"))
        self.phase1 = _degrees(say("First order over the sweep, degrees"))
        self.pivot = QLabel()
        self.take = BenchButton(look, say("Take it"), parent=self)
        self.leave = BenchButton(look, say("Leave"), parent=self)
        hint = say("Drag up or down: zero order. Shift: first order. Click: pivot.")
        for widget in (self.phase0, self.phase1, self.take, self.leave):
            widget.setToolTip(hint)
        row = QHBoxLayout(self)
        row.setContentsMargins(16, 4, 16, 4)
        row.setSpacing(8)
        row.addWidget(QLabel(say("Zero order")))
        row.addWidget(self.phase0)
        row.addWidget(QLabel(say("First order")))
        row.addWidget(self.phase1)
        row.addWidget(self.pivot)
        row.addStretch(1)
        row.addWidget(self.take)
        row.addWidget(self.leave)
        self.setAccessibleName(say("Phase by hand"))
        self.retune()
        for box in (self.phase0, self.phase1):
            box.valueChanged.connect(self._tell)
        self.take.clicked.connect(lambda _=False: self.taken.emit())
        self.leave.clicked.connect(lambda _=False: self.given_up.emit())
        self.hide()

    def show_setting(self, setting: PhaseSetting, pivot_ppm: float) -> None:
        """Show both orders and the pivot."""
        for box, value in (
            (self.phase0, setting.phase0_deg),
            (self.phase1, setting.phase1_deg),
        ):
            box.blockSignals(True)
            box.setValue(value)
            box.blockSignals(False)
        words = say("Pivot {0} ppm").replace("{0}", number(pivot_ppm, 3))
        self.pivot.setText(words)

    def retune(self) -> None:
        """Take the look's text size again."""
        self.setFixedHeight(self.look.px(_HEIGHT_PX))
        for child in self.findChildren(QWidget):
            child.setFont(self.look.font())
        for box in (self.phase0, self.phase1):
            box.setFixedSize(self.look.px(92), self.look.px(28))

    def sizeHint(self) -> QSize:
        """One row."""
        return QSize(600, self.look.px(_HEIGHT_PX))

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Enter takes the phase, Escape leaves it."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self.taken.emit()
        elif event.key() == Qt.Key.Key_Escape:
            self.given_up.emit()
        else:
            super().keyPressEvent(event)

    def _tell(self) -> None:
        self.setting_typed.emit(self.phase0.value(), self.phase1.value())


class PhaseHand(QObject):
    """Takes the mouse of the lanes while the phase is set by hand.

    Signals
    -------
    turned : float zero order, float first order, degrees
        More of both, since the last such signal.
    pivoted : float ppm
    """

    turned = Signal(float, float)
    pivoted = Signal(float)

    def __init__(self, lanes: LanesView) -> None:
        super().__init__(lanes)
        self._lanes = lanes
        self._start: QPointF | None = None
        self._last = QPointF()
        self.is_active = False
        lanes.installEventFilter(self)

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Turn drags into phase, a click into a pivot; the wheel still zooms."""
        if not self.is_active or not isinstance(event, QMouseEvent):
            return False
        place = event.position()
        match event.type():
            case QEvent.Type.MouseButtonPress if _is_left(event):
                self._start = self._last = place
            case QEvent.Type.MouseMove if self._start is not None:
                self._drag(event)
            case QEvent.Type.MouseMove:
                self._lanes.setCursor(Qt.CursorShape.SizeVerCursor)
            case QEvent.Type.MouseButtonRelease if self._start is not None:
                self._release(place)
            case QEvent.Type.MouseButtonDblClick:
                return True
            case _:
                return False
        return True

    def _drag(self, event: QMouseEvent) -> None:
        rise = self._last.y() - event.position().y()
        self._last = event.position()
        if event.modifiers() & Qt.KeyboardModifier.ShiftModifier:
            self.turned.emit(0.0, rise * _FIRST_DEG_PER_PX)
        else:
            self.turned.emit(rise * _DEG_PER_PX, 0.0)

    def _release(self, place: QPointF) -> None:
        start, self._start = self._start, None
        is_click = start is not None and (place - start).manhattanLength() < _CLICK_PX
        shift_map = self._lanes.map
        ppm = None if shift_map is None else shift_map.ppm_at(place.x())
        if is_click and ppm is not None:
            self.pivoted.emit(ppm)


def _is_left(event: QMouseEvent) -> bool:
    return event.button() == Qt.MouseButton.LeftButton


def _degrees(name: str) -> QDoubleSpinBox:
    box = QDoubleSpinBox()
    box.setRange(-3600.0, 3600.0)
    box.setDecimals(1)
    box.setSingleStep(0.5)
    box.setSuffix("°")
    box.setAccessibleName(name)
    return box
