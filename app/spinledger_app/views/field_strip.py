"""What if the field were another: a slider over the lanes."""

from __future__ import annotations

from PySide6.QtCore import QSize, Qt, Signal
from PySide6.QtGui import QKeyEvent
from PySide6.QtWidgets import QHBoxLayout, QLabel, QSlider, QWidget

from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look
from spinledger_app.views.controls import BenchButton

_HEIGHT_PX = 44
_LEAST_MHZ, _MOST_MHZ = 40, 1200


class FieldStrip(QWidget):
    """A slider of proton frequencies.

    Signals
    -------
    field_wanted : float MHz
    given_up : none
    """

    field_wanted = Signal(float)
    given_up = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.slider = QSlider(Qt.Orientation.Horizontal)
        self.slider.setRange(_LEAST_MHZ, _MOST_MHZ)
        self.slider.setSingleStep(10)
        self.slider.setPageStep(100)
        self.slider.setMinimumWidth(look.px(120))
        self.slider.setAccessibleName(say("Field as proton frequency, MHz"))
        self.value = QLabel()
        self.leave = BenchButton(look, say("Leave"), parent=self)
        self.leave.setToolTip(say("Show the spectrum alone again (Esc)"))
        row = QHBoxLayout(self)
        row.setContentsMargins(16, 4, 16, 4)
        row.setSpacing(12)
        row.addWidget(QLabel(say("Claims at")))
        row.addWidget(self.value)
        row.addWidget(self.slider, 1)
        row.addWidget(self.leave)
        self.setAccessibleName(say("What if the field were another"))
        self.retune()
        self.slider.valueChanged.connect(self._tell)
        self.leave.clicked.connect(lambda _=False: self.given_up.emit())
        self.hide()

    def show_field(self, frequency_mhz: float) -> None:
        """Show a field, without asking for it."""
        self.slider.blockSignals(True)
        self.slider.setValue(round(frequency_mhz))
        self.slider.blockSignals(False)
        self._show_value()

    def retune(self) -> None:
        """Take the look's text size again."""
        self.setFixedHeight(self.look.px(_HEIGHT_PX))
        for child in self.findChildren(QWidget):
            child.setFont(self.look.font())

    def sizeHint(self) -> QSize:
        """One row."""
        return QSize(600, self.look.px(_HEIGHT_PX))

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Escape closes the strip."""
        if event.key() == Qt.Key.Key_Escape:
            self.given_up.emit()
        else:
            super().keyPressEvent(event)

    def _show_value(self) -> None:
        self.value.setText(f"{self.slider.value()} MHz")

    def _tell(self) -> None:
        self._show_value()
        self.field_wanted.emit(float(self.slider.value()))
