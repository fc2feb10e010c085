import numpy as np
import pytest

from spinledger.lines.picking import pick_lines, pick_weak_lines

STEP_HZ = 0.15
N_POINTS = 32768


def trace_of(
    lines: list[tuple[float, float]], *, width_hz: float = 1.0, noise: float = 0.0
) -> np.ndarray:
    """Lorentz lines of given (fractional point, height), and white noise."""
    points = np.arange(N_POINTS)
    total = np.random.default_rng(2).normal(size=N_POINTS) * noise
    for point, height in lines:
        total += height / (1 + ((points - point) * STEP_HZ / (width_hz / 2)) ** 2)
    return total


@pytest.mark.parametrize("fraction", [0.0, 0.17, 0.5, 0.83])
def test_a_line_is_placed_between_points(fraction: float) -> None:
    picks = pick_lines(trace_of([(9000 + fraction, 1.0)], noise=1e-4), step_hz=STEP_HZ)
    assert picks.points.size == 1
    # The parabola on a line sampled 7 times a width is good to a few 0.001 points.
    assert picks.points[0] == pytest.approx(9000 + fraction, abs=0.01)


def test_the_outer_lines_of_a_septet_are_picked() -> None:
    spacing = 6.9 / STEP_HZ
    heights = [1, 6, 15, 20, 15, 6, 1]
    lines = [(12000 + (k - 3) * spacing, h) for k, h in enumerate(heights)]
    picks = pick_lines(trace_of(lines, noise=0.02), step_hz=STEP_HZ)
    np.testing.assert_allclose(picks.points, [p for p, _ in lines], atol=0.6)


def test_a_weak_line_beside_a_giant_is_picked() -> None:
    picks = pick_lines(
        trace_of([(8000, 1e4), (8000 + 25 / STEP_HZ, 1.0)], noise=0.01),
        step_hz=STEP_HZ,
    )
    # 25 Hz away the giant's foot is as high as the line itself.
    np.testing.assert_allclose(picks.points, [8000, 8000 + 25 / STEP_HZ], atol=0.3)


def test_of_two_maxima_closer_than_the_least_distance_the_taller_stays() -> None:
    lines = [(9000, 1.0), (9000 + 0.75 / STEP_HZ, 0.8)]
    trace = trace_of(lines, width_hz=0.4, noise=0.003)
    apart = pick_lines(trace, step_hz=STEP_HZ, sigma_hz=0.25)
    assert apart.points.size == 2
    picks = pick_lines(trace, step_hz=STEP_HZ, sigma_hz=0.25, least_distance_hz=0.9)
    assert picks.points.size == 1
    assert picks.points[0] == pytest.approx(9000, abs=0.6)


def test_noise_alone_gives_no_line() -> None:
    quiet = trace_of([], noise=1.0)
    fine = pick_lines(quiet, step_hz=STEP_HZ)
    assert fine.points.size == 0
    assert pick_weak_lines(quiet, fine, step_hz=STEP_HZ).points.size == 0


def test_a_broad_weak_line_shows_only_with_more_smoothing() -> None:
    # 6 Hz wide and 8 noise sd high; noise is white, one degree a point.
    trace = trace_of([(15000, 8.0)], width_hz=6.0, noise=1.0)
    fine = pick_lines(trace, step_hz=STEP_HZ)
    assert fine.points.size == 0
    every = pick_weak_lines(trace, fine, step_hz=STEP_HZ)
    assert every.points.size == 1
    # A smoothed derivative of this line places it to about half a Hz.
    assert every.points[0] == pytest.approx(15000, abs=1.5 / STEP_HZ)
