"""Drawn spectra against analytic line shapes and against a made FID."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

from spinledger.spins.synthesis import (
    FrequencyAxis,
    LineList,
    LineShape,
    Treatment,
    add_to,
    draw,
    fid_length_s,
)
from spinledger.values.evidence import LineKernel
from spinledger.values.recipe import Apodize
from spinledger.values.spectrum import Spectrum

Floats = npt.NDArray[np.float64]

AXIS = FrequencyAxis(first_hz=400.0, step_hz=0.2, n_points=2000)


def pseudo_voigt(apart_hz: Floats, width_hz: float, share: float) -> Floats:
    half = width_hz / 2
    lorentz = half / np.pi / (apart_hz**2 + half**2)
    sigma = half / np.sqrt(2 * np.log(2))
    gauss = np.exp(-0.5 * (apart_hz / sigma) ** 2) / sigma / np.sqrt(2 * np.pi)
    return np.asarray((1 - share) * lorentz + share * gauss)


def some_lines(n_lines: int) -> tuple[Floats, Floats]:
    rng = np.random.default_rng(4)
    return rng.uniform(180.0, 220.0, n_lines), rng.uniform(0.0, 1.0, n_lines) / n_lines


# 30 lines are summed one by one, 300 through a grid.
@pytest.mark.parametrize("n_lines", [30, 300])
@pytest.mark.parametrize("share", [None, 0.0, 0.5])
@pytest.mark.parametrize("width_hz", [0.5, 1.0, 3.0])
def test_drawn_lines_have_their_shape(
    n_lines: int, share: float | None, width_hz: float
) -> None:
    frequencies, protons = some_lines(n_lines)
    images = draw(
        LineList(frequencies_hz=frequencies, protons=protons),
        AXIS,
        width_hz=width_hz,
        shape=LineShape(gauss_share=share),
    )
    drawn = np.zeros(AXIS.n_points)
    add_to(drawn, images)
    apart = AXIS.frequencies_hz[:, None] - frequencies[None, :]
    expected = pseudo_voigt(apart, width_hz, share or 0.0) @ protons
    inside = slice(max(images.start, 0), images.start + images.value.size)
    # Ends of the stretch are joined, tails 20 widths out add up: 2e-3.
    np.testing.assert_allclose(
        drawn[inside], expected[inside], atol=2e-3 * expected.max()
    )


def test_drawn_area_is_the_number_of_protons() -> None:
    frequencies, protons = some_lines(40)
    images = draw(
        LineList(frequencies_hz=frequencies, protons=protons),
        AXIS,
        width_hz=1.0,
        shape=LineShape(),
    )
    # The stretch is periodic, so the tails are all in it.
    assert images.value.sum() * AXIS.step_hz == pytest.approx(protons.sum(), rel=1e-9)


@pytest.mark.parametrize("n_lines", [30, 300])
def test_images_are_the_derivatives(n_lines: int) -> None:
    rng = np.random.default_rng(9)
    frequencies, protons = some_lines(n_lines)
    by_frequency = rng.normal(size=(n_lines, 3))
    by_protons = rng.normal(size=(n_lines, 3)) / n_lines
    lines = LineList(
        frequencies_hz=frequencies,
        protons=protons,
        d_frequency=by_frequency,
        d_protons=by_protons,
    )
    images = draw(lines, AXIS, width_hz=1.234, shape=LineShape(gauss_share=0.3))
    assert images.by_parameter is not None
    assert images.by_log_width is not None
    assert images.by_gauss_share is not None

    def drawn(parameter: int, step: float, ratio: float, share: float) -> Floats:
        moved = LineList(
            frequencies_hz=frequencies + step * by_frequency[:, parameter],
            protons=protons + step * by_protons[:, parameter],
        )
        shape = LineShape(gauss_share=share)
        # A fixed stretch: lines moved by 1e-4 Hz do not cross a point.
        return draw(moved, AXIS, width_hz=1.234 * ratio, shape=shape).value

    h = 1e-4
    for k in range(3):
        change = (drawn(k, h, 1.0, 0.3) - drawn(k, -h, 1.0, 0.3)) / (2 * h)
        # The grid's spline is good to 1e-5, which differences of 1e-4 Hz magnify.
        tolerance = 1e-6 if n_lines < 48 else 2e-3
        np.testing.assert_allclose(
            images.by_parameter[k], change, atol=tolerance * np.abs(change).max()
        )
    # Same number of points in the stretch at both widths is needed here.
    wide, narrow = drawn(0, 0, np.exp(1e-6), 0.3), drawn(0, 0, np.exp(-1e-6), 0.3)
    np.testing.assert_allclose(
        images.by_log_width, (wide - narrow) / 2e-6, atol=1e-4 * wide.max()
    )
    change = (drawn(0, 0, 1.0, 0.31) - drawn(0, 0, 1.0, 0.29)) / 0.02
    np.testing.assert_allclose(
        images.by_gauss_share, change, atol=1e-9 * np.abs(change).max()
    )


def test_kernel_offsets_point_to_higher_frequency() -> None:
    kernel = LineKernel(
        offsets_hz=np.array([-1.0, 0.0, 1.4]),
        weights=np.array([0.2, 0.5, 0.3]),
        width_hz=1.0,
    )
    images = draw(
        LineList(frequencies_hz=np.array([200.0]), protons=np.ones(1)),
        AXIS,
        width_hz=1.0,
        shape=LineShape(kernel=kernel),
    )
    drawn = np.zeros(AXIS.n_points)
    add_to(drawn, images)
    apart = AXIS.frequencies_hz - 200.0
    expected = sum(
        weight * pseudo_voigt(apart - offset, 1.0, 0.0)
        for offset, weight in zip(kernel.offsets_hz, kernel.weights, strict=True)
    )
    inside = slice(images.start, images.start + images.value.size)
    np.testing.assert_allclose(drawn[inside], expected[inside], atol=2e-3 * drawn.max())


def made_spectrum(
    frequencies: Floats,
    *,
    width_hz: float,
    n_samples: int,
    window: Floats,
    noise: Floats | None = None,
) -> Spectrum:
    """Absorption spectrum of a FID with a window, filled with zeros."""
    sweep_hz, n_points = 400.0, 8192
    times = np.arange(n_samples) / sweep_hz
    fid = np.exp(2j * np.pi * np.outer(times, frequencies - 200.0)).sum(axis=1)
    fid *= np.exp(-np.pi * width_hz * times) * window
    fid[0] *= 0.5
    if noise is not None:
        fid += noise
    filled = np.zeros(n_points, dtype=complex)
    filled[:n_samples] = fid
    ascending = np.fft.fftshift(np.fft.fft(filled))
    return Spectrum(
        intensities=ascending.real[::-1] * 2 / sweep_hz,
        imaginary=ascending.imag[::-1] * 2 / sweep_hz,
        first_point_ppm=200.0 + (0.5 - 1 / n_points) * sweep_hz,
        spectral_width_hz=sweep_hz,
        spectrometer_frequency_mhz=1.0,
    )


@pytest.mark.parametrize("kind", ["none", "gaussian", "sine_bell"])
def test_truncation_and_window_of_the_fid_are_in_the_model(kind: str) -> None:
    n_samples, width_hz = 800, 0.7
    times = np.arange(n_samples) / 400.0
    windows = {
        "none": np.ones(n_samples),
        "gaussian": np.exp(-((np.pi * 0.8 * times) ** 2) / (4 * np.log(2))),
        "sine_bell": np.sin(np.pi / 2 + np.pi / 2 * times / times[-1]),
    }
    step = {
        "none": Apodize(kind="none"),
        "gaussian": Apodize(kind="gaussian", gaussian_hz=0.8),
        "sine_bell": Apodize(kind="sine_bell", sine_offset_deg=90.0),
    }[kind]
    frequencies = np.array([190.3, 201.17, 207.0])
    spectrum = made_spectrum(
        frequencies, width_hz=width_hz, n_samples=n_samples, window=windows[kind]
    )
    images = draw(
        LineList(frequencies_hz=frequencies, protons=np.ones(3)),
        FrequencyAxis.of(spectrum),
        width_hz=width_hz,
        shape=LineShape(treatment=Treatment(window=step, length_s=times[-1])),
        pad_hz=150.0,
    )
    drawn = np.zeros(spectrum.n_points)
    add_to(drawn, images)
    near = slice(images.start, images.start + images.value.size)
    # The sum over samples against the integral over time differs by 1 / sweep.
    np.testing.assert_allclose(
        drawn[near], spectrum.intensities[near], atol=5e-3 * drawn.max()
    )


def test_length_of_a_zero_filled_fid_is_found_in_its_spectrum() -> None:
    rng = np.random.default_rng(1)
    spectrum = made_spectrum(
        np.array([150.0, 200.0]),
        width_hz=0.7,
        n_samples=3000,
        window=np.ones(3000),
        noise=0.02 * rng.normal(size=3000),
    )
    # 512 blocks of 16 points of 1/400 s: 0.04 s.
    assert fid_length_s(spectrum) == pytest.approx(3000 / 400.0, abs=0.05)


def test_length_is_unknown_without_dispersive_part() -> None:
    spectrum = Spectrum(
        intensities=np.ones(64),
        first_point_ppm=10.0,
        spectral_width_hz=100.0,
        spectrometer_frequency_mhz=100.0,
    )
    assert fid_length_s(spectrum) is None
