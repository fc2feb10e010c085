"""A molecule with a definite sense at every centre, for symmetry and for models in space."""

from __future__ import annotations

from itertools import combinations
from typing import Any, Final

from rdkit import Chem
from rdkit.Chem import rdDistGeom

from spinledger.structure.stereo_elements import (
    LONE,
    stereo_elements,
    terminal_alkenes,
)
from spinledger.structure.symmetry import Symmetry
from spinledger.structure.topicity import site_classes

_SEED: Final = 7
_MOST_TWINS: Final = 4
_UNSPECIFIED: Final = Chem.ChiralType.CHI_UNSPECIFIED
_DEFAULT: Final = Chem.ChiralType.CHI_TETRAHEDRAL_CCW
_OPEN: Final = "_spinledger_open"


def settled(mol: Chem.Mol) -> Chem.Mol:
    """Copy in which every tetrahedral centre has a chiral tag.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.

    Returns
    -------
    Chem.Mol
        Known tags are kept. Where rings share atoms, open ones are read from
        a model in space, so that they can exist together; the rest is
        arbitrary: it only tells like neighbours apart, or picks one of the
        configurations that the drawing leaves open. Where like centres are
        open, the combination that tells most protons apart is taken, so that
        no signal goes unclaimed. Open centres are remembered for
        :func:`open_centres`.
    """
    copy = Chem.Mol(mol)
    _mark_open_centres(copy)
    centres = stereo_elements(copy).centres
    untagged = [
        index
        for index in centres
        if copy.GetAtomWithIdx(index).GetChiralTag() == _UNSPECIFIED
    ]
    if any(_is_shared_by_rings(copy, index) for index in untagged):
        copy = _from_model(copy, set(untagged))
    for index in untagged:
        atom = copy.GetAtomWithIdx(index)
        if atom.GetChiralTag() == _UNSPECIFIED:
            atom.SetChiralTag(_DEFAULT)
    return _least_symmetric(copy)


def _least_symmetric(mol: Chem.Mol) -> Chem.Mol:
    """Turn open centres that have a twin so that most protons differ."""
    colours = Symmetry(mol).colours
    free = [i for i in open_centres(mol) if not _is_shared_by_rings(mol, i)]
    twins = [i for i in free if sum(colours[i] == colours[j] for j in free) > 1]
    best, most = mol, 0
    for count in range(len(twins[:_MOST_TWINS])):
        for chosen in combinations(twins[1:_MOST_TWINS], count):
            candidate = Chem.Mol(mol)
            for index in chosen:
                candidate.GetAtomWithIdx(index).InvertChirality()
            found = len(site_classes(Symmetry(candidate)))
            if found > most:
                best, most = candidate, found
    return best


def with_hydrogens(mol: Chem.Mol) -> Chem.Mol:
    """Settled molecule with hydrogens appended, each with a definite place.

    Parameters
    ----------
    mol : Chem.Mol
        Settled, hydrogens implicit.

    Notes
    -----
    Tags stay valid, since hydrogens come last at every atom. The two hydrogens
    of a C=CH2 group get their sides as the symmetry takes them, so that models
    in space agree with it.
    """
    full = Chem.AddHs(mol)
    for end in terminal_alkenes(mol):
        references = end.cis if end.cis is not None else end.trans
        if references is None:
            continue
        first = next(
            n.GetIdx()
            for n in full.GetAtomWithIdx(end.outer).GetNeighbors()
            if n.GetIdx() >= mol.GetNumAtoms()
        )
        bond = full.GetBondBetweenAtoms(end.outer, end.inner)
        pair = (first, references)
        if bond.GetBeginAtomIdx() != end.outer:
            pair = pair[::-1]
        bond.SetStereoAtoms(*pair)
        is_cis = end.cis is not None
        bond.SetStereo(
            Chem.BondStereo.STEREOCIS if is_cis else Chem.BondStereo.STEREOTRANS
        )
    return full


def open_centres(mol: Chem.Mol) -> tuple[int, ...]:
    """Stereocentres of a settled molecule that the drawing left open."""
    return tuple(a.GetIdx() for a in mol.GetAtoms() if a.HasProp(_OPEN))


def _mark_open_centres(mol: Chem.Mol) -> None:
    for info in Chem.FindPotentialStereo(Chem.Mol(mol)):
        if (
            info.type == Chem.StereoType.Atom_Tetrahedral
            and info.specified != Chem.StereoSpecified.Specified
        ):
            mol.GetAtomWithIdx(info.centeredOn).SetBoolProp(_OPEN, True)


def _is_shared_by_rings(mol: Chem.Mol, index: int) -> bool:
    atom = mol.GetAtomWithIdx(index)
    ring_bonds = sum(bond.IsInRing() for bond in atom.GetBonds())
    n_rings = mol.GetRingInfo().NumAtomRings(index)
    return ring_bonds == 3 or (ring_bonds == 4 and n_rings > 2)


def _from_model(mol: Chem.Mol, untagged: set[int]) -> Chem.Mol:
    """Tags of untagged ring atoms from one conformer; unchanged if none embeds."""
    model = Chem.AddHs(mol)
    parameters: Any = rdDistGeom.ETKDGv3()
    parameters.randomSeed = _SEED
    parameters.maxIterations = 50
    if rdDistGeom.EmbedMolecule(model, parameters) < 0:
        return mol
    copy = Chem.Mol(mol)
    positions = model.GetConformer()
    for index, centre in stereo_elements(mol).centres.items():
        atom = copy.GetAtomWithIdx(index)
        if index not in untagged or not atom.IsInRing():
            continue
        if sum(position >= 0 for position in centre.positions) < 3:
            continue
        atom.SetChiralTag(_tag(positions, index, centre.positions))
    return copy


def _tag(
    conformer: Chem.Conformer, index: int, positions: tuple[int, ...]
) -> Chem.ChiralType:
    """Tag that a model shows for the given order of positions."""
    origin = conformer.GetAtomPosition(index)
    arms = [
        conformer.GetAtomPosition(p) - origin for p in positions if p >= 0 and p != LONE
    ]
    if len(arms) == 3:
        # The fourth position points away from the sum of the other three.
        total = arms[0] + arms[1] + arms[2]
        arms.append(total * -1.0)
    volume = arms[1].DotProduct(arms[2].CrossProduct(arms[3]))
    if volume > 0:
        return Chem.ChiralType.CHI_TETRAHEDRAL_CCW
    return Chem.ChiralType.CHI_TETRAHEDRAL_CW
