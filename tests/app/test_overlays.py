"""Spectra over the evidence: the claims at another field, and Esc."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from stage import settle

from spinledger.project.document import Project
from spinledger.reconcile.options import ReconcileOptions
from spinledger.structure.read import read_structure
from spinledger.values.ledger import Ledger
from spinledger_app import tasks
from spinledger_app.application import Parts
from spinledger_app.lanes.pyramid import Pyramid
from spinledger_app.lanes.scene import Trace
from spinledger_app.places import example_place
from spinledger_app.presenters.what_if import drawn_at, what_if


def _say(_stage: str, _fraction: float) -> None:
    return None


def _never() -> bool:
    return False


@pytest.fixture(scope="module")
def ledger() -> Ledger:
    place = example_place()
    assert place is not None
    options = Project().options
    read = tasks.read_spectrum(_say, _never, place.data, options)
    structure = read_structure("CCOC(=O)C[C@@H](C)O")
    return tasks.solve(
        _say, _never, read.evidence, structure, ReconcileOptions(quick=True)
    )


def test_at_its_own_field_the_claims_give_the_fitted_model(ledger: Ledger) -> None:
    asked = what_if(ledger)
    assert asked is not None
    assert ledger.model is not None
    spectrum = ledger.evidence.spectrum
    drawn = drawn_at(asked, spectrum.spectrometer_frequency_mhz)
    model = ledger.model.intensities
    shifts = spectrum.first_point_ppm - spectrum.step_ppm * np.arange(drawn.size)
    near = (shifts > 2.36) & (shifts < 2.55)  # the CH2 beside the stereocentre
    # Lorentz lines against the fitted shape of the processed lines: a tenth in area.
    assert drawn[near].sum() == pytest.approx(model[near].sum(), rel=0.1)
    assert np.corrcoef(drawn[near], model[near])[0, 1] > 0.98


def test_a_higher_field_draws_a_doublet_together_in_ppm(ledger: Ledger) -> None:
    asked = what_if(ledger)
    assert asked is not None

    def spread_ppm(frequency_mhz: float) -> float:
        values = drawn_at(asked, frequency_mhz)
        start, stop = (
            round((asked.first_point_ppm - ppm) / asked.step_ppm)
            for ppm in (1.245, 1.20)
        )
        part = values[start:stop]
        tall = np.flatnonzero(
            (part[1:-1] > part[:-2])
            & (part[1:-1] > part[2:])
            & (part[1:-1] > 0.5 * part.max())
        )
        return float(np.ptp(tall)) * asked.step_ppm

    # The CH3 doublet of 6.3 Hz: 6.3 / 400 and 6.3 / 1000 ppm; two points' tolerance.
    assert spread_ppm(400.0) == pytest.approx(6.31 / 400, abs=2 * asked.step_ppm)
    assert spread_ppm(1000.0) == pytest.approx(6.31 / 1000, abs=2 * asked.step_ppm)


def test_escape_takes_the_overlay_then_the_choice_away(parts: Parts) -> None:
    lanes, scene = parts.window.lanes, parts.bench.scene
    assert scene is not None
    before = lanes.grab().toImage()
    lanes.show_overlays(replace(scene.measured, pyramid=_shifted(scene.measured)))
    assert lanes.grab().toImage() != before
    parts.bench.selection.select("3-H")
    QTest.keyClick(parts.window, Qt.Key.Key_Escape)
    assert lanes.overlays == ()
    assert parts.bench.selection.marks.selected == "3-H"
    QTest.keyClick(parts.window, Qt.Key.Key_Escape)
    settle()
    assert parts.bench.selection.marks.selected is None


def _shifted(trace: Trace) -> Pyramid:
    return Pyramid(np.roll(trace.pyramid.values, 40))


def test_the_field_strip_opens_at_the_spectrum_s_own_field(parts: Parts) -> None:
    QTest.keyClick(parts.window, Qt.Key.Key_W)
    settle()
    strip = parts.window.field_strip
    assert strip.isVisible()
    assert strip.value.text() == "400 MHz"
    asked: list[float] = []
    strip.field_wanted.connect(asked.append)
    QTest.keyClick(strip.slider, Qt.Key.Key_PageUp)
    assert asked == [500.0]
    QTest.keyClick(parts.window, Qt.Key.Key_Escape)
    assert not strip.isVisible()


def test_two_contenders_lie_over_each_other_solid_and_dashed(
    parts: Parts, monkeypatch: pytest.MonkeyPatch
) -> None:
    scene = parts.bench.scene
    assert scene is not None
    trace = replace(scene.measured, pyramid=_shifted(scene.measured))

    def fit_now(*_given: object, **hands: object) -> None:
        done = hands["done"]
        assert callable(done)
        done(replace(trace))

    monkeypatch.setattr(parts.pool, "run", fit_now)
    lanes = parts.window.lanes
    parts.desk.overlays.compare("CC(C)OC(=O)CCO", "one")
    alone = lanes.grab().toImage()
    parts.desk.overlays.compare("CCOC(=O)C(O)CC", "two")
    assert len(lanes.overlays) == 2
    assert "one (solid) and two (dashed)" in parts.window.status.words
    # The same curve twice: only the second manner of drawing can make a difference.
    assert lanes.grab().toImage() != alone
    parts.desk.overlays.compare("CCOC(C)CC(=O)O", "three")
    assert "two (solid) and three (dashed)" in parts.window.status.words
    QTest.keyClick(parts.window, Qt.Key.Key_Escape)
    assert lanes.overlays == ()
