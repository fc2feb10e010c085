"""Random systems and claim sets that several tests of spins use."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from spinledger.values.claim import Claim, ClaimSet, CouplingClaim, Particle
from spinledger.values.spin_system import SpinSystem

Floats = npt.NDArray[np.float64]


def random_system(n_spins: list[int], rng: np.random.Generator) -> SpinSystem:
    """Strongly coupled protons: shifts within 120 Hz, J from -15 to 15 Hz."""
    size = len(n_spins)
    couplings = np.triu(rng.uniform(-15.0, 15.0, (size, size)), 1)
    return SpinSystem(
        n_spins=np.array(n_spins),
        frequencies_hz=rng.uniform(0.0, 120.0, size),
        couplings_hz=couplings + couplings.T,
        nuclei=("1H",) * size,
    )


def decaying_signal(frequencies_hz: Floats, intensities: Floats) -> Floats:
    """Sum of intensity * cos and sin at fixed times: a fingerprint without order."""
    times_s = np.linspace(0.0, 0.9, 40)
    turns = 2j * np.pi * np.outer(frequencies_hz, times_s)
    signal = intensities @ np.exp(turns)
    return np.concatenate([signal.real, signal.imag], axis=-1)


def claim_set(
    groups: list[tuple[str, list[int], float]],
    couplings: list[tuple[list[tuple[int, int]], float]],
    *,
    j_sd_hz: float = 2.0,
    shift_sd_ppm: float = 0.2,
) -> ClaimSet:
    """Claims from (label, spins of each particle, shift) and (pairs, J)."""
    claims, particles = [], []
    for index, (label, members, shift_ppm) in enumerate(groups):
        claims.append(
            Claim(
                label=label,
                atoms=(index,),
                n_protons=sum(members),
                shift_ppm=shift_ppm,
                shift_sd_ppm=shift_sd_ppm,
            )
        )
        particles += [
            Particle(claim=index, nucleus="1H", n_spins=n, hydrogens=())
            for n in members
        ]
    return ClaimSet(
        claims=tuple(claims),
        particles=tuple(particles),
        couplings=tuple(
            CouplingClaim(
                pairs=tuple(pairs),
                j_hz=j_hz,
                j_sd_hz=j_sd_hz,
                kind="vicinal chain",
                bonds=3,
                is_rigid=False,
            )
            for pairs, j_hz in couplings
        ),
    )


def predictions(claims: ClaimSet, frequency_mhz: float) -> tuple[Floats, Floats]:
    """Predicted shifts in Hz and couplings."""
    shifts = np.array([claim.shift_ppm for claim in claims.claims]) * frequency_mhz
    return shifts, np.array([coupling.j_hz for coupling in claims.couplings])
