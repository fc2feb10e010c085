import numpy as np
import pytest

from spinledger.lines.deconvolution import NoiseModel, fit_lines

AXIS_HZ = np.arange(0.0, 60.0, 0.15)
CENTRES = np.array([20.0, 27.3, 29.0])
AREAS = np.array([3.0, 1.0, 2.0])
WIDTHS = np.array([1.0, 1.1, 0.9])


def clean() -> np.ndarray:
    half = WIDTHS / 2
    apart = AXIS_HZ[:, None] - CENTRES
    return (AREAS * half / np.pi / (half**2 + apart**2)).sum(axis=1)


def test_overlapping_lines_are_recovered_exactly_without_noise() -> None:
    fit = fit_lines(
        AXIS_HZ, clean(), CENTRES + 0.2, width_hz=1.3, noise=NoiseModel(sd=1e-6)
    )
    # The prior that ties widths together pulls by well under a percent.
    np.testing.assert_allclose(fit.centres_hz, CENTRES, atol=2e-3)
    np.testing.assert_allclose(fit.areas, AREAS, rtol=0.01)
    np.testing.assert_allclose(fit.widths_hz, WIDTHS, rtol=0.02)


def test_sds_are_the_scatter_over_noise() -> None:
    rng = np.random.default_rng(5)
    sd = 0.02
    fits = [
        fit_lines(
            AXIS_HZ,
            clean() + rng.normal(size=AXIS_HZ.size) * sd,
            CENTRES,
            width_hz=1.0,
            noise=NoiseModel(sd=sd),
        )
        for _ in range(150)
    ]
    for values, sds in (
        ("centres_hz", "centre_sds_hz"),
        ("areas", "area_sds"),
    ):
        scatter = np.std([getattr(fit, values) for fit in fits], axis=0)
        said = np.mean([getattr(fit, sds) for fit in fits], axis=0)
        # 150 runs give a scatter to 6 %; the width prior narrows it a little.
        np.testing.assert_allclose(said, scatter, rtol=0.3)


def test_a_line_that_is_not_there_is_dropped() -> None:
    rng = np.random.default_rng(6)
    noise = NoiseModel(sd=0.02)
    fit = fit_lines(
        AXIS_HZ,
        clean() + rng.normal(size=AXIS_HZ.size) * noise.sd,
        np.append(CENTRES, 45.0),
        width_hz=1.0,
        noise=noise,
    )
    np.testing.assert_allclose(fit.centres_hz, CENTRES, atol=0.1)


def test_correlated_noise_raises_the_sds_by_its_root() -> None:
    plain, correlated = (
        fit_lines(
            AXIS_HZ,
            clean(),
            CENTRES,
            width_hz=1.0,
            noise=NoiseModel(sd=0.01, correlation=correlation),
        )
        for correlation in (1.0, 4.0)
    )
    ratio = correlated.centre_sds_hz / plain.centre_sds_hz
    assert ratio == pytest.approx(np.full(3, 2.0), rel=1e-6)
