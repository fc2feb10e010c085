"""Whether a first-order pattern can be read off the exact spectrum; Hz, protons."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.spins.network import ClaimLineSet

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Sticks:
    """Lines by frequency and intensity."""

    frequencies: Floats
    protons: Floats


def owned_lines(exact: ClaimLineSet, claim: int, *, bin_hz: float) -> Sticks:
    """What is seen of a claim: its share of the intensity of every line.

    Parameters
    ----------
    exact : ClaimLineSet
        Lines of all claims.
    claim : int
    bin_hz : float, Hz
        Width of the bins in which the lines were merged.

    Notes
    -----
    Exact intensities by claim, T_c T with T = sum T_c, add up to the spectrum
    but are negative in places: strong coupling moves intensity between the
    lines of A and those of B. Nobody sees that; a line belongs to the claim
    that flips in it. So every line of intensity T^2 is shared out as T_c^2,
    which leaves the roof as it is seen.
    """
    order = np.argsort(exact.frequencies_hz, kind="stable")
    frequencies = exact.frequencies_hz[order]
    group = _groups(frequencies, bin_hz)
    n_claims = int(exact.claim.max()) + 1
    by_claim = np.zeros((int(group[-1]) + 1, n_claims))
    np.add.at(by_claim, (group, exact.claim[order]), exact.protons[order])
    total = by_claim.sum(axis=1)
    squares = (by_claim**2).sum(axis=1)
    seen = np.maximum(total, 0.0) * by_claim[:, claim] ** 2
    mean = np.bincount(group, frequencies) / np.bincount(group)
    used = seen > 0.0
    return Sticks(mean[used], seen[used] / squares[used])


# The lines of a strongly coupled set stand in the list once for every claim, at
# nearly one frequency. Chains of neighbours are cut at this many bins.
_LONGEST_CHAIN_BINS = 10


def _groups(frequencies: Floats, bin_hz: float) -> Integers:
    """Number of the group of every line: neighbours within a bin."""
    starts = np.diff(frequencies, prepend=-np.inf) > bin_hz
    first = np.maximum.accumulate(np.where(starts, np.arange(starts.size), 0))
    into = (frequencies - frequencies[first]) / (_LONGEST_CHAIN_BINS * bin_hz)
    starts |= np.diff(np.floor(into), prepend=0.0) > 0.0
    return np.cumsum(starts) - 1


# A pattern can be read off if nine tenths of the intensity stand at leaves, and
# nine tenths of the leaves have a third or more of their intensity.
_ENOUGH = 0.9
_LEAST_LEAF = 0.33

# Lines nearer to a leaf than this share of their width read the same J.
_REACH_WIDTHS = 0.6
_LEAST_SEARCH_WIDTHS = 4.0


def is_read_off(
    tree: Sticks, seen: Sticks, *, width_hz: float, largest_shift_hz: float
) -> bool:
    """True if what is seen forms the tree's pattern, wherever its centre is.

    Parameters
    ----------
    tree : Sticks
        Leaves of the first-order tree.
    seen : Sticks
    width_hz : float, Hz
        Full width of a line.
    largest_shift_hz : float, Hz
        How far strong coupling may push the whole pattern; at least four widths
        are tried. Of an AB pair it pushes by less than half of J.

    Notes
    -----
    The AB part of an ABX system whose spacings still read J within the line
    width is a doublet of doublets; only its centre and its roof are displaced.
    """
    reach = _REACH_WIDTHS * width_hz
    limit = max(_LEAST_SEARCH_WIDTHS * width_hz, largest_shift_hz)
    shifts = np.arange(-limit, limit + 1e-9, 0.1 * width_hz)
    total = float(seen.protons.sum())
    best_share, best_shift = 0.0, 0.0
    for shift in shifts[np.argsort(np.abs(shifts), kind="stable")].tolist():
        near = _distance(seen.frequencies - shift, tree.frequencies) <= reach
        share = float(seen.protons[near].sum()) / total
        if share > best_share + 1e-9:
            best_share, best_shift = share, shift
    if best_share < _ENOUGH:
        return False
    gaps = seen.frequencies[:, None] - tree.frequencies[None, :]
    close = np.abs(gaps - best_shift) <= reach
    alike = np.abs(tree.frequencies[:, None] - tree.frequencies[None, :]) <= reach
    found = seen.protons @ close
    expected = alike @ tree.protons
    filled = tree.protons[found >= _LEAST_LEAF * expected].sum()
    return bool(filled >= _ENOUGH * tree.protons.sum())


def _distance(frequencies: Floats, leaves: Floats) -> Floats:
    """Distance of every frequency to the nearest of the ascending leaves."""
    place = np.searchsorted(leaves, frequencies)
    below = frequencies - leaves[np.maximum(place - 1, 0)]
    above = leaves[np.minimum(place, leaves.size - 1)] - frequencies
    return np.minimum(np.abs(below), np.abs(above))
