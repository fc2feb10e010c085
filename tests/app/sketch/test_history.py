"""Undo and redo as values."""

from __future__ import annotations

from spinledger_app.sketch.drawing import EMPTY
from spinledger_app.sketch.growth import ring_at
from spinledger_app.sketch.history import History, recorded, redone, undone

RINGS = [ring_at(EMPTY, (0, 0), size) for size in (3, 4, 5)]


def drawn() -> History:
    history = History()
    for index, ring in enumerate(RINGS):
        history = recorded(history, f"edit {index}", ring)
    return history


def test_undo_goes_back_to_the_beginning_and_redo_to_the_end() -> None:
    history = drawn()
    seen = []
    while history.past:
        seen.append((history.undo_label, history.present))
        history = undone(history)
    assert seen == [("edit 2", RINGS[2]), ("edit 1", RINGS[1]), ("edit 0", RINGS[0])]
    assert history.present == EMPTY
    assert undone(history) is history
    assert history.redo_label == "edit 0"
    for ring in RINGS:
        history = redone(history)
        assert history.present == ring
    assert redone(history) is history
    assert history == drawn()


def test_new_edit_after_undo_drops_what_was_taken_back() -> None:
    history = recorded(undone(drawn()), "other", RINGS[0])
    assert history.future == ()
    assert history.undo_label == "other"
    assert undone(history).present == RINGS[1]


def test_edit_without_effect_leaves_no_step_and_keeps_redo() -> None:
    history = undone(drawn())
    assert recorded(history, "nothing", RINGS[1]) is history
