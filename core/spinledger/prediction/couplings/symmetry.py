"""Which pairs of nuclei are the same by symmetry of the molecule."""

from __future__ import annotations

from functools import cached_property
from itertools import product

from rdkit import Chem
from rdkit.Geometry import Point3D

from spinledger.prediction.couplings.frame import Frame
from spinledger.values.claim import Particle

#: Isotope labels that no real nucleus has.
_FIRST_LABEL, _SECOND_LABEL = 401, 402

Key = tuple[str, ...]


class PairSymmetry:
    """Keys of particle pairs, equal exactly for pairs that symmetry exchanges.

    The two nuclei get isotope labels, and the molecule with its labels is
    written as canonical SMILES with stereo, and so is its mirror image; the
    smaller text is the key. Rotation about single bonds and ring inversion
    are taken as fast, which is what a graph with stereo describes.

    Parameters
    ----------
    frame : Frame
    """

    def __init__(self, frame: Frame) -> None:
        self._frame = frame
        self._texts: dict[tuple[tuple[int, int], ...], str] = {}

    def particle_key(self, particle: Particle) -> Key:
        """Key of one particle."""
        atoms = self._representatives(particle)
        return tuple(sorted({self._text(((a, _FIRST_LABEL),)) for a in atoms}))

    def pair_key(self, first: Particle, second: Particle, *, is_ordered: bool) -> Key:
        """Key of a pair; ordered pairs tell their two members apart."""
        pairs = list(
            product(self._representatives(first), self._representatives(second))
        )
        forward = self._pair_texts(pairs)
        if is_ordered:
            return forward
        return min(forward, self._pair_texts([(b, a) for a, b in pairs]))

    def _pair_texts(self, pairs: list[tuple[int, int]]) -> Key:
        labelled = (
            self._text(((a, _FIRST_LABEL), (b, _SECOND_LABEL))) for a, b in pairs
        )
        return tuple(sorted(set(labelled)))

    def _representatives(self, particle: Particle) -> tuple[int, ...]:
        """One hydrogen of each methyl group, all other nuclei."""
        chosen: dict[int, int] = {}
        rest: list[int] = []
        for atom in particle.hydrogens:
            carrier = (
                self._frame.carrier(atom) if self._frame.element(atom) == 1 else -1
            )
            if carrier >= 0 and self._frame.n_hydrogens(carrier) == 3:
                chosen.setdefault(carrier, atom)
            else:
                rest.append(atom)
        return (*rest, *chosen.values())

    def _text(self, labels: tuple[tuple[int, int], ...]) -> str:
        if labels not in self._texts:
            self._texts[labels] = min(
                _labelled_smiles(mol, labels) for mol in self._both_hands
            )
        return self._texts[labels]

    @cached_property
    def _both_hands(self) -> tuple[Chem.Mol, Chem.Mol]:
        """The molecule and its mirror image, each with one conformer if possible."""
        left, right = Chem.Mol(self._frame.mol), Chem.Mol(self._frame.mol)
        for mol, sign in ((left, 1.0), (right, -1.0)):
            mol.RemoveAllConformers()
            if not self._frame.conformers.is_empty:
                mol.AddConformer(self._conformer(sign))
            elif sign < 0:
                _invert_tags(mol)
        return left, right

    def _conformer(self, sign: float) -> Chem.Conformer:
        positions = self._frame.conformers.positions[0]
        conformer = Chem.Conformer(len(positions))
        conformer.Set3D(True)
        for index, (x, y, z) in enumerate(positions):
            conformer.SetAtomPosition(
                index, Point3D(sign * float(x), float(y), float(z))
            )
        return conformer


def _invert_tags(mol: Chem.Mol) -> None:
    for atom in mol.GetAtoms():
        atom.InvertChirality()


def _labelled_smiles(mol: Chem.Mol, labels: tuple[tuple[int, int], ...]) -> str:
    labelled = Chem.Mol(mol)
    for atom, label in labels:
        labelled.GetAtomWithIdx(atom).SetIsotope(label)
    if labelled.GetNumConformers():
        Chem.AssignStereochemistryFrom3D(labelled, replaceExistingTags=True)
    return str(Chem.MolToSmiles(Chem.RemoveHs(labelled)))
