"""Masks follow the wings of tall lines and stop before signals."""

from collections.abc import Callable

import pytest

from spinledger.reconcile.tails import with_tails
from spinledger.values.evidence import Evidence, Stray

Evidences = Callable[..., Evidence]

WATER = Stray(low_ppm=4.7, high_ppm=4.9, kind="water", why="HOD")


def test_mask_grows_over_a_wing_until_the_noise(make_evidence: Evidences) -> None:
    evidence = make_evidence([(4.8, 500, [])], strays=(WATER,), noise=0.02)
    (stray,) = with_tails(evidence).strays
    # Wing of a Lorentz line of 500 H, half width 0.6 Hz, at distance d Hz:
    # 500 * 0.6 / pi / d^2. It meets five sd of a 7 Hz mean (0.1 / sqrt(15)) at
    # 61 Hz or 0.15 ppm from the centre; noise moves that by some per cent.
    assert stray.high_ppm == pytest.approx(4.8 + 0.152, abs=0.02)
    assert stray.low_ppm == pytest.approx(4.8 - 0.152, abs=0.02)


def test_mask_stops_before_a_signal_on_the_wing(make_evidence: Evidences) -> None:
    evidence = make_evidence(
        [(4.8, 3000, []), (4.55, 1, [])], strays=(WATER,), noise=0.002
    )
    (stray,) = with_tails(evidence).strays
    # The line at 4.55 is 1.2 Hz wide: its flank rises within 0.03 ppm of it.
    assert 4.55 < stray.low_ppm < 4.65


def test_mask_without_a_wing_stays(make_evidence: Evidences) -> None:
    evidence = make_evidence([(2.0, 3, [])], strays=(WATER,), noise=0.05)
    (stray,) = with_tails(evidence).strays
    # Pure noise falls below five sd at the first points.
    assert stray.low_ppm == pytest.approx(4.7, abs=0.005)
    assert stray.high_ppm == pytest.approx(4.9, abs=0.005)
