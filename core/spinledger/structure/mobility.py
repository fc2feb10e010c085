"""What moves fast or slowly: delocalised charge, mobile protons, slow rotation.

Barriers in kcal/mol, temperatures in K.
"""

from __future__ import annotations

import functools
import math
from collections import defaultdict
from dataclasses import dataclass
from typing import Final

from rdkit import Chem

ROOM_TEMPERATURE_K: Final = 298.15
_GAS_CONSTANT_KCAL: Final = 1.987204e-3
_BOLTZMANN_OVER_PLANCK: Final = 2.083662e10
# Typical distance of the two signals that would merge (0.1 ppm at 400 MHz).
_TYPICAL_SPLITTING_HZ: Final = 40.0
_MOST_RESONANCE_FORMS: Final = 64


@dataclass(frozen=True, slots=True, kw_only=True)
class SlowBond:
    """A single bond about which rotation is slow on the time scale of shifts.

    Attributes
    ----------
    atoms : (int, int)
        The trigonal carbon (or nitrogen) and the nitrogen.
    kind : str
        "amide", "carbamate", ...
    barrier_kcal : float, kcal/mol
    """

    atoms: tuple[int, int]
    kind: str
    barrier_kcal: float


# Barriers to rotation, typical values from reviews of dynamic NMR (from memory):
# DMF 20.9, acetamides 18, benzamides 15.5, carbamates 15.5, thioamides 22,
# nitrosamines 23, formamidines 16, vinylogous amides 14.9, ureas below 12.
_ROTATIONS: Final = (
    ("formamide", "[CX3;H1;!R](=[OX1])-[NX3;!$(N-[C,S]=[O,S])]", 20.9),
    ("formamide", "[CX3;H1](=[OX1])-[NX3]", 20.9),
    ("urea", "[CX3](=[OX1])([NX3])-[NX3]", 11.0),
    ("carbamate", "[CX3](=[OX1])([OX2])-[NX3]", 15.5),
    ("benzamide", "[CX3](=[OX1])(c)-[NX3]", 15.5),
    ("amide", "[CX3](=[OX1])-[NX3]", 18.0),
    ("dithiocarbamate", "[CX3](=[SX1])(S)-[NX3]", 15.5),
    ("thiourea", "[CX3](=[SX1])([NX3])-[NX3]", 12.0),
    ("thioamide", "[CX3](=[SX1])-[NX3]", 22.0),
    ("nitrosamine", "[NX2](=[OX1])-[NX3]", 23.0),
    ("formamidine", "[CX3;H1](=[NX2;!$(N-[#1])])-[NX3;H0]", 16.0),
    ("vinylogous amide", "[CX3;!$(C=O)](=[CX3]-[C,N,S]=,#[O,N])-[NX3;H0]", 14.9),
)
_NOT_AMIDE_NITROGEN: Final = (
    "[$([NX3](C=[O,S])C=[O,S]),$([NX3]-S(=O)=O),$([NX3]-[NX3])]"
)

# Atoms whose charge, protons and bond orders move about faster than shifts
# differ; each match makes its end atoms alike.
_MOBILE: Final = (
    "[$([OX1]=[C,N,P,S,Cl,As,Se]),$([OX1-,OX2H1][C;$(C=[OX1])]),"
    "$([OX1-,OX2H1][N,P,S,Cl,As,Se;$(*=[OX1])])]",
)
_ENOL: Final = (
    "[OX2H1,OX1-][C]=[C][C]=[OX1]",
    "[OX2H1,OX1-][c]:[c][c]=[OX1]",
    "[NX3;H1,H2][C]=[C][C]=[NX2,NX3+]",
    "[NX3;H1,H2][CX3]=[NX2,NX3+]",
    "[NX3][CX3]=[NX3+]",
    "[SX2H1,SX1-][CX3]=[SX1]",
)
_DOUBLE: Final = f"{2.0:.3f}"
_AZOLE_NITROGEN: Final = "[n;r5]"


def slow_bonds(
    mol: Chem.Mol, temperature_k: float | None = None
) -> tuple[SlowBond, ...]:
    """Bonds to nitrogen that rotate slowly enough to keep two sites apart.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    temperature_k : float, K, optional
        298 K where it is not known.

    Returns
    -------
    tuple of SlowBond
        Open-chain bonds only: a ring holds its own bonds anyway.

    Notes
    -----
    Two signals of equal population merge at k = 2.22 times their distance;
    k is taken from the barrier by the Eyring equation, for a distance of 40 Hz.
    """
    limit = merging_barrier_kcal(temperature_k or ROOM_TEMPERATURE_K)
    return tuple(bond for bond in turning_bonds(mol) if bond.barrier_kcal > limit)


def turning_bonds(mol: Chem.Mol) -> tuple[SlowBond, ...]:
    """Bonds to nitrogen with some double-bond character, whatever their barrier."""
    excluded = {
        match[0] for match in mol.GetSubstructMatches(_pattern(_NOT_AMIDE_NITROGEN))
    }
    found: dict[tuple[int, int], SlowBond] = {}
    for kind, smarts, barrier in _ROTATIONS:
        for match in mol.GetSubstructMatches(_pattern(smarts), uniquify=False):
            atoms = (match[0], match[-1])
            bond = mol.GetBondBetweenAtoms(*atoms)
            if atoms in found or bond.IsInRing() or match[-1] in excluded:
                continue
            found[atoms] = SlowBond(atoms=atoms, kind=kind, barrier_kcal=barrier)
    return tuple(found.values())


def merging_barrier_kcal(temperature_k: float) -> float:
    """Barrier at which two signals 40 Hz apart just merge, kcal/mol.

    References
    ----------
    .. [1] H. S. Gutowsky, C. H. Holm, J. Chem. Phys. 25 (1956) 1228-1234,
       doi:10.1063/1.1743184.

    Examples
    --------
    >>> round(merging_barrier_kcal(298.15), 1)
    14.8
    """
    rate = math.pi / math.sqrt(2) * _TYPICAL_SPLITTING_HZ
    return (
        _GAS_CONSTANT_KCAL
        * temperature_k
        * math.log(_BOLTZMANN_OVER_PLANCK * temperature_k / rate)
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Averaging:
    """Colours of atoms and bonds after fast motion of charges and protons.

    Two atoms (or bonds) that fast exchange makes alike have equal colours.
    ``mobile`` are the atoms of groups in which protons or charge move.
    """

    atoms: tuple[str, ...]
    bonds: dict[frozenset[int], str]
    mobile: frozenset[int]

    def is_fixed_double(self, ends: tuple[int, int]) -> bool:
        """Whether a bond is double all the time, so that it does not turn."""
        if self.mobile.issuperset(ends):
            return False
        return self.bonds[frozenset(ends)] in ("mobile", _DOUBLE)


def averaged_colours(mol: Chem.Mol) -> Averaging:
    """What each atom and bond looks like on the time scale of shifts.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.

    Notes
    -----
    Carboxylates, phosphates, amidinium and guanidinium, dyes with a
    delocalised charge, NH of azoles, enols of 1,3-diketones and amidines with
    NH: protons and charges move fast, so the ends look alike.
    """
    mobile = _mobile_atoms(mol)
    looks, orders = _resonance_averages(_resonance_forms(mol))
    atoms = []
    for atom in mol.GetAtoms():
        index = atom.GetIdx()
        facts: tuple[object, ...] = (
            atom.GetAtomicNum(),
            atom.GetIsotope(),
            looks[index][0],
        )
        if index in mobile:
            facts += ("mobile", mobile[index])
        else:
            facts += (atom.GetTotalNumHs(), looks[index][1])
        atoms.append(repr(facts))
    bonds = {}
    for bond in mol.GetBonds():
        ends = frozenset((bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()))
        is_mobile = any(mobile.get(end) is not None for end in ends)
        bonds[ends] = "mobile" if is_mobile else orders[ends]
    return Averaging(atoms=tuple(atoms), bonds=bonds, mobile=frozenset(mobile))


def _mobile_atoms(mol: Chem.Mol) -> dict[int, str]:
    """Atoms of groups in which protons and charge move, with the kind of group."""
    found: dict[int, str] = {}
    for smarts in _MOBILE:
        for (index,) in mol.GetSubstructMatches(_pattern(smarts)):
            if _has_twin(mol, index):
                found[index] = "oxo"
    for smarts in _ENOL:
        for match in mol.GetSubstructMatches(_pattern(smarts)):
            for index in match:
                found.setdefault(index, "delocalised")
    found.update((index, "azole") for index in _azole_nitrogens(mol))
    return found


def _azole_nitrogens(mol: Chem.Mol) -> set[int]:
    """Nitrogens of five-rings between which a proton or a charge moves."""
    by_ring: dict[int, list[int]] = defaultdict(list)
    for (index,) in mol.GetSubstructMatches(_pattern(_AZOLE_NITROGEN)):
        for number, ring in enumerate(mol.GetRingInfo().AtomRings()):
            if index in ring and len(ring) == 5:
                by_ring[number].append(index)
    return {
        index
        for members in by_ring.values()
        if len(members) >= 2 and any(_is_proton_site(mol, i) for i in members)
        for index in members
    }


def _has_twin(mol: Chem.Mol, oxygen: int) -> bool:
    """Whether the centre of this oxygen has another terminal one."""
    (centre,) = mol.GetAtomWithIdx(oxygen).GetNeighbors()
    terminal = [
        n for n in centre.GetNeighbors() if n.GetAtomicNum() == 8 and n.GetDegree() == 1
    ]
    return len(terminal) > 1


def _is_proton_site(mol: Chem.Mol, index: int) -> bool:
    atom = mol.GetAtomWithIdx(index)
    return bool(atom.GetTotalNumHs()) or atom.GetFormalCharge() > 0


def _resonance_forms(mol: Chem.Mol) -> list[Chem.Mol]:
    """The molecule in its best resonance forms; itself alone where nothing is charged."""
    if not any(a.GetFormalCharge() for a in mol.GetAtoms()):
        return [mol]
    supplier = Chem.ResonanceMolSupplier(mol, maxStructs=_MOST_RESONANCE_FORMS)
    return [_perceived(form) for form in supplier if form is not None] or [mol]


def _perceived(form: Chem.Mol) -> Chem.Mol:
    """A resonance form with the aromaticity of its own bonds."""
    copy = Chem.Mol(form)
    Chem.Kekulize(copy, clearAromaticFlags=True)
    Chem.SanitizeMol(copy)
    return copy


def _resonance_averages(
    forms: list[Chem.Mol],
) -> tuple[list[tuple[bool, float]], dict[frozenset[int], str]]:
    """Aromaticity and mean charge of atoms, mean order of bonds, over the forms."""
    atoms = [
        (
            any(form.GetAtomWithIdx(i).GetIsAromatic() for form in forms),
            round(
                sum(form.GetAtomWithIdx(i).GetFormalCharge() for form in forms)
                / len(forms),
                3,
            ),
        )
        for i in range(forms[0].GetNumAtoms())
    ]
    orders = {}
    for bond in forms[0].GetBonds():
        ends = (bond.GetBeginAtomIdx(), bond.GetEndAtomIdx())
        drawn = [form.GetBondBetweenAtoms(*ends) for form in forms]
        mean = sum(b.GetBondTypeAsDouble() for b in drawn) / len(drawn)
        orders[frozenset(ends)] = f"{mean:.3f}"
    return atoms, orders


@functools.cache
def _pattern(smarts: str) -> Chem.Mol:
    return Chem.MolFromSmarts(smarts)
