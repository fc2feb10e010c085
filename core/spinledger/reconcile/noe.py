"""NOE contacts from conformers; distances in Angstrom, shifts in ppm."""

from __future__ import annotations

from itertools import combinations

import numpy as np

from spinledger.processing.solvents import canonical_solvent, is_aqueous
from spinledger.reconcile.advice_view import Finding, View
from spinledger.structure.conformers import ensemble
from spinledger.structure.read import molecule
from spinledger.structure.settled import settled, with_hydrogens
from spinledger.structure.species import in_solution

#: Beyond this no contact is seen; within the other one it is strong.
FURTHEST = 5.0
STRONG = 4.0
#: A distance from an NOE, spin diffusion and conformers allowed for.
LOG_DISTANCE_SD = 0.2
#: An NOE may fail for reasons of its own (tumbling, relaxation).
MOST_LOG_ODDS = 3.0
DIAGONAL_PPM = 0.05
MOST_HEAVY_ATOMS = 40

Distances = dict[tuple[int, int], float]


def contact_distances(view: View, *, ph: float | None = None) -> Distances:
    """Distances between placed claims on carbon as NOE see them.

    Parameters
    ----------
    view : View
    ph : float, optional

    Returns
    -------
    dict
        Inverse sixth power averaged over conformers and over the protons of
        both claims, then the root; beyond 5 Angstrom it reads 5. Pairs of
        claims, lower index first; empty where there are no conformers.

    References
    ----------
    .. [1] D. Neuhaus, M. P. Williamson, The Nuclear Overhauser Effect in
       Structural and Conformational Analysis, 2nd ed., 2000, chapter 5; from
       memory.
    """
    evaluation = view.evaluation
    solvent = evaluation.evidence.solvent
    known = (canonical_solvent(solvent) or solvent) if solvent else None
    species = in_solution(molecule(evaluation.structure), known, ph).species
    if species[0].mol.GetNumHeavyAtoms() > MOST_HEAVY_ATOMS:
        return {}
    mol = with_hydrogens(settled(species[0].mol))
    conformers = ensemble(mol, is_aqueous=is_aqueous(solvent))
    if conformers.is_empty:
        return {}
    hydrogens: dict[int, list[int]] = {}
    for particle in evaluation.claims.particles:
        claim = particle.claim
        if claim in view.places and evaluation.claims.claims[claim].species == 0:
            hydrogens.setdefault(claim, []).extend(particle.hydrogens)
    found: Distances = {}
    for first, second in combinations(sorted(hydrogens), 2):
        gaps = (
            conformers.positions[:, hydrogens[first], None, :]
            - conformers.positions[:, None, hydrogens[second], :]
        )
        sixth = np.sum(gaps**2, axis=-1) ** -3.0
        mean = float(conformers.weights @ sixth.mean(axis=(1, 2)))
        found[first, second] = min(mean ** (-1.0 / 6.0), FURTHEST)
    return found


def noe_finding(
    own: View, other: View, distances: tuple[Distances, Distances]
) -> Finding | None:
    """The contact whose distance differs most between two structures."""
    best: tuple[float, str] | None = None
    total = 0.0
    for (first, second), mine in distances[0].items():
        shifts = own.places[first], own.places[second]
        theirs = other.near(shifts[0]), other.near(shifts[1])
        if abs(shifts[0] - shifts[1]) < DIAGONAL_PPM or None in theirs:
            continue
        pair = sorted(k for k in theirs if k is not None)
        not_mine = distances[1].get((pair[0], pair[-1]))
        if not_mine is None or min(mine, not_mine) > STRONG:
            continue
        odds = contact_odds(mine, not_mine)
        total += odds
        if odds > 0.1 and (best is None or odds > best[0]):
            best = (
                odds,
                (
                    f"between {max(shifts):.2f} and {min(shifts):.2f} ppm "
                    f"{contact_words(mine)} if {own.name} is right, "
                    f"{contact_words(not_mine)} if {other.name} is"
                ),
            )
    if best is None:
        return None
    return Finding(log_odds=min(total, 1.5 * best[0], MOST_LOG_ODDS), look_for=best[1])


def contact_odds(first: float, second: float) -> float:
    """Expected log odds by which two distances are told apart."""
    z = np.log(first / second) / LOG_DISTANCE_SD
    return float(min(0.5 * z * z, MOST_LOG_ODDS))


def contact_words(distance: float) -> str:
    """A contact in words: "a strong contact (2.4 Å)"."""
    if distance >= FURTHEST:
        return "none (5 Å or more)"
    strength = "strong" if distance < 2.7 else "clear" if distance < STRONG else "weak"
    return f"a {strength} contact ({distance:.1f} Å)"
