"""A published proton list, pasted, beside the signals of the ledger."""

from __future__ import annotations

from typing import TYPE_CHECKING

from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import (
    QAbstractItemView,
    QDialogButtonBox,
    QHeaderView,
    QLabel,
    QPlainTextEdit,
    QTableWidget,
    QTableWidgetItem,
    QWidget,
)

from spinledger.values.ledger import Ledger
from spinledger_app.presenters.published import (
    published_head,
    published_rows,
    published_tsv,
    published_words,
)
from spinledger_app.presenters.wording import say
from spinledger_app.theme import Look
from spinledger_app.views.dialogs import BenchDialog

if TYPE_CHECKING:
    from spinledger.report.compare import ListComparison


class PublishedListDialog(BenchDialog):
    """Paste the list; the table follows as it is typed. Stays open beside the window."""

    def __init__(self, look: Look, ledger: Ledger, parent: QWidget) -> None:
        super().__init__(look, say("Published list"), parent)
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        self.setModal(False)
        self._ledger = ledger
        self._comparison: ListComparison | None = None
        hint = QLabel(
            say(
                "Paste a published proton list as a journal prints it: δ 4.19 (m, 1H), …"
            )
        )
        hint.setWordWrap(True)
        self.box = QPlainTextEdit()
        self.box.setTabChangesFocus(True)
        self.box.setMaximumHeight(look.px(120))
        self.box.setAccessibleName(say("Published list"))
        hint.setBuddy(self.box)
        self.words = QLabel()
        self.words.setWordWrap(True)
        self.words.setMinimumHeight(look.px(40))
        self.table = self._make_table(look)
        for part in (hint, self.box, self.words, self.table):
            self.column.addWidget(part)
        buttons = self.add_buttons(None)
        self._copy = buttons.addButton(
            say("Copy"), QDialogButtonBox.ButtonRole.ActionRole
        )
        self._copy.setEnabled(False)
        self._copy.clicked.connect(self._take_table)
        self.box.textChanged.connect(self._compare)
        self.box.setFocus()

    def _make_table(self, look: Look) -> QTableWidget:
        head = published_head()
        table = QTableWidget(0, len(head))
        table.setHorizontalHeaderLabels(list(head))
        table.verticalHeader().hide()
        table.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        table.setAccessibleName(say("Comparison with the published list"))
        table.setWordWrap(True)
        bar = table.horizontalHeader()
        bar.setSectionResizeMode(QHeaderView.ResizeMode.ResizeToContents)
        bar.setSectionResizeMode(len(head) - 1, QHeaderView.ResizeMode.Stretch)
        table.setMinimumSize(look.px(720), look.px(280))
        return table

    def _compare(self) -> None:
        """Put the pasted list beside the ledger, or say what cannot be read."""
        from spinledger.report.compare import (  # noqa: PLC0415 - loads scipy
            compare_lists,
            list_of_ledger,
        )
        from spinledger.report.published import parse_published  # noqa: PLC0415

        text, self._comparison, words = self.box.toPlainText().strip(), None, ""
        published = parse_published(text)
        if published.signals:
            self._comparison = compare_lists(list_of_ledger(self._ledger), published)
            words = published_words(self._comparison)
        elif text:
            words = say("No shifts with protons were found in the text.")
        self.words.setText(words)
        self._show_rows()

    def _show_rows(self) -> None:
        rows = published_rows(self._comparison) if self._comparison else []
        self._copy.setEnabled(bool(rows))
        self.table.setRowCount(len(rows))
        for row, cells in enumerate(rows):
            for column, text in enumerate(cells):
                self.table.setItem(row, column, QTableWidgetItem(text))
        self.table.resizeRowsToContents()

    def _take_table(self) -> None:
        if self._comparison is not None:
            QGuiApplication.clipboard().setText(published_tsv(self._comparison))
