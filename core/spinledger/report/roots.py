"""Root marks and labels on the soil line, spread so that none touches another."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from spinledger.report.palette import BARK, MUTED
from spinledger.report.svg import Canvas, number, text_width

_SIZE = 11.0
_SMALLEST = 6.0
_GAP = 8.0


@dataclass(frozen=True, slots=True, kw_only=True)
class RootLabel:
    """A label that belongs to a root; ``width`` is the room it needs."""

    root: float
    width: float
    words: str
    count: str
    state: str

    @classmethod
    def of(cls, *, x: float, words: str, n_protons: int, state: str) -> RootLabel:
        """Label of a claim whose root stands at ``x``."""
        return cls(
            root=x,
            width=max(text_width(words, _SIZE), 20.0),
            words=words,
            count=f"{n_protons}\u00a0H",
            state=state,
        )


def draw_roots(canvas: Canvas, labels: Sequence[RootLabel], *, soil: float) -> None:
    """Draw marks on the soil line and labels below it.

    Parameters
    ----------
    canvas : Canvas
    labels : sequence of RootLabel
    soil : float
        Height of the soil line.
    """
    ordered = sorted(labels, key=lambda label: label.root)
    needed = sum(label.width + _GAP for label in ordered)
    shrink = min(1.0, canvas.width / needed) if needed else 1.0
    size = max(_SMALLEST, _SIZE * shrink)
    for label, x in zip(ordered, _spread(ordered, shrink, canvas.width), strict=True):
        if abs(x - label.root) > 0.5:
            canvas.path(_elbow(label.root, x, soil), stroke=BARK, width=0.8)
        canvas.mark((label.root, soil), label.state, size=9)
        canvas.text((x, soil + 19), label.words, size=size, weight=600, anchor="middle")
        if shrink > 0.75:
            canvas.text(
                (x, soil + 30), label.count, size=9, fill=MUTED, anchor="middle"
            )


def _spread(labels: Sequence[RootLabel], shrink: float, width: float) -> list[float]:
    """Places of the labels, moved sideways as little as possible."""
    places = [label.root for label in labels]
    widths = [label.width * shrink for label in labels]
    gap = _GAP * shrink
    for _ in range(400):
        moved = False
        for left, right in pairwise(range(len(places))):
            needed = (widths[left] + widths[right]) / 2 + gap
            short = needed - (places[right] - places[left])
            if short > 0.05:
                places[left] -= short / 2
                places[right] += short / 2
                moved = True
        places = [
            min(max(x, own / 2), width - own / 2)
            for x, own in zip(places, widths, strict=True)
        ]
        if not moved:
            break
    return places


def _elbow(root: float, x: float, soil: float) -> str:
    return (
        f"M{number(root)} {number(soil)}C{number(root)} {number(soil + 8)} "
        f"{number(x)} {number(soil + 2)} {number(x)} {number(soil + 9)}"
    )
