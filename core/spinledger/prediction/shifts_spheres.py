"""Sphere codes: a table of shifts by neighbourhood, from coarse to fine; ppm.

A code names everything within so many bonds of an atom. The table gives for
each code the median shift, the mean deviation and the number of examples.
"""

from __future__ import annotations

import hashlib
import struct
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt
from rdkit import Chem

from spinledger.prediction.shifts_types import (
    PROTON_CLASSES,
    proton_class,
    proton_count,
)

N_SPHERES: Final = 6  # radius 0 to 5
_SHRINK_EXAMPLES: Final = 1.0
_MASK_32_BITS: Final = np.uint64(0xFFFFFFFF)


def fine_codes(mol: Chem.Mol) -> npt.NDArray[np.uint32]:
    """Code of every atom's neighbourhood with ring sizes and hydrogens.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.

    Returns
    -------
    numpy.ndarray of uint32, shape (n_atoms, 6)
        Radius 0 to 5. 32 bits: of 200 000 known codes one in 20 000 foreign
        ones is mistaken for a known one.
    """
    return _truncated(neighbourhoods(mol, _fine_invariant, N_SPHERES))


def coarse_neighbourhoods(mol: Chem.Mol) -> npt.NDArray[np.uint64]:
    """Hashes by element and hybridisation only, shape (n_atoms, 6)."""
    return neighbourhoods(mol, coarse_invariant, N_SPHERES)


def coarse_codes(
    mol: Chem.Mol, wide: npt.NDArray[np.uint64] | None = None
) -> npt.NDArray[np.uint32]:
    """Code of every atom's neighbourhood by element and hybridisation only.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit.
    wide : numpy.ndarray, optional
        From :func:`coarse_neighbourhoods`, where it is known already.

    Returns
    -------
    numpy.ndarray of uint32, shape (n_atoms, 6)
        The class of the atom's own protons is mixed in.
    """
    classes = [PROTON_CLASSES.index(proton_class(atom)) for atom in mol.GetAtoms()]
    known = coarse_neighbourhoods(mol) if wide is None else wide
    return _truncated(
        known * np.uint64(1000003) + np.array(classes, np.uint64)[:, None]
    )


Invariant = Callable[[Chem.Mol, Chem.Atom], tuple[object, ...]]


def neighbourhoods(
    mol: Chem.Mol, invariant: Invariant, n_radii: int
) -> npt.NDArray[np.uint64]:
    """Hash of everything within 0, 1, ... bonds of every atom.

    Returns
    -------
    numpy.ndarray of uint64, shape (n_atoms, n_radii)
    """
    current = [hashed(repr(invariant(mol, atom)).encode()) for atom in mol.GetAtoms()]
    neighbours = [
        [
            (int(bond.GetBondTypeAsDouble() * 2), bond.GetOtherAtomIdx(atom.GetIdx()))
            for bond in atom.GetBonds()
        ]
        for atom in mol.GetAtoms()
    ]
    spheres = [current]
    for _ in range(1, n_radii):
        current = [
            hashed(
                struct.pack("<Q", current[index])
                + b"".join(
                    struct.pack("<BQ", order, code)
                    for order, code in sorted((o, current[j]) for o, j in around)
                )
            )
            for index, around in enumerate(neighbours)
        ]
        spheres.append(current)
    return np.array(spheres, dtype=np.uint64).T


def hashed(content: bytes) -> int:
    """64-bit hash, the same on every machine."""
    digest = hashlib.blake2b(content, digest_size=8).digest()
    return int(struct.unpack("<Q", digest)[0])


def _truncated(wide: npt.NDArray[np.uint64]) -> npt.NDArray[np.uint32]:
    return np.asarray(wide & _MASK_32_BITS, dtype=np.uint32)


def _fine_invariant(mol: Chem.Mol, atom: Chem.Atom) -> tuple[object, ...]:
    return (
        atom.GetAtomicNum(),
        atom.GetIsAromatic(),
        proton_count(atom),
        atom.GetDegree(),
        atom.GetFormalCharge(),
        min(mol.GetRingInfo().MinAtomRingSize(atom.GetIdx()), 8),
    )


def coarse_invariant(_mol: Chem.Mol, atom: Chem.Atom) -> tuple[object, ...]:
    """Element and hybridisation of an atom, halogens and chalcogens pooled in part."""
    number = atom.GetAtomicNum()
    hybrid = str(atom.GetHybridization())
    if number == 6:
        return ("C", hybrid, atom.GetIsAromatic())
    if number == 7:
        return ("N", hybrid, atom.GetFormalCharge(), atom.GetIsAromatic())
    if number == 8:
        return (
            "O",
            atom.GetTotalDegree(),
            atom.GetFormalCharge(),
            atom.GetIsAromatic(),
        )
    if number in (16, 34, 52):
        return ("S", number, atom.GetTotalDegree(), atom.GetIsAromatic())
    return (number,)


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
    features : numpy.ndarray, shape (n_atoms, 37)
        For the fine, then the coarse codes: running estimate, log count and
        deviation for radius 1 to 5, deepest known radius, final estimate and
        deviation; last the estimate of both together.
    estimates_ppm : numpy.ndarray, shape (n_atoms,)
        From coarse and fine codes in turn.
    spreads_ppm : numpy.ndarray, shape (n_atoms,)
        Mean deviation of the examples behind the deepest fine code.
    depths, examples : numpy.ndarray of int, shape (n_atoms,)
        Deepest radius at which the fine neighbourhood is known, and how many
        examples stand behind it.
    """

    features: npt.NDArray[np.float64]
    estimates_ppm: npt.NDArray[np.float64]
    spreads_ppm: npt.NDArray[np.float64]
    depths: npt.NDArray[np.int64]
    examples: npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class SphereTable:
    """Shifts by neighbourhood.

    Attributes
    ----------
    class_medians_ppm, class_sds_ppm : numpy.ndarray, shape (n_classes,)
        In the order of PROTON_CLASSES: where an estimate starts from.
    fine, coarse : tuple of Sphere
        Radius 0 first.
    """

    class_medians_ppm: npt.NDArray[np.float64]
    class_sds_ppm: npt.NDArray[np.float64]
    fine: tuple[Sphere, ...]
    coarse: tuple[Sphere, ...]

    def look_up(
        self,
        fine: npt.NDArray[np.uint32],
        coarse: npt.NDArray[np.uint32],
        classes: Sequence[str],
    ) -> Lookup:
        """Estimate shifts from coarse to fine.

        Parameters
        ----------
        fine, coarse : numpy.ndarray of uint32, shape (n_atoms, 6)
        classes : sequence of str, length n_atoms

        Notes
        -----
        Each finer code with n examples moves the running estimate to
        (n median + estimate) / (n + 1).
        """
        index = [PROTON_CLASSES.index(name) for name in classes]
        start = self.class_medians_ppm[index].astype(np.float64)
        spread = self.class_sds_ppm[index].astype(np.float64)
        by_fine = _walk(self.fine, fine, start, spread)
        by_coarse = _walk(self.coarse, coarse, start, spread)
        both = tuple(
            s for pair in zip(self.coarse, self.fine, strict=True) for s in pair
        )
        mixed = np.empty((fine.shape[0], 2 * N_SPHERES), np.uint32)
        mixed[:, 0::2], mixed[:, 1::2] = coarse, fine
        together = _walk(both, mixed, start, spread).estimates_ppm
        return Lookup(
            features=np.column_stack([by_fine.features, by_coarse.features, together]),
            estimates_ppm=together,
            spreads_ppm=by_fine.spreads_ppm,
            depths=by_fine.depths,
            examples=by_fine.examples,
        )


def _walk(
    spheres: Sequence[Sphere],
    codes: npt.NDArray[np.uint32],
    start_ppm: npt.NDArray[np.float64],
    start_spread_ppm: npt.NDArray[np.float64],
) -> Lookup:
    """Go through codes from the first to the last, shrinking each to the one before."""
    estimate, deviation = start_ppm.copy(), start_spread_ppm.copy()
    depth = np.zeros(start_ppm.size, dtype=np.int64)
    examples = np.zeros(start_ppm.size, dtype=np.int64)
    latest = start_spread_ppm.copy()
    columns = []
    for radius, sphere in enumerate(spheres):
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
        latest = np.where(known, spread, latest)
        if radius >= 1:
            columns += [estimate.copy(), np.log1p(count), spread]
    columns += [depth.astype(np.float64), estimate, deviation]
    return Lookup(
        features=np.column_stack(columns),
        estimates_ppm=estimate,
        spreads_ppm=latest,
        depths=depth,
        examples=examples,
    )


def fit_table(
    fine: npt.NDArray[np.uint32],
    coarse: npt.NDArray[np.uint32],
    shifts_ppm: npt.NDArray[np.float64],
    classes: npt.NDArray[np.str_],
) -> SphereTable:
    """Build the table from labelled atoms (used in training).

    Parameters
    ----------
    fine, coarse : numpy.ndarray of uint32, shape (n_labels, 6)
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
        fine=tuple(_fit_sphere(column, shifts_ppm) for column in fine.T),
        coarse=tuple(_fit_sphere(column, shifts_ppm) for column in coarse.T),
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
