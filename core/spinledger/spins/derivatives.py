"""Closed-form derivatives of line frequencies and intensities, per Hz of a parameter.

First-order perturbation theory: frequencies by the Hellmann-Feynman theorem,
intensities by the first-order change of the states.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import numpy.typing as npt

from spinledger.spins.basis import BlockStack, IndexStructure, TransitionStack
from spinledger.spins.solution import EigenSystem, Kept, Moments

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]
Singles = npt.NDArray[np.float32]

# States closer than this are taken as degenerate and not mixed: any mixture of
# them has the same lines, and the exact split is far below any line width.
_DEGENERATE_HZ = 1e-6


def of_frequencies(
    index: IndexStructure, eigen: EigenSystem, kept: list[Kept]
) -> Singles:
    """Derivatives of the kept lines' frequencies, shape (n_lines, n_parameters)."""
    slopes = [
        _energy_slopes(index, stack, vectors)
        for stack, vectors in zip(index.blocks, eigen.vectors, strict=True)
    ]
    n_lines = sum(lines.flat.size for lines in kept)
    out = np.empty((n_lines, index.diagonal.shape[1]), dtype=np.float32)
    begin = 0
    for stack, lines in zip(index.transitions, kept, strict=True):
        part = out[begin : begin + lines.flat.size]
        link_of, upper, lower = lines.indices()
        _, n_upper, n_lower = lines.shape
        above = stack.upper_blocks[link_of] * n_upper + upper
        below = stack.lower_blocks[link_of] * n_lower + lower
        slopes[stack.upper].take(above, axis=0, out=part, mode="clip")
        part -= slopes[stack.lower].take(below, axis=0)
        begin += lines.flat.size
    return out


def _energy_slopes(
    index: IndexStructure, stack: BlockStack, vectors: Floats
) -> Singles:
    """dE/dp of every state, shape (n_blocks * size, n_parameters)."""
    diagonal = index.diagonal[stack.states]
    slopes: Floats = diagonal.transpose(0, 2, 1) @ (vectors * vectors)
    if stack.off_starts.size:
        n_pairs = diagonal.shape[-1] - index.n_particles
        flat = vectors.reshape(-1, stack.size)
        products = flat[stack.off_rows] * flat[stack.off_columns]
        products *= 2.0 * stack.off_coefficients[:, None]
        sums = np.add.reduceat(products, stack.off_starts, axis=0)
        block, pair = np.divmod(stack.off_targets, n_pairs)
        slopes[block, index.n_particles + pair] += sums
    by_state = slopes.transpose(0, 2, 1).astype(np.float32, order="C")
    return by_state.reshape(-1, diagonal.shape[-1])


def of_intensities(
    index: IndexStructure,
    eigen: EigenSystem,
    moments: list[Moments],
    kept: list[Kept],
) -> Singles:
    """Derivatives of the kept lines' intensities.

    Returns
    -------
    numpy.ndarray, shape (n_rows, n_lines, n_parameters), protons per Hz

    Notes
    -----
    With V = U' (dH/dp) U and X_ab = V_ab / (E_b - E_a), dU = U X, so
    dT = X_k' T + T X_(k+1) and d(T_row T) = dT_row T + T_row dT. Products are
    taken in single precision, which is right to about 1e-6 of the largest
    derivative and twice as fast.
    """
    mixings = _all_mixings(index, eigen)
    n_rows = kept[0].intensities.shape[0]
    n_lines = sum(lines.flat.size for lines in kept)
    out = np.empty((n_rows, n_lines, index.diagonal.shape[1]), dtype=np.float32)
    begin = 0
    for stack, moment, lines in zip(index.transitions, moments, kept, strict=True):
        part = out[:, begin : begin + lines.flat.size]
        _one_stack(stack, moment, lines, mixings=mixings, out=part)
        begin += lines.flat.size
    return out


def of_moments(
    index: IndexStructure,
    eigen: EigenSystem,
    moments: list[Moments],
    kept: list[Kept],
) -> tuple[Singles, Floats]:
    """Derivatives of the total moments, and what turns them into rows.

    Returns
    -------
    numpy.ndarray, shape (n_lines, n_parameters); numpy.ndarray, (n_rows, n_lines)
        d(T_row T) is given as 2 T_row dT: right in the sum over all rows.
    """
    mixings = _all_mixings(index, eigen)
    n_rows = kept[0].intensities.shape[0]
    n_lines = sum(lines.flat.size for lines in kept)
    out = np.empty((n_lines, index.diagonal.shape[1]), dtype=np.float32)
    factors = np.empty((n_rows, n_lines))
    begin = 0
    for stack, moment, lines in zip(index.transitions, moments, kept, strict=True):
        part = slice(begin, begin + lines.flat.size)
        for link, here, flat in _links(lines):
            changed = _moment_change(
                moment.total[link].astype(np.float32),
                mixings[stack.upper][stack.upper_blocks[link]],
                mixings[stack.lower][stack.lower_blocks[link]],
            )
            out[part][here] = _picked(changed, flat)
            for row in range(n_rows):
                own = moment.rows[link, row].ravel()[flat]
                factors[row, part][here] = 2.0 * stack.weights[link] * own
        begin += lines.flat.size
    return out, factors


def _all_mixings(index: IndexStructure, eigen: EigenSystem) -> list[Singles]:
    return [
        _mixings(stack, energies, vectors)
        for stack, energies, vectors in zip(
            index.blocks, eigen.energies, eigen.vectors, strict=True
        )
    ]


def _links(lines: Kept) -> Iterator[tuple[int, slice, Integers]]:
    """Every link with kept lines: where they stand, and their places in it."""
    n_links, upper, lower = lines.shape
    ends = np.searchsorted(lines.flat, upper * lower * np.arange(n_links + 1))
    for link in range(n_links):
        here = slice(int(ends[link]), int(ends[link + 1]))
        if here.start < here.stop:
            yield link, here, lines.flat[here] - link * upper * lower


def _one_stack(
    stack: TransitionStack,
    moment: Moments,
    lines: Kept,
    *,
    mixings: list[Singles],
    out: Singles,
) -> None:
    n_all = moment.rows.shape[1]
    for link, here, flat in _links(lines):
        above = mixings[stack.upper][stack.upper_blocks[link]]
        below = mixings[stack.lower][stack.lower_blocks[link]]
        rows = moment.rows[link].astype(np.float32)
        changes = [
            _picked(_moment_change(rows[row], above, below), flat)
            for row in range(n_all)
        ]
        total = _picked(moment.total[link].reshape(-1, 1), flat)
        total = (stack.weights[link] * total).astype(np.float32)
        if n_all == 1:
            np.multiply(changes[0], 2.0 * total, out=out[0, here])
            continue
        of_total = sum(changes[1:], start=changes[0])
        for row in range(out.shape[0]):
            own = stack.weights[link] * rows[row].reshape(-1, 1)[flat]
            np.multiply(changes[row], total, out=out[row, here])
            out[row, here] += of_total * own


def _picked(table: Singles, flat: Integers) -> Singles:
    """Rows of the kept lines; all of them need no copy."""
    return table if flat.size == table.shape[0] else table.take(flat, axis=0)


def _moment_change(moments: Singles, above: Singles, below: Singles) -> Singles:
    """X_k' T + T X_(k+1), shape (upper size * lower size, n_parameters).

    X is antisymmetric, so X' = -X.
    """
    size_above, n_parameters, _ = above.shape
    size_below = below.shape[0]
    other = moments @ below.reshape(size_below, -1)
    other -= (above.reshape(-1, size_above) @ moments).reshape(size_above, -1)
    table = other.reshape(size_above, n_parameters, size_below).transpose(0, 2, 1)
    return np.ascontiguousarray(table).reshape(-1, n_parameters)


def _mixings(stack: BlockStack, energies: Floats, vectors: Floats) -> Singles:
    """X of every parameter, shape (n_blocks, size, n_parameters, size)."""
    gaps = energies[:, None, :] - energies[:, :, None]
    close = np.abs(gaps) < _DEGENERATE_HZ
    inverse = np.where(close, 0.0, 1.0 / np.where(close, 1.0, gaps))
    states = vectors.astype(np.float32)
    changed = stack.change @ states.reshape(-1, stack.size)
    mixing = np.matmul(
        states.transpose(0, 2, 1), changed.reshape(stack.n_blocks, stack.size, -1)
    ).reshape(stack.n_blocks, stack.size, -1, stack.size)
    mixing *= inverse.astype(np.float32)[:, :, None, :]
    return np.asarray(mixing, dtype=np.float32)
