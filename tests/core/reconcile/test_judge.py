"""The verdict model: monotone, bounded, and as its file says."""

import numpy as np
import pytest

from spinledger.reconcile.judge import (
    VerdictModel,
    likelihood_ratio,
    load_model,
    probability_of,
    state_of,
)


@pytest.fixture
def model() -> VerdictModel:
    return VerdictModel(
        names=("misfit", "shift"),
        weights=np.array([1.0, 2.0]),
        intercept=3.0,
        upper=0.7,
        lower=0.3,
        temperature=1.0,
    )


def test_probability_is_the_logistic_of_the_weighted_faults(
    model: VerdictModel,
) -> None:
    # 3 - 1 * 1 - 2 * 0.5 = 1; 1 / (1 + exp(-1)) to 1e-12 by closed form.
    found = probability_of({"misfit": 1.0, "shift": 0.5}, model)
    assert found == pytest.approx(1 / (1 + np.exp(-1.0)), abs=1e-12)


@pytest.mark.parametrize(
    ("probability", "state"),
    [
        (0.7, "reconciled"),
        (0.69, "undecided"),
        (0.3, "undecided"),
        (0.29, "not reconciled"),
    ],
)
def test_limits_decide_the_state(
    model: VerdictModel, probability: float, state: str
) -> None:
    assert state_of(probability, model) == state


def test_likelihood_ratio_and_prior_give_the_probability_back() -> None:
    ratio = likelihood_ratio(0.9, prior=0.2)
    odds = ratio * 0.2 / 0.8
    assert odds / (1 + odds) == pytest.approx(0.9, abs=1e-12)


def test_model_in_the_package_counts_every_fault_against() -> None:
    stored = load_model()
    assert np.all(stored.weights >= 0)
    assert 0.0 < stored.lower < stored.upper < 1.0
    faultless = dict.fromkeys(stored.names, 0.0)
    assert probability_of(faultless, stored) > stored.upper
