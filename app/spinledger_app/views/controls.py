"""Buttons, rules and the focus ring, drawn in the bench's own hand."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QObject, QRect, QRectF, QSize, Qt
from PySide6.QtGui import QEnterEvent, QPainter, QPaintEvent, QPen, QResizeEvent
from PySide6.QtWidgets import (
    QAbstractButton,
    QApplication,
    QFrame,
    QPushButton,
    QScrollArea,
    QScrollBar,
    QSizePolicy,
    QSplitter,
    QSplitterHandle,
    QToolButton,
    QWidget,
)

from spinledger_app.painting.icons import paint_icon
from spinledger_app.painting.ink import Face, Ink
from spinledger_app.theme import Look

_KEYBOARD = (QEvent.Type.KeyPress, QEvent.Type.Shortcut)
_MOUSE = (QEvent.Type.MouseButtonPress, QEvent.Type.MouseButtonDblClick)
_SPLIT_REACH_PX = 4


class BenchButton(QPushButton):
    """A button with its key beside its word; ``is_primary`` for the first choice."""

    def __init__(
        self,
        look: Look,
        text: str,
        *,
        key: str = "",
        is_primary: bool = False,
        height: int = 28,
        parent: QWidget | None = None,
    ) -> None:
        super().__init__(text, parent)
        self.look = look
        self.key = key
        self.is_primary = is_primary
        self._height = height
        self.setSizePolicy(QSizePolicy.Policy.Fixed, QSizePolicy.Policy.Fixed)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setAccessibleName(text)

    def sizeHint(self) -> QSize:
        """Word, key and 12 px on both sides."""
        weight = 600 if self.is_primary else 400
        width = self.look.width(self.text(), 14, weight) + 24
        if self.key:
            width += self.look.width(self.key, 12) + 8
        return QSize(round(width) + 1, self.look.px(self._height))

    def minimumSizeHint(self) -> QSize:
        """As large as preferred: words are never cut."""
        return self.sizeHint()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint face, edge, word and key."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        fill, edge, words = self._colours()
        ink.box(QRectF(self.rect()), fill=fill, edge=edge)
        weight = 600 if self.is_primary else 400
        metrics = self.look.metrics(14, weight)
        width = self.look.width(self.text(), 14, weight)
        key_width = self.look.width(self.key, 12) + 8 if self.key else 0.0
        x = (self.width() - width - key_width) / 2
        baseline = (self.height() + metrics.capHeight()) / 2
        ink.text(x, baseline, self.text(), Face(weight=weight, colour=words))
        if self.key:
            tone = words if self.is_primary else "muted"
            ink.text(x + width + 8, baseline, self.key, Face(size=12, colour=tone))
        painter.end()

    def _colours(self) -> tuple[str, str, str]:
        if not self.isEnabled():
            return "panel", "hairline", "muted"
        if self.is_primary:
            return "accent", "accent", "on_accent"
        is_hot = self.underMouse() or self.isDown()
        return ("hover" if is_hot else "button"), "edge", "ink"


class IconButton(QToolButton):
    """A 28 px button with an icon; name and key stand in its tool tip."""

    def __init__(
        self, look: Look, icon: str, name: str, *, parent: QWidget | None = None
    ) -> None:
        super().__init__(parent)
        self.look = look
        self.icon_name = icon
        self.setAccessibleName(name)
        self.setToolTip(name)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setFixedSize(look.px(28), look.px(28))

    def retune(self) -> None:
        """Take the look's text size again."""
        self.setFixedSize(self.look.px(28), self.look.px(28))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint hover or selected fill and the icon."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        if self.isChecked():
            ink.box(QRectF(self.rect()), fill="selected", edge="accent")
        elif self.underMouse() and self.isEnabled():
            ink.fill(QRectF(self.rect()), "hover", 4)
        colour = "ink" if self.isEnabled() else "muted"
        offset = (self.width() - 16) / 2
        paint_icon(ink, self.icon_name, offset, offset, colour)
        painter.end()


class TextLink(QAbstractButton):
    """A word that acts, in accent; for small choices beside a heading."""

    def __init__(self, look: Look, text: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.setText(text)
        self.setAccessibleName(text)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setSizePolicy(QSizePolicy.Policy.Fixed, QSizePolicy.Policy.Fixed)

    def sizeHint(self) -> QSize:
        """The word and 4 px on both sides, 24 px high at least."""
        width = round(self.look.width(self.text(), 13)) + 9
        return QSize(width, max(24, self.look.px(20)))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the word, underlined under the mouse."""
        painter = QPainter(self)
        ink = Ink(painter, self.look, self)
        colour = "accent" if self.isEnabled() else "muted"
        baseline = (self.height() + self.look.metrics(13).capHeight()) / 2
        width = ink.text(4, baseline, self.text(), Face(size=13, colour=colour))
        if self.underMouse():
            ink.hline(4, 4 + width, round(baseline) + 2, colour)
        painter.end()

    def enterEvent(self, event: QEnterEvent) -> None:
        """Paint anew with the underline."""
        self.update()
        super().enterEvent(event)


class OverlayScroll(QScrollArea):
    """A column that scrolls upright; the bar lies over it and takes no width."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setWidgetResizable(True)
        self.setFrameShape(QFrame.Shape.NoFrame)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setVerticalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.bar = QScrollBar(Qt.Orientation.Vertical, self)
        hidden = self.verticalScrollBar()
        hidden.rangeChanged.connect(self._take_range)
        hidden.valueChanged.connect(self.bar.setValue)
        self.bar.valueChanged.connect(hidden.setValue)
        self.bar.hide()

    def _take_range(self, least: int, most: int) -> None:
        self.bar.setRange(least, most)
        self.bar.setPageStep(self.verticalScrollBar().pageStep())
        self.bar.setSingleStep(20)
        self.bar.setVisible(most > least)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep the bar at the right edge."""
        super().resizeEvent(event)
        width = self.bar.sizeHint().width()
        self.bar.setGeometry(self.width() - width, 0, width, self.height())
        self.bar.raise_()


class FocusRing(QWidget):
    """A 2 px accent ring about whatever the keyboard is on.

    It lies over a window and lets the mouse through. The ring shows once a key
    was pressed, and goes when the mouse is used.
    """

    def __init__(self, look: Look, window: QWidget) -> None:
        super().__init__(window)
        self.look = look
        self._window = window
        self._is_by_keys = True
        self.setAttribute(Qt.WidgetAttribute.WA_TransparentForMouseEvents)
        self.setAttribute(Qt.WidgetAttribute.WA_NoSystemBackground)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        app = QApplication.instance()
        assert isinstance(app, QApplication)
        app.focusChanged.connect(self._follow)
        app.installEventFilter(self)
        self._followed: QWidget | None = None

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Tell keys from mouse, and keep to the widget that has the focus."""
        kind = event.type()
        if kind in _KEYBOARD and not self._is_by_keys:
            self._is_by_keys = True
            self._place()
        elif kind in _MOUSE and self._is_by_keys:
            self._is_by_keys = False
            self._place()
        elif watched is self._followed and kind in (
            QEvent.Type.Resize,
            QEvent.Type.Move,
            QEvent.Type.Hide,
            QEvent.Type.Show,
        ):
            self._place()
        return False

    def _follow(self, before: QWidget | None, now: QWidget | None) -> None:
        self._followed = now
        self._place()

    def rest(self) -> None:
        """Show no ring until the next key: the focus went somewhere by itself."""
        self._is_by_keys = False
        self._place()

    def refresh(self) -> None:
        """Put the ring where it belongs, after a scroll or a new layout."""
        self._place()

    def _place(self) -> None:
        target = self._followed
        is_ours = (
            target is not None
            and target.window() is self._window
            and target is not self._window
        )
        if (
            not is_ours
            or not self._is_by_keys
            or target is None
            or (not target.isVisible())
        ):
            self.hide()
            return
        corner = target.mapTo(self._window, target.rect().topLeft())
        rect = QRect(corner, target.size())
        is_inside = bool(target.property("focusInside"))
        grow = 0 if is_inside else 4
        self.setGeometry(rect.adjusted(-grow, -grow, grow, grow))
        self.raise_()
        self.show()
        self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the ring."""
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setPen(QPen(self.look.colour("accent"), 2))
        painter.drawRoundedRect(QRectF(self.rect()).adjusted(1, 1, -1, -1), 6, 6)
        painter.end()


class _Handle(QSplitterHandle):
    """A line of 1 px that can be grabbed over 8 px; double click: default size."""

    def __init__(self, orientation: Qt.Orientation, parent: BenchSplitter) -> None:
        super().__init__(orientation, parent)
        self._parent = parent
        self.setAttribute(Qt.WidgetAttribute.WA_Hover)

    def resizeEvent(self, event: object) -> None:
        """Grow the part that the mouse can grab beyond the line."""
        reach = _SPLIT_REACH_PX
        self.setAttribute(Qt.WidgetAttribute.WA_MouseNoMask, True)
        if self.orientation() == Qt.Orientation.Horizontal:
            self.setContentsMargins(reach, 0, reach - 1, 0)
        else:
            self.setContentsMargins(0, reach, 0, reach - 1)
        self.setMask(self.contentsRect())

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the hairline, in accent under the mouse."""
        painter = QPainter(self)
        token = "accent" if self.underMouse() else "hairline"
        painter.fillRect(self.contentsRect(), self._parent.look.colour(token))
        painter.end()

    def mouseDoubleClickEvent(self, event: object) -> None:
        """Give the panels their default sizes."""
        self._parent.go_default()


class BenchSplitter(QSplitter):
    """Splitter with hairline handles and default sizes to go back to."""

    def __init__(
        self, look: Look, orientation: Qt.Orientation, parent: QWidget | None = None
    ) -> None:
        super().__init__(orientation, parent)
        self.look = look
        self.default_sizes: list[int] = []
        self.setHandleWidth(1)
        self.setChildrenCollapsible(False)

    def createHandle(self) -> QSplitterHandle:
        """Handle in the bench's manner."""
        return _Handle(self.orientation(), self)

    def go_default(self) -> None:
        """Default sizes of all panels."""
        if self.default_sizes:
            self.setSizes(self.default_sizes)
