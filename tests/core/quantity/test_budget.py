"""Budgets against sums done by hand and against drawn inputs."""

import math

import numpy as np
import pytest

from spinledger.quantity.budget import Input, combine, simulate

# Maleic acid, 2 H, against a compound of 250.00 g/mol, done with pencil:
#   P = 0.4810 * 250.00 / 116.07 * 5.000 / 10.000 * 0.9990
#     = 1.0360128 * 0.5 * 0.999 = 0.5174884
# relative: ratio 0.4 %, masses 0.02/5 and 0.02/10, purity 0.05 %; in quadrature
#   sqrt(0.004^2 + 0.004^2 + 0.002^2 + 0.0005^2) = 0.0060208
INPUTS = (
    Input(name="ratio", value=0.4810, unit="", standard_uncertainty=0.4810 * 0.004,
          exponent=1, source=""),
    Input(name="M x", value=250.0, unit="g/mol", standard_uncertainty=0.0, exponent=1,
          source=""),
    Input(name="M s", value=116.07, unit="g/mol", standard_uncertainty=0.0, exponent=-1,
          source=""),
    Input(name="m s", value=5.0, unit="mg", standard_uncertainty=0.02, exponent=1,
          source=""),
    Input(name="m x", value=10.0, unit="mg", standard_uncertainty=0.02, exponent=-1,
          source=""),
    Input(name="P s", value=0.9990, unit="", standard_uncertainty=0.9990 * 0.0005,
          exponent=1, source=""),
)  # fmt: skip


def test_example_done_by_hand() -> None:
    budget = combine(INPUTS)
    # Seven figures were carried by hand.
    assert budget.value == pytest.approx(0.5174884, rel=2e-6)
    assert budget.standard_uncertainty == pytest.approx(0.5174884 * 0.0060208, rel=1e-4)
    assert budget.expanded == 2 * budget.standard_uncertainty
    assert sum(row.share for row in budget.rows) == pytest.approx(1.0)
    assert budget.rows[0].share == pytest.approx(16 / 36.25, rel=1e-9)


def test_sensitivities_are_the_slopes_of_the_equation() -> None:
    budget = combine(INPUTS)
    for index, row in enumerate(budget.rows):
        step = 1e-6 * row.source.value
        moved = list(INPUTS)
        moved[index] = Input(
            name="moved",
            value=row.source.value + step,
            unit="",
            standard_uncertainty=0.0,
            exponent=row.source.exponent,
            source="",
        )
        slope = (combine(moved).value - budget.value) / step
        # A forward difference errs by about the step's share.
        assert row.sensitivity == pytest.approx(slope, rel=1e-5)


def test_drawn_inputs_agree_with_the_budget() -> None:
    flat = Input(
        name="relaxation",
        value=1.0,
        unit="",
        standard_uncertainty=0.0067 / math.sqrt(3),
        exponent=1,
        source="",
        distribution="rectangular",
    )
    inputs = (*INPUTS, flat)
    budget = combine(inputs)
    drawn = simulate(inputs, n_draws=200_000, rng=np.random.default_rng(5))
    # The sd of 2e5 draws is known to 0.16 %; the linear form errs by u^2, 4e-5.
    assert drawn.sd == pytest.approx(budget.standard_uncertainty, rel=0.008)
    assert drawn.mean == pytest.approx(budget.value, rel=1e-4)
    # GUM-S1, section 8: both ends within the numerical tolerance of two figures.
    tolerance = 0.05 * budget.standard_uncertainty
    assert drawn.low == pytest.approx(
        budget.value - 1.96 * budget.standard_uncertainty, abs=tolerance
    )
    assert drawn.high == pytest.approx(
        budget.value + 1.96 * budget.standard_uncertainty, abs=tolerance
    )


def test_impossible_inputs_are_refused() -> None:
    with pytest.raises(ValueError, match="value of m"):
        Input(
            name="m",
            value=0.0,
            unit="mg",
            standard_uncertainty=0.1,
            exponent=1,
            source="",
        )
    with pytest.raises(ValueError, match="standard_uncertainty of m"):
        Input(
            name="m",
            value=1.0,
            unit="mg",
            standard_uncertainty=-0.1,
            exponent=1,
            source="",
        )
