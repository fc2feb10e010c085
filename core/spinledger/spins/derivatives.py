"""Closed-form derivatives of line frequencies and intensities, per Hz of a parameter.

First-order perturbation theory: frequencies by the Hellmann-Feynman theorem,
intensities by the first-order change of the states.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from spinledger.spins.basis import BlockStack, IndexStructure, TransitionStack
from spinledger.spins.solution import EigenSystem, Kept, Moments

Floats = npt.NDArray[np.float64]

# States closer than this are taken as degenerate and not mixed: any mixture of
# them has the same lines, and the exact split is far below any line width.
_DEGENERATE_HZ = 1e-7


def of_frequencies(
    index: IndexStructure, eigen: EigenSystem, kept: list[Kept]
) -> Floats:
    """Derivatives of the kept lines' frequencies, shape (n_parameters, n_lines)."""
    slopes = [
        _energy_slopes(index, stack, vectors)
        for stack, vectors in zip(index.blocks, eigen.vectors, strict=True)
    ]
    parts = []
    for stack, lines in zip(index.transitions, kept, strict=True):
        above = slopes[stack.upper][stack.upper_blocks]
        below = slopes[stack.lower][stack.lower_blocks]
        parts.append(
            above[lines.link, :, lines.upper].T - below[lines.link, :, lines.lower].T
        )
    return np.concatenate(parts, axis=1)


def _energy_slopes(index: IndexStructure, stack: BlockStack, vectors: Floats) -> Floats:
    """dE/dp of every state, shape (n_blocks, n_parameters, size)."""
    diagonal = index.diagonal[stack.states]
    slopes: Floats = diagonal.transpose(0, 2, 1) @ (vectors * vectors)
    if stack.off_starts.size:
        n_parameters = diagonal.shape[-1]
        n_pairs = n_parameters - index.n_particles
        flat = vectors.reshape(-1, stack.size)
        products = flat[stack.off_rows] * flat[stack.off_columns]
        products *= 2.0 * stack.off_coefficients[:, None]
        sums = np.add.reduceat(products, stack.off_starts, axis=0)
        block, pair = np.divmod(stack.off_targets, n_pairs)
        slopes[block, index.n_particles + pair] += sums
    return slopes


def of_intensities(
    index: IndexStructure,
    eigen: EigenSystem,
    moments: list[Moments],
    kept: list[Kept],
) -> Floats:
    """Derivatives of the kept lines' intensities.

    Returns
    -------
    numpy.ndarray, shape (n_parameters, n_rows, n_lines), protons per Hz

    Notes
    -----
    With V = U' (dH/dp) U and X_ab = V_ab / (E_b - E_a), dU = U X, so
    dT = X_k' T + T X_(k+1) and d(T_row T) = dT_row T + T_row dT.
    """
    mixings = [
        _mixings(index, stack, energies, vectors)
        for stack, energies, vectors in zip(
            index.blocks, eigen.energies, eigen.vectors, strict=True
        )
    ]
    parts = []
    for stack, moment, lines in zip(index.transitions, moments, kept, strict=True):
        parts.append(_one_stack(stack, moment, lines, mixings=mixings))
    return np.concatenate(parts, axis=2)


def _one_stack(
    stack: TransitionStack, moment: Moments, lines: Kept, *, mixings: list[Floats]
) -> Floats:
    n_parameters = mixings[stack.upper].shape[1]
    n_rows = moment.rows.shape[1]
    out = np.empty((n_parameters, n_rows, lines.link.size))
    for link in range(stack.weights.size):
        here = np.flatnonzero(lines.link == link)
        if here.size == 0:
            continue
        above = mixings[stack.upper][stack.upper_blocks[link]]
        below = mixings[stack.lower][stack.lower_blocks[link]]
        where = (lines.upper[here], lines.lower[here])
        total = moment.total[link][where]
        changes = np.empty((n_parameters, n_rows, here.size))
        for row in range(n_rows):
            changes[:, row] = _moment_change(moment.rows[link, row], above, below)[
                (slice(None), *where)
            ]
        of_total = changes.sum(axis=1)
        own = moment.rows[link][(slice(None), *where)]
        out[:, :, here] = stack.weights[link] * (
            changes * total + own * of_total[:, None]
        )
    return out


def _moment_change(moments: Floats, above: Floats, below: Floats) -> Floats:
    """X_k' T + T X_(k+1) for every parameter; X is antisymmetric, so X' = -X."""
    n_parameters, size_above, _ = above.shape
    size_below = below.shape[1]
    change = (above.reshape(-1, size_above) @ moments).reshape(
        n_parameters, size_above, size_below
    )
    other: Floats = np.matmul(moments, below)
    other -= change
    return other


def _mixings(
    index: IndexStructure, stack: BlockStack, energies: Floats, vectors: Floats
) -> Floats:
    """X of every parameter, shape (n_blocks, n_parameters, size, size)."""
    n_particles = index.n_particles
    gaps = energies[:, None, :] - energies[:, :, None]
    close = np.abs(gaps) < _DEGENERATE_HZ
    inverse = np.where(close, 0.0, 1.0 / np.where(close, 1.0, gaps))
    diagonal = index.diagonal[stack.states].transpose(0, 2, 1)
    changed = diagonal[..., None] * vectors[:, None]
    if stack.off_starts.size:
        n_pairs = diagonal.shape[1] - n_particles
        ends = np.append(stack.off_starts[1:], stack.off_rows.size)
        for begin, end, target in zip(
            stack.off_starts, ends, stack.off_targets, strict=True
        ):
            block, pair = divmod(int(target), n_pairs)
            rows = stack.off_rows[begin:end] - block * stack.size
            columns = stack.off_columns[begin:end] - block * stack.size
            scale = stack.off_coefficients[begin:end, None]
            out = changed[block, n_particles + pair]
            # A composite particle can step twice from one row, so add unbuffered.
            np.add.at(out, rows, scale * vectors[block, columns])
            np.add.at(out, columns, scale * vectors[block, rows])
    mixing: Floats = np.matmul(vectors.transpose(0, 2, 1)[:, None], changed)
    mixing *= inverse[:, None]
    return mixing
