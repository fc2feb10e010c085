"""Who owns what no claim owns: solvent, water, reference, impurities, the rest.

Shifts in ppm, areas in intensity * Hz.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from rdkit import Chem

from spinledger.processing.solvents import (
    ImpurityLine,
    impurity_lines,
    residual_lines,
)
from spinledger.reconcile.assess import SpectrumMisfit
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.windows import Stretch, points_of_hz, stretches
from spinledger.structure.read import molecule
from spinledger.values.evidence import Evidence, Signal, Stray, StrayKind
from spinledger.values.structure import Structure

STANDARDS = {
    "TMS": "C[Si](C)(C)C",
    "DSS": "C[Si](C)(C)CCCS(=O)(=O)[O-]",
    "TSP": "C[Si](C)(C)CCC(=O)[O-]",
}
# Tables are given to 0.01 ppm; concentration and temperature move lines by more.
IMPURITY_TOLERANCE_PPM = 0.03
SMALLEST_STRAY_PROTONS = 0.04
UNOWNED_SHARE = 0.4


def released(evidence: Evidence, structure: Structure) -> Evidence:
    """Evidence in which the claimed structure's own lines are no strays.

    Where the standard or the solvent itself is claimed, its line belongs to
    the claim and is not masked.
    """
    claimed = _bare_fragments(structure)
    freed: set[StrayKind] = set()
    if claimed & {_bare(smiles) for smiles in STANDARDS.values()}:
        freed.add("reference")
    if claimed & _solvent_skeletons(evidence.solvent):
        freed.add("solvent")
    if "O" in claimed:
        freed.add("water")
    if not freed:
        return evidence
    kept = tuple(stray for stray in evidence.strays if stray.kind not in freed)
    return replace(evidence, strays=kept)


def _bare_fragments(structure: Structure) -> set[str]:
    return {
        _bare_molecule(part)
        for part in Chem.GetMolFrags(molecule(structure), asMols=True)
    }


def _bare(smiles: str) -> str:
    return _bare_molecule(Chem.MolFromSmiles(smiles))


def _bare_molecule(mol: Chem.Mol) -> str:
    """SMILES without isotopes, charges of acids and stereo."""
    plain = Chem.RWMol(Chem.RemoveHs(mol))
    for atom in plain.GetAtoms():
        atom.SetIsotope(0)
        if atom.GetSymbol() == "O" and atom.GetFormalCharge() == -1:
            atom.SetFormalCharge(0)
    Chem.SanitizeMol(plain)
    return str(Chem.MolToSmiles(Chem.RemoveHs(plain.GetMol()), isomericSmiles=False))


def _solvent_skeletons(solvent: str | None) -> set[str]:
    """The solvent's own SMILES, heavy atoms only, by the residual-line table."""
    skeletons = {
        "CDCl3": "ClC(Cl)Cl",
        "DMSO-d6": "CS(C)=O",
        "acetone-d6": "CC(C)=O",
        "CD3CN": "CC#N",
        "CD3OD": "CO",
        "C6D6": "c1ccccc1",
        "toluene-d8": "Cc1ccccc1",
        "THF-d8": "C1CCOC1",
        "CD2Cl2": "ClCCl",
        "C6D5Cl": "Clc1ccccc1",
        "TFE-d3": "OCC(F)(F)F",
        "DMF-d7": "CN(C)C=O",
        "pyridine-d5": "c1ccncc1",
        "CD3CO2D": "CC(=O)O",
        "C2D2Cl4": "ClC(Cl)C(Cl)Cl",
        "TFA-d": "O=C(O)C(F)(F)F",
        "dioxane-d8": "C1COCCO1",
    }
    smiles = skeletons.get(solvent or "")
    return {_bare(smiles)} if smiles and residual_lines(solvent) else set()


@dataclass(frozen=True, slots=True, kw_only=True)
class Unowned:
    """A stretch whose measured area no claim explains."""

    low_ppm: float
    high_ppm: float
    area: float
    share: float


def unowned_stretches(
    evidence: Evidence, misfit: SpectrumMisfit, area_per_proton: float
) -> tuple[Unowned, ...]:
    """Parts of the spectrum that stand out and that no claim accounts for.

    A stretch counts when at least 40 % of its area is unexplained and the
    unexplained part is worth 0.04 protons.
    """
    spectrum = evidence.spectrum
    positive = np.maximum(misfit.residual, 0.0)
    level = np.maximum(misfit.measured, 0.0)
    stands_out = positive > UNOWNED_SHARE * np.maximum(level, 1e-300)
    found = []
    for run in stretches(stands_out, pad=points_of_hz(spectrum, 4.0)):
        inside = slice(run.start, run.stop)
        area = float(positive[inside].sum()) * spectrum.step_hz
        whole = float(level[inside].sum()) * spectrum.step_hz
        share = area / max(whole, 1e-300)
        if area < SMALLEST_STRAY_PROTONS * area_per_proton or share < UNOWNED_SHARE:
            continue
        low_ppm, high_ppm = run.range_ppm(spectrum)
        found.append(
            Unowned(low_ppm=low_ppm, high_ppm=high_ppm, area=area, share=share)
        )
    return tuple(found)


def book_strays(
    evidence: Evidence,
    unowned: Sequence[Unowned],
    area_per_proton: float,
    *,
    constraints: Constraints | None = None,
) -> tuple[Stray, ...]:
    """All strays: recognised ones, declared ones, table impurities, the rest.

    Parameters
    ----------
    evidence : Evidence
        With its recognised strays.
    unowned : sequence of Unowned
    area_per_proton : float
        Sets the size of a stray in protons; 0 where it is not known.
    constraints : Constraints, optional
        Impurities that the user declared.
    """
    declared = [
        Stray(low_ppm=one.low_ppm, high_ppm=one.high_ppm, kind="impurity", why=one.why)
        for one in (constraints.impurities if constraints else ())
    ]
    named = table_impurities(evidence, unowned)
    rest = []
    for number, one in enumerate(unowned):
        protons = one.area / area_per_proton if area_per_proton > 0 else None
        kind, why = named.get(number, ("unexplained", _size_sentence(protons)))
        rest.append(
            Stray(
                low_ppm=one.low_ppm,
                high_ppm=one.high_ppm,
                kind=kind,
                why=why,
                protons=protons,
            )
        )
    everything = [*evidence.strays, *declared, *rest]
    return tuple(sorted(everything, key=lambda stray: -stray.high_ppm))


def _size_sentence(protons: float | None) -> str:
    if protons is None:
        return "no claim and no known stray stands here"
    return f"no claim and no known stray stands here; {protons:.2f} H by area"


def table_impurities(
    evidence: Evidence, unowned: Sequence[Unowned]
) -> dict[int, tuple[StrayKind, str]]:
    """Unowned stretches that a common impurity explains with all its lines.

    Every signal of the compound must be found, either unowned or where other
    signals lie on top, and at least one of them unowned; a compound with a
    single line must be a narrow stretch.
    """
    by_compound: dict[str, list[ImpurityLine]] = {}
    for line in impurity_lines(evidence.solvent):
        by_compound.setdefault(line.compound, []).append(line)
    named: dict[int, tuple[StrayKind, str]] = {}
    best_gap: dict[int, float] = {}
    for compound, lines in by_compound.items():
        hits = _hits(evidence.signals, unowned, lines)
        if hits is None:
            continue
        shifts = ", ".join(f"{line.shift_ppm:.2f}" for line in lines)
        for number, gap in hits.items():
            if gap < best_gap.get(number, np.inf):
                best_gap[number] = gap
                named[number] = (
                    "impurity",
                    f"{compound}: expected at {shifts} ppm in {evidence.solvent}",
                )
    return named


def _hits(
    signals: Sequence[Signal], unowned: Sequence[Unowned], lines: list[ImpurityLine]
) -> dict[int, float] | None:
    """Unowned stretches of a compound with their gaps; None if a line lacks."""
    hits: dict[int, float] = {}
    for line in lines:
        near = [
            (abs((one.low_ppm + one.high_ppm) / 2 - line.shift_ppm), number)
            for number, one in enumerate(unowned)
            if one.low_ppm - IMPURITY_TOLERANCE_PPM
            <= line.shift_ppm
            <= one.high_ppm + IMPURITY_TOLERANCE_PPM
        ]
        if near:
            gap, number = min(near)
            hits[number] = gap
            continue
        exchangeable = line.group in {"OH", "NH", "NH2", "COOH"}
        if exchangeable or any(
            one.low_ppm <= line.shift_ppm <= one.high_ppm for one in signals
        ):
            continue
        return None
    return hits or None


def stretch_of(evidence: Evidence, low_ppm: float, high_ppm: float) -> Stretch:
    """Points of a range as a stretch."""
    window = evidence.spectrum.window(low_ppm, high_ppm)
    return Stretch(start=int(window.start), stop=int(window.stop))
