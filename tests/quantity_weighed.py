"""The invented ester with a standard and acetone in its tube, areas known exactly."""

from dataclasses import replace

import numpy as np

from invented_ledger import FIELD_MHZ, _add_line, invented_ledger
from spinledger.values.evidence import Line, Signal, Stray
from spinledger.values.ledger import Ledger

STANDARD_PPM, STANDARD_PROTONS = 6.09, 3
ACETONE_PPM = 2.17


def weighed_ledger(
    *,
    standard_ratio: float = 0.5,
    acetone_ratio: float = 0.02,
    pulse_angle_deg: float | None = 90.0,
    delay_s: float | None = 30.0,
) -> Ledger:
    """Ledger whose proton has the area 1; ratios are molecules for each of ester."""
    ledger = invented_ledger()
    evidence = ledger.evidence
    spectrum = evidence.spectrum
    axis = spectrum.shifts_ppm
    lines = (
        (STANDARD_PPM, STANDARD_PROTONS * standard_ratio, 0.9),
        (ACETONE_PPM, 6 * acetone_ratio, 1.0),
    )
    added = sum(
        (_add_line(axis, *one) for one in lines), np.zeros(spectrum.intensities.size)
    )
    acetone = Stray(
        low_ppm=ACETONE_PPM - 0.01,
        high_ppm=ACETONE_PPM + 0.01,
        kind="impurity",
        why="acetone: expected at 2.17 ppm in CDCl3",
    )
    standard = Stray(
        low_ppm=STANDARD_PPM - 0.01,
        high_ppm=STANDARD_PPM + 0.01,
        kind="given",
        why="standard",
    )
    changed = replace(
        evidence,
        spectrum=replace(spectrum, intensities=spectrum.intensities + added),
        signals=(*evidence.signals, *(_signal(*one) for one in lines)),
        metadata=replace(
            evidence.metadata,
            pulse_angle_deg=pulse_angle_deg,
            relaxation_delay_s=delay_s,
        ),
    )
    return replace(ledger, evidence=changed, strays=(*ledger.strays, acetone, standard))


def _signal(shift_ppm: float, area: float, width_hz: float) -> Signal:
    line = Line(
        shift_ppm=shift_ppm,
        shift_sd_ppm=1e-4,
        area=area,
        area_sd=0.01 * area,
        width_hz=width_hz,
        width_sd_hz=0.05,
    )
    reach = 4 / FIELD_MHZ
    return Signal(
        low_ppm=shift_ppm - reach,
        high_ppm=shift_ppm + reach,
        area=area,
        area_sd=0.01 * area,
        lines=(line,),
    )
