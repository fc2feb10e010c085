"""The same sample at another field, by spin simulation; MHz, Hz and ppm."""

from __future__ import annotations

import numpy as np

from spinledger.reconcile.advice_view import (
    Finding,
    View,
    odds_of_difference,
)
from spinledger.reconcile.coarse import FloatArray
from spinledger.spins.clusters import QUICK_EFFORT
from spinledger.spins.network import ClaimLineSet, ClaimNetwork

FIELDS_MHZ = (300.0, 400.0, 500.0, 600.0, 800.0)
#: A field this close is the one at hand.
SAME_FIELD = 0.08
_STEP_HZ = 0.5
_LEAST_WIDTH_HZ = 1.0
#: Overlap, as a share of a claim's area, from which it is not read alone.
OVERLAPPED, APART = 0.3, 0.12


class Simulator:
    """Spectra of one view at any field, with fitted shifts and couplings.

    Parameters
    ----------
    view : View
    """

    def __init__(self, view: View) -> None:
        self.view = view
        self.network = ClaimNetwork(view.evaluation.claims)
        self._known: dict[float, ClaimLineSet] = {}

    def shifts_hz(self, field_mhz: float) -> FloatArray:
        """Shift of every claim at a field; predicted where it has no place, Hz."""
        claims = self.view.evaluation.claims.claims
        shifts = np.array([one.shift_ppm for one in claims])
        for claim, place in self.view.all_places.items():
            shifts[claim] = place
        return shifts * field_mhz

    def lines(self, field_mhz: float) -> ClaimLineSet:
        """Lines of all placed claims at a field, Hz; each field is solved once."""
        if field_mhz not in self._known:
            shifts, couplings = self.shifts_hz(field_mhz), self.view.couplings_hz
            plan = self.network.plan(
                shifts, couplings, without=self.view.gone, effort=QUICK_EFFORT
            )
            self._known[field_mhz] = self.network.lines(shifts, couplings, plan=plan)
        return self._known[field_mhz]

    @property
    def width_hz(self) -> float:
        """Median width of the fit, Hz."""
        widths = self.view.solution.best.refinement.widths_hz[list(self.view.places)]
        return max(float(np.median(widths)), _LEAST_WIDTH_HZ)


def other_fields(field_mhz: float) -> tuple[float, ...]:
    """Usual fields that are not the one at hand, MHz."""
    return tuple(
        one for one in FIELDS_MHZ if abs(one - field_mhz) > SAME_FIELD * field_mhz
    )


def field_finding(own: Simulator, other: Simulator, field_mhz: float) -> Finding | None:
    """Where two structures that agree here part at another field."""
    share, place_ppm = _difference(own, other, field_mhz)
    now, _ = _difference(own, other, own.view.frequency_mhz)
    odds = odds_of_difference(max(share - now, 0.0))
    if odds < 0.1:
        return None
    return Finding(
        log_odds=odds,
        look_for=f"the two spectra part, most near {place_ppm:.2f} ppm: "
        f"{100 * share:.0f} % of the area differs between {own.view.name} and "
        f"{other.view.name} (here {100 * now:.0f} %)",
    )


def _difference(
    own: Simulator, other: Simulator, field_mhz: float
) -> tuple[float, float]:
    """Half the area between two simulated spectra, as a share, and its place, ppm."""
    sets = [one.lines(field_mhz) for one in (own, other)]
    keep = [
        np.isin(lines.claim, list(one.view.places))
        for one, lines in zip((own, other), sets, strict=True)
    ]
    if not all(mask.any() for mask in keep):
        return 0.0, 0.0
    both = np.concatenate(
        [lines.frequencies_hz[mask] for lines, mask in zip(sets, keep, strict=True)]
    )
    low, high = float(both.min()) - 30.0, float(both.max()) + 30.0
    width_hz = max(own.width_hz, other.width_hz)
    drawn = [
        draw(lines.frequencies_hz[mask], lines.protons[mask], (low, high), width_hz)
        for lines, mask in zip(sets, keep, strict=True)
    ]
    gap = np.abs(drawn[0] / drawn[0].sum() - drawn[1] / drawn[1].sum())
    # The place where the difference is greatest over some ten Hz.
    smooth = np.convolve(gap, np.ones(41), mode="same")
    place_hz = low + _STEP_HZ * int(np.argmax(smooth))
    return float(0.5 * gap.sum()), place_hz / field_mhz


def draw(
    frequencies_hz: FloatArray,
    protons: FloatArray,
    limits_hz: tuple[float, float],
    width_hz: float,
) -> FloatArray:
    """Lorentzian lines on a grid of half a Hz."""
    low, high = limits_hz
    size = int((high - low) / _STEP_HZ) + 1
    sticks = np.zeros(size)
    places = np.clip(
        np.rint((frequencies_hz - low) / _STEP_HZ).astype(int), 0, size - 1
    )
    np.add.at(sticks, places, protons)
    reach = np.arange(-int(40 * width_hz), int(40 * width_hz) + 1) * _STEP_HZ
    shape = 1.0 / (reach**2 + (width_hz / 2) ** 2)
    return np.asarray(np.convolve(sticks, shape / shape.sum(), mode="same"))


def overlaps(own: Simulator, field_mhz: float) -> dict[int, float]:
    """Share of each placed claim's area that lies under the other claims."""
    lines = own.lines(field_mhz)
    limits = (
        float(lines.frequencies_hz.min()) - 30.0,
        float(lines.frequencies_hz.max()) + 30.0,
    )
    drawn = {
        claim: draw(
            lines.frequencies_hz[lines.claim == claim],
            lines.protons[lines.claim == claim],
            limits,
            own.width_hz,
        )
        for claim in own.view.places
        if np.any(lines.claim == claim)
    }
    if not drawn:
        return {}
    total = np.sum(list(drawn.values()), axis=0)
    return {
        claim: float(np.minimum(one, total - one).sum() / one.sum())
        for claim, one in drawn.items()
    }
