"""Assigned shifts as training labels: one row an atom class of one spectrum."""

from __future__ import annotations

import csv
import gzip
import os
import zlib
from collections import defaultdict
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import numpy.typing as npt
from rdkit import Chem, rdBase
from rdkit.Chem.Scaffolds import MurckoScaffold

from spinledger.prediction.shifts_features import Surroundings, feature_matrix
from spinledger.prediction.shifts_increments import FragmentCounts, fragment_counts
from spinledger.prediction.shifts_spheres import coarse_codes, fine_codes
from spinledger.prediction.shifts_types import proton_class
from spinledger.structure.acidity import at_ph

SHARED = Path(
    os.environ.get("SPINLEDGER_SHARED", Path(__file__).resolve().parents[3] / "shared")
)
SOLVENTS = (
    *("CDCl3", "CD3OD", "DMSO-d6", "acetone-d6", "pyridine-d5", "D2O", "C6D6"),
    *("CD3CN", "THF-d8"),
)
_ALIASES = {"CHCl3": "CDCl3", "MeOH": "CD3OD", "MeOD": "CD3OD", "CCl4": "CDCl3"}
FITTED = "fitted"


@dataclass(frozen=True, slots=True, kw_only=True)
class Label:
    """One shift of one symmetry class of atoms in one spectrum."""

    smiles: str
    atom: int
    shift_ppm: float
    gap_ppm: float
    solvent: int
    group: str
    source: str


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Labels:
    """Labelled atoms; the arrays from ``row`` on have one entry a label.

    Attributes
    ----------
    features : numpy.ndarray of float32, shape (n_rows, n_features)
    fine, coarse : numpy.ndarray of uint32, shape (n_rows, 6)
    fragments : FragmentCounts
        One run a row.
    row : numpy.ndarray of int
        Row that a label uses.
    shifts_ppm, gaps_ppm : numpy.ndarray
        Mean of the values, and their difference.
    classes, groups, smiles, sources : numpy.ndarray of str
        Proton class; scaffold (skeleton for acyclic ones); ``sources`` is
        "assigned" or "fitted".
    solvents : numpy.ndarray of int
        Index into SOLVENTS, -1 where unknown.
    atoms : numpy.ndarray of int
    """

    features: npt.NDArray[np.float32]
    fine: npt.NDArray[np.uint32]
    coarse: npt.NDArray[np.uint32]
    fragments: FragmentCounts
    row: npt.NDArray[np.int64]
    shifts_ppm: npt.NDArray[np.float64]
    gaps_ppm: npt.NDArray[np.float64]
    classes: npt.NDArray[np.str_]
    groups: npt.NDArray[np.str_]
    solvents: npt.NDArray[np.int64]
    smiles: npt.NDArray[np.str_]
    sources: npt.NDArray[np.str_]
    atoms: npt.NDArray[np.int64]

    def folds(self, count: int, salt: str = "") -> npt.NDArray[np.int64]:
        """Fold of every label; labels of one scaffold stay together."""
        return np.array(
            [zlib.crc32((salt + group).encode()) % count for group in self.groups],
            np.int64,
        )


def solvent_index(name: str) -> int:
    """Index of a solvent in SOLVENTS, -1 where it is not one of them."""
    known = _ALIASES.get(name, name)
    return SOLVENTS.index(known) if known in SOLVENTS else -1


def read_labels() -> Labels:
    """Read both tables and compute what the models see of every labelled atom."""
    with rdBase.BlockLogs():
        found = [
            *assigned_labels(SHARED / "shifts" / "assigned_1h_shifts.csv.gz"),
            *fitted_labels(SHARED / "shifts" / "published_spin_fit_shifts.csv.gz"),
        ]
        return _with_features(found)


def assigned_labels(path: Path) -> Iterator[Label]:
    """Labels of the assigned spectra."""
    for smiles, rows in _rows_by_smiles(path).items():
        mol = Chem.MolFromSmiles(smiles)
        if mol is None:
            continue
        skeleton = Chem.MolToSmiles(mol, isomericSmiles=False)
        ranks = _ranks(mol)
        first = _first_atoms(ranks, (int(row["atom"]) for row in rows))
        together: dict[tuple[str, int], list[dict[str, str]]] = defaultdict(list)
        for row in rows:
            together[row["spectrum"], ranks[int(row["atom"])]].append(row)
        for (_, rank), same in together.items():
            low = min(float(row["shift_min"]) for row in same)
            high = max(float(row["shift_max"]) for row in same)
            yield Label(
                smiles=smiles,
                atom=first[rank],
                shift_ppm=float(np.mean([float(row["shift"]) for row in same])),
                gap_ppm=high - low,
                solvent=solvent_index(same[0]["solvent"]),
                group=same[0]["scaffold"] or skeleton,
                source="assigned",
            )


def fitted_labels(path: Path) -> Iterator[Label]:
    """Labels of published total-lineshape fits, as ions in D2O at pH 7.4."""
    for smiles, rows in _rows_by_smiles(path).items():
        drawn = Chem.MolFromSmiles(smiles)
        if drawn is None or not _is_exact(drawn, rows):
            continue
        mol = at_ph(drawn).mol
        group = MurckoScaffold.MurckoScaffoldSmiles(  # type: ignore[no-untyped-call]
            mol=_without_stereo(drawn)
        )
        ranks = _ranks(mol)
        first = _first_atoms(ranks, (int(row["heavy_atom"]) for row in rows))
        together: dict[tuple[str, int], list[float]] = defaultdict(list)
        for row in rows:
            key = (row["entry"], ranks[int(row["heavy_atom"])])
            together[key].append(float(row["shift"]))
        for (_, rank), values in together.items():
            yield Label(
                smiles=Chem.MolToSmiles(mol, canonical=False),
                atom=_place(mol, first[rank]),
                shift_ppm=float(np.mean(values)),
                gap_ppm=max(values) - min(values),
                solvent=SOLVENTS.index("D2O"),
                group=group or Chem.MolToSmiles(drawn, isomericSmiles=False),
                source=FITTED,
            )


def _place(mol: Chem.Mol, atom: int) -> int:
    """Index that an atom has after the molecule was written and read again."""
    Chem.MolToSmiles(mol, canonical=False)
    order = list(mol.GetPropsAsDict(True, True)["_smilesAtomOutputOrder"])
    return order.index(atom)


def _is_exact(mol: Chem.Mol, rows: list[dict[str, str]]) -> bool:
    """Whether every row names a carbon with as many protons as it says."""
    return all(
        int(row["heavy_atom"]) < mol.GetNumAtoms()
        and mol.GetAtomWithIdx(int(row["heavy_atom"])).GetTotalNumHs() == int(row["nH"])
        for row in rows
    )


def _without_stereo(mol: Chem.Mol) -> Chem.Mol:
    copy = Chem.Mol(mol)
    Chem.RemoveStereochemistry(copy)
    return copy


def _rows_by_smiles(path: Path) -> dict[str, list[dict[str, str]]]:
    found: dict[str, list[dict[str, str]]] = defaultdict(list)
    with gzip.open(path, "rt") as handle:
        for row in csv.DictReader(handle):
            found[row["smiles"]].append(row)
    return found


def _ranks(mol: Chem.Mol) -> list[int]:
    return list(Chem.CanonicalRankAtoms(mol, breakTies=False, includeChirality=False))


def _first_atoms(ranks: list[int], atoms: Iterable[int]) -> dict[int, int]:
    first: dict[int, int] = {}
    for atom in atoms:
        first.setdefault(ranks[atom], atom)
    return first


def _with_features(labels: list[Label]) -> Labels:
    """Compute features once for each molecule and labelled atom."""
    by_smiles: dict[str, list[Label]] = defaultdict(list)
    for label in labels:
        by_smiles[label.smiles].append(label)
    features, fine, coarse, counted = [], [], [], []
    ordered, rows, classes = [], [], []
    n_rows = 0
    for smiles, members in by_smiles.items():
        mol = Chem.MolFromSmiles(smiles)
        atoms = sorted({label.atom for label in members})
        around = Surroundings(mol)
        features.append(feature_matrix(around, atoms))
        fine.append(fine_codes(mol)[atoms])
        coarse.append(coarse_codes(mol)[atoms])
        counted.append(fragment_counts(mol, atoms, around.distances))
        for label in members:
            ordered.append(label)
            rows.append(n_rows + atoms.index(label.atom))
            classes.append(proton_class(mol.GetAtomWithIdx(label.atom)))
        n_rows += len(atoms)
    return Labels(
        features=np.vstack(features),
        fine=np.vstack(fine),
        coarse=np.vstack(coarse),
        fragments=_joined(counted),
        row=np.array(rows),
        shifts_ppm=np.array([label.shift_ppm for label in ordered]),
        gaps_ppm=np.array([label.gap_ppm for label in ordered]),
        classes=np.array(classes),
        groups=np.array([label.group for label in ordered]),
        solvents=np.array([label.solvent for label in ordered]),
        smiles=np.array([label.smiles for label in ordered]),
        sources=np.array([label.source for label in ordered]),
        atoms=np.array([label.atom for label in ordered]),
    )


def _joined(parts: list[FragmentCounts]) -> FragmentCounts:
    lengths = np.concatenate([np.diff(part.starts) for part in parts])
    return FragmentCounts(
        keys=np.concatenate([part.keys for part in parts]),
        weights=np.concatenate([part.weights for part in parts]),
        starts=np.concatenate([[0], np.cumsum(lengths)]).astype(np.int64),
    )
