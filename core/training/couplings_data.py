"""Published couplings read, mended and grouped for training; J in Hz.

The data carry assumed values and exchanged labels. What is dropped or mended
is said at each function.
"""

from __future__ import annotations

import csv
import gzip
import hashlib
from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import permutations
from pathlib import Path

import numpy as np
from rdkit import Chem
from rdkit.Chem import rdFingerprintGenerator
from rdkit.Chem.Scaffolds import MurckoScaffold
from rdkit.DataStructs import BulkTanimotoSimilarity
from rdkit.ML.Cluster import Butina

from spinledger.prediction.couplings.aromatic import ring_rule
from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.tables import rule
from spinledger.structure.conformers import Ensemble

#: Most protons of an aromatic system whose labels are permuted.
MOST_PERMUTED = 7
#: Gain in Hz that makes a relabelling believable.
RELABEL_GAIN_HZ = 4.0
FIVE_RING_GAIN_HZ = 1.5

_ACIDS = (
    "[CX3](=O)[OX2H1:1]",
    "[SX4](=O)(=O)[OX2H1:1]",
    "[PX4](=O)[OX2H1:1]",
)
_AMINE = (
    "[NX3;+0;!$(N-[#6]=[O,S,N]);!$(N-[#6]#N);!$(N-c);!$(N-[#6]=[#6]);"
    "!$(N-[!#6]);!$(N#*);!$(N=*):1]"
)
_AMIDINE = "[NX3;H2,H1][CX3](=[NX2;+0:1])[NX3]"


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """One published coupling.

    Attributes
    ----------
    entry, smiles : str
    protons : (int, int)
        Labels of the fit, no atom indices.
    heavy : (int, int)
        Heavy atoms of the SMILES that carry them.
    bonds : int
    j_hz : float, Hz
    """

    entry: str
    smiles: str
    protons: tuple[int, int]
    heavy: tuple[int, int]
    bonds: int
    j_hz: float

    @property
    def is_assumed(self) -> bool:
        """Whether the value is a round one, that is, put in and not fitted."""
        return abs(self.j_hz - round(self.j_hz, 1)) < 1e-9


def read_rows(path: Path) -> list[Row]:
    """All rows of the table of published couplings."""
    with gzip.open(path, "rt", encoding="utf-8", newline="") as stream:
        return [
            Row(
                entry=row["entry"],
                smiles=row["smiles"],
                protons=(int(row["h1"]), int(row["h2"])),
                heavy=(int(row["heavy1"]), int(row["heavy2"])),
                bonds=int(row["n_bonds"]),
                j_hz=float(row["J_hz"]),
            )
            for row in csv.DictReader(stream)
        ]


def read_shifts(path: Path) -> dict[tuple[str, int], float]:
    """Shift of every proton label of the same fits, ppm."""
    with gzip.open(path, "rt", encoding="utf-8", newline="") as stream:
        return {
            (row["entry"], int(row["h"])): float(row["shift"])
            for row in csv.DictReader(stream)
        }


def by_entry(rows: Iterable[Row]) -> dict[str, list[Row]]:
    """Rows of each entry."""
    found: dict[str, list[Row]] = defaultdict(list)
    for row in rows:
        found[row.entry].append(row)
    return found


def ionised(smiles: str) -> Chem.Mol:
    """The molecule as in water at pH 7; heavy atoms keep their order.

    Carboxylic, sulfonic and phosphoric acids lose their proton; aliphatic
    amines, amidines and guanidines take one up.
    """
    mol = Chem.RWMol(Chem.MolFromSmiles(smiles))
    for pattern in _ACIDS:
        for index in _marked_atoms(mol, pattern):
            atom = mol.GetAtomWithIdx(index)
            atom.SetFormalCharge(-1)
            atom.SetNumExplicitHs(0)
            atom.SetNoImplicit(True)
    for pattern in (_AMINE, _AMIDINE):
        for index in _marked_atoms(mol, pattern):
            _protonate(mol.GetAtomWithIdx(index))
    Chem.SanitizeMol(mol)
    return mol.GetMol()


def _marked_atoms(mol: Chem.Mol, pattern: str) -> list[int]:
    query = Chem.MolFromSmarts(pattern)
    marked = next(a.GetIdx() for a in query.GetAtoms() if a.GetAtomMapNum() == 1)
    return sorted({match[marked] for match in mol.GetSubstructMatches(query)})


def _protonate(atom: Chem.Atom) -> None:
    if atom.GetIsAromatic() or atom.GetFormalCharge():
        return
    hydrogens = atom.GetTotalNumHs()
    atom.SetFormalCharge(1)
    atom.SetNumExplicitHs(hydrogens + 1)
    atom.SetNoImplicit(True)


def skeleton(smiles: str) -> str:
    """Canonical SMILES without stereo and charge: one compound, one text."""
    mol = Chem.MolFromSmiles(smiles)
    Chem.RemoveStereochemistry(mol)
    return str(Chem.MolToSmiles(mol))


def scaffold_groups(smiles: Sequence[str]) -> list[str]:
    """Group of each structure that must not be split between folds.

    Murcko scaffold of cyclic compounds; clusters of alike acyclic ones
    (Butina, Morgan radius 2, distance 0.55).
    """
    skeletons = {text: skeleton(text) for text in set(smiles)}
    groups: dict[str, str] = {}
    acyclic = []
    for text in sorted(set(skeletons.values())):
        scaffold = MurckoScaffold.MurckoScaffoldSmilesFromSmiles(text)
        if scaffold:
            groups[text] = scaffold
        else:
            acyclic.append(text)
    for number, members in enumerate(_clusters(acyclic)):
        groups.update({acyclic[i]: f"acyclic {number}" for i in members})
    return [groups[skeletons[text]] for text in smiles]


def _clusters(smiles: Sequence[str]) -> Iterable[tuple[int, ...]]:
    generator = rdFingerprintGenerator.GetMorganGenerator(radius=2)
    prints = [generator.GetFingerprint(Chem.MolFromSmiles(text)) for text in smiles]
    distances: list[float] = []
    for index in range(1, len(prints)):
        alike = BulkTanimotoSimilarity(prints[index], prints[:index])
        distances.extend(1 - value for value in alike)
    return Butina.ClusterData(distances, len(prints), 0.55, isDistData=True)


def relabelled_aromatic(rows: Sequence[Row], mol: Chem.Mol) -> list[Row]:
    """Aromatic rows of one entry with exchanged proton labels put right.

    Every permutation of up to seven labels is tried against couplings
    expected from topology; one that gains more than 4 Hz is taken.
    """
    carriers = {}
    for row in rows:
        carriers.update(zip(row.protons, row.heavy, strict=True))
    labels = sorted(carriers)
    if len(labels) > MOST_PERMUTED:
        return list(rows)
    published = {row.protons: row.j_hz for row in rows}
    expected = {
        (a, b): _expected_hz(mol, a, b)
        for a in carriers.values()
        for b in carriers.values()
    }

    def misfit_hz(order: Sequence[int]) -> float:
        place = dict(zip(labels, (carriers[label] for label in order), strict=True))
        return sum(
            min(abs(_published(published, a, b) - expected[place[a], place[b]]), 8.0)
            for i, a in enumerate(labels)
            for b in labels[:i]
            if place[a] != place[b]
        )

    best = min(permutations(labels), key=misfit_hz)
    if misfit_hz(labels) - misfit_hz(best) <= RELABEL_GAIN_HZ:
        return list(rows)
    place = dict(zip(labels, (carriers[label] for label in best), strict=True))
    return [_moved(row, place) for row in rows]


def relabelled_five_rings(rows: Sequence[Row], frame: Frame) -> list[Row]:
    """Five-ring rows of one entry with exchanged proton labels put right.

    Furans, thiophenes and pyrroles tell their positions by couplings 1.5 Hz
    and more apart; labels that gain more than 1.5 Hz against the literature
    values by exchanging are exchanged.
    """
    mended = list(rows)
    for ring in frame.rings:
        if len(ring) != 5 or sum(frame.element(i) != 6 for i in ring) != 1:
            continue
        mine = [
            index
            for index, row in enumerate(rows)
            if set(row.heavy) <= set(ring) and row.heavy[0] != row.heavy[1]
        ]
        carriers: dict[int, int] = {}
        for index in mine:
            carriers.update(zip(rows[index].protons, rows[index].heavy, strict=True))
        place = _five_ring_places([rows[i] for i in mine], carriers, ring, frame)
        for index in mine:
            mended[index] = _moved(rows[index], place)
    return mended


def _five_ring_places(
    rows: Sequence[Row],
    carriers: dict[int, int],
    ring: tuple[int, ...],
    frame: Frame,
) -> dict[int, int]:
    labels = sorted(carriers)
    if len(labels) < 3:
        return carriers

    def misfit_hz(order: Sequence[int]) -> float:
        place = dict(zip(labels, (carriers[label] for label in order), strict=True))
        total = 0.0
        for row in rows:
            pair = (place[row.protons[0]], place[row.protons[1]])
            chosen = ring_rule(frame, ring, pair)
            if chosen is not None:
                total += abs(row.j_hz - rule(chosen.key).j_hz)
        return total

    best = min(permutations(labels), key=misfit_hz)
    if misfit_hz(labels) - misfit_hz(best) <= FIVE_RING_GAIN_HZ:
        return carriers
    return dict(zip(labels, (carriers[label] for label in best), strict=True))


def _moved(row: Row, place: dict[int, int]) -> Row:
    first, second = row.protons
    return Row(
        entry=row.entry,
        smiles=row.smiles,
        protons=row.protons,
        heavy=(place[first], place[second]),
        bonds=row.bonds,
        j_hz=row.j_hz,
    )


def _published(values: dict[tuple[int, int], float], a: int, b: int) -> float:
    return values.get((a, b), values.get((b, a), 0.3))


def _expected_hz(mol: Chem.Mol, a: int, b: int) -> float:
    """Rough value by topology, only good enough to see exchanged labels."""
    if a == b:
        return 0.0
    for ring in mol.GetRingInfo().AtomRings():
        if a in ring and b in ring and _is_aromatic_ring(mol, ring):
            gap = abs(ring.index(a) - ring.index(b))
            return _expected_in_ring_hz(mol, ring, (a, b), min(gap, len(ring) - gap))
    return 0.2 if len(Chem.GetShortestPath(mol, a, b)) > 2 else 8.0


def _expected_in_ring_hz(
    mol: Chem.Mol, ring: Sequence[int], pair: tuple[int, int], steps: int
) -> float:
    symbols = {mol.GetAtomWithIdx(i).GetSymbol() for i in ring}
    if len(ring) == 5:
        ortho = 2.3 if "O" in symbols else 4.9 if "S" in symbols else 2.9
        return ortho if steps == 1 else 1.2
    beside = any(
        n.GetSymbol() == "N" and n.GetIdx() in ring
        for i in pair
        for n in mol.GetAtomWithIdx(i).GetNeighbors()
    )
    return {1: 5.5 if beside else 8.0, 2: 1.7, 3: 0.6}.get(steps, 0.5)


def _is_aromatic_ring(mol: Chem.Mol, ring: Sequence[int]) -> bool:
    return all(mol.GetAtomWithIdx(i).GetIsAromatic() for i in ring)


class Frames:
    """Molecules in water with conformers, each made once and kept on disk if asked."""

    def __init__(self, cache: Path | None) -> None:
        self._cache = cache
        self._frames: dict[str, Frame] = {}

    def of(self, smiles: str) -> Frame:
        """Frame of a structure as it is at pH 7."""
        if smiles not in self._frames:
            mol = Chem.AddHs(ionised(smiles))
            self._frames[smiles] = Frame(
                mol, is_aqueous=True, conformers=self._kept(smiles)
            )
        return self._frames[smiles]

    def with_conformers(self, smiles: str) -> Frame:
        """The same, conformers made and written to the cache."""
        frame = self.of(smiles)
        path = self._path(smiles)
        if path is not None and not path.exists():
            found = frame.conformers
            np.savez(path, positions=found.positions, weights=found.weights)
        return frame

    def _path(self, smiles: str) -> Path | None:
        if self._cache is None:
            return None
        name = hashlib.sha256(smiles.encode()).hexdigest()
        return self._cache / f"{name}.npz"

    def _kept(self, smiles: str) -> Ensemble | None:
        path = self._path(smiles)
        if path is None or not path.exists():
            return None
        with np.load(path) as stored:
            return Ensemble(positions=stored["positions"], weights=stored["weights"])
