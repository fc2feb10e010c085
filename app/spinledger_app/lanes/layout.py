"""Where the lanes lie in their widget; logical px."""

from __future__ import annotations

from dataclasses import dataclass

GUTTER_PX = 88.0
WIDE_GUTTER_PX = 100.0
RIGHT_MARGIN_PX = 16.0
AXIS_PX = 28.0
SOIL_PX = 44.0
FOOT_PX = 9.0
BASELINE_LIFT_PX = 6.0
BRACKET_PX = 44.0
LEAST_PX = (160.0, 160.0, 72.0)
DEFAULT_SHARES = (0.44, 0.37, 0.19)


@dataclass(frozen=True, slots=True, kw_only=True)
class LaneLayout:
    """Edges of the lanes from top to bottom, and of the plot from left to right.

    Attributes
    ----------
    left, right : float
        Ends of the plot.
    gutter : float
        Right edge of the gutter with the lanes' names.
    evidence_top, seam, claims_bottom, axis_top, bottom : float
        The seam is where Evidence meets Claims; the axis row is last.
    width : float
        Of the widget.
    scale : float
        The user's text size.
    """

    left: float
    right: float
    gutter: float
    width: float
    evidence_top: float
    seam: float
    claims_bottom: float
    axis_top: float
    bottom: float
    scale: float = 1.0

    @property
    def baseline(self) -> float:
        """Zero of the evidence."""
        return self.seam - BASELINE_LIFT_PX

    @property
    def tip(self) -> float:
        """Lower end of the measured lines' feet, where leaves touch."""
        return self.seam - BASELINE_LIFT_PX + FOOT_PX

    @property
    def soil(self) -> float:
        """Line on which the roots stand."""
        return self.claims_bottom - round(SOIL_PX * self.scale)

    @property
    def bracket(self) -> float:
        """Line of the signals' brackets."""
        return self.evidence_top + round(30 * self.scale)

    @property
    def curve_top(self) -> float:
        """Upper end of the evidence's curve at full height."""
        return self.evidence_top + round(BRACKET_PX * self.scale)


def lane_layout(
    width: float,
    height: float,
    *,
    shares: tuple[float, float, float] = DEFAULT_SHARES,
    is_wide: bool = False,
    scale: float = 1.0,
) -> LaneLayout:
    """Layout for a widget's size; lanes keep their least heights where they can."""
    gutter = round((WIDE_GUTTER_PX if is_wide else GUTTER_PX) * scale)
    axis_top = height - round(AXIS_PX * scale)
    heights = _heights(axis_top, shares)
    seam = round(heights[0])
    return LaneLayout(
        left=gutter,
        right=width - RIGHT_MARGIN_PX,
        gutter=gutter - 8,
        width=width,
        evidence_top=0.0,
        seam=seam,
        claims_bottom=round(seam + heights[1]),
        axis_top=axis_top,
        bottom=height,
        scale=scale,
    )


def _heights(
    room: float, shares: tuple[float, float, float]
) -> tuple[float, float, float]:
    total = sum(shares)
    heights = [room * share / total for share in shares]
    if room < sum(LEAST_PX):
        return heights[0], heights[1], heights[2]
    for index, least in enumerate(LEAST_PX):
        lack = least - heights[index]
        if lack <= 0:
            continue
        heights[index] = least
        spare = [max(0.0, h - m) for h, m in zip(heights, LEAST_PX, strict=True)]
        total_spare = sum(spare)
        heights = [
            h - lack * s / total_spare for h, s in zip(heights, spare, strict=True)
        ]
    return heights[0], heights[1], heights[2]
