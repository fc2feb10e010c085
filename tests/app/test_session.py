"""Undo, redo, and results that come later."""

from __future__ import annotations

from dataclasses import replace

import pytest

from spinledger.project.document import Project
from spinledger.values.structure import Structure
from spinledger_app.session import Session


def named(name: str, project: Project) -> Project:
    return replace(project, name=name)


def test_every_edit_is_one_step_back_and_forth() -> None:
    session = Session()
    seen: list[str] = []
    session.project_changed.connect(lambda _before, after: seen.append(after.name))
    session.apply("a", lambda project: named("a", project))
    session.apply("b", lambda project: named("b", project))
    session.undo_stack.undo()
    assert session.project.name == "a"
    session.undo_stack.undo()
    assert session.project.name == "Untitled"
    session.undo_stack.redo()
    session.undo_stack.redo()
    assert session.project.name == "b"
    assert seen == ["a", "b", "a", "Untitled", "a", "b"]


def test_an_edit_without_effect_leaves_no_step() -> None:
    session = Session()
    assert not session.apply("nothing", lambda project: project)
    assert session.undo_stack.count() == 0


def test_a_failing_edit_changes_nothing() -> None:
    session = Session()

    def fail(project: Project) -> Project:
        raise ValueError("cannot be done")

    with pytest.raises(ValueError, match="cannot be done"):
        session.apply("fail", fail)
    assert session.undo_stack.count() == 0


def test_a_late_result_goes_into_the_step_that_asked() -> None:
    session = Session()
    session.apply("a", lambda project: named("a", project))
    asked = session.project
    session.apply("b", lambda project: named("b", project))
    assert session.absorb(asked, lambda project: named("a solved", project))
    assert session.project.name == "b"  # what is shown did not jump
    session.undo_stack.undo()
    assert session.project.name == "a solved"
    assert session.undo_stack.count() == 2


def test_a_result_for_a_state_that_is_gone_is_dropped() -> None:
    session = Session()
    session.apply("a", lambda project: named("a", project))
    asked = session.project
    session.undo_stack.undo()
    session.apply("c", lambda project: named("c", project))
    assert not session.absorb(asked, lambda project: named("a solved", project))
    assert session.project.name == "c"


def test_unsaved_is_told_after_an_edit_and_not_after_saving(tmp_path: object) -> None:
    session = Session()
    assert not session.is_unsaved
    structure = Structure(given="C", molblock="", smiles="C")
    session.apply("s", lambda project: replace(project, structure=structure))
    assert session.is_unsaved
    session.mark_saved(session.project, tmp_path)  # type: ignore[arg-type]
    assert not session.is_unsaved
    session.undo_stack.undo()
    session.undo_stack.redo()
    assert not session.is_unsaved
