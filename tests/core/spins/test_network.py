"""Claim networks against the plain engine, one spin for every proton."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

from core.spins.spin_cases import claim_set, decaying_signal, predictions
from spinledger.spins.clusters import Effort
from spinledger.spins.engine import simulate
from spinledger.spins.network import ClaimLineSet, ClaimNetwork
from spinledger.values.claim import Claim, ClaimSet, CouplingClaim, Particle
from spinledger.values.spin_system import SpinSystem

Floats = npt.NDArray[np.float64]

# No thinning: lines are merged within 1e-9 Hz only.
EXACT = Effort(smallest=0.0, bin_hz=1e-9)


def plain_signal(claims: ClaimSet, frequency_mhz: float) -> Floats:
    """Fingerprint of every claim, each particle as it stands, nothing merged."""
    shifts, couplings = predictions(claims, frequency_mhz)
    size = len(claims.particles)
    table = np.zeros((size, size))
    for coupling, value in zip(claims.couplings, couplings, strict=True):
        for a, b in coupling.pairs:
            table[a, b] = table[b, a] = value
    system = SpinSystem(
        n_spins=np.array([p.n_spins for p in claims.particles]),
        frequencies_hz=np.array(
            [0.0 if p.claim is None else shifts[p.claim] for p in claims.particles]
        ),
        couplings_hz=table,
        nuclei=tuple(p.nucleus for p in claims.particles),
    )
    lines = simulate(system)
    rows = decaying_signal(lines.frequencies_hz, lines.intensities)
    found = np.zeros((len(claims.claims), rows.shape[1]))
    for row, particle in zip(rows, lines.observed, strict=True):
        owner = claims.particles[particle].claim
        assert owner is not None
        found[owner] += row
    return found


def network_signal(lines: ClaimLineSet, n_claims: int) -> Floats:
    return np.array(
        [
            decaying_signal(
                lines.frequencies_hz[lines.claim == k], lines.protons[lines.claim == k]
            )
            for k in range(n_claims)
        ]
    )


CASES = {
    "ethyl": claim_set(
        [("CH3", [1, 1, 1], 1.2), ("CH2", [1, 1], 1.5)],
        [
            ([(a, b) for a in range(3) for b in (3, 4)], 7.1),
            ([(3, 4)], -11.0),
            ([(0, 1), (0, 2), (1, 2)], -12.0),
        ],
    ),
    "para ring": claim_set(
        [("2-H", [1, 1], 7.30), ("3-H", [1, 1], 7.12)],
        [
            ([(0, 2), (1, 3)], 8.4),
            ([(0, 3), (1, 2)], 0.4),
            ([(0, 1)], 2.1),
            ([(2, 3)], 2.7),
        ],
    ),
    "isopropyl twice": claim_set(
        [("CH3", [3, 3, 3, 3], 1.15), ("CH", [1, 1], 2.9)],
        [([(0, 4), (1, 4), (2, 5), (3, 5)], 6.8)],
    ),
    "singlet of nine and a far pair": claim_set(
        [("tBu", [3, 3, 3], 1.2), ("A", [1], 6.1), ("B", [1], 6.3)],
        [([(0, 1), (0, 2), (1, 2)], 5.0), ([(3, 4)], 15.0)],
    ),
    "two unlike members of a claim": claim_set(
        [("a", [1, 1, 1], 2.0), ("b", [1], 2.2)],
        [
            ([(0, 3)], 7.0),
            ([(1, 3)], 7.0),
            ([(2, 3)], 2.0),
            ([(0, 2)], -12.0),
            ([(1, 2)], 3.0),
        ],
    ),
}


@pytest.mark.parametrize("name", list(CASES))
def test_network_gives_the_unmerged_spectrum(name: str) -> None:
    claims = CASES[name]
    shifts, couplings = predictions(claims, 100.0)
    network = ClaimNetwork(claims)
    plan = network.plan(shifts, couplings, effort=EXACT)
    lines = network.lines(shifts, couplings, plan=plan)
    # Merging is exact; the tolerance is that of lines joined within 1e-9 Hz.
    np.testing.assert_allclose(
        network_signal(lines, len(claims.claims)),
        plain_signal(claims, 100.0),
        atol=1e-6,
    )
    assert lines.error_bound == 0.0


def test_benzene_like_claim_is_one_line() -> None:
    claims = claim_set([("H", [1] * 6, 7.3)], [([(0, 1), (1, 2), (2, 3)], 7.5)])
    lines = ClaimNetwork(claims).lines(np.array([730.0]), np.array([7.5]))
    assert lines.frequencies_hz.tolist() == [730.0]
    assert lines.protons.tolist() == [6.0]


@pytest.mark.parametrize("name", list(CASES))
def test_protons_of_every_claim_add_up_after_thinning(name: str) -> None:
    claims = CASES[name]
    shifts, couplings = predictions(claims, 400.0)
    lines = ClaimNetwork(claims).lines(shifts, couplings)
    sums = np.bincount(lines.claim, lines.protons)
    # Kept lines are scaled to the claim, so only rounding is left.
    np.testing.assert_allclose(sums, [c.n_protons for c in claims.claims], rtol=1e-12)


def difluoro() -> ClaimSet:
    """Two protons and two fluorines, AA'XX'."""
    return ClaimSet(
        claims=(
            Claim(
                label="CH2", atoms=(0,), n_protons=2, shift_ppm=3.8, shift_sd_ppm=0.2
            ),
        ),
        particles=(
            Particle(claim=0, nucleus="1H", n_spins=1, hydrogens=()),
            Particle(claim=0, nucleus="1H", n_spins=1, hydrogens=()),
            Particle(claim=None, nucleus="19F", n_spins=1, hydrogens=()),
            Particle(claim=None, nucleus="19F", n_spins=1, hydrogens=()),
        ),
        couplings=tuple(
            CouplingClaim(
                pairs=pairs, j_hz=j_hz, j_sd_hz=2.0, kind="x", bonds=3, is_rigid=True
            )
            for pairs, j_hz in (
                (((0, 2), (1, 3)), 0.7),
                (((0, 3), (1, 2)), 33.9),
                (((0, 1),), -4.8),
                (((2, 3),), 36.4),
            )
        ),
    )


def test_equivalent_fluorines_make_aaxx() -> None:
    claims = difluoro()
    shifts, couplings = predictions(claims, 100.0)
    network = ClaimNetwork(claims)
    plan = network.plan(shifts, couplings, effort=EXACT)
    found = network_signal(network.lines(shifts, couplings, plan=plan), 1)
    np.testing.assert_allclose(found, plain_signal(claims, 100.0), atol=1e-6)


def exchangeable_set(*, is_exchangeable: bool) -> ClaimSet:
    base = claim_set([("CH", [1], 3.6), ("X", [1], 4.5)], [([(0, 1)], 6.0)])
    second = Claim(
        label="X",
        atoms=(1,),
        n_protons=1,
        shift_ppm=4.5,
        shift_sd_ppm=0.3,
        is_exchangeable=is_exchangeable,
    )
    return ClaimSet(
        claims=(base.claims[0], second),
        particles=base.particles,
        couplings=base.couplings,
    )


@pytest.mark.parametrize(("is_exchangeable", "n_lines"), [(True, 1), (False, 2)])
def test_absent_claim_still_splits_unless_it_exchanges(
    is_exchangeable: bool, n_lines: int
) -> None:
    claims = exchangeable_set(is_exchangeable=is_exchangeable)
    shifts, couplings = predictions(claims, 500.0)
    lines = ClaimNetwork(claims).lines(shifts, couplings, without=frozenset({1}))
    assert set(lines.claim.tolist()) == {0}
    # At J / dnu = 0.013 the partner's own lines carry 0.3 % of this claim.
    assert int((np.abs(lines.protons) > 0.01).sum()) == n_lines


def test_derivatives_of_shared_parameters_agree_with_differences() -> None:
    claims = CASES["para ring"]
    shifts, couplings = predictions(claims, 100.0)
    network = ClaimNetwork(claims)
    plan = network.plan(shifts, couplings, effort=EXACT)
    lines = network.lines(shifts, couplings, plan=plan, intensity_derivatives=True)
    assert lines.d_frequency is not None
    assert lines.d_protons is not None
    point = np.concatenate([shifts, couplings])
    for k in range(point.size):
        step = np.zeros(point.size)
        step[k] = 1e-4
        signals = [
            network_signal(network.lines(x[:2], x[2:], plan=plan), 2)
            for x in (point + step, point - step)
        ]
        change = (signals[0] - signals[1]) / 2e-4
        moved = [slope_of_signal(lines, lines.claim == claim, k) for claim in range(2)]
        # Differences of 1e-4 Hz: third derivatives of the signal are some 1e3.
        np.testing.assert_allclose(moved, change, atol=1e-4)


def slope_of_signal(lines: ClaimLineSet, own: npt.NDArray[np.bool_], k: int) -> Floats:
    """Chain rule through frequency and intensity of every line."""
    assert lines.d_frequency is not None
    assert lines.d_protons is not None
    times_s = np.linspace(0.0, 0.9, 40)
    waves = np.exp(2j * np.pi * np.outer(lines.frequencies_hz[own], times_s))
    slope = lines.d_protons[own, k] @ waves
    slope += (lines.protons[own] * lines.d_frequency[own, k]) @ (
        waves * 2j * np.pi * times_s
    )
    return np.concatenate([slope.real, slope.imag])


def chain(n_spins: int) -> ClaimSet:
    """Protons 0.17 ppm apart, each coupled to its two nearest neighbours."""
    groups = [(f"{k}-H", [1], 1.0 + 0.17 * k) for k in range(n_spins)]
    near = [([(k, k + 1)], 7.0 + 0.3 * (k % 5)) for k in range(n_spins - 1)]
    return claim_set(groups, near + [([(k, k + 2)], 1.1) for k in range(n_spins - 2)])


def broad(lines: ClaimLineSet, grid: Floats) -> Floats:
    gaps = grid[:, None] - lines.frequencies_hz[None, :]
    return np.asarray((lines.protons * 0.25 / (gaps**2 + 0.25)).sum(axis=1))


def test_clusters_agree_with_the_whole_within_their_bound() -> None:
    claims = chain(8)
    shifts, couplings = predictions(claims, 500.0)
    network = ClaimNetwork(claims)
    whole = network.lines(shifts, couplings)
    effort = Effort(exact_cost=500.0, cluster_cost=1500.0)
    plan = network.plan(shifts, couplings, effort=effort)
    assert plan.is_cut
    cut = network.lines(shifts, couplings, plan=plan)
    grid = np.unique(np.concatenate([whole.frequencies_hz, cut.frequencies_hz]))
    expected = broad(whole, grid)
    error = np.abs(broad(cut, grid) - expected).max() / expected.max()
    assert 0.0 < error < cut.error_bound
    # Clusters of about six spins: a few per cent. The demand of 1 % is for the
    # usual, larger ones, see the benchmark.
    assert error < 0.05
    np.testing.assert_allclose(np.bincount(cut.claim, cut.protons), 1.0, rtol=1e-12)


def test_forty_protons_are_cut_and_every_one_is_detected() -> None:
    claims = chain(40)
    shifts, couplings = predictions(claims, 500.0)
    lines = ClaimNetwork(claims).lines(shifts, couplings)
    np.testing.assert_allclose(np.bincount(lines.claim, lines.protons), 1.0, rtol=1e-12)
    assert 0.0 < lines.error_bound < 0.1


def test_network_says_which_array_is_short() -> None:
    network = ClaimNetwork(CASES["para ring"])
    with pytest.raises(ValueError, match=r"couplings_hz: need \(4,\), got \(3,\)"):
        network.lines(np.zeros(2), np.zeros(3))
