"""What side evidence says of one structure, kind by kind; shifts in ppm."""

from __future__ import annotations

from collections.abc import Sequence

from rdkit import Chem

from spinledger.processing.solvents import canonical_solvent
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.side_costs import (
    SideResult,
    carbon_result,
    cosy_result,
    expected_carbons,
    hsqc_result,
    types_in_words,
)
from spinledger.reconcile.solve import Solution
from spinledger.structure.carbons import CarbonLine
from spinledger.structure.read import molecule
from spinledger.structure.species import in_solution
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import SideFinding
from spinledger.values.structure import Structure

Carbons = tuple[tuple[CarbonLine, ...], tuple[CarbonLine, ...]]


def carbons_of(
    structures: Sequence[Structure], evidence: Evidence, options: ReconcileOptions
) -> Carbons:
    """Carbon lines that the species in the tube must, and those that they may show."""
    solvent = evidence.solvent
    known = (canonical_solvent(solvent) or solvent) if solvent else None
    molecules: list[Chem.Mol] = []
    shares: list[float] = []
    for one in structures:
        for species in in_solution(molecule(one), known, options.ph).species:
            molecules.append(species.mol)
            shares.append(species.share)
    temperature_k = options.temperature_k or evidence.metadata.temperature_k
    return expected_carbons(molecules, shares, temperature_k=temperature_k)


def side_findings(
    structure: Structure,
    claims: ClaimSet,
    solution: Solution,
    evidence: Evidence,
    options: ReconcileOptions,
) -> tuple[SideFinding, ...]:
    """Findings of every kind of side evidence that was given.

    Parameters
    ----------
    structure : Structure
    claims : ClaimSet
    solution : Solution
        The placement that HSQC and COSY are held against.
    evidence : Evidence
    options : ReconcileOptions
        With the side evidence among its constraints.
    """
    side = options.constraints.side
    if side is None:
        return ()
    shifts = solution.best.refinement.shifts_ppm
    gone = solution.absent | solution.hidden
    found: list[SideFinding] = []
    if side.carbons:
        must, may = carbons_of((structure, *options.species), evidence, options)
        agreed = types_in_words([line.n_protons for line in must])
        found.append(
            _finding(
                "carbons",
                carbon_result(must, may, side),
                f"the carbon list agrees with {agreed}",
            )
        )
    if side.hsqc:
        result = hsqc_result(claims, shifts, gone, side)
        found.append(_finding("HSQC", result, "the HSQC pairs agree"))
    if side.cosy:
        result = cosy_result(claims, shifts, gone, side)
        found.append(_finding("COSY", result, "the COSY pairs agree"))
    return tuple(found)


def _finding(kind: str, result: SideResult, agreed: str) -> SideFinding:
    if not result.reasons:
        return SideFinding(kind=kind, sentence=agreed, cost=0.0)
    return SideFinding(
        kind=kind, sentence="; ".join(result.reasons[:3]), cost=result.cost
    )
