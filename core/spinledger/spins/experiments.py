"""What other experiments on the same claims would show; shifts in ppm, J in Hz."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from spinledger.spins.network import ClaimLineSet, ClaimNetwork

Floats = npt.NDArray[np.float64]


def lines_at_field(
    network: ClaimNetwork,
    shifts_ppm: Floats,
    couplings_hz: Floats,
    *,
    frequency_mhz: float,
    irradiated: frozenset[int] = frozenset(),
    without: frozenset[int] = frozenset(),
) -> ClaimLineSet:
    """Exact lines at some field, with some claims irradiated.

    Parameters
    ----------
    network : ClaimNetwork
    shifts_ppm : numpy.ndarray, shape (n_claims,), ppm
    couplings_hz : numpy.ndarray, shape (n_couplings,), Hz
    frequency_mhz : float, MHz
        Spectrometer frequency of the experiment.
    irradiated : frozenset of int
        Claims that a second field saturates: they show no lines and split
        nothing (homodecoupling).
    without : frozenset of int
        Claims that show no lines; exchangeable ones split nothing either.

    Notes
    -----
    Irradiation is taken as perfect and selective: what it does to near signals
    (Bloch-Siegert shifts, partial collapse) is left out.
    """
    kept = np.array(couplings_hz, dtype=np.float64)
    if irradiated:
        for index in range(kept.size):
            if network.claims_of(index) & irradiated:
                kept[index] = 0.0
    return network.lines(
        np.asarray(shifts_ppm, dtype=np.float64) * frequency_mhz,
        kept,
        without=without | irradiated,
    )
