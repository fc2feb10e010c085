"""Close isomers of a claimed structure that could own the same spectrum."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from itertools import combinations, zip_longest
from typing import Literal

from rdkit import Chem, rdBase

IsomerKind = Literal["stereo", "double bond", "position", "turned round", "branching"]

MAX_STEREO_FLIPS = 64
# Groups that do not last in a bottle: gem-diols, hemiaminals, halo-alcohols,
# enols and enamines with free OH or NH (common knowledge, from memory).
_SHORT_LIVED = tuple(
    Chem.MolFromSmarts(text)
    for text in (
        "[CX4]([OX2H,NX3;H1,H2])[OX2,NX3,NX4+,F,Cl,Br,I]",
        "[CX4]([F,Cl,Br,I])[NX3,OX2]",
        "[CX3;!$(C=[O,N,S])]=[CX3][OX2,NX3;H1,H2]",
        "[CX3;!a](=[CX3])[OX2][CX3]=O",
        "[OX2,NX3][OX2,NX3]",
    )
)
_REVERSIBLE = Chem.MolFromSmarts("[#6:1][CX3:2](=O)[O,NX3;!R0,R0:3][#6:4]")


@dataclass(frozen=True, slots=True, kw_only=True)
class Isomer:
    """A structure of the same formula, made from another by one change.

    Attributes
    ----------
    smiles : str
        Canonical, isomeric.
    kind : str
    change : str
        In words: "substituent moved on the ring", ...
    """

    smiles: str
    kind: IsomerKind
    change: str


def close_isomers(
    molecule: Chem.Mol,
    *,
    limit: int,
    cancelled: Callable[[], None] | None = None,
) -> tuple[Isomer, ...]:
    """Isomers one change away, one kind after the other in turn.

    Parameters
    ----------
    molecule : rdkit.Chem.Mol
        Heavy atoms of the claimed structure.
    limit : int
        Largest number given back.
    cancelled : callable, optional
        Raises when the user stopped.

    Notes
    -----
    The structure itself and its mirror image are left out: a proton spectrum
    in an achiral solvent cannot tell mirror images apart.
    """
    seen = set(_names(molecule))
    makers = (
        _stereo_isomers,
        _double_bond_isomers,
        _position_isomers,
        _turned_round,
        _branched,
    )
    short_lived = _short_lived_groups(molecule)
    chosen: list[Isomer] = []
    for row in zip_longest(*(maker(molecule) for maker in makers)):
        if cancelled is not None:
            cancelled()
        for isomer in row:
            if isomer is None or len(chosen) >= limit:
                continue
            made = Chem.MolFromSmiles(isomer.smiles)
            if _short_lived_groups(made) > short_lived:
                continue
            names = _names(made)
            if seen.isdisjoint(names):
                seen.update(names)
                chosen.append(isomer)
        if len(chosen) >= limit:
            break
    return tuple(chosen)


def _short_lived_groups(molecule: Chem.Mol) -> int:
    return sum(len(molecule.GetSubstructMatches(one)) for one in _SHORT_LIVED)


def _names(molecule: Chem.Mol) -> tuple[str, str]:
    """Canonical SMILES of a molecule and of its mirror image."""
    bare = Chem.Mol(molecule)
    for atom in bare.GetAtoms():
        atom.SetAtomMapNum(0)
    mirror = Chem.Mol(bare)
    for atom in mirror.GetAtoms():
        atom.InvertChirality()
    # Round trip, since the order of neighbours may hold stale marks.
    return tuple(  # type: ignore[return-value]
        Chem.MolToSmiles(Chem.MolFromSmiles(Chem.MolToSmiles(one)))
        for one in (bare, mirror)
    )


def _stereo_isomers(molecule: Chem.Mol) -> Iterator[Isomer]:
    """Relative configurations: some, but not all, marked centres inverted."""
    centres = [
        atom.GetIdx()
        for atom in molecule.GetAtoms()
        if atom.GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED
    ]
    made = 0
    for size in range(1, len(centres) // 2 + 1):
        for flipped in combinations(centres, size):
            if made >= MAX_STEREO_FLIPS:
                return
            made += 1
            other = Chem.Mol(molecule)
            for index in flipped:
                other.GetAtomWithIdx(index).InvertChirality()
            yield Isomer(
                smiles=_canonical(other),
                kind="stereo",
                change="other relative configuration",
            )


def _canonical(molecule: Chem.Mol) -> str:
    return str(Chem.MolToSmiles(Chem.MolFromSmiles(Chem.MolToSmiles(molecule))))


def _double_bond_isomers(molecule: Chem.Mol) -> Iterator[Isomer]:
    turned = {
        Chem.BondStereo.STEREOE: Chem.BondStereo.STEREOZ,
        Chem.BondStereo.STEREOZ: Chem.BondStereo.STEREOE,
        Chem.BondStereo.STEREOCIS: Chem.BondStereo.STEREOTRANS,
        Chem.BondStereo.STEREOTRANS: Chem.BondStereo.STEREOCIS,
    }
    for bond in molecule.GetBonds():
        if bond.GetStereo() not in turned:
            continue
        other = Chem.Mol(molecule)
        other.GetBondWithIdx(bond.GetIdx()).SetStereo(turned[bond.GetStereo()])
        yield Isomer(
            smiles=str(Chem.MolToSmiles(other)),
            kind="double bond",
            change="double bond of the other geometry",
        )


def _position_isomers(molecule: Chem.Mol) -> Iterator[Isomer]:
    """A substituent moved to another CH of an aromatic ring, CH2 of another one."""
    for ring in molecule.GetRingInfo().AtomRings():
        atoms = [molecule.GetAtomWithIdx(index) for index in ring]
        is_aromatic = all(atom.GetIsAromatic() for atom in atoms)
        free = [
            atom.GetIdx() for atom in atoms if _is_free(atom, is_aromatic=is_aromatic)
        ]
        for atom in atoms:
            if not (is_aromatic or _is_sp3_carbon(atom)) or atom.GetSymbol() != "C":
                continue
            for bond in atom.GetBonds():
                if bond.IsInRing() or bond.GetBondType() != Chem.BondType.SINGLE:
                    continue
                branch = bond.GetOtherAtomIdx(atom.GetIdx())
                for target in free:
                    smiles = _moved(molecule, branch, atom.GetIdx(), target)
                    if smiles is not None:
                        yield Isomer(
                            smiles=smiles,
                            kind="position",
                            change="substituent at another place of the ring",
                        )


def _is_free(atom: Chem.Atom, *, is_aromatic: bool) -> bool:
    """Whether a ring atom can take a substituent from another."""
    if is_aromatic:
        return bool(atom.GetSymbol() == "C" and atom.GetTotalNumHs())
    return _is_sp3_carbon(atom) and bool(atom.GetTotalNumHs() == 2)


def _turned_round(molecule: Chem.Mol) -> Iterator[Isomer]:
    """Esters and amides with acyl and alkyl side exchanged."""
    for acyl, carbonyl, _, hetero, alkyl in molecule.GetSubstructMatches(_REVERSIBLE):
        if molecule.GetBondBetweenAtoms(carbonyl, hetero).IsInRing():
            continue
        editable = Chem.RWMol(molecule)
        editable.RemoveBond(acyl, carbonyl)
        editable.RemoveBond(hetero, alkyl)
        editable.AddBond(alkyl, carbonyl, Chem.BondType.SINGLE)
        editable.AddBond(hetero, acyl, Chem.BondType.SINGLE)
        smiles = _sane(editable, {acyl, carbonyl, hetero, alkyl})
        if smiles is not None:
            yield Isomer(
                smiles=smiles,
                kind="turned round",
                change="ester or amide turned round",
            )


def _branched(molecule: Chem.Mol) -> Iterator[Isomer]:
    """A methyl, a hetero group or a halogen moved to the next carbon atom."""
    for atom in molecule.GetAtoms():
        if atom.GetDegree() != 1 or atom.GetFormalCharge() != 0:
            continue
        bond = atom.GetBonds()[0]
        if bond.GetBondType() != Chem.BondType.SINGLE:
            continue
        home = bond.GetOtherAtom(atom)
        if not _is_sp3_carbon(home):
            continue
        for target in home.GetNeighbors():
            if target.GetIdx() == atom.GetIdx() or not _is_sp3_carbon(target):
                continue
            if target.GetTotalNumHs() == 0:
                continue
            smiles = _moved(molecule, atom.GetIdx(), home.GetIdx(), target.GetIdx())
            if smiles is not None:
                yield Isomer(
                    smiles=smiles,
                    kind="branching",
                    change="group at the next carbon atom",
                )


def _is_sp3_carbon(atom: Chem.Atom) -> bool:
    return bool(
        atom.GetSymbol() == "C"
        and atom.GetHybridization() == Chem.HybridizationType.SP3
    )


def _moved(molecule: Chem.Mol, branch: int, home: int, target: int) -> str | None:
    """SMILES with ``branch`` taken from ``home`` and bound to ``target``."""
    if branch == target:
        return None
    editable = Chem.RWMol(molecule)
    editable.RemoveBond(branch, home)
    editable.AddBond(branch, target, Chem.BondType.SINGLE)
    return _sane(editable, {branch, home, target})


def _sane(editable: Chem.RWMol, changed: set[int]) -> str | None:
    """Canonical SMILES after the changed atoms lost marks and fixed hydrogens."""
    for index in changed:
        atom = editable.GetAtomWithIdx(index)
        atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
        if not (atom.GetIsAromatic() and atom.GetSymbol() != "C"):
            atom.SetNumExplicitHs(0)
            atom.SetNoImplicit(False)
    try:
        with rdBase.BlockLogs():
            Chem.SanitizeMol(editable)
            Chem.AssignStereochemistry(editable, cleanIt=True, force=True)
            return _canonical(editable.GetMol())
    except (Chem.AtomValenceException, Chem.KekulizeException):
        return None
