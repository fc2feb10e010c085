"""Placing claims on synthetic spectra whose answer is known."""

from collections.abc import Callable

import numpy as np
import pytest

from spinledger.reconcile.coarse import broadened, coarse_shape, first_order_sticks
from spinledger.reconcile.match import match
from spinledger.reconcile.options import Constraints, Pin
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence, Stray

Evidences = Callable[..., Evidence]
Claims = Callable[..., ClaimSet]

# The coarse grid step is 2 Hz at 400 MHz, and overlap may move a maximum by
# about one step.
GRID_PPM = 2 * 2.0 / 400.0


def test_ethyl_group_is_placed_far_from_its_prediction(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    evidence = make_evidence(
        [(4.35, 2, [(3, 7.1)]), (1.62, 3, [(2, 7.1)]), (2.05, 3, [])]
    )
    claims = make_claims(
        [("CH2", 4.0, 0.3, 2), ("CH3", 1.2, 0.3, 3), ("Ac", 2.3, 0.3, 3)],
        [(0, 1, 7.1)],
    )
    best = match(evidence, claims).hypotheses[0]
    assert best.shifts_ppm == pytest.approx([4.35, 1.62, 2.05], abs=GRID_PPM)


def test_splitting_decides_where_shifts_do_not(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    # A septet-like and a singlet CH, predicted at the same place.
    evidence = make_evidence([(3.2, 1, [(6, 7.0)]), (3.6, 1, []), (1.2, 6, [(1, 7.0)])])
    claims = make_claims(
        [("sept", 3.4, 0.3, 1), ("s", 3.4, 0.3, 1), ("Me", 1.2, 0.2, 6)],
        [(0, 2, 7.0)],
    )
    best = match(evidence, claims).hypotheses[0]
    assert best.shifts_ppm == pytest.approx([3.2, 3.6, 1.2], abs=GRID_PPM)


def test_exchangeable_that_is_not_there_is_absent(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    evidence = make_evidence([(3.7, 2, []), (1.2, 3, [])])
    claims = make_claims(
        [("A", 3.6, 0.2, 2), ("B", 1.2, 0.2, 3), ("OH", 6.0, 1.5, 1)],
        optional=frozenset({"OH"}),
    )
    best = match(evidence, claims).hypotheses[0]
    assert best.absent == frozenset({2})


def test_claim_under_the_water_mask_is_hidden(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    water = Stray(low_ppm=4.6, high_ppm=5.0, kind="water", why="HOD")
    evidence = make_evidence(
        [(4.8, 200, []), (3.3, 2, []), (1.2, 3, [])], strays=(water,)
    )
    claims = make_claims(
        [("CHOH", 4.78, 0.15, 1), ("A", 3.3, 0.2, 2), ("B", 1.2, 0.2, 3)]
    )
    best = match(evidence, claims).hypotheses[0]
    assert best.hidden == frozenset({0})


def test_pin_holds_a_claim_where_it_would_not_go(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    evidence = make_evidence([(3.0, 1, []), (4.0, 1, [])])
    claims = make_claims([("A", 3.0, 0.1, 1), ("B", 4.0, 0.1, 1)])
    pinned = Constraints(pins=(Pin(claim="A", low_ppm=3.9, high_ppm=4.1),))
    free = match(evidence, claims).hypotheses[0]
    held = match(evidence, claims, constraints=pinned).hypotheses[0]
    assert free.shifts_ppm == pytest.approx([3.0, 4.0], abs=GRID_PPM)
    assert held.shifts_ppm == pytest.approx([4.0, 3.0], abs=GRID_PPM)


def test_common_reference_error_is_found(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    shifts = [7.4, 5.1, 3.6, 2.2, 1.0]
    evidence = make_evidence([(s + 0.15, 1, []) for s in shifts], reference_sd_ppm=0.1)
    claims = make_claims([(f"C{i}", s, 0.05, 1) for i, s in enumerate(shifts)])
    best = match(evidence, claims).hypotheses[0]
    assert best.shifts_ppm == pytest.approx(np.array(shifts) + 0.15, abs=GRID_PPM)
    # Weighted mean of five gaps of 0.15 with sd 0.05 under a zero-mean prior of
    # sd 0.1: 0.15 * 2000 / 2100, to within half a grid step.
    assert best.offset_ppm == pytest.approx(0.1429, abs=0.003)


def test_quartet_sticks_are_binomial(make_claims: Claims) -> None:
    claims = make_claims([("CH2", 4.0, 0.1, 2), ("CH3", 1.0, 0.1, 3)], [(0, 1, 7.0)])
    offsets, areas = first_order_sticks(claims, np.array([7.0]))[0]
    assert offsets == pytest.approx([-10.5, -3.5, 3.5, 10.5], abs=1e-9)
    assert areas == pytest.approx([0.25, 0.75, 0.75, 0.25], abs=1e-12)


def test_coarse_shape_is_what_broadening_a_line_gives(make_evidence: Evidences) -> None:
    evidence = make_evidence([(5.0, 1, [])], noise=1e-9, width_hz=1.0)
    spectrum = evidence.spectrum
    seen = broadened(spectrum, spectrum.intensities, 6.0)
    middle = int(np.argmax(seen))
    # Lorentzians convolve to the sum of their half widths.
    expected = coarse_shape((np.zeros(1), np.ones(1)), 0, hwhm_hz=6.5)[0]
    # 1 %: the finite axis cuts the tails of both.
    assert seen[middle] == pytest.approx(expected, rel=0.01)
