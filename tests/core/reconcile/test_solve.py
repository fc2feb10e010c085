"""From claims to a booked fit on synthetic spectra whose answer is known."""

from collections.abc import Callable
from dataclasses import replace

import pytest

from spinledger.reconcile.entries import book_entries
from spinledger.reconcile.solve import Limits, solve
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence, Signal, Stray

Evidences = Callable[..., Evidence]
Claims = Callable[..., ClaimSet]


def with_signals(evidence: Evidence, *ranges: tuple[float, float]) -> Evidence:
    signals = tuple(
        Signal(low_ppm=low, high_ppm=high, area=1.0, area_sd=0.01, lines=())
        for low, high in ranges
    )
    return replace(evidence, signals=signals)


def test_ethyl_group_is_booked_with_shift_coupling_and_integral(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    evidence = with_signals(
        make_evidence([(4.12, 2, [(3, 7.13)]), (1.26, 3, [(2, 7.13)]), (2.04, 3, [])]),
        (4.05, 4.2),
        (1.2, 1.32),
        (2.0, 2.08),
    )
    claims = make_claims(
        [("CH2", 4.0, 0.2, 2), ("CH3", 1.2, 0.2, 3), ("Ac", 2.1, 0.2, 3)],
        [(0, 1, 6.5)],
    )
    solution = solve(evidence, claims)
    assert solution is not None
    booking = book_entries(evidence, solution)
    ethyl, methyl, acetyl = booking.entries
    assert [entry.state for entry in booking.entries] == ["settled"] * 3
    # The spectrum is drawn first order; at 1144 Hz distance second-order shifts
    # are J^2 / 2 / 1144 = 0.02 Hz, far below 0.001 ppm (0.4 Hz).
    assert ethyl.shift_ppm == pytest.approx(4.12, abs=0.001)
    assert methyl.shift_ppm == pytest.approx(1.26, abs=0.001)
    assert [one.j_hz for one in ethyl.couplings] == pytest.approx([7.13], abs=0.05)
    assert [one.partner for one in methyl.couplings] == ["CH2"]
    assert (ethyl.multiplicity, methyl.multiplicity, acetyl.multiplicity) == (
        "q",
        "t",
        "s",
    )
    # Noise 0.002 against peaks near 1 and full tails: 2 % covers the baseline.
    assert ethyl.integral_protons == pytest.approx(2.0, rel=0.02)
    assert booking.balance.claimed == 8.0
    assert booking.balance.found == pytest.approx(8.0, rel=0.02)


def test_claim_without_a_signal_is_open_with_a_sentence(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    evidence = with_signals(
        make_evidence([(3.6, 3, []), (1.2, 9, [])]), (3.55, 3.65), (1.15, 1.25)
    )
    claims = make_claims(
        [("OMe", 3.6, 0.1, 3), ("tBu", 1.2, 0.1, 9), ("CHO", 9.8, 0.1, 1)]
    )
    solution = solve(evidence, claims)
    assert solution is not None
    lost = book_entries(evidence, solution).entries[2]
    assert lost.state == "open"
    assert lost.shift_ppm is None
    assert "nothing of that shape lies between" in lost.reasons[0]


def test_hidden_claim_is_silent_and_says_where(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    water = Stray(low_ppm=4.6, high_ppm=5.0, kind="water", why="HOD")
    evidence = with_signals(
        make_evidence([(4.8, 300, []), (3.3, 2, []), (1.2, 3, [])], strays=(water,)),
        (3.25, 3.35),
        (1.15, 1.25),
    )
    claims = make_claims(
        [("CHOH", 4.78, 0.1, 1), ("A", 3.3, 0.2, 2), ("B", 1.2, 0.2, 3)]
    )
    solution = solve(evidence, claims)
    assert solution is not None
    booking = book_entries(evidence, solution)
    hidden = booking.entries[0]
    assert hidden.state == "silent"
    assert "water" in hidden.why
    # A hidden claim stands on neither side of the balance.
    assert booking.balance.claimed == 5.0


def test_two_alike_claims_are_interchangeable_with_even_odds(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    evidence = with_signals(
        make_evidence([(3.0, 3, []), (2.8, 3, []), (7.0, 2, [])]),
        (2.95, 3.05),
        (2.75, 2.85),
        (6.95, 7.05),
    )
    claims = make_claims(
        [("NMe-A", 2.9, 0.15, 3), ("NMe-B", 2.9, 0.15, 3), ("Ar", 7.0, 0.1, 2)]
    )
    solution = solve(evidence, claims)
    assert solution is not None
    group = book_entries(evidence, solution).entries[0].group
    assert group is not None
    assert (group.kind, group.partners) == ("interchangeable", ("NMe-B",))
    # Equal predictions: the residuals differ only by the fitted digits.
    assert group.odds == pytest.approx(0.5, abs=0.01)


def test_time_that_ran_out_is_said(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    evidence = with_signals(
        make_evidence([(3.0, 1, [(1, 9.0)]), (3.4, 1, [(1, 9.0)]), (3.7, 2, [])]),
        (2.9, 3.8),
    )
    claims = make_claims(
        [("A", 3.3, 0.3, 1), ("B", 3.3, 0.3, 1), ("C", 3.4, 0.3, 2)], [(0, 1, 5.0)]
    )
    solution = solve(evidence, claims, limits=Limits(deadline_s=0.0))
    assert solution is not None
    assert not solution.is_complete
