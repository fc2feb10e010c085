"""Couplings that a structure claims, in Hz: one rule family a file."""

from __future__ import annotations

from itertools import combinations, product

from rdkit import Chem

from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.pairs import MOST_BONDS, estimate_pair
from spinledger.prediction.couplings.sharing import (
    PairEstimate,
    merged,
    shared_couplings,
)
from spinledger.structure.conformers import Ensemble
from spinledger.values.claim import CouplingClaim, Particle

__all__ = ["predict_couplings"]


def predict_couplings(
    mol_with_hydrogens: Chem.Mol,
    particles: tuple[Particle, ...],
    *,
    is_aqueous: bool,
    ensemble: Ensemble | None = None,
) -> tuple[CouplingClaim, ...]:
    """Couplings between the particles of one structure.

    Parameters
    ----------
    mol_with_hydrogens : rdkit.Chem.Mol
        Hydrogens explicit; ions as they are in solution.
    particles : tuple of Particle
        Magnetically equivalent sets; ``hydrogens`` index the molecule.
    is_aqueous : bool
        Whether charges are screened by water in the conformers.
    ensemble : Ensemble, optional
        Conformers of the molecule; made here, and only if a rule needs
        geometry, when not given.

    Returns
    -------
    tuple of CouplingClaim
        Pairs that symmetry exchanges share one; J and J' of AA'XX' and
        AA'BB', and the couplings of the two protons of a diastereotopic CH2,
        are linked by ``swaps_with``. Where both ends of a coupling belong to
        diastereotopic pairs, the link exchanges the pair with the lowest
        claim index.
    """
    frame = Frame(mol_with_hydrogens, is_aqueous=is_aqueous, conformers=ensemble)
    found = [
        item
        for first, second in combinations(range(len(particles)), 2)
        if (item := _between(frame, particles, (first, second))) is not None
    ]
    return shared_couplings(frame, particles, found)


def _between(
    frame: Frame, particles: tuple[Particle, ...], pair: tuple[int, int]
) -> PairEstimate | None:
    """Mean over the nuclei of two particles, at the least number of bonds."""
    first, second = (particles[index] for index in pair)
    if "1H" not in (first.nucleus, second.nucleus):
        return None
    by_bonds: dict[int, list[tuple[int, int]]] = {}
    for a, b in product(first.hydrogens, second.hydrogens):
        by_bonds.setdefault(frame.n_bonds(a, b), []).append((a, b))
    bonds = min((count for count in by_bonds if count), default=0)
    if not 1 <= bonds <= MOST_BONDS:
        return None
    estimates = [estimate_pair(frame, a, b) for a, b in by_bonds[bonds]]
    known = [estimate for estimate in estimates if estimate is not None]
    if not known:
        return None
    return PairEstimate(pair=pair, bonds=bonds, estimate=merged(known))
