"""The shift of a line set by hand: click the line, type where it belongs."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QObject, Qt, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent
from PySide6.QtWidgets import QLineEdit

from spinledger_app.presenters.wording import say
from spinledger_app.views.lanes_view import LanesView

_REACH_PX = 12.0
_FIELD_WIDTH_PX = 96


class ReferenceHand(QObject):
    """Takes the next click in the lanes, and opens a field at the line there.

    Signals
    -------
    line_chosen : float ppm
        A line was clicked; answered by :meth:`ask`.
    missed : none
        There is no line near the click.
    typed : float ppm of the line, str
    given_up : none
    """

    line_chosen = Signal(float)
    missed = Signal()
    typed = Signal(float, str)
    given_up = Signal()

    def __init__(self, lanes: LanesView) -> None:
        super().__init__(lanes)
        self._lanes = lanes
        self._line_ppm = 0.0
        self.is_waiting = False
        self.field: QLineEdit | None = None
        lanes.installEventFilter(self)

    @property
    def is_active(self) -> bool:
        """Whether it waits for a click or for a number."""
        return self.is_waiting or self.field is not None

    def begin(self) -> None:
        """Wait for a click at a line."""
        self.leave()
        self.is_waiting = True
        self._lanes.setFocus(Qt.FocusReason.OtherFocusReason)

    def leave(self) -> None:
        """Wait no longer, and close the field."""
        self.is_waiting = False
        field, self.field = self.field, None
        if field is not None:
            field.hide()
            field.deleteLater()

    def ask(self, line_ppm: float, suggested_ppm: float) -> None:
        """Open a field beside a line; the suggestion is selected in it."""
        self.leave()
        lanes, px = self._lanes, self._lanes.look.px
        x = None if lanes.map is None else lanes.map.x_of(line_ppm)
        layout = lanes.layout_now
        field = QLineEdit(f"{suggested_ppm:.3f}", lanes)
        words = say("Where the line at {0} ppm belongs, in ppm; Enter takes it")
        field.setToolTip(words.replace("{0}", f"{line_ppm:.4f}"))
        field.setAccessibleName(field.toolTip())
        width = px(_FIELD_WIDTH_PX)
        middle = (layout.left + layout.right) / 2 if x is None else x
        left = min(max(middle + 10, layout.left), layout.right - width)
        field.setGeometry(round(left), round(layout.curve_top), width, px(28))
        field.installEventFilter(self)
        field.returnPressed.connect(self._take)
        field.show()
        field.selectAll()
        field.setFocus()
        self.field, self._line_ppm = field, line_ppm

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Take the click at a line, and Escape in the field."""
        is_escape = (
            isinstance(event, QKeyEvent)
            and event.type() in (QEvent.Type.KeyPress, QEvent.Type.ShortcutOverride)
            and event.key() == Qt.Key.Key_Escape
        )
        if watched is self.field and is_escape:
            event.accept()
            if event.type() == QEvent.Type.KeyPress:
                self.given_up.emit()
            return True
        if watched is not self._lanes or not self.is_waiting:
            return False
        if isinstance(event, QKeyEvent):
            return event.type() == QEvent.Type.KeyPress and self._take_key(event)
        if not isinstance(event, QMouseEvent):
            return False
        if event.button() != Qt.MouseButton.LeftButton:
            return False
        if event.type() == QEvent.Type.MouseButtonRelease:
            self._choose(event.position().x())
        return True

    def choose_near(self, shift_ppm: float) -> None:
        """Take the line nearest to a shift, as if it had been clicked."""
        scene = self._lanes.scene
        feet = [] if scene is None else [foot.shift_ppm for foot in scene.feet]
        if feet:
            self.line_chosen.emit(min(feet, key=lambda ppm: abs(ppm - shift_ppm)))
        else:
            self.missed.emit()

    def _take_key(self, event: QKeyEvent) -> bool:
        """Enter takes the line of the signal that the arrow keys point at."""
        view = self._lanes
        key = view.marks.hovered_signal
        mark = view.scene.signal(key) if view.scene is not None and key else None
        is_enter = event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter)
        if mark is None or not is_enter:
            return False
        self.choose_near(mark.centre_ppm)
        return True

    def _choose(self, x: float) -> None:
        line = self._line_at(x)
        if line is None:
            self.missed.emit()
        else:
            self.line_chosen.emit(line)

    def _line_at(self, x: float) -> float | None:
        view = self._lanes
        if view.map is None or view.scene is None:
            return None
        places = [
            (abs(line_x - x), foot.shift_ppm)
            for foot in view.scene.feet
            if (line_x := view.map.x_of(foot.shift_ppm)) is not None
        ]
        distance, line = min(places, default=(_REACH_PX + 1, 0.0))
        return line if distance <= _REACH_PX else None

    def _take(self) -> None:
        if self.field is not None:
            self.typed.emit(self._line_ppm, self.field.text())
