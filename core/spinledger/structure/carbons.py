"""Carbon lines that a structure should show: symmetry classes, protons, windows.

Shifts in ppm.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from rdkit import Chem

from spinledger.structure.settled import settled
from spinledger.structure.stereo_elements import LONE
from spinledger.structure.symmetry import Symmetry

Window = tuple[float, float]

#: Wide windows by kind of carbon; what lies outside is very unusual [1]_.
#: .. [1] E. Pretsch, P. Buhlmann, M. Badertscher, Structure Determination of
#:    Organic Compounds, 4th ed., doi:10.1007/978-3-540-93810-1; limits from memory.
_SATURATED: Final[Window] = (-20.0, 115.0)
_TRIGONAL: Final[Window] = (75.0, 200.0)
_CARBONYL: Final[Window] = (145.0, 225.0)
_LINEAR: Final[Window] = (55.0, 225.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class CarbonLine:
    """One line of a proton-decoupled carbon spectrum.

    Attributes
    ----------
    atoms : tuple of int
        All carbons that symmetry makes alike.
    n_protons : int
        On each of them, deuterium left out.
    window_ppm : (float, float)
        Where a carbon of this kind can lie.
    """

    atoms: tuple[int, ...]
    n_protons: int
    window_ppm: Window


def carbon_lines(
    mol: Chem.Mol, *, temperature_k: float | None = None
) -> tuple[CarbonLine, ...]:
    """Lines of a carbon spectrum by the symmetry of the molecule in motion.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Hydrogens implicit.
    temperature_k : float, K, optional
        Decides which bonds turn slowly.

    Examples
    --------
    >>> [line.n_protons for line in carbon_lines(Chem.MolFromSmiles("Cc1ccc(C)cc1"))]
    [3, 0, 1]
    """
    fixed = settled(mol)
    symmetry = Symmetry(fixed, temperature_k=temperature_k)
    classes: list[list[int]] = []
    for atom in fixed.GetAtoms():
        if atom.GetAtomicNum() != 6:
            continue
        index = int(atom.GetIdx())
        for known in classes:
            if _are_alike(symmetry, known[0], index):
                known.append(index)
                break
        else:
            classes.append([index])
    return tuple(
        CarbonLine(
            atoms=tuple(group),
            n_protons=int(fixed.GetAtomWithIdx(group[0]).GetTotalNumHs()),
            window_ppm=_window(fixed.GetAtomWithIdx(group[0])),
        )
        for group in classes
    )


def _are_alike(symmetry: Symmetry, first: int, second: int) -> bool:
    if symmetry.colours[first] != symmetry.colours[second]:
        return False
    pairs = [((first, LONE), (second, LONE))]
    return symmetry.maps(pairs, 1) or symmetry.maps(pairs, -1)


def _window(atom: Chem.Atom) -> Window:
    degree = atom.GetTotalDegree()
    if degree >= 4:
        return _SATURATED
    if degree <= 2:
        return _LINEAR
    is_carbonyl = any(
        bond.GetBondType() == Chem.BondType.DOUBLE
        and bond.GetOtherAtom(atom).GetAtomicNum() in (8, 16)
        for bond in atom.GetBonds()
    )
    return _CARBONYL if is_carbonyl else _TRIGONAL
