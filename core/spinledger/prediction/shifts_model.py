"""The shift model: its parts and the reading of its files; ppm.

Origin and licence of the files: data/SOURCE.md.
"""

from __future__ import annotations

import functools
import gzip
import json
from dataclasses import dataclass
from importlib import resources
from typing import TYPE_CHECKING, Any, Final

import numpy as np
import numpy.typing as npt

from spinledger.prediction.shifts_increments import IncrementTable
from spinledger.prediction.shifts_network import Network
from spinledger.prediction.shifts_spheres import N_SPHERES, Sphere, SphereTable

if TYPE_CHECKING:
    import lightgbm

_USUAL_LN_SPREAD: Final = 0.7


def boosted(
    booster: lightgbm.Booster, rows: npt.NDArray[np.float32]
) -> npt.NDArray[np.float64]:
    """Answers of a booster, in one thread."""
    return np.asarray(booster.predict(rows, num_threads=1), dtype=np.float64)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class GapModel:
    """Distance of two unlike protons on one carbon.

    Attributes
    ----------
    booster : lightgbm.Booster
        Predicts ln(distance + floor_ppm) from counted features and a flag that
        tells fitted spectra from assigned ones.
    columns : numpy.ndarray of int
    floor_ppm : float, ppm
    ln_spread : dict of str to float
        Half-width of the 68 % interval of the logarithm, by class.
    """

    booster: lightgbm.Booster
    columns: npt.NDArray[np.int64]
    floor_ppm: float
    ln_spread: dict[str, float]

    def predict(self, features: npt.NDArray[np.float32]) -> npt.NDArray[np.float64]:
        """Distances, ppm, for rows of :func:`feature_matrix`."""
        counted = features[:, self.columns]
        # Assignments give two values only where they are far apart, fits always
        # do: the geometric mean of both answers is taken.
        flags = np.repeat([0.0, 1.0], len(counted))
        both = np.column_stack([np.vstack([counted, counted]), flags])
        logarithms = boosted(self.booster, both.astype(np.float32)).reshape(2, -1)
        found = np.exp(np.mean(logarithms, axis=0)) - self.floor_ppm
        return np.asarray(np.maximum(found, 0.0), dtype=np.float64)

    def factor(self, class_name: str) -> float:
        """Factor that 68 of 100 distances lie within, either way."""
        return float(np.exp(self.ln_spread.get(class_name, _USUAL_LN_SPREAD)))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class ShiftModel:
    """Everything that was learned."""

    table: SphereTable
    increments: IncrementTable
    networks: tuple[Network, ...]
    residual: lightgbm.Booster
    direct: lightgbm.Booster
    scale: lightgbm.Booster
    columns: npt.NDArray[np.int64]
    solvents: tuple[str, ...]
    class_factors: dict[str, tuple[float, float]]
    shares: dict[str, float]
    gap: GapModel


@functools.cache
def load_model() -> ShiftModel:
    """Read the model files; once a process."""
    facts = json.loads(_read("shift_facts.json"))
    return ShiftModel(
        table=_load_table(),
        increments=_load_increments(),
        networks=_load_networks(),
        residual=_load_booster("shift_residual.txt.gz"),
        direct=_load_booster("shift_direct.txt.gz"),
        scale=_load_booster("shift_scale.txt.gz"),
        columns=np.array(facts["columns"], dtype=np.int64),
        solvents=tuple(facts["solvents"]),
        class_factors={k: (v[0], v[1]) for k, v in facts["class_factors"].items()},
        gap=_load_gap(),
        shares={name: float(share) for name, share in facts["shares"].items()},
    )


def _load_gap() -> GapModel:
    facts = json.loads(_read("shift_gap_facts.json"))
    return GapModel(
        booster=_load_booster("shift_gap.txt.gz"),
        columns=np.array(facts["columns"], dtype=np.int64),
        floor_ppm=float(facts["floor_ppm"]),
        ln_spread={k: float(v) for k, v in facts["ln_spread"].items()},
    )


def _read(name: str) -> bytes:
    return (resources.files("spinledger.prediction") / "data" / name).read_bytes()


def _load_booster(name: str) -> lightgbm.Booster:
    import lightgbm  # noqa: PLC0415 - 0.4 s, only where shifts are predicted

    return lightgbm.Booster(model_str=gzip.decompress(_read(name)).decode())


def _load_increments() -> IncrementTable:
    folder = resources.files("spinledger.prediction") / "data"
    with (
        resources.as_file(folder / "shift_increments.npz") as path,
        np.load(path, allow_pickle=False) as arrays,
    ):
        return IncrementTable(
            keys=arrays["keys"],
            increments_ppm=arrays["increments_ppm"].astype(np.float32),
            class_medians_ppm=arrays["class_medians_ppm"],
        )


def _load_networks() -> tuple[Network, ...]:
    folder = resources.files("spinledger.prediction") / "data"
    with (
        resources.as_file(folder / "shift_networks.npz") as path,
        np.load(path, allow_pickle=False) as stored,
    ):
        arrays = {name: stored[name].astype(np.float32) for name in stored.files}
    count = sum(name.startswith("centre_") for name in arrays)
    n_layers = sum(name.startswith("bias_0_") for name in arrays)
    return tuple(
        Network(
            centre=arrays[f"centre_{number}"],
            spread=arrays[f"spread_{number}"],
            weights=tuple(arrays[f"weight_{number}_{k}"] for k in range(n_layers)),
            biases=tuple(arrays[f"bias_{number}_{k}"] for k in range(n_layers)),
        )
        for number in range(count)
    )


def _load_table() -> SphereTable:
    folder = resources.files("spinledger.prediction") / "data"
    with (
        resources.as_file(folder / "shift_table.npz") as path,
        np.load(path, allow_pickle=False) as arrays,
    ):
        return SphereTable(
            class_medians_ppm=arrays["class_medians_ppm"],
            class_sds_ppm=arrays["class_sds_ppm"],
            fine=tuple(_sphere(arrays, f"fine_{k}") for k in range(N_SPHERES)),
            coarse=tuple(_sphere(arrays, f"coarse_{k}") for k in range(N_SPHERES)),
        )


def _sphere(arrays: Any, name: str) -> Sphere:
    return Sphere(
        codes=arrays[f"codes_{name}"],
        medians_ppm=arrays[f"medians_{name}"].astype(np.float32),
        deviations_ppm=arrays[f"deviations_{name}"].astype(np.float32),
        counts=arrays[f"counts_{name}"].astype(np.float32),
    )
