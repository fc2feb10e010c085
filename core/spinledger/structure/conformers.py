"""Conformer ensembles with proton labels kept; positions in Angstrom, energies in kcal/mol."""

from __future__ import annotations

import functools
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
from rdkit import Chem
from rdkit.Chem import rdDistGeom, rdForceFieldHelpers, rdMolDescriptors

from spinledger.structure.dihedrals import dihedrals_deg
from spinledger.values.arrays import locked_floats

Floats = npt.NDArray[np.float64]

#: 2 R T at 298 K: force-field energies of open chains in water carry little
#: information, and halving them predicts couplings better (measured on
#: published couplings of 361 compounds).
SOFTENED_RT_KCAL = 2 * 0.5925
WATER_DIELECTRIC = 80.0
ORGANIC_DIELECTRIC = 10.0
POLYOL_DIELECTRIC = 4.0
#: MMFF94s in a high dielectric makes axial carbon groups too stable; so much
#: each brings ring couplings of published six-rings closest.
AXIAL_CARBON_KCAL = 1.0
WINDOW_KCAL = 8.0
DUPLICATE_KCAL = 0.05
DUPLICATE_DEG = 12.0
#: A model of a larger molecule takes minutes and tells little of its shape.
MOST_HEAVY_ATOMS = 100
_AXIAL_LIMIT_DEG = 100.0


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Ensemble:
    """Conformers of one molecule, lowest energy first.

    Attributes
    ----------
    positions : numpy.ndarray, shape (n_conformers, n_atoms, 3), Angstrom
        Read-only. Atom order of the molecule with explicit hydrogens. The two
        hydrogens of a CH2 keep their sides from conformer to conformer.
    weights : numpy.ndarray, shape (n_conformers,)
        Softened Boltzmann weights, sum 1. Read-only.
    reason : str
        Empty for a normal ensemble; else one sentence: why there are no
        conformers, or why they are rougher than usual.
    """

    positions: Floats
    weights: Floats
    reason: str = ""

    def __post_init__(self) -> None:
        positions = locked_floats(self.positions, "positions", ndim=3)
        weights = locked_floats(self.weights, "weights")
        if positions.shape[0] != weights.size or positions.shape[2] != 3:
            raise ValueError(
                f"sizes differ: positions {positions.shape}, {weights.size} weights"
            )
        object.__setattr__(self, "positions", positions)
        object.__setattr__(self, "weights", weights)

    @property
    def is_empty(self) -> bool:
        """Whether no conformer could be made; ``reason`` says why."""
        return self.weights.size == 0


def ensemble(
    mol_with_hydrogens: Chem.Mol, *, is_aqueous: bool, seed: int = 7
) -> Ensemble:
    """Conformers of a molecule with weights, always the same for the same input.

    Parameters
    ----------
    mol_with_hydrogens : rdkit.Chem.Mol
        Hydrogens explicit; ions as they are in solution.
    is_aqueous : bool
        Screen charges as water does; otherwise as a typical organic solvent.
    seed : int
        Seed of the distance geometry.

    Returns
    -------
    Ensemble
        Empty, with the reason, where distance geometry finds nothing.

    Notes
    -----
    ETKDGv3 [1]_, then MMFF94s [2]_ with a constant dielectric; UFF [3]_ where
    MMFF94s has no parameters. One conformer is made first, and every
    four-coordinate carbon with at most two hydrogens gets a chiral tag from
    it, so that the labelled protons of a CH2, and the stereocentres that the
    structure leaves open, are the same in all others. Work is bounded by
    counts, not by the clock, so that the result does not depend on the load.
    Saturated polyol rings are minimised in a low dielectric: a high one
    distorts them.

    References
    ----------
    .. [1] S. Wang, J. Witek, G. Landrum, S. Riniker, J. Chem. Inf. Model. 60
       (2020) 2044-2058, doi:10.1021/acs.jcim.0c00025.
    .. [2] T. A. Halgren, J. Comput. Chem. 20 (1999) 720-729,
       doi:10.1002/(SICI)1096-987X(199905)20:7<720::AID-JCC7>3.0.CO;2-X.
    .. [3] A. K. Rappe et al., J. Am. Chem. Soc. 114 (1992) 10024-10035,
       doi:10.1021/ja00051a040.
    """
    if mol_with_hydrogens.GetNumHeavyAtoms() > MOST_HEAVY_ATOMS:
        return _empty(
            mol_with_hydrogens,
            f"More than {MOST_HEAVY_ATOMS} heavy atoms: no three-dimensional model is made.",
        )
    # Conformers go by bonds and stereo alone, so that equal drawings share them.
    known = mol_with_hydrogens.ToBinary(Chem.PropertyPickleOptions.NoProps)
    return _ensemble(known, is_aqueous, seed)


@functools.lru_cache(maxsize=64)
def _ensemble(binary: bytes, is_aqueous: bool, seed: int) -> Ensemble:
    mol = Chem.Mol(binary)  # type: ignore[call-overload]  # stub knows text only
    tagged = _tagged_from_first(mol, seed)
    if tagged is None:
        return _empty(mol, "No three-dimensional model could be made.")
    many = _embedded(tagged, n_conformers(tagged), seed)
    energies, reason = _minimise(many, _dielectric(many, is_aqueous))
    positions = np.array([c.GetPositions() for c in many.GetConformers()])
    energies = energies + AXIAL_CARBON_KCAL * n_axial_carbons(tagged, positions)
    kept = _distinct(tagged, positions, energies)
    weights = np.exp(-(energies[kept] - energies[kept[0]]) / SOFTENED_RT_KCAL)
    return Ensemble(
        positions=positions[kept], weights=weights / weights.sum(), reason=reason
    )


def n_conformers(mol: Chem.Mol) -> int:
    """Number of conformers to try: more for flexible molecules, fewer for large ones."""
    heavy = mol.GetNumHeavyAtoms()
    limits = ((20, 50), (26, 20), (35, 12), (60, 8))
    most = next((count for limit, count in limits if heavy <= limit), 4)
    freedoms = _n_freedoms(mol)
    if heavy <= 15:
        return most if freedoms else 6
    return min(most, 6 + 8 * freedoms)


def _n_freedoms(mol: Chem.Mol) -> int:
    """Rotatable bonds, and rings that can pucker."""
    rotatable = int(rdMolDescriptors.CalcNumRotatableBonds(mol))
    puckering = sum(
        len(ring) >= 5
        and sum(mol.GetAtomWithIdx(i).GetTotalDegree() == 4 for i in ring) >= 2
        for ring in mol.GetRingInfo().AtomRings()
    )
    macrocyclic = sum(
        len(ring) - 7 for ring in mol.GetRingInfo().AtomRings() if len(ring) > 7
    )
    return rotatable + puckering + macrocyclic


def n_axial_carbons(mol: Chem.Mol, positions: Floats) -> Floats:
    """Axial carbon groups on CH of six-membered rings, shape (n_conformers,)."""
    count = np.zeros(positions.shape[0])
    rings = mol.GetRingInfo()
    for ring in rings.AtomRings():
        if len(ring) != 6:
            continue
        for place, index in enumerate(ring):
            group = _carbon_group_outside(mol, index)
            if group is None:
                continue
            sides = [
                (group, index, ring[place - 1], ring[place - 2]),
                (group, index, ring[(place + 1) % 6], ring[(place + 2) % 6]),
            ]
            angles = np.abs([dihedrals_deg(positions, side) for side in sides])
            count += np.all(angles < _AXIAL_LIMIT_DEG, axis=0)
    return count


def _carbon_group_outside(mol: Chem.Mol, index: int) -> int | None:
    """Carbon outside all rings of a saturated ring CH; None if there is none."""
    atom = mol.GetAtomWithIdx(index)
    if atom.GetAtomicNum() != 6 or atom.GetTotalDegree() != 4:
        return None
    neighbours = atom.GetNeighbors()
    outside = [
        n
        for n in neighbours
        if n.GetAtomicNum() > 1
        and not mol.GetBondBetweenAtoms(index, n.GetIdx()).IsInRing()
    ]
    has_hydrogen = any(n.GetAtomicNum() == 1 for n in neighbours)
    if len(outside) != 1 or not has_hydrogen or outside[0].GetAtomicNum() != 6:
        return None
    return int(outside[0].GetIdx())


def with_full_tags(mol: Chem.Mol, positions: Floats) -> Chem.Mol:
    """Copy with a chiral tag, read from one conformer, on every carbon that can carry one.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        With explicit hydrogens.
    positions : numpy.ndarray, shape (n_atoms, 3), Angstrom

    Returns
    -------
    rdkit.Chem.Mol
        Four-coordinate carbons with at most two hydrogens are tagged, whether
        or not they are stereocentres.
    """
    tagged = Chem.Mol(mol)
    for atom in tagged.GetAtoms():
        neighbours = [bond.GetOtherAtomIdx(atom.GetIdx()) for bond in atom.GetBonds()]
        if not _takes_tag(tagged, atom, neighbours):
            continue
        arms = positions[neighbours] - positions[atom.GetIdx()]
        # Seen from the first neighbour the others run anticlockwise when the
        # volume they span is negative.
        is_left = float(np.dot(arms[1], np.cross(arms[2], arms[3]))) < 0
        atom.SetChiralTag(
            Chem.ChiralType.CHI_TETRAHEDRAL_CCW
            if is_left
            else Chem.ChiralType.CHI_TETRAHEDRAL_CW
        )
    return tagged


def _takes_tag(mol: Chem.Mol, atom: Chem.Atom, neighbours: list[int]) -> bool:
    if atom.GetAtomicNum() != 6 or len(neighbours) != 4:
        return False
    return sum(mol.GetAtomWithIdx(i).GetAtomicNum() == 1 for i in neighbours) <= 2


def _empty(mol: Chem.Mol, reason: str) -> Ensemble:
    return Ensemble(
        positions=np.zeros((0, mol.GetNumAtoms(), 3)),
        weights=np.zeros(0),
        reason=reason,
    )


def _parameters(seed: int) -> Any:
    """Embedding parameters; typed as Any because RDKit's stubs make them read-only."""
    parameters: Any = rdDistGeom.ETKDGv3()
    parameters.randomSeed = seed
    parameters.maxIterations = 20
    parameters.pruneRmsThresh = -1.0
    parameters.numThreads = 1
    return parameters


def _embedded(tagged: Chem.Mol, count: int, seed: int) -> Chem.Mol:
    """Copy with many conformers; with the one it has where no more can be made."""
    many = Chem.Mol(tagged)
    found = rdDistGeom.EmbedMultipleConfs(many, count, _parameters(seed))
    return many if len(found) else Chem.Mol(tagged)


def _tagged_from_first(mol: Chem.Mol, seed: int) -> Chem.Mol | None:
    """Copy with one conformer and full chiral tags from it; None if none embeds."""
    first = Chem.Mol(mol)
    first.RemoveAllConformers()
    parameters = _parameters(seed)
    if rdDistGeom.EmbedMolecule(first, parameters) < 0:
        parameters.useRandomCoords = True
        parameters.maxIterations = 100
        if rdDistGeom.EmbedMolecule(first, parameters) < 0:
            return None
    return with_full_tags(first, first.GetConformer().GetPositions())


def _dielectric(mol: Chem.Mol, is_aqueous: bool) -> float:
    if _has_polyol_ring(mol) and not any(a.GetFormalCharge() for a in mol.GetAtoms()):
        return POLYOL_DIELECTRIC
    return WATER_DIELECTRIC if is_aqueous else ORGANIC_DIELECTRIC


def _has_polyol_ring(mol: Chem.Mol) -> bool:
    """Whether a saturated ring carries three or more oxygens outside the ring."""
    for ring in mol.GetRingInfo().AtomRings():
        atoms = [mol.GetAtomWithIdx(i) for i in ring]
        if any(a.GetHybridization() != Chem.HybridizationType.SP3 for a in atoms):
            continue
        outside = {
            n.GetIdx()
            for a in atoms
            for n in a.GetNeighbors()
            if n.GetAtomicNum() == 8 and n.GetIdx() not in ring
        }
        if len(outside) >= 3:
            return True
    return False


def _minimise(mol: Chem.Mol, dielectric: float) -> tuple[Floats, str]:
    """Minimise in place; energies in kcal/mol and a sentence if it is not MMFF94s."""
    identifiers = [conformer.GetId() for conformer in mol.GetConformers()]
    most_steps = 300 if mol.GetNumHeavyAtoms() <= 20 else 200
    properties = rdForceFieldHelpers.MMFFGetMoleculeProperties(mol, "MMFF94s")
    if properties is not None:
        properties.SetMMFFDielectricConstant(dielectric)
        fields = (
            rdForceFieldHelpers.MMFFGetMoleculeForceField(mol, properties, confId=i)
            for i in identifiers
        )
        return _minimised_energies(fields, most_steps), ""
    if rdForceFieldHelpers.UFFHasAllMoleculeParams(mol):
        fields = (
            rdForceFieldHelpers.UFFGetMoleculeForceField(mol, confId=i)
            for i in identifiers
        )
        return (
            _minimised_energies(fields, most_steps),
            "MMFF94s has no parameters for this structure; UFF was used.",
        )
    return (
        np.zeros(len(identifiers)),
        "No force field has parameters for this structure; conformers are not minimised.",
    )


def _minimised_energies(fields: Iterable[Any], most_steps: int) -> Floats:
    energies = []
    for field in fields:
        field.Minimize(maxIts=most_steps)
        energies.append(field.CalcEnergy())
    return np.array(energies)


def _distinct(mol: Chem.Mol, positions: Floats, energies: Floats) -> list[int]:
    """Indices of distinct conformers within the window, lowest energy first."""
    torsions = _heavy_torsions_deg(mol, positions)
    order = np.argsort(energies, kind="stable")
    kept: list[int] = []
    for index in order:
        if energies[index] - energies[order[0]] > WINDOW_KCAL:
            break
        if not any(
            abs(energies[index] - energies[other]) < DUPLICATE_KCAL
            and _largest_turn_deg(torsions[:, index] - torsions[:, other])
            < DUPLICATE_DEG
            for other in kept
        ):
            kept.append(int(index))
    return kept


def _largest_turn_deg(differences_deg: Floats) -> float:
    if differences_deg.size == 0:
        return 0.0
    return float(np.abs((differences_deg + 180.0) % 360.0 - 180.0).max())


def _heavy_torsions_deg(mol: Chem.Mol, positions: Floats) -> Floats:
    """One torsion a bond between heavy atoms, shape (n_torsions, n_conformers)."""
    torsions = []
    for bond in mol.GetBonds():
        begin, end = bond.GetBeginAtom(), bond.GetEndAtom()
        left = _heavy_neighbour(begin, end.GetIdx())
        right = _heavy_neighbour(end, begin.GetIdx())
        if left is None or right is None or left == right:
            continue
        path = (left, begin.GetIdx(), end.GetIdx(), right)
        torsions.append(dihedrals_deg(positions, path))
    return np.array(torsions).reshape(len(torsions), positions.shape[0])


def _heavy_neighbour(atom: Chem.Atom, excluded: int) -> int | None:
    for neighbour in atom.GetNeighbors():
        if neighbour.GetAtomicNum() > 1 and neighbour.GetIdx() != excluded:
            return int(neighbour.GetIdx())
    return None
