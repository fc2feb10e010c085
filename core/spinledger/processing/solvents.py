"""Deuterated solvents: names, residual lines, water, impurities; shifts in ppm."""

from __future__ import annotations

import csv
import functools
import re
from dataclasses import dataclass
from importlib import resources

# What people and spectrometers write, squeezed to lower-case letters and digits.
_ALIASES = {
    "CDCl3": "cdcl3 chloroform chloroformd chloroformd1 chcl3 deuterochloroform "
    "deuteriochloroform cdcl3tms cdcl3d cdcl3d1",
    "DMSO-d6": "dmso dmsod6 dmsod d6dmso dimethylsulfoxide dimethylsulfoxided6 "
    "dimethylsulphoxide dimethylsulphoxided6 cd32so cd3socd3 dmso6 c2d6os",
    "acetone-d6": "acetone acetoned6 acetoned d6acetone cd32co cd3cocd3 propanoned6 "
    "c3d6o aceton acetond6",
    "CD3CN": "cd3cn acetonitrile acetonitriled3 d3acetonitrile mecn mecnd3 ch3cn "
    "ch3cnd3 cd3cnd3",
    "CD3OD": "cd3od methanol methanold4 methanold d4methanol meod meoh meohd4 ch3oh "
    "ch3ohd4 methanold3",
    "D2O": "d2o deuteriumoxide heavywater waterd2 d2 2h2o d2otsp d2odss d2osalt "
    "deuteratedwater deuteriumoxided2 waterd d2odsspbs d2obuffer",
    "H2O/D2O": "h2o water 10d2o 5d2o h2osalt",
    "C6D6": "c6d6 benzene benzened6 d6benzene c6h6",
    "toluene-d8": "toluene toluened8 d8toluene c7d8 phmed8 tol told8 c6d5cd3",
    "THF-d8": "thf thfd8 d8thf tetrahydrofuran tetrahydrofurand8 c4d8o",
    "CD2Cl2": "cd2cl2 dichloromethane dichloromethaned2 methylenechloride "
    "methylenechlorided2 dcm dcmd2 ch2cl2 d2dichloromethane",
    "C6D5Cl": "c6d5cl chlorobenzene chlorobenzened5",
    "TFE-d3": "tfe tfed3 trifluoroethanol trifluoroethanold3 222trifluoroethanold3 "
    "cf3cd2od tfed2",
    "DMF-d7": "dmf dmfd7 dimethylformamide dimethylformamided7 nndimethylformamided7",
    "pyridine-d5": "pyridine pyridined5 pyr pyrd5 c5d5n py",
    "CD3CO2D": "cd3co2d cd3cood aceticacid aceticacidd4 acoh acohd4 acod hac",
    "C2D2Cl4": "c2d2cl4 tce tced2 tetrachloroethane tetrachloroethaned2 "
    "1122tetrachloroethane 1122tetrachloroethaned2 cdcl2cdcl2 c2d2cl4d2",
    "TFA-d": "tfa tfad tfad1 trifluoroaceticacid trifluoroaceticacidd cf3co2d cf3cood",
    "dioxane-d8": "dioxane dioxaned8 14dioxane 14dioxaned8",
}
_PROTIC = frozenset({"D2O", "H2O/D2O", "CD3OD", "TFE-d3", "CD3CO2D", "TFA-d"})
_AQUEOUS = frozenset({"D2O", "H2O/D2O"})
_CELSIUS_K = 273.15
# HOD, besides H2O, where proton exchange is slow: 2.81 and 3.30 ppm [1].
_SLOW_HOD_PPM = {"acetone-d6": 2.81, "DMSO-d6": 3.30}


@dataclass(frozen=True, slots=True, kw_only=True)
class ResidualLine:
    """A residual proton signal of a deuterated solvent.

    Attributes
    ----------
    solvent, species : str
        Canonical name; what carries the proton ("CHCl3", "CD2H", ...).
    shift_ppm : float, ppm
    multiplicity : str
        "s", "t", "quint", "s br", "m".
    j_hd_hz : float or None, Hz
        H/D splitting.
    """

    solvent: str
    species: str
    shift_ppm: float
    multiplicity: str
    j_hd_hz: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class WaterLine:
    """Where water is expected in a solvent, with its sd; shifts in ppm."""

    species: str
    shift_ppm: float
    sd_ppm: float


@dataclass(frozen=True, slots=True, kw_only=True)
class ImpurityLine:
    """One signal of a common impurity in one solvent.

    Attributes
    ----------
    compound, smiles, group : str
        ``smiles`` is "" for mixtures such as grease.
    multiplicity : str
    couplings_hz : tuple of float, Hz
    shift_ppm : float, ppm
    """

    compound: str
    smiles: str
    group: str
    multiplicity: str
    couplings_hz: tuple[float, ...]
    shift_ppm: float


def canonical_solvent(name: str) -> str | None:
    """Name of a solvent as the tables have it, or None where it is not known.

    Parameters
    ----------
    name : str
        Formula, trade or systematic name in any case: "chloroform-d", "MeOD",
        "(CD3)2SO", "H2O+D2O", ...

    Examples
    --------
    >>> canonical_solvent("Deuterium oxide")
    'D2O'
    >>> canonical_solvent("(CD3)2SO")
    'DMSO-d6'
    """
    squeezed = re.sub(r"[^a-z0-9]", "", name.lower())
    if "h2o" in squeezed and "d2o" in squeezed:
        return "H2O/D2O"
    return _by_alias().get(squeezed)


@functools.cache
def solvent_names() -> tuple[str, ...]:
    """Canonical names of all known solvents."""
    return tuple(_ALIASES)


def is_protic_deuterated(solvent: str | None) -> bool:
    """Whether OH, NH, SH and COOH exchange with the solvent and are not seen."""
    return solvent in _PROTIC


def is_aqueous(solvent: str | None) -> bool:
    """Whether the solvent is heavy water or water with some of it."""
    return solvent in _AQUEOUS


def residual_lines(solvent: str | None) -> tuple[ResidualLine, ...]:
    """Residual proton lines of a solvent, water left out; empty where unknown."""
    if solvent is None:
        return ()
    return tuple(
        line
        for line in _residual_table()
        if line.solvent == solvent and line.species != "HOD"
    )


def quintet_solvents() -> tuple[ResidualLine, ...]:
    """All residual CD2H lines, by which a solvent can be told from the spectrum."""
    return tuple(line for line in _residual_table() if line.multiplicity == "quint")


def hod_shift_ppm(temperature_k: float) -> float:
    """Shift of HOD in D2O against DSS, ppm.

    Parameters
    ----------
    temperature_k : float, K
        0 to 50 deg C.

    Notes
    -----
    7.83 - T/96.9, dilute, near neutral. Another published form,
    5.060 - 0.0122 t + 2.11e-5 t^2 (t in deg C), differs by up to 0.05 ppm; salt
    and pH move it by as much.

    References
    ----------
    .. [1] D. S. Wishart et al., J. Biomol. NMR 6 (1995) 135-140,
       doi:10.1007/BF00211777 (from memory).

    Examples
    --------
    >>> round(hod_shift_ppm(298.15), 3)
    4.753
    """
    return 7.83 - temperature_k / 96.9


def water_lines(
    solvent: str | None, temperature_k: float | None = None
) -> tuple[WaterLine, ...]:
    """Where water is expected; empty for an unknown solvent.

    Parameters
    ----------
    solvent : str or None
        Canonical name.
    temperature_k : float, K, optional
        Of the sample; 298.15 K is taken where it is unknown.

    Notes
    -----
    H2O in most organic solvents; H2O and HOD side by side in acetone-d6 and
    DMSO-d6 [1]; HOD alone in D2O. Concentration and acids move water in organic
    solvents by some tenths of a ppm.

    References
    ----------
    .. [1] H. E. Gottlieb, V. Kotlyar, A. Nudelman, J. Org. Chem. 62 (1997)
       7512-7515, doi:10.1021/jo971176v.
    """
    if solvent is None:
        return ()
    if is_aqueous(solvent):
        celsius_25 = 25.0 + _CELSIUS_K
        shift = hod_shift_ppm(temperature_k if temperature_k else celsius_25)
        return (WaterLine(species="HOD", shift_ppm=shift, sd_ppm=0.1),)
    shift_or_none = _water_table().get(solvent)
    if shift_or_none is None:
        return ()
    species = "HOD" if is_protic_deuterated(solvent) else "H2O"
    lines = [WaterLine(species=species, shift_ppm=shift_or_none, sd_ppm=0.1)]
    if solvent in _SLOW_HOD_PPM:
        shift = _SLOW_HOD_PPM[solvent]
        lines.append(WaterLine(species="HOD", shift_ppm=shift, sd_ppm=0.1))
    return tuple(lines)


@functools.cache
def impurity_lines(solvent: str | None) -> tuple[ImpurityLine, ...]:
    """Lines of common impurities in a solvent; empty for an unknown one.

    Water is left out (see :func:`water_lines`), and so are rows that look
    misprinted in their source.
    """
    wanted = "D2O" if is_aqueous(solvent) else solvent
    return tuple(
        ImpurityLine(
            compound=row["compound"],
            smiles=row["smiles"],
            group=row["group"],
            multiplicity=row["mult"],
            couplings_hz=tuple(float(j) for j in re.findall(r"[\d.]+", row["J_Hz"])),
            shift_ppm=float(row["shift_ppm"]),
        )
        for row in _rows("impurities_1h.csv")
        if row["solvent"] == wanted
        and row["compound"] != "water"
        and row["confidence"] != "low"
    )


@functools.cache
def _by_alias() -> dict[str, str]:
    return {
        alias: solvent
        for solvent, aliases in _ALIASES.items()
        for alias in aliases.split()
    }


@functools.cache
def _residual_table() -> tuple[ResidualLine, ...]:
    return tuple(
        ResidualLine(
            solvent=row["solvent"],
            species=row["species"],
            shift_ppm=float(row["shift_1H_ppm"]),
            multiplicity=row["mult"],
            j_hd_hz=float(row["J_HD_Hz"]) if row["J_HD_Hz"] else None,
        )
        for row in _rows("residual_solvents.csv")
    )


@functools.cache
def _water_table() -> dict[str, float]:
    return {
        row["solvent"]: float(row["water_1H_ppm"])
        for row in _rows("residual_solvents.csv")
        if row["water_1H_ppm"]
    }


def _rows(name: str) -> list[dict[str, str]]:
    table = resources.files("spinledger.processing") / "data" / name
    return list(csv.DictReader(table.read_text(encoding="utf-8").splitlines()))
