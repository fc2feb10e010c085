"""What the measured couplings say about the geometry of the claimed structure.

Couplings in Hz, angles in degrees.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from rdkit import Chem

from spinledger.processing.solvents import canonical_solvent, is_aqueous
from spinledger.reconcile.configurations import (
    Configuration,
    configurations,
    related_centres,
    relation_name,
)
from spinledger.reconcile.evaluate import Evaluation
from spinledger.reconcile.geometry_words import geometry_sentences
from spinledger.reconcile.measured_couplings import (
    Labelling,
    MeasuredVicinal,
    antiperiplanar,
    carrier,
    labellings,
    log_evidence,
    measured_vicinal,
)
from spinledger.reconcile.solve import Limits
from spinledger.structure.conformers import Ensemble, ensemble
from spinledger.structure.read import molecule
from spinledger.structure.settled import settled, with_hydrogens
from spinledger.structure.species import in_solution
from spinledger.values.claim import ClaimSet
from spinledger.values.geometry import ConfigurationOdds, DihedralShare, Geometry

#: Configurations tried, by heavy atoms: conformers cost more for large ones.
CONFIGURATION_EFFORT = 80
MOST_HEAVY_ATOMS = 40
#: Doubt in the model itself, on top of each probability: no odds beyond 40 to 1.
MODEL_DOUBT = 0.025
#: Labellings within these log odds of the best one are averaged.
CLOSE_LOG_ODDS = 3.0


def what_couplings_say(
    evaluation: Evaluation, limits: Limits, *, ph: float | None = None
) -> Geometry | None:
    """Conformer populations and relative configuration by the measured couplings.

    Parameters
    ----------
    evaluation : Evaluation
        Of the claimed structure.
    limits : Limits
        Let the user stop; no configuration is begun after the deadline.
    ph : float, optional
        Of the sample.

    Returns
    -------
    Geometry or None
        None where no determined coupling runs between saturated CH or CH2, or
        no conformers can be made.
    """
    solution = evaluation.solution
    if solution is None:
        return None
    solvent = evaluation.evidence.solvent
    known = (canonical_solvent(solvent) or solvent) if solvent else None
    species = in_solution(molecule(evaluation.structure), known, ph).species
    main = int(np.argmax([share for share, _ in evaluation.claims.species_shares]))
    if main >= len(species) or species[main].mol.GetNumHeavyAtoms() > MOST_HEAVY_ATOMS:
        return None
    drawn = settled(species[main].mol)
    measured = measured_vicinal(solution, with_hydrogens(drawn), main)
    if not measured:
        return None
    return geometry_of(
        drawn, measured, evaluation.claims, limits, in_water=is_aqueous(solvent)
    )


def geometry_of(
    drawn: Chem.Mol,
    measured: Sequence[MeasuredVicinal],
    claims: ClaimSet,
    limits: Limits,
    *,
    in_water: bool,
) -> Geometry | None:
    """Geometry of one species from given couplings; None without conformers.

    Parameters
    ----------
    drawn : rdkit.Chem.Mol
        Settled, hydrogens implicit.
    measured : sequence of MeasuredVicinal
    claims : ClaimSet
        Gives the labels.
    limits : Limits
    in_water : bool
    """
    mol = with_hydrogens(drawn)
    conformers = ensemble(mol, is_aqueous=in_water)
    if conformers.is_empty:
        return None
    found = labellings(mol, conformers, measured, is_aqueous=in_water)
    dihedrals = _dihedrals(mol, conformers, measured, found, claims)
    odds = _configuration_odds(drawn, measured, limits, claims, in_water=in_water)
    best = found[0].fit
    before = (best.prior @ best.values - [one.j_hz for one in measured]) / best.sds
    return Geometry(
        n_conformers=int(conformers.weights.size),
        effective_share=float(np.exp(-best.relative_entropy)),
        misfit_before=float(np.sqrt(np.mean(before**2))),
        misfit_after=float(np.sqrt(np.mean(best.deviations**2))),
        dihedrals=dihedrals,
        configurations=odds,
        sentences=geometry_sentences(dihedrals, odds),
    )


def _dihedrals(
    mol: Chem.Mol,
    conformers: Ensemble,
    measured: Sequence[MeasuredVicinal],
    found: Sequence[Labelling],
    claims: ClaimSet,
) -> tuple[DihedralShare, ...]:
    """Shares averaged over the labellings that the couplings leave open."""
    top = found[0].fit.log_evidence
    close = [one for one in found if top - one.fit.log_evidence < CLOSE_LOG_ODDS]
    odds = np.exp([one.fit.log_evidence - top for one in close])
    odds = odds / odds.sum()
    rows = []
    for number, one in enumerate(measured):
        shares = []
        for option in close:
            is_anti, angle = antiperiplanar(mol, conformers, one, option.swapped)
            mean, sd = option.fit.mean_and_sd(is_anti)
            mean_angle = float(option.fit.weights @ angle)
            spread = float(option.fit.weights @ (angle - mean_angle) ** 2)
            prior = float(option.fit.prior @ is_anti)
            fitted = float(option.fit.weights @ option.fit.values[:, number])
            shares.append((mean, sd**2, mean_angle, spread, prior, fitted))
        table = np.array(shares)
        mean, variance, mean_angle, spread, prior, fitted = odds @ table
        among = odds @ (table[:, [0, 2]] - [mean, mean_angle]) ** 2
        rows.append(
            DihedralShare(
                first=claims.claims[one.first].label,
                second=claims.claims[one.second].label,
                is_in_ring=one.is_in_ring,
                j_hz=one.j_hz,
                j_sd_hz=one.j_sd_hz,
                fitted_j_hz=float(fitted),
                anti_share=float(np.clip(mean, 0.0, 1.0)),
                anti_share_sd=float(np.sqrt(variance + among[0])),
                prior_anti_share=float(prior),
                angle_deg=float(mean_angle),
                angle_sd_deg=float(np.sqrt(spread + among[1])),
            )
        )
    return tuple(rows)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class _Weighed:
    configuration: Configuration
    name: str
    log_evidence: float
    misfit_sd: float


def _configuration_odds(
    drawn: Chem.Mol,
    measured: Sequence[MeasuredVicinal],
    limits: Limits,
    claims: ClaimSet,
    *,
    in_water: bool,
) -> tuple[ConfigurationOdds, ...]:
    """Probabilities of the relative configurations, the likeliest first."""
    weighed: list[_Weighed] = []
    limit = max(CONFIGURATION_EFFORT // drawn.GetNumHeavyAtoms(), 2)
    for one in configurations(drawn, limit=limit):
        limits.checked()
        if limits.is_over():
            return ()
        row = _weighed(one, measured, claims, in_water=in_water)
        if row is not None:
            weighed.append(row)
    if len(weighed) < 2:
        return ()
    heights = np.array([one.log_evidence for one in weighed])
    shares = np.exp(heights - heights.max())
    shares = shares / shares.sum() + MODEL_DOUBT
    shares = shares / shares.sum()
    rows = [
        ConfigurationOdds(
            smiles=one.configuration.smiles,
            name=one.name,
            probability=float(share),
            is_drawn=one.configuration.is_drawn,
            misfit_sd=one.misfit_sd,
        )
        for one, share in zip(weighed, shares, strict=True)
    ]
    return tuple(sorted(rows, key=lambda row: -row.probability))


def _weighed(
    one: Configuration,
    measured: Sequence[MeasuredVicinal],
    claims: ClaimSet,
    *,
    in_water: bool,
) -> _Weighed | None:
    """Evidence of one configuration; None where it cannot be built."""
    mol = with_hydrogens(one.mol)
    conformers = ensemble(mol, is_aqueous=in_water)
    if conformers.is_empty:
        return None
    found = labellings(mol, conformers, measured, is_aqueous=in_water)
    return _Weighed(
        configuration=one,
        name=_name(one, mol, conformers, claims),
        log_evidence=log_evidence(found),
        misfit_sd=float(np.abs(found[0].fit.deviations).max()),
    )


def _name(
    one: Configuration, mol: Chem.Mol, conformers: Ensemble, claims: ClaimSet
) -> str:
    """Relation of two centres, as "cis"; of more, which of them are turned over."""
    centres = related_centres(one.mol)
    if len(centres) == 2:
        relation = relation_name(mol, conformers.positions[0], *centres)
        if relation:
            return relation
    if not one.flipped:
        return "as drawn" if one.is_drawn else "one choice"
    labels = [_label_at(mol, claims, centre) for centre in one.flipped]
    return f"{' and '.join(labels)} turned over"


def _label_at(mol: Chem.Mol, claims: ClaimSet, centre: int) -> str:
    """Label of a claim whose proton sits on a centre."""
    for particle in claims.particles:
        if particle.claim is None or not particle.hydrogens:
            continue
        if any(
            h < mol.GetNumAtoms() and carrier(mol, h) == centre
            for h in particle.hydrogens
        ):
            return claims.claims[particle.claim].label
    return "a centre"
