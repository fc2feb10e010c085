import numpy as np
import pytest

from spinledger.lines.deconvolution import NoiseModel
from spinledger.lines.splitting import Stretch, fit_with_splits

AXIS_HZ = np.arange(0.0, 40.0, 0.15)
SD = 0.004


def stretch_of(intensities: np.ndarray) -> Stretch:
    rng = np.random.default_rng(3)
    return Stretch(
        frequencies_hz=AXIS_HZ,
        intensities=intensities + rng.normal(size=AXIS_HZ.size) * SD,
        width_hz=1.2,
        noise=NoiseModel(sd=SD),
    )


def lorentz(centre: float, width: float, area: float) -> np.ndarray:
    half = width / 2
    return area * half / np.pi / (half**2 + (AXIS_HZ - centre) ** 2)


def test_two_lines_one_width_apart_are_told_apart() -> None:
    pair = lorentz(19.4, 1.2, 1.0) + lorentz(20.6, 1.2, 1.0)
    fit = fit_with_splits(stretch_of(pair), np.array([20.0]))
    assert fit.centres_hz.size == 2
    # A pair one width apart at S/N 130: placed to a few 0.01 Hz.
    assert fit.centres_hz == pytest.approx([19.4, 20.6], abs=0.1)


def test_a_line_of_another_shape_is_not_cut_into_pieces() -> None:
    # A flat-topped line, as no Lorentz lines can describe it to the noise.
    box = np.where(np.abs(AXIS_HZ - 20.0) < 2.5, 1.0, 0.0)
    fit = fit_with_splits(stretch_of(box), np.array([20.0]))
    assert fit.centres_hz.size == 1


def test_a_single_line_stays_single() -> None:
    fit = fit_with_splits(stretch_of(lorentz(20.0, 1.2, 1.0)), np.array([20.0]))
    assert fit.centres_hz.size == 1
