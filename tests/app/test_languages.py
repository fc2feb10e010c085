"""Every text of the bench has its German, and the German fits."""

from __future__ import annotations

import ast
import re
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from PySide6.QtCore import QCoreApplication
from stage import settle, stage, take_down
from test_texts import disputed, empty, folded, look_for_faults

import spinledger_app
from spinledger_app.application import Parts
from spinledger_app.languages import NAMES, Words, chosen, table_of

APP = Path(spinledger_app.__file__).parent


def spoken() -> set[str]:
    """All literals that the program hands to ``say``."""
    found = set()
    for path in APP.rglob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            is_say = isinstance(node, ast.Call) and (
                isinstance(node.func, ast.Name) and node.func.id == "say"
            )
            if is_say and node.args and isinstance(node.args[0], ast.Constant):
                found.add(str(node.args[0].value))
    return found


@pytest.mark.parametrize("code", [code for code in NAMES if code != "en"])
def test_every_text_is_translated_with_its_places(code: str) -> None:
    table = table_of(code)
    texts = spoken()
    assert len(texts) > 200  # the search does find them
    assert texts - table.keys() == set()
    for english, other in table.items():
        places = re.findall(r"\{\d\}", english)
        assert sorted(places) == sorted(re.findall(r"\{\d\}", other)), english


@contextmanager
def spoken_in(code: str) -> Iterator[None]:
    """The program's words in a language, as its start installs them."""
    words = Words(table_of(code))
    QCoreApplication.installTranslator(words)
    yield
    QCoreApplication.removeTranslator(words)


def test_an_unknown_text_stays_english(qapp: object) -> None:
    with spoken_in("de"):
        assert QCoreApplication.translate("bench", "Undo") == "Rückgängig"
        assert QCoreApplication.translate("bench", "no such text") == "no such text"


def test_english_shows_its_own_texts(qapp: object) -> None:
    with spoken_in("en"):
        shown = {text: QCoreApplication.translate("bench", text) for text in spoken()}
    assert all(text == other for text, other in shown.items())


def test_an_unknown_language_falls_back() -> None:
    assert chosen("xx") == "en"
    assert chosen("de") == "de"


@pytest.fixture
def german(qapp: object, tmp_path: Path) -> Iterator[Parts]:
    with spoken_in("de"):
        parts = stage(tmp_path)
        yield parts
        take_down(parts)


@pytest.mark.parametrize("show", [empty, folded, disputed])
def test_german_texts_can_be_read(german: Parts, show: object) -> None:
    assert callable(show)
    show(german)
    settle()
    assert look_for_faults(german) == []
    assert "Befund" in {one.text for one in noted(german)}


def noted(parts: Parts) -> list[object]:
    log = parts.look.text_log = []
    parts.window.lanes.refresh()
    parts.window.grab()
    parts.look.text_log = None
    return list(log)
