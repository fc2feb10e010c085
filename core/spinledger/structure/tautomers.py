"""Keto and enol forms of 1,3-diketones, which exchange slowly enough to show both."""

from __future__ import annotations

import functools
from dataclasses import dataclass
from typing import Final

from rdkit import Chem

from spinledger.processing.solvents import is_aqueous

# Open-chain 1,3-diketone and its enol; atoms 0, 1: carbonyl C and O that becomes
# (or is) the enol; 2: carbon between; 3, 4: the other carbonyl.
_KETO: Final = "[CX3;!R](=[OX1])([#6])[CX4;!H0;!R][CX3;!R](=[OX1])[#6]"
_ENOL: Final = "[CX3;!R]([OX2H1])([#6])=[CX3;!R][CX3;!R](=[OX1])[#6]"
_KETO_ESTER: Final = "[CX3](=[OX1])([#6])[CX4;!H0][CX3](=[OX1])[OX2,NX3]"

# Share of the enol of acetylacetone at room temperature (from memory): 80-85 % in
# CDCl3, 95 % in hydrocarbons, 60-65 % in DMSO, 15-20 % in water. A substituent on
# the carbon between lowers it.
_ENOL_SHARES: Final = {"C6D6": 0.9, "DMSO-d6": 0.62, "CD3OD": 0.72, "acetone-d6": 0.75}
_WATER_SHARE: Final = 0.18
_USUAL_SHARE: Final = 0.82
_SUBSTITUTED_SHARE: Final = 0.3
_SHARE_SD: Final = 0.12


@dataclass(frozen=True, slots=True, kw_only=True)
class Tautomer:
    """One form with its expected share."""

    mol: Chem.Mol
    name: str
    share: float
    share_sd: float


def keto_enol_forms(mol: Chem.Mol, solvent: str | None) -> tuple[Tautomer, ...]:
    """Both forms of an open-chain 1,3-diketone, the drawn one first.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    solvent : str or None
        Canonical name.

    Returns
    -------
    tuple of Tautomer
        Empty if there is no such group. Same heavy atoms in the same order.
    """
    keto = mol.GetSubstructMatch(_pattern(_KETO))
    enol = mol.GetSubstructMatch(_pattern(_ENOL))
    if keto:
        carbon, oxygen, _, middle = keto[:4]
        other = _moved(mol, carbon, oxygen, middle, to_enol=True)
        names = ("keto form", "enol form")
    elif enol:
        carbon, oxygen, _, middle = enol[:4]
        other = _moved(mol, carbon, oxygen, middle, to_enol=False)
        names = ("enol form", "keto form")
    else:
        return ()
    is_substituted = mol.GetAtomWithIdx(middle).GetDegree() == 3
    share = _enol_share(solvent, is_substituted=is_substituted)
    shares = (1 - share, share) if keto else (share, 1 - share)
    return tuple(
        Tautomer(mol=form, name=name, share=part, share_sd=_SHARE_SD)
        for form, name, part in zip((mol, other), names, shares, strict=True)
    )


def has_minor_enol(mol: Chem.Mol) -> bool:
    """Whether some enol (5 to 10 %) may show besides a 1,3-keto ester or amide."""
    return bool(mol.HasSubstructMatch(_pattern(_KETO_ESTER)))


def _enol_share(solvent: str | None, *, is_substituted: bool) -> float:
    if is_aqueous(solvent):
        share = _WATER_SHARE
    else:
        share = _ENOL_SHARES.get(solvent or "", _USUAL_SHARE)
    return share * _SUBSTITUTED_SHARE if is_substituted else share


def _moved(
    mol: Chem.Mol, carbon: int, oxygen: int, middle: int, *, to_enol: bool
) -> Chem.Mol:
    """The other tautomer: double bond and proton change places."""
    copy = Chem.RWMol(mol)
    single, double = Chem.BondType.SINGLE, Chem.BondType.DOUBLE
    to_oxygen = copy.GetBondBetweenAtoms(carbon, oxygen)
    to_middle = copy.GetBondBetweenAtoms(carbon, middle)
    to_middle.SetStereo(Chem.BondStereo.STEREONONE)
    to_oxygen.SetBondType(single if to_enol else double)
    to_middle.SetBondType(double if to_enol else single)
    for index in (oxygen, middle):
        atom = copy.GetAtomWithIdx(index)
        atom.SetNoImplicit(False)
        atom.SetNumExplicitHs(0)
    copy.GetAtomWithIdx(middle).SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
    for bond in copy.GetBonds():
        bond.SetBondDir(Chem.BondDir.NONE)
    plain = copy.GetMol()
    Chem.SanitizeMol(plain)
    return plain


@functools.cache
def _pattern(smarts: str) -> Chem.Mol:
    return Chem.MolFromSmarts(smarts)
