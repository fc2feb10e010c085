import numpy as np
import pytest

from spinledger.lines.kernel import learn_kernel

AXIS_HZ = np.arange(-14.0, 14.0, 0.1)
OFFSETS, WEIGHTS, WIDTH_HZ = np.array([-0.6, 0.0, 0.8]), np.array([0.3, 0.5, 0.2]), 0.9


def shimmed(noise: float) -> np.ndarray:
    """A singlet in a field of three steps, tallest point near 1."""
    half = WIDTH_HZ / 2
    lines = half**2 / (half**2 + (AXIS_HZ[:, None] - OFFSETS) ** 2)
    rng = np.random.default_rng(1)
    return lines @ WEIGHTS + rng.normal(size=AXIS_HZ.size) * noise


def test_a_known_field_distribution_is_recovered() -> None:
    kernel = learn_kernel(AXIS_HZ, shimmed(3e-4), noise_sd=3e-4, has_silicon=False)
    assert kernel is not None
    assert kernel.weights.sum() == pytest.approx(1.0, abs=1e-12)
    # The centre of gravity is the origin; the spread is that of the field.
    assert kernel.weights @ kernel.offsets_hz == pytest.approx(0.0, abs=1e-12)
    mean = WEIGHTS @ OFFSETS
    spread = np.sqrt(WEIGHTS @ (OFFSETS - mean) ** 2)
    # Offsets of 0.2 Hz and widths of 0.2 Hz share it between them.
    found = np.sqrt(kernel.weights @ kernel.offsets_hz**2)
    assert found == pytest.approx(spread, abs=0.12)
    assert kernel.width_hz == pytest.approx(WIDTH_HZ, abs=0.21)


def test_no_kernel_from_a_weak_singlet() -> None:
    # S/N 100, under the 500 that a kernel must have.
    assert (
        learn_kernel(AXIS_HZ, shimmed(0.01), noise_sd=0.01, has_silicon=False) is None
    )


def test_no_kernel_where_another_line_stands_beside() -> None:
    doublet = shimmed(3e-4) + np.roll(shimmed(3e-4), 60)
    assert learn_kernel(AXIS_HZ, doublet, noise_sd=3e-4, has_silicon=False) is None
