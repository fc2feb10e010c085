"""Claims of a structure in a solvent: what must be in its spectrum. Shifts in ppm."""

from __future__ import annotations

import functools
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

from rdkit import Chem

from spinledger.prediction.claims_notes import notes_on
from spinledger.prediction.couplings import predict_couplings
from spinledger.prediction.shifts import predict_shifts
from spinledger.prediction.shifts_pairs import pair_offsets
from spinledger.prediction.shifts_reasons import (
    KnownEnvironment,
    known_environments,
)
from spinledger.processing.solvents import canonical_solvent, is_aqueous
from spinledger.structure.exchange import (
    Exchange,
    couples_over_exchange,
    exchanges,
)
from spinledger.structure.labels import group_labels
from spinledger.structure.locants import locants
from spinledger.structure.read import molecule
from spinledger.structure.settled import settled, with_hydrogens
from spinledger.structure.species import Solution, Species, in_solution
from spinledger.structure.topicity import (
    ProtonGroup,
    hetero_particles,
    proton_groups,
)
from spinledger.structure.vantage import places
from spinledger.values.claim import (
    Claim,
    ClaimSet,
    CouplingClaim,
    Particle,
    Visibility,
)
from spinledger.values.structure import Structure

# A species with a smaller share may be lost in the noise.
_MINOR_SHARE: Final = 0.15
_BORDERLINE_SD_PPM: Final = 0.25
_BORDERLINE_BONDS: Final = 3


def make_claims(
    structure: Structure,
    *,
    solvent: str | None,
    ph: float | None = None,
    temperature_k: float | None = None,
    slow_exchange: bool | None = None,
) -> ClaimSet:
    """Everything that a structure claims about its proton spectrum.

    Parameters
    ----------
    structure : Structure
    solvent : str or None
        Any usual name; None where it is not known.
    ph : float, optional
        Of a solution in water; 7.4 is taken where it is not known.
    temperature_k : float, K, optional
        Of the sample; decides which bonds turn slowly.
    slow_exchange : bool, optional
        Whether OH and NH that are seen show their couplings to CH. Both happen in
        CDCl3; where it is not given, the usual case of the solvent is taken.

    Returns
    -------
    ClaimSet
        Atoms of the claims are heavy atoms of the given structure, whatever
        the species. ``hydrogens`` of a particle index the species' own
        molecule with hydrogens appended (:func:`species_models`).
    """
    known = canonical_solvent(solvent) if solvent else None
    return _claims(structure, known or solvent, ph, temperature_k, slow_exchange)


def species_models(
    structure: Structure, *, solvent: str | None, ph: float | None = None
) -> tuple[Chem.Mol, ...]:
    """Molecule with hydrogens of each species, as the claims' particles index it."""
    known = canonical_solvent(solvent) if solvent else None
    solution = in_solution(molecule(structure), known or solvent, ph)
    return tuple(with_hydrogens(settled(species.mol)) for species in solution.species)


def environments_of(
    structure: Structure,
    claims: ClaimSet,
    *,
    solvent: str | None,
    ph: float | None = None,
) -> tuple[tuple[KnownEnvironment, ...], ...]:
    """Known environments behind the shift of every claim, nearest last.

    Parameters
    ----------
    structure : Structure
    claims : ClaimSet
        Made of it by :func:`make_claims` with the same solvent and pH.
    solvent : str or None
    ph : float, optional

    Returns
    -------
    tuple of tuple of KnownEnvironment, one a claim
        Empty for exchangeable protons, whose shift is a usual range.
    """
    known = canonical_solvent(solvent) if solvent else None
    solution = in_solution(molecule(structure), known or solvent, ph)
    models = [settled(species.mol) for species in solution.species]
    return tuple(
        ()
        if claim.is_exchangeable
        else known_environments(models[claim.species], claim.atoms[0])
        for claim in claims.claims
    )


@functools.lru_cache(maxsize=128)
def _claims(
    structure: Structure,
    solvent: str | None,
    ph: float | None,
    temperature_k: float | None,
    slow_exchange: bool | None,
) -> ClaimSet:
    drawn = molecule(structure)
    solution = in_solution(drawn, solvent, ph)
    numbers = tuple(
        (structure.locants[i] if i < len(structure.locants) else None) or number
        for i, number in enumerate(locants(drawn))
    )
    maker = _Maker(
        solvent=solvent,
        ph=ph,
        temperature_k=temperature_k,
        slow_exchange=slow_exchange,
        numbers=numbers,
        n_given=drawn.GetNumAtoms(),
    )
    parts = [
        maker.claims_of(species, index, len(solution.species))
        for index, species in enumerate(solution.species)
    ]
    return _joined(parts, solution, notes_on(drawn, solution, temperature_k))


@dataclass(frozen=True, slots=True, kw_only=True)
class _SpeciesClaims:
    claims: tuple[Claim, ...]
    particles: tuple[Particle, ...]
    couplings: tuple[CouplingClaim, ...]


def _joined(
    parts: Sequence[_SpeciesClaims], solution: Solution, notes: tuple[str, ...]
) -> ClaimSet:
    """Claims of all species in one set, indices moved up."""
    claims: list[Claim] = []
    particles: list[Particle] = []
    couplings: list[CouplingClaim] = []
    for part in parts:
        n_claims, n_particles = len(claims), len(particles)
        n_couplings = len(couplings)
        claims.extend(part.claims)
        particles.extend(
            replace(p, claim=None if p.claim is None else p.claim + n_claims)
            for p in part.particles
        )
        couplings.extend(
            replace(
                c,
                pairs=tuple((a + n_particles, b + n_particles) for a, b in c.pairs),
                swaps_with=None if c.swaps_with is None else c.swaps_with + n_couplings,
            )
            for c in part.couplings
        )
    return ClaimSet(
        claims=tuple(claims),
        particles=tuple(particles),
        couplings=tuple(couplings),
        species_smiles=tuple(Chem.MolToSmiles(s.mol) for s in solution.species),
        species_shares=tuple((s.share, s.share_sd) for s in solution.species),
        notes=notes,
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class _Maker:
    """What all species of one structure share."""

    solvent: str | None
    ph: float | None
    temperature_k: float | None
    slow_exchange: bool | None
    numbers: tuple[str | None, ...]
    n_given: int

    def claims_of(self, species: Species, index: int, count: int) -> _SpeciesClaims:
        """Claims, particles and couplings of one species, counted from 0."""
        mol = settled(species.mol)
        groups = [
            group
            for group in proton_groups(mol, temperature_k=self.temperature_k)
            if all(carrier < self.n_given for carrier in group.carriers)
        ]
        groups = _with_partners_renumbered(mol, groups)
        labels = group_labels(mol, groups, self.numbers)
        if count > 1:
            labels = tuple(f"{label} ({species.name})" for label in labels)
        swapping = exchanges(mol, self.solvent, self.ph)
        claims = tuple(
            replace(claim, species=index)
            for claim in self._claims(mol, species, groups, labels, swapping)
        )
        particles = _particles(mol, groups, claims)
        couplings = self._couplings(mol, particles, groups, swapping)
        return _SpeciesClaims(claims=claims, particles=particles, couplings=couplings)

    def _claims(
        self,
        mol: Chem.Mol,
        species: Species,
        groups: Sequence[ProtonGroup],
        labels: Sequence[str],
        swapping: dict[int, Exchange],
    ) -> list[Claim]:
        carbons = [
            g.carriers[0]
            for g in groups
            if not _is_exchangeable(swapping.get(g.carriers[0]))
        ]
        predicted = dict(
            zip(
                carbons, predict_shifts(mol, carbons, solvent=self.solvent), strict=True
            )
        )
        offsets = pair_offsets(mol, groups, predicted, temperature_k=self.temperature_k)
        where = places(mol, groups)
        claims = []
        for index, group in enumerate(groups):
            swap = swapping.get(group.carriers[0])
            visibility, why = _visibility(species, swap)
            if swap is not None and swap.is_exchangeable:
                shift, sd = swap.shift_ppm or 0.0, swap.shift_sd_ppm or 3.0
                source = f"usual range of this kind of proton ({swap.kind})"
            else:
                found = predicted[group.carriers[0]]
                shift, sd, source = found.shift_ppm, found.sd_ppm, found.source
            offset, spread = offsets[index]
            sd = (sd**2 + spread**2 + _borderline(mol, species, group) ** 2) ** 0.5
            claims.append(
                Claim(
                    label=labels[index],
                    atoms=group.carriers,
                    n_protons=len(group.hydrogens),
                    shift_ppm=shift + offset,
                    shift_sd_ppm=sd,
                    is_exchangeable=_is_exchangeable(swap),
                    pair=_pair(groups, labels, index),
                    shift_source=source,
                    visibility=visibility,
                    why=why,
                    place=where[index],
                )
            )
        return claims

    def _couplings(
        self,
        mol: Chem.Mol,
        particles: Sequence[Particle],
        groups: Sequence[ProtonGroup],
        swapping: dict[int, Exchange],
    ) -> tuple[CouplingClaim, ...]:
        coupled = [
            place
            for place, particle in enumerate(particles)
            if particle.claim is None
            or self._couples(swapping.get(groups[particle.claim].carriers[0]))
        ]
        found = predict_couplings(
            with_hydrogens(mol),
            tuple(particles[place] for place in coupled),
            is_aqueous=is_aqueous(self.solvent),
        )
        return tuple(
            replace(c, pairs=tuple((coupled[a], coupled[b]) for a, b in c.pairs))
            for c in found
        )

    def _couples(self, swap: Exchange | None) -> bool:
        if swap is None or not swap.is_exchangeable:
            return True
        if self.slow_exchange is not None:
            return self.slow_exchange
        return couples_over_exchange(swap.kind, self.solvent)


def _is_exchangeable(swap: Exchange | None) -> bool:
    return swap is not None and swap.is_exchangeable


def _visibility(species: Species, swap: Exchange | None) -> tuple[Visibility, str]:
    if swap is not None:
        return swap.visibility, swap.why
    if species.share < _MINOR_SHARE:
        return (
            "optional",
            f"The {species.name} is a minor species; it may be too weak to see.",
        )
    return "seen", ""


def _pair(
    groups: Sequence[ProtonGroup], labels: Sequence[str], index: int
) -> str | None:
    partners = groups[index].partners
    return labels[partners[0]] if len(partners) == 1 else None


def _borderline(mol: Chem.Mol, species: Species, group: ProtonGroup) -> float:
    """Extra sd beside a group that is half protonated, ppm."""
    if not species.borderline:
        return 0.0
    distances = Chem.GetDistanceMatrix(mol)
    nearest = min(
        distances[carrier][atom]
        for carrier in group.carriers
        for atom in species.borderline
    )
    return _BORDERLINE_SD_PPM / max(nearest, 1) if nearest <= _BORDERLINE_BONDS else 0.0


def _with_partners_renumbered(
    mol: Chem.Mol, groups: Sequence[ProtonGroup]
) -> list[ProtonGroup]:
    """Groups whose partners index this (shorter) list."""
    everything = [set(group.carriers) for group in groups]
    return [
        replace(
            group,
            partners=tuple(
                other
                for other, carriers in enumerate(everything)
                if other != index
                and carriers & everything[index]
                and mol.GetAtomWithIdx(group.carriers[0]).GetTotalNumHs() == 2
            ),
        )
        for index, group in enumerate(groups)
    ]


def _particles(
    mol: Chem.Mol, groups: Sequence[ProtonGroup], claims: Sequence[Claim]
) -> tuple[Particle, ...]:
    """Particles of all claims that may be seen, then of hetero spins near them."""
    found = [
        Particle(claim=index, nucleus="1H", n_spins=len(part), hydrogens=part)
        for index, (group, claim) in enumerate(zip(groups, claims, strict=True))
        if claim.visibility != "silent"
        for part in group.particles
    ]
    carriers = {
        carrier
        for group, claim in zip(groups, claims, strict=True)
        if claim.visibility != "silent"
        for carrier in group.carriers
    }
    found.extend(
        Particle(claim=None, nucleus=nucleus, n_spins=len(atoms), hydrogens=atoms)
        for nucleus, atoms in hetero_particles(mol, carriers)
    )
    return tuple(found)
