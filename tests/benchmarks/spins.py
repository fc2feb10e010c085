"""Speed and accuracy of the spin engine; prints one JSON object.

Run: ``python tests/benchmarks/spins.py``. Ratios are taken within one process on
one core, and a repeat with other parameters counts, not the first call.
"""

from __future__ import annotations

import importlib
import json
import os
import time
import warnings
from collections.abc import Callable
from typing import Any

for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(name, "1")

import numpy as np  # noqa: E402 - after the number of threads is set
import numpy.typing as npt  # noqa: E402

from spinledger.spins.basis import Topology  # noqa: E402
from spinledger.spins.clusters import FULL_EFFORT, Effort  # noqa: E402
from spinledger.spins.engine import SpinEngine  # noqa: E402
from spinledger.spins.network import ClaimLineSet, ClaimNetwork  # noqa: E402
from spinledger.values.claim import (  # noqa: E402
    Claim,
    ClaimSet,
    CouplingClaim,
    Particle,
)

Floats = npt.NDArray[np.float64]

# The intensity below which a line is not handed on, in protons, and the same
# for all that is compared here.
SMALLEST = 1e-9


def best_of(run: Callable[[], object], repeats: int) -> float:
    """Shortest processor time of some runs, s."""
    run()
    times = []
    for _ in range(repeats):
        began = time.process_time()
        run()
        times.append(time.process_time() - began)
    return min(times)


def strong_engine(n_spins: int, seed: int) -> tuple[SpinEngine, Floats, Floats]:
    """Every proton coupled to every other, shifts within 200 Hz; all summed."""
    rng = np.random.default_rng(seed)
    pairs = tuple((a, b) for a in range(n_spins) for b in range(a + 1, n_spins))
    topology = Topology(
        n_spins=(1,) * n_spins,
        species=(0,) * n_spins,
        pairs=pairs,
        detected=(0,) * n_spins,
    )
    frequencies = rng.uniform(0.0, 200.0, n_spins)
    return SpinEngine(topology), frequencies, rng.uniform(-12.0, 15.0, len(pairs))


def qutip_run(frequencies: Floats, couplings: Floats) -> Callable[[], object]:
    """Hamiltonian by QuTiP's operators, all states, all transition intensities.

    Operators are made once, like our index structure.
    """
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        qutip = importlib.import_module("qutip")
    size = frequencies.size
    one = qutip.qeye(2)

    def on(operator: Any, place: int) -> Any:
        return qutip.tensor([operator if k == place else one for k in range(size)])

    x, y, z = (
        [on(0.5 * m, k) for k in range(size)]
        for m in (qutip.sigmax(), qutip.sigmay(), qutip.sigmaz())
    )
    pairs = [(a, b) for a in range(size) for b in range(a + 1, size)]
    products = [x[a] * x[b] + y[a] * y[b] + z[a] * z[b] for a, b in pairs]
    lowering = sum(x[k] - 1j * y[k] for k in range(size)).to("csr")

    def run() -> object:
        hamiltonian = sum(f * m for f, m in zip(frequencies, z, strict=True))
        hamiltonian += sum(j * m for j, m in zip(couplings, products, strict=True))
        energies, states = hamiltonian.eigenstates()
        vectors = np.hstack([state.full() for state in states])
        moments = vectors.conj().T @ (lowering.data_as("csr_matrix") @ vectors)
        intensities = np.abs(moments) ** 2
        gaps = energies[None, :] - energies[:, None]
        kept = intensities > SMALLEST * 2.0 ** (size - 1)
        return gaps[kept], intensities[kept]

    return run


def floor_run(
    engine: SpinEngine, frequencies: Floats, couplings: Floats
) -> Callable[[], object]:
    """Only numpy's eigh of the same blocks and two products for each transition."""
    index = engine._index
    flat = np.zeros(index.n_elements)
    flat[index.diagonal_positions] = index.diagonal @ np.concatenate(
        [frequencies, couplings]
    )
    flat[index.off_positions] = index.off_coefficients * couplings[index.off_pairs]
    blocks = []
    for stack in index.blocks:
        for block in range(stack.n_blocks):
            at = stack.start + block * stack.size**2
            blocks.append(flat[at : at + stack.size**2].reshape(stack.size, stack.size))
    rng = np.random.default_rng(0)
    products = []
    for stack in index.transitions:
        upper, lower = index.blocks[stack.upper].size, index.blocks[stack.lower].size
        for _ in range(stack.weights.size):
            products.append(
                (
                    rng.normal(size=(upper, upper)),
                    rng.normal(size=(upper, lower)),
                    rng.normal(size=(lower, lower)),
                )
            )

    def run() -> object:
        for block in blocks:
            np.linalg.eigh(block)
        for left, middle, right in products:
            left.T @ middle @ right
        return None

    return run


def chain(n_spins: int) -> ClaimSet:
    """A chain of CH2 and CH: 0.02 to 0.3 ppm apart, geminal and vicinal J."""
    rng = np.random.default_rng(3)
    shifts = 1.0 + np.cumsum(rng.uniform(0.02, 0.3, n_spins)) % 3.0
    claims = tuple(
        Claim(
            label=f"{k}-H",
            atoms=(k,),
            n_protons=1,
            shift_ppm=float(shifts[k]),
            shift_sd_ppm=0.2,
        )
        for k in range(n_spins)
    )
    particles = tuple(
        Particle(claim=k, nucleus="1H", n_spins=1, hydrogens=(k,))
        for k in range(n_spins)
    )
    couplings = []
    for k in range(n_spins - 1):
        couplings.append(((k, k + 1), -13.0 if k % 2 else 7.0))
    for k in range(n_spins - 2):
        couplings.append(((k, k + 2), 6.0 if k % 2 else 4.0))
    return ClaimSet(
        claims=claims,
        particles=particles,
        couplings=tuple(
            CouplingClaim(
                pairs=(pair,), j_hz=j, j_sd_hz=2.0, kind="x", bonds=3, is_rigid=False
            )
            for pair, j in couplings
        ),
    )


def parameters(claims: ClaimSet, frequency_mhz: float) -> tuple[Floats, Floats]:
    shifts = np.array([c.shift_ppm for c in claims.claims]) * frequency_mhz
    return shifts, np.array([c.j_hz for c in claims.couplings])


def drawn(lines: ClaimLineSet, grid: Floats) -> Floats:
    """Spectrum at 1 Hz full width."""
    total = np.zeros(grid.size)
    for frequency, protons in zip(lines.frequencies_hz, lines.protons, strict=True):
        near = slice(*np.searchsorted(grid, [frequency - 40.0, frequency + 40.0]))
        total[near] += protons * 0.25 / ((grid[near] - frequency) ** 2 + 0.25)
    return total


def cluster_figures(n_spins: int) -> dict[str, float]:
    claims = chain(n_spins)
    shifts, couplings = parameters(claims, 500.0)
    network = ClaimNetwork(claims)
    plan = network.plan(shifts, couplings)
    finer = network.plan(
        shifts,
        couplings,
        effort=Effort(
            cluster_cost=6 * FULL_EFFORT.cluster_cost,
            tolerance_hz=FULL_EFFORT.tolerance_hz / 4,
            flip_tolerance_hz=FULL_EFFORT.flip_tolerance_hz / 4,
            smallest=FULL_EFFORT.smallest / 10,
        ),
    )
    lines = network.lines(shifts, couplings, plan=plan)
    better = network.lines(shifts, couplings, plan=finer)
    grid = np.arange(shifts.min() - 50.0, shifts.max() + 50.0, 0.05)
    expected = drawn(better, grid)
    error = np.abs(drawn(lines, grid) - expected).max() / expected.max()
    seconds = best_of(lambda: network.lines(shifts, couplings, plan=plan), 5)
    return {"ms": 1e3 * seconds, "error": float(error), "bound": lines.error_bound}


def main() -> None:
    """Measure and print."""
    figures: dict[str, Any] = {}
    for n_spins, repeats in ((8, 3), (10, 1)):
        engine, frequencies, couplings = strong_engine(n_spins, n_spins)
        ours = best_of(
            lambda e=engine, f=frequencies, j=couplings: e.lines(
                f, j, smallest=SMALLEST
            ),
            5,
        )
        theirs = best_of(qutip_run(frequencies, couplings), repeats)
        figures[f"qutip_ratio_{n_spins}"] = theirs / ours
    for n_spins, repeats in ((6, 200), (10, 5), (12, 2)):
        engine, frequencies, couplings = strong_engine(n_spins, n_spins)
        ours = best_of(
            lambda e=engine, f=frequencies, j=couplings: e.lines(
                f, j, smallest=SMALLEST
            ),
            repeats,
        )
        figures[f"floor_ratio_{n_spins}"] = ours / best_of(
            floor_run(engine, frequencies, couplings), repeats
        )
    for n_spins in (10, 20, 40, 60, 80, 100):
        found = cluster_figures(n_spins)
        if n_spins == 40:
            figures["cluster40_ms"] = found["ms"]
            figures["cluster40_error"] = found["error"]
            figures["cluster40_bound"] = found["bound"]
        figures.setdefault("chain_ms", {})[n_spins] = round(found["ms"], 1)
    engine, frequencies, couplings = strong_engine(8, 8)
    once = best_of(lambda: engine.lines(frequencies, couplings, smallest=SMALLEST), 10)
    for key, kind in (
        ("jacobian_ratio_8", "intensity_derivatives"),
        ("frequency_jacobian_ratio_8", "derivatives"),
    ):
        figures[key] = (
            best_of(
                lambda k=kind: engine.lines(
                    frequencies, couplings, smallest=SMALLEST, **{k: True}
                ),
                5,
            )
            / once
        )
    print(json.dumps(figures))


if __name__ == "__main__":
    main()
