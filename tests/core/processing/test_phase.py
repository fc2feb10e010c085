from dataclasses import replace

import numpy as np
import pytest

from known_fid import KnownLine, Setting, made_fid, multiplet
from spinledger.processing.automatic import starting_recipe
from spinledger.processing.automatic_phase import AutomaticPhase, automatic_phase
from spinledger.processing.found_regions import found_regions
from spinledger.processing.phase import linear_phasor, phased, sweep_positions
from spinledger.processing.recipe import transform
from spinledger.values.acquisition import Fid
from spinledger.values.recipe import Phase

LINES = [
    *multiplet(7.3, [8.2, 1.4], area=2.0),
    *multiplet(4.1, [7.1, 7.1, 7.1], area=2.0),
    KnownLine(shift_ppm=2.1, area=3.0),
    *multiplet(1.2, [7.1, 7.1], area=3.0),
]


@pytest.mark.parametrize("n_points", [8, 9, 1000, 65536])
def test_the_phasor_is_the_exponential_at_every_point(n_points: int) -> None:
    found = linear_phasor(n_points, 0.7, -5.1)
    exact = np.exp(1j * (0.7 - 5.1 * sweep_positions(n_points)))
    # Rounding of the two-factor product.
    np.testing.assert_allclose(found, exact, atol=1e-12)


def test_sweep_positions_are_the_frequencies_of_the_transform() -> None:
    descending = np.fft.fftshift(np.fft.fftfreq(64))[::-1]
    np.testing.assert_allclose(sweep_positions(64), descending, atol=1e-15)
    odd = np.fft.fftshift(np.fft.fftfreq(63))[::-1]
    np.testing.assert_allclose(sweep_positions(63), odd, atol=1e-15)


def test_the_pivot_keeps_its_phase() -> None:
    values = np.ones(1000, dtype=np.complex128)
    turned = phased(values, Phase(phase0_deg=20.0, phase1_deg=90.0, pivot=0.25))
    at_pivot = int(np.argmin(np.abs(sweep_positions(1000) - 0.25)))
    # The nearest point is within half a thousandth of the sweep: 0.05 deg.
    assert np.degrees(np.angle(turned[at_pivot])) == pytest.approx(20.0, abs=0.1)


def found_phase(fid: Fid) -> AutomaticPhase:
    transformed = transform(fid, starting_recipe(fid))
    regions = found_regions(transformed, water_at_carrier=False)
    found = automatic_phase(transformed, regions)
    assert found is not None
    return found


@pytest.mark.parametrize(
    ("phase0_deg", "phase1_deg"),
    [(0.0, 0.0), (137.0, -110.0), (-95.0, 300.0), (179.0, -330.0)],
)
def test_a_phase_that_was_put_on_is_found(phase0_deg: float, phase1_deg: float) -> None:
    # Phase on the spectrum is undone by its negative.
    setting = Setting(
        phase0_deg=-phase0_deg, phase1_deg=-phase1_deg, noise_sd=0.02, seed=4
    )
    found = found_phase(made_fid(LINES, setting))
    for line in (LINES[0], LINES[-1]):
        x = (line.shift_ppm - 5.0) * 500.0 / 8000.0
        asked = found.step.phase0_deg + found.step.phase1_deg * x
        miss = (asked - phase0_deg - phase1_deg * x + 180) % 360 - 180
        # S/N of the weakest multiplet is about 150; a degree is what is asked.
        assert abs(miss) < 1.0
    assert found.sd_deg < 3.0
    assert found.doubts == ()


def test_a_bad_shim_does_not_bias_the_phase() -> None:
    # Every line has a foot on one side, all alike, as one shim makes it.
    footed = [
        part
        for line in LINES
        for part in (
            line,
            KnownLine(
                shift_ppm=line.shift_ppm + 1.5 / 500.0,
                area=0.3 * line.area,
                width_hz=2.0,
            ),
        )
    ]
    setting = Setting(phase0_deg=-60.0, noise_sd=0.01)
    found = found_phase(made_fid(footed, setting))
    # A symmetry criterion would miss by the lines' common lean, some 10 deg.
    assert found.step.phase0_deg == pytest.approx(60.0, abs=2.0)


def test_weak_signals_are_said_to_leave_the_phase_open() -> None:
    lines = [KnownLine(shift_ppm=7.0, area=1.0), KnownLine(shift_ppm=1.0, area=1.0)]
    found = found_phase(made_fid(lines, Setting(noise_sd=1.5, seed=2)))
    # S/N of a line: 8000 / pi / 1.3 against 1.5 sqrt(4900) is about 18.
    assert found.sd_deg > 3.0
    assert any("weak" in doubt or "tails" in doubt for doubt in found.doubts)


def test_no_signal_gives_no_phase() -> None:
    fid = made_fid([], Setting(noise_sd=1.0))
    transformed = transform(fid, starting_recipe(fid))
    regions = found_regions(transformed, water_at_carrier=False)
    assert automatic_phase(transformed, regions) is None


def test_huge_water_out_of_phase_does_not_rule() -> None:
    # Water a thousand times the solute, 40 degrees off as suppression leaves it.
    plain = made_fid(LINES, Setting(phase0_deg=-25.0, noise_sd=0.02, carrier_ppm=4.75))
    water = made_fid(
        [KnownLine(shift_ppm=4.75, area=3000.0, width_hz=3.0)],
        Setting(phase0_deg=15.0, carrier_ppm=4.75),
    )
    fid = replace(plain, samples=plain.samples + water.samples)
    transformed = transform(fid, starting_recipe(fid))
    regions = found_regions(transformed, water_at_carrier=True)
    found = automatic_phase(transformed, regions)
    assert found is not None
    # The solute's phase, not the water's -15, over the span of its signals.
    for x in (0.15, -0.25):
        asked = found.step.phase0_deg + found.step.phase1_deg * x
        assert asked == pytest.approx(25.0, abs=5.0)


def test_one_signal_beside_water_is_said_to_leave_the_slope_open() -> None:
    water = KnownLine(shift_ppm=4.75, area=30.0, width_hz=3.0)
    lines = [KnownLine(shift_ppm=2.4, area=4.0), water]
    fid = made_fid(lines, Setting(noise_sd=0.02, carrier_ppm=4.75))
    transformed = transform(fid, starting_recipe(fid))
    regions = found_regions(transformed, water_at_carrier=True)
    found = automatic_phase(transformed, regions)
    assert found is not None
    assert found.sd_deg > 3.0
    assert any("far from the few signals" in doubt for doubt in found.doubts)
