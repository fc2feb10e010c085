import numpy as np
import pytest
import scipy.fft

from spinledger.lines.noise import noise_sd, quiet_correlation, quiet_rms

N_FID, WIDTH_HZ, BROADENING_HZ = 16384, 9600.0, 0.3


def noise_spectrum(n_points: int, broadening_hz: float, seed: int) -> np.ndarray:
    """Transform of windowed unit noise; its exact sd is sqrt(sum of the window^2)."""
    rng = np.random.default_rng(seed)
    window = np.exp(-np.pi * broadening_hz * np.arange(N_FID) / WIDTH_HZ)
    samples = (rng.normal(size=N_FID) + 1j * rng.normal(size=N_FID)) * window
    return scipy.fft.fftshift(scipy.fft.fft(samples, n_points)) / np.sqrt(
        np.sum(window**2)
    )


@pytest.mark.parametrize("n_points", [16384, 32768, 65536])
def test_noise_sd_of_a_zero_filled_spectrum_is_that_of_the_window(
    n_points: int,
) -> None:
    found = np.mean(
        [noise_sd(noise_spectrum(n_points, BROADENING_HZ, k).real) for k in range(6)]
    )
    # A tenth of 64 blocks estimates the sd to 3 %; six of them to 1.5 %, 3 sd.
    assert found == pytest.approx(1.0, abs=0.045)


def test_noise_sd_of_a_complex_spectrum_is_that_of_one_channel() -> None:
    assert noise_sd(noise_spectrum(32768, 0.0, 3)) == pytest.approx(1.0, abs=0.06)


def test_noise_sd_ignores_signals_and_a_rolling_baseline() -> None:
    trace = noise_spectrum(32768, BROADENING_HZ, 5).real
    x = np.arange(trace.size)
    rolled = trace + 40 * np.sin(x / 9000.0)
    for place in range(3000, 30000, 1500):
        rolled = rolled + 5000 / (1 + ((x - place) / 3.0) ** 2)
    # Half of the blocks hold a line whose tails rise over the noise.
    assert noise_sd(rolled) == pytest.approx(noise_sd(trace), rel=0.15)


def test_quiet_rms_of_smoothed_noise_is_free_of_the_low_quantile_bias() -> None:
    rng = np.random.default_rng(11)
    covered = 40
    kernel = np.full(covered, covered**-0.5)
    values = [
        quiet_rms(
            np.convolve(rng.normal(size=65536), kernel, mode="same"),
            # A boxcar of n points has n sum rho^2 = 2 n / 3 points a degree.
            points_per_degree=2 * covered / 3,
        )
        for _ in range(8)
    ]
    # Without the correction the 10 % quantile reads 0.8.
    assert np.mean(values) == pytest.approx(1.0, abs=0.05)


def test_correlation_is_one_for_twofold_zero_filling_without_window() -> None:
    # The real part of a twofold zero-filled transform has independent points.
    assert quiet_correlation(noise_spectrum(32768, 0.0, 7).real) == pytest.approx(
        1.0, abs=0.15
    )


def test_correlation_of_fourfold_zero_filling_is_two() -> None:
    # Lags 2, 4, ... vanish; the sum over lags of the sinc-like rest is 2.
    assert quiet_correlation(noise_spectrum(65536, 0.0, 9).real) == pytest.approx(
        2.0, abs=0.5
    )
