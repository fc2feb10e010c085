"""Blocks that flow over A4 pages; lengths in CSS px (1/96 inch)."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace

from PySide6.QtCore import QRectF

from spinledger_app.painting.ink import Face, Ink, wrap
from spinledger_app.painting.marks import paint_mark
from spinledger_app.theme import Look

PAGE_WIDTH = 793.7  # 210 mm
PAGE_HEIGHT = 1122.5  # 297 mm
MARGIN = 60.5  # 16 mm
FOOTER = 34.0

Paint = Callable[[Ink, float], None]

TEXT = Face(size=12)
TEXT_MUTED = Face(size=12, colour="muted")
CELL = Face(size=11.3)
CELL_STRONG = Face(size=11.3, weight=600)
CELL_MUTED = Face(size=11.3, colour="muted")
HEADING = Face(size=14, weight=600)
TITLE = Face(size=25, weight=600)


@dataclass(frozen=True, slots=True, kw_only=True)
class Block:
    """Something with a height that is painted with its top at a given y.

    ``keeps_next`` holds it on the page of the block after it; ``head`` is painted
    above it again where it is the first on a page.
    """

    height: float
    paint: Paint
    keeps_next: bool = False
    head: Block | None = None


@dataclass(slots=True)
class Flow:
    """Blocks in order, and the pages they fall on."""

    look: Look
    blocks: list[Block] = field(default_factory=list)

    @property
    def left(self) -> float:
        """Left edge of the text."""
        return MARGIN

    @property
    def right(self) -> float:
        """Right edge of the text."""
        return PAGE_WIDTH - MARGIN

    @property
    def width(self) -> float:
        """Width of the text."""
        return self.right - self.left

    def add(self, height: float, paint: Paint, *, keeps_next: bool = False) -> None:
        """Add a block."""
        self.blocks.append(Block(height=height, paint=paint, keeps_next=keeps_next))

    def gap(self, height: float) -> None:
        """Add empty space."""
        self.add(height, lambda _ink, _y: None)

    def rule(self, colour: str = "rule", *, width: float = 1.0) -> None:
        """Add a rule over the whole width."""

        def paint(ink: Ink, y: float) -> None:
            ink.fill(QRectF(self.left, y, self.width, width), colour)

        self.add(width + 1, paint)

    def heading(self, text: str) -> None:
        """Add a heading that stays with what follows."""
        self.gap(12)

        def paint(ink: Ink, y: float) -> None:
            ink.text(self.left, y + 14, text, HEADING)

        self.add(22, paint, keeps_next=True)

    def paragraph(
        self, text: str, face: Face = TEXT, *, lead: str = "", indent: float = 0.0
    ) -> None:
        """Add wrapped text, line by line so that it may break over pages."""
        step = face.size + 4.5
        lines = wrap(self.look, f"{lead}{text}", self.width - indent, face)
        for line in lines:

            def paint(ink: Ink, y: float, line: str = line) -> None:
                ink.text(self.left + indent, y + face.size, line, face)

            self.add(step, paint)

    def bullets(self, texts: Sequence[str], face: Face = TEXT) -> None:
        """Add a list."""
        for text in texts:
            lines = wrap(self.look, text, self.width - 14, face)
            for i, line in enumerate(lines):

                def paint(ink: Ink, y: float, line: str = line, i: int = i) -> None:
                    if i == 0:
                        ink.text(self.left + 2, y + face.size, "·", face)
                    ink.text(self.left + 14, y + face.size, line, face)

                self.add(face.size + 4.5, paint)

    def pages(self) -> list[list[tuple[Block, float]]]:
        """Blocks with their tops, page by page."""
        bottom = PAGE_HEIGHT - MARGIN - FOOTER
        pages: list[list[tuple[Block, float]]] = [[]]
        y = MARGIN
        for index, block in enumerate(self.blocks):
            if y + self._held_height(index) > bottom and pages[-1]:
                pages.append([])
                y = MARGIN
                if block.head is not None:
                    pages[-1].append((block.head, y))
                    y += block.head.height
            pages[-1].append((block, y))
            y += block.height
        return pages

    def _held_height(self, index: int) -> float:
        """Height of a block with all that it must stay together with."""
        total = 0.0
        for block in self.blocks[index:]:
            total += block.height
            if not block.keeps_next:
                break
        return total


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """A table's column: head, share of the width."""

    head: str
    share: float


def add_table(
    flow: Flow,
    columns: Sequence[Column],
    rows: Sequence[Sequence[str]],
    *,
    first_is_strong: bool = True,
    marks: Sequence[str] = (),
) -> None:
    """Add a table whose cells wrap; ``marks`` are states painted in the last column."""
    total = sum(column.share for column in columns)
    edges = [flow.left]
    for column in columns:
        edges.append(edges[-1] + flow.width * column.share / total)

    def paint_head(ink: Ink, y: float) -> None:
        ink.hline(flow.left, flow.right, y, "ink")
        for column, x in zip(columns, edges, strict=False):
            ink.text(x, y + 15, column.head, CELL_MUTED)
        ink.hline(flow.left, flow.right, y + 21, "rule")

    flow.add(22, paint_head, keeps_next=True)
    head = flow.blocks[-1]
    for number, row in enumerate(rows):
        _add_row(
            flow,
            edges,
            row,
            first_is_strong=first_is_strong,
            mark=marks[number] if number < len(marks) else "",
        )
        flow.blocks[-1] = replace(flow.blocks[-1], head=head)


def _add_row(
    flow: Flow,
    edges: Sequence[float],
    row: Sequence[str],
    *,
    first_is_strong: bool,
    mark: str,
) -> None:
    faces = [
        CELL_STRONG if first_is_strong and i == 0 else CELL for i in range(len(row))
    ]
    cells = [
        wrap(flow.look, cell, edges[i + 1] - edges[i] - 8, faces[i])
        for i, cell in enumerate(row)
    ]
    height = max(len(lines) for lines in cells) * 15.0 + 6

    def paint(ink: Ink, y: float) -> None:
        for i, lines in enumerate(cells):
            x = edges[i] + (16 if mark and i == len(cells) - 1 else 0)
            for k, line in enumerate(lines):
                ink.text(x, y + 14 + 15 * k, line, faces[i])
        if mark:
            paint_mark(ink, edges[len(cells) - 1] + 5, y + 10, mark, size=9)
        ink.hline(flow.left, flow.right, y + height - 1)

    flow.add(height, paint)


def add_double_rule(flow: Flow) -> None:
    """Close a table as an account is closed."""

    def paint(ink: Ink, y: float) -> None:
        ink.hline(flow.left, flow.right, y, "ink")
        ink.hline(flow.left, flow.right, y + 3, "ink")

    # The closing row never stands on a page alone.
    for rank in (-2, -1):
        flow.blocks[rank] = replace(flow.blocks[rank], keeps_next=True)
    flow.add(8, paint)
