"""One spectrum fitted again with the couplings that others of its sample show; Hz."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from spinledger.reconcile.refine import refine
from spinledger.reconcile.refine_values import (
    Refinement,
    RefineSettings,
    Stage,
    Start,
)
from spinledger.sample.collapse import fitted_spins
from spinledger.sample.tables import (
    COUPLING_FLOOR_HZ,
    CouplingKey,
    Figure,
    Table,
    coupling_key,
)
from spinledger.values.claim import ClaimSet
from spinledger.values.ledger import Ledger

# No prior is taken to be closer than this by the refinement.
LEAST_PRIOR_SD_HZ = 0.3
# A fit that leaves this much more unexplained is not taken.
WORSE_SHARE = 1.2
SLIGHT_SHARE = 0.005
# From the ledger's own fit on, the sharper stages are enough.
_SETTINGS = RefineSettings(
    stages=(
        Stage(broadening_hz=2.0, max_steps=8),
        Stage(broadening_hz=0.5, max_steps=12),
        Stage(broadening_hz=0.0, max_steps=20),
    ),
    fit_shape=False,
    exact_slopes=False,
    second_thoughts=0,
)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Refit:
    """How a spectrum takes the couplings of the others.

    Attributes
    ----------
    share_before, share_after : float
        Part of the signals left unexplained by the same fit with the predicted
        couplings and with the others' as priors.
    taken : bool
        Whether it explains the spectrum as well.
    table : Table
        What its own data say in that fit.
    """

    share_before: float
    share_after: float
    taken: bool
    table: Table


def refit(
    ledger: Ledger,
    table: Table,
    known: Mapping[CouplingKey, Figure],
    *,
    cancelled: Callable[[], bool] | None = None,
) -> Refit | None:
    """Fit a spectrum with known couplings as priors, or None without a fit to start.

    Parameters
    ----------
    ledger : Ledger
    table : Table
        Of this ledger, in the order of claims that suits the others.
    known : mapping of coupling key to Figure, Hz
        |J| from the other spectra.
    cancelled : callable, optional

    Notes
    -----
    A prior adds its inverse variance; taking it off the result gives back what
    the data of this spectrum alone say, as a normal likelihood.
    """
    if ledger.model is None:
        return None
    claims = ledger.claims
    keys = coupling_keys(claims)
    informed = _informed(claims, keys, known)
    frequency_mhz = ledger.evidence.spectrum.spectrometer_frequency_mhz
    shifts_hz, couplings_hz = fitted_spins(ledger, frequency_mhz)
    shown = {one.claim for one in ledger.model.claim_lines}
    labels = [one.label for one in claims.claims]
    own_shifts = np.array(
        [
            table.shifts_ppm[label].value if label in table.shifts_ppm else at
            for label, at in zip(labels, shifts_hz / frequency_mhz, strict=True)
        ]
    )
    absent = frozenset(k for k, label in enumerate(labels) if label not in shown)
    start = Start(shifts_ppm=own_shifts, couplings_hz=couplings_hz, absent=absent)
    moved = replace(start, couplings_hz=_started(couplings_hz, keys, known))
    before = refine(
        ledger.evidence, claims, start, settings=_SETTINGS, cancelled=cancelled
    )
    after = refine(
        ledger.evidence, informed, moved, settings=_SETTINGS, cancelled=cancelled
    )
    shares = (before.residuals.boxcar_share, after.residuals.boxcar_share)
    return Refit(
        share_before=shares[0],
        share_after=shares[1],
        taken=shares[1] <= max(WORSE_SHARE * shares[0], shares[0] + SLIGHT_SHARE),
        table=_own_table(table, after, informed, keys, known),
    )


def coupling_keys(claims: ClaimSet) -> list[CouplingKey | None]:
    """Key of every coupling as tables have it; None for one to another nucleus."""
    counts: dict[tuple[str, str], int] = {}
    keys: list[CouplingKey | None] = []
    for coupling in claims.couplings:
        owners = [claims.particles[number].claim for number in coupling.pairs[0]]
        if owners[0] is None or owners[1] is None:
            keys.append(None)
            continue
        first, second, _ = coupling_key(
            claims.claims[owners[0]].label, claims.claims[owners[1]].label
        )
        number = counts.get((first, second), 0)
        counts[first, second] = number + 1
        keys.append((first, second, number))
    return keys


def _informed(
    claims: ClaimSet,
    keys: list[CouplingKey | None],
    known: Mapping[CouplingKey, Figure],
) -> ClaimSet:
    couplings = list(claims.couplings)
    for index, key in enumerate(keys):
        if key is None or key not in known:
            continue
        sign = -1.0 if couplings[index].j_hz < 0.0 else 1.0
        couplings[index] = replace(
            couplings[index],
            j_hz=sign * known[key].value,
            j_sd_hz=max(known[key].sd, LEAST_PRIOR_SD_HZ),
        )
    return replace(claims, couplings=tuple(couplings))


def _started(
    couplings_hz: npt.NDArray[np.float64],
    keys: list[CouplingKey | None],
    known: Mapping[CouplingKey, Figure],
) -> npt.NDArray[np.float64]:
    values = np.array(couplings_hz)
    for index, key in enumerate(keys):
        if key is not None and key in known:
            sign = -1.0 if values[index] < 0.0 else 1.0
            values[index] = sign * known[key].value
    return values


def _own_table(
    table: Table,
    fit: Refinement,
    informed: ClaimSet,
    keys: list[CouplingKey | None],
    known: Mapping[CouplingKey, Figure],
) -> Table:
    """Values of a fit with the priors of the others taken off again."""
    couplings = {}
    for index, key in enumerate(keys):
        sd = float(fit.coupling_sds_hz[index])
        if key is None or not np.isfinite(sd):
            continue
        value = abs(float(fit.couplings_hz[index]))
        if key not in known:
            if bool(fit.determined[index]):
                couplings[key] = _figure(value, sd)
            continue
        prior_sd = informed.couplings[index].j_sd_hz
        precision = sd**-2 - prior_sd**-2
        # Less than half of what is known comes from these data.
        if precision < 0.5 * sd**-2:
            continue
        own = (value * sd**-2 - known[key].value * prior_sd**-2) / precision
        couplings[key] = _figure(own, precision**-0.5)
    shifts = {
        claim.label: Figure(
            value=float(fit.shifts_ppm[index]), sd=float(fit.shift_sds_ppm[index])
        )
        for index, claim in enumerate(informed.claims)
        if claim.label in table.shifts_ppm and np.isfinite(fit.shift_sds_ppm[index])
    }
    return replace(
        table, shifts_ppm={**table.shifts_ppm, **shifts}, couplings_hz=couplings
    )


def _figure(value: float, sd: float) -> Figure:
    return Figure(value=value, sd=float(np.hypot(sd, COUPLING_FLOOR_HZ)))
