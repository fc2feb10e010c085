"""Which stretches stay: sharp lines, broad humps, never bare noise."""

from __future__ import annotations

import numpy as np

from spinledger.values.evidence import Line
from spinledger.values.spectrum import Spectrum
from spinledger_app.lanes.folds import filled_stretches
from spinledger_app.lanes.shift_map import Stretch

WHOLE = Stretch(high_ppm=12.0, low_ppm=-1.0)
FIELD_MHZ = 500.0
N_POINTS = 65_536
WIDTH_HZ = 8000.0


def spectrum_of(*lines: tuple[float, float, float]) -> Spectrum:
    """Lorentzians (shift ppm, area, width Hz) on unit noise."""
    step_ppm = WIDTH_HZ / N_POINTS / FIELD_MHZ
    shifts = 13.0 - step_ppm * np.arange(N_POINTS)
    total = np.random.default_rng(3).normal(size=N_POINTS)
    for shift, area, width in lines:
        half = width / 2
        away = (shifts - shift) * FIELD_MHZ
        total += area * half / np.pi / (away**2 + half**2)
    return Spectrum(
        intensities=total,
        first_point_ppm=13.0,
        spectral_width_hz=WIDTH_HZ,
        spectrometer_frequency_mhz=FIELD_MHZ,
    )


def line(shift: float, area: float, width: float) -> Line:
    return Line(
        shift_ppm=shift,
        shift_sd_ppm=0.0001,
        area=area,
        area_sd=0.1,
        width_hz=width,
        width_sd_hz=0.1,
    )


def test_a_broad_hump_that_no_signal_names_stays() -> None:
    # 80 Hz wide and 2.4 noise sd high: hidden point by point, plain by area.
    spectrum = spectrum_of((3.0, 4000.0, 1.0), (9.6, 300.0, 80.0))
    kept = filled_stretches(
        spectrum, [(2.99, 3.01)], whole=WHOLE, lines=[line(3.0, 4000.0, 1.0)]
    )
    assert any(stretch.holds(9.6) for stretch in kept)


def test_bare_noise_and_tails_are_folded_away() -> None:
    lines = [line(7.3, 9000.0, 1.0), line(2.0, 9000.0, 1.0)]
    spectrum = spectrum_of((7.3, 9000.0, 1.0), (2.0, 9000.0, 1.0))
    ranges = [(7.29, 7.31), (1.99, 2.01)]
    kept = filled_stretches(spectrum, ranges, whole=WHOLE, lines=lines)
    assert len(kept) == 2
    # Two signals of 10 Hz with their margins: far less than half a ppm each.
    assert sum(stretch.width_ppm for stretch in kept) < 0.3


def test_signals_stay_and_order_is_descending() -> None:
    spectrum = spectrum_of((8.0, 900.0, 1.0))
    ranges = [(0.9, 1.1), (7.95, 8.05), (3.0, 3.2)]
    kept = filled_stretches(spectrum, ranges, whole=WHOLE, places_ppm=[5.5])
    assert [stretch.high_ppm for stretch in kept] == sorted(
        (stretch.high_ppm for stretch in kept), reverse=True
    )
    for shift in (1.0, 8.0, 3.1, 5.5):
        assert any(stretch.holds(shift) for stretch in kept)


def test_many_signals_share_nine_stretches() -> None:
    shifts = np.linspace(0.5, 11.0, 30)
    spectrum = spectrum_of(*[(float(s), 500.0, 1.0) for s in shifts])
    ranges = [(float(s) - 0.01, float(s) + 0.01) for s in shifts]
    kept = filled_stretches(spectrum, ranges, whole=WHOLE)
    assert len(kept) <= 9
    assert all(any(stretch.holds(float(s)) for stretch in kept) for s in shifts)
