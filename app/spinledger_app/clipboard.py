"""Puts this program's own data on the clipboard so that the end of it is safe."""

from __future__ import annotations

from PySide6.QtCore import QByteArray, QMimeData
from PySide6.QtGui import QGuiApplication


class OwnData(QMimeData):
    """Data that this program made, told from that of others by its class."""


def put_table(text: str, html: str) -> None:
    """Put a table on the clipboard, for spreadsheets and for text processors."""
    data = OwnData()
    data.setText(text)
    data.setHtml(html)
    data.setData("text/tab-separated-values", QByteArray(text.encode()))
    QGuiApplication.clipboard().setMimeData(data)


def leave_plain_text() -> None:
    """Keep only the plain text of what this program put on the clipboard.

    To be called when the program ends: Qt drops the clipboard's contents after
    Python is gone, which must not meet an object that Python made.
    """
    clipboard = QGuiApplication.clipboard()
    is_ours = isinstance(clipboard.mimeData(), OwnData)
    if is_ours or clipboard.ownsClipboard():
        clipboard.setText(clipboard.text())
