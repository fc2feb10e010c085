"""Finding the order of coupled claims from their splittings alone."""

from collections.abc import Callable, Sequence

import numpy as np
import pytest

from spinledger.reconcile.closeup import CloseUp, close_up
from spinledger.reconcile.rearrange import rearranged, shifted
from spinledger.spins.network import ClaimNetwork
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence, Stray

Evidences = Callable[..., Evidence]
Claims = Callable[..., ClaimSet]

# A chain of five CH whose J tell their order; every shift is predicted alike.
PLACES_PPM = (4.1, 3.7, 3.3, 2.9, 2.5)
COUPLINGS_HZ = (9.0, 3.0, 10.5, 6.0)


def _close(evidence: Evidence, claims: ClaimSet) -> CloseUp:
    return close_up(
        evidence,
        ClaimNetwork(claims),
        np.array([one.j_hz for one in claims.couplings]),
        offset_ppm=0.0,
        line_width_hz=1.2,
    )


def _chain(make_evidence: Evidences, strays: tuple[Stray, ...] = ()) -> Evidence:
    rows = []
    for number, place in enumerate(PLACES_PPM):
        near = COUPLINGS_HZ[max(number - 1, 0) : number + 1]
        rows.append((place, 1, [(1, j) for j in near]))
    return make_evidence(rows, strays=strays)


def _claims(make_claims: Claims, shifts: Sequence[float], sd: float) -> ClaimSet:
    return make_claims(
        [(name, shift, sd, 1) for name, shift in zip("ABCDE", shifts, strict=True)],
        [(k, k + 1, j) for k, j in enumerate(COUPLINGS_HZ)],
    )


@pytest.mark.parametrize("order", [(1, 2, 3, 4, 0), (4, 3, 2, 1, 0), (2, 0, 1, 4, 3)])
def test_splittings_alone_put_a_chain_in_order(
    make_evidence: Evidences, make_claims: Claims, order: tuple[int, ...]
) -> None:
    close = _close(_chain(make_evidence), _claims(make_claims, [3.3] * 5, 0.6))
    start = np.array([PLACES_PPM[k] for k in order])
    found = rearranged(
        close, [close.places_of(start, frozenset())], is_over=lambda: False
    )
    best = close.shifts_of(found[0].places, start)
    # Half a grid step of 1 Hz, and 1 Hz for second order at 160 Hz distance
    # (J^2 / 2 / 160 is 0.3 Hz).
    assert best == pytest.approx(PLACES_PPM, abs=0.004)


def test_a_member_leaves_a_wrong_place_for_an_empty_signal(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    close = _close(_chain(make_evidence), _claims(make_claims, [3.3] * 5, 0.6))
    start = np.array([4.1, 3.7, 3.3, 2.9, 2.72])
    found = rearranged(
        close, [close.places_of(start, frozenset())], is_over=lambda: False
    )
    best = close.shifts_of(found[0].places, start)
    assert best == pytest.approx(PLACES_PPM, abs=0.004)


def test_nothing_is_moved_under_a_mask(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    water = Stray(low_ppm=4.6, high_ppm=5.0, kind="water", why="HOD")
    evidence = _chain(make_evidence, strays=(water,))
    # One claim more than there are signals would vanish under the mask.
    claims = make_claims(
        [(name, 3.6, 0.6, 1) for name in "ABCDEF"],
        [(k, k + 1, j) for k, j in enumerate(COUPLINGS_HZ)],
    )
    close = _close(evidence, claims)
    start = np.array([*PLACES_PPM, 3.5])
    found = rearranged(
        close, [close.places_of(start, frozenset())], is_over=lambda: False
    )
    for one in found:
        shifts = close.shifts_of(one.places, start)
        assert not ((shifts > 4.6) & (shifts < 5.0)).any()


def test_time_that_is_over_stops_after_the_first_start(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    close = _close(_chain(make_evidence), _claims(make_claims, [3.3] * 5, 0.6))
    start = close.places_of(np.array(PLACES_PPM), frozenset())
    assert rearranged(close, [start], is_over=lambda: True) == ()


def test_absent_members_stay_absent_and_cost_their_skip(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    claims = make_claims(
        [("A", 3.6, 0.2, 2), ("OH", 5.0, 1.0, 1)], optional=frozenset({"OH"})
    )
    close = _close(make_evidence([(3.7, 2, [])]), claims)
    places = close.places_of(np.array([3.7, 5.0]), frozenset({1}))
    drawn = close.arrange(places, close.plan(places))
    member = close.search.members.index(1)
    assert drawn.places[member] < 0
    assert drawn.images[member].max() == 0.0


def test_drawn_area_is_the_protons_of_a_claim(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    evidence = make_evidence([(4.1, 2, [(3, 7.0)]), (1.2, 3, [(2, 7.0)])], noise=1e-6)
    claims = make_claims([("CH2", 4.1, 0.2, 2), ("CH3", 1.2, 0.2, 3)], [(0, 1, 7.0)])
    close = _close(evidence, claims)
    places = close.places_of(np.array([4.1, 1.2]), frozenset())
    drawn = close.arrange(places, close.plan(places))
    areas = drawn.images.sum(axis=1) * close.search.coarse.step_hz
    wanted = [claims.claims[i].n_protons for i in close.search.members]
    # Tails of a Lorentzian of 3.6 Hz beyond 1.5 ppm of room hold below 1 %.
    assert areas == pytest.approx(wanted, rel=0.01)
    # Areas of the synthetic lines are 1 a proton.
    assert drawn.common == pytest.approx(1.0, rel=0.02)


def test_shifted_row_brings_zeros_behind_it() -> None:
    row = np.array([1.0, 2.0, 3.0, 4.0])
    assert shifted(row, 1).tolist() == [0.0, 1.0, 2.0, 3.0]
    assert shifted(row, -2).tolist() == [3.0, 4.0, 0.0, 0.0]
    assert shifted(row, 0).tolist() == row.tolist()
