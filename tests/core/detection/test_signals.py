"""Ranges, lines and integrals of made spectra whose areas are known."""

import numpy as np
import pytest

from known_fid import KnownLine, Setting, made_fid, multiplet
from spinledger.detection.evidence import gather_evidence
from spinledger.values.evidence import Evidence, Signal

SINGLET = KnownLine(shift_ppm=3.6, area=3.0)
SOLUTE = (*multiplet(4.1, [7.0, 7.0, 7.0], area=2.0), SINGLET)


def signal_at(evidence: Evidence, shift_ppm: float) -> Signal:
    return next(
        one for one in evidence.signals if one.low_ppm < shift_ppm < one.high_ppm
    )


def protons(evidence: Evidence, shift_ppm: float) -> float:
    """Integral on the scale of the singlet of three protons."""
    unit = signal_at(evidence, SINGLET.shift_ppm).area / SINGLET.area
    return signal_at(evidence, shift_ppm).area / unit


@pytest.mark.parametrize("width_hz", [20.0, 60.0])
def test_a_broad_hump_is_kept_with_its_integral(width_hz: float) -> None:
    hump = KnownLine(shift_ppm=9.5, area=1.0, width_hz=width_hz)
    evidence = gather_evidence(made_fid([*SOLUTE, hump], Setting(noise_sd=0.02)))
    # Its feet go on under the noise: a tenth is open.
    assert protons(evidence, 9.5) == pytest.approx(1.0, abs=0.1)
    assert signal_at(evidence, 9.5).lines[0].width_hz == pytest.approx(
        width_hz, rel=0.15
    )


@pytest.mark.parametrize("times", [10.0, 100.0, 1000.0])
def test_giant_water_leaves_the_integrals_beside_it(times: float) -> None:
    water = KnownLine(shift_ppm=4.75, area=9 * times, width_hz=3.0)
    setting = Setting(noise_sd=0.02, n_samples=32768, carrier_ppm=4.75)
    fid = made_fid([*SOLUTE, water], setting, solvent="D2O")
    evidence = gather_evidence(fid)
    found = signal_at(evidence, 4.1)
    assert len(found.lines) == 4
    # 325 Hz from a line a thousand times as tall; a twentieth is open there.
    assert protons(evidence, 4.1) == pytest.approx(2.0, abs=0.1)
    unit = signal_at(evidence, SINGLET.shift_ppm).area / SINGLET.area
    assert abs(protons(evidence, 4.1) - 2.0) < 3 * found.area_sd / unit


@pytest.mark.parametrize(("phase0_deg", "phase1_deg"), [(0.0, 0.0), (70.0, -200.0)])
def test_benchtop_widths_and_field(phase0_deg: float, phase1_deg: float) -> None:
    lines = [
        *multiplet(1.25, [7.0, 7.0], area=3.0, field_mhz=60.0, width_hz=1.5),
        *multiplet(4.1, [7.0, 7.0, 7.0], area=2.0, field_mhz=60.0, width_hz=1.5),
        KnownLine(shift_ppm=2.04, area=3.0, width_hz=1.5),
        KnownLine(shift_ppm=7.26, area=0.3, width_hz=1.5),
        KnownLine(shift_ppm=0.0, area=0.3, width_hz=1.5),
    ]
    setting = Setting(
        field_mhz=60.0,
        width_hz=1200.0,
        n_samples=8192,
        noise_sd=0.05,
        phase0_deg=phase0_deg,
        phase1_deg=phase1_deg,
    )
    evidence = gather_evidence(made_fid(lines, setting, solvent="CDCl3"))
    assert evidence.reference.by == "TMS"
    unit = signal_at(evidence, 2.04).area / 3
    for shift_ppm, expected in ((1.25, 3.0), (4.1, 2.0)):
        # A few degrees of phase at this signal-to-noise cost a few per cent.
        share = signal_at(evidence, shift_ppm).area / unit / expected
        assert share == pytest.approx(1.0, abs=0.05)


def test_positions_and_areas_lie_within_their_sds() -> None:
    errors = []
    for seed in range(4):
        setting = Setting(noise_sd=0.02, seed=seed, phase0_deg=30.0)
        evidence = gather_evidence(made_fid(SOLUTE, setting))
        found = [line for one in evidence.signals for line in one.lines]
        assert len(found) == len(SOLUTE)
        truth = sorted(SOLUTE, key=lambda line: -line.shift_ppm)
        errors += [
            (mine.shift_ppm - known.shift_ppm) / mine.shift_sd_ppm
            for mine, known in zip(found, truth, strict=True)
        ]
    # 20 errors in their own sd: a rms beyond 1.5 has a chance below 0.1 %.
    assert np.sqrt(np.mean(np.square(errors))) < 1.5
