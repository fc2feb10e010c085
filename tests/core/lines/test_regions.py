import numpy as np
import pytest

from spinledger.lines.regions import find_regions, joined_runs

STEP_HZ = 0.15
N_POINTS = 32768


def complex_line(point: float, height: float, width_hz: float = 1.0) -> np.ndarray:
    apart_hz = (np.arange(N_POINTS) - point) * STEP_HZ
    return height / (1 + 1j * apart_hz / (width_hz / 2))


def noisy(values: np.ndarray, sd: float = 1.0) -> np.ndarray:
    rng = np.random.default_rng(8)
    return values + sd * (rng.normal(size=N_POINTS) + 1j * rng.normal(size=N_POINTS))


@pytest.mark.parametrize("phase_rad", [0.0, 1.3, 3.0])
def test_regions_are_the_same_whatever_the_phase(phase_rad: float) -> None:
    clean = complex_line(9000, 1000) + complex_line(20000, 300)
    regions = find_regions(noisy(clean * np.exp(1j * phase_rad)), step_hz=STEP_HZ)
    assert regions.count == 2
    # The strongest point of a narrow line's curvature is its centre.
    np.testing.assert_allclose(regions.peaks, [9000, 20000], atol=2)


def test_tails_of_a_giant_line_do_not_join_its_neighbour() -> None:
    # 40 Hz away the giant's dispersive tail still is ten times the neighbour.
    clean = complex_line(9000, 1e6) + complex_line(9000 + 40 / STEP_HZ, 1500)
    regions = find_regions(noisy(clean), step_hz=STEP_HZ)
    assert regions.count == 2


def test_gaps_up_to_the_given_length_are_closed() -> None:
    flags = np.zeros(30, dtype=bool)
    flags[[2, 3, 7, 20, 21]] = True
    starts, stops = joined_runs(flags, 3)
    assert starts.tolist() == [2, 20]
    assert stops.tolist() == [8, 22]


def test_mask_covers_the_grown_regions_only() -> None:
    regions = find_regions(noisy(complex_line(9000, 1000)), step_hz=STEP_HZ)
    mask = regions.mask(N_POINTS, 10)
    start, stop = int(regions.starts[0]) - 10, int(regions.stops[0]) + 10
    assert mask[start:stop].all()
    assert mask.sum() == stop - start
