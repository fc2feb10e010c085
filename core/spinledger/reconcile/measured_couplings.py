"""Measured couplings over three bonds as averages over conformers; J in Hz."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from rdkit import Chem

from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.hla import vicinal_over_conformers_hz
from spinledger.reconcile.coarse import FloatArray
from spinledger.reconcile.entries import DISPUTED_MISFIT
from spinledger.reconcile.reweighting import Reweighted, reweighted
from spinledger.reconcile.solve import Solution
from spinledger.structure.conformers import Ensemble

Pair = tuple[int, int]

#: Error of the equation with force-field geometries: open chains as published
#: for the equation (0.48 Hz, doi:10.1016/0040-4020(80)80155-4) with some flattening;
#: rings as this project measured on published couplings.
CHAIN_RULE_SD_HZ = 0.6
RING_RULE_SD_HZ = 1.1
#: Chain CH-CH couplings are predicted to 1.5 Hz by force-field populations where
#: rotamers spread them by about 3.5 Hz: as sharp as five draws.
ENSEMBLE_TRUST = 5.0
MOST_LABELLED = 4


@dataclass(frozen=True, slots=True, kw_only=True)
class MeasuredVicinal:
    """One determined coupling between protons on saturated carbons.

    Attributes
    ----------
    first, second : int
        Claims.
    pairs : tuple of (int, int)
        Hydrogens whose mean it is.
    is_in_ring : bool
    j_hz, j_sd_hz : float, Hz
    """

    first: int
    second: int
    pairs: tuple[Pair, ...]
    is_in_ring: bool
    j_hz: float
    j_sd_hz: float

    @property
    def total_sd_hz(self) -> float:
        """Of measurement and rule, Hz."""
        rule = RING_RULE_SD_HZ if self.is_in_ring else CHAIN_RULE_SD_HZ
        return float(np.hypot(rule, self.j_sd_hz))


def measured_vicinal(
    solution: Solution, mol: Chem.Mol, species: int
) -> tuple[MeasuredVicinal, ...]:
    """Determined vicinal couplings of one species, of claims whose shape fits.

    Parameters
    ----------
    solution : Solution
    mol : rdkit.Chem.Mol
        The species with hydrogens, as the claims' particles index it.
    species : int
    """
    claims = solution.claims
    refinement = solution.best.refinement
    gone = solution.absent | solution.hidden | _misshapen(solution)
    found = []
    for index, coupling in enumerate(claims.couplings):
        first, second = (claims.particles[p].claim for p in coupling.pairs[0])
        if first is None or second is None or not refinement.determined[index]:
            continue
        listed = claims.claims[first], claims.claims[second]
        if {first, second} & gone or any(
            one.species != species or one.is_exchangeable for one in listed
        ):
            continue
        pairs = tuple(
            pair
            for a, b in coupling.pairs
            for pair in vicinal_pairs(
                mol, claims.particles[a].hydrogens, claims.particles[b].hydrogens
            )
        )
        if not pairs:
            continue
        found.append(
            MeasuredVicinal(
                first=first,
                second=second,
                pairs=pairs,
                is_in_ring=_is_in_ring(mol, pairs[0]),
                j_hz=abs(float(refinement.couplings_hz[index])),
                j_sd_hz=float(refinement.coupling_sds_hz[index]),
            )
        )
    return tuple(found)


def _misshapen(solution: Solution) -> frozenset[int]:
    """Claims whose shape is not that of their signal: their J mean nothing."""
    return frozenset(
        one.claim
        for one in solution.best.assessment.claims
        if one.residual_share > DISPUTED_MISFIT
    )


def vicinal_pairs(
    mol: Chem.Mol, first: Sequence[int], second: Sequence[int]
) -> Iterator[Pair]:
    """Hydrogens on neighbouring saturated carbons, methyl groups left out.

    Small rings are left out too: the equation does not hold there.
    """
    for a in first:
        for b in second:
            one, other = carrier(mol, a), carrier(mol, b)
            bond = mol.GetBondBetweenAtoms(one, other)
            if bond is None or bond.IsInRingSize(3) or bond.IsInRingSize(4):
                continue
            if all(_is_tetrahedral(mol, atom) for atom in (one, other)):
                yield a, b


def _is_tetrahedral(mol: Chem.Mol, index: int) -> bool:
    atom = mol.GetAtomWithIdx(index)
    is_methyl = atom.GetTotalNumHs(includeNeighbors=True) > 2
    return (
        bool(atom.GetAtomicNum() == 6 and atom.GetTotalDegree() == 4) and not is_methyl
    )


def carrier(mol: Chem.Mol, hydrogen: int) -> int:
    """Atom that a hydrogen sits on."""
    return int(mol.GetAtomWithIdx(hydrogen).GetNeighbors()[0].GetIdx())


def _is_in_ring(mol: Chem.Mol, pair: Pair) -> bool:
    bond = mol.GetBondBetweenAtoms(carrier(mol, pair[0]), carrier(mol, pair[1]))
    return bool(bond.IsInRing())


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Labelling:
    """One way to tell geminal protons apart, and the populations it asks for.

    Attributes
    ----------
    swapped : frozenset of int
        Carbons whose two protons take each other's label.
    fit : Reweighted
    """

    swapped: frozenset[int]
    fit: Reweighted


def labellings(
    mol: Chem.Mol,
    conformers: Ensemble,
    measured: Sequence[MeasuredVicinal],
    *,
    is_aqueous: bool,
    trust: float = ENSEMBLE_TRUST,
) -> tuple[Labelling, ...]:
    """Reweighted populations for every labelling of geminal protons, likeliest first.

    Which of two geminal protons is which is not known from a spectrum, so that
    all labellings are tried, up to four carbons at once; beyond that one
    carbon at a time.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        With hydrogens.
    conformers : Ensemble
        Not empty.
    measured : sequence of MeasuredVicinal
        One or more.
    is_aqueous : bool
    trust : float
        In the force field's populations.
    """
    table = _Table(mol, conformers, is_aqueous=is_aqueous)
    values = np.array([one.j_hz for one in measured])
    sds = np.array([one.total_sd_hz for one in measured])

    def fitted(swapped: frozenset[int]) -> Labelling:
        columns = [table.mean_over(one.pairs, swapped) for one in measured]
        fit = reweighted(
            np.column_stack(columns), conformers.weights, values, sds, trust=trust
        )
        return Labelling(swapped=swapped, fit=fit)

    free = table.geminal_carbons(measured)
    if len(free) <= MOST_LABELLED:
        chosen = [
            fitted(frozenset(some))
            for size in range(len(free) + 1)
            for some in combinations(free, size)
        ]
    else:
        chosen = [fitted(frozenset())]
        for carbon in free:
            best = max(chosen, key=lambda one: one.fit.log_evidence)
            chosen.append(fitted(best.swapped ^ {carbon}))
    return tuple(sorted(chosen, key=lambda one: -one.fit.log_evidence))


def log_evidence(found: Sequence[Labelling]) -> float:
    """Log probability of the measured values, labellings being alike beforehand."""
    heights = np.array([one.fit.log_evidence for one in found])
    top = float(heights.max())
    return top + float(np.log(np.exp(heights - top).mean()))


class _Table:
    """Couplings of hydrogen pairs in every conformer, each worked out once."""

    def __init__(
        self, mol: Chem.Mol, conformers: Ensemble, *, is_aqueous: bool
    ) -> None:
        self.mol = mol
        self.frame = Frame(mol, is_aqueous=is_aqueous, conformers=conformers)
        self._known: dict[Pair, FloatArray] = {}
        self._siblings: Mapping[int, int] = _siblings(mol)

    def mean_over(self, pairs: Sequence[Pair], swapped: frozenset[int]) -> FloatArray:
        """Mean coupling of the pairs under a labelling, shape (n_conformers,), Hz."""
        return np.asarray(
            np.mean([self._of(self.labelled(pair, swapped)) for pair in pairs], axis=0)
        )

    def labelled(self, pair: Pair, swapped: frozenset[int]) -> Pair:
        """Hydrogens that a pair of labels means."""
        return labelled(self.mol, self._siblings, pair, swapped)

    def geminal_carbons(self, measured: Sequence[MeasuredVicinal]) -> list[int]:
        """Carbons with two protons that the couplings tell apart, in order."""
        return sorted(
            {
                carrier(self.mol, hydrogen)
                for one in measured
                for pair in one.pairs
                for hydrogen in pair
                if hydrogen in self._siblings
            }
        )

    def _of(self, pair: Pair) -> FloatArray:
        if pair not in self._known:
            first, second = pair
            a, b = carrier(self.mol, first), carrier(self.mol, second)
            self._known[pair] = vicinal_over_conformers_hz(
                self.frame, first, a, b, second
            )
        return self._known[pair]


def _siblings(mol: Chem.Mol) -> dict[int, int]:
    """The other hydrogen of every CH2."""
    found = {}
    for atom in mol.GetAtoms():
        own = [n.GetIdx() for n in atom.GetNeighbors() if n.GetAtomicNum() == 1]
        if len(own) == 2:
            found[own[0]], found[own[1]] = own[1], own[0]
    return found


def labelled(
    mol: Chem.Mol, siblings: Mapping[int, int], pair: Pair, swapped: frozenset[int]
) -> Pair:
    """A pair of hydrogens with those on swapped carbons exchanged."""
    first, second = (
        siblings.get(one, one) if carrier(mol, one) in swapped else one for one in pair
    )
    return first, second


def antiperiplanar(
    mol: Chem.Mol,
    conformers: Ensemble,
    one: MeasuredVicinal,
    swapped: frozenset[int],
) -> tuple[FloatArray, FloatArray]:
    """Share of antiperiplanar pairs and mean unsigned angle in every conformer."""
    frame = Frame(mol, is_aqueous=False, conformers=conformers)
    siblings = _siblings(mol)
    angles = []
    for pair in one.pairs:
        first, second = labelled(mol, siblings, pair, swapped)
        angles.append(
            np.abs(
                frame.dihedral_deg(
                    first, carrier(mol, first), carrier(mol, second), second
                )
            )
        )
    stacked = np.array(angles)
    return (stacked > 120.0).mean(axis=0), stacked.mean(axis=0)
