"""Why a shift is predicted: the known environments behind it, from near to far; ppm."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from rdkit import Chem

from spinledger.prediction.shifts_model import load_model
from spinledger.prediction.shifts_spheres import fine_codes


@dataclass(frozen=True, slots=True, kw_only=True)
class KnownEnvironment:
    """One neighbourhood of a proton as the training data know it.

    Attributes
    ----------
    sphere : int
        Bonds out to which the neighbourhood reaches.
    fragment : str
        SMILES of the atoms inside; the proton's carbon has the map number 1.
    examples : int
        Labels with exactly this neighbourhood.
    median_ppm, deviation_ppm : float, ppm
        Median of their shifts and mean deviation from it.
    """

    sphere: int
    fragment: str
    examples: int
    median_ppm: float
    deviation_ppm: float


def known_environments(mol: Chem.Mol, atom: int) -> tuple[KnownEnvironment, ...]:
    """Known neighbourhoods of the protons on an atom, the smallest first.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit; ions as they are in solution.
    atom : int
        Carbon that carries the protons.

    Returns
    -------
    tuple of KnownEnvironment
        Ends with the largest neighbourhood that is known. Fragments are of the
        molecule asked about; no molecule of the training data is shown.
    """
    codes = fine_codes(mol)[atom]
    distances = Chem.GetDistanceMatrix(mol)[atom]
    found = []
    for radius, sphere in enumerate(load_model().table.fine):
        place = int(np.searchsorted(sphere.codes, codes[radius]))
        if place == sphere.codes.size or sphere.codes[place] != codes[radius]:
            break
        found.append(
            KnownEnvironment(
                sphere=radius,
                fragment=_fragment(mol, atom, np.nonzero(distances <= radius)[0]),
                examples=int(sphere.counts[place]),
                median_ppm=float(sphere.medians_ppm[place]),
                deviation_ppm=float(sphere.deviations_ppm[place]),
            )
        )
    return tuple(found)


def _fragment(mol: Chem.Mol, atom: int, inside: np.ndarray) -> str:
    marked = Chem.Mol(mol)
    marked.GetAtomWithIdx(atom).SetAtomMapNum(1)
    return str(Chem.MolFragmentToSmiles(marked, [int(i) for i in inside]))
