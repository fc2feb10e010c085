"""What is in solution: ions, anomers, hydrates and enols of the drawn structure."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from typing import Final

from rdkit import Chem

from spinledger.processing.solvents import is_aqueous
from spinledger.structure.acidity import as_salt, at_ph
from spinledger.structure.sugars import SugarForm, sugar_forms
from spinledger.structure.tautomers import Tautomer, has_minor_enol, keto_enol_forms

# Share of the hydrate in water at room temperature (from memory): pattern
# starts at the carbonyl carbon; mean share and its sd.
_HYDRATES: Final = (
    ("[CX3H1](=O)C(=O)[OX1-,OX2H1]", 0.97, 0.03),
    ("[CX3H1](=O)C(F)(F)F", 0.99, 0.01),
    ("[CX3H1](=O)C(Cl)(Cl)Cl", 0.99, 0.01),
    ("[CX3](=O)([#6;!$(C=O)])C(=O)[OX2H1]", 0.60, 0.15),
    ("[CX3](=O)([#6;!$(C=O)])C(=O)[OX1-]", 0.06, 0.04),
    ("[CX3H1](=O)[CX4]", 0.50, 0.20),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Species:
    """One species in solution.

    Attributes
    ----------
    mol : Chem.Mol
        Hydrogens implicit. The given heavy atoms come first, in the given
        order; a hydrate has its water oxygen behind them.
    name : str
        "" for the only one, else "alpha", "beta", "hydrate", ...
    share, share_sd : float
    borderline : frozenset of int
        Atoms of groups that are half protonated.
    """

    mol: Chem.Mol
    name: str = ""
    share: float = 1.0
    share_sd: float = 0.0
    borderline: frozenset[int] = frozenset()


@dataclass(frozen=True, slots=True, kw_only=True)
class Solution:
    """All species of one structure in one solvent, with notes for the user."""

    species: tuple[Species, ...]
    notes: tuple[str, ...] = ()


def in_solution(
    mol: Chem.Mol, solvent: str | None, ph: float | None = None
) -> Solution:
    """Species of a structure in a solvent.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    solvent : str or None
        Canonical name.
    ph : float, optional
        Of water (pD is the meter reading + 0.4).

    Returns
    -------
    Solution
        The drawn form first, except that a hydrate with the larger share does
        not change the order.

    Notes
    -----
    In water: ions by pH; a free sugar as its anomers and ring sizes; alpha-keto
    acids and aldehydes with their hydrates. 1,3-diketones with their enols in
    every solvent. Elsewhere the drawing is taken, but acids
    drawn beside bases form salts, and amino acids in methanol are zwitterions.
    """
    if is_aqueous(solvent):
        protonation = at_ph(as_salt(mol, with_carboxylic_acids=False).mol, ph)
    else:
        protonation = as_salt(mol, with_carboxylic_acids=_forms_ions(mol, solvent))
    notes = list(protonation.notes)
    if len(Chem.GetMolFrags(mol)) > 1:
        notes.append(
            "Several components are drawn; their proportion is not claimed "
            "and is to be read from the integrals."
        )
    found = [
        Species(mol=protonation.mol, borderline=protonation.borderline),
    ]
    mixture = tuple(_tautomers(found[0], solvent, notes))
    if not mixture and is_aqueous(solvent):
        mixture = tuple(_mixture(found[0], notes))
    return Solution(species=mixture or tuple(found), notes=tuple(notes))


def _forms_ions(mol: Chem.Mol, solvent: str | None) -> bool:
    """Whether carboxylic acids pass their proton to amines in this solvent."""
    return solvent in ("CD3OD", "TFE-d3") or len(Chem.GetMolFrags(mol)) > 1


def _shares(drawn: Species, forms: Iterable[Tautomer | SugarForm]) -> Iterator[Species]:
    """The forms of what is drawn, each with its share."""
    for form in forms:
        yield Species(
            mol=form.mol,
            name=form.name,
            share=form.share,
            share_sd=form.share_sd,
            borderline=drawn.borderline,
        )


def _tautomers(
    drawn: Species, solvent: str | None, notes: list[str]
) -> Iterator[Species]:
    forms = keto_enol_forms(drawn.mol, solvent)
    if forms:
        notes.append(
            "A 1,3-diketone is a mixture of keto and enol form; both are claimed, in a "
            "proportion that the spectrum decides."
        )
    elif has_minor_enol(drawn.mol):
        notes.append(
            "Some enol (5 to 10 %) may show besides the keto form, which is claimed."
        )
    yield from _shares(drawn, forms)


def _mixture(drawn: Species, notes: list[str]) -> Iterator[Species]:
    forms = sugar_forms(drawn.mol)
    if forms:
        notes.append(
            f"A free sugar is a mixture in water; {len(forms)} forms (anomers, ring "
            "sizes) are claimed, in a proportion that the spectrum decides."
        )
        yield from _shares(drawn, forms)
        return
    hydrate = _hydrate(drawn)
    if hydrate is not None:
        notes.append(
            "Part of it may be hydrated in water; the hydrate is claimed as a "
            "second species."
        )
        yield Species(
            mol=drawn.mol,
            name="carbonyl form",
            share=1.0 - hydrate.share,
            share_sd=hydrate.share_sd,
            borderline=drawn.borderline,
        )
        yield hydrate


def _hydrate(drawn: Species) -> Species | None:
    """Hydrate of the first carbonyl group that forms one."""
    for smarts, share, share_sd in _HYDRATES:
        match = drawn.mol.GetSubstructMatch(Chem.MolFromSmarts(smarts))
        if match:
            return Species(
                mol=_with_water(drawn.mol, match[0]),
                name="hydrate",
                share=share,
                share_sd=share_sd,
                borderline=drawn.borderline,
            )
    return None


def _with_water(mol: Chem.Mol, carbon: int) -> Chem.Mol:
    copy = Chem.RWMol(mol)
    for bond in copy.GetAtomWithIdx(carbon).GetBonds():
        other = bond.GetOtherAtom(copy.GetAtomWithIdx(carbon))
        if bond.GetBondType() == Chem.BondType.DOUBLE and other.GetAtomicNum() == 8:
            bond.SetBondType(Chem.BondType.SINGLE)
            other.SetNoImplicit(False)
            break
    water = copy.AddAtom(Chem.Atom(8))
    copy.AddBond(carbon, water, Chem.BondType.SINGLE)
    plain = copy.GetMol()
    Chem.SanitizeMol(plain)
    return plain
