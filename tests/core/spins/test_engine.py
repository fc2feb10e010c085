"""Exact spectra against QuTiP, published tables, closed forms and sum rules."""

from __future__ import annotations

import csv
import importlib
import tomllib
import warnings
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest

from core.spins.spin_cases import decaying_signal, random_system
from shared_data import shared
from spinledger.spins.basis import Topology, spin_content
from spinledger.spins.engine import SpinEngine, simulate
from spinledger.values.spin_system import SpinSystem

Floats = npt.NDArray[np.float64]


def dense_operators(n_spins: int) -> tuple[list[Any], list[Any], list[Any]]:
    with warnings.catch_warnings():
        # QuTiP says that it has no matplotlib; nothing is drawn here.
        warnings.simplefilter("ignore")
        qutip = importlib.import_module("qutip")
    one = qutip.qeye(2)

    def on(operator: Any, place: int) -> Any:
        return qutip.tensor([operator if k == place else one for k in range(n_spins)])

    matrices = (qutip.sigmax(), qutip.sigmay(), qutip.sigmaz())
    found = [[on(0.5 * m, k) for k in range(n_spins)] for m in matrices]
    return found[0], found[1], found[2]


def qutip_solution(
    system: SpinSystem, *, is_weak: npt.NDArray[np.bool_] | None = None
) -> tuple[Floats, Floats, Floats]:
    """Energies, and frequencies and per-spin intensities of all transitions.

    One spin for every proton, so that composite particles are tested too.
    """
    owner = np.repeat(np.arange(system.n_spins.size), system.n_spins)
    size = owner.size
    x, y, z = dense_operators(size)
    hamiltonian = sum(system.frequencies_hz[owner[k]] * z[k] for k in range(size))
    for a in range(size):
        for b in range(a + 1, size):
            j = system.couplings_hz[owner[a], owner[b]]
            hamiltonian += j * z[a] * z[b]
            if is_weak is None or not is_weak[owner[a], owner[b]]:
                hamiltonian += j * (x[a] * x[b] + y[a] * y[b])
    energies, states = hamiltonian.eigenstates()
    vectors = np.hstack([state.full() for state in states])
    lowering = [(x[k] - 1j * y[k]).full() for k in range(size)]
    moments = np.array([vectors.conj().T @ low @ vectors for low in lowering])
    by_particle = np.array(
        [moments[owner == k].sum(axis=0) for k in range(system.n_spins.size)]
    )
    observed = np.array([n == "1H" for n in system.nuclei])
    total = by_particle[observed].sum(axis=0)
    # <lower| L |upper>: the line stands at E(upper) - E(lower).
    intensities = np.real(by_particle * total.conj()) / 2.0 ** (size - 1)
    gaps = energies[None, :] - energies[:, None]
    return energies, gaps.ravel(), intensities.reshape(len(by_particle), -1)


@pytest.mark.parametrize(
    "n_spins", [[1, 1], [1, 1, 1], [1, 1, 1, 1], [1] * 5, [1] * 6, [3, 1], [2, 1, 3]]
)
def test_engine_agrees_with_qutip(n_spins: list[int]) -> None:
    system = random_system(n_spins, np.random.default_rng(sum(n_spins)))
    energies, frequencies, intensities = qutip_solution(system)
    lines = simulate(system)
    # Rounding of both eigensolvers, some 1e-13 of energies of 300 Hz, grows by
    # 2 pi f t in the signal; 1e-9 of the number of protons is the demand.
    np.testing.assert_allclose(
        decaying_signal(lines.frequencies_hz, lines.intensities),
        decaying_signal(frequencies, intensities),
        atol=1e-9 * system.n_spins.sum(),
    )
    if set(n_spins) == {1}:
        pairs = tuple(
            (a, b) for a in range(len(n_spins)) for b in range(a + 1, len(n_spins))
        )
        engine = SpinEngine(
            Topology(
                n_spins=tuple(n_spins),
                species=(0,) * len(n_spins),
                pairs=pairs,
                detected=tuple(range(len(n_spins))),
            )
        )
        values = np.array([system.couplings_hz[pair] for pair in pairs])
        found = engine.diagonalise(system.frequencies_hz, values).energies
        np.testing.assert_allclose(
            np.sort(np.concatenate([e.ravel() for e in found])),
            np.sort(energies),
            atol=1e-9 * np.abs(energies).max(),
        )


def test_hetero_nucleus_couples_weakly() -> None:
    rng = np.random.default_rng(11)
    protons = random_system([1, 1, 1, 1], rng)
    system = SpinSystem(
        n_spins=protons.n_spins,
        frequencies_hz=protons.frequencies_hz,
        couplings_hz=protons.couplings_hz,
        nuclei=("1H", "1H", "19F", "19F"),
    )
    is_fluorine = np.array([False, False, True, True])
    weak = is_fluorine[:, None] != is_fluorine[None, :]
    _, frequencies, intensities = qutip_solution(system, is_weak=weak)
    lines = simulate(system)
    assert lines.observed == (0, 1)
    np.testing.assert_allclose(
        decaying_signal(lines.frequencies_hz, lines.intensities),
        decaying_signal(frequencies, intensities)[:2],
        atol=1e-9 * 4,
    )


def textbook_systems() -> dict[str, dict[str, Any]]:
    text = shared("reference", "strong_coupling_systems.toml").read_bytes()
    return {system["id"]: system for system in tomllib.loads(text.decode())["system"]}


def test_engine_gives_the_published_line_lists() -> None:
    systems = textbook_systems()
    listed: dict[tuple[str, float], list[tuple[float, float]]] = {}
    with shared("reference", "strong_coupling_lines.csv").open(newline="") as file:
        for row in csv.DictReader(file):
            key = (row["system"], float(row["field_MHz"]))
            listed.setdefault(key, []).append(
                (float(row["freq_Hz"]), float(row["intensity"]))
            )
    assert len({name for name, _ in listed}) == 26
    for (name, field_mhz), rows in listed.items():
        lines = simulate(textbook_system(systems[name], field_mhz))
        ours = np.column_stack([lines.frequencies_hz, lines.intensities.sum(axis=0)])
        theirs = np.array(rows)
        grid = np.unique(theirs[:, 0])
        # The tables round to 0.001 Hz, merge coinciding lines and leave out the
        # weakest (up to 0.006 protons together): 0.5 % of the tallest at 0.3 Hz.
        expected = lorentz_sum(theirs, grid)
        np.testing.assert_allclose(
            lorentz_sum(ours, grid), expected, atol=0.005 * expected.max(), err_msg=name
        )


def lorentz_sum(lines: Floats, at_hz: Floats) -> Floats:
    """Lines of 0.3 Hz full width at some frequencies."""
    gaps = at_hz[:, None] - lines[None, :, 0]
    return np.asarray((lines[:, 1] * 0.0225 / (gaps**2 + 0.0225)).sum(axis=1))


def textbook_system(entry: dict[str, Any], field_mhz: float) -> SpinSystem:
    labels = entry["labels"]
    couplings = np.zeros((len(labels), len(labels)))
    for first, second, value in entry["J"]:
        a, b = labels.index(first), labels.index(second)
        couplings[a, b] = couplings[b, a] = value
    kinds = {"F": "19F", "C13": "13C"}
    nuclei = tuple(
        next((n for start, n in kinds.items() if label.startswith(start)), "1H")
        for label in labels
    )
    return SpinSystem(
        n_spins=np.ones(len(labels), dtype=np.int64),
        frequencies_hz=np.array(entry["shift_ppm"]) * field_mhz,
        couplings_hz=couplings,
        nuclei=nuclei,
    )


@pytest.mark.parametrize("ratio", [0.05, 0.2, 0.5, 1.0, 2.0, 5.0, 20.0])
def test_ab_quartet_has_its_closed_form(ratio: float) -> None:
    """Lines at centre +- (D -+ J)/2, D = sqrt(dnu^2 + J^2), (1 +- J/D)/2 each.

    J. A. Pople, W. G. Schneider, H. J. Bernstein, High-resolution NMR (1959).
    """
    j_hz = 10.0
    gap = j_hz / ratio
    distance = np.hypot(gap, j_hz)
    system = SpinSystem(
        n_spins=np.array([1, 1]),
        frequencies_hz=np.array([gap / 2, -gap / 2]),
        couplings_hz=np.array([[0.0, j_hz], [j_hz, 0.0]]),
        nuclei=("1H", "1H"),
    )
    lines = simulate(system)
    order = np.argsort(lines.frequencies_hz)
    half = np.array([-1, -1, 1, 1]) * distance / 2 + np.array([-1, 1, -1, 1]) * j_hz / 2
    shares = 0.5 * (1 + np.array([-1, 1, 1, -1]) * j_hz / distance)
    # Two by two blocks: rounding only.
    np.testing.assert_allclose(lines.frequencies_hz[order], half, atol=1e-10)
    np.testing.assert_allclose(lines.intensities.sum(axis=0)[order], shares, atol=1e-12)


def abx(observed: str) -> tuple[Floats, Floats]:
    j_ab, j_ax, j_bx = 12.0, 9.0, -2.5
    system = SpinSystem(
        n_spins=np.ones(3, dtype=np.int64),
        frequencies_hz=np.array([8.0, -8.0, 100.0]),
        couplings_hz=np.array([[0, j_ab, j_ax], [j_ab, 0, j_bx], [j_ax, j_bx, 0.0]]),
        nuclei=("1H", "1H", "31P"),
    )
    lines = simulate(system, observed_nucleus=observed, smallest=1e-9)
    order = np.argsort(lines.frequencies_hz)
    return lines.frequencies_hz[order], lines.intensities.sum(axis=0)[order]


def test_abx_is_two_quartets_and_six_x_lines() -> None:
    """X part: +-N/2, +-(D+ - D-), +-(D+ + D-); N = J_AX + J_BX.

    J. A. Pople, W. G. Schneider, H. J. Bernstein, High-resolution NMR (1959),
    ABX case, D+- = sqrt((dnu +- (J_AX - J_BX)/2)^2 + J_AB^2) / 2.
    """
    j_ab, j_ax, j_bx, gap = 12.0, 9.0, -2.5, 16.0
    quartets, shares = [], []
    for sign in (1, -1):
        local = gap + sign * (j_ax - j_bx) / 2
        distance = np.hypot(local, j_ab)
        centre = sign * (j_ax + j_bx) / 4
        for side in (-1, 1):
            for inner in (-1, 1):
                quartets.append(centre + (side * distance + inner * j_ab) / 2)
                shares.append(0.25 * (1 - side * inner * j_ab / distance))
    order = np.argsort(quartets)
    frequencies, intensities = abx("1H")
    np.testing.assert_allclose(frequencies, np.array(quartets)[order], atol=1e-9)
    np.testing.assert_allclose(intensities, np.array(shares)[order], atol=1e-9)
    upper = np.hypot(gap + (j_ax - j_bx) / 2, j_ab) / 2
    lower = np.hypot(gap - (j_ax - j_bx) / 2, j_ab) / 2
    angle = 0.5 * (
        np.arctan2(j_ab, gap + (j_ax - j_bx) / 2)
        - np.arctan2(j_ab, gap - (j_ax - j_bx) / 2)
    )
    offsets = [(j_ax + j_bx) / 2, upper - lower, upper + lower]
    expected = [0.25, 0.25 * np.cos(angle) ** 2, 0.25 * np.sin(angle) ** 2]
    frequencies, intensities = abx("31P")
    both = sorted(
        (s * o + 100.0, w)
        for o, w in zip(offsets, expected, strict=True)
        for s in (-1, 1)
    )
    np.testing.assert_allclose(frequencies, [f for f, _ in both], atol=1e-9)
    np.testing.assert_allclose(intensities, [w for _, w in both], atol=1e-9)


def test_aaxx_half_spectrum_has_its_closed_form() -> None:
    """+-N/2 (1/2 each), (+-K +- sqrt(K^2 + L^2))/2, (+-M +- sqrt(M^2 + L^2))/2.

    H. Gunther, Angew. Chem. Int. Ed. 11 (1972) 861-874,
    doi:10.1002/anie.197208611 (from memory): K, M = J_AA +- J_XX, N, L = J +- J'.
    """
    j_aa, j_xx, j, j_prime = 2.6, 8.1, 9.3, -1.2
    couplings = np.array(
        [
            [0, j_aa, j, j_prime],
            [j_aa, 0, j_prime, j],
            [j, j_prime, 0, j_xx],
            [j_prime, j, j_xx, 0],
        ]
    )
    system = SpinSystem(
        n_spins=np.ones(4, dtype=np.int64),
        frequencies_hz=np.zeros(4),
        couplings_hz=couplings,
        nuclei=("1H", "1H", "19F", "19F"),
    )
    lines = simulate(system, smallest=1e-9)
    n, l_ = j + j_prime, j - j_prime
    expected: list[tuple[float, float]] = [(n / 2, 0.5), (-n / 2, 0.5)]
    for k in (j_aa + j_xx, j_aa - j_xx):
        root = np.hypot(k, l_)
        for sign in (1, -1):
            expected.append((sign * (k + root) / 2, 0.125 * (1 - k / root)))
            expected.append((sign * (k - root) / 2, 0.125 * (1 + k / root)))
    total = lines.intensities.sum(axis=0)
    assert total.sum() == pytest.approx(2.0, abs=1e-9)
    for frequency, intensity in expected:
        near = np.abs(lines.frequencies_hz - frequency) < 1e-6
        assert total[near].sum() == pytest.approx(intensity, abs=1e-9)


def test_sums_of_intensity_and_first_moment() -> None:
    system = random_system([1, 3, 2, 1, 1], np.random.default_rng(5))
    lines = simulate(system)
    total = lines.intensities.sum(axis=0)
    # Traces of the operators, exact but for rounding over 10^4 lines.
    np.testing.assert_allclose(lines.intensities.sum(axis=1), system.n_spins, rtol=1e-9)
    assert total @ lines.frequencies_hz == pytest.approx(
        float(system.n_spins @ system.frequencies_hz), rel=1e-9
    )


def test_order_of_the_particles_changes_nothing() -> None:
    rng = np.random.default_rng(8)
    system = random_system([1, 1, 3, 1, 2], rng)
    order = rng.permutation(5)
    turned = SpinSystem(
        n_spins=system.n_spins[order],
        frequencies_hz=system.frequencies_hz[order],
        couplings_hz=system.couplings_hz[np.ix_(order, order)],
        nuclei=system.nuclei,
    )
    before, after = simulate(system), simulate(turned)
    np.testing.assert_allclose(
        decaying_signal(before.frequencies_hz, before.intensities)[order],
        decaying_signal(after.frequencies_hz, after.intensities),
        atol=1e-9,
    )


def test_separate_parts_are_solved_apart_and_add_up() -> None:
    system = random_system([1, 1, 1, 1], np.random.default_rng(2))
    couplings = system.couplings_hz.copy()
    couplings[:2, 2:] = couplings[2:, :2] = 0.0
    parted = SpinSystem(
        n_spins=system.n_spins,
        frequencies_hz=system.frequencies_hz,
        couplings_hz=couplings,
        nuclei=system.nuclei,
    )
    lines = simulate(parted)
    # Two AB quartets; the combination lines of four spins are not there.
    assert lines.frequencies_hz.size == 8
    np.testing.assert_allclose(lines.intensities.sum(axis=1), 1.0, atol=1e-12)


@pytest.mark.parametrize("n_spins", [1, 2, 3, 6, 9])
def test_spin_content_counts_all_states(n_spins: int) -> None:
    assert sum((s + 1) * n for s, n in spin_content(n_spins)) == 2**n_spins


def test_simulate_names_a_missing_nucleus() -> None:
    system = random_system([1, 1], np.random.default_rng(1))
    with pytest.raises(ValueError, match="no particle of '19F'"):
        simulate(system, observed_nucleus="19F")


@pytest.mark.parametrize("n_spins", [(1, 1, 1, 1), (3, 1, 2), (1, 2, 1, 1)])
def test_derivatives_agree_with_differences(n_spins: tuple[int, ...]) -> None:
    rng = np.random.default_rng(3)
    size = len(n_spins)
    pairs = tuple((a, b) for a in range(size) for b in range(a + 1, size))
    species = (0,) * (size - 1) + (1,)
    engine = SpinEngine(
        Topology(
            n_spins=n_spins,
            species=species,
            pairs=pairs,
            detected=(0, 0, *range(1, size - 1)),
        )
    )
    frequencies, couplings = rng.uniform(0, 80, size), rng.uniform(-12, 12, len(pairs))
    point = np.concatenate([frequencies, couplings])

    def at(values: Floats) -> tuple[Floats, Floats]:
        lines = engine.lines(values[:size], values[size:], smallest=-1.0)
        return lines.frequencies_hz, lines.intensities

    exact = engine.lines(
        frequencies, couplings, smallest=-1.0, intensity_derivatives=True
    )
    assert exact.d_frequencies is not None
    assert exact.d_intensities is not None
    for k in range(point.size):
        step = np.zeros(point.size)
        step[k] = 1e-4
        above, below = at(point + step), at(point - step)
        # Central differences of 1e-4 Hz: h^2 f''' is some 1e-8, rounding 1e-9.
        np.testing.assert_allclose(
            exact.d_frequencies[:, k], (above[0] - below[0]) / 2e-4, atol=2e-6
        )
        np.testing.assert_allclose(
            exact.d_intensities[:, :, k], (above[1] - below[1]) / 2e-4, atol=2e-6
        )
