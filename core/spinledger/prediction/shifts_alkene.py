"""Which proton of a C=CH2 group is which: substituent increments; ppm."""

from __future__ import annotations

import functools
from typing import Final

from rdkit import Chem

_BASE_PPM: Final = 5.25

# Substituent, pattern that starts at the carbon of the double bond and goes on
# to the substituent, then the increments Z for geminal, cis and trans protons.
# Pascual, Meier, Simon, Helv. Chim. Acta 49 (1966) 164,
# doi:10.1002/hlca.660490122; Matter et al., Helv. Chim. Acta 52 (1969) 692
# (values from memory). Earlier rows win.
_INCREMENTS: Final = (
    ("CF3", "C-C(F)(F)F", 0.66, 0.61, 0.32),
    ("CHF2", "C-C(F)F", 0.66, 0.32, 0.21),
    ("CH2-halogen", "C-[CX4][F,Cl,Br]", 0.70, 0.11, -0.04),
    ("CH2-O or CH2-I", "C-[CX4][O,I]", 0.64, -0.01, -0.02),
    ("CH2-S", "C-[CX4]S", 0.71, -0.13, -0.22),
    ("CH2-N", "C-[CX4]N", 0.58, -0.10, -0.08),
    ("CH2-CO or CH2-CN", "C-[CX4][C;$(C=O),$(C#N)]", 0.69, -0.08, -0.06),
    ("CH2-aryl", "C-[CX4]c", 1.05, -0.29, -0.32),
    ("alkyl in ring", "[C;R]-[CX4;R]", 0.69, -0.25, -0.28),
    ("alkyl", "C-[CX4]", 0.45, -0.22, -0.28),
    ("C=C conjugated", "C-[CX3]=[CX3]-[C,c;$(*=,:*)]", 1.24, 0.02, -0.05),
    ("C=C", "C-[CX3]=[CX3]", 1.00, -0.09, -0.23),
    ("CN", "C-C#N", 0.27, 0.75, 0.55),
    ("C#C", "C-C#C", 0.47, 0.38, 0.12),
    ("COOH", "C-C(=O)[OX2H1,OX1-]", 0.97, 1.41, 0.71),
    ("COOR", "C-C(=O)[OX2]", 0.80, 1.18, 0.55),
    ("CHO", "C-[CX3H1]=O", 1.02, 0.95, 1.17),
    ("CONR2", "C-C(=O)N", 1.37, 0.98, 0.46),
    ("COCl", "C-C(=O)[Cl,Br]", 1.11, 1.46, 1.01),
    ("COR", "C-C(=O)[#6]", 1.10, 1.12, 0.87),
    ("OCOR", "C-[OX2]C=O", 2.11, -0.35, -0.64),
    ("OR conjugated", "C-[OX2][c,$(C=C)]", 1.21, -0.60, -1.00),
    ("OR", "C-[OX2]", 1.22, -1.07, -1.21),
    ("aryl, ortho substituted", "C-c:c-[!#1;!R]", 1.65, 0.19, 0.09),
    ("aryl", "C-c", 1.38, 0.36, -0.07),
    ("Cl", "C-Cl", 1.08, 0.18, 0.13),
    ("Br", "C-Br", 1.07, 0.45, 0.55),
    ("I", "C-I", 1.14, 0.81, 0.88),
    ("F", "C-F", 1.54, -0.40, -1.02),
    ("NCOR", "C-[NX3]C=O", 2.08, -0.57, -0.72),
    ("NR2 conjugated", "C-[NX3][c,$(C=C)]", 1.17, -0.53, -0.99),
    ("NR2", "C-[NX3]", 0.80, -1.26, -1.21),
    ("SO2R", "C-S(=O)=O", 1.55, 1.16, 0.93),
    ("SR", "C-[SX2]", 1.11, -0.29, -0.13),
    ("PO(OR)2", "C-P=O", 0.66, 0.88, 0.67),
)


def cis_trans_difference_ppm(
    mol: Chem.Mol, inner: int, cis: int | None, trans: int | None
) -> float | None:
    """Shift of one proton of C=CH2 less that of the other one, ppm.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    inner : int
        The other carbon of the double bond.
    cis, trans : int or None
        Its substituents cis and trans to the first proton; None for hydrogen.

    Returns
    -------
    float or None
        None where a substituent is not in the table.

    Examples
    --------
    >>> mol = Chem.MolFromSmiles("C=CC#N")
    >>> round(cis_trans_difference_ppm(mol, 1, 2, None), 2)
    0.2
    """
    near = _z(mol, inner, cis)
    far = _z(mol, inner, trans)
    if near is None or far is None:
        return None
    return (near[1] + far[2]) - (near[2] + far[1])


def alkene_shift_ppm(
    mol: Chem.Mol,
    inner: int,
    *,
    geminal: int | None,
    cis: int | None,
    trans: int | None,
) -> float | None:
    """Shift of an alkene proton from increments alone, ppm.

    Parameters
    ----------
    mol : Chem.Mol
    inner : int
        Carbon that bears the cis and trans substituents.
    geminal, cis, trans : int or None
        Substituents relative to the proton; None for hydrogen.
    """
    outer = next(
        (
            bond.GetOtherAtomIdx(inner)
            for bond in mol.GetAtomWithIdx(inner).GetBonds()
            if bond.GetBondType() == Chem.BondType.DOUBLE
        ),
        None,
    )
    if outer is None:
        return None
    parts = (_z(mol, outer, geminal), _z(mol, inner, cis), _z(mol, inner, trans))
    if any(part is None for part in parts):
        return None
    return _BASE_PPM + sum(part[i] for i, part in enumerate(parts) if part is not None)


def _z(
    mol: Chem.Mol, carbon: int, substituent: int | None
) -> tuple[float, float, float] | None:
    """Increments for geminal, cis and trans protons."""
    if substituent is None:
        return (0.0, 0.0, 0.0)
    for _, smarts, *values in _INCREMENTS:
        for match in mol.GetSubstructMatches(_pattern(smarts)):
            if match[0] == carbon and match[1] == substituent:
                return (values[0], values[1], values[2])
    return None


@functools.cache
def _pattern(smarts: str) -> Chem.Mol:
    return Chem.MolFromSmarts(smarts)
