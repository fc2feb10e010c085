"""Shapes of leaves and branches."""

from __future__ import annotations

from PySide6.QtCore import QPointF
from PySide6.QtGui import QPainterPath


def leaf_path(
    base: tuple[float, float], tip: tuple[float, float], width: float
) -> QPainterPath:
    """Almond from its foot to its tip; large ones are fuller near the foot."""
    xb, yb = base
    xt, yt = tip
    path = QPainterPath(QPointF(xb, yb))
    if yb - yt <= 24:
        middle = (yb + yt) / 2
        xm = (xb + xt) / 2
        path.cubicTo(
            QPointF(xm - width, middle + 2), QPointF(xm - width * 0.7, middle - 3),
            QPointF(xt, yt),
        )  # fmt: skip
        path.cubicTo(
            QPointF(xm + width * 0.7, middle - 3), QPointF(xm + width, middle + 2),
            QPointF(xb, yb),
        )  # fmt: skip
        return path
    height = yb - yt
    for side in (-1, 1):
        w = side * width
        low = (xb + w * 0.5, yb - height * 0.05, xb + w * 1.15, yb - height * 0.30)
        belly = (xb + w, yb - height * 0.52)
        high = (xb + w * 0.7, yt + height * 0.25, xt + w * 0.2, yt + height * 0.12)
        if side < 0:
            path.cubicTo(*low, *belly)
            path.cubicTo(*high, xt, yt)
        else:
            path.cubicTo(high[2], high[3], high[0], high[1], *belly)
            path.cubicTo(low[2], low[3], low[0], low[1], xb, yb)
    return path


def broad_leaf_path(
    base: tuple[float, float], half_width: float, height: float
) -> QPainterPath:
    """One wide leaf for a broad signal, pointed at foot and tip."""
    x, y = base
    top = y - height
    middle = y - height * 0.5
    path = QPainterPath(QPointF(x, y))
    for side in (-1, 1):
        outer = QPointF(x + side * half_width, middle)
        near = QPointF(x + side * half_width * 0.5, y - height * 0.12)
        far = QPointF(x + side * half_width * 0.5, top + height * 0.12)
        if side < 0:
            path.quadTo(near, outer)
            path.quadTo(far, QPointF(x, top))
        else:
            path.quadTo(far, outer)
            path.quadTo(near, QPointF(x, y))
    return path


def branch_path(start: tuple[float, float], end: tuple[float, float]) -> QPainterPath:
    """Branch that leaves and arrives upright; y of the end is the smaller one."""
    path = QPainterPath()
    add_branch(path, start, end)
    return path


def add_branch(
    path: QPainterPath, start: tuple[float, float], end: tuple[float, float]
) -> None:
    """Add a branch to a path; many are stroked at once far faster than singly."""
    rise = start[1] - end[1]
    path.moveTo(*start)
    path.cubicTo(
        start[0], start[1] - rise * 0.42, end[0], end[1] + rise * 0.52, end[0], end[1]
    )


def funnel_side(start: tuple[float, float], end: tuple[float, float]) -> QPainterPath:
    """One side of a hedge's crown."""
    rise = start[1] - end[1]
    path = QPainterPath(QPointF(*start))
    path.cubicTo(
        QPointF(start[0], start[1] - rise * 0.5),
        QPointF(end[0], end[1] + rise * 0.45),
        QPointF(*end),
    )
    return path
