"""Index structure of a spin system: product states, blocks, matrix positions.

Everything that depends on which particles couple, and not on the numbers. It is
built once for a topology; a repeat only fills, diagonalises and multiplies.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from itertools import product
from math import comb, prod

import numpy as np
import numpy.typing as npt
import scipy.sparse

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Topology:
    """What a spectrum's index structure depends on; hashable.

    Attributes
    ----------
    n_spins : tuple of int
        Magnetically equivalent spins in each particle.
    species : tuple of int
        Particles of one number exchange spin with each other (flip-flop terms);
        particles of different numbers couple weakly, through I_z I_z alone.
    pairs : tuple of (int, int)
        Coupled particle pairs, first index lower.
    detected : tuple of int
        Row of the intensities to which each particle is added, -1 if it is not
        observed.
    """

    n_spins: tuple[int, ...]
    species: tuple[int, ...]
    pairs: tuple[tuple[int, int], ...]
    detected: tuple[int, ...]

    @property
    def n_rows(self) -> int:
        """Number of intensity rows."""
        return max(self.detected, default=-1) + 1


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class BlockStack:
    """All blocks of one size, stored one after the other.

    Attributes
    ----------
    size : int
        States in each block.
    n_blocks : int
    states : numpy.ndarray of int, shape (n_blocks, size)
        Global state of each row, so that tables by state can be looked up.
    start : int
        Position of the stack in the flat Hamiltonian.
    off_rows, off_columns : numpy.ndarray of int, shape (n_off,)
        Off-diagonal elements as row numbers in the stack of eigenvectors seen
        as (n_blocks * size, size); ordered by block, then pair.
    off_coefficients : numpy.ndarray, shape (n_off,)
    off_starts, off_targets : numpy.ndarray of int
        Where each run of one (block, pair) begins, and block * n_pairs + pair.
    change : scipy.sparse.csr_array, shape (n_blocks * size * n_parameters, n_blocks * size)
        dH/dp of all parameters, rows ordered by block, row, parameter.
    """

    size: int
    n_blocks: int
    states: Integers
    start: int
    off_rows: Integers
    off_columns: Integers
    off_coefficients: Floats
    off_starts: Integers
    off_targets: Integers
    change: scipy.sparse.csr_array


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class TransitionStack:
    """Pairs of adjacent blocks that have the same two sizes.

    Attributes
    ----------
    upper, lower : int
        Which block stacks.
    upper_blocks, lower_blocks : numpy.ndarray of int, shape (n,)
        Which blocks of them.
    targets : numpy.ndarray of int, shape (n, n_detected, upper size)
        Row (in the flat stack of eigenvectors) that the lowering operator of a
        particle leads to.
    coefficients : numpy.ndarray, shape (n, n_detected, upper size)
        Its matrix element, 0 where there is none.
    weights : numpy.ndarray, shape (n,)
        Multiplicity over the normalisation: sums become protons.
    ladders : tuple of tuple of Ladder
        Lowering operator of every link and row; empty where blocks are small
        and it is faster to do all in one call.
    """

    upper: int
    lower: int
    upper_blocks: Integers
    lower_blocks: Integers
    targets: Integers
    coefficients: Floats
    weights: Floats
    ladders: tuple[tuple[Ladder, ...], ...]


@dataclass(frozen=True, slots=True, eq=False)
class Ladder:
    """A row's lowering operator between two blocks, its empty rows left out.

    Attributes
    ----------
    used : numpy.ndarray of int, shape (n_used,)
        Rows of the upper block that it leads from.
    operator : scipy.sparse.csr_array, shape (n_used, rows of the flat stack)
    """

    used: Integers
    operator: scipy.sparse.csr_array


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class IndexStructure:
    """Everything about a topology that does not depend on the numbers.

    Attributes
    ----------
    diagonal : numpy.ndarray, shape (n_states, n_particles + n_pairs)
        m_i of every state, then m_i m_j of every pair.
    diagonal_positions : numpy.ndarray of int, shape (n_states,)
        Places of the diagonal in the flat Hamiltonian.
    off_positions, off_pairs, off_coefficients : numpy.ndarray, shape (n_off,)
        Lower-triangle places, whose coupling, and the matrix element at 1 Hz.
    n_elements : int
        Length of the flat Hamiltonian.
    n_particles : int
    blocks : tuple of BlockStack
    transitions : tuple of TransitionStack
    row_starts : numpy.ndarray of int, shape (n_rows,)
        Where each row's particles begin in the sorted list of detected ones.
    """

    diagonal: Floats
    diagonal_positions: Integers
    off_positions: Integers
    off_pairs: Integers
    off_coefficients: Floats
    n_elements: int
    n_particles: int
    blocks: tuple[BlockStack, ...]
    transitions: tuple[TransitionStack, ...]
    row_starts: Integers


@dataclass(frozen=True, slots=True, eq=False)
class _States:
    """Product states of all combinations of total spins, one after the other."""

    twice_m: Integers  # (n_states, n_particles)
    twice_s: Integers  # (n_states, n_particles)
    strides: Integers  # (n_states, n_particles)
    combination: Integers  # (n_states,)
    multiplicity: Floats  # (n_combinations,)


@dataclass(frozen=True, slots=True, eq=False)
class _Layout:
    """Where every state stands: which stack, which block of it, which row."""

    stack: Integers
    block: Integers
    row: Integers
    sizes: tuple[int, ...]
    counts: tuple[int, ...]
    starts: tuple[int, ...]


# Blocks from this size on are multiplied row by row, smaller ones in one call
# (measured).
_LADDER_SIZE = 48


def spin_content(n_spins: int) -> tuple[tuple[int, int], ...]:
    """Total spins of n equivalent spins one half: (2 S, how often it occurs)."""
    return tuple(
        (n_spins - 2 * k, comb(n_spins, k) - (comb(n_spins, k - 1) if k else 0))
        for k in range(n_spins // 2 + 1)
    )


@lru_cache(maxsize=256)
def index_structure(topology: Topology) -> IndexStructure:
    """Index structure of a topology, kept for the next call with the same one."""
    states = _product_states(topology.n_spins)
    layout = _lay_out(states, topology)
    sizes = np.array(layout.sizes, dtype=np.int64)
    starts = np.array(layout.starts, dtype=np.int64)
    size = sizes[layout.stack]
    row_position = starts[layout.stack] + (layout.block * size + layout.row) * size
    off = _off_diagonal(states, topology)
    low = np.maximum(layout.row[off.first], layout.row[off.second])
    high = np.minimum(layout.row[off.first], layout.row[off.second])
    base = row_position[off.first] - layout.row[off.first] * size[off.first]
    m = states.twice_m / 2.0
    pairs = np.array(topology.pairs, dtype=np.int64).reshape(-1, 2)
    diagonal = np.hstack([m, m[:, pairs[:, 0]] * m[:, pairs[:, 1]]])
    return IndexStructure(
        diagonal=diagonal,
        diagonal_positions=row_position + layout.row,
        off_positions=base + low * size[off.first] + high,
        off_pairs=off.pair,
        off_coefficients=off.coefficient,
        n_elements=int(
            sum(c * n * n for c, n in zip(layout.counts, layout.sizes, strict=True))
        ),
        n_particles=len(topology.n_spins),
        blocks=_block_stacks(layout, off, diagonal, n_particles=len(topology.n_spins)),
        transitions=_transition_stacks(states, layout, topology),
        row_starts=_row_starts(topology),
    )


def _product_states(n_spins: tuple[int, ...]) -> _States:
    """Every product state; digit 0 of a particle is m = +S."""
    contents = [spin_content(n) for n in n_spins]
    twice_m, twice_s, strides, combination, multiplicity = [], [], [], [], []
    for index, chosen in enumerate(product(*contents)):
        spins = np.array([s for s, _ in chosen], dtype=np.int64)
        dims = spins + 1
        n_states = int(prod(dims.tolist()))
        steps = np.array(
            [prod(dims[k + 1 :].tolist()) for k in range(dims.size)], dtype=np.int64
        )
        digits = (np.arange(n_states)[:, None] // steps) % dims
        twice_m.append(spins - 2 * digits)
        twice_s.append(np.broadcast_to(spins, digits.shape))
        strides.append(np.broadcast_to(steps, digits.shape))
        combination.append(np.full(n_states, index, dtype=np.int64))
        multiplicity.append(float(prod(count for _, count in chosen)))
    return _States(
        np.vstack(twice_m),
        np.vstack(twice_s),
        np.vstack(strides),
        np.concatenate(combination),
        np.array(multiplicity),
    )


def _lay_out(states: _States, topology: Topology) -> _Layout:
    """Blocks of one combination and one total m per species, sorted by size."""
    labels = sorted(set(topology.species))
    members = np.array(
        [[s == label for s in topology.species] for label in labels], dtype=np.int64
    )
    keys = np.column_stack([states.combination, states.twice_m @ members.T])
    _, block_of_state, block_size = np.unique(
        keys, axis=0, return_inverse=True, return_counts=True
    )
    block_of_state = block_of_state.reshape(-1)
    order = np.argsort(block_of_state, kind="stable")
    first = np.concatenate([[0], np.cumsum(block_size)[:-1]])
    row = np.empty(order.size, dtype=np.int64)
    row[order] = np.arange(order.size) - np.repeat(first, block_size)
    sizes, stack_of_block, counts = np.unique(
        block_size, return_inverse=True, return_counts=True
    )
    number = np.empty(block_size.size, dtype=np.int64)
    for stack in range(sizes.size):
        inside = np.flatnonzero(stack_of_block == stack)
        number[inside] = np.arange(inside.size)
    starts = np.concatenate([[0], np.cumsum(counts * sizes**2)[:-1]])
    return _Layout(
        stack_of_block[block_of_state],
        number[block_of_state],
        row,
        tuple(sizes.tolist()),
        tuple(counts.tolist()),
        tuple(starts.tolist()),
    )


@dataclass(frozen=True, slots=True, eq=False)
class _OffDiagonal:
    first: Integers
    second: Integers
    pair: Integers
    coefficient: Floats


def _step(states: _States, particle: int, raise_it: bool) -> tuple[Integers, Floats]:
    """States that a ladder operator acts on, and its matrix elements."""
    m, s = states.twice_m[:, particle], states.twice_s[:, particle]
    where = np.flatnonzero(m < s if raise_it else m > -s)
    m_half, s_half = m[where] / 2.0, s[where] / 2.0
    change = 1.0 if raise_it else -1.0
    return where, np.sqrt(s_half * (s_half + 1) - m_half * (m_half + change))


def _off_diagonal(states: _States, topology: Topology) -> _OffDiagonal:
    """Elements of (I+_i I-_j + I-_i I+_j) / 2, each state pair once."""
    first, second, pair, coefficient = [], [], [], []
    n_states = states.combination.size
    for index, (i, j) in enumerate(topology.pairs):
        if topology.species[i] != topology.species[j]:
            continue
        up, up_element = _step(states, i, raise_it=True)
        down, down_element = _step(states, j, raise_it=False)
        elements = np.zeros(n_states)
        elements[down] = down_element
        both = elements[up] > 0
        origin = up[both]
        first.append(origin)
        second.append(origin - states.strides[origin, i] + states.strides[origin, j])
        pair.append(np.full(origin.size, index, dtype=np.int64))
        coefficient.append(0.5 * up_element[both] * elements[origin])
    if not first:
        none = np.zeros(0, dtype=np.int64)
        return _OffDiagonal(none, none, none, np.zeros(0))
    return _OffDiagonal(
        np.concatenate(first),
        np.concatenate(second),
        np.concatenate(pair),
        np.concatenate(coefficient),
    )


def _block_stacks(
    layout: _Layout, off: _OffDiagonal, diagonal: Floats, *, n_particles: int
) -> tuple[BlockStack, ...]:
    n_pairs = diagonal.shape[1] - n_particles
    stacks = []
    for index, (size, count) in enumerate(
        zip(layout.sizes, layout.counts, strict=True)
    ):
        here = np.flatnonzero(layout.stack == index)
        table = np.empty((count, size), dtype=np.int64)
        table[layout.block[here], layout.row[here]] = here
        mine = np.flatnonzero(layout.stack[off.first] == index)
        target = layout.block[off.first[mine]] * n_pairs + off.pair[mine]
        order = np.argsort(target, kind="stable")
        mine, target = mine[order], target[order]
        runs = np.flatnonzero(np.diff(target, prepend=-1))
        rows = layout.block * size + layout.row
        first, second = rows[off.first[mine]], rows[off.second[mine]]
        stacks.append(
            BlockStack(
                size=size,
                n_blocks=count,
                states=table,
                start=layout.starts[index],
                off_rows=first,
                off_columns=second,
                off_coefficients=off.coefficient[mine],
                off_starts=runs,
                off_targets=target[runs],
                change=_change(
                    diagonal[table.ravel()],
                    _OffDiagonal(
                        first,
                        second,
                        n_particles + off.pair[mine],
                        off.coefficient[mine],
                    ),
                ),
            )
        )
    return tuple(stacks)


def _change(diagonal: Floats, off: _OffDiagonal) -> scipy.sparse.csr_array:
    """dH/dp of all parameters as one sparse operator on a flat stack of vectors."""
    n_rows, n_parameters = diagonal.shape
    straight = np.arange(n_rows * n_parameters)
    places = np.concatenate(
        [
            straight,
            off.first * n_parameters + off.pair,
            off.second * n_parameters + off.pair,
        ]
    )
    columns = np.concatenate([straight // n_parameters, off.second, off.first])
    values = np.concatenate([diagonal.ravel(), off.coefficient, off.coefficient])
    values = values.astype(np.float32)
    shape = (n_rows * n_parameters, n_rows)
    return scipy.sparse.csr_array(
        scipy.sparse.coo_array((values, (places, columns)), shape=shape)
    )


def _detected_order(topology: Topology) -> list[int]:
    """Observed particles, sorted by the row that they are added to."""
    seen = [i for i, row in enumerate(topology.detected) if row >= 0]
    return sorted(seen, key=lambda i: topology.detected[i])


def _row_starts(topology: Topology) -> Integers:
    rows = [topology.detected[i] for i in _detected_order(topology)]
    return np.searchsorted(rows, np.arange(topology.n_rows)).astype(np.int64)


def _transition_stacks(
    states: _States, layout: _Layout, topology: Topology
) -> tuple[TransitionStack, ...]:
    """Adjacent blocks: those that one observed lowering operator connects."""
    particles = _detected_order(topology)
    norm = 2.0 ** (sum(topology.n_spins) - 1)
    n_states = states.combination.size
    target = np.full((len(particles), n_states), -1, dtype=np.int64)
    element = np.zeros((len(particles), n_states))
    for k, i in enumerate(particles):
        where, elements = _step(states, i, raise_it=False)
        target[k, where] = where + states.strides[where, i]
        element[k, where] = elements
    links = _links(layout, target)
    stacks = []
    for upper, lower in sorted({(a, b) for a, _, b, _ in links}):
        chosen = [link for link in links if (link[0], link[2]) == (upper, lower)]
        tables = [
            _one_link(layout, link, target=target, element=element) for link in chosen
        ]
        first = [rows[0] for _, _, rows in tables]
        stacks.append(
            TransitionStack(
                upper=upper,
                lower=lower,
                upper_blocks=np.array([link[1] for link in chosen], dtype=np.int64),
                lower_blocks=np.array([link[3] for link in chosen], dtype=np.int64),
                targets=np.stack([t for t, _, _ in tables]),
                coefficients=np.stack([c for _, c, _ in tables]),
                weights=states.multiplicity[states.combination[first]] / norm,
                ladders=_ladders(layout, topology, (upper, lower), tables=tables),
            )
        )
    return tuple(stacks)


def _ladders(
    layout: _Layout,
    topology: Topology,
    stacks: tuple[int, int],
    *,
    tables: list[tuple[Integers, Floats, Integers]],
) -> tuple[tuple[Ladder, ...], ...]:
    upper, lower = stacks
    size = layout.sizes[upper]
    if size < _LADDER_SIZE:
        return ()
    n_flat = layout.counts[lower] * layout.sizes[lower]
    starts = _row_starts(topology).tolist()
    ends = [*starts[1:], len(_detected_order(topology))]
    found = []
    for targets, coefficients, _ in tables:
        found.append(
            tuple(
                _ladder(targets[begin:end], coefficients[begin:end], n_flat)
                for begin, end in zip(starts, ends, strict=True)
            )
        )
    return tuple(found)


def _ladder(targets: Integers, coefficients: Floats, n_flat: int) -> Ladder:
    particle, row = np.nonzero(coefficients)
    used, place = np.unique(row, return_inverse=True)
    operator = scipy.sparse.coo_array(
        (coefficients[particle, row], (place, targets[particle, row])),
        shape=(used.size, n_flat),
    )
    return Ladder(used, scipy.sparse.csr_array(operator))


_Link = tuple[int, int, int, int]


def _links(layout: _Layout, target: Integers) -> list[_Link]:
    """Distinct (upper stack, block, lower stack, block), in a fixed order."""
    found: set[_Link] = set()
    for row in target:
        origin = np.flatnonzero(row >= 0)
        reached = row[origin]
        found.update(
            zip(
                layout.stack[origin].tolist(),
                layout.block[origin].tolist(),
                layout.stack[reached].tolist(),
                layout.block[reached].tolist(),
                strict=True,
            )
        )
    return sorted(found)


def _one_link(
    layout: _Layout, link: _Link, *, target: Integers, element: Floats
) -> tuple[Integers, Floats, Integers]:
    """Targets and elements of one block pair, and the states of its upper block."""
    stack, block, lower, lower_block = link
    here = np.flatnonzero((layout.stack == stack) & (layout.block == block))
    here = here[np.argsort(layout.row[here])]
    reached, coefficients = target[:, here], element[:, here]
    safe = np.where(reached >= 0, reached, 0)
    ours = (
        (reached >= 0)
        & (layout.stack[safe] == lower)
        & (layout.block[safe] == lower_block)
    )
    rows = layout.block[safe] * layout.sizes[lower] + layout.row[safe]
    # Without a target any row serves: its coefficient is zero.
    return np.where(ours, rows, 0), np.where(ours, coefficients, 0.0), here
