"""How a drawing lies on the screen, and how the keyboard's cursor goes over it."""

from __future__ import annotations

import math
from collections.abc import Collection, Iterator
from dataclasses import dataclass, replace

from spinledger_app.sketch.drawing import Drawing, Point
from spinledger_app.sketch.gestures import Spot

_LARGEST_PX = 34.0
_SMALLEST_PX = 8.0
_MOST_ZOOM_PX = 120.0


@dataclass(frozen=True, slots=True, kw_only=True)
class View:
    """Mapping from drawing to screen.

    Attributes
    ----------
    scale_px : float
        Px per bond length.
    x_px, y_px : float
        Where the drawing's origin is; y of the drawing goes upwards.
    """

    scale_px: float = 30.0
    x_px: float = 0.0
    y_px: float = 0.0

    def to_screen(self, place: Point) -> Point:
        """Screen place of a place in the drawing, px."""
        return (
            self.x_px + place[0] * self.scale_px,
            self.y_px - place[1] * self.scale_px,
        )

    def to_drawing(self, point: Point) -> Point:
        """Place in the drawing under a point of the screen, bond lengths."""
        return (
            (point[0] - self.x_px) / self.scale_px,
            (self.y_px - point[1]) / self.scale_px,
        )


def fitted(
    drawing: Drawing, size_px: Point, margins_px: tuple[float, float, float]
) -> View:
    """View with the drawing in the middle, as large as it may be.

    ``margins_px`` are kept free at both sides, over and under the drawing.
    """
    left, low, right, high = drawing.bounds
    side, over, under = margins_px
    wide = max(size_px[0] - 2 * side, 1.0)
    tall = max(size_px[1] - over - under, 1.0)
    scale = min(
        _LARGEST_PX,
        wide / max(right - left, 1e-9),
        tall / max(high - low, 1e-9),
    )
    scale = max(scale, _SMALLEST_PX)
    return View(
        scale_px=scale,
        x_px=size_px[0] / 2 - (left + right) / 2 * scale,
        y_px=over + tall / 2 + (low + high) / 2 * scale,
    )


def is_inside(drawing: Drawing, view: View, size_px: Point, margin_px: float) -> bool:
    """Whether the whole drawing shows."""
    left, low, right, high = drawing.bounds
    x0, y0 = view.to_screen((left, high))
    x1, y1 = view.to_screen((right, low))
    return (
        x0 >= margin_px
        and y0 >= margin_px
        and x1 <= size_px[0] - margin_px
        and y1 <= size_px[1] - margin_px
    )


def zoomed(view: View, point_px: Point, factor: float) -> View:
    """View enlarged about a point of the screen."""
    scale = min(max(view.scale_px * factor, _SMALLEST_PX), _MOST_ZOOM_PX)
    x, y = view.to_drawing(point_px)
    return View(
        scale_px=scale, x_px=point_px[0] - x * scale, y_px=point_px[1] + y * scale
    )


def panned(view: View, by_px: Point) -> View:
    """View moved over the screen."""
    return replace(view, x_px=view.x_px + by_px[0], y_px=view.y_px + by_px[1])


def place_of(drawing: Drawing, spot: Spot) -> Point | None:
    """Place of an atom, or middle of a bond."""
    if spot.atom is not None:
        return drawing.atoms[spot.atom].place
    if spot.bond is not None:
        return drawing.middle(spot.bond)
    return None


def handle_px(drawing: Drawing, view: View, selected: Collection[int]) -> Point | None:
    """Where the knob stands: over the selection, if two atoms or more are in it."""
    if len(selected) < 2:
        return None
    points = [view.to_screen(drawing.atoms[i].place) for i in selected]
    xs = [x for x, _ in points]
    return (min(xs) + max(xs)) / 2, max(min(y for _, y in points) - 28, 10.0)


def next_spot(drawing: Drawing, spot: Spot, towards: Point) -> Spot:
    """The next atom or bond in a direction; the same spot if there is none.

    From nowhere the cursor goes to the atom farthest against the direction, so
    that the first stroke of an arrow enters the drawing from its edge.
    """
    here = place_of(drawing, spot)
    if here is None:
        return _first_spot(drawing, towards)
    best, found = math.inf, spot
    for other, place in _spots(drawing):
        dx, dy = place[0] - here[0], place[1] - here[1]
        along = dx * towards[0] + dy * towards[1]
        across = abs(dx * towards[1] - dy * towards[0])
        # Within 60° of the arrow, so that bonds of a zigzag are met both ways.
        if other == spot or along <= 1e-6 or across > 1.7321 * along + 1e-6:
            continue
        cost = math.hypot(along, across) + across
        if cost < best - 1e-9:
            best, found = cost, other
    return found


def _first_spot(drawing: Drawing, towards: Point) -> Spot:
    if not drawing.atoms:
        return Spot()
    return Spot(
        atom=min(
            range(len(drawing.atoms)),
            key=lambda i: (
                drawing.atoms[i].x * towards[0] + drawing.atoms[i].y * towards[1]
            ),
        )
    )


def _spots(drawing: Drawing) -> Iterator[tuple[Spot, Point]]:
    for index, atom in enumerate(drawing.atoms):
        yield Spot(atom=index), atom.place
    for index in range(len(drawing.bonds)):
        yield Spot(bond=index), drawing.middle(index)
