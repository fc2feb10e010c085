"""Splitting trees of the entries: levels, leaves, and how they meet the lines."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import product
from math import comb

import numpy as np
import numpy.typing as npt

from spinledger.values.evidence import Line
from spinledger.values.ledger import ClaimLines, Entry, EntryCoupling, Ledger
from spinledger_app.lanes.scene import Leaf, Level, TreeShape

# Below this a splitting is hidden in the line width of ordinary spectra.
SMALLEST_J_HZ = 0.6
BROAD_HZ = 5.0
_MOST_LEAVES = 96
_SAME_LINE_HZ = 0.25
_WEAK_SHARE = 0.02
_FAR_HZ = 8.0
_OFF_SD = 3.0
_FOOT_REACH_HZ = 6.0
# A line's place is not claimed better than this, whatever the fit says.
_SMALLEST_LINE_SD_HZ = 0.08
# Nor better than this share of its width, where lines overlap.
_WIDTH_SHARE = 0.15


def trees(ledger: Ledger) -> tuple[TreeShape, ...]:
    """One tree an entry, by descending shift of the root."""
    frequency_mhz = ledger.evidence.spectrum.spectrometer_frequency_mhz
    counts = {entry.claim: entry.protons for entry in ledger.entries}
    exact = {}
    if ledger.model is not None:
        exact = {one.claim: one for one in ledger.model.claim_lines}
    lines = [line for signal in ledger.evidence.signals for line in signal.lines]
    shapes = [
        tree_of(entry, counts, exact.get(entry.claim), lines, frequency_mhz)
        for entry in ledger.entries
    ]
    return tuple(sorted(shapes, key=lambda shape: -shape.root_ppm))


def tree_of(
    entry: Entry,
    counts: dict[str, int],
    exact: ClaimLines | None,
    lines: Sequence[Line],
    frequency_mhz: float,
) -> TreeShape:
    """Tree of one entry; predicted places where nothing was found."""
    is_placed = entry.shift_ppm is not None
    root_ppm = entry.shift_ppm if entry.shift_ppm is not None else None
    root = entry.predicted_shift_ppm if root_ppm is None else root_ppm
    levels = levels_of(entry, counts, use_found=is_placed)
    width_hz = entry.width_hz
    is_broad = width_hz is not None and width_hz > BROAD_HZ
    bases, weights = first_order(root, levels, frequency_mhz)
    twigs: tuple[float, ...] = ()
    tips = bases
    if exact is not None and is_placed:
        tips, twigs = tips_of(bases, exact, frequency_mhz)
    leaves = tuple(
        Leaf(base_ppm=float(base), tip_ppm=float(tip), weight=float(weight))
        for base, tip, weight in zip(bases, tips, weights, strict=True)
    )
    if is_placed and not is_broad:
        leaves = _with_gaps(leaves, lines, frequency_mhz)
    pattern = entry.multiplicity or entry.predicted_multiplicity
    return TreeShape(
        claim=entry.claim,
        state=entry.state,
        n_protons=entry.protons,
        root_ppm=root,
        levels=levels,
        leaves=leaves,
        twigs_ppm=twigs,
        pattern=pattern,
        width_hz=width_hz if is_broad else None,
        is_shared=entry.group is not None and entry.group.kind == "shared",
    )


def levels_of(
    entry: Entry, counts: dict[str, int], *, use_found: bool
) -> tuple[Level, ...]:
    """Splittings of an entry, largest J first, as many as can be drawn."""
    per_partner: dict[str, int] = {}
    for coupling in entry.couplings:
        per_partner[coupling.partner] = per_partner.get(coupling.partner, 0) + 1
    levels = []
    for coupling in entry.couplings:
        j_hz = _drawn_j(coupling, use_found=use_found)
        if j_hz < SMALLEST_J_HZ:
            continue
        protons = counts.get(coupling.partner, 1)
        levels.append(
            Level(
                j_hz=j_hz,
                n_partners=max(1, round(protons / per_partner[coupling.partner])),
                partner=coupling.partner,
                predicted_j_hz=abs(coupling.predicted_j_hz),
                predicted_j_sd_hz=coupling.predicted_j_sd_hz,
                is_disputed=coupling.is_disputed and use_found,
                is_determined=coupling.determined and use_found,
            )
        )
    levels.sort(key=lambda level: -level.j_hz)
    kept: list[Level] = []
    n_leaves = 1
    for level in levels:
        n_leaves *= level.n_partners + 1
        if n_leaves > _MOST_LEAVES:
            break
        kept.append(level)
    return tuple(kept)


def first_order(
    root_ppm: float, levels: Sequence[Level], frequency_mhz: float
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """First-order line places (ppm, descending) and binomial weights (sum 1).

    Places closer than a hundredth of a Hz are one line, so that equal J give
    the triplets and quartets that are seen.
    """
    offsets: dict[float, float] = {0.0: 1.0}
    for level in levels:
        n = level.n_partners
        split: dict[float, float] = {}
        for (offset, weight), k in product(offsets.items(), range(n + 1)):
            place = round(offset + (n / 2 - k) * level.j_hz, 2)
            split[place] = split.get(place, 0.0) + weight * comb(n, k) / 2**n
        offsets = split
    ordered = sorted(offsets.items(), reverse=True)
    places = np.array([root_ppm + hz / frequency_mhz for hz, _ in ordered])
    return places, np.array([weight for _, weight in ordered])


def tips_of(
    bases_ppm: npt.NDArray[np.float64], exact: ClaimLines, frequency_mhz: float
) -> tuple[npt.NDArray[np.float64], tuple[float, ...]]:
    """Exact line for every first-order place, and the lines that have none.

    The pairing keeps the order and moves least; where there are fewer exact
    lines than places, neighbours share one.
    """
    lines_ppm, weights = _merged_lines(exact, frequency_mhz)
    reach_ppm = _FAR_HZ / frequency_mhz
    is_near = (lines_ppm < bases_ppm.max() + reach_ppm) & (
        lines_ppm > bases_ppm.min() - reach_ppm
    )
    # Combination lines far outside the multiplet belong to no branch.
    lines_ppm, weights = lines_ppm[is_near], weights[is_near]
    if lines_ppm.size == 0:
        return bases_ppm, ()
    if lines_ppm.size < bases_ppm.size:
        nearest = np.abs(bases_ppm[:, None] - lines_ppm[None, :]).argmin(axis=1)
        return lines_ppm[nearest], ()
    chosen = _ordered_pairing(bases_ppm, lines_ppm)
    left = np.setdiff1d(np.arange(lines_ppm.size), chosen)
    strong = left[weights[left] > 0.03 * weights.max()]
    return lines_ppm[chosen], tuple(float(one) for one in lines_ppm[strong])


def _ordered_pairing(
    bases: npt.NDArray[np.float64], lines: npt.NDArray[np.float64]
) -> npt.NDArray[np.int64]:
    """Index of a line for every base, increasing, with least squared distance."""
    n_bases, n_lines = bases.size, lines.size
    costs = (bases[:, None] - lines[None, :]) ** 2
    best = np.full((n_bases + 1, n_lines + 1), np.inf)
    best[0, :] = 0.0
    for i in range(1, n_bases + 1):
        for j in range(i, n_lines + 1):
            best[i, j] = min(best[i, j - 1], best[i - 1, j - 1] + costs[i - 1, j - 1])
    chosen = np.empty(n_bases, dtype=np.int64)
    j = n_lines
    for i in range(n_bases, 0, -1):
        while j > i and best[i, j] == best[i, j - 1]:
            j -= 1
        j -= 1
        chosen[i - 1] = j
    return chosen


def _merged_lines(
    exact: ClaimLines, frequency_mhz: float
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    strong = exact.protons > _WEAK_SHARE * max(float(exact.protons.max(initial=0)), 0)
    order = np.argsort(-exact.shifts_ppm[strong])
    shifts = exact.shifts_ppm[strong][order]
    areas = exact.protons[strong][order]
    if shifts.size == 0:
        return shifts, areas
    apart = np.abs(np.diff(shifts)) * frequency_mhz > _SAME_LINE_HZ
    group = np.concatenate(([0], np.cumsum(apart)))
    total = np.bincount(group, areas)
    centres = np.asarray(np.bincount(group, areas * shifts) / total, dtype=np.float64)
    return centres, np.asarray(total, dtype=np.float64)


def _drawn_j(coupling: EntryCoupling, *, use_found: bool) -> float:
    if use_found and coupling.j_hz is not None:
        return abs(coupling.j_hz)
    return abs(coupling.predicted_j_hz)


def _with_gaps(
    leaves: tuple[Leaf, ...], lines: Sequence[Line], frequency_mhz: float
) -> tuple[Leaf, ...]:
    if not lines:
        return leaves
    shifts = np.array([line.shift_ppm for line in lines])
    sds_hz = np.array([line.shift_sd_ppm for line in lines]) * frequency_mhz
    measured = []
    for leaf in leaves:
        nearest = int(np.abs(shifts - leaf.tip_ppm).argmin())
        gap_hz = float((leaf.tip_ppm - shifts[nearest]) * frequency_mhz)
        if abs(gap_hz) > _FOOT_REACH_HZ:
            measured.append(leaf)
            continue
        sd_hz = max(
            float(sds_hz[nearest]),
            _SMALLEST_LINE_SD_HZ,
            _WIDTH_SHARE * lines[nearest].width_hz,
        )
        measured.append(
            Leaf(
                base_ppm=leaf.base_ppm,
                tip_ppm=leaf.tip_ppm,
                weight=leaf.weight,
                gap_hz=gap_hz,
                is_off=abs(gap_hz) > _OFF_SD * sd_hz,
            )
        )
    return tuple(measured)
