"""Protonation in water: which groups are charged at a pH; pKa from tables."""

from __future__ import annotations

import functools
from dataclasses import dataclass
from typing import Final

from rdkit import Chem

DEFAULT_PH: Final = 7.4

# pKa of groups in water at 25 degC, textbook values (from memory, +-0.5); the
# first atom of each pattern loses the proton. Earlier rows win.
_ACIDS: Final = (
    ("sulfonic acid", "[OX2H1]S(=O)(=O)", -1.0),
    ("phosphoric acid", "[OX2H1]P(=O)", 1.5),
    ("alpha-halo acid", "[OX2H1]C(=O)C([F,Cl])[F,Cl]", 0.7),
    ("alpha-keto acid", "[OX2H1]C(=O)C=O", 2.4),
    ("alpha-amino acid", "[OX2H1]C(=O)[CX4][$([NX3;!$(N-C=O)]),NX4]", 2.2),
    ("carboxylic acid", "[OX2H1]C=O", 4.3),
    ("thioacid", "[OX2H1,SX2H1]C=[O,S]", 3.4),
    ("vinylogous acid", "[OX2H1][C;R]=[C;R][C;R]=O", 4.8),
    ("dinitrophenol", "[OX2H1]c1c(N(=O)=O)cc(N(=O)=O)cc1", 4.0),
    ("dinitrophenol", "[OX2H1]c1c([N+](=O)[O-])cc([N+](=O)[O-])cc1", 4.0),
    ("nitrophenol", "[OX2H1]c1ccc([N+](=O)[O-])cc1", 7.1),
    ("phenol", "[OX2H1]c", 10.0),
    ("thiophenol", "[SX2H1]c", 6.5),
    ("aminothiol", "[SX2H1]CC[NX3,NX4]", 8.3),
    ("thiol", "[SX2H1]C", 10.3),
    ("hydroxamic acid", "[OX2H1][NX3]C=O", 9.0),
    ("acyl sulfonamide", "[NX3H1](C=O)S(=O)=O", 4.3),
    ("sulfonamide of a heteroarene", "[NX3H1](S(=O)=O)c:[n,o,s]", 6.3),
    ("imide", "[NX3H1](C=O)C=O", 9.6),
    ("tetrazole", "[nH1]1nnnc1", 4.9),
    ("tetrazole", "[nH1]1nncn1", 4.9),
)
_SECOND_PHOSPHATE_PKA: Final = 6.5

# pKa of the conjugate acid; the first atom takes the proton.
_BASES: Final = (
    ("biguanide", "[NX2]=C(N)[NX3]C(=N)N", 11.5),
    ("cyclic acylguanidine", "[NX2;R](C=O)=C(N)N", 4.8),
    ("acylguanidine", "[NX2](C=O)=C(N)N", 7.9),
    ("acylguanidine", "[NX2]=C([NX3]C=O)N", 7.9),
    ("nitroguanidine", "[NX2](N(=O))=C(N)N", -1.0),
    ("cyanoguanidine", "[NX2](C#N)=C(N)N", -1.0),
    ("guanidine", "[NX2;!$(N-[N,O,S])]=[CX3;!$(Cc)]([NX3])[NX3]", 12.5),
    ("isothiourea", "[NX2]=C([NX3])S", 9.8),
    ("amidine", "[NX2;!$(N-[N,O,S,c])]=[CX3;!$(C[O])][NX3;!$(N-[C,S]=[O,S])]", 11.5),
    ("4-aminopyridine", "[nX2]1ccc([NX3;!$(N-[C,S]=O)])cc1", 9.3),
    ("2-aminopyridine", "[nX2]1c([NX3;!$(N-[C,S]=O)])cccc1", 6.9),
    ("imidazole", "[nX2]1[c;R1][c;R1][n;H1,X3]c1", 7.0),
    ("pyridine", "[nX2]1[c;!$(c[F,Cl,Br])]cccc1", 5.3),
    ("aryl amine", "[NX3;!$(N-[C,S,P]=[O,S]);!$(N-N);!$(Nc:n)]c", 4.5),
    ("hydrazine", "[NX3;!$(N-[C,S]=[O,S]);!$(N-c)][NX3;!$(N-[C,S,P]=O)]", 7.9),
    ("hydroxylamine", "[NX3;!$(N-[C,S]=[O,S])][OX2]", 5.5),
    ("tertiary amine", "[NX3H0]([CX4])([CX4])[CX4]", 9.9),
    ("secondary amine", "[NX3H1]([CX4])[CX4]", 10.8),
    ("primary amine", "[NX3H2][CX4]", 10.3),
    ("ammonia", "[NX3H3]", 9.25),
)
_AMINES: Final = frozenset({"tertiary amine", "secondary amine", "primary amine"})

# Shift of an amine's pKa by what stands near it (from memory): pattern starts
# at the nitrogen.
_AMINE_EFFECTS: Final = (
    ("[NX3][CX4]C#N", -5.0),
    ("[NX3][CX4][CX4,c]([F,Cl])[F,Cl]", -4.5),
    ("[NX3][CX4]C(=O)[OX2H0,NX3]", -2.5),
    ("[NX3][CX4]C(=O)[OX1-,OX2H1]", -0.6),
    ("[NX3][CX4]C(=O)[#6]", -2.3),
    ("[NX3][CX4]c", -0.9),
    ("[NX3][CX4]C=C", -0.7),
    ("[NX3][CX4]C#C", -2.2),
    ("[NX3][CX4][CX4][OX2]", -0.8),
    ("[NX3][CX4][OX2]", -2.0),
    ("[NX3][CX4]P=O", -0.5),
    ("[NX3]1CC[NX3,NX4]CC1", -1.5),
)
# Effect of a charge already on another nitrogen, by bonds between the two.
_CHARGE_EFFECTS: Final = {1: -8.0, 2: -6.0, 3: -3.0, 4: -1.3, 5: -0.7, 6: -0.4}

_STRONG_ACIDS: Final = (
    "[F,Cl,Br,I;H1;D0]",
    "[OX2H1]S(=O)(=O)",
    "[OX2H1]C(=O)C(F)(F)F",
    "[OX2H1][N+](=O)[O-]",
    "[OX2H1]Cl(=O)(=O)=O",
    "[OX2H1]P(=O)",
    "[OX2H1]C(=O)C(=O)[OX2H1,OX1-]",
)
_STRONG_ANIONS: Final = (
    "[F-,Cl-,Br-,I-]",
    "[OX1-]S(=O)(=O)",
    "[OX1-]C(=O)C(F)(F)F",
    "[OX1-]Cl(=O)(=O)=O",
)
_ACIDIC_PH: Final = 2.0
_WEAK_ACID: Final = "[OX2H1][CX3]=O"


@dataclass(frozen=True, slots=True, kw_only=True)
class Protonation:
    """A molecule as it is in solution.

    Attributes
    ----------
    mol : Chem.Mol
        Same heavy atoms in the same order.
    notes : tuple of str
        One sentence for each thing that was decided.
    borderline : frozenset of int
        Atoms whose group is half protonated: its neighbours' shifts depend
        on the exact pH.
    """

    mol: Chem.Mol
    notes: tuple[str, ...] = ()
    borderline: frozenset[int] = frozenset()


def at_ph(mol: Chem.Mol, ph: float | None = None) -> Protonation:
    """Ions of a molecule in water.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    ph : float, optional
        7.4 where it is not known; about 2 if a strong acid is drawn with it.

    Notes
    -----
    Groups that are drawn charged stay so. Acids below, bases above the pH are
    charged, the strongest first; each charge weakens its neighbours.
    """
    notes: list[str] = []
    level = DEFAULT_PH if ph is None else ph
    if ph is None and _is_salt_of_strong_acid(mol):
        level = _ACIDIC_PH
        notes.append("A strong acid is drawn with it; the solution is taken as acidic.")
    copy = Chem.RWMol(mol)
    borderline = _deprotonate(copy, level) | _protonate(copy, level)
    result = _sanitised(copy)
    if Chem.MolToSmiles(result) != Chem.MolToSmiles(mol):
        taken = "given" if ph is not None else "taken"
        notes.append(f"In water at pH {level:g} ({taken}) the ion is claimed.")
    if borderline:
        notes.append(
            "A group is partly protonated at this pH; its shifts move with pH."
        )
    return Protonation(mol=result, notes=tuple(notes), borderline=frozenset(borderline))


def _is_salt_of_strong_acid(mol: Chem.Mol) -> bool:
    """Whether a fragment without nitrogen bases is a strong acid, or its anion."""
    bases = set(_base_strengths(mol))
    bases |= {a.GetIdx() for a in mol.GetAtoms() if _is_onium(a)}
    acids = set(_acid_atoms(mol, (*_STRONG_ACIDS, *_STRONG_ANIONS)))
    fragments = [set(f) for f in Chem.GetMolFrags(mol)]
    return any(f & acids and not f & bases for f in fragments) and any(
        f & bases and not f & acids for f in fragments
    )


def _is_onium(atom: Chem.Atom) -> bool:
    return bool(
        atom.GetAtomicNum() == 7 and atom.GetFormalCharge() > 0 and atom.GetTotalNumHs()
    )


def as_salt(mol: Chem.Mol, *, with_carboxylic_acids: bool) -> Protonation:
    """Pass protons from drawn acids to drawn bases, as in the solid salt.

    Parameters
    ----------
    mol : Chem.Mol
        Several fragments, or an amino acid.
    with_carboxylic_acids : bool
        Whether carboxylic acids give up theirs to amines, too.
    """
    copy = Chem.RWMol(mol)
    acids = _acid_atoms(copy, _STRONG_ACIDS)
    if with_carboxylic_acids:
        acids += [i for i in _acid_atoms(copy, (_WEAK_ACID,)) if i not in acids]
    bases = sorted(_base_strengths(copy).items(), key=lambda item: -item[1])
    moved = 0
    for acid, (base, strength) in zip(acids, bases, strict=False):
        if strength < 4.0:
            break
        _change_charge(copy, acid, -1)
        _change_charge(copy, base, 1)
        moved += 1
    if not moved:
        return Protonation(mol=mol)
    return Protonation(
        mol=_sanitised(copy),
        notes=("The acid's proton is claimed on the base, as in the salt.",),
    )


def _acid_atoms(mol: Chem.Mol, patterns: tuple[str, ...]) -> list[int]:
    found: list[int] = []
    for smarts in patterns:
        for match in mol.GetSubstructMatches(_pattern(smarts)):
            if match[0] not in found:
                found.append(match[0])
    return found


def _deprotonate(mol: Chem.RWMol, ph: float) -> set[int]:
    borderline: set[int] = set()
    strengths: dict[int, float] = {}
    for _, smarts, pka in _ACIDS:
        for match in mol.GetSubstructMatches(_pattern(smarts)):
            strengths.setdefault(match[0], pka)
    for index, strength in sorted(strengths.items(), key=lambda item: item[1]):
        pka = strength
        if _is_second_on_phosphorus(mol, index):
            pka = _SECOND_PHOSPHATE_PKA
        if abs(ph - pka) < 0.8:
            borderline.add(index)
        if ph > pka:
            _change_charge(mol, index, -1)
    return borderline


def _is_second_on_phosphorus(mol: Chem.RWMol, index: int) -> bool:
    return any(
        centre.GetAtomicNum() == 15
        and any(o.GetFormalCharge() < 0 for o in centre.GetNeighbors())
        for centre in mol.GetAtomWithIdx(index).GetNeighbors()
    )


def _protonate(mol: Chem.RWMol, ph: float) -> set[int]:
    borderline: set[int] = set()
    strengths = _base_strengths(mol)
    while strengths:
        index = max(strengths, key=lambda i: (strengths[i], -i))
        pka = strengths.pop(index) + _charge_effect(mol, index)
        if abs(ph - pka) < 0.8:
            borderline.add(index)
        if ph < pka:
            _change_charge(mol, index, 1)
    return borderline


def _base_strengths(mol: Chem.Mol) -> dict[int, float]:
    """Return pKa of the conjugate acid of each basic atom, charges left out."""
    found: dict[int, float] = {}
    kinds: dict[int, str] = {}
    taken: set[int] = set()
    for kind, smarts, pka in _BASES:
        for match in mol.GetSubstructMatches(_pattern(smarts)):
            index = match[0]
            if index in taken or mol.GetAtomWithIdx(index).GetFormalCharge():
                continue
            found[index], kinds[index] = pka, kind
            # Nitrogens that share their charge take one proton together.
            taken.update(i for i in match if mol.GetAtomWithIdx(i).GetAtomicNum() == 7)
    for smarts, effect in _AMINE_EFFECTS:
        near = {m[:3] for m in mol.GetSubstructMatches(_pattern(smarts))}
        for match in near:
            if kinds.get(match[0]) in _AMINES:
                found[match[0]] += effect
    return found


def _charge_effect(mol: Chem.RWMol, index: int) -> float:
    distances = Chem.GetDistanceMatrix(mol)
    return sum(
        _CHARGE_EFFECTS.get(int(distances[index][atom.GetIdx()]), 0.0)
        for atom in mol.GetAtoms()
        if atom.GetAtomicNum() == 7
        and atom.GetFormalCharge() > 0
        and not any(n.GetFormalCharge() < 0 for n in atom.GetNeighbors())
    )


def _change_charge(mol: Chem.RWMol, index: int, by: int) -> None:
    """Take off (-1) or put on (+1) a proton."""
    atom = mol.GetAtomWithIdx(index)
    hydrogens = atom.GetTotalNumHs()
    atom.SetFormalCharge(atom.GetFormalCharge() + by)
    atom.SetNoImplicit(True)
    atom.SetNumExplicitHs(max(hydrogens + by, 0))


def _sanitised(mol: Chem.RWMol) -> Chem.Mol:
    plain = mol.GetMol()
    Chem.SanitizeMol(plain)
    return plain


@functools.cache
def _pattern(smarts: str) -> Chem.Mol:
    return Chem.MolFromSmarts(smarts)
