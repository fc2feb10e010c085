from dataclasses import replace

import numpy as np
import pytest

from known_fid import KnownLine, Setting, made_fid, made_spectrum, maker_spectrum
from spinledger.errors import EvidenceError, UsageError
from spinledger.processing.automatic import process, reprocess
from spinledger.processing.automatic_window import (
    automatic_line_broadening,
    automatic_size,
)
from spinledger.processing.noise_model import noise_model
from spinledger.processing.recipe import find_step, with_step
from spinledger.values.recipe import Apodize, Phase, Recipe, Reference

LINES = [KnownLine(shift_ppm=7.2), KnownLine(shift_ppm=1.3, area=3.0)]


def test_the_steps_stand_in_the_order_in_which_they_run() -> None:
    recipe = process(made_fid(LINES, Setting(noise_sd=0.05))).run.recipe
    names = [row["step"] for row in recipe.to_json()]
    assert names == [
        "RemoveDelay",
        "Apodize",
        "ZeroFill",
        "FourierTransform",
        "Phase",
        "Baseline",
        "Reference",
    ]


@pytest.mark.parametrize(
    ("n_samples", "n_points"),
    [(4096, 65536), (16384, 65536), (40000, 131072), (65536, 131072), (200000, 262144)],
)
def test_spectra_are_filled_to_a_power_of_two(n_samples: int, n_points: int) -> None:
    fid = made_fid(LINES, Setting(n_samples=n_samples))
    assert automatic_size(fid) == n_points


def test_a_fid_that_was_cut_short_is_broadened_and_said_so() -> None:
    # 0.25 s of lines 0.5 Hz wide: two thirds of the signal is left at the end.
    lines = [replace(line, width_hz=0.5) for line in LINES]
    fid = made_fid(lines, Setting(n_samples=2048, noise_sd=0.005))
    broadening = automatic_line_broadening(fid)
    left = np.exp(-np.pi * (0.5 + broadening) * 0.256)
    # The step at the end is 0.3 % of the start, by the formula's own aim.
    assert left == pytest.approx(0.003, rel=0.3)
    assert any("cut short" in doubt for doubt in process(fid).quality.doubts)


def test_a_full_fid_and_a_receiver_offset_keep_the_least_broadening() -> None:
    fid = made_fid(LINES, Setting(noise_sd=0.05))
    assert automatic_line_broadening(fid) == 0.3
    offset = replace(fid, samples=fid.samples + 0.5)
    assert automatic_line_broadening(offset) == 0.3


def test_a_clipped_receiver_is_reported() -> None:
    fid = made_fid(LINES, Setting(noise_sd=0.02))
    limit = 0.6 * np.abs(fid.samples.real).max()
    clipped = np.clip(fid.samples.real, -limit, limit) + 1j * np.clip(
        fid.samples.imag, -limit, limit
    )
    assert any(
        "clipped" in doubt
        for doubt in process(replace(fid, samples=clipped)).quality.doubts
    )
    assert not any("clipped" in doubt for doubt in process(fid).quality.doubts)


def test_a_narrow_sweep_is_reported() -> None:
    narrow = Setting(width_hz=2000.0, carrier_ppm=7.0, noise_sd=0.05)
    doubts = process(made_fid(LINES[:1], narrow)).quality.doubts
    assert any("sweep only covers" in doubt for doubt in doubts)


def test_first_points_that_are_wrong_leave_integrals_right() -> None:
    fid = made_fid(LINES, Setting(noise_sd=0.01))
    wrong = np.zeros(fid.samples.size, dtype=np.complex128)
    wrong[:3] = [20.0, -12.0j, 6.0]
    spectrum = process(replace(fid, samples=fid.samples + wrong)).spectrum
    areas = []
    for line in LINES:
        window = spectrum.window(line.shift_ppm - 0.05, line.shift_ppm + 0.05)
        areas.append(float(spectrum.intensities[window].sum()))
    # Both ranges lose the same share of their Lorentz tails.
    assert areas[1] / areas[0] == pytest.approx(3.0, rel=0.01)


def test_too_few_points_and_empty_data_are_refused_in_a_sentence() -> None:
    short = made_fid(LINES, Setting(n_samples=64))
    with pytest.raises(EvidenceError, match="the FID has only 64 points"):
        process(short)
    empty = made_fid([])
    with pytest.raises(EvidenceError, match="the FID is empty"):
        process(empty)
    small = maker_spectrum(made_spectrum(np.arange(100.0)))
    with pytest.raises(EvidenceError, match="the spectrum has only 100 points"):
        process(small)
    flat = maker_spectrum(made_spectrum(np.ones(4096)))
    with pytest.raises(EvidenceError, match="the spectrum is empty"):
        process(flat)


def test_a_solvent_nobody_knows_is_refused_with_the_names_that_are() -> None:
    fid = made_fid(LINES, Setting(noise_sd=0.05))
    with pytest.raises(UsageError, match=r"'olive oil' is not known; use one of CDCl3"):
        process(fid, solvent="olive oil")


def test_a_given_recipe_is_run_as_it_is() -> None:
    fid = made_fid(LINES, Setting(noise_sd=0.05, phase0_deg=30.0))
    own = process(fid)
    recipe = with_step(
        with_step(own.run.recipe, Phase(phase0_deg=-33.0, phase1_deg=1.0)),
        Reference(offset_ppm=0.4, by="user", sd_ppm=0.001),
    )
    again = reprocess(fid, recipe)
    assert again.run.recipe == recipe
    assert again.referencing.reference.by == "user"
    assert again.quality.phase_sd_deg is None


def test_a_recipe_without_reference_gets_one() -> None:
    fid = made_fid(LINES, Setting(noise_sd=0.05))
    steps = process(fid).run.recipe.steps
    again = reprocess(fid, Recipe(steps=steps[:-1]))
    assert find_step(again.run.recipe, Reference) is not None


def test_noise_correlation_is_that_of_window_and_zero_filling() -> None:
    setting = Setting(noise_sd=1.0)
    run = process(made_fid([KnownLine(shift_ppm=3.0, area=50.0)], setting)).run
    window = find_step(run.recipe, Apodize)
    assert window is not None
    times = np.arange(setting.n_samples) / setting.width_hz
    power = np.sum(np.exp(-2 * np.pi * window.line_broadening_hz * times))
    # Variance of a sum of many points, real part: N / (2 sum w^2).
    model = noise_model(run, 1.0)
    assert model.correlation == pytest.approx(65536 / (2 * power), rel=1e-9)
    assert model.line_broadening_hz == window.line_broadening_hz
