"""Who owns what no claim owns: solvent, water, reference, impurities, the rest.

Shifts in ppm, areas in intensity * Hz.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
from rdkit import Chem

from spinledger.processing.solvents import (
    ImpurityLine,
    impurity_lines,
    residual_lines,
)
from spinledger.reconcile.misfit import SpectrumMisfit
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.windows import points_of_hz, stretches
from spinledger.structure.read import molecule
from spinledger.values.evidence import Evidence, Stray, StrayKind
from spinledger.values.ledger import ClaimLines
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
# One line of 2 Hz after the 6 Hz boxcar of the misfit; a doublet reaches 13 Hz.
SINGLET_REACH_HZ = 10.0
# CH against (CH3)3 in one molecule.
AREA_RATIO = 9.0
# Half of 1J(C,H) from CH3 (125 Hz) to heteroarenes (200 Hz), from memory.
SATELLITE_HZ = (55.0, 110.0)
SATELLITE_SHARE = 0.02
EXCHANGEABLE_GROUPS = frozenset({"OH", "NH", "NH2", "COOH"})


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
            atom.SetNoImplicit(False)
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
    """A stretch whose measured area no claim explains, with its centroid.

    ``reach_hz`` is the span over which it stands above a quarter of its top: a
    few Hz for one line, the distance of the outer strong lines for a multiplet.
    """

    low_ppm: float
    high_ppm: float
    centre_ppm: float
    area: float
    share: float
    reach_hz: float


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
        places = np.arange(run.start, run.stop)
        middle = float((places * positive[inside]).sum() / positive[inside].sum())
        found.append(
            Unowned(
                low_ppm=low_ppm,
                high_ppm=high_ppm,
                centre_ppm=spectrum.first_point_ppm - spectrum.step_ppm * middle,
                area=area,
                share=share,
                reach_hz=_reach_points(positive[inside]) * spectrum.step_hz,
            )
        )
    return tuple(found)


def _reach_points(heights: npt.NDArray[np.float64]) -> int:
    """Points from the first to the last above a quarter of the top."""
    above = np.flatnonzero(heights > 0.25 * heights.max())
    return int(above[-1] - above[0])


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


def own_satellites(
    evidence: Evidence,
    unowned: Sequence[Unowned],
    claim_lines: Sequence[ClaimLines],
    area_per_proton: float,
) -> dict[int, tuple[StrayKind, str]]:
    """Unowned stretches that are 13C satellites of a claim.

    They stand half of 1J(C,H), 55 to 110 Hz, beside the claim's centre and hold
    no more than 1.1 % of its protons between two of them, with room for
    an unclean base line.
    """
    frequency = evidence.spectrum.spectrometer_frequency_mhz
    found: dict[int, tuple[StrayKind, str]] = {}
    for number, one in enumerate(unowned):
        for claim in claim_lines:
            protons = float(claim.protons.sum())
            if protons <= 0.0:
                continue
            centre = float((claim.shifts_ppm * claim.protons).sum()) / protons
            distance_hz = abs(one.centre_ppm - centre) * frequency
            size = one.area / max(area_per_proton, 1e-300)
            if (
                SATELLITE_HZ[0] <= distance_hz <= SATELLITE_HZ[1]
                and size <= SATELLITE_SHARE * protons
            ):
                found[number] = ("satellite", f"13C satellite of {claim.claim}")
                break
    return found


def table_impurities(
    evidence: Evidence, unowned: Sequence[Unowned]
) -> dict[int, tuple[StrayKind, str]]:
    """Unowned stretches that a common impurity explains with all its lines.

    Every signal of the compound must be found within 0.03 ppm, either unowned
    or where other signals lie on top, and at least one of them unowned; a line
    that the table calls a singlet must be narrow, and the areas must lie within
    a factor of the numbers of protons that groups have.
    """
    by_compound: dict[str, list[ImpurityLine]] = {}
    for line in impurity_lines(evidence.solvent):
        if line.group not in EXCHANGEABLE_GROUPS:
            by_compound.setdefault(line.compound, []).append(line)
    named: dict[int, tuple[StrayKind, str]] = {}
    best_gap: dict[int, float] = {}
    for compound, lines in by_compound.items():
        hits = _hits(evidence, unowned, lines)
        areas = [unowned[number].area for number in hits]
        if not hits or max(areas) > AREA_RATIO * min(areas):
            continue
        shifts = ", ".join(f"{line.shift_ppm:z.2f}" for line in lines)
        # A compound that explains more stretches at once is the likelier one.
        for number, gap in hits.items():
            if gap / len(hits) < best_gap.get(number, np.inf):
                best_gap[number] = gap / len(hits)
                named[number] = (
                    "impurity",
                    f"{compound}: expected at {shifts} ppm in {evidence.solvent}",
                )
    return named


def _hits(
    evidence: Evidence, unowned: Sequence[Unowned], lines: list[ImpurityLine]
) -> dict[int, float]:
    """Unowned stretches of a compound with their gaps; none if a line lacks."""
    hits: dict[int, float] = {}
    for line in lines:
        near = [
            (abs(one.centre_ppm - line.shift_ppm), number)
            for number, one in enumerate(unowned)
            if abs(one.centre_ppm - line.shift_ppm) <= IMPURITY_TOLERANCE_PPM
            and (line.multiplicity != "s" or one.reach_hz <= SINGLET_REACH_HZ)
        ]
        if near:
            gap, number = min(near)
            hits[number] = gap
        elif not any(
            one.low_ppm <= line.shift_ppm <= one.high_ppm for one in evidence.signals
        ):
            return {}
    return hits
