"""The stored models, against a plain walk through the trees and against LightGBM."""

import json
from importlib.resources import files

import numpy as np
import pytest

from spinledger.prediction.couplings import models

TRAINED = files("spinledger.prediction.couplings") / "data" / "trained"


def walked(tree: dict[str, list[float]], row: np.ndarray) -> float:
    """One tree, one step at a time."""
    node = 0 if tree["feature"] else -1
    while node >= 0:
        is_left = row[int(tree["feature"][node])] <= tree["threshold"][node]
        node = int(tree["left" if is_left else "right"][node])
    return tree["leaf"][-1 - node]


@pytest.mark.parametrize("name", ["aromatic", "chain_ch_ch2_gap", "ring6_ch2_ch2"])
def test_all_trees_at_once_give_what_one_by_one_gives(name: str) -> None:
    stored = json.loads((TRAINED / "trees.json").read_text("utf-8"))[name]
    width = 1 + max(int(max(tree["feature"], default=0)) for tree in stored)
    rng = np.random.default_rng(3)
    for _ in range(20):
        row = rng.integers(-1, 4, size=width + 5).astype(float)
        expected = sum(walked(tree, row) for tree in stored)
        # 1e-9: order of a few hundred additions.
        assert models.tree_value_hz(name, row) == pytest.approx(expected, abs=1e-9)


def test_stored_form_keeps_what_lightgbm_predicts(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    from pathlib import Path  # noqa: PLC0415 # only this test reaches for training

    training = Path(__file__).parents[4] / "core" / "training"
    monkeypatch.syspath_prepend(str(training))
    from couplings_fit import TREES, fit_trees, stored_trees  # noqa: PLC0415

    rng = np.random.default_rng(5)
    features = rng.normal(size=(300, 6))
    values = features[:, 0] * 2 + np.sin(3 * features[:, 1])
    parameters = {**TREES, "alpha": 1.0, "num_leaves": 8}
    booster = fit_trees(features, values, np.ones(300), parameters, 40)
    trees = stored_trees(booster)
    found = [sum(walked(tree, row) for tree in trees) for row in features[:50]]
    expected = np.asarray(booster.predict(features[:50], num_threads=1))
    # Leaves are kept to 1e-5; so many add up as there are trees.
    assert np.abs(np.array(found) - expected).max() < len(trees) * 1e-5


def test_linear_models_stay_within_what_they_were_trained_on() -> None:
    model = models.LinearModel(
        coefficients=np.array([2.0, 0.0]), intercept=1.0, low=0.0, high=4.0
    )
    assert model.predict(np.array([1.0, 9.0])) == pytest.approx(3.0)
    assert model.predict(np.array([5.0, 0.0])) == 4.0
    assert model.predict(np.array([-5.0, 0.0])) == 0.0


def test_sd_lies_between_the_two_intervals() -> None:
    for kind in models.known_kinds():
        widths = models.half_widths(kind)
        normal = sorted([widths.half_68_hz, widths.half_95_hz / 1.96])
        assert normal[0] <= widths.sd_hz * (1 + 1e-9)
        assert widths.sd_hz <= normal[1] * (1 + 1e-9)


def test_models_are_small_and_carry_their_licence() -> None:
    sizes = [len((TRAINED / n).read_bytes()) for n in ("trees.json", "couplings.json")]
    assert sum(sizes) < 1_000_000
    assert "BY-SA 4.0" in (TRAINED / "LICENSE.md").read_text("utf-8")
