"""Uncertainty budgets of products and quotients, by the GUM and by Monte Carlo."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt

COVERAGE_FACTOR = 2.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Input:
    """One quantity of the measurement equation.

    Attributes
    ----------
    name : str
        In words, with its symbol.
    value : float
    unit : str
        Empty for a pure number.
    standard_uncertainty : float
        In the same unit, >= 0; of a rectangular input half its width over the
        square root of three.
    exponent : {1, -1}
        In the numerator or the denominator.
    source : str
        Where the value and its uncertainty come from.
    distribution : {"normal", "rectangular"}
    """

    name: str
    value: float
    unit: str
    standard_uncertainty: float
    exponent: Literal[1, -1]
    source: str
    distribution: Literal["normal", "rectangular"] = "normal"

    def __post_init__(self) -> None:
        if not (math.isfinite(self.value) and self.value > 0):
            raise ValueError(f"value of {self.name} must be > 0, got {self.value!r}")
        if not self.standard_uncertainty >= 0:
            raise ValueError(
                f"standard_uncertainty of {self.name} must be >= 0, "
                f"got {self.standard_uncertainty!r}"
            )

    @property
    def relative(self) -> float:
        """Standard uncertainty over value."""
        return self.standard_uncertainty / self.value


@dataclass(frozen=True, slots=True, kw_only=True)
class Contribution:
    """One row of a budget: an input and its share of the result's variance."""

    source: Input
    sensitivity: float
    share: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Budget:
    """Result of a measurement equation with its uncertainty.

    Attributes
    ----------
    value : float
    standard_uncertainty : float
    coverage_factor : float
    rows : tuple of Contribution
        In the order of the equation; the shares add up to one.
    """

    value: float
    standard_uncertainty: float
    coverage_factor: float
    rows: tuple[Contribution, ...]

    @property
    def expanded(self) -> float:
        """Expanded uncertainty, about 95 % for a coverage factor of two."""
        return self.coverage_factor * self.standard_uncertainty


@dataclass(frozen=True, slots=True, kw_only=True)
class Simulated:
    """Mean, sd and shortest 95 % interval of drawn results."""

    mean: float
    sd: float
    low: float
    high: float


def combine(inputs: Sequence[Input]) -> Budget:
    """Value and uncertainty of a product of powers of independent inputs.

    Parameters
    ----------
    inputs : sequence of Input

    Notes
    -----
    y = prod x_i**e_i, so the sensitivity is c_i = e_i y / x_i and the relative
    variances add up, (u(y)/y)**2 = sum (u(x_i)/x_i)**2 [1]_.

    References
    ----------
    .. [1] JCGM 100:2008 (GUM), section 5.1.6, equation 12.

    Examples
    --------
    >>> mass = Input(name="m", value=2.0, unit="mg", standard_uncertainty=0.06,
    ...              exponent=1, source="balance")
    >>> part = Input(name="P", value=0.5, unit="", standard_uncertainty=0.02,
    ...              exponent=-1, source="certificate")
    >>> budget = combine([mass, part])
    >>> round(budget.value, 6), round(budget.standard_uncertainty, 6)
    (4.0, 0.2)
    """
    value = math.prod(one.value**one.exponent for one in inputs)
    variance = sum(one.relative**2 for one in inputs)
    return Budget(
        value=value,
        standard_uncertainty=value * math.sqrt(variance),
        coverage_factor=COVERAGE_FACTOR,
        rows=tuple(
            Contribution(
                source=one,
                sensitivity=one.exponent * value / one.value,
                share=one.relative**2 / variance if variance else 0.0,
            )
            for one in inputs
        ),
    )


def simulate(
    inputs: Sequence[Input], *, n_draws: int, rng: np.random.Generator
) -> Simulated:
    """The same equation with every input drawn from its distribution.

    Parameters
    ----------
    inputs : sequence of Input
    n_draws : int
    rng : numpy.random.Generator

    References
    ----------
    .. [1] JCGM 101:2008 (GUM supplement 1), section 5.3.4.
    """
    results = np.ones(n_draws)
    for one in inputs:
        results *= _drawn(one, n_draws, rng) ** float(one.exponent)
    results.sort()
    n_inside = math.ceil(0.95 * n_draws)
    widths = results[n_inside - 1 :] - results[: n_draws - n_inside + 1]
    first = int(widths.argmin())
    return Simulated(
        mean=float(results.mean()),
        sd=float(results.std(ddof=1)),
        low=float(results[first]),
        high=float(results[first + n_inside - 1]),
    )


def _drawn(
    one: Input, n_draws: int, rng: np.random.Generator
) -> npt.NDArray[np.float64]:
    if one.distribution == "rectangular":
        half = math.sqrt(3.0) * one.standard_uncertainty
        return rng.uniform(one.value - half, one.value + half, n_draws)
    return rng.normal(one.value, one.standard_uncertainty, n_draws)
