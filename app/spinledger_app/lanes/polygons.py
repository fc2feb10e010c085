"""Long polylines for Qt straight from arrays, without a Python loop."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import shiboken6
from PySide6.QtGui import QPolygonF


def polygon(xs: npt.NDArray[np.float64], ys: npt.NDArray[np.float64]) -> QPolygonF:
    """Polygon of the points (xs, ys), both shape (n,), logical px."""
    result = QPolygonF()
    n = xs.size
    if n == 0:
        return result
    result.resize(n)
    # QPointF is two doubles; the polygon's own storage is filled in place.
    # The stubs know neither of these calls; both are the binding's own way.
    memory = shiboken6.VoidPtr(result.data(), n * 16, True)  # type: ignore[call-arg,arg-type]
    points = np.frombuffer(memory, dtype=np.float64).reshape(n, 2)  # type: ignore[call-overload]
    points[:, 0] = xs
    points[:, 1] = ys
    return result
