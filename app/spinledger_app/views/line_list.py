"""The line list of a spectrum in a small window of its own."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import (
    QAbstractItemView,
    QDialogButtonBox,
    QHeaderView,
    QTableWidget,
    QTableWidgetItem,
    QWidget,
)

from spinledger.values.evidence import Evidence
from spinledger_app.presenters.line_list import line_head, line_rows, line_tsv
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look
from spinledger_app.views.dialogs import BenchDialog


class LineListDialog(BenchDialog):
    """Shifts, widths and distances of all lines; stays open beside the window."""

    def __init__(self, look: Look, evidence: Evidence, parent: QWidget) -> None:
        super().__init__(look, say("Line list"), parent)
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        self.setModal(False)
        rows = line_rows(evidence)
        head = line_head()
        self.table = QTableWidget(len(rows), len(head))
        self.table.setHorizontalHeaderLabels(list(head))
        self.table.verticalHeader().hide()
        self.table.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        self.table.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.table.setAccessibleName(say("Line list"))
        right = Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter
        for row, cells in enumerate(rows):
            for column, text in enumerate(cells):
                item = QTableWidgetItem(text)
                item.setTextAlignment(right)
                self.table.setItem(row, column, item)
        self.table.horizontalHeader().setSectionResizeMode(
            QHeaderView.ResizeMode.Stretch
        )
        self.table.setMinimumSize(look.px(600), look.px(420))
        self.column.addWidget(self.table)
        box = self.add_buttons(None)
        copy = box.addButton(say("Copy"), QDialogButtonBox.ButtonRole.ActionRole)
        copy.clicked.connect(
            lambda: QGuiApplication.clipboard().setText(line_tsv(evidence))
        )
