import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import voigt_profile

from spinledger.lines.shapes import gaussian, lorentzian, pseudo_voigt, share_within


@pytest.mark.parametrize("share", [0.0, 0.4, 1.0])
def test_shapes_hold_unit_area_and_their_width(share: float) -> None:
    width = 1.7

    def shape(x: float) -> float:
        return float(pseudo_voigt(np.array([x]), width, share)[0])

    inner = quad(shape, -500, 500, points=[-1, 0, 1], limit=400)[0]
    # Lorentz tails beyond 500 Hz hold 2 atan tail = width / (500 pi).
    tails = share * width / (500 * np.pi)
    assert inner + tails == pytest.approx(1.0, abs=1e-5)
    assert shape(width / 2) / shape(0.0) == pytest.approx(0.5, abs=1e-12)


def test_lorentz_and_gauss_are_the_limits_of_the_voigt_profile() -> None:
    x = np.linspace(-5, 5, 101)
    width = 1.2
    sigma = width / np.sqrt(8 * np.log(2))
    np.testing.assert_allclose(
        lorentzian(x, width), voigt_profile(x, 0.0, width / 2), rtol=1e-12
    )
    np.testing.assert_allclose(
        gaussian(x, width), voigt_profile(x, sigma, 0.0), rtol=1e-10, atol=1e-300
    )


def test_share_within_is_the_integral_over_the_range() -> None:
    low, high, centre, width = -3.0, 7.0, 1.0, 2.2
    expected = quad(
        lambda x: float(lorentzian(np.array([x - centre]), width)[0]), low, high
    )[0]
    assert float(share_within(low, high, centre, width)) == pytest.approx(
        expected, abs=1e-10
    )
