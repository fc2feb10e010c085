"""Whether the couplings to an exchanged proton are gone; ppm and Hz."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.optimize import minimize_scalar

from spinledger.sample.shim import Matched
from spinledger.sample.traces import Trace
from spinledger.spins.network import ClaimNetwork
from spinledger.values.claim import ClaimSet
from spinledger.values.ledger import ClaimLines, Ledger

Floats = npt.NDArray[np.float64]

# A splitting narrower than this share of the line width is not resolved.
RESOLVED_SHARE = 0.8
MARGIN_HZ = 8.0
REACH_HZ = 3.0
# Points that one degree of freedom of the noise covers in zero-filled spectra.
CORRELATED_POINTS = 4.0
# Line shape and shim keep two multiplets from agreeing better than this.
LEAST_SD = 0.03


@dataclass(frozen=True, slots=True, kw_only=True)
class Collapse:
    """How far a coupling to an exchanged proton has gone.

    Attributes
    ----------
    claim : str
        The exchanged proton.
    partner : str
        The claim whose multiplet was looked at.
    j_hz : float, Hz
        Before the shake.
    fraction, sd : float
        Share of the partner's molecules without the coupling: 1 all.
    """

    claim: str
    partner: str
    j_hz: float
    fraction: float
    sd: float


def collapses(ledger: Ledger, matched: Matched) -> tuple[Collapse, ...]:
    """Every resolved coupling to an exchangeable proton, looked at after the shake.

    Parameters
    ----------
    ledger : Ledger
        Of the spectrum before.
    matched : Matched
        Both spectra on one axis, with one line width.

    Notes
    -----
    The partner's multiplet after the shake is fitted with its shape with and
    without the coupling, both from the spins fitted before; a molecule that has
    swapped its proton shows the second one. J to deuterium, 6.5 times smaller,
    is not resolved.
    """
    found = []
    for claim in ledger.claims.claims:
        if not claim.is_exchangeable:
            continue
        entry = next(one for one in ledger.entries if one.claim == claim.label)
        for coupling in entry.couplings:
            if coupling.j_hz is None or coupling.partner == claim.label:
                continue
            one = _collapse(
                ledger, matched, (claim.label, coupling.partner), coupling.j_hz
            )
            if one is not None:
                fraction, sd = one
                found.append(
                    Collapse(
                        claim=claim.label,
                        partner=coupling.partner,
                        j_hz=coupling.j_hz,
                        fraction=fraction,
                        sd=sd,
                    )
                )
    return tuple(found)


def fitted_spins(ledger: Ledger, frequency_mhz: float) -> tuple[Floats, Floats]:
    """Shifts and couplings of a ledger, Hz; predictions where nothing was found."""
    claims = ledger.claims
    entries = {one.claim: one for one in ledger.entries}
    shifts = [
        entries[one.label].shift_ppm
        if entries[one.label].shift_ppm is not None
        else one.shift_ppm
        for one in claims.claims
    ]
    couplings = []
    for coupling in claims.couplings:
        owners = [claims.particles[number].claim for number in coupling.pairs[0]]
        labels = [None if k is None else claims.claims[k].label for k in owners]
        found = [
            one.j_hz
            for first, second in (labels, labels[::-1])
            if first is not None
            for one in entries[first].couplings
            if one.partner == second
            and one.predicted_j_hz == coupling.j_hz
            and one.j_hz is not None
        ]
        couplings.append(found[0] if found else coupling.j_hz)
    return np.array(shifts, dtype=np.float64) * frequency_mhz, np.array(
        couplings, dtype=np.float64
    )


def _collapse(
    ledger: Ledger, matched: Matched, pair: tuple[str, str], j_hz: float
) -> tuple[float, float] | None:
    claim, partner = pair
    if ledger.model is None:
        return None
    claims = ledger.claims
    labels = [one.label for one in claims.claims]
    if partner not in labels:
        return None
    index, gone = labels.index(partner), labels.index(claim)
    shown = {one.claim: one for one in ledger.model.claim_lines}
    own = shown.get(partner)
    if own is None:
        return None
    frequency_mhz = ledger.evidence.spectrum.spectrometer_frequency_mhz
    entry = next(one for one in ledger.entries if one.claim == partner)
    if entry.range_ppm is None or abs(j_hz) < RESOLVED_SHARE * own.width_hz:
        return None
    reach_hz = (
        entry.range_ppm[0] * frequency_mhz - MARGIN_HZ,
        entry.range_ppm[1] * frequency_mhz + MARGIN_HZ,
    )
    width_hz = own.width_hz + max(-matched.broadening_hz, 0.0)
    network = ClaimNetwork(claims)
    shifts_hz, couplings_hz = fitted_spins(ledger, frequency_mhz)
    absent = frozenset(
        k for k, label in enumerate(labels) if label not in (*shown, claim)
    )
    shapes = []
    for values_hz in (couplings_hz, _uncoupled(claims, couplings_hz, gone)):
        lines = network.lines(shifts_hz, values_hz, without=absent)
        mine = (lines.claim == index) & _inside(lines.frequencies_hz, reach_hz)
        shapes.append((lines.frequencies_hz[mine], lines.protons[mine]))
    if not all(at.size for at, _ in shapes):
        return None
    others = [one for name, one in shown.items() if name not in pair]
    return _fitted_share(matched.other, shapes, width_hz, others)


def _uncoupled(claims: ClaimSet, couplings_hz: Floats, gone: int) -> Floats:
    """Couplings with those of one claim set to zero."""
    values = np.array(couplings_hz)
    for number, coupling in enumerate(claims.couplings):
        owners = {claims.particles[k].claim for pair in coupling.pairs for k in pair}
        if gone in owners:
            values[number] = 0.0
    return values


def _inside(places_hz: Floats, reach_hz: tuple[float, float]) -> npt.NDArray[np.bool_]:
    """Lines of a signal without the faint ones that strong coupling puts far away."""
    return np.asarray((places_hz >= reach_hz[0]) & (places_hz <= reach_hz[1]))


def _fitted_share(
    trace: Trace,
    shapes: Sequence[tuple[Floats, Floats]],
    width_hz: float,
    others: Sequence[ClaimLines],
) -> tuple[float, float]:
    places_hz = np.concatenate([one[0] for one in shapes])
    window = trace.points(
        (float(places_hz.min()) - MARGIN_HZ) / trace.frequency_mhz,
        (float(places_hz.max()) + MARGIN_HZ) / trace.frequency_mhz,
    )
    axis_hz = trace.shifts_ppm[window] * trace.frequency_mhz
    data = trace.intensities[window]
    extra = [
        _lorentz(
            axis_hz, one.shifts_ppm * trace.frequency_mhz, one.protons, one.width_hz
        )
        for one in others
    ]
    # A neighbour that adds nothing here only shakes the solution.
    tallest = max((float(np.ptp(one)) for one in extra), default=0.0)
    near = [one for one in extra if np.ptp(one) > 0.02 * tallest]
    ground = [np.ones_like(axis_hz), np.linspace(-1.0, 1.0, axis_hz.size)]

    def design(move_hz: float) -> Floats:
        pair = [_lorentz(axis_hz, at + move_hz, p, width_hz) for at, p in shapes]
        return np.column_stack([*pair, *near, *ground])

    def misfit(move_hz: float) -> float:
        columns = design(move_hz)
        solved = np.linalg.lstsq(columns, data, rcond=None)[0]
        return float(np.sum((data - columns @ solved) ** 2))

    moves = np.linspace(-REACH_HZ, REACH_HZ, 13)
    start = float(moves[int(np.argmin([misfit(float(m)) for m in moves]))])
    best = minimize_scalar(misfit, bounds=(start - 0.5, start + 0.5), method="bounded")
    columns = design(float(best.x))
    solved = np.linalg.lstsq(columns, data, rcond=None)[0]
    degrees = max(data.size / CORRELATED_POINTS - columns.shape[1], 1.0)
    variance = float(best.fun) / data.size
    variance = max(
        variance * data.size / CORRELATED_POINTS / degrees, trace.noise_sd**2
    )
    scale = np.abs(columns).max(axis=0)
    normal = (columns / scale).T @ (columns / scale) / CORRELATED_POINTS
    covariance = np.linalg.pinv(normal) * variance / np.outer(scale, scale)
    kept, lost = float(solved[0]), float(solved[1])
    total = kept + lost
    slope = np.array([-lost, kept]) / total**2
    sd = float(np.sqrt(slope @ covariance[:2, :2] @ slope))
    return lost / total, float(np.hypot(sd, LEAST_SD))


def _lorentz(
    axis_hz: Floats, places_hz: Floats, weights: Floats, width_hz: float
) -> Floats:
    """Sum of Lorentz lines of unit area a proton."""
    half = width_hz / 2.0
    apart = axis_hz[:, None] - places_hz[None, :]
    return np.asarray((half / np.pi / (apart**2 + half**2)) @ weights)
