"""Splitting trees as drawn: a root on the soil line, one level a coupling, leaves.

Shifts in ppm, couplings in Hz, positions in user units.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from math import sqrt

import numpy as np
import numpy.typing as npt

from spinledger.report.palette import BARK, PAPER, STATE_FILL, STATE_TONE
from spinledger.report.svg import Canvas, number
from spinledger.spins.tree import TreeLevel, first_order_levels, first_order_lines
from spinledger.values.claim import ClaimSet
from spinledger.values.ledger import ClaimLines, Entry, Ledger

# Beyond this a crown cannot be read as branches any more.
_MOST_LEAVES = 64
# The pattern's letters are read with the same share of a line's width.
_FINEST_SHARE = 0.5
# Lines weaker than this share of the strongest would only be specks.
_FAINTEST_SHARE = 0.02
_STEM = 12.0
_LEAF = 14.0
_CLOSEST_LEAVES = 3.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Tree:
    """First-order tree of one claim and the exact lines that it should meet.

    Attributes
    ----------
    claim : str
    state : str
    root_ppm : float, ppm
    levels : tuple of TreeLevel
        Largest J first.
    tips_ppm : tuple of float, ppm
        Exact lines of the fit, or the first-order ones where there is no fit.
    weights : tuple of float
        Relative intensity of each tip.
    width_ppm : float, ppm
        Line width.
    """

    claim: str
    state: str
    root_ppm: float
    levels: tuple[TreeLevel, ...]
    tips_ppm: tuple[float, ...]
    weights: tuple[float, ...]
    width_ppm: float

    @property
    def span_ppm(self) -> tuple[float, float]:
        """Lowest and highest shift that the tree touches."""
        return (
            min((self.root_ppm, *self.tips_ppm)) - self.width_ppm / 2,
            max((self.root_ppm, *self.tips_ppm)) + self.width_ppm / 2,
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Storey:
    """Vertical room of one tree: tips on top, crown between, root at the bottom."""

    tip: float
    crown: float
    base: float
    root: float


def claim_tree(ledger: Ledger, entry: Entry) -> Tree | None:
    """Tree of an entry; None for silent claims."""
    if entry.state == "silent":
        return None
    field_mhz = ledger.evidence.spectrum.spectrometer_frequency_mhz
    root = entry.shift_ppm if entry.shift_ppm is not None else entry.predicted_shift_ppm
    levels = tree_levels(ledger, entry)
    found = _lines_of(ledger, entry.claim)
    if entry.state == "open" or found is None:
        tips, weights = _first_order(root, levels, field_mhz)
    else:
        tips, weights = _visible(found, entry.range_ppm, 6.0 / field_mhz)
    width_hz = entry.width_hz or (found.width_hz if found else 1.0)
    return Tree(
        claim=entry.claim,
        state=entry.state,
        root_ppm=root,
        levels=levels,
        tips_ppm=tuple(tips.tolist()),
        weights=tuple(weights.tolist()),
        width_ppm=width_hz / field_mhz,
    )


def draw_tree(
    canvas: Canvas,
    tree: Tree,
    storey: Storey,
    *,
    x_of: Callable[[float], float],
    field_mhz: float,
) -> None:
    """Draw a tree into its storey.

    Parameters
    ----------
    canvas : Canvas
    tree : Tree
    storey : Storey
    x_of : callable
        Position of a shift.
    field_mhz : float, MHz
    """
    tips = np.array([x_of(shift) for shift in tree.tips_ppm])
    root_x = x_of(tree.root_ppm)
    gap = 8.0 if tree.state == "open" else 0.0
    tip_y = storey.tip + gap
    leaves, leaf_weights = _first_order(tree.root_ppm, tree.levels, field_mhz)
    leaf_x = np.array([x_of(shift) for shift in leaves])
    per_hz = abs(x_of(0.0) - x_of(1.0 / field_mhz))
    if _is_hedge(tree, leaf_x, tips, per_hz=per_hz):
        _draw_hedge(canvas, tree, storey, root_x, np.sort(tips))
        return
    top = storey.crown + _LEAF
    _stem(canvas, root_x, storey.root, storey.base - _STEM if tree.levels else top)
    if tree.levels:
        _branches(
            canvas, tree, (storey.base - _STEM, top), x_of=x_of, field_mhz=field_mhz
        )
    wide = x_of(0.0) - x_of(tree.width_ppm)
    for x, weight in zip(leaf_x, leaf_weights, strict=True):
        target = float(tips[np.argmin(np.abs(tips - x))]) if tips.size else x
        if storey.crown > storey.tip:  # a lower storey: the stalk rises to the line
            canvas.line((x, top), (x, tip_y + _LEAF), stroke=BARK, width=0.8)
        _leaf(
            canvas,
            (x, tip_y + _LEAF),
            (target, tip_y),
            half=_half_width(tree, float(weight / leaf_weights.max()), abs(wide)),
            state=tree.state,
        )


def storeys(
    trees: Sequence[Tree], tip: float, soil: float, x_of: Callable[[float], float]
) -> tuple[Storey, ...]:
    """Room for each tree; those that overlap stand above each other.

    The tree with the most leaves stands on top, its stem running down to the
    soil line; at most three stand in storeys, further ones share the lowest.
    """
    rooms = [Storey(tip=tip, crown=tip, base=soil, root=soil)] * len(trees)
    for group in _overlapping(trees, x_of):
        if len(group) == 1:
            continue
        order = sorted(group, key=lambda index: -len(trees[index].tips_ppm))
        shares = (0.58, 0.42) if len(order) == 2 else (0.42, 0.31, 0.27)
        edges = [tip]
        for share in shares:
            edges.append(edges[-1] + share * (soil - tip))
        for rank, index in enumerate(order):
            place = min(rank, len(shares) - 1)
            rooms[index] = Storey(
                tip=tip, crown=edges[place], base=edges[place + 1], root=soil
            )
    return tuple(rooms)


def tree_levels(ledger: Ledger, entry: Entry) -> tuple[TreeLevel, ...]:
    """Splittings to draw, by the rules that name the pattern, largest J first."""
    couplings_hz = known_couplings_hz(ledger)
    levels = first_order_levels(
        ledger.claims,
        ledger.claims.index_of(entry.claim),
        couplings_hz,
        finest_hz=_FINEST_SHARE * (entry.width_hz or 1.0),
    )
    kept: list[TreeLevel] = []
    n_leaves = 1
    for level in levels:
        n_leaves *= level.n_spins + 1
        if n_leaves > _MOST_LEAVES:
            break
        kept.append(level)
    return tuple(kept)


def known_couplings_hz(ledger: Ledger) -> npt.NDArray[np.float64]:
    """|J| of every coupling parameter as the entries book it, NaN where unknown.

    Returns
    -------
    numpy.ndarray, shape (n_couplings,), Hz
    """
    entries = {entry.claim: entry for entry in ledger.entries}
    found = np.full(len(ledger.claims.couplings), np.nan)
    for index, coupling in enumerate(ledger.claims.couplings):
        for own, partner in _ends(ledger.claims, coupling.pairs[0]):
            values = [
                abs(one.j_hz)
                for one in (entries[own].couplings if own in entries else ())
                if one.partner == partner
                and one.predicted_j_hz == coupling.j_hz
                and one.determined
                and one.j_hz is not None
            ]
            if values:
                found[index] = values[0]
    return found


def _ends(claims: ClaimSet, pair: tuple[int, int]) -> list[tuple[str, str]]:
    """Both directions of a pair, as (claim, partner as an entry names it)."""
    particles = [claims.particles[one] for one in pair]
    names = [
        one.nucleus if one.claim is None else claims.claims[one.claim].label
        for one in particles
    ]
    return [
        (names[side], names[1 - side])
        for side in (0, 1)
        if particles[side].claim is not None
    ]


def _lines_of(ledger: Ledger, claim: str) -> ClaimLines | None:
    if ledger.model is None:
        return None
    return next((one for one in ledger.model.claim_lines if one.claim == claim), None)


def _visible(
    lines: ClaimLines, region: tuple[float, float] | None, margin_ppm: float
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """Lines that can be told in a drawing.

    In a strongly coupled system some of a claim's intensity stands among its
    partner's lines; the tree shows what stands in the claim's own range.
    """
    if lines.protons.size == 0:
        return lines.shifts_ppm, lines.protons
    shown = lines.protons >= _FAINTEST_SHARE * lines.protons.max()
    if region is not None:
        inside = (lines.shifts_ppm >= region[0] - margin_ppm) & (
            lines.shifts_ppm <= region[1] + margin_ppm
        )
        shown = shown & inside if np.any(shown & inside) else shown
    return lines.shifts_ppm[shown], lines.protons[shown]


def _first_order(
    root_ppm: float, levels: tuple[TreeLevel, ...], field_mhz: float
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    lines_hz, shares = first_order_lines(root_ppm * field_mhz, levels)
    return lines_hz / field_mhz, shares


def _is_hedge(
    tree: Tree,
    leaf_x: npt.NDArray[np.float64],
    tips: npt.NDArray[np.float64],
    *,
    per_hz: float,
) -> bool:
    """Whether branches could not be read, or would not lead to the exact lines."""
    if tips.size > 2 and not _leads_to_lines(tree, leaf_x, tips, per_hz=per_hz):
        return True
    distinct = np.unique(np.round(leaf_x, 1))
    if distinct.size <= 5:
        return False
    return bool(np.diff(distinct).min() < _CLOSEST_LEAVES)


def _leads_to_lines(
    tree: Tree,
    leaf_x: npt.NDArray[np.float64],
    tips: npt.NDArray[np.float64],
    *,
    per_hz: float,
) -> bool:
    """Every leaf has a line and every line a leaf within half the smallest J."""
    smallest_hz = min((level.coupling_hz for level in tree.levels), default=1.0)
    reach = max(0.5 * smallest_hz, 1.0) * per_hz
    gaps = np.abs(np.subtract.outer(leaf_x, tips))
    return bool(gaps.min(axis=1).max() <= reach and gaps.min(axis=0).max() <= reach)


def _draw_hedge(
    canvas: Canvas,
    tree: Tree,
    storey: Storey,
    root_x: float,
    tips: npt.NDArray[np.float64],
) -> None:
    """A funnel under a rounded bar with one tick a line."""
    left, right = float(tips.min()) - 2, float(tips.max()) + 2
    bar, fork = storey.crown + _LEAF - 4, storey.base - _STEM
    rise = fork - bar
    sides = [
        f"M{number(root_x)} {number(fork)}C{number(root_x)} {number(fork - rise / 2)} "
        f"{number(edge)} {number(bar + 0.45 * rise)} {number(edge)} {number(bar)}"
        for edge in (left, right)
    ]
    closing = (
        f"L{number(right)} {number(bar)}C{number(right)} {number(bar + 0.45 * rise)} "
        f"{number(root_x)} {number(fork - rise / 2)} {number(root_x)} {number(fork)}Z"
    )
    canvas.path(sides[0] + closing, fill=BARK, opacity=0.15)
    for side in sides:
        canvas.path(side, stroke=BARK, width=1.0)
    _stem(canvas, root_x, storey.root, fork)
    if storey.crown > storey.tip:
        ticks = "".join(
            f"M{number(x)} {number(bar)}V{number(storey.tip + 4)}" for x in tips
        )
        canvas.path(ticks, stroke=BARK, width=0.6)
    tone, fill = STATE_TONE[tree.state], STATE_FILL[tree.state]
    filled = PAPER if tree.state == "open" else fill
    top = storey.crown + 2
    canvas.path(
        f"M{number(left)} {number(top + 3)}q0 -3 3 -3H{number(right - 3)}q3 0 3 3"
        f"V{number(bar - 3)}q0 3 -3 3H{number(left + 3)}q-3 0 -3 -3Z",
        stroke=tone,
        width=0.8,
        fill=filled,
    )
    ticks = "".join(f"M{number(x)} {number(top + 1)}V{number(bar - 1)}" for x in tips)
    canvas.path(ticks, stroke=tone, width=0.6)


def _branches(
    canvas: Canvas,
    tree: Tree,
    between: tuple[float, float],
    *,
    x_of: Callable[[float], float],
    field_mhz: float,
) -> None:
    bottom, top = between
    step = (bottom - top) / len(tree.levels)
    nodes = [tree.root_ppm]
    y = bottom
    for rank, level in enumerate(tree.levels):
        reached: list[float] = []
        strokes: list[str] = []
        for node in nodes:
            for k in range(level.n_spins + 1):
                end = node + (k - level.n_spins / 2) * level.coupling_hz / field_mhz
                strokes.append(_branch((x_of(node), y), (x_of(end), y - step)))
                reached.append(end)
        canvas.path("".join(strokes), stroke=BARK, width=max(0.7, 1.4 - 0.2 * rank))
        # Branches that meet at one place go on as one.
        nodes = sorted({round(one, 7): one for one in reached}.values())
        y -= step


def _branch(start: tuple[float, float], end: tuple[float, float]) -> str:
    rise = start[1] - end[1]
    return (
        f"M{number(start[0])} {number(start[1])}"
        f"C{number(start[0])} {number(start[1] - 0.42 * rise)} "
        f"{number(end[0])} {number(end[1] + 0.52 * rise)} "
        f"{number(end[0])} {number(end[1])}"
    )


def _stem(canvas: Canvas, x: float, root: float, top: float) -> None:
    canvas.line((x, root), (x, top), stroke=BARK, width=1.4)


def _half_width(tree: Tree, share: float, line_width: float) -> float:
    if not tree.levels and line_width > 6:  # one wide leaf for a broad signal
        return 0.42 * line_width
    return 1.8 * (0.45 + 0.55 * sqrt(max(share, 0.0)))


def _leaf(
    canvas: Canvas,
    base: tuple[float, float],
    tip: tuple[float, float],
    *,
    half: float,
    state: str,
) -> None:
    """An almond from its first-order base to the exact line: a lean is a shift."""
    (x0, y0), (x1, y1) = base, tip
    middle, height = (x0 + x1) / 2, (y0 + y1) / 2
    half = 1.5 * half
    commands = (
        f"M{number(x0)} {number(y0)}Q{number(middle - half)} {number(height)} "
        f"{number(x1)} {number(y1)}Q{number(middle + half)} {number(height)} "
        f"{number(x0)} {number(y0)}Z"
    )
    fill = PAPER if state == "open" else STATE_FILL[state]
    canvas.path(commands, stroke=STATE_TONE[state], width=0.8, fill=fill)


def _overlapping(
    trees: Sequence[Tree], x_of: Callable[[float], float]
) -> list[list[int]]:
    """Indices of trees whose drawn spans touch, in groups."""
    spans = []
    for index, tree in enumerate(trees):
        low, high = tree.span_ppm
        spans.append((x_of(high) - 3, x_of(low) + 3, index))
    groups: list[list[int]] = []
    reach = -np.inf
    for left, right, index in sorted(spans):
        if groups and left < reach:
            groups[-1].append(index)
            reach = max(reach, right)
        else:
            groups.append([index])
            reach = right
    return groups
