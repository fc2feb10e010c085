"""Sphere codes: a table of shifts by neighbourhood, from coarse to fine; ppm.

A code names everything within so many bonds of an atom. The table gives for
each code the median shift, the mean deviation and the number of examples.
"""

from __future__ import annotations

import hashlib
import struct
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt
from rdkit import Chem

from spinledger.prediction.shifts_types import PROTON_CLASSES, proton_count

N_SPHERES: Final = 6  # radius 0 to 5
_SHRINK_EXAMPLES: Final = 1.0


def sphere_codes(mol: Chem.Mol) -> npt.NDArray[np.uint32]:
    """Canonical code of every atom's neighbourhood at radius 0 to 5.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.

    Returns
    -------
    numpy.ndarray of uint32, shape (n_atoms, 6)
        32 bits: of 200 000 known codes one in 20 000 foreign ones is
        mistaken for a known one.
    """
    current = [_hash(repr(_invariant(mol, atom)).encode()) for atom in mol.GetAtoms()]
    neighbours = [
        [
            (int(bond.GetBondTypeAsDouble() * 2), bond.GetOtherAtomIdx(atom.GetIdx()))
            for bond in atom.GetBonds()
        ]
        for atom in mol.GetAtoms()
    ]
    spheres = [current]
    for _ in range(1, N_SPHERES):
        current = [
            _hash(
                struct.pack("<Q", current[index])
                + b"".join(
                    struct.pack("<BQ", order, code)
                    for order, code in sorted((o, current[j]) for o, j in around)
                )
            )
            for index, around in enumerate(neighbours)
        ]
        spheres.append(current)
    wide = np.array(spheres, dtype=np.uint64).T
    return (wide & np.uint64(0xFFFFFFFF)).astype(np.uint32)


def _invariant(mol: Chem.Mol, atom: Chem.Atom) -> tuple[int | bool, ...]:
    return (
        atom.GetAtomicNum(),
        atom.GetIsAromatic(),
        proton_count(atom),
        atom.GetDegree(),
        atom.GetFormalCharge(),
        min(mol.GetRingInfo().MinAtomRingSize(atom.GetIdx()), 8),
    )


def _hash(content: bytes) -> int:
    digest = hashlib.blake2b(content, digest_size=8).digest()
    return int(struct.unpack("<Q", digest)[0])


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Sphere:
    """What is known about the codes of one radius, sorted by code."""

    codes: npt.NDArray[np.uint32]
    medians_ppm: npt.NDArray[np.float32]
    deviations_ppm: npt.NDArray[np.float32]
    counts: npt.NDArray[np.float32]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Lookup:
    """Answer of the table for some atoms.

    Attributes
    ----------
    features : numpy.ndarray, shape (n_atoms, 18)
        Running estimate, log count and deviation for radius 1 to 5, then the
        deepest known radius, the final estimate and its deviation.
    estimates_ppm, deviations_ppm : numpy.ndarray, shape (n_atoms,)
    depths, examples : numpy.ndarray of int, shape (n_atoms,)
        Deepest radius at which the neighbourhood is known, and how many
        examples stand behind it.
    """

    features: npt.NDArray[np.float64]
    estimates_ppm: npt.NDArray[np.float64]
    deviations_ppm: npt.NDArray[np.float64]
    depths: npt.NDArray[np.int64]
    examples: npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class SphereTable:
    """Shifts by neighbourhood.

    Attributes
    ----------
    class_medians_ppm, class_sds_ppm : numpy.ndarray, shape (n_classes,)
        In the order of PROTON_CLASSES: where an estimate starts from.
    spheres : tuple of Sphere
        Radius 0 first.
    """

    class_medians_ppm: npt.NDArray[np.float64]
    class_sds_ppm: npt.NDArray[np.float64]
    spheres: tuple[Sphere, ...]

    def look_up(self, codes: npt.NDArray[np.uint32], classes: Sequence[str]) -> Lookup:
        """Estimate shifts from coarse to fine.

        Parameters
        ----------
        codes : numpy.ndarray of uint32, shape (n_atoms, 6)
        classes : sequence of str, length n_atoms

        Notes
        -----
        Each finer radius with n examples moves the running estimate to
        (n median + estimate) / (n + 1).
        """
        index = [PROTON_CLASSES.index(name) for name in classes]
        estimate = self.class_medians_ppm[index].astype(np.float64)
        deviation = self.class_sds_ppm[index].astype(np.float64)
        depth = np.zeros(len(index), dtype=np.int64)
        examples = np.zeros(len(index), dtype=np.int64)
        columns = []
        for radius, sphere in enumerate(self.spheres):
            place = np.searchsorted(sphere.codes, codes[:, radius])
            place = np.minimum(place, sphere.codes.size - 1)
            known = sphere.codes[place] == codes[:, radius]
            count = np.where(known, sphere.counts[place], 0.0)
            weight = count / (count + _SHRINK_EXAMPLES)
            spread = np.where(known, sphere.deviations_ppm[place], np.nan)
            estimate = estimate + weight * (sphere.medians_ppm[place] - estimate)
            deviation = deviation + weight * (np.nan_to_num(spread) - deviation)
            depth = np.where(known, radius, depth)
            examples = np.where(known, count.astype(np.int64), examples)
            if radius >= 1:
                columns += [estimate.copy(), np.log1p(count), spread]
        columns += [depth.astype(np.float64), estimate, deviation]
        return Lookup(
            features=np.column_stack(columns) if columns else np.zeros((0, 18)),
            estimates_ppm=estimate,
            deviations_ppm=deviation,
            depths=depth,
            examples=examples,
        )


def fit_table(
    codes: npt.NDArray[np.uint32],
    shifts_ppm: npt.NDArray[np.float64],
    classes: npt.NDArray[np.str_],
) -> SphereTable:
    """Build the table from labelled atoms (used in training).

    Parameters
    ----------
    codes : numpy.ndarray of uint32, shape (n_labels, 6)
    shifts_ppm, classes : numpy.ndarray, shape (n_labels,)
    """
    medians, sds = [], []
    for name in PROTON_CLASSES:
        of_class = shifts_ppm[classes == name]
        medians.append(np.median(of_class) if of_class.size else 4.0)
        sds.append(np.std(of_class) if of_class.size > 1 else 2.0)
    return SphereTable(
        class_medians_ppm=np.array(medians),
        class_sds_ppm=np.array(sds),
        spheres=tuple(_fit_sphere(column, shifts_ppm) for column in codes.T),
    )


def _fit_sphere(
    codes: npt.NDArray[np.uint32], shifts_ppm: npt.NDArray[np.float64]
) -> Sphere:
    order = np.lexsort((shifts_ppm, codes))
    sorted_shifts = shifts_ppm[order]
    known, starts, counts = np.unique(
        codes[order], return_index=True, return_counts=True
    )
    low = sorted_shifts[starts + (counts - 1) // 2]
    high = sorted_shifts[starts + counts // 2]
    medians = (low + high) / 2
    away = np.abs(sorted_shifts - np.repeat(medians, counts))
    deviations = np.add.reduceat(away, starts) / counts
    return Sphere(
        codes=known,
        medians_ppm=medians.astype(np.float32),
        deviations_ppm=deviations.astype(np.float32),
        counts=counts.astype(np.float32),
    )
