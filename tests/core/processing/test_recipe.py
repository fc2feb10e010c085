import time

import numpy as np
import pytest

from known_fid import KnownLine, Setting, made_fid, made_spectrum, maker_spectrum
from spinledger.processing.automatic import process
from spinledger.processing.recipe import (
    find_step,
    rerun,
    run_recipe,
    start_run,
    with_step,
)
from spinledger.values.recipe import (
    Apodize,
    Baseline,
    Phase,
    Recipe,
    Reference,
    ZeroFill,
)
from spinledger.values.spectrum import Spectrum

LINES = [
    KnownLine(shift_ppm=7.2),
    KnownLine(shift_ppm=3.3, area=2.0),
    KnownLine(shift_ppm=1.1, area=3.0),
]


def same(a: Spectrum, b: Spectrum) -> bool:
    return (
        np.array_equal(a.intensities, b.intensities)
        and np.array_equal(a.imaginary, b.imaginary)  # type: ignore[arg-type]  # None equals None
        and a.first_point_ppm == b.first_point_ppm
    )


def test_the_stored_recipe_gives_the_same_numbers_bit_for_bit() -> None:
    fid = made_fid(LINES, Setting(noise_sd=0.05, phase0_deg=50.0))
    processed = process(fid)
    stored = Recipe.from_json(processed.run.recipe.to_json())
    assert same(run_recipe(fid, stored), processed.spectrum)
    assert same(run_recipe(fid, stored), run_recipe(fid, stored))


@pytest.mark.parametrize(
    "step",
    [
        Phase(phase0_deg=12.0, phase1_deg=-30.0, automatic=False),
        Baseline(method="none"),
        Reference(offset_ppm=0.3, by="user", sd_ppm=0.001),
        Apodize(kind="gaussian", gaussian_hz=2.0),
        ZeroFill(n_points=32768),
    ],
)
def test_a_rerun_from_the_changed_step_equals_a_whole_run(step) -> None:
    fid = made_fid(LINES, Setting(noise_sd=0.05))
    run = process(fid).run
    changed = with_step(run.recipe, step)
    assert same(rerun(run, changed).spectrum, start_run(fid, changed).spectrum)
    assert not same(rerun(run, changed).spectrum, run.spectrum)


def test_a_step_is_replaced_in_its_place_or_added_at_the_end() -> None:
    recipe = Recipe(steps=(Apodize(kind="none"), ZeroFill(n_points=4)))
    replaced = with_step(recipe, Apodize(kind="exponential", line_broadening_hz=1.0))
    assert [type(step) for step in replaced.steps] == [Apodize, ZeroFill]
    added = with_step(recipe, Phase(phase0_deg=1.0, phase1_deg=0.0))
    assert isinstance(added.steps[-1], Phase)
    assert find_step(added, Baseline) is None


def test_a_makers_spectrum_takes_baseline_and_reference_only() -> None:
    spectrum = made_spectrum(np.arange(4096.0))
    recipe = Recipe(
        steps=(
            Apodize(kind="exponential", line_broadening_hz=5.0),
            Phase(phase0_deg=90.0, phase1_deg=0.0),
            Reference(offset_ppm=0.1, by="user", sd_ppm=0.0),
        )
    )
    made = run_recipe(maker_spectrum(spectrum), recipe)
    # No dispersive part: a phase cannot be put on, and nothing else changes.
    np.testing.assert_array_equal(made.intensities, spectrum.intensities)
    assert made.imaginary is None
    assert made.first_point_ppm == pytest.approx(12.1)


def test_a_makers_complex_spectrum_can_be_phased() -> None:
    spectrum = Spectrum(
        intensities=np.array([1.0, 2.0, 3.0, 4.0]),
        imaginary=np.array([5.0, 6.0, 7.0, 8.0]),
        first_point_ppm=10.0,
        spectral_width_hz=5000.0,
        spectrometer_frequency_mhz=500.0,
    )
    turned = run_recipe(
        maker_spectrum(spectrum),
        Recipe(steps=(Phase(phase0_deg=90.0, phase1_deg=0.0),)),
    )
    # i (a + i b) = -b + i a.
    np.testing.assert_allclose(turned.intensities, [-5, -6, -7, -8], atol=1e-12)
    np.testing.assert_allclose(turned.imaginary, [1, 2, 3, 4], atol=1e-12)


def test_changing_the_phase_of_131072_points_is_fast_enough_to_drag() -> None:
    fid = made_fid(LINES, Setting(noise_sd=0.05, n_samples=65536))
    run = process(fid).run
    assert run.spectrum.n_points == 131072
    seconds = []
    for phase0_deg in range(8):
        step = Phase(phase0_deg=float(phase0_deg), phase1_deg=5.0, automatic=False)
        begin = time.process_time()
        rerun(run, with_step(run.recipe, step))
        seconds.append(time.process_time() - begin)
    # 50 ms is the redraw budget; the best of eight leaves other load aside.
    assert min(seconds) < 0.05
