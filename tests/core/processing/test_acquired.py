"""A few acquired sets against what the makers' programs and papers say."""

import numpy as np
import pytest

from shared_data import shared
from spinledger.io.read import read_acquired
from spinledger.processing.automatic import process
from spinledger.processing.recipe import run_recipe, with_step
from spinledger.values.acquisition import Fid, MakerSpectrum
from spinledger.values.recipe import Apodize


def inside(
    spectrum, low_ppm: float, high_ppm: float, n_points: int = 4000
) -> np.ndarray:
    """Intensities on a common grid of shifts."""
    grid = np.linspace(low_ppm, high_ppm, n_points)
    return np.interp(grid, spectrum.shifts_ppm[::-1], spectrum.intensities[::-1])


@pytest.mark.parametrize(
    ("name", "broadening_hz", "ranges"),
    [
        # LB of the maker's processing; ranges of the published signals.
        ("br_l-alanine_bmse000028", 2.0, [(1.40, 1.53), (3.68, 3.86)]),
        ("br_l-valine_bmse000860", 1.0, [(0.90, 1.12), (2.15, 2.38), (3.5, 3.7)]),
        ("br_caffeine_bmse000206", 1.0, [(3.1, 3.5), (3.8, 4.0), (7.8, 7.95)]),
    ],
)
def test_our_spectrum_is_the_makers_inside_the_signals(
    name: str, broadening_hz: float, ranges: list[tuple[float, float]]
) -> None:
    folder = next(shared("acquired", name, "raw").glob("**/acqus")).parent
    fid = read_acquired(folder)
    made = read_acquired(folder, prefer_processed=True)
    assert isinstance(fid, Fid)
    assert isinstance(made, MakerSpectrum)
    window = Apodize(kind="exponential", line_broadening_hz=broadening_hz)
    ours = run_recipe(fid, with_step(process(fid).run.recipe, window))
    maker = process(made).spectrum
    for low, high in ranges:
        a, b = inside(ours, low, high), inside(maker, low, high)
        # Two axes with their own zero differ by a tenth of a line width.
        assert np.corrcoef(a, b)[0, 1] > 0.995


@pytest.mark.parametrize(
    ("name", "by"),
    [
        ("br_l-proline_bmse000947", "DSS"),
        ("br_choline_bmse000953", "DSS"),
        ("brn_menthol", "solvent"),
        ("jc_propionanilide", "solvent"),
        ("jc_menthol", "TMS"),
    ],
)
def test_the_reference_line_is_found(name: str, by: str) -> None:
    raw = shared("acquired", name, "raw")
    places = [p.parent for p in raw.glob("**/acqus")] or list(raw.glob("**/*fid.dx"))
    processed = process(read_acquired(places[0]))
    assert processed.referencing.reference.by == by
    spectrum = processed.spectrum
    place = processed.referencing.reference.line_ppm
    assert place is not None
    window = spectrum.window(place - 0.01, place + 0.01)
    top = spectrum.shifts_ppm[window][np.argmax(spectrum.intensities[window])]
    # The tallest point there is the reference line's, within its own width.
    assert top == pytest.approx(place, abs=0.002)


def test_a_header_that_names_the_wrong_solvent_is_caught() -> None:
    raw = shared("acquired", "jc_1-4-fluorophenyl-ethylamine", "raw")
    processed = process(read_acquired(next(raw.glob("**/*fid.dx"))))
    assert processed.solvent_header == "acetone-d6"
    assert processed.referencing.solvent == "CDCl3"
    assert any("header says acetone-d6" in one for one in processed.quality.doubts)
