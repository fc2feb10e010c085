"""Colours of a printed page: ink on white, colour on states only.

State fills are the colour-blind-safe set of Okabe and Ito; each has an edge in
a darker tone that carries the contrast, and each state has its own shape.

References
----------
.. [1] M. Okabe, K. Ito, "Color Universal Design", 2008 (from memory).
"""

from __future__ import annotations

from collections.abc import Mapping

INK = "#1D2226"
MUTED = "#575D62"
RULE = "#A8A294"
HAIRLINE = "#DDD8CC"
FOLD = "#F3F1EB"
BAND = "#E9E6DC"
BARK = "#6E6455"
ACCENT = "#005E94"
MODEL_FILL = "#56B4E9"
MODEL_FILL_OPACITY = 0.27
MODEL_EDGE = "#2F7FB3"
PAPER = "#FFFFFF"

STATE_FILL: Mapping[str, str] = {
    "settled": "#009E73",
    "disputed": "#D55E00",
    "open": "#E69F00",
    "silent": "#7F868C",
    "stray": "#CC79A7",
}
STATE_TONE: Mapping[str, str] = {
    "settled": "#00694D",
    "disputed": "#A34700",
    "open": "#7F5600",
    "silent": "#575D62",
    "stray": "#8F3B6B",
}
FONT_STACK = (
    "'Source Sans 3', 'Source Sans Pro', 'Segoe UI', 'Helvetica Neue', Arial, "
    "'DejaVu Sans', sans-serif"
)
