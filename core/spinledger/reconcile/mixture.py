"""Claims of several species in one tube joined into one set."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from spinledger.values.claim import Claim, ClaimSet, CouplingClaim, Particle

# A user's mixture says what is there, not how much.
UNKNOWN_SHARE_SD = 0.5


def joined(sets: Sequence[ClaimSet]) -> ClaimSet:
    """One claim set of all species, with labels made unique.

    Parameters
    ----------
    sets : sequence of ClaimSet
        The first one belongs to the claimed structure. Shares of a single set
        are kept; with several sets each species' share is free.

    Raises
    ------
    ValueError
        If there is no set.
    """
    if not sets:
        raise ValueError("sets: need one claim set or more")
    if len(sets) == 1:
        return sets[0]
    claims: list[Claim] = []
    particles: list[Particle] = []
    couplings: list[CouplingClaim] = []
    shares: list[tuple[float, float]] = []
    names: list[str] = []
    notes: list[str] = []
    for number, one in enumerate(sets):
        first_claim, first_particle = len(claims), len(particles)
        first_coupling, first_species = len(couplings), len(shares)
        suffix = "" if number == 0 else f" ({number + 1})"
        claims += [
            replace(
                claim,
                label=claim.label + suffix,
                pair=None if claim.pair is None else claim.pair + suffix,
                species=claim.species + first_species,
            )
            for claim in one.claims
        ]
        particles += [
            replace(
                particle,
                claim=None if particle.claim is None else particle.claim + first_claim,
            )
            for particle in one.particles
        ]
        couplings += [
            replace(
                coupling,
                pairs=tuple(
                    (a + first_particle, b + first_particle) for a, b in coupling.pairs
                ),
                swaps_with=None
                if coupling.swaps_with is None
                else coupling.swaps_with + first_coupling,
            )
            for coupling in one.couplings
        ]
        shares += [
            (share / len(sets), max(sd, UNKNOWN_SHARE_SD))
            for share, sd in one.species_shares
        ]
        names += one.species_smiles
        notes += one.notes
    return ClaimSet(
        claims=tuple(claims),
        particles=tuple(particles),
        couplings=tuple(couplings),
        species_smiles=tuple(names),
        species_shares=tuple(shares),
        notes=tuple(notes),
    )
