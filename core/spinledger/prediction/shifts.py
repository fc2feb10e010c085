"""Shifts of protons on carbon, with calibrated intervals; ppm.

A table of known neighbourhoods and a sum of increments start it; boosted trees and
small networks correct them. How the parts were made: data/SOURCE.md.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt
from rdkit import Chem

from spinledger.prediction.shifts_features import Surroundings, feature_matrix
from spinledger.prediction.shifts_increments import fragment_counts
from spinledger.prediction.shifts_model import ShiftModel, boosted, load_model
from spinledger.prediction.shifts_network import network_inputs
from spinledger.prediction.shifts_solvents import solvent_differences_ppm
from spinledger.prediction.shifts_spheres import (
    Lookup,
    coarse_codes,
    coarse_neighbourhoods,
    fine_codes,
)
from spinledger.prediction.shifts_types import proton_class
from spinledger.processing.solvents import is_aqueous

# Most training labels do not name their solvent (common practice: CDCl3), so
# the interval is widened for others. D2O 1.25 is measured on published fits,
# the rest is from memory of solvent-induced shifts; aromatic ones move most.
_WIDENING: Final = {
    "CDCl3": 1.0,
    "CD2Cl2": 1.0,
    "C2D2Cl4": 1.05,
    "D2O": 1.25,
    "H2O/D2O": 1.25,
    "C6D6": 1.6,
    "toluene-d8": 1.5,
    "C6D5Cl": 1.3,
    "pyridine-d5": 1.35,
    "TFA-d": 1.6,
    "CD3CO2D": 1.25,
}
_OTHER_SOLVENT: Final = 1.12
_UNKNOWN_SOLVENT: Final = 1.05


@dataclass(frozen=True, slots=True, kw_only=True)
class ShiftPrediction:
    """Shift of the protons on one atom.

    Attributes
    ----------
    shift_ppm : float, ppm
    sd_ppm : float, ppm
        Half-width of the interval that holds 68 % of measured shifts.
    half_width_95_ppm : float, ppm
        Half-width of the interval that holds 95 %.
    sphere : int
        Bonds out to which the surroundings are known from the training data.
    examples : int
        Labels with just these surroundings.
    source : str
        The same in words.
    gap_ppm : float, ppm
        Distance of the two protons of the carbon (or of two methyls), if they
        are not alike.
    gap_factor : float
        The distance is within this factor, either way, in 68 of 100 cases.
    """

    shift_ppm: float
    sd_ppm: float
    half_width_95_ppm: float
    sphere: int
    examples: int
    source: str
    gap_ppm: float
    gap_factor: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class _Base:
    """What table and increments say of some atoms, and what the trees are shown."""

    lookup: Lookup
    estimates_ppm: npt.NDArray[np.float64]
    columns: npt.NDArray[np.float64]


def predict_shifts(
    mol: Chem.Mol, atoms: Sequence[int], *, solvent: str | None = None
) -> tuple[ShiftPrediction, ...]:
    """Shifts of the protons on some carbons of a molecule.

    Parameters
    ----------
    mol : Chem.Mol
        Hydrogens implicit; ions as they are in solution.
    atoms : sequence of int
        Carbons that carry protons.
    solvent : str, optional
        Canonical name.

    Returns
    -------
    tuple of ShiftPrediction, one an atom
        The two protons of a CH2 have one mean here.
    """
    if not atoms:
        return ()
    model = load_model()
    chosen = list(atoms)
    classes = [proton_class(mol.GetAtomWithIdx(i)) for i in chosen]
    around = Surroundings(mol)
    base = _base(model, mol, chosen, classes, around)
    features = feature_matrix(around, chosen)
    solvent_column = np.full(len(chosen), _solvent_index(model, solvent))
    counted = np.column_stack([features[:, model.columns], solvent_column]).astype(
        np.float32
    )
    stacked = np.column_stack([counted, base.columns]).astype(np.float32)
    means = _means(model, base, counted, stacked, classes)
    means = means + np.array(solvent_differences_ppm(mol, chosen, solvent))
    scales = np.exp(boosted(model.scale, stacked)) * _widening(solvent)
    gaps = model.gap.predict(features)
    out = []
    for index, name in enumerate(classes):
        factors = model.class_factors.get(name, model.class_factors["all"])
        sphere = int(base.lookup.depths[index])
        examples = int(base.lookup.examples[index])
        out.append(
            ShiftPrediction(
                shift_ppm=float(means[index]),
                sd_ppm=float(scales[index]) * factors[0],
                half_width_95_ppm=float(scales[index]) * factors[1],
                sphere=sphere,
                examples=examples,
                source=_in_words(
                    sphere, examples, float(base.lookup.spreads_ppm[index])
                ),
                gap_ppm=float(gaps[index]),
                gap_factor=model.gap.factor(name),
            )
        )
    return tuple(out)


def _base(
    model: ShiftModel,
    mol: Chem.Mol,
    atoms: list[int],
    classes: list[str],
    around: Surroundings,
) -> _Base:
    wide = coarse_neighbourhoods(mol)
    lookup = model.table.look_up(
        fine_codes(mol)[atoms], coarse_codes(mol, wide)[atoms], classes
    )
    counts = fragment_counts(mol, atoms, around.distances, wide)
    sums = model.increments.estimate(counts, classes)
    return _Base(
        lookup=lookup,
        estimates_ppm=(lookup.estimates_ppm + sums) / 2,
        columns=np.column_stack([lookup.features, sums, sums - lookup.estimates_ppm]),
    )


def _means(
    model: ShiftModel,
    base: _Base,
    counted: npt.NDArray[np.float32],
    stacked: npt.NDArray[np.float32],
    classes: list[str],
) -> npt.NDArray[np.float64]:
    """Weighted mean of the trees' and the networks' answers."""
    shown = network_inputs(counted, base.columns, classes, len(model.solvents))
    corrections = [network.predict(shown) for network in model.networks]
    parts = {
        "residual": base.estimates_ppm + boosted(model.residual, stacked),
        "direct": boosted(model.direct, counted),
        "network": base.estimates_ppm + np.mean(corrections, axis=0),
    }
    weighted = [model.shares[name] * part for name, part in parts.items()]
    return np.asarray(np.sum(weighted, axis=0), dtype=np.float64)


def _solvent_index(model: ShiftModel, solvent: str | None) -> int:
    known = "D2O" if is_aqueous(solvent) else solvent
    return model.solvents.index(known) if known in model.solvents else -1


def _widening(solvent: str | None) -> float:
    if solvent is None:
        return _UNKNOWN_SOLVENT
    return _WIDENING.get(solvent, _OTHER_SOLVENT)


def _in_words(sphere: int, examples: int, spread_ppm: float) -> str:
    if examples == 0:
        return "surroundings not known; from counted neighbours alone"
    count = "1 example" if examples == 1 else f"{examples} examples"
    spread = f", mean spread {spread_ppm:.2f} ppm" if examples > 1 else ""
    return f"known environment to sphere {sphere}, {count}{spread}"
