"""No text is clipped, covered by another, or too pale, in any state of the bench."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from pathlib import Path

import invented
import pytest
from PySide6.QtGui import QColor
from stage import picture, put_on, settle, stage, take_down
from text_checks import contrast, faults

from spinledger_app.application import Parts
from spinledger_app.theme import DARK, HIGH_CONTRAST, LIGHT, STATE_FILLS, Tokens
from spinledger_app.views.controls import BenchButton

Show = Callable[[Parts], None]


@pytest.fixture
def parts(qapp: object, tmp_path: Path) -> Iterator[Parts]:
    made = stage(tmp_path)
    yield made
    take_down(made)


def empty(parts: Parts) -> None:
    parts.desk.show_all()


def unreadable(parts: Parts) -> None:
    parts.bench.unreadable.emit(
        "batch-9: The folder holds no acquisition; expected a FID or a processed "
        "spectrum of one proton experiment."
    )


def opened(parts: Parts) -> None:
    put_on(parts, None, has_structure=False)


def continuous(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    parts.window.lanes.set_folded(False)


def folded(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    parts.window.lanes.set_folded(True)


def own_gains(parts: Parts) -> None:
    folded(parts)
    parts.window.lanes.set_own_gains(True)


def zoomed(parts: Parts) -> None:
    put_on(parts, invented.ledger())
    parts.window.lanes.zoom_to(2.38, 2.53)


def disputed(parts: Parts) -> None:
    put_on(parts, invented.disputed())
    parts.bench.selection.select("2-HB")
    parts.window.lanes.zoom_to(2.36, 2.50)


def unfolded(parts: Parts) -> None:
    folded(parts)
    parts.bench.selection.select("2-HA")


def chosen(parts: Parts) -> None:
    folded(parts)
    scene = parts.bench.scene
    assert scene is not None
    parts.bench.selection.choose(scene.signals[1].key)


def two_open(parts: Parts) -> None:
    put_on(parts, invented.lost())
    parts.window.lanes.set_folded(True)


STATES: list[Show] = [
    empty,
    unreadable,
    opened,
    continuous,
    folded,
    own_gains,
    zoomed,
    disputed,
    unfolded,
    chosen,
    two_open,
]


def buttons_of(parts: Parts) -> list[BenchButton]:
    found = parts.window.findChildren(BenchButton)
    return [button for button in found if button.isVisible()]


def look_for_faults(parts: Parts) -> list[str]:
    picture(parts)
    log = parts.look.text_log = []
    parts.window.lanes.refresh()
    image = parts.window.grab().toImage()
    parts.look.text_log = None
    assert len(log) > 20  # the log is being written at all
    low = [b.text() for b in buttons_of(parts) if b.height() < 24]
    assert low == []  # hit areas are 24 px at least
    return faults(parts.window, log, image)


@pytest.mark.parametrize("show", STATES)
@pytest.mark.parametrize("theme", ["light", "dark"])
def test_texts_can_be_read(parts: Parts, show: Show, theme: str) -> None:
    parts.desk.view.take_theme(theme)
    show(parts)
    assert look_for_faults(parts) == []


@pytest.mark.parametrize("size", [(1100, 640), (1920, 1080), (2560, 1440)])
@pytest.mark.parametrize("show", [empty, folded, disputed])
def test_texts_can_be_read_at_other_sizes(
    parts: Parts, show: Show, size: tuple[int, int]
) -> None:
    parts.window.resize(*size)
    settle()
    show(parts)
    assert look_for_faults(parts) == []


@pytest.mark.parametrize("show", [empty, folded, disputed])
def test_texts_can_be_read_when_enlarged(parts: Parts, show: Show) -> None:
    parts.window.resize(1600, 900)
    parts.desk.view.take_text_scale(1.3)
    settle()
    show(parts)
    assert look_for_faults(parts) == []


def test_the_check_finds_a_pale_text(parts: Parts) -> None:
    folded(parts)
    parts.look.tokens = _with(LIGHT, muted="#CFCBC0")
    parts.window.show_look()
    assert any("contrast" in fault for fault in look_for_faults(parts))


def _with(tokens: Tokens, **changed: str) -> Tokens:
    values = {name: getattr(tokens, name) for name in tokens.__slots__}
    return Tokens(**(values | changed))


@pytest.mark.parametrize("tokens", [LIGHT, DARK, HIGH_CONTRAST])
def test_tokens_keep_the_contrast_of_the_specification(tokens: Tokens) -> None:
    grounds = [tokens.chrome, tokens.panel, tokens.lane, tokens.selected]
    for ground in grounds:
        for text in (tokens.ink, tokens.muted, tokens.accent):
            assert contrast(QColor(text), QColor(ground)) >= 4.5
        # Edges of controls are not text: 3 : 1 (WCAG 2.1, 1.4.11).
        assert contrast(QColor(tokens.edge), QColor(ground)) >= 3.0
    for state in STATE_FILLS:
        assert contrast(QColor(tokens.tones[state]), QColor(tokens.panel)) >= 4.5
