"""How far apart like groups stand on the two sides of a slow C-N bond; ppm."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

from rdkit import Chem

from spinledger.structure.mobility import SlowBond
from spinledger.structure.stereo_elements import Link

# Distance of two N-methyl groups at room temperature in CDCl3 or DMSO-d6, from
# memory of handbook spectra: DMF 0.09, dimethylacetamide 0.08, dimethylbenzamide
# 0.13, dimethyl carbamate 0.02, thioacetamide 0.2, nitrosodimethylamine 0.7.
_METHYL_GAP_PPM: Final = {
    "formamide": 0.09,
    "amide": 0.08,
    "benzamide": 0.13,
    "carbamate": 0.03,
    "thioamide": 0.18,
    "dithiocarbamate": 0.1,
    "nitrosamine": 0.7,
    "formamidine": 0.1,
    "vinylogous amide": 0.1,
}
_OTHER_GAP_PPM: Final = 0.1
# The same for N-CH2 (diethyl formamide, N-formylpyrrolidine) and N-CH (diisopropyl
# amides), against N-CH3; and how the distance falls with the bonds from nitrogen.
_FACTOR_BY_PROTONS: Final = {3: 1.0, 2: 1.5, 1: 4.0}
_MOST_PPM: Final = 0.8
_FALL: Final = (1.0, 1.0, 0.5, 0.25)
_FURTHEST_FALL: Final = 0.15
# The distance is known to about its own size.
_RELATIVE_SD: Final = 0.5
_LEAST_SD_PPM: Final = 0.02


def rotation_gap_ppm(
    mol: Chem.Mol, bonds: Sequence[SlowBond], carriers: tuple[int, int]
) -> tuple[float, float] | None:
    """Distance of two groups on the two sides of a slow bond, and its sd.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    bonds : sequence of SlowBond
    carriers : (int, int)
        One carrier of each group.

    Returns
    -------
    (float, float), ppm, or None
        None where no slow bond has them on two branches of its nitrogen.
    """
    found = []
    for bond in bonds:
        paths = [_path(mol, bond.atoms[1], carrier) for carrier in carriers]
        if len(paths[0]) != len(paths[1]) or paths[0][:2] == paths[1][:2]:
            continue
        methyl = _METHYL_GAP_PPM.get(bond.kind, _OTHER_GAP_PPM)
        protons = mol.GetAtomWithIdx(carriers[0]).GetTotalNumHs()
        near = min(methyl * _FACTOR_BY_PROTONS.get(protons, 1.0), _MOST_PPM)
        found.append(near * _fall(len(paths[0]) - 1))
    if not found:
        return None
    gap = max(found)
    return gap, max(_RELATIVE_SD * gap, _LEAST_SD_PPM)


def formamide_sign(mol: Chem.Mol, links: Sequence[Link], carrier: int) -> float | None:
    """+1 where a group beside a formamide nitrogen stands at lower field than its twin.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    links : sequence of Link
        Slow bonds among them, see
        :func:`spinledger.structure.stereo_elements.stereo_elements`.
    carrier : int
        Carbon with two or three protons.

    Returns
    -------
    float or None
        None where the carrier is not bonded to such a nitrogen. N-CH3 and N-CH2
        anti to the oxygen, beside the formyl proton, stand at lower field [1]_.

    References
    ----------
    .. [1] F. A. L. Anet, A. J. R. Bourn, J. Am. Chem. Soc. 87 (1965) 5250-5251,
       doi:10.1021/ja00950a048 (nuclear Overhauser effect of dimethylformamide).
    """
    if mol.GetAtomWithIdx(carrier).GetTotalNumHs() < 2:
        return None
    for link in links:
        if link.kind != "formamide" or carrier not in link.positions[1]:
            continue
        oxygens = [
            i >= 0 and mol.GetAtomWithIdx(i).GetAtomicNum() == 8
            for i in link.positions[0]
        ]
        if True in oxygens:
            # First positions of both ends are cis.
            beside = link.positions[1][oxygens.index(True)]
            return -1.0 if carrier == beside else 1.0
    return None


def _path(mol: Chem.Mol, first: int, last: int) -> tuple[int, ...]:
    """Atoms from one to the other, both included."""
    return (first,) if first == last else tuple(Chem.GetShortestPath(mol, first, last))


def _fall(bonds: int) -> float:
    return _FALL[bonds] if bonds < len(_FALL) else _FURTHEST_FALL
