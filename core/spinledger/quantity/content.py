"""Residual solvents and common impurities against the compound, by integrals alone."""

from __future__ import annotations

import math
from collections import defaultdict
from dataclasses import dataclass

from rdkit import Chem
from rdkit.Chem.Descriptors import MolWt  # type: ignore[attr-defined]  # RDKit

from spinledger.processing.solvents import ImpurityLine, impurity_lines
from spinledger.quantity.conditions import PulseConditions, allowance
from spinledger.quantity.integrals import area_at, claim_areas
from spinledger.quantity.purity import area_per_proton
from spinledger.structure.read import molecule
from spinledger.values.evidence import Stray
from spinledger.values.ledger import Ledger

_REACH_PPM = 0.05
# Relative standard uncertainty of a small signal's integral beside its noise.
_PROCESSING = 0.02


@dataclass(frozen=True, slots=True, kw_only=True)
class Companion:
    """One other compound in the tube.

    Attributes
    ----------
    name, smiles : str
    shift_ppm : float, ppm
        Of the signal that was measured.
    n_protons : int
    mol_ratio, mol_ratio_u : float
        Molecules of it for each of the compound, with the standard uncertainty.
    mol_percent, mass_percent : float
        Of the compound and all companions together.
    """

    name: str
    smiles: str
    shift_ppm: float
    n_protons: int
    mol_ratio: float
    mol_ratio_u: float
    mol_percent: float
    mass_percent: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Content:
    """What else is in the tube, as far as protons show it.

    Attributes
    ----------
    companions : tuple of Companion
    not_counted : tuple of str
        One sentence for each stray that could not be counted.
    refusals, notes : tuple of str
    """

    companions: tuple[Companion, ...]
    not_counted: tuple[str, ...]
    refusals: tuple[str, ...]
    notes: tuple[str, ...]


def content(ledger: Ledger, known: PulseConditions | None = None) -> Content:
    """Mol and mass percent of the recognised impurities.

    Water, the solvent's own line, and compounds without protons are not seen.

    Parameters
    ----------
    ledger : Ledger
    known : PulseConditions, optional
    """
    allowed = allowance(ledger, known)
    signals, _ = claim_areas(ledger)
    refusals = list(allowed.refusals)
    if not signals:
        refusals.append("No signal of the compound stands clear of all others.")
    if len(ledger.claims.species_shares) > 1:
        refusals.append(
            "Several species share the signals; their sum is not formed yet."
        )
    found: list[_Found] = []
    not_counted: list[str] = []
    if not refusals:
        per_proton, u, _ = area_per_proton(signals)
        found, not_counted = _found(ledger, per_proton, u / per_proton)
    return Content(
        companions=_shares(ledger, found),
        not_counted=tuple(not_counted),
        refusals=tuple(refusals),
        notes=(
            *allowed.notes,
            "Only what has protons and a line of its own is counted.",
        ),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class _Found:
    line: ImpurityLine
    n_protons: int
    ratio: float
    u: float


def _found(
    ledger: Ledger, per_proton: float, relative_u: float
) -> tuple[list[_Found], list[str]]:
    """Best signal of each recognised compound, and what could not be counted."""
    by_name: dict[str, list[_Found]] = defaultdict(list)
    failed: dict[str, str] = {}
    loose: list[str] = []
    for stray in ledger.strays:
        if stray.kind not in ("impurity", "unexplained", "given"):
            continue
        place = f"{stray.high_ppm:.2f} to {stray.low_ppm:.2f} ppm"
        line = _line_of(ledger, stray)
        if line is None:
            loose.append(f"{place}: {stray.kind}, of no compound in the table.")
            continue
        n_protons = protons_of(line)
        area = area_at(ledger, (stray.low_ppm + stray.high_ppm) / 2)
        if not n_protons:
            failed[line.compound] = f"{line.compound}: its proton count is not certain."
        elif area is None or area.area <= 0:
            failed[line.compound] = f"{line.compound}: its signal does not stand clear."
        else:
            ratio = area.area / n_protons / per_proton
            u = ratio * math.hypot(relative_u, area.noise_sd / area.area, _PROCESSING)
            by_name[line.compound].append(
                _Found(line=line, n_protons=n_protons, ratio=ratio, u=u)
            )
    best = [min(rows, key=lambda one: one.u / one.ratio) for rows in by_name.values()]
    return best, [*(w for name, w in failed.items() if name not in by_name), *loose]


def _line_of(ledger: Ledger, stray: Stray) -> ImpurityLine | None:
    """Table line that a stray was recognised by."""
    middle = (stray.low_ppm + stray.high_ppm) / 2
    near = [
        (abs(line.shift_ppm - middle), rank, line)
        for rank, line in enumerate(impurity_lines(ledger.evidence.solvent))
        if stray.why.startswith(f"{line.compound}:")
        and abs(line.shift_ppm - middle) <= _REACH_PPM
    ]
    return min(near)[2] if near else None


def protons_of(line: ImpurityLine) -> int:
    """Protons behind a line of the table; 0 where group and structure leave it open.

    Examples
    --------
    >>> lines = {(one.compound, one.group): one for one in impurity_lines("CDCl3")}
    >>> protons_of(lines["acetone", "CH3"]), protons_of(lines["ethyl acetate", "CH2"])
    (6, 2)
    >>> protons_of(lines["ethyl acetate", "CH3"])
    0
    """
    mol = Chem.MolFromSmiles(line.smiles) if line.smiles else None
    if mol is None:
        return 0
    ranks = list(Chem.CanonicalRankAtoms(mol, breakTies=False))
    classes: dict[str, dict[int, int]] = defaultdict(lambda: defaultdict(int))
    for atom in mol.GetAtoms():
        n = atom.GetTotalNumHs()
        if atom.GetSymbol() == "C" and n:
            group = "CH" if n == 1 else f"CH{n}"
            classes[group][ranks[atom.GetIdx()]] += n
    own = classes.get(line.group, {})
    return next(iter(own.values())) if len(own) == 1 else 0


def _shares(ledger: Ledger, found: list[_Found]) -> tuple[Companion, ...]:
    own_mass = float(MolWt(molecule(ledger.structure)))
    masses = [float(MolWt(Chem.MolFromSmiles(one.line.smiles))) for one in found]
    moles = 1.0 + sum(one.ratio for one in found)
    mass = own_mass + sum(
        one.ratio * molar for one, molar in zip(found, masses, strict=True)
    )
    rows = [
        Companion(
            name=one.line.compound,
            smiles=one.line.smiles,
            shift_ppm=one.line.shift_ppm,
            n_protons=one.n_protons,
            mol_ratio=one.ratio,
            mol_ratio_u=one.u,
            mol_percent=100 * one.ratio / moles,
            mass_percent=100 * one.ratio * molar / mass,
        )
        for one, molar in zip(found, masses, strict=True)
    ]
    return tuple(sorted(rows, key=lambda one: -one.mass_percent))
