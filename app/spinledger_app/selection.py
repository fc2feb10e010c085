"""What is hovered, selected and chosen, shared by all panels of one window."""

from __future__ import annotations

from dataclasses import dataclass, replace

from PySide6.QtCore import QObject, Signal


@dataclass(frozen=True, slots=True, kw_only=True)
class Marks:
    """The claim and signal that are pointed at, and those that are taken up.

    Attributes
    ----------
    hovered, selected : str or None
        Labels of claims.
    hovered_signal, chosen_signal : str or None
        Keys of signals; a chosen one waits to be put to a claim.
    waiting_claim : str or None
        A claim that waits for a signal to be put to.
    """

    hovered: str | None = None
    hovered_signal: str | None = None
    selected: str | None = None
    chosen_signal: str | None = None
    waiting_claim: str | None = None


class Selection(QObject):
    """Owner of the marks; emits ``changed(before, after)`` once a change."""

    changed = Signal(object, object)

    def __init__(self) -> None:
        super().__init__()
        self._marks = Marks()

    @property
    def marks(self) -> Marks:
        """The current marks."""
        return self._marks

    def hover(self, claim: str | None, signal: str | None = None) -> None:
        """Point at a claim, a signal, both or nothing."""
        self._take(replace(self._marks, hovered=claim, hovered_signal=signal))

    def select(self, claim: str | None) -> None:
        """Select a claim; None selects nothing."""
        self._take(replace(self._marks, selected=claim))

    def choose(self, signal: str | None) -> None:
        """Take up a signal so that the next claim is put to it."""
        self._take(replace(self._marks, chosen_signal=signal, waiting_claim=None))

    def wait_for_signal(self, claim: str | None) -> None:
        """Let a claim wait for the next signal that is clicked."""
        self._take(
            replace(
                self._marks, waiting_claim=claim, chosen_signal=None, selected=claim
            )
        )

    def let_go(self) -> None:
        """Drop what is chosen or waits; then what is selected."""
        marks = self._marks
        if marks.chosen_signal is not None or marks.waiting_claim is not None:
            self._take(replace(marks, chosen_signal=None, waiting_claim=None))
        else:
            self._take(replace(marks, selected=None))

    def clear(self) -> None:
        """Drop everything, for another project."""
        self._take(Marks())

    def _take(self, marks: Marks) -> None:
        if marks != self._marks:
            before, self._marks = self._marks, marks
            self.changed.emit(before, marks)
