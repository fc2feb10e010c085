from dataclasses import replace

import numpy as np
import pytest

from shake_cases import Line, evidence_of_lines, multiplet
from spinledger.errors import EvidenceError
from spinledger.sample.batch_reference import (
    BatchLimits,
    compare_batch,
    joined_ranges,
)
from spinledger.values.evidence import Evidence

PLACES = ((0.9, 3.0, [7.0, 7.0]), (2.3, 2.0, [7.0]), (3.9, 1.0, []), (7.1, 4.0, [8.0]))


def lines(*more: Line, scale: float = 1.0) -> list[Line]:
    rows = [one for at, n, js in PLACES for one in multiplet(at, n * scale, js, 1.2)]
    return [*rows, *more]


def spectrum(rows: list[Line], seed: int, *, gain: float = 1.0) -> Evidence:
    rng = np.random.default_rng(seed)
    return evidence_of_lines(rows, rng, noise=0.004, receiver_gain=gain)


@pytest.fixture(scope="module")
def reference() -> Evidence:
    return spectrum(lines(), 1, gain=3.0)


def test_batch_like_its_reference_passes(reference: Evidence) -> None:
    found = compare_batch(spectrum(lines(), 2), reference, n_protons=10.0)
    assert found.passed
    assert found.alignment.scale == pytest.approx(1.0 / 3.0, rel=0.01)
    assert "agrees" in found.sentences()[0]


@pytest.mark.parametrize(("amount", "passes"), [(0.004, True), (0.03, False)])
def test_new_line_counts_from_its_limit_on(
    reference: Evidence, amount: float, passes: bool
) -> None:
    batch = spectrum(lines((5.3, amount, 1.2)), 3)
    found = compare_batch(batch, reference, n_protons=10.0)
    assert found.passed is passes
    if not passes:
        (one,) = found.deviations
        assert one.kind == "new"
        # 5 % of the line's tails lie outside the window.
        assert one.amount == pytest.approx(100.0 * amount, rel=0.15)


def test_line_of_the_reference_that_is_missing_is_said(reference: Evidence) -> None:
    batch = spectrum([one for one in lines() if abs(one[0] - 3.9) > 0.1], 4)
    found = compare_batch(batch, reference, n_protons=9.0)
    (one,) = found.deviations
    assert one.kind == "missing"
    assert "missing at 3.9" in one.sentence()


def test_larger_signal_fails_its_integral_limit(reference: Evidence) -> None:
    batch = spectrum(lines((3.9, 0.2, 1.2)), 5)
    found = compare_batch(batch, reference, n_protons=10.0)
    (one,) = found.deviations
    assert one.kind == "more"
    assert one.amount == pytest.approx(20.0, abs=4.0 * one.sd)
    wide = BatchLimits(integral_percent=30.0)
    assert compare_batch(batch, reference, n_protons=10.0, limits=wide).passed


def test_reference_in_another_solvent_is_refused(reference: Evidence) -> None:
    other = replace(reference, solvent="DMSO-d6")
    with pytest.raises(EvidenceError, match="take a reference in the same solvent"):
        compare_batch(spectrum(lines(), 6), other, n_protons=10.0)


def test_limits_must_be_positive() -> None:
    with pytest.raises(ValueError, match="line_mol_percent must be > 0"):
        BatchLimits(line_mol_percent=0.0)


def test_ranges_that_touch_are_joined() -> None:
    assert joined_ranges([(3.0, 4.0), (1.0, 2.0), (1.5, 2.5)]) == [
        (1.0, 2.5),
        (3.0, 4.0),
    ]
