"""Assigned shifts as training labels: one row an atom class of one spectrum."""

from __future__ import annotations

import csv
import gzip
import os
import zlib
from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import numpy.typing as npt
from rdkit import Chem, rdBase

from spinledger.prediction.shifts_features import Surroundings, feature_matrix
from spinledger.prediction.shifts_spheres import sphere_codes
from spinledger.prediction.shifts_types import proton_class

SHARED = Path(
    os.environ.get("SPINLEDGER_SHARED", Path(__file__).resolve().parents[3] / "shared")
)
SOLVENTS = (
    *("CDCl3", "CD3OD", "DMSO-d6", "acetone-d6", "pyridine-d5", "D2O", "C6D6"),
    *("CD3CN", "THF-d8"),
)
_ALIASES = {"CHCl3": "CDCl3", "MeOH": "CD3OD", "MeOD": "CD3OD", "CCl4": "CDCl3"}


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Labels:
    """Labelled atoms; every array has one entry a label.

    Attributes
    ----------
    features : numpy.ndarray of float32, shape (n_rows, n_features)
    codes : numpy.ndarray of uint32, shape (n_rows, 6)
    row : numpy.ndarray of int
        Row of ``features`` and ``codes`` that a label uses.
    shifts_ppm, gaps_ppm : numpy.ndarray
        Mean of the values, and their difference.
    classes, groups : numpy.ndarray of str
        Proton class; scaffold (skeleton for acyclic ones).
    solvents : numpy.ndarray of int
        Index into SOLVENTS, -1 where unknown.
    smiles : numpy.ndarray of str
    atoms : numpy.ndarray of int
    """

    features: npt.NDArray[np.float32]
    codes: npt.NDArray[np.uint32]
    row: npt.NDArray[np.int64]
    shifts_ppm: npt.NDArray[np.float64]
    gaps_ppm: npt.NDArray[np.float64]
    classes: npt.NDArray[np.str_]
    groups: npt.NDArray[np.str_]
    solvents: npt.NDArray[np.int64]
    smiles: npt.NDArray[np.str_]
    atoms: npt.NDArray[np.int64]

    def folds(self, count: int) -> npt.NDArray[np.int64]:
        """Fold of every label; labels of one scaffold stay together."""
        return np.array(
            [zlib.crc32(group.encode()) % count for group in self.groups], np.int64
        )


def solvent_index(name: str) -> int:
    """Index of a solvent in SOLVENTS, -1 where it is not one of them."""
    known = _ALIASES.get(name, name)
    return SOLVENTS.index(known) if known in SOLVENTS else -1


def read_labels(path: Path | None = None) -> Labels:
    """Read the assigned shifts and compute the features of every labelled atom."""
    source = path or SHARED / "shifts" / "assigned_1h_shifts.csv.gz"
    by_smiles: dict[str, list[dict[str, str]]] = defaultdict(list)
    with gzip.open(source, "rt") as handle:
        for row in csv.DictReader(handle):
            by_smiles[row["smiles"]].append(row)
    features, codes, columns = [], [], defaultdict(list)
    n_rows = 0
    with rdBase.BlockLogs():
        for smiles, rows in by_smiles.items():
            mol = Chem.MolFromSmiles(smiles)
            if mol is None:
                continue
            ranks = list(
                Chem.CanonicalRankAtoms(mol, breakTies=False, includeChirality=False)
            )
            first: dict[int, int] = {}
            for row in rows:
                first.setdefault(ranks[int(row["atom"])], int(row["atom"]))
            atoms = list(first.values())
            features.append(feature_matrix(Surroundings(mol), atoms))
            codes.append(sphere_codes(mol)[atoms])
            place = {rank: n_rows + i for i, rank in enumerate(first)}
            n_rows += len(atoms)
            for label in _labels_of(mol, smiles, rows, ranks, first):
                for name, value in label.items():
                    columns[name].append(value)
                columns["row"].append(place[ranks[label["atoms"]]])
    arrays = {name: np.array(values) for name, values in columns.items()}
    return Labels(features=np.vstack(features), codes=np.vstack(codes), **arrays)


def _labels_of(
    mol: Chem.Mol,
    smiles: str,
    rows: list[dict[str, str]],
    ranks: list[int],
    first: dict[int, int],
) -> Iterator[dict[str, object]]:
    """One label for each symmetry class and spectrum."""
    skeleton = Chem.MolToSmiles(mol, isomericSmiles=False)
    together: dict[tuple[str, int], list[dict[str, str]]] = defaultdict(list)
    for row in rows:
        together[row["spectrum"], ranks[int(row["atom"])]].append(row)
    for (_, rank), found in together.items():
        values = [float(row["shift"]) for row in found]
        low = min(float(row["shift_min"]) for row in found)
        high = max(float(row["shift_max"]) for row in found)
        yield {
            "smiles": smiles,
            "atoms": first[rank],
            "classes": proton_class(mol.GetAtomWithIdx(first[rank])),
            "shifts_ppm": float(np.mean(values)),
            "gaps_ppm": high - low,
            "solvents": solvent_index(found[0]["solvent"]),
            "groups": found[0]["scaffold"] or skeleton,
        }
