"""Shifts of protons on carbon, with calibrated intervals; ppm.

The mean of a table of known neighbourhoods corrected by boosted trees, and of
trees on counted surroundings alone. Model files and their origin: data/SOURCE.md.
"""

from __future__ import annotations

import functools
import gzip
import json
from collections.abc import Sequence
from dataclasses import dataclass
from importlib import resources
from typing import TYPE_CHECKING, Any, Final

import numpy as np
import numpy.typing as npt
from rdkit import Chem

from spinledger.prediction.shifts_features import Surroundings, feature_matrix
from spinledger.prediction.shifts_spheres import (
    N_SPHERES,
    Lookup,
    Sphere,
    SphereTable,
    sphere_codes,
)
from spinledger.prediction.shifts_types import proton_class

if TYPE_CHECKING:
    import lightgbm

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
    """

    shift_ppm: float
    sd_ppm: float
    half_width_95_ppm: float
    sphere: int
    examples: int
    source: str


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class ShiftModel:
    """Everything that was learned."""

    table: SphereTable
    residual: lightgbm.Booster
    direct: lightgbm.Booster
    scale: lightgbm.Booster
    columns: npt.NDArray[np.int64]
    solvents: tuple[str, ...]
    class_factors: dict[str, tuple[float, float]]


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
    classes = [proton_class(mol.GetAtomWithIdx(i)) for i in atoms]
    lookup = model.table.look_up(sphere_codes(mol)[list(atoms)], classes)
    counted = feature_matrix(Surroundings(mol), atoms)[:, model.columns]
    known = model.solvents.index(solvent) if solvent in model.solvents else -1
    direct_input = np.column_stack([counted, np.full(len(atoms), known)])
    stacked = np.column_stack([direct_input, lookup.features]).astype(np.float32)
    means = (
        lookup.estimates_ppm
        + _predicted(model.residual, stacked)
        + _predicted(model.direct, direct_input.astype(np.float32))
    ) / 2
    scales = np.exp(_predicted(model.scale, stacked))
    widening = _widening(solvent)
    return tuple(
        _prediction(
            model,
            lookup,
            index,
            class_name=classes[index],
            mean=float(means[index]),
            scale=float(scales[index]) * widening,
        )
        for index in range(len(atoms))
    )


def _widening(solvent: str | None) -> float:
    if solvent is None:
        return _UNKNOWN_SOLVENT
    return _WIDENING.get(solvent, _OTHER_SOLVENT)


def _predicted(
    booster: lightgbm.Booster, rows: npt.NDArray[np.float32]
) -> npt.NDArray[np.float64]:
    return np.asarray(booster.predict(rows, num_threads=1), dtype=np.float64)


def _prediction(
    model: ShiftModel,
    lookup: Lookup,
    index: int,
    *,
    class_name: str,
    mean: float,
    scale: float,
) -> ShiftPrediction:
    inner, outer = model.class_factors.get(class_name, model.class_factors["all"])
    sphere, examples = int(lookup.depths[index]), int(lookup.examples[index])
    return ShiftPrediction(
        shift_ppm=mean,
        sd_ppm=inner * scale,
        half_width_95_ppm=outer * scale,
        sphere=sphere,
        examples=examples,
        source=_in_words(sphere, examples, float(lookup.deviations_ppm[index])),
    )


def _in_words(sphere: int, examples: int, spread_ppm: float) -> str:
    if examples == 0:
        return "surroundings not known; from counted neighbours alone"
    count = "1 example" if examples == 1 else f"{examples} examples"
    spread = f", mean spread {spread_ppm:.2f} ppm" if examples > 1 else ""
    return f"known environment to sphere {sphere}, {count}{spread}"


@functools.cache
def load_model() -> ShiftModel:
    """Read the model files; once a process."""
    facts = json.loads(_read("shift_facts.json"))
    return ShiftModel(
        table=_load_table(),
        residual=_load_booster("shift_residual.txt.gz"),
        direct=_load_booster("shift_direct.txt.gz"),
        scale=_load_booster("shift_scale.txt.gz"),
        columns=np.array(facts["columns"], dtype=np.int64),
        solvents=tuple(facts["solvents"]),
        class_factors={k: (v[0], v[1]) for k, v in facts["class_factors"].items()},
    )


def _read(name: str) -> bytes:
    return (resources.files("spinledger.prediction") / "data" / name).read_bytes()


def _load_booster(name: str) -> lightgbm.Booster:
    import lightgbm  # noqa: PLC0415 - 0.4 s, only where shifts are predicted

    return lightgbm.Booster(model_str=gzip.decompress(_read(name)).decode())


def _load_table() -> SphereTable:
    folder = resources.files("spinledger.prediction") / "data"
    with (
        resources.as_file(folder / "shift_table.npz") as path,
        np.load(path, allow_pickle=False) as arrays,
    ):
        return SphereTable(
            class_medians_ppm=arrays["class_medians_ppm"],
            class_sds_ppm=arrays["class_sds_ppm"],
            spheres=tuple(_sphere(arrays, radius) for radius in range(N_SPHERES)),
        )


def _sphere(arrays: Any, radius: int) -> Sphere:
    return Sphere(
        codes=arrays[f"codes_{radius}"],
        medians_ppm=arrays[f"medians_{radius}"].astype(np.float32),
        deviations_ppm=arrays[f"deviations_{radius}"].astype(np.float32),
        counts=arrays[f"counts_{radius}"].astype(np.float32),
    )
