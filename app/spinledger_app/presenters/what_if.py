"""The claims at another field: what is sent to the worker, and what it draws.

Shifts in ppm, couplings in Hz.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.values.claim import ClaimSet
from spinledger.values.ledger import Entry, Ledger

_LEAST_WIDTH_HZ = 0.5
# Beyond 60 widths a Lorentz line is below 1e-4 of its height.
_REACH_WIDTHS = 60.0

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class WhatIf:
    """Claims with what was found of them, and the axis to draw them on.

    Attributes
    ----------
    shifts_ppm, widths_hz : numpy.ndarray, shape (n_claims,)
    couplings_hz : numpy.ndarray, shape (n_couplings,), Hz
        As predicted where the spectrum did not tell.
    absent : frozenset of int
        Claims that show no lines.
    area_per_proton : float
    first_point_ppm, step_ppm, n_points
        Axis of the spectrum.
    """

    claims: ClaimSet
    shifts_ppm: Floats
    widths_hz: Floats
    couplings_hz: Floats
    absent: frozenset[int]
    area_per_proton: float
    first_point_ppm: float
    step_ppm: float
    n_points: int


def what_if(ledger: Ledger) -> WhatIf | None:
    """Claims of a ledger as they were found; None where there is no model."""
    if ledger.model is None:
        return None
    claims, spectrum = ledger.claims, ledger.evidence.spectrum
    entries = {entry.claim: entry for entry in ledger.entries}
    mine = [entries.get(claim.label) for claim in claims.claims]
    shifts = [
        claim.shift_ppm if entry is None or entry.shift_ppm is None else entry.shift_ppm
        for claim, entry in zip(claims.claims, mine, strict=True)
    ]
    widths = [
        max(_LEAST_WIDTH_HZ, (entry.width_hz if entry is not None else None) or 1.0)
        for entry in mine
    ]
    absent = frozenset(
        index
        for index, entry in enumerate(mine)
        if entry is None or entry.state == "silent"
    )
    return WhatIf(
        claims=claims,
        shifts_ppm=np.array(shifts),
        widths_hz=np.array(widths),
        couplings_hz=_couplings(claims, entries),
        absent=absent,
        area_per_proton=ledger.model.area_per_proton,
        first_point_ppm=spectrum.first_point_ppm,
        step_ppm=spectrum.step_ppm,
        n_points=spectrum.n_points,
    )


def _couplings(claims: ClaimSet, entries: dict[str, Entry]) -> Floats:
    values = np.array([one.j_hz for one in claims.couplings], dtype=np.float64)
    for index, coupling in enumerate(claims.couplings):
        particles = [claims.particles[one] for one in coupling.pairs[0]]
        if any(one.claim is None for one in particles):
            continue
        names = [claims.claims[one.claim or 0].label for one in particles]
        for own, partner in (names, names[::-1]):
            entry = entries.get(own)
            for one in entry.couplings if entry is not None else ():
                is_it = one.partner == partner and one.predicted_j_hz == coupling.j_hz
                if is_it and one.determined and one.j_hz is not None:
                    sign = -1.0 if coupling.j_hz < 0 else 1.0
                    values[index] = sign * abs(one.j_hz)
    return values


def drawn_at(asked: WhatIf, frequency_mhz: float) -> Floats:
    """Spectrum of the claims at a field, on the spectrum's own ppm axis.

    Parameters
    ----------
    frequency_mhz : float, MHz
        Proton frequency.

    Returns
    -------
    numpy.ndarray, shape (n_points,)
        Lorentz lines of the widths that were found, in Hz, on no baseline; the
        height of a single line is that of the measured field.
    """
    from spinledger.spins.network import (  # noqa: PLC0415 - for the worker alone
        ClaimNetwork,
    )

    lines = ClaimNetwork(asked.claims).lines(
        asked.shifts_ppm * frequency_mhz, asked.couplings_hz, without=asked.absent
    )
    total = np.zeros(asked.n_points)
    for frequency_hz, protons, claim in zip(
        lines.frequencies_hz, lines.protons, lines.claim, strict=True
    ):
        width_ppm = asked.widths_hz[claim] / frequency_mhz
        height = (
            2.0 * asked.area_per_proton * protons / (np.pi * asked.widths_hz[claim])
        )
        _add_line(total, asked, frequency_hz / frequency_mhz, width_ppm, height)
    return total


def _add_line(
    total: Floats, asked: WhatIf, shift_ppm: float, width_ppm: float, height: float
) -> None:
    centre = (asked.first_point_ppm - shift_ppm) / asked.step_ppm
    reach = _REACH_WIDTHS * width_ppm / asked.step_ppm
    start, stop = max(0, int(centre - reach)), min(asked.n_points, int(centre + reach))
    if stop > start:
        away = (np.arange(start, stop) - centre) * asked.step_ppm
        total[start:stop] += height / (1.0 + (2.0 * away / width_ppm) ** 2)
