"""Populations by maximum entropy, against direct minimisation and quadrature."""

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import minimize

from spinledger.reconcile.reweighting import covariance, reweighted

Array = np.ndarray


def by_direct_search(
    values: Array, prior: Array, measured: Array, sds: Array, trust: float
) -> Array:
    """Oracle: the same objective minimised over the weights themselves."""

    def objective(logits: Array) -> float:
        weights = np.exp(logits - logits.max())
        weights = weights / weights.sum()
        entropy = float(weights @ np.log(weights / prior))
        z = (weights @ values - measured) / sds
        return trust * entropy + 0.5 * float(z @ z)

    found = minimize(
        objective,
        np.log(prior),
        method="Nelder-Mead",
        options={"maxiter": 20000, "maxfev": 20000, "xatol": 1e-9, "fatol": 1e-13},
    )
    weights = np.exp(found.x - found.x.max())
    return np.asarray(weights / weights.sum())


@pytest.mark.parametrize("trust", [0.5, 5.0])
def test_weights_are_those_of_a_direct_search(trust: float) -> None:
    values = np.array([[2.5, 3.0], [12.0, 2.8], [4.0, 11.0]])
    prior = np.array([0.5, 0.3, 0.2])
    measured, sds = np.array([8.5, 4.0]), np.array([0.6, 0.8])
    found = reweighted(values, prior, measured, sds, trust=trust)
    expected = by_direct_search(values, prior, measured, sds, trust)
    # The simplex search stops at about 1e-6 in the weights.
    assert found.weights == pytest.approx(expected, abs=1e-4)
    assert found.weights.sum() == pytest.approx(1.0, abs=1e-12)


def test_known_populations_come_back_from_sharp_couplings() -> None:
    rng = np.random.default_rng(5)
    values = rng.uniform(1.0, 13.0, size=(3, 2))
    truth = np.array([0.6, 0.3, 0.1])
    found = reweighted(
        values, np.full(3, 1 / 3), truth @ values, np.full(2, 0.01), trust=1.0
    )
    # Two averages and the sum fix three populations; the pull is 1e-4 Hz^2.
    assert found.weights == pytest.approx(truth, abs=0.005)


def test_measurement_out_of_reach_pushes_to_the_nearest_conformer() -> None:
    values = np.array([[2.0], [5.0]])
    found = reweighted(
        values, np.array([0.5, 0.5]), np.array([12.0]), np.array([0.3]), trust=1.0
    )
    assert found.weights[1] > 0.999
    # 7 Hz beyond the nearest conformer at 0.3 Hz.
    assert found.deviations[0] == pytest.approx(-7.0 / 0.3, rel=0.001)


def test_nothing_changes_where_the_prior_already_agrees() -> None:
    values = np.array([[2.0], [12.0]])
    prior = np.array([0.7, 0.3])
    found = reweighted(values, prior, prior @ values, np.array([0.5]), trust=5.0)
    assert found.weights == pytest.approx(prior, abs=1e-9)
    assert found.relative_entropy == pytest.approx(0.0, abs=1e-12)


def quadrature(trust: float, measured_hz: float) -> tuple[float, float, float]:
    """Evidence, mean and sd of one share of two conformers, integrated exactly.

    Density exp(-trust * relative entropy) with the measure that is flat in the
    arcsine of the root of the share, the one the curvature of the entropy makes.
    """
    low, high, sd, prior = 3.0, 12.0, 0.8, 0.4

    def weight(angle: float) -> tuple[float, float]:
        share = min(max(float(np.sin(angle) ** 2), 1e-12), 1 - 1e-12)
        entropy = share * np.log(share / prior)
        entropy += (1 - share) * np.log((1 - share) / (1 - prior))
        return float(np.exp(-trust * entropy)), share

    def integral(power: int, *, with_data: bool) -> float:
        def integrand(angle: float) -> float:
            density, share = weight(angle)
            z = (low + (high - low) * share - measured_hz) / sd
            likelihood = np.exp(-0.5 * z * z) / (np.sqrt(2 * np.pi) * sd)
            return density * share**power * (float(likelihood) if with_data else 1.0)

        return float(quad(integrand, 0.0, np.pi / 2, limit=200)[0])

    total = integral(0, with_data=True)
    mean = integral(1, with_data=True) / total
    variance = integral(2, with_data=True) / total - mean**2
    return total / integral(0, with_data=False), mean, float(np.sqrt(variance))


@pytest.mark.parametrize("measured_hz", [5.0, 7.0, 9.0])
def test_evidence_and_sd_are_those_of_an_exact_integral(measured_hz: float) -> None:
    trust = 20.0
    values, prior = np.array([[12.0], [3.0]]), np.array([0.4, 0.6])
    found = reweighted(
        values, prior, np.array([measured_hz]), np.array([0.8]), trust=trust
    )
    evidence, mean, sd = quadrature(trust, measured_hz)
    share, share_sd = found.mean_and_sd(np.array([1.0, 0.0]))
    # The curvature at the peak is exact as trust grows; at 20 the next term
    # of the expansion is a few per cent.
    assert np.exp(found.log_evidence) == pytest.approx(evidence, rel=0.08)
    assert share == pytest.approx(mean, abs=0.01)
    assert share_sd == pytest.approx(sd, rel=0.08)


def test_covariance_is_the_weighted_one() -> None:
    rng = np.random.default_rng(2)
    values, weights = rng.normal(size=(6, 3)), rng.dirichlet(np.ones(6))
    expected = np.cov(values.T, aweights=weights, ddof=0)
    assert covariance(values, weights) == pytest.approx(expected, abs=1e-12)


def test_shapes_and_sds_are_checked() -> None:
    with pytest.raises(ValueError, match="shapes differ"):
        reweighted(np.ones((2, 2)), np.ones(2) / 2, np.ones(1), np.ones(1), trust=1.0)
    with pytest.raises(ValueError, match="must be > 0"):
        reweighted(np.ones((2, 1)), np.ones(2) / 2, np.ones(1), np.zeros(1), trust=1.0)
