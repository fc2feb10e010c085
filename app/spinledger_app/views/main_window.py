"""The window: panels in their places; shows what the bench tells."""

from __future__ import annotations

from PySide6.QtCore import QEvent, Qt, Signal
from PySide6.QtGui import (
    QAction,
    QCloseEvent,
    QDragEnterEvent,
    QDragLeaveEvent,
    QDropEvent,
    QKeySequence,
    QResizeEvent,
)
from PySide6.QtWidgets import (
    QApplication,
    QMainWindow,
    QMenu,
    QSizePolicy,
    QStackedWidget,
    QVBoxLayout,
    QWidget,
)

from spinledger_app.actions import ActionText, action_table, menu_names
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look, palette, style_sheet
from spinledger_app.views.contenders_view import ContendersView
from spinledger_app.views.controls import BenchSplitter, FocusRing
from spinledger_app.views.evidence_empty import EvidenceEmpty
from spinledger_app.views.field_strip import FieldStrip
from spinledger_app.views.lanes_view import LanesView
from spinledger_app.views.ledger_view import LedgerView
from spinledger_app.views.menu_row import MenuRow
from spinledger_app.views.phase_strip import PhaseStrip
from spinledger_app.views.rail import LeftColumn
from spinledger_app.views.recipe_view import RecipeView
from spinledger_app.views.ribbon_view import RibbonView
from spinledger_app.views.spectrum_tabs import SpectrumTabs
from spinledger_app.views.status_row import StatusRow
from spinledger_app.views.structure_view import SketchPanel

WIDE_FROM_PX = 1600
LEAST_SIZE = (1100, 640)
_LEFT_PX, _WIDE_LEFT_PX = 256, 320
_RIGHT_PX, _WIDE_RIGHT_PX = 376, 452
_CONTENDERS_PX, _WIDE_CONTENDERS_PX = 292, 380
_EMPTY_CONTENDERS_PX = 200
_GUTTER_PX, _WIDE_GUTTER_PX = 88, 100


class MainWindow(QMainWindow):
    """All panels of the bench in one window; no decisions here.

    Signals
    -------
    action_wanted : str
        Name of an action from the table.
    places_dropped : list of str
    text_dropped : str
    close_wanted : QCloseEvent
    """

    action_wanted = Signal(str)
    places_dropped = Signal(list)
    text_dropped = Signal(str)
    close_wanted = Signal(object)
    moved_about = Signal()

    def __init__(self, look: Look) -> None:
        super().__init__()
        self.look = look
        self.actions_by_name: dict[str, QAction] = {}
        self.recent_menu = QMenu(say("Open recent"), self)
        self.menu_row = MenuRow(look)
        self.sketch = SketchPanel(look)
        self.contenders = ContendersView(look)
        self.recipe = RecipeView(look)
        self.ribbon = RibbonView(look)
        self.lanes = LanesView(look)
        self.lanes_empty = EvidenceEmpty(look)
        self.phase_strip = PhaseStrip(look)
        self.spectrum_tabs = SpectrumTabs(look)
        self.field_strip = FieldStrip(look)
        self.ledger = LedgerView(look)
        self.status = StatusRow(look)
        self._is_wide: bool | None = None
        self._has_structure = False
        self._is_sized_by_hand = False
        self._build()
        self.ring = FocusRing(look, self)

    # -- building ------------------------------------------------------------------

    def _build(self) -> None:
        self.setWindowTitle("Spin Ledger")
        self.setMinimumSize(*LEAST_SIZE)
        self.setAcceptDrops(True)
        self.middle = QStackedWidget()
        self.middle.addWidget(self.lanes_empty)
        self.middle.addWidget(self.lanes)
        centre = QWidget()
        column = QVBoxLayout(centre)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        strips = (self.recipe, self.ribbon, self.spectrum_tabs)
        for strip in (*strips, self.phase_strip, self.field_strip):
            column.addWidget(strip)
        column.addWidget(self.middle, 1)
        self.left = BenchSplitter(self.look, Qt.Orientation.Vertical)
        self.left.addWidget(self.sketch)
        self.left.addWidget(self.contenders)
        self.left.setStretchFactor(0, 1)
        self.left.setStretchFactor(1, 0)
        self.panels = BenchSplitter(self.look, Qt.Orientation.Horizontal)
        self.left_column = LeftColumn(self.look, self.left)
        self.left_column.rail.opened.connect(
            lambda: self.action_wanted.emit("left_panels")
        )
        sides = ((self.left_column, 0), (centre, 1), (self.ledger, 0))
        for widget, stretch in sides:
            self.panels.addWidget(widget)
            self.panels.setStretchFactor(self.panels.count() - 1, stretch)
        whole = QWidget()
        rows = QVBoxLayout(whole)
        rows.setContentsMargins(0, 0, 0, 0)
        rows.setSpacing(0)
        rows.addWidget(self.menu_row)
        rows.addWidget(self.panels, 1)
        rows.addWidget(self.status)
        whole.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setCentralWidget(whole)
        self._build_menus()
        self.menu_row.undo.clicked.connect(lambda: self.action_wanted.emit("undo"))
        self.menu_row.redo.clicked.connect(lambda: self.action_wanted.emit("redo"))
        self.menu_row.refine.clicked.connect(lambda: self.action_wanted.emit("refine"))
        self.menu_row.report.clicked.connect(lambda: self.action_wanted.emit("report"))
        self.panels.splitterMoved.connect(self._note_hand)
        self.left.splitterMoved.connect(self._note_hand)
        self.lanes_empty.open_button.setFocus(Qt.FocusReason.OtherFocusReason)
        self.setTabOrder(self.menu_row, self.sketch.canvas)
        self.setTabOrder(self.sketch.canvas, self.sketch.tags)
        self.setTabOrder(self.sketch.tags, self.contenders)
        self.setTabOrder(self.contenders, self.recipe)
        self.setTabOrder(self.recipe, self.spectrum_tabs)
        self.setTabOrder(self.spectrum_tabs, self.lanes)
        self.setTabOrder(self.lanes, self.ledger.verdict)

    def _build_menus(self) -> None:
        menus = {name: self.menu_row.menus.addMenu(name) for name in menu_names()}
        for entry in action_table():
            menu = menus[entry.menu]
            if entry.name == "recent":
                menu.addMenu(self.recent_menu)
                continue
            action = self._action(entry)
            menu.addAction(action)
            if entry.ends_group:
                menu.addSeparator()

    def _action(self, entry: ActionText) -> QAction:
        action = QAction(entry.words, self)
        action.setCheckable(entry.is_checkable)
        if entry.keys:
            action.setShortcuts([QKeySequence(key) for key in entry.keys.split("|")])
        action.triggered.connect(
            lambda _=False, name=entry.name: self.action_wanted.emit(name)
        )
        self.actions_by_name[entry.name] = action
        self.addAction(action)
        return action

    # -- what is shown ---------------------------------------------------------------

    def show_abilities(self, abilities: set[str]) -> None:
        """Enable what can be done now."""
        for entry in action_table():
            action = self.actions_by_name.get(entry.name)
            if action is not None:
                action.setEnabled(entry.needs == "nothing" or entry.needs in abilities)
        self.menu_row.undo.setEnabled("undo" in abilities)
        self.menu_row.redo.setEnabled("redo" in abilities)
        self.menu_row.refine.setEnabled("structure" in abilities)
        self.menu_row.report.setEnabled("ledger" in abilities)

    def show_checks(self, checks: dict[str, bool]) -> None:
        """Set the ticks of checkable actions."""
        for name, is_on in checks.items():
            self.actions_by_name[name].setChecked(is_on)

    def show_spectrum(self, has_spectrum: bool) -> None:
        """Lanes, or the empty state."""
        if has_spectrum and self.middle.currentWidget() is self.lanes_empty:
            self.ring.rest()
        focused = self.focusWidget()
        if not has_spectrum and (focused is None or not focused.isVisible()):
            self.lanes_empty.open_button.setFocus(Qt.FocusReason.OtherFocusReason)
        self.middle.setCurrentWidget(self.lanes if has_spectrum else self.lanes_empty)

    def show_structure_size(self, has_structure: bool) -> None:
        """Contenders take more room once there is a structure."""
        if has_structure != self._has_structure:
            self._has_structure = has_structure
            self._size_panels(force=not self._is_sized_by_hand)

    def show_look(self) -> None:
        """Take the look's colours and text size."""
        app = QApplication.instance()
        assert isinstance(app, QApplication)
        app.setPalette(palette(self.look.tokens))
        app.setFont(self.look.font())
        app.setStyleSheet(style_sheet(self.look))
        for strip in (
            self.menu_row,
            self.recipe,
            self.ribbon,
            self.spectrum_tabs,
            self.phase_strip,
            self.field_strip,
            self.status,
        ):
            strip.retune()
        for panel in (self.sketch, self.contenders, self.left_column):
            panel.retune()
        for child in self.findChildren(QWidget):
            child.updateGeometry()
            child.update()
        self.lanes.refresh()
        self.ribbon.refresh()

    # -- sizes -----------------------------------------------------------------------

    def _note_hand(self, _position: int, _index: int) -> None:
        self._is_sized_by_hand = True
        self.ring.refresh()

    def fold_left(self, is_folded: bool) -> None:
        """Fold the left panels to a rail, or open them again."""
        self.left_column.set_folded(is_folded)
        self._size_panels(force=True)

    @property
    def sizes_by_hand(self) -> tuple[list[int], list[int]] | None:
        """Widths of the panels and heights at the left; None for the default."""
        if not self._is_sized_by_hand:
            return None
        return self.panels.sizes(), self.left.sizes()

    def take_sizes(self, across: list[int], down: list[int]) -> None:
        """Sizes that were set by hand before."""
        self._is_sized_by_hand = True
        self.panels.setSizes(across)
        self.left.setSizes(down)

    def reset_sizes(self) -> None:
        """Panels at their default sizes."""
        self._is_sized_by_hand = False
        self._size_panels(force=True)
        self.moved_about.emit()

    def _size_panels(self, *, force: bool) -> None:
        is_wide = self.width() > WIDE_FROM_PX
        changed = is_wide != self._is_wide
        self._is_wide = is_wide
        px = self.look.px
        gutter = px(_WIDE_GUTTER_PX if is_wide else _GUTTER_PX)
        self.recipe.gutter = self.ribbon.gutter = gutter
        self.lanes.is_wide = self.lanes_empty.is_wide = is_wide
        left = px(_WIDE_LEFT_PX if is_wide else _LEFT_PX)
        if self.left_column.is_folded:
            left = self.left_column.rail.width()
        right = px(_WIDE_RIGHT_PX if is_wide else _RIGHT_PX)
        contenders = px(_WIDE_CONTENDERS_PX if is_wide else _CONTENDERS_PX)
        if not self._has_structure:
            contenders = px(_EMPTY_CONTENDERS_PX)
        middle = max(self.width() - left - right - 2, px(480))
        height = max(self.height() - px(64), 300)
        self.panels.default_sizes = [left, middle, right]
        self.left.default_sizes = [height - contenders, contenders]
        if force or (changed and not self._is_sized_by_hand):
            self.panels.setSizes(self.panels.default_sizes)
            self.left.setSizes(self.left.default_sizes)
        self.status.middle_left = left + 16

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Size the panels for the window."""
        super().resizeEvent(event)
        self._size_panels(force=not self._is_sized_by_hand)
        self.ring.refresh()

    def changeEvent(self, event: QEvent) -> None:
        """Keep the ring in place when the window's state changes."""
        super().changeEvent(event)
        if hasattr(self, "ring"):
            self.ring.refresh()

    # -- drops and closing -------------------------------------------------------------

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        """Take files, folders and text."""
        data = event.mimeData()
        if any(url.isLocalFile() for url in data.urls()) or data.hasText():
            event.acceptProposedAction()
            self.lanes_empty.show_drag(True)

    def dragLeaveEvent(self, event: QDragLeaveEvent) -> None:
        """Put the drop area's light out."""
        self.lanes_empty.show_drag(False)

    def dropEvent(self, event: QDropEvent) -> None:
        """Tell what was dropped."""
        self.lanes_empty.show_drag(False)
        data = event.mimeData()
        places = [url.toLocalFile() for url in data.urls() if url.isLocalFile()]
        event.acceptProposedAction()
        if places:
            self.places_dropped.emit(places)
        elif data.hasText():
            self.text_dropped.emit(data.text())

    def closeEvent(self, event: QCloseEvent) -> None:
        """Ask whoever listens whether the window may close."""
        self.close_wanted.emit(event)
