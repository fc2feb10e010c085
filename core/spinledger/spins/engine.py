"""Exact spectra of coupled spins one half: frequencies in Hz, intensities in protons."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt

from spinledger.spins import derivatives as closed_form
from spinledger.spins.basis import (
    IndexStructure,
    Topology,
    TransitionStack,
    index_structure,
)
from spinledger.spins.solution import EigenSystem, Kept, Moments
from spinledger.values.spin_system import SpinSystem, Transitions

Floats = npt.NDArray[np.float64]
Singles = npt.NDArray[np.float32]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class EngineLines:
    """Lines of one engine call.

    Attributes
    ----------
    frequencies_hz : numpy.ndarray, shape (n_lines,), Hz
    intensities : numpy.ndarray, shape (n_rows, n_lines), protons
    d_frequencies : numpy.ndarray or None, shape (n_lines, n_parameters)
        Derivative by every particle's frequency, then by every pair's J; these
        and the following in single precision.
    d_intensities : numpy.ndarray or None, shape (n_rows, n_lines, n_parameters)
        Protons per Hz.
    d_moments : numpy.ndarray or None, shape (n_lines, n_parameters)
        Derivative of the total transition moment, in place of the former.
    row_factors : numpy.ndarray or None, shape (n_rows, n_lines)
        Share of each row in it: times ``d_moments`` they are derivatives of
        intensities that add up over the rows exactly, while their split among
        the rows is that of the intensities.
    """

    frequencies_hz: Floats
    intensities: Floats
    d_frequencies: Singles | None = None
    d_intensities: Singles | None = None
    d_moments: Singles | None = None
    row_factors: Floats | None = None

    def row_changes(self, row: int, kept: Integers) -> Floats | None:
        """Derivatives of one row's intensities, (n_kept, n_parameters), or None."""
        if self.d_intensities is not None:
            return np.asarray(self.d_intensities[row, kept], dtype=np.float64)
        if self.d_moments is None or self.row_factors is None:
            return None
        return np.asarray(self.d_moments[kept] * self.row_factors[row, kept, None])


class SpinEngine:
    """Spectra of one topology at many parameter values.

    Parameters
    ----------
    topology : Topology
        Particles, who exchanges spin with whom, couplings, observed rows.

    Notes
    -----
    H = sum_i nu_i I_iz + sum_ij J_ij I_i . I_j (I_iz I_jz between species), in
    Hz, is real and conserves the total m of every species, so each block of the
    product basis is diagonalised alone, and lines join adjacent blocks only.
    Magnetically equivalent spins enter as one composite particle with total
    spins n/2, n/2 - 1, ... and their multiplicities. Intensities are
    T_row * T_total, so each row has its own lines and its sum is its number of
    spins.

    References
    ----------
    .. [1] P. L. Corio, Structure of High-Resolution NMR Spectra (1966).
    """

    def __init__(self, topology: Topology) -> None:
        self.topology = topology
        self._index: IndexStructure = index_structure(topology)

    @property
    def n_parameters(self) -> int:
        """Frequencies of all particles, then J of all pairs."""
        return len(self.topology.n_spins) + len(self.topology.pairs)

    @property
    def slope_cost(self) -> float:
        """Cost of the derivatives of intensities, about microseconds."""
        index = self._index
        products = 0.0
        for stack in index.transitions:
            above, below = (
                index.blocks[stack.upper].size,
                index.blocks[stack.lower].size,
            )
            products += stack.weights.size * (above + below) * above * below
        # Two operations for each product, 25e9 a second on one 2020s core.
        return 8e-5 * products * self.n_parameters

    def diagonalise(self, frequencies_hz: Floats, couplings_hz: Floats) -> EigenSystem:
        """Energies and states of all blocks.

        Parameters
        ----------
        frequencies_hz : numpy.ndarray, shape (n_particles,), Hz
        couplings_hz : numpy.ndarray, shape (n_pairs,), Hz
        """
        index = self._index
        flat = np.zeros(index.n_elements)
        flat[index.diagonal_positions] = index.diagonal @ np.concatenate(
            [frequencies_hz, couplings_hz]
        )
        flat[index.off_positions] = (
            index.off_coefficients * couplings_hz[index.off_pairs]
        )
        energies, vectors = [], []
        for stack in index.blocks:
            n_elements = stack.n_blocks * stack.size**2
            matrices = flat[stack.start : stack.start + n_elements].reshape(
                stack.n_blocks, stack.size, stack.size
            )
            values, states = _eigh(matrices)
            energies.append(values)
            vectors.append(states)
        return EigenSystem(tuple(energies), tuple(vectors))

    def lines(
        self,
        frequencies_hz: Floats,
        couplings_hz: Floats,
        *,
        smallest: float = 0.0,
        n_rows: int | None = None,
        derivatives: bool = False,
        intensity_derivatives: bool | Literal["shared"] = False,
    ) -> EngineLines:
        """All lines with an intensity above ``smallest`` in some row.

        Parameters
        ----------
        frequencies_hz : numpy.ndarray, shape (n_particles,), Hz
        couplings_hz : numpy.ndarray, shape (n_pairs,), Hz
        smallest : float, protons
            Lines at or under it in every row are left out.
        n_rows : int or None
            Only the first so many rows are handed on (all count in the total).
        derivatives, intensity_derivatives : bool
            Also give the derivatives of frequencies, and of intensities; for
            these "shared" gives only that of the total and its split, which is
            as many times faster as there are rows.
        """
        eigen = self.diagonalise(frequencies_hz, couplings_hz)
        stacks = self._index.transitions
        reported = self.topology.n_rows if n_rows is None else n_rows
        moments = [self._moments(stack, eigen) for stack in stacks]
        kept = [_select(moment, smallest, reported) for moment in moments]
        frequencies = [
            _frequencies(stack, eigen, kept_here)
            for stack, kept_here in zip(stacks, kept, strict=True)
        ]
        d_frequencies = d_intensities = None
        if derivatives or intensity_derivatives:
            d_frequencies = closed_form.of_frequencies(self._index, eigen, kept)
        d_moments = row_factors = None
        if intensity_derivatives == "shared":
            d_moments, row_factors = closed_form.of_moments(
                self._index, eigen, moments, kept
            )
        elif intensity_derivatives:
            d_intensities = closed_form.of_intensities(
                self._index, eigen, moments, kept
            )
        return EngineLines(
            frequencies_hz=np.concatenate(frequencies),
            intensities=np.concatenate([k.intensities for k in kept], axis=1),
            d_frequencies=d_frequencies,
            d_intensities=d_intensities,
            d_moments=d_moments,
            row_factors=row_factors,
        )

    def _moments(self, stack: TransitionStack, eigen: EigenSystem) -> Moments:
        """Matrix elements of every row's lowering operator between eigenstates."""
        upper = eigen.vectors[stack.upper][stack.upper_blocks]
        lower = eigen.vectors[stack.lower]
        flat = lower.reshape(-1, lower.shape[-1])
        if stack.ladders:
            rows = _row_by_row(stack, upper, flat)
        else:
            rows = _all_rows_at_once(stack, upper, flat, self._index.row_starts)
        total = rows[:, 0] if rows.shape[1] == 1 else rows.sum(axis=1)
        return Moments(rows, total, stack.weights)


def _eigh(matrices: Floats) -> tuple[Floats, Floats]:
    if matrices.shape[-1] == 1:
        return matrices[:, :, 0].copy(), np.ones_like(matrices)
    values, states = np.linalg.eigh(matrices, UPLO="L")
    return values, states


def _all_rows_at_once(
    stack: TransitionStack, upper: Floats, flat: Floats, row_starts: Integers
) -> Floats:
    gathered = stack.coefficients[..., None] * flat[stack.targets]
    if row_starts.size != gathered.shape[1]:
        gathered = np.add.reduceat(gathered, row_starts, axis=1)
    moments: Floats = np.matmul(upper.transpose(0, 2, 1)[:, None], gathered)
    return moments


def _row_by_row(stack: TransitionStack, upper: Floats, flat: Floats) -> Floats:
    n_links, size = upper.shape[:2]
    n_rows = len(stack.ladders[0])
    moments = np.zeros((n_links, n_rows, size, flat.shape[-1]))
    for link, ladders in enumerate(stack.ladders):
        for row, ladder in enumerate(ladders):
            if ladder.used.size:
                reached = ladder.operator @ flat
                from_states = upper[link]
                if ladder.used.size < size:
                    from_states = from_states[ladder.used]
                np.matmul(from_states.T, reached, out=moments[link, row])
    return moments


def _select(moments: Moments, smallest: float, n_rows: int) -> Kept:
    """Lines above the threshold in one of the first rows."""
    total, rows = moments.total, moments.rows[:, :n_rows]
    n_links, upper, lower = total.shape
    if moments.rows.shape[1] == 1:
        strength = total * total
    else:
        strength = np.abs(rows).max(axis=1) * np.abs(total)
    strength *= moments.weights[:, None, None]
    flat = np.flatnonzero(strength > smallest)
    picked = np.empty((n_rows, flat.size))
    weighted = (total * moments.weights[:, None, None]).ravel()[flat]
    for row in range(n_rows):
        np.multiply(rows[:, row].ravel()[flat], weighted, out=picked[row])
    return Kept(flat, (n_links, upper, lower), picked)


def _frequencies(stack: TransitionStack, eigen: EigenSystem, kept: Kept) -> Floats:
    from_energy = eigen.energies[stack.upper][stack.upper_blocks]
    to_energy = eigen.energies[stack.lower][stack.lower_blocks]
    gaps = from_energy[:, :, None] - to_energy[:, None, :]
    return np.asarray(gaps.ravel()[kept.flat])


def simulate(
    system: SpinSystem, *, observed_nucleus: str = "1H", smallest: float = 1e-12
) -> Transitions:
    """Exact lines of a spin system, each particle's share apart.

    Parameters
    ----------
    system : SpinSystem
    observed_nucleus : str
        Nucleus that is detected; others couple weakly to it.
    smallest : float, protons
        Lines at or under it are left out; 0 keeps all that are not exactly 0.

    Returns
    -------
    Transitions
        One row for every observed particle; row sums are its number of spins.

    Raises
    ------
    ValueError
        If no particle has the observed nucleus.

    Notes
    -----
    Parts of the system without couplings between them are solved apart, so the
    cost is that of the largest connected part.

    Examples
    --------
    >>> import numpy as np
    >>> ab = SpinSystem(
    ...     n_spins=np.array([1, 1]),
    ...     frequencies_hz=np.array([10.0, 0.0]),
    ...     couplings_hz=np.array([[0.0, 10.0], [10.0, 0.0]]),
    ...     nuclei=("1H", "1H"),
    ... )
    >>> np.sort(simulate(ab).frequencies_hz).round(3).tolist()
    [-7.071, 2.929, 7.071, 17.071]
    """
    observed = [
        k for k, nucleus in enumerate(system.nuclei) if nucleus == observed_nucleus
    ]
    if not observed:
        raise ValueError(f"system: no particle of {observed_nucleus!r} in it")
    row_of = {particle: row for row, particle in enumerate(observed)}
    frequencies, intensities = [], []
    for members in connected_parts(system.couplings_hz != 0.0):
        seen = [particle for particle in members if particle in row_of]
        if not seen:
            continue
        lines = _solve_part(system, members, seen, smallest=smallest)
        table = np.zeros((len(observed), lines.frequencies_hz.size))
        table[[row_of[particle] for particle in seen]] = lines.intensities
        frequencies.append(lines.frequencies_hz)
        intensities.append(table)
    return Transitions(
        frequencies_hz=np.concatenate(frequencies),
        intensities=np.concatenate(intensities, axis=1),
        observed=tuple(observed),
    )


def _solve_part(
    system: SpinSystem, members: list[int], seen: list[int], *, smallest: float
) -> EngineLines:
    nuclei = sorted({system.nuclei[k] for k in members})
    pairs = [
        (a, b)
        for a in range(len(members))
        for b in range(a + 1, len(members))
        if system.couplings_hz[members[a], members[b]] != 0.0
    ]
    topology = Topology(
        n_spins=tuple(int(system.n_spins[k]) for k in members),
        species=tuple(nuclei.index(system.nuclei[k]) for k in members),
        pairs=tuple(pairs),
        detected=tuple(seen.index(k) if k in seen else -1 for k in members),
    )
    couplings = np.array(
        [system.couplings_hz[members[a], members[b]] for a, b in pairs]
    )
    return SpinEngine(topology).lines(
        system.frequencies_hz[members], couplings, smallest=smallest
    )


def connected_parts(is_coupled: npt.NDArray[np.bool_]) -> list[list[int]]:
    """Groups of indices that are connected, each sorted, in order of first member."""
    n_particles = is_coupled.shape[0]
    left = set(range(n_particles))
    parts = []
    while left:
        start = min(left)
        reached, frontier = {start}, [start]
        while frontier:
            for other in np.flatnonzero(is_coupled[frontier.pop()]).tolist():
                if other not in reached:
                    reached.add(other)
                    frontier.append(other)
        left -= reached
        parts.append(sorted(reached))
    return parts
