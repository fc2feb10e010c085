"""Protons that exchange: their kind, whether a solvent shows them, where; ppm."""

from __future__ import annotations

import functools
from dataclasses import dataclass
from typing import Final

from rdkit import Chem

from spinledger.processing.solvents import is_aqueous, is_protic_deuterated
from spinledger.values.claim import Visibility

# Kind, pattern whose first atom carries the proton, then mean and sd of the
# shift in apolar solvents (CDCl3) and in hydrogen-bonding ones (DMSO-d6).
# Common practice, from memory; the sds cover concentration and temperature.
_KINDS: Final[tuple[tuple[str, str, tuple[float, float], tuple[float, float]], ...]] = (
    ("water", "[OX2H2,OX3H3]", (1.6, 0.5), (3.4, 0.3)),
    ("enol", "[OX2H1]C=CC=[OX1]", (14.0, 2.0), (14.0, 2.5)),
    ("carboxylic acid", "[OX2H1][CX3]=[OX1]", (11.2, 1.3), (12.4, 0.9)),
    ("sulfonic or phosphoric acid", "[OX2H1][S,P;$(*=[OX1])]", (10.5, 2.5), (9.5, 3.0)),
    ("hydroperoxide", "[OX2H1][OX2]", (8.0, 1.5), (11.0, 1.2)),
    ("oxime", "[OX2H1][NX2]=C", (8.6, 1.2), (11.0, 0.7)),
    ("hydroxylamine", "[OX2H1][NX3]", (8.0, 2.0), (9.5, 1.5)),
    ("chelated phenol", "[OX2H1]c:c[C;$(C=[O,N])]", (11.3, 1.2), (11.2, 1.2)),
    ("chelated phenol", "[OX2H1]c:cc(=O)", (12.4, 1.2), (12.3, 1.2)),
    ("phenol", "[OX2H1]c", (5.5, 1.2), (9.4, 0.7)),
    ("boronic acid", "[OX2H1]B", (5.0, 2.0), (8.0, 0.8)),
    ("silanol", "[OX2H1][Si]", (2.2, 1.5), (6.0, 1.5)),
    ("hemiacetal", "[OX2H1][CX4][OX2]", (3.3, 1.5), (6.3, 0.6)),
    ("alcohol", "[OX2H1][CX4]c", (2.3, 1.3), (5.3, 0.4)),
    ("alcohol", "[OX2H1][CX4;H2][CX4][OX2]", (2.4, 1.2), (4.5, 0.35)),
    ("alcohol", "[OX2H1][CX4;H1][CX4][OX2]", (2.6, 1.2), (4.75, 0.4)),
    ("alcohol", "[OX2H1][CX4;H0][CX4][OX2]", (2.6, 1.2), (4.7, 0.5)),
    ("alcohol", "[OX2H1][CX4]C(F)(F)F", (3.0, 1.0), (6.2, 0.5)),
    ("alcohol", "[OX2H1][CX4;H2,H3]", (1.9, 1.0), (4.4, 0.4)),
    ("alcohol", "[OX2H1][CX4;H1]C=[O,N]", (3.0, 1.0), (5.5, 0.5)),
    ("alcohol", "[OX2H1][CX4;H1]", (1.8, 1.0), (4.5, 0.4)),
    ("alcohol", "[OX2H1][CX4]", (1.9, 1.2), (4.5, 0.6)),
    ("OH", "[OH1,OH2]", (5.0, 3.0), (7.0, 3.0)),
    ("ammonium", "[NX4;!H0]", (8.2, 1.2), (8.3, 1.0)),
    ("guanidinium or amidinium", "[NX3;!H0,NX2H1]C=[N+]", (7.5, 1.2), (7.6, 1.0)),
    ("guanidinium or amidinium", "[N+;!H0]=C", (7.8, 1.5), (8.0, 1.2)),
    ("azinium", "[n+;H1]", (14.0, 3.0), (14.0, 3.0)),
    ("imide", "[NX3H1](C=[O,S])C=[O,S]", (8.8, 1.0), (11.0, 0.8)),
    ("sulfonamide", "[NX3;!H0]S(=O)=O", (5.2, 0.9), (7.6, 1.0)),
    ("carbamate", "[NX3;!H0](c)C(=O)[OX2]", (6.8, 0.7), (9.5, 0.6)),
    ("carbamate", "[NX3;!H0]C(=O)[OX2]", (5.0, 0.7), (7.0, 0.7)),
    ("urea", "[NX3;!H0]C(=[O,S])[NX3]", (5.8, 1.3), (7.0, 1.5)),
    ("hydrazide", "[NX3;!H0]([NX3])C=[O,S]", (7.8, 1.2), (9.6, 0.9)),
    ("primary amide", "[NX3H2]C=[O,S]", (5.9, 0.7), (7.4, 0.6)),
    ("anilide", "[NX3H1](c)C=[O,S]", (7.8, 0.9), (10.0, 0.6)),
    ("amide", "[NX3H1]C=[O,S]", (6.4, 0.9), (8.1, 0.7)),
    ("hydrazine or hydrazone", "[NX3;!H0][NX3,NX2]", (6.0, 2.0), (8.5, 2.5)),
    ("hydroxylamine NH", "[NX3;!H0][OX2]", (5.5, 1.5), (7.0, 1.5)),
    ("enamine NH", "[NX3;!H0][CX3]=C", (6.0, 2.5), (7.0, 2.0)),
    ("aromatic amine", "[NX3;!H0]c", (3.9, 0.7), (5.6, 0.9)),
    ("imine", "[NX2H1]=C", (8.0, 2.0), (9.0, 2.0)),
    ("amine", "[NX3;!H0]", (1.6, 0.9), (2.1, 1.2)),
    ("pyrrole or indole", "[nH1;$([nH]1cccc1)]", (8.2, 0.7), (11.0, 0.7)),
    ("lactam in an aromatic ring", "[nH1]c=[O,S]", (10.5, 1.8), (11.6, 0.9)),
    ("azole", "[nH1]", (10.5, 2.0), (12.6, 0.9)),
    ("NH", "[N,n;!H0]", (6.0, 3.0), (8.0, 3.0)),
    ("aryl thiol", "[SX2H1]c", (3.5, 0.5), (5.0, 1.0)),
    ("thiol", "[SX2H1]", (1.5, 0.5), (2.3, 0.5)),
    ("mineral acid", "[F,Cl,Br,I;!H0]", (8.0, 4.0), (8.0, 4.0)),
)
# How far from CDCl3 (0) to DMSO-d6 (1) a solvent moves such protons.
_STRENGTH: Final = {
    "DMSO-d6": 1.0,
    "DMF-d7": 1.0,
    "pyridine-d5": 1.3,
    "acetone-d6": 0.65,
    "THF-d8": 0.6,
    "dioxane-d8": 0.6,
    "CD3CN": 0.35,
    "H2O/D2O": 0.8,
}
# These last long enough to be seen in CD3OD or in water with little D2O.
_SLOW_NITROGEN: Final = frozenset(
    {"amide", "anilide", "primary amide", "carbamate", "pyrrole or indole", "imide"}
)

_FADING: Final = (
    ("terminal alkyne", "[CX2H1]#C", "base"),
    ("1,3-dicarbonyl", "[CX4;!H0]([C;$(C=[O,S]),$(C#N)])[C;$(C=[O,S]),$(C#N)]", "any"),
    ("nitroalkane", "[CX4;!H0][NX3+](=O)[O-]", "any"),
    ("disulfone or keto sulfone", "[CX4;!H0](S(=O)=O)[C,S;$(*=O)]", "any"),
    ("phloroglucinol type", "[cH1]([c;$(c[OH,O-])])[c;$(c[OH,O-])]", "any"),
    ("imidazolium", "[cH1;r5](:[n,n+,nH+]):[n+,nH+]", "any"),
    ("thiazolium", "[cH1;r5](:s):[n+]", "any"),
    ("imidazolium", "[cH1;r5](:[n+]):[nH]", "any"),
    ("alpha-keto acid", "[CX4;!H0][CX3](=O)[CX3](=O)[OX2H1,OX1-]", "any"),
    ("ketone", "[CX4;!H0][CX3](=O)[#6]", "base"),
    ("aldehyde", "[CX4;!H0][CX3H1]=O", "base"),
)
_BASIC_PH: Final = 9.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Exchange:
    """What exchange does to the protons on one atom.

    Attributes
    ----------
    kind : str
        "alcohol", "amide", "1,3-dicarbonyl", ...
    visibility : {"seen", "optional", "silent"}
    why : str
        One sentence.
    is_exchangeable : bool
        False for carbon acids, whose shift is predicted like any other.
    shift_ppm, shift_sd_ppm : float or None, ppm
        Weak prior of exchangeable protons.
    """

    kind: str
    visibility: Visibility
    why: str
    is_exchangeable: bool
    shift_ppm: float | None = None
    shift_sd_ppm: float | None = None


def exchanges(
    mol: Chem.Mol, solvent: str | None, ph: float | None = None
) -> dict[int, Exchange]:
    """Exchange behaviour of every atom whose protons are not simply seen.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit; ions as they are in solution.
    solvent : str or None
        Canonical name, see
        :func:`spinledger.processing.solvents.canonical_solvent`.
    ph : float, optional
        Of water.

    Returns
    -------
    dict of int to Exchange
        By heavy atom.

    Notes
    -----
    OH, NH, SH and acids swap their protons for deuterons in heavy water and
    deuterated alcohols; elsewhere they may be seen, at a shift that depends on
    concentration, and never decide anything. Amide NH outlasts a measurement
    in CD3OD and is seen in H2O. Some C-H protons also swap, slowly.
    """
    found = {
        index: _of_hetero_atom(kind, means, solvent)
        for index, (kind, means) in exchangeable_kinds(mol).items()
    }
    for index, kind in _fading(mol, solvent, ph).items():
        found.setdefault(
            index,
            Exchange(
                kind=kind,
                visibility="optional",
                why=(
                    f"This C-H ({kind}) may fade: it swaps slowly with the solvent; "
                    "CHD left over is a 1:1:1 triplet of 2 Hz, slightly upfield."
                    if mol.GetAtomWithIdx(index).GetTotalNumHs() == 2
                    else f"This C-H ({kind}) may fade: it swaps slowly with the solvent."
                ),
                is_exchangeable=False,
            ),
        )
    return found


_Means = tuple[tuple[float, float], tuple[float, float]]


def exchangeable_kinds(mol: Chem.Mol) -> dict[int, tuple[str, _Means]]:
    """Kind and shift priors of every atom with an exchangeable proton."""
    found: dict[int, tuple[str, _Means]] = {}
    for kind, smarts, apolar, bonding in _KINDS:
        for match in mol.GetSubstructMatches(_pattern(smarts), maxMatches=2000):
            if mol.GetAtomWithIdx(match[0]).GetTotalNumHs():
                found.setdefault(match[0], (kind, (apolar, bonding)))
    return found


def _of_hetero_atom(kind: str, means: _Means, solvent: str | None) -> Exchange:
    visibility, why = _visibility(kind, solvent)
    strength = _STRENGTH.get(solvent or "", 0.0)
    (low, low_sd), (high, high_sd) = means
    shift = low + strength * (high - low)
    sd = low_sd + min(strength, 1.0) * (high_sd - low_sd)
    if solvent is None:
        shift, sd = (low + high) / 2, max(low_sd, high_sd) + abs(high - low) / 2
    return Exchange(
        kind=kind,
        visibility=visibility,
        why=why,
        is_exchangeable=True,
        shift_ppm=shift,
        shift_sd_ppm=sd,
    )


def _visibility(kind: str, solvent: str | None) -> tuple[Visibility, str]:
    if kind in ("water", "mineral acid"):
        return "silent", f"This proton ({kind}) is part of the water line."
    is_slow = kind in _SLOW_NITROGEN
    if solvent == "H2O/D2O":
        if is_slow:
            return "optional", f"This NH ({kind}) exchanges with water; it may be weak."
        return "silent", f"This proton ({kind}) exchanges fast with water."
    if is_protic_deuterated(solvent):
        if is_slow and not is_aqueous(solvent):
            return (
                "optional",
                f"This NH ({kind}) swaps slowly with {solvent}; it may last for hours.",
            )
        return "silent", f"This proton ({kind}) is swapped for deuterium by {solvent}."
    if kind == "carboxylic acid":
        return (
            "optional",
            "A carboxylic acid proton may be too broad to be seen; "
            "its absence is no evidence.",
        )
    if kind in ("alcohol", "hemiacetal") and solvent != "DMSO-d6":
        return (
            "optional",
            f"This proton ({kind}) exchanges; it may be broad or sharp, and its "
            "coupling to the next CH, which is left out, may show.",
        )
    return (
        "optional",
        f"This proton ({kind}) exchanges: broad or sharp, anywhere in a wide range.",
    )


def _fading(mol: Chem.Mol, solvent: str | None, ph: float | None) -> dict[int, str]:
    if not is_protic_deuterated(solvent):
        return {}
    is_basic = ph is not None and ph >= _BASIC_PH
    found: dict[int, str] = {}
    for kind, smarts, condition in _FADING:
        if condition == "base" and not is_basic:
            continue
        for match in mol.GetSubstructMatches(_pattern(smarts)):
            found.setdefault(match[0], kind)
    return found


def couples_over_exchange(kind: str, solvent: str | None) -> bool:
    """Whether an exchangeable proton is expected to show its couplings.

    Amide-like NH nearly always does; OH does in DMSO-d6, where it exchanges
    slowly; amines and acids do not.
    """
    if kind in _SLOW_NITROGEN:
        return True
    return kind in ("alcohol", "hemiacetal") and solvent == "DMSO-d6"


@functools.cache
def _pattern(smarts: str) -> Chem.Mol:
    return Chem.MolFromSmarts(smarts)
