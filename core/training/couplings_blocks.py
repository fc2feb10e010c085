"""Blocks of vicinal couplings over one bond between saturated carbons; J in Hz."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import permutations

import numpy as np
import numpy.typing as npt
from couplings_data import Row
from rdkit import Chem

Floats = npt.NDArray[np.float64]

LOWEST_HZ, HIGHEST_HZ = 0.3, 14.6
METHYL_LIMITS_HZ = (5.0, 9.0)
ROW_SUM_LIMITS_HZ = (6.0, 18.5)
CONSISTENT_HZ = 0.5


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Block:
    """Published couplings between the protons of two neighbouring carbons.

    Attributes
    ----------
    entry, smiles : str
    carbons : (int, int)
        Heavy atoms, the one with fewer hydrogens first.
    n_hydrogens : (int, int)
    couplings_hz : numpy.ndarray, shape (n_first, n_second), Hz
        One value, the mean, next to a methyl group.
    has_split : bool
        Whether the single values are believed, not just their mean.
    """

    entry: str
    smiles: str
    carbons: tuple[int, int]
    n_hydrogens: tuple[int, int]
    couplings_hz: Floats
    has_split: bool

    @property
    def mean_hz(self) -> float:
        """Mean of the block."""
        return float(self.couplings_hz.mean())

    @property
    def kind(self) -> str:
        """Numbers of hydrogens, as in 'CH-CH2'."""
        names = {1: "CH", 2: "CH2", 3: "CH3"}
        first, second = self.n_hydrogens
        return f"{names[first]}-{names[second]}"


def saturated_blocks(rows: Sequence[Row], mol: Chem.Mol) -> list[Block]:
    """Blocks of one entry that survive the cleaning.

    Parameters
    ----------
    rows : sequence of Row
        Of one entry.
    mol : rdkit.Chem.Mol
        Its structure, heavy atoms in the order of the rows.
    """
    found: dict[tuple[int, int], list[Row]] = defaultdict(list)
    for row in rows:
        if row.bonds == 3 and all(_is_saturated(mol, i) for i in row.heavy):
            first, second = sorted(row.heavy, key=lambda i: (_hydrogens(mol, i), i))
            found[first, second].append(row)
    blocks = (_block(items, carbons, mol) for carbons, items in found.items())
    return [block for block in blocks if block is not None]


def _is_saturated(mol: Chem.Mol, index: int) -> bool:
    atom = mol.GetAtomWithIdx(index)
    return atom.GetAtomicNum() == 6 and atom.GetTotalDegree() == 4


def _hydrogens(mol: Chem.Mol, index: int) -> int:
    return int(mol.GetAtomWithIdx(index).GetTotalNumHs(includeNeighbors=True))


def _block(
    rows: Sequence[Row], carbons: tuple[int, int], mol: Chem.Mol
) -> Block | None:
    counts = _hydrogens(mol, carbons[0]), _hydrogens(mol, carbons[1])
    matrix = _matrix(rows, carbons, counts)
    if matrix is None or any(row.is_assumed for row in rows):
        return None
    if not _is_believable(matrix, has_methyl=3 in counts):
        return None
    if 3 in counts:
        matrix = np.array([[matrix.mean()]])
    return Block(
        entry=rows[0].entry,
        smiles=rows[0].smiles,
        carbons=carbons,
        n_hydrogens=counts,
        couplings_hz=matrix,
        has_split=matrix.size > 1 and _has_split(matrix),
    )


def _matrix(
    rows: Sequence[Row], carbons: tuple[int, int], counts: tuple[int, int]
) -> Floats | None:
    """Couplings by proton label; None if a pair is missing."""
    values: dict[tuple[int, int], float] = {}
    for row in rows:
        pair = row.protons if row.heavy[0] == carbons[0] else row.protons[::-1]
        values[pair] = row.j_hz
    firsts = sorted({first for first, _ in values})
    seconds = sorted({second for _, second in values})
    if (len(firsts), len(seconds)) != counts or len(values) != counts[0] * counts[1]:
        return None
    return np.array([[values[i, j] for j in seconds] for i in firsts])


def _is_believable(matrix: Floats, *, has_methyl: bool) -> bool:
    low, high = METHYL_LIMITS_HZ if has_methyl else (LOWEST_HZ, HIGHEST_HZ)
    return bool(np.all((matrix >= low) & (matrix <= high)))


def _has_split(matrix: Floats) -> bool:
    """Sums over one proton's partners lie where three rotamers can put them."""
    if np.ptp(matrix) < 1e-3:
        return False
    if matrix.shape != (2, 2):
        return True
    low, high = ROW_SUM_LIMITS_HZ
    sums = np.concatenate([matrix.sum(axis=0), matrix.sum(axis=1)])
    return bool(np.all((sums >= low) & (sums <= high)))


def orders(matrix: Floats) -> list[Floats]:
    """The block with the labels on each carbon in every order."""
    n_first, n_second = matrix.shape
    return [
        matrix[np.ix_(first, second)]
        for first in permutations(range(n_first))
        for second in permutations(range(n_second))
    ]


def best_order(matrix: Floats, predicted: Floats) -> Floats:
    """Order of labels that agrees best with a prediction.

    The labels of the two protons of a CH2 in the data carry no stereo
    information.
    """
    return min(orders(matrix), key=lambda m: float(np.abs(m - predicted).sum()))


def symmetrised(matrix: Floats) -> Floats | None:
    """Block of two enantiotopic CH2 with J11 = J22 and J12 = J21; None if it is not so."""
    best = min(orders(matrix), key=_asymmetry_hz)
    if _asymmetry_hz(best) >= CONSISTENT_HZ:
        return None
    return (best + best[::-1, ::-1]) / 2


def _asymmetry_hz(matrix: Floats) -> float:
    return float(
        max(abs(matrix[0, 0] - matrix[1, 1]), abs(matrix[0, 1] - matrix[1, 0]))
    )
