"""Which parameters are fitted, with their priors and bounds; Hz."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.reconcile.match import held_couplings
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.refine_model import Layout
from spinledger.spins.network import ClaimNetwork
from spinledger.spins.plan import Plan
from spinledger.values.claim import ClaimSet

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Fixed:
    """Constraints by number instead of label.

    Attributes
    ----------
    ranges_hz : mapping of int to (low, high), Hz
        Claims pinned to a stretch.
    couplings_hz : mapping of int to float, Hz
    """

    ranges_hz: Mapping[int, tuple[float, float]]
    couplings_hz: Mapping[int, float]


def fixed_by(
    claims: ClaimSet, constraints: Constraints | None, frequency_mhz: float
) -> Fixed:
    """Pins and fixed couplings of the user, by claim and coupling number."""
    labels = {claim.label: index for index, claim in enumerate(claims.claims)}
    ranges = {
        labels[pin.claim]: (pin.low_ppm * frequency_mhz, pin.high_ppm * frequency_mhz)
        for pin in (constraints.pins if constraints else ())
        if pin.claim in labels
    }
    return Fixed(
        ranges_hz=ranges, couplings_hz=dict(held_couplings(claims, constraints))
    )


# Prior sd of ln width: of the common one, of a claim, of an exchangeable claim.
_COMMON_WIDTH_SD = 0.7
_CLAIM_WIDTH_SD = 0.4
_EXCHANGEABLE_WIDTH_SD = 1.5

# A coupling prediction is not trusted closer than this.
_LEAST_COUPLING_SD_HZ = 0.3
_LEAST_SHIFT_SD_PPM = 0.02


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Ground:
    """What bounds and priors stand on, besides the claims.

    Attributes
    ----------
    start_shifts_hz : numpy.ndarray, shape (n_claims,), Hz
    fixed : Fixed
    frequency_mhz : float, MHz
    line_width_hz : float, Hz
        Typical width of the measured lines.
    absent : frozenset of int
        Claims that show no lines; exchangeable ones do not couple either.
    """

    start_shifts_hz: Floats
    fixed: Fixed
    frequency_mhz: float
    line_width_hz: float
    absent: frozenset[int] = frozenset()


def make_layout(
    network: ClaimNetwork, plan: Plan, *, ground: Ground, fits_gauss_share: bool
) -> Layout:
    """Parameter vector for the claims and couplings that a plan draws."""
    claims = network.claims
    drawn = np.array(plan.drawn_claims, dtype=np.int64)
    moving_claims, used_couplings = plan.moving_claims, plan.couplings
    if plan.is_cut:
        # Cuts follow the shifts: what one plan leaves out, the next may need, and
        # one vector has to serve all stages.
        moving_claims, used_couplings = _all_in_play(claims, ground.absent)
    moving = np.array(moving_claims, dtype=np.int64)
    couplings = np.array(
        [k for k in used_couplings if k not in ground.fixed.couplings_hz],
        dtype=np.int64,
    )
    shifts = [_shift_bounds(claims, int(k), ground) for k in moving]
    js = [_coupling_bounds(claims, int(k)) for k in couplings]
    widths = [
        (
            float(np.log(ground.line_width_hz)),
            _COMMON_WIDTH_SD,
            np.log(0.15),
            np.log(40.0),
            0.5,
        )
    ]
    for k in drawn:
        is_loose = claims.claims[k].is_exchangeable
        sd = _EXCHANGEABLE_WIDTH_SD if is_loose else _CLAIM_WIDTH_SD
        reach = 4.0 if is_loose else 2.5
        widths.append((0.0, sd, -reach, reach, 0.5))
    rows = [*shifts, *js, *widths]
    if fits_gauss_share:
        rows.append((0.1, 0.3, 0.0, 1.0, 0.3))
    table = np.array(rows, dtype=np.float64)
    return Layout(
        shift_claims=moving,
        couplings=couplings,
        drawn=drawn,
        fits_gauss_share=fits_gauss_share,
        centres=table[:, 0],
        sds=table[:, 1],
        low=table[:, 2],
        high=table[:, 3],
        step_limits=table[:, 4],
    )


def _all_in_play(
    claims: ClaimSet, absent: frozenset[int]
) -> tuple[tuple[int, ...], tuple[int, ...]]:
    """Claims and couplings that could change some line, whatever the plan."""
    gone = {k for k in absent if claims.claims[k].is_exchangeable}
    owners = [particle.claim for particle in claims.particles]
    moving = sorted({k for k in owners if k is not None and k not in gone})
    couplings = [
        index
        for index, coupling in enumerate(claims.couplings)
        if any(gone.isdisjoint({owners[a], owners[b]}) for a, b in coupling.pairs)
    ]
    return tuple(moving), tuple(couplings)


_Row = tuple[float, float, float, float, float]


def _shift_bounds(claims: ClaimSet, index: int, ground: Ground) -> _Row:
    claim = claims.claims[index]
    centre = claim.shift_ppm * ground.frequency_mhz
    sd = max(claim.shift_sd_ppm, _LEAST_SHIFT_SD_PPM) * ground.frequency_mhz
    start = float(ground.start_shifts_hz[index])
    # A claim far from where it was put belongs to another hypothesis.
    reach = max(60.0, 0.12 * ground.frequency_mhz)
    low, high = start - reach, start + reach
    if index in ground.fixed.ranges_hz:
        low, high = ground.fixed.ranges_hz[index]
    return centre, sd, low, high, 8.0


def _coupling_bounds(claims: ClaimSet, index: int) -> _Row:
    coupling = claims.couplings[index]
    sd = max(coupling.j_sd_hz, _LEAST_COUPLING_SD_HZ)
    reach = max(6.0 * sd, 3.0)
    return coupling.j_hz, sd, coupling.j_hz - reach, coupling.j_hz + reach, 2.0
