"""Claims: trees that grow from a soil line up to the lines they own."""

from __future__ import annotations

import math
from dataclasses import dataclass

from PySide6.QtCore import QLineF, QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QPainterPath, QPen

from spinledger_app.lanes.grove import (
    GAPS_FROM,
    LARGE_LEAVES_FROM,
    STEM_ONLY_BELOW,
    Grove,
    PlacedTree,
    RootLabel,
    leaf_width,
)
from spinledger_app.lanes.layout import LaneLayout
from spinledger_app.lanes.leaves import (
    add_branch,
    branch_path,
    broad_leaf_path,
    funnel_side,
    leaf_path,
)
from spinledger_app.lanes.scene import LaneScene, Level
from spinledger_app.lanes.shift_map import ShiftMap
from spinledger_app.painting.ink import (
    CAPTION,
    SECOND,
    SECOND_STRONG,
    STRONG,
    Face,
    Ink,
)
from spinledger_app.painting.marks import paint_mark
from spinledger_app.presenters.wording import number, say, signed

_CASING_PX = 2.4
_TEXT_ROOM_PX = 16.0


@dataclass(frozen=True, slots=True, kw_only=True)
class BranchHandle:
    """A level of a tree that can be grabbed: its fork nodes on the screen.

    ``sense`` is the half splitting in px: the partner branch lies on the other
    side of the node.
    """

    claim: str
    level: int
    nodes: tuple[float, ...]
    half_px: tuple[float, ...]
    lower_y: float
    upper_y: float


class _Texts:
    """Places of texts already painted, so that none is put over another."""

    def __init__(self) -> None:
        self._rects: list[QRectF] = []

    def is_free(self, rect: QRectF) -> bool:
        return not any(rect.intersects(other) for other in self._rects)

    def take(self, rect: QRectF) -> None:
        self._rects.append(rect)


class ClaimsPainter:
    """Paints one view of the claims; keeps the handles for the mouse.

    Parameters
    ----------
    ink : Ink
    scene : LaneScene
    shift_map : ShiftMap
    layout : LaneLayout
    grove : Grove
    selected : str or None
        Claim whose level of dispute and label are set off.
    lit_level : (str, int) or None
        Level that is under the mouse.
    """

    def __init__(  # noqa: PLR0913 - a view and what is picked in it
        self,
        ink: Ink,
        scene: LaneScene,
        shift_map: ShiftMap,
        layout: LaneLayout,
        grove: Grove,
        *,
        selected: str | None = None,
        lit_level: tuple[str, int] | None = None,
    ) -> None:
        self.ink = ink
        self.scene = scene
        self.map = shift_map
        self.layout = layout
        self.grove = grove
        self.selected = selected
        self.lit_level = lit_level
        self.handles: list[BranchHandle] = []
        self._patterns: list[tuple[PlacedTree, str]] = []
        self._texts = _Texts()
        self._is_wide = grove.px_per_hz >= LARGE_LEAVES_FROM

    def paint(self) -> None:
        """Paint feet, soil line, trees, strays, labels."""
        layout = self.layout
        for index in self.map.visible():
            start, end = self.map.span(index)
            left, right = max(start, layout.left), min(end, layout.right)
            self.ink.hline(left, right, layout.soil, "bark")
        self._feet()
        self._strays()
        self._take_stems_and_leaves()
        # Low storeys first: upper crowns and their casings lie over the stalks.
        for placed in sorted(self.grove.trees, key=lambda one: not one.is_low):
            self._clipped(placed)
        for placed, pattern in self._patterns:
            self._pattern(placed, pattern)
        for placed in self.grove.trees:
            if self.layout.left - 8 <= placed.root_x <= self.layout.right + 8:
                size = 12 if self._is_wide else 10
                paint_mark(
                    self.ink,
                    placed.root_x,
                    layout.soil + 0.5,
                    placed.tree.state,
                    size=size,
                )
        for label in self.grove.labels:
            self._label(label)

    def _take_stems_and_leaves(self) -> None:
        """Keep texts off stems and large leaves."""
        for placed in self.grove.trees:
            top, bottom = placed.fork_y, placed.soil_y
            self._texts.take(QRectF(placed.root_x - 2, top, 4, bottom - top))
            if not self._is_wide or placed.style != "branches":
                continue
            for leaf in placed.tree.leaves:
                x = self._x(leaf.tip_ppm, placed)
                height = placed.leaf_y - placed.tip_y
                self._texts.take(QRectF(x - 4, placed.tip_y, 8, height))

    def _feet(self) -> None:
        width = 1.3 if self._is_wide else 1.0
        top, bottom = self.layout.baseline, self.layout.tip
        lines = []
        for foot in self.scene.feet:
            x = self.map.x_of(foot.shift_ppm)
            if x is not None and self.layout.left <= x <= self.layout.right:
                lines.append(QLineF(x, top, x, bottom))
        self.ink.painter.setPen(QPen(self.ink.colour("trace"), width))
        self.ink.painter.drawLines(lines)

    def _strays(self) -> None:
        for mark in self.scene.signals:
            if mark.stray is None:
                continue
            index = self.map.stretch_of(mark.centre_ppm)
            x = self.map.x_of(mark.centre_ppm)
            if index is None or x is None:
                continue
            if not self.layout.left <= x <= self.layout.right:
                continue
            y = self.layout.tip + 12
            seed = QRectF(x - 7, y - 7, 14, 14)
            if not self._texts.is_free(seed):
                continue
            self._texts.take(seed)
            paint_mark(self.ink, x, y, "stray", size=11, known=mark.stray == "known")
            self._stray_name(mark.name, x, index)

    def _stray_name(self, name: str, x: float, index: int) -> None:
        look = self.ink.look
        size = 13 if self._is_wide else 12
        width = look.width(name, size)
        start, end = self.map.span(index)
        left, right = max(start, self.layout.left), min(end, self.layout.right)
        middle = min(max(x, left - 6 + width / 2), right + 6 - width / 2)
        baseline = self.layout.tip + look.px(34)
        rect = QRectF(middle - width / 2 - 3, baseline - 12, width + 6, 16)
        if not name or width > right - left + 12 or not self._texts.is_free(rect):
            return
        self._texts.take(rect)
        face = Face(size=size, colour="tone:stray")
        self.ink.text(middle, baseline, name, face, align="centre")

    def _clipped(self, placed: PlacedTree) -> None:
        start, end = self.map.span(placed.stretch)
        left, right = max(start, self.layout.left), min(end, self.layout.right)
        painter = self.ink.painter
        painter.save()
        top, bottom = self.layout.seam - 12, self.layout.soil + 1
        painter.setClipRect(
            QRectF(left, top, right - left, bottom - top),
            Qt.ClipOperation.IntersectClip,
        )
        {
            "stump": self._stump,
            "stem": self._stem,
            "broad": self._broad,
            "hedge": self._hedge,
            "branches": self._branches,
        }[placed.style](placed)
        painter.restore()

    def _stump(self, placed: PlacedTree) -> None:
        x, y = placed.root_x, placed.soil_y
        self.ink.line((x, y), (x, y - 22), "bark", 1.8)
        cap = Qt.PenCapStyle.RoundCap
        self.ink.line((x - 7, y - 22), (x + 7, y - 22), "bark", 2.4, cap)

    def _stem(self, placed: PlacedTree) -> None:
        x = placed.root_x
        self.ink.line((x, placed.soil_y), (x, placed.leaf_y - 1), "bark", 1.8)
        self._paint_leaf(self._leaf_path(placed, x, x, 1.0), placed.tree.state)
        pattern = placed.tree.pattern
        if self.grove.px_per_hz >= STEM_ONLY_BELOW or not pattern:
            return
        self._patterns.append((placed, pattern))

    def _pattern(self, placed: PlacedTree, pattern: str) -> None:
        """Pattern letters beside a stem, on the side that is free."""
        x = placed.root_x
        width = self.ink.look.width(pattern, 13, 600)
        baseline = placed.soil_y - self.ink.look.px(24)
        start, end = self.map.span(placed.stretch)
        start, end = max(start, self.layout.left), min(end, self.layout.right)
        neighbours = [o.root_x for o in self.grove.trees if o is not placed]
        for left in (x + 8, x - 8 - width):
            rect = QRectF(left - 2, baseline - 14, width + 4, 18)
            is_inside = start <= left and left + width <= end
            is_clear = not any(left - 4 < o < left + width + 4 for o in neighbours)
            if is_inside and is_clear and self._texts.is_free(rect):
                self._texts.take(rect)
                self.ink.text(left, baseline, pattern, SECOND_STRONG)
                return

    def _broad(self, placed: PlacedTree) -> None:
        x = placed.root_x
        tree = placed.tree
        self.ink.line((x, placed.soil_y), (x, placed.leaf_y - 2), "bark", 1.8)
        width_hz = tree.width_hz or 0.0
        half = max(4.0, 0.42 * width_hz * self.grove.px_per_hz)
        path = broad_leaf_path((x, placed.leaf_y), half, placed.leaf_y - placed.tip_y)
        self.ink.stroke(path, self._tone(tree.state), 0.9, fill=f"fill:{tree.state}")

    def _hedge(self, placed: PlacedTree) -> None:
        tree = placed.tree
        x0, x1 = placed.span
        root = (placed.root_x, placed.fork_y)
        bar_top, bar_bottom = placed.tip_y + 6, placed.leaf_y - 2
        foot = placed.crown_y if placed.is_low else bar_bottom - 1
        crown = funnel_side(root, (x0 + 1, foot))
        crown.lineTo(x1 - 1, foot)
        back = funnel_side(root, (x1 - 1, foot))
        crown.connectPath(back.toReversed())
        filling = self.ink.colour("bark")
        filling.setAlpha(38 if self.ink.look.tokens.name != "dark" else 60)
        self._casing_line(placed)
        self.ink.area(crown, filling)
        for end in (x0 + 1, x1 - 1):
            self.ink.stroke(funnel_side(root, (end, foot)), "bark", 1.3)
        if placed.is_low:
            for x in (x0 + 1, x1 - 1):
                self.ink.line((x, foot), (x, bar_bottom), "bark", 1.0)
        bar = QRectF(x0, bar_top, x1 - x0, bar_bottom - bar_top)
        fill = f"fill:{tree.state}"
        painter = self.ink.painter
        painter.setPen(QPen(self.ink.colour(self._tone(tree.state)), 1))
        painter.setBrush(
            self.ink.colour("lane") if tree.state == "open" else self.ink.colour(fill)
        )
        radius = min(5.0, bar.height() / 2)
        painter.drawRoundedRect(bar, radius, radius)
        painter.setBrush(Qt.BrushStyle.NoBrush)
        for leaf in tree.leaves:
            x = self._x(leaf.tip_ppm, placed)
            self.ink.line((x, placed.tip_y), (x, bar_top), self._tone(tree.state), 1)

    def _casing_line(self, placed: PlacedTree) -> None:
        stem = QPainterPath(QPointF(placed.root_x, placed.soil_y))
        stem.lineTo(placed.root_x, placed.fork_y)
        self.ink.stroke(stem, "bark", 1.8)

    def _branches(self, placed: PlacedTree) -> None:
        tree = placed.tree
        strokes: list[tuple[QPainterPath, float]] = []
        nodes = [0.0]
        y = placed.fork_y
        n_levels = len(tree.levels)
        rise = (placed.fork_y - placed.crown_y) / max(n_levels, 1)
        forks: list[tuple[Level, list[float], float, float]] = []
        for depth, level in enumerate(tree.levels):
            upper = y - rise
            is_lit = self.lit_level == (tree.claim, depth)
            width = 2.4 if is_lit else max(0.8, 1.6 - 0.2 * depth)
            path, ends = self._fork(placed, level, nodes, (y, upper))
            strokes.append((path, width))
            forks.append((level, nodes, y, upper))
            self._handle(placed, depth, level, nodes, (y, upper))
            nodes, y = ends, upper
        ends_x = [self._x(leaf.base_ppm, placed) for leaf in tree.leaves]
        self._ghosts(placed, forks)
        self._bark(placed, strokes, ends_x, y)
        self._twigs(placed, y)
        self._leaves(placed, ends_x)
        self._gaps(placed)
        if placed.has_j_labels:
            for depth, fork in enumerate(forks):
                self._j_label(placed, depth, fork)

    def _fork(
        self,
        placed: PlacedTree,
        level: Level,
        nodes: list[float],
        ys: tuple[float, float],
    ) -> tuple[QPainterPath, list[float]]:
        """Branches of one level as one path, and the nodes where they end, Hz."""
        path = QPainterPath()
        ends: set[float] = set()
        for node in nodes:
            start = (self._hz_x(node, placed), ys[0])
            for k in range(level.n_partners + 1):
                offset = round(node + (k - level.n_partners / 2) * level.j_hz, 2)
                add_branch(path, start, (self._hz_x(offset, placed), ys[1]))
                ends.add(offset)
        return path, sorted(ends)

    def _bark(
        self,
        placed: PlacedTree,
        strokes: list[tuple[QPainterPath, float]],
        ends: list[float],
        crown_y: float,
    ) -> None:
        if self._is_crowded(placed):
            ground = self._ground(placed.tree.claim)
            for path, width in strokes:
                self.ink.stroke(path, ground, width + _CASING_PX)
        x = placed.root_x
        self.ink.line((x, placed.soil_y), (x, placed.fork_y), "bark", 1.8)
        for path, width in strokes:
            self.ink.stroke(path, "bark", width)
        painter = self.ink.painter
        painter.setPen(QPen(self.ink.colour("bark"), 1.0 if placed.is_low else 1.2))
        lines = [QLineF(x, crown_y, x, placed.leaf_y - 1) for x in ends]
        painter.drawLines(lines)

    def _is_crowded(self, placed: PlacedTree) -> bool:
        """Whether another tree stands in the same place, so that casings tell."""
        left, right = placed.span
        return any(
            other is not placed and other.span[0] < right and left < other.span[1]
            for other in self.grove.trees
        )

    def _leaves(self, placed: PlacedTree, bases: list[float]) -> None:
        """All leaves of a tree as one path."""
        tree = placed.tree
        heaviest = max((leaf.weight for leaf in tree.leaves), default=1.0)
        path = QPainterPath()
        for leaf, base in zip(tree.leaves, bases, strict=True):
            tip = self._x(leaf.tip_ppm, placed)
            path.addPath(self._leaf_path(placed, base, tip, leaf.weight / heaviest))
        self._paint_leaf(path, tree.state)

    def _twigs(self, placed: PlacedTree, crown_y: float) -> None:
        tree = placed.tree
        if self.grove.px_per_hz < LARGE_LEAVES_FROM or not tree.leaves:
            return
        for twig_ppm in tree.twigs_ppm:
            nearest = min(tree.leaves, key=lambda leaf: abs(leaf.base_ppm - twig_ppm))
            start = (self._x(nearest.base_ppm, placed), crown_y)
            path = branch_path(start, (self._x(twig_ppm, placed), placed.tip_y))
            self.ink.stroke(path, "bark", 1.0, dashes=[3.0, 2.5])

    def _leaf_path(
        self, placed: PlacedTree, base_x: float, tip_x: float, share: float
    ) -> QPainterPath:
        width = leaf_width(self.grove.px_per_hz) * (0.45 + 0.55 * math.sqrt(share))
        return leaf_path((base_x, placed.leaf_y), (tip_x, placed.tip_y), width)

    def _paint_leaf(self, path: QPainterPath, state: str) -> None:
        if state == "open":
            self.ink.stroke(path, self._tone(state), 1.1, fill="lane")
        else:
            self.ink.stroke(path, self._tone(state), 0.9, fill=f"fill:{state}")

    def _ghosts(
        self,
        placed: PlacedTree,
        forks: list[tuple[Level, list[float], float, float]],
    ) -> None:
        """Dashed branches and hollow leaves at the claimed J of a disputed level."""
        if placed.tree.state != "disputed" or not self._is_wide:
            return
        tone = self._tone("disputed")
        for level, nodes, lower, upper in forks:
            if not level.is_disputed:
                continue
            for node in nodes:
                for k in range(level.n_partners + 1):
                    away = (k - level.n_partners / 2) * level.predicted_j_hz
                    x = self._hz_x(node + away, placed)
                    path = branch_path((self._hz_x(node, placed), lower), (x, upper))
                    self.ink.stroke(path, tone, 1.2, dashes=[3.0, 3.0])
                    if level is placed.tree.levels[-1]:
                        shape = leaf_path((x, placed.leaf_y), (x, placed.tip_y), 5.0)
                        self.ink.stroke(shape, tone, 1.2, fill="lane", dashes=[2.5, 2])

    def _gaps(self, placed: PlacedTree) -> None:
        """Bars from leaf tip to foot; their length in Hz from 5 px/Hz on."""
        off = [leaf for leaf in placed.tree.leaves if leaf.is_off]
        look = self.ink.look
        for leaf in off:
            tip = self._x(leaf.tip_ppm, placed)
            gap_px = (leaf.gap_hz or 0.0) * self.grove.px_per_hz
            left = min(tip, tip + gap_px)
            bar = QRectF(left, placed.tip_y - 1, abs(gap_px), 3)
            self.ink.fill(bar, "fill:disputed")
            if self.grove.px_per_hz <= GAPS_FROM or leaf.gap_hz is None:
                continue
            text = signed(leaf.gap_hz, 2) + (" Hz" if leaf is off[-1] else "")
            baseline = placed.tip_y + look.px(22)
            x = max(tip, tip + gap_px) + 6
            width = look.width(text, 12, 600)
            rect = QRectF(x - 2, baseline - 12, width + 4, 16)
            if self._texts.is_free(rect):
                self._texts.take(rect)
                face = Face(size=12, weight=600, colour="tone:disputed")
                self.ink.text(x, baseline, text, face)

    def _j_label(
        self,
        placed: PlacedTree,
        depth: int,
        fork: tuple[Level, list[float], float, float],
    ) -> None:
        level, nodes, _, upper = fork
        look = self.ink.look
        node = max(nodes) if depth else nodes[0]  # leftmost: highest frequency
        half = level.n_partners / 2 * level.j_hz
        left = self._hz_x(node + half, placed)
        right = self._hz_x(node - half, placed)
        if level.is_disputed and placed.tree.state == "disputed":
            self._disputed_label(placed, level, nodes, upper)
            return
        text = number(level.j_hz, 2) if level.is_determined else say("not determined")
        face = SECOND_STRONG if level.is_determined else SECOND
        width = look.width(text, face.size, face.weight)
        if right - left >= width + _TEXT_ROOM_PX:
            x, baseline = (left + right - width) / 2, upper + look.px(18)
        else:
            x, baseline = left - 10 - width, upper + look.px(24)
        rect = QRectF(x - 2, baseline - 12, width + 4, 16)
        if self._texts.is_free(rect) and x > self.layout.left:
            self._texts.take(rect)
            self.ink.text(x, baseline, text, face)

    def _disputed_label(
        self, placed: PlacedTree, level: Level, nodes: list[float], upper: float
    ) -> None:
        look = self.ink.look
        found = say("{0} found").replace("{0}", number(level.j_hz, 2))
        predicted = say("{0} predicted").replace(
            "{0}", f"{number(level.predicted_j_hz, 1)} ± {level.predicted_j_sd_hz:.1f}"
        )
        half = level.n_partners / 2 * max(level.j_hz, level.predicted_j_hz)
        width = max(look.width(found, 13, 600), look.width(predicted, 13, 600))
        x = self._beside(placed, nodes, half, width)
        if x is None:
            return
        rect = QRectF(x - 2, upper - 4, width + 4, look.px(34))
        if not self._texts.is_free(rect):
            return
        self._texts.take(rect)
        self.ink.text(x, upper + look.px(10), found, SECOND_STRONG)
        face = Face(size=13, weight=600, colour="tone:disputed")
        self.ink.text(x, upper + look.px(27), predicted, face)

    def _beside(
        self, placed: PlacedTree, nodes: list[float], half_hz: float, width: float
    ) -> float | None:
        """Left side of a text beside a level: right of it, else left, else none."""
        start, end = self.map.span(placed.stretch)
        right_of = self._hz_x(min(nodes) - half_hz, placed) + 12
        if right_of + width <= min(end, self.layout.right):
            return right_of
        left_of = self._hz_x(max(nodes) + half_hz, placed) - 12 - width
        if left_of >= max(start, self.layout.left):
            return left_of
        inside = self._hz_x(min(nodes), placed) - width / 2
        has_room = 2 * half_hz * self.grove.px_per_hz >= width + _TEXT_ROOM_PX
        return inside if has_room else None

    def _handle(
        self,
        placed: PlacedTree,
        depth: int,
        level: Level,
        nodes: list[float],
        ys: tuple[float, float],
    ) -> None:
        half_px = level.n_partners / 2 * level.j_hz * self.grove.px_per_hz
        self.handles.append(
            BranchHandle(
                claim=placed.tree.claim,
                level=depth,
                nodes=tuple(self._hz_x(node, placed) for node in nodes),
                half_px=tuple(half_px for _ in nodes),
                lower_y=ys[0],
                upper_y=ys[1],
            )
        )

    def _label(self, label: RootLabel) -> None:
        look = self.ink.look
        soil = self.layout.soil
        is_tag = label.is_tag
        if abs(label.x - label.root_x) > 1 and not is_tag:
            elbow = QPainterPath(QPointF(label.root_x, soil))
            elbow.cubicTo(
                QPointF(label.root_x, soil + 8),
                QPointF(label.x, soil + 4),
                QPointF(label.x, soil + 12),
            )
            self.ink.stroke(elbow, "bark", 1.2)
        baseline = soil + look.px(24)
        if self.selected in label.claims:
            half = label.width / 2 + 5
            box = QRectF(label.x - half, soil + look.px(10), 2 * half, look.px(33))
            self.ink.box(box, fill="selected", edge="accent")
        face = Face(size=12, colour="muted") if is_tag else STRONG
        if is_tag:
            self.ink.text(label.x, baseline, label.text, face, align="centre")
            return
        self.ink.label(label.x, baseline, label.text, face, align="centre")
        self.ink.text(
            label.x, soil + look.px(39), label.caption, CAPTION, align="centre"
        )

    def _ground(self, claim: str) -> QColor:
        """Colour behind a tree: the lane, tinted where its claim is selected."""
        ground = self.ink.colour("lane")
        if claim != self.selected:
            return ground
        tint = self.ink.look.tint
        share = tint.alphaF()
        return QColor.fromRgbF(
            tint.redF() * share + ground.redF() * (1 - share),
            tint.greenF() * share + ground.greenF() * (1 - share),
            tint.blueF() * share + ground.blueF() * (1 - share),
        )

    def _tone(self, state: str) -> str:
        return f"tone:{state}"

    def _x(self, shift_ppm: float, placed: PlacedTree) -> float:
        return self.map.x_of(shift_ppm, placed.stretch) or 0.0

    def _hz_x(self, offset_hz: float, placed: PlacedTree) -> float:
        """Place of an offset from the root; positive is to the left."""
        return placed.root_x - offset_hz * self.grove.px_per_hz
