import numpy as np
import pytest

from known_fid import KnownLine, Setting, made_fid
from spinledger.processing.recipe import run_recipe
from spinledger.processing.transform import apodization_window, fourier_transform
from spinledger.values.recipe import (
    Apodize,
    FourierTransform,
    Recipe,
    Reference,
    RemoveDelay,
    ZeroFill,
)

N_POINTS = 32768


def plain_recipe(*, delay_points: float = 0.0, halve: bool = True) -> Recipe:
    return Recipe(
        steps=(
            RemoveDelay(group_delay_points=delay_points),
            ZeroFill(n_points=N_POINTS),
            FourierTransform(halve_first_point=halve),
        )
    )


def test_a_decaying_exponential_becomes_the_lorentz_line_of_its_closed_form() -> None:
    line = KnownLine(shift_ppm=6.2, area=2.0, width_hz=4.0)
    fid = made_fid([line])
    spectrum = run_recipe(fid, plain_recipe())
    assert spectrum.imaginary is not None
    offset_hz = (spectrum.shifts_ppm - line.shift_ppm) * 500.0
    # Integral of A exp(-(pi w + 2 pi i f) t) dt times the sampling rate.
    exact = line.area * 8000.0 / (np.pi * line.width_hz + 2j * np.pi * offset_hz)
    found = spectrum.intensities + 1j * spectrum.imaginary
    near = np.abs(offset_hz) < 400
    # Sampling folds the far tails in: 1e-3 of the top at most this near.
    np.testing.assert_allclose(found[near], exact[near], atol=2e-3 * exact.real.max())


def test_a_line_above_the_carrier_stands_at_the_higher_shift() -> None:
    spectrum = run_recipe(made_fid([KnownLine(shift_ppm=9.0)]), plain_recipe())
    top = int(np.argmax(spectrum.intensities))
    # Points are 8000 / 32768 / 500 = 0.0005 ppm apart.
    assert spectrum.shifts_ppm[top] == pytest.approx(9.0, abs=0.0005)
    assert spectrum.shifts_ppm[0] > spectrum.shifts_ppm[-1]


@pytest.mark.parametrize("n_points", [20000, 20001])
def test_the_axis_fits_even_and_odd_numbers_of_points(n_points: int) -> None:
    fid = made_fid([KnownLine(shift_ppm=2.5)])
    recipe = Recipe(
        steps=(
            ZeroFill(n_points=n_points),
            FourierTransform(halve_first_point=True),
        )
    )
    spectrum = run_recipe(fid, recipe)
    tallest = spectrum.intensities.argmax()
    left, mid, right = spectrum.intensities[tallest - 1 : tallest + 2]
    fine = tallest + 0.5 * (left - right) / (left - 2 * mid + right)
    # A parabola on a line of 1 Hz sampled at 0.4 Hz is good to 0.03 Hz.
    assert spectrum.first_point_ppm - fine * spectrum.step_ppm == pytest.approx(
        2.5, abs=6e-5
    )


@pytest.mark.parametrize("delay_points", [68.0, 67.984])
def test_a_digital_filter_delay_is_taken_out_with_its_fraction(
    delay_points: float,
) -> None:
    line = KnownLine(shift_ppm=7.7, width_hz=4.0)
    setting = Setting(delay_points=delay_points)
    recipe = plain_recipe(delay_points=delay_points, halve=False)
    delayed = run_recipe(made_fid([line], setting), recipe)
    prompt = run_recipe(made_fid([line]), plain_recipe())
    top = int(np.argmax(prompt.intensities))
    near = slice(top - 40, top + 40)
    assert delayed.imaginary is not None
    assert prompt.imaginary is not None
    # A delayed start leaves the first sample whole: a constant of up to half a
    # sample, 1 in 640 of the top here.
    scale = prompt.intensities[top]
    np.testing.assert_allclose(
        delayed.intensities[near], prompt.intensities[near], atol=2e-3 * scale
    )
    np.testing.assert_allclose(
        delayed.imaginary[near], prompt.imaginary[near], atol=2e-3 * scale
    )


@pytest.mark.parametrize(
    ("step", "added_hz"),
    [
        (Apodize(kind="exponential", line_broadening_hz=1.5), 1.5),
        (Apodize(kind="none"), 0.0),
    ],
)
def test_exponential_windows_add_their_width(step: Apodize, added_hz: float) -> None:
    width = 2.0
    recipe = Recipe(steps=(step, *plain_recipe().steps))
    spectrum = run_recipe(made_fid([KnownLine(shift_ppm=5.5, width_hz=width)]), recipe)
    # Half-height crossings of a line sampled every 0.24 Hz, interpolated.
    assert full_width(spectrum) == pytest.approx(width + added_hz, rel=0.01)


def test_a_gaussian_window_on_a_sharp_line_gives_a_gauss_line_of_its_width() -> None:
    step = Apodize(kind="gaussian", gaussian_hz=6.0)
    recipe = Recipe(steps=(step, *plain_recipe().steps))
    fid = made_fid([KnownLine(shift_ppm=5.5, width_hz=0.01)])
    assert full_width(run_recipe(fid, recipe)) == pytest.approx(6.0, rel=0.01)


def test_lorentz_to_gauss_turns_a_lorentz_line_into_a_gauss_line() -> None:
    step = Apodize(kind="lorentz_to_gauss", line_broadening_hz=-3.0, gaussian_hz=4.0)
    recipe = Recipe(steps=(step, *plain_recipe().steps))
    spectrum = run_recipe(made_fid([KnownLine(shift_ppm=5.5, width_hz=3.0)]), recipe)
    offset_hz = (spectrum.shifts_ppm - 5.5) * 500.0
    gauss = np.exp(-4 * np.log(2) * (offset_hz / 4.0) ** 2)
    top = spectrum.intensities.max()
    near = np.abs(offset_hz) < 8
    np.testing.assert_allclose(spectrum.intensities[near] / top, gauss[near], atol=0.01)


def full_width(spectrum) -> float:
    half = spectrum.intensities.max() / 2
    above = np.flatnonzero(spectrum.intensities > half)
    first, last = above[0], above[-1]
    y = spectrum.intensities
    left = first - (y[first] - half) / (y[first] - y[first - 1])
    right = last + (y[last] - half) / (y[last] - y[last + 1])
    return float((right - left) * spectrum.step_hz)


def test_a_sine_bell_starts_at_its_offset_and_ends_at_zero() -> None:
    times = np.linspace(0.0, 2.0, 5)
    step = Apodize(kind="sine_bell", sine_offset_deg=90.0, sine_power=2.0)
    window = apodization_window(step, times, length_s=2.0)
    np.testing.assert_allclose(
        window, np.cos(np.pi / 4 * np.array([0, 0.5, 1, 1.5, 2])) ** 2, atol=1e-12
    )


def test_windows_are_held_before_the_end_of_the_delay() -> None:
    step = Apodize(kind="exponential", line_broadening_hz=5.0)
    window = apodization_window(step, np.array([-0.1, 0.0, 0.1]), length_s=0.1)
    assert window[0] == window[1] == 1.0
    assert window[2] == pytest.approx(np.exp(-0.5 * np.pi))


def test_an_unknown_window_is_named() -> None:
    step = Apodize(kind="hamming")  # type: ignore[arg-type]  # the fault under test
    with pytest.raises(ValueError, match="unknown window 'hamming'"):
        apodization_window(step, np.zeros(3), length_s=1.0)


def test_halving_the_first_point_takes_half_a_sample_off_everywhere() -> None:
    samples = np.array([2.0 + 1j, 0.5, -0.25j, 0.125], dtype=np.complex128)
    whole = fourier_transform(samples, n_points=8, halve_first_point=False)
    halved = fourier_transform(samples, n_points=8, halve_first_point=True)
    np.testing.assert_allclose(whole - halved, 1.0 + 0.5j, atol=1e-15)


def test_a_reference_moves_the_axis_only() -> None:
    fid = made_fid([KnownLine(shift_ppm=5.5)])
    plain = run_recipe(fid, plain_recipe())
    moved = run_recipe(
        fid,
        Recipe(
            steps=(
                *plain_recipe().steps,
                Reference(offset_ppm=-0.12, by="user", sd_ppm=0.001),
            )
        ),
    )
    np.testing.assert_array_equal(moved.intensities, plain.intensities)
    assert moved.first_point_ppm - plain.first_point_ppm == pytest.approx(-0.12)
