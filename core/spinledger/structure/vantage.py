"""Names of the two places on one carbon: axial and equatorial, pro-R and pro-S."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

from rdkit import Chem
from rdkit.Chem import rdCIPLabeler

from spinledger.structure.chairs import chair_rings
from spinledger.structure.settled import open_centres, with_hydrogens
from spinledger.structure.stereo_elements import FIRST_H, LONE, SECOND_H
from spinledger.structure.topicity import ProtonGroup

# A place is named where it is taken at least so much of the time.
_MOSTLY: Final = 0.9
_PROCHIRAL: Final = {"R": "pro-R", "S": "pro-S"}


def axial_preferences(mol: Chem.Mol, groups: Sequence[ProtonGroup]) -> dict[int, float]:
    """Excess of the axial over the equatorial place for protons of chair rings.

    Parameters
    ----------
    mol : Chem.Mol
        Settled, hydrogens implicit.
    groups : sequence of ProtonGroup

    Returns
    -------
    dict of int to float
        By index of the group: +1 always axial, -1 always equatorial. Groups
        outside such rings, and ring-fusion protons of two rings that differ,
        are left out.
    """
    shares: dict[tuple[int, int], set[float]] = {}
    for ring in chair_rings(mol):
        for place, index in enumerate(ring.atoms):
            for position in ring.faces[place]:
                if position in (FIRST_H, SECOND_H, LONE):
                    share = round(ring.axial_share(place, position), 3)
                    shares.setdefault((index, position), set()).add(share)
    if not shares:
        return {}
    found: dict[int, float] = {}
    for index, group in enumerate(groups):
        carrier = group.carriers[0]
        seen = shares.get((carrier, _position(mol, group, carrier)))
        if seen is not None and len(seen) == 1:
            found[index] = 2.0 * next(iter(seen)) - 1.0
    return found


def places(mol: Chem.Mol, groups: Sequence[ProtonGroup]) -> tuple[str, ...]:
    """Place of each group in words: "axial", "pro-R", "axial, pro-R" or "".

    Parameters
    ----------
    mol : Chem.Mol
        Settled, hydrogens implicit.
    groups : sequence of ProtonGroup

    Notes
    -----
    Axial and equatorial where a proton spends at least 95 % of its time there.
    pro-R and pro-S by the rule of Cahn, Ingold and Prelog, for the configuration
    as drawn; not where the drawing leaves a stereocentre open.
    """
    preferences = axial_preferences(mol, groups)
    prochiral = _prochiral(mol, groups)
    out = []
    for index in range(len(groups)):
        words = []
        preference = preferences.get(index, 0.0)
        if abs(preference) >= _MOSTLY:
            words.append("axial" if preference > 0 else "equatorial")
        if index in prochiral:
            words.append(prochiral[index])
        out.append(", ".join(words))
    return tuple(out)


def _prochiral(mol: Chem.Mol, groups: Sequence[ProtonGroup]) -> dict[int, str]:
    pairs = [
        index
        for index, group in enumerate(groups)
        if group.relation == "diastereotopic"
        and len(group.carriers) == 1
        and len(group.hydrogens) == 1
    ]
    if not pairs or open_centres(mol):
        return {}
    full = with_hydrogens(mol)
    found = {}
    for index in pairs:
        label = _label(full, groups[index].carriers[0], groups[index].hydrogens[0])
        if label in _PROCHIRAL:
            found[index] = _PROCHIRAL[label]
    return found


def _label(full: Chem.Mol, carrier: int, hydrogen: int) -> str:
    """CIP label of a carrier once one of its protons outranks the other."""
    marked = Chem.Mol(full)
    marked.GetAtomWithIdx(hydrogen).SetIsotope(2)
    rdCIPLabeler.AssignCIPLabels(marked, [carrier], [])
    atom = marked.GetAtomWithIdx(carrier)
    return str(atom.GetProp("_CIPCode")) if atom.HasProp("_CIPCode") else ""


def _position(mol: Chem.Mol, group: ProtonGroup, carrier: int) -> int:
    """Position of a group's proton on one of its carriers."""
    first = mol.GetNumAtoms() + sum(
        mol.GetAtomWithIdx(i).GetTotalNumHs() for i in range(carrier)
    )
    if mol.GetAtomWithIdx(carrier).GetTotalNumHs() == 1:
        return LONE
    return FIRST_H if first in group.hydrogens else SECOND_H
