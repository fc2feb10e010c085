"""Undo and redo of drawings, as a frozen value."""

from __future__ import annotations

from dataclasses import dataclass

from spinledger_app.sketch.drawing import EMPTY, Drawing


@dataclass(frozen=True, slots=True, kw_only=True)
class Step:
    """An edit that was made: its name and the drawing before or after it."""

    label: str
    drawing: Drawing


@dataclass(frozen=True, slots=True, kw_only=True)
class History:
    """The present drawing, the steps before it and those taken back.

    Attributes
    ----------
    present : Drawing
    past : tuple of Step
        Oldest first; each holds the drawing before its edit.
    future : tuple of Step
        Next to redo first; each holds the drawing after its edit.
    """

    present: Drawing = EMPTY
    past: tuple[Step, ...] = ()
    future: tuple[Step, ...] = ()

    @property
    def undo_label(self) -> str:
        """Name of the edit that would be taken back; empty if there is none."""
        return self.past[-1].label if self.past else ""

    @property
    def redo_label(self) -> str:
        """Name of the edit that would be made again; empty if there is none."""
        return self.future[0].label if self.future else ""


def recorded(history: History, label: str, drawing: Drawing) -> History:
    """History with one edit more; the same history if nothing changed."""
    if drawing == history.present:
        return history
    step = Step(label=label, drawing=history.present)
    return History(present=drawing, past=(*history.past, step))


def undone(history: History) -> History:
    """History one step back; the same history at the beginning."""
    if not history.past:
        return history
    *past, step = history.past
    taken = Step(label=step.label, drawing=history.present)
    return History(
        present=step.drawing, past=tuple(past), future=(taken, *history.future)
    )


def redone(history: History) -> History:
    """History one step on; the same history at the end."""
    if not history.future:
        return history
    step, *future = history.future
    made = Step(label=step.label, drawing=history.present)
    return History(
        present=step.drawing, past=(*history.past, made), future=tuple(future)
    )
