"""The bench's words in other languages: one JSON file each, English to it."""

from __future__ import annotations

import json
from importlib import resources

from PySide6.QtCore import QLocale, QObject, QTranslator

NAMES = {"en": "", "de": "german.json"}


class Words(QTranslator):
    """Translator over a plain table; what it does not know stays English."""

    def __init__(self, table: dict[str, str], parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._table = table

    def isEmpty(self) -> bool:
        """Whether there is nothing to translate with."""
        return not self._table

    def translate(
        self,
        context: str,
        sourceText: str,
        disambiguation: str | None = None,
        n: int = -1,
    ) -> str | None:
        """The text in the other language; None where it is not known.

        An empty text would count as a translation and blank the label.
        """
        return self._table.get(sourceText)


def table_of(code: str) -> dict[str, str]:
    """English text to its translation; empty for English itself.

    Raises
    ------
    KeyError
        If there is no such language.
    """
    name = NAMES[code]
    if not name:
        return {}
    text = (resources.files(__package__) / name).read_text(encoding="utf-8")
    table: dict[str, str] = json.loads(text)
    return table


def chosen(setting: str) -> str:
    """Code of the language to use: the one that was set, else the desktop's."""
    code = setting or QLocale.system().name()[:2]
    return code if code in NAMES else "en"
