import numpy as np
import pytest

from known_fid import made_spectrum
from spinledger.processing.baseline import baseline_of
from spinledger.values.recipe import Baseline
from spinledger.values.spectrum import Spectrum

N_POINTS = 65536
X = np.linspace(-0.5, 0.5, N_POINTS)
ROLL = 3.0 + 20 * X + 8 * np.cos(2 * np.pi * 1.3 * X)
SIGNAL_PPM = 6.0


def with_signal(*, noise: float = 1.0, height: float = 5000.0) -> Spectrum:
    rng = np.random.default_rng(1)
    plain = made_spectrum(ROLL + noise * rng.normal(size=N_POINTS))
    apart_hz = (plain.shifts_ppm - SIGNAL_PPM) * 500.0
    return made_spectrum(plain.intensities + height / (1 + (apart_hz / 0.6) ** 2))


def test_a_known_roll_under_a_masked_signal_is_recovered() -> None:
    step = Baseline(method="whittaker", masked_ppm=((5.9, 6.1),))
    found = baseline_of(with_signal(), step)
    # Noise 1 averaged over the smoother's reach of some 4000 points.
    np.testing.assert_allclose(found[1000:-1000], ROLL[1000:-1000], atol=0.4)


def test_a_missed_signal_does_not_lift_the_baseline() -> None:
    found = baseline_of(with_signal(height=300.0), Baseline(method="whittaker"))
    near = np.abs(np.arange(N_POINTS) - with_signal().index_of_ppm(SIGNAL_PPM)) < 2000
    np.testing.assert_allclose(found[near], ROLL[near], atol=0.5)


def test_a_broad_hump_is_left_standing() -> None:
    plain = with_signal(height=0.0)
    apart_hz = (plain.shifts_ppm - 8.0) * 500.0
    hump = 20 * np.exp(-0.5 * (apart_hz / 40.0) ** 2)
    spectrum = made_spectrum(plain.intensities + hump)
    found = baseline_of(spectrum, Baseline(method="whittaker"))
    centre = spectrum.index_of_ppm(8.0)
    # A hump of 94 Hz width keeps nine tenths of its height.
    assert found[centre] - ROLL[centre] == pytest.approx(0.0, abs=2.0)


def test_method_none_is_zero() -> None:
    assert not baseline_of(with_signal(), Baseline(method="none")).any()


def test_an_all_masked_or_empty_spectrum_has_no_baseline() -> None:
    everything = Baseline(method="whittaker", masked_ppm=((-100.0, 100.0),))
    assert not baseline_of(with_signal(), everything).any()
    assert not baseline_of(
        made_spectrum(np.zeros(4096)), Baseline(method="whittaker")
    ).any()


def test_an_unknown_method_is_named() -> None:
    step = Baseline(method="spline")  # type: ignore[arg-type]  # the fault under test
    with pytest.raises(ValueError, match="unknown baseline 'spline'"):
        baseline_of(with_signal(), step)
