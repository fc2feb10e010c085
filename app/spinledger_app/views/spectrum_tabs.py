"""A row of tabs over the lanes, one a spectrum of the sample."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import QPoint, Qt, Signal
from PySide6.QtGui import QContextMenuEvent, QKeyEvent
from PySide6.QtWidgets import QTabBar, QWidget

from spinledger_app.presenters.spectra import TabText
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look

_HEIGHT_PX = 32


class SpectrumTabs(QTabBar):
    """The sample's spectra; hidden while there is only one.

    Signals
    -------
    spectrum_wanted : int key
    menu_wanted : int key, QPoint on the screen
    removal_wanted : int key
    """

    spectrum_wanted = Signal(int)
    menu_wanted = Signal(int, QPoint)
    removal_wanted = Signal(int)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.shown_tabs: tuple[TabText, ...] = ()
        self.setDrawBase(False)
        self.setExpanding(False)
        self.setUsesScrollButtons(True)
        self.setElideMode(Qt.TextElideMode.ElideRight)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setAccessibleName(say("Spectra of the sample"))
        self.currentChanged.connect(self._tell)
        self.retune()
        self.hide()

    def show_tabs(self, tabs: Sequence[TabText]) -> None:
        """Show these spectra, without asking for any."""
        if tuple(tabs) == self.shown_tabs:
            return
        self.shown_tabs = tuple(tabs)
        self.blockSignals(True)
        while self.count() > len(tabs):
            self.removeTab(self.count() - 1)
        for index, tab in enumerate(tabs):
            if index == self.count():
                self.addTab(tab.words)
            self.setTabText(index, tab.words)
            self.setTabToolTip(index, tab.tip)
            self.setAccessibleTabName(index, tab.spoken)
            if tab.is_shown:
                self.setCurrentIndex(index)
        self.blockSignals(False)
        self.setVisible(bool(tabs))

    def retune(self) -> None:
        """Take the look's text size again."""
        self.setFont(self.look.font(13))
        self.setFixedHeight(self.look.px(_HEIGHT_PX))

    def contextMenuEvent(self, event: QContextMenuEvent) -> None:
        """Ask for the menu of the tab under the mouse, or of the current one."""
        index = self.tabAt(event.pos())
        if event.reason() == QContextMenuEvent.Reason.Keyboard or index < 0:
            index = self.currentIndex()
        if index >= 0:
            place = self.mapToGlobal(self.tabRect(index).bottomLeft())
            self.menu_wanted.emit(self.shown_tabs[index].key, place)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Delete takes the spectrum out of the sample; arrows go along."""
        if event.key() == Qt.Key.Key_Delete and self.currentIndex() >= 0:
            self.removal_wanted.emit(self.shown_tabs[self.currentIndex()].key)
        else:
            super().keyPressEvent(event)

    def _tell(self, index: int) -> None:
        if 0 <= index < len(self.shown_tabs):
            self.spectrum_wanted.emit(self.shown_tabs[index].key)
