"""Relative configurations that a drawing could have, and their names."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from rdkit import Chem

from spinledger.reconcile.coarse import FloatArray
from spinledger.structure.dihedrals import dihedrals_deg
from spinledger.structure.settled import open_centres

MOST_CENTRES = 6
LARGEST_RING = 8


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Configuration:
    """One relative configuration.

    Attributes
    ----------
    mol : rdkit.Chem.Mol
        Settled, hydrogens implicit.
    smiles : str
        Of one mirror image, stereo of all related centres marked.
    flipped : tuple of int
        Centres that stand the other way round than in the settled drawing.
    is_drawn : bool
        As drawn; False for all where the drawing leaves a centre open.
    """

    mol: Chem.Mol
    smiles: str
    flipped: tuple[int, ...]
    is_drawn: bool


def related_centres(mol: Chem.Mol) -> tuple[int, ...]:
    """Stereocentres with a proton that couplings can relate to another one.

    Two centres are related if they are bonded, or if they share a small ring.
    Bridgeheads, whose turn would break the cage, are left out.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Hydrogens implicit.
    """
    centres = [
        int(info.centeredOn)
        for info in Chem.FindPotentialStereo(Chem.Mol(mol))
        if info.type == Chem.StereoType.Atom_Tetrahedral
        and mol.GetAtomWithIdx(info.centeredOn).GetAtomicNum() == 6
        and not _is_bridgehead(mol, info.centeredOn)
    ]
    found = [
        one
        for one in centres
        if any(one != other and _are_related(mol, one, other) for other in centres)
    ]
    return tuple(found)


def _are_related(mol: Chem.Mol, first: int, second: int) -> bool:
    if mol.GetBondBetweenAtoms(first, second) is not None:
        return True
    return any(
        first in ring and second in ring and len(ring) <= LARGEST_RING
        for ring in mol.GetRingInfo().AtomRings()
    )


def _is_bridgehead(mol: Chem.Mol, index: int) -> bool:
    mine = [set(ring) for ring in mol.GetRingInfo().AtomRings() if index in ring]
    return any(len(one & other) > 2 for k, one in enumerate(mine) for other in mine[:k])


def configurations(mol: Chem.Mol, *, limit: int) -> tuple[Configuration, ...]:
    """Relative configurations, the drawn one first, then by the number of turns.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Settled, hydrogens implicit.
    limit : int
        Largest number given back.

    Returns
    -------
    tuple of Configuration
        Mirror images count once. Empty where fewer than two centres are
        related, or more than six are.
    """
    centres = related_centres(mol)
    if not 2 <= len(centres) <= MOST_CENTRES:
        return ()
    open_ones = set(open_centres(mol)) & set(centres)
    chosen: list[Configuration] = []
    seen: set[str] = set()
    for flipped in _subsets(centres):
        turned = Chem.Mol(mol)
        for index in flipped:
            turned.GetAtomWithIdx(index).InvertChirality()
        smiles = _smiles(turned)
        mirror = _smiles(_mirrored(turned))
        if {smiles, mirror} & seen:
            continue
        seen.add(smiles)
        chosen.append(
            Configuration(
                mol=turned,
                smiles=smiles,
                flipped=flipped,
                is_drawn=not flipped and not open_ones,
            )
        )
        if len(chosen) >= limit:
            break
    return tuple(chosen) if len(chosen) > 1 else ()


def _subsets(centres: Sequence[int]) -> Iterator[tuple[int, ...]]:
    for size in range(len(centres)):
        yield from combinations(centres, size)


def _mirrored(mol: Chem.Mol) -> Chem.Mol:
    copy = Chem.Mol(mol)
    for atom in copy.GetAtoms():
        atom.InvertChirality()
    return copy


def _smiles(mol: Chem.Mol) -> str:
    """Canonical, with the tags of stereocentres alone."""
    bare = Chem.Mol(mol)
    centres = {
        int(info.centeredOn)
        for info in Chem.FindPotentialStereo(Chem.Mol(mol))
        if info.type == Chem.StereoType.Atom_Tetrahedral
    }
    for atom in bare.GetAtoms():
        if atom.GetIdx() not in centres:
            atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
    # Relations between ring atoms are remembered and would be stale.
    Chem.AssignStereochemistry(bare, cleanIt=True, force=True)
    return str(Chem.MolToSmiles(Chem.MolFromSmiles(Chem.MolToSmiles(bare))))


def relation_name(mol: Chem.Mol, positions: FloatArray, first: int, second: int) -> str:
    """How two centres are related: "cis", "trans", "syn" or "anti"; "" if unclear.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        With hydrogens.
    positions : numpy.ndarray, shape (n_atoms, 3), Angstrom
        Any conformer.
    first, second : int
        Stereocentres in one ring, or bonded in a chain.

    Notes
    -----
    In a ring: the weightier groups outside it stand on the same side (cis) or
    not. In a chain: with the main chain in a zigzag, the groups off it (a
    hetero atom goes before carbon) stand on the same side (syn) or not.
    """
    ring = min(
        (r for r in mol.GetRingInfo().AtomRings() if first in r and second in r),
        key=len,
        default=None,
    )
    if ring is not None:
        sides = [_ring_side(mol, positions, ring, one) for one in (first, second)]
        if 0.0 in sides:
            return ""
        return "cis" if sides[0] * sides[1] > 0 else "trans"
    if mol.GetBondBetweenAtoms(first, second) is None:
        return ""
    return _chain_name(mol, positions, first, second)


def _ring_side(
    mol: Chem.Mol, positions: FloatArray, ring: Sequence[int], centre: int
) -> float:
    """Sign of the side on which the weightier group of a ring atom stands."""
    outside = _by_weight(mol, centre, without=set(ring))
    if not outside:
        return 0.0
    place = list(ring).index(centre)
    before = positions[ring[place - 1]] - positions[centre]
    after = positions[ring[(place + 1) % len(ring)]] - positions[centre]
    group = positions[outside[0]] - positions[centre]
    return float(np.sign(np.dot(np.cross(before, after), group)))


def _chain_name(mol: Chem.Mol, positions: FloatArray, first: int, second: int) -> str:
    groups, chain = [], []
    for centre, other in ((first, second), (second, first)):
        heavy = _by_weight(mol, centre, without={other})
        carbons = [k for k in heavy if mol.GetAtomWithIdx(k).GetAtomicNum() == 6]
        if len(heavy) != 2 or not carbons:
            return ""
        main = max(carbons, key=lambda k, c=centre: (_size_beyond(mol, c, k), -k))  # type: ignore[misc]  # default binds now
        chain.append(main)
        groups.append(next(k for k in heavy if k != main))
    angles = [
        float(dihedrals_deg(positions[None], (a, first, second, b))[0])
        for a, b in (groups, chain)
    ]
    turn = abs((angles[0] - angles[1] + 180.0) % 360.0 - 180.0)
    return "anti" if turn < 60.0 else "syn"


def _by_weight(mol: Chem.Mol, centre: int, *, without: set[int]) -> list[int]:
    """Heavy neighbours, hetero atoms first, then by the size of the branch."""
    heavy = [
        int(n.GetIdx())
        for n in mol.GetAtomWithIdx(centre).GetNeighbors()
        if n.GetAtomicNum() > 1 and n.GetIdx() not in without
    ]
    return sorted(
        heavy,
        key=lambda k: (
            -mol.GetAtomWithIdx(k).GetAtomicNum(),
            -_size_beyond(mol, centre, k),
            k,
        ),
    )


def _size_beyond(mol: Chem.Mol, centre: int, start: int) -> int:
    """Heavy atoms reached from ``start`` without passing ``centre``."""
    seen, waiting = {centre, start}, [start]
    while waiting:
        for neighbour in mol.GetAtomWithIdx(waiting.pop()).GetNeighbors():
            index = int(neighbour.GetIdx())
            if index not in seen and neighbour.GetAtomicNum() > 1:
                seen.add(index)
                waiting.append(index)
    return len(seen) - 1
