import numpy as np
import pytest

from spinledger.lines.derivative import (
    complex_second_derivative,
    curvature_magnitude,
    negative_second_derivative,
    points_per_degree,
)

STEP_HZ = 0.1
AXIS_HZ = (np.arange(8192) - 4096) * STEP_HZ


def gauss(sigma_hz: float) -> np.ndarray:
    return np.exp(-0.5 * (AXIS_HZ / sigma_hz) ** 2)


def test_second_derivative_of_a_gauss_line_has_its_closed_form() -> None:
    line_sigma, smoothing = 1.3, 0.7
    found = negative_second_derivative(
        gauss(line_sigma), step_hz=STEP_HZ, sigma_hz=smoothing
    )
    # Gauss of sd s smoothed by Gauss of sd w is Gauss of variance v = s^2 + w^2
    # and area kept; minus its second derivative is (1/v - x^2/v^2) times itself.
    variance = line_sigma**2 + smoothing**2
    smooth = line_sigma / np.sqrt(variance) * np.exp(-0.5 * AXIS_HZ**2 / variance)
    expected = smoothing**2 * (1 / variance - AXIS_HZ**2 / variance**2) * smooth
    np.testing.assert_allclose(found, expected, atol=1e-9)


def test_a_constant_and_the_far_tail_of_a_line_vanish() -> None:
    tail = 1 / (1 + (AXIS_HZ[AXIS_HZ > 150] / 0.5) ** 2)
    assert tail.max() > 1e-5
    found = negative_second_derivative(
        np.full(8192, 7.0), step_hz=STEP_HZ, sigma_hz=0.8
    )
    # Rounding of the transform only.
    np.testing.assert_allclose(found, 0.0, atol=1e-11)


def test_magnitude_does_not_depend_on_the_phase() -> None:
    line = 1 / (1 + 1j * AXIS_HZ / 0.6)
    upright = curvature_magnitude(line, step_hz=STEP_HZ, sigma_hz=0.8)
    turned = curvature_magnitude(line * np.exp(2.1j), step_hz=STEP_HZ, sigma_hz=0.8)
    np.testing.assert_allclose(turned, upright, atol=1e-12)


def test_real_part_of_the_complex_derivative_is_the_real_derivative() -> None:
    line = 1 / (1 + 1j * AXIS_HZ / 0.6)
    both = complex_second_derivative(line, step_hz=STEP_HZ, sigma_hz=0.8)
    alone = negative_second_derivative(line.real, step_hz=STEP_HZ, sigma_hz=0.8)
    np.testing.assert_allclose(both.real, alone, atol=1e-12)


@pytest.mark.parametrize("sigma_hz", [0.45, 2.0, 6.0])
def test_points_per_degree_is_what_the_scatter_of_block_powers_says(
    sigma_hz: float,
) -> None:
    rng = np.random.default_rng(4)
    length = 4096
    powers = [
        np.mean(block**2)
        for _ in range(40)
        for block in negative_second_derivative(
            rng.normal(size=8 * length), step_hz=STEP_HZ, sigma_hz=sigma_hz
        ).reshape(8, length)
    ]
    # The mean square of n degrees of freedom has a relative variance of 2/n.
    degrees = 2 * np.mean(powers) ** 2 / np.var(powers)
    # 320 blocks give the variance to 8 %; 3 sd.
    assert length / degrees == pytest.approx(
        points_per_degree(STEP_HZ, sigma_hz), rel=0.25
    )
