"""What measured couplings say about the rotamers of an open chain; J in Hz."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import permutations

import numpy as np
import numpy.typing as npt
from rdkit import Chem

from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.hla import vicinal_over_conformers_hz
from spinledger.structure.conformers import Ensemble
from spinledger.values.arrays import locked_floats

Floats = npt.NDArray[np.float64]

#: Error of one value of the equation for a known geometry.
RULE_SD_HZ = 0.45
#: Steps of a population on the grid over all mixtures of three rotamers.
GRID_STEPS = 40
#: A share is determined when its sd is below this.
DETERMINED_SD = 0.10
#: Worse than this many sd for every mixture speaks against the structure.
MISFIT_LIMIT = 2.0


@dataclass(frozen=True, slots=True, kw_only=True)
class MeasuredCoupling:
    """One coupling across the bond.

    Attributes
    ----------
    first, second : int
        Hydrogens; which of two on one carbon is meant need not be known.
    j_hz, j_sd_hz : float, Hz
    """

    first: int
    second: int
    j_hz: float
    j_sd_hz: float = 0.0


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class RotamerPopulations:
    """Shares of the staggered rotamers about one bond, for one labelling.

    Attributes
    ----------
    torsion : (int, int, int, int)
        Atoms whose dihedral angle names the rotamers.
    angles_deg : numpy.ndarray, shape (n_rotamers,), degrees
        Mean angle of each rotamer that has conformers.
    shares, share_sds : numpy.ndarray, shape (n_rotamers,)
        Posterior mean and sd, every mixture being as likely beforehand.
    prior_shares : numpy.ndarray, shape (n_rotamers,)
        What the force field says; for comparison only.
    couplings_hz : numpy.ndarray, shape (n_couplings,), Hz
        Of the best mixture, in the order measured.
    misfit_sd : float
        Largest deviation of the best mixture, in sd.
    log_evidence : float
        Natural logarithm, to compare labellings.
    order : tuple of int
        Which measured value each given pair of protons takes.
    """

    torsion: tuple[int, int, int, int]
    angles_deg: Floats
    shares: Floats
    share_sds: Floats
    prior_shares: Floats
    couplings_hz: Floats
    misfit_sd: float
    log_evidence: float
    order: tuple[int, ...]

    def __post_init__(self) -> None:
        for name in (
            "angles_deg",
            "shares",
            "share_sds",
            "prior_shares",
            "couplings_hz",
        ):
            object.__setattr__(self, name, locked_floats(getattr(self, name), name))

    @property
    def is_determined(self) -> tuple[bool, ...]:
        """Whether the couplings fix the share of each rotamer."""
        return tuple(bool(sd < DETERMINED_SD) for sd in self.share_sds)

    @property
    def speaks_against_structure(self) -> bool:
        """Whether no mixture of rotamers gives the couplings."""
        return self.misfit_sd > MISFIT_LIMIT


def rotamer_populations(
    mol_with_hydrogens: Chem.Mol,
    conformers: Ensemble,
    *,
    bond: tuple[int, int],
    measured: Sequence[MeasuredCoupling],
    is_aqueous: bool,
) -> tuple[RotamerPopulations, ...]:
    """Shares of the rotamers about a bond from the couplings across it.

    Parameters
    ----------
    mol_with_hydrogens : rdkit.Chem.Mol
    conformers : Ensemble
    bond : (int, int)
        Saturated carbons of an open chain.
    measured : sequence of MeasuredCoupling
        One to four values.
    is_aqueous : bool

    Returns
    -------
    tuple of RotamerPopulations
        One for every way of giving the values to the protons that a change of
        labels on one carbon allows, the most likely first. Couplings alone
        seldom tell the labellings apart: report all that are close.

    Raises
    ------
    ValueError
        If there are no conformers, no couplings, or the bond has no rotamers.

    Notes
    -----
    Posterior over all mixtures of the staggered rotamers, flat beforehand, on
    a grid; the coupling of each rotamer is the mean of the equation over the
    conformers in its well. A single coupling fixes the share of the rotamer
    with antiperiplanar protons and leaves the others open.

    References
    ----------
    .. [1] C. A. G. Haasnoot, F. A. A. M. de Leeuw, C. Altona, Tetrahedron 36
       (1980) 2783-2792, doi:10.1016/0040-4020(80)80155-4.
    """
    if conformers.is_empty or not measured:
        raise ValueError("rotamers need conformers and at least one coupling")
    frame = Frame(mol_with_hydrogens, is_aqueous=is_aqueous, conformers=conformers)
    torsion = _torsion(frame, *bond)
    wells = _wells(frame, torsion)
    rotamers = _rotamer_couplings_hz(frame, bond, measured, wells)
    found = [
        _posterior(frame, torsion, wells, rotamers, measured, order)
        for order in _orders(frame, measured)
    ]
    return tuple(sorted(found, key=lambda item: -item.log_evidence))


def _torsion(frame: Frame, a: int, b: int) -> tuple[int, int, int, int]:
    """Heaviest substituent on either carbon, ties by symmetry class."""
    ends = []
    for carbon, other in ((a, b), (b, a)):
        substituents = frame.others(carbon, other)
        if not substituents:
            raise ValueError(f"bond {a}-{b}: atom {carbon} has no group to turn")
        ends.append(
            max(
                substituents,
                key=lambda i: (frame.element(i), -frame.constitutional_ranks[i]),
            )
        )
    return ends[0], a, b, ends[1]


def _wells(
    frame: Frame, torsion: tuple[int, int, int, int]
) -> tuple[npt.NDArray[np.bool_], ...]:
    """Conformers of each staggered rotamer that occurs (near +60, 180, -60)."""
    angles = frame.dihedral_deg(*torsion) % 360.0
    wells = [(angles >= low) & (angles < low + 120.0) for low in (0.0, 120.0, 240.0)]
    return tuple(well for well in wells if well.any())


def _rotamer_couplings_hz(
    frame: Frame,
    bond: tuple[int, int],
    measured: Sequence[MeasuredCoupling],
    wells: Sequence[npt.NDArray[np.bool_]],
) -> Floats:
    """Mean coupling of each proton pair in each well, shape (n_wells, n_pairs), Hz."""
    weights = frame.conformers.weights
    columns = []
    for item in measured:
        first, second = item.first, item.second
        if frame.carrier(first) != bond[0]:
            first, second = second, first
        values = vicinal_over_conformers_hz(frame, first, *bond, second)
        columns.append([np.average(values[w], weights=weights[w]) for w in wells])
    return np.array(columns).T


def _orders(
    frame: Frame, measured: Sequence[MeasuredCoupling]
) -> list[tuple[int, ...]]:
    """Permutations of the values that exchange labels on one carbon."""
    pairs = [(item.first, item.second) for item in measured]
    orders = []
    for order in permutations(range(len(pairs))):
        moved = {
            (old, new)
            for index, target in enumerate(order)
            for old, new in zip(pairs[index], pairs[target], strict=True)
        }
        is_relabelling = len({old for old, _ in moved}) == len(moved)
        stays = all(frame.carrier(old) == frame.carrier(new) for old, new in moved)
        if is_relabelling and stays:
            orders.append(order)
    return orders


def _posterior(
    frame: Frame,
    torsion: tuple[int, int, int, int],
    wells: Sequence[npt.NDArray[np.bool_]],
    rotamers: Floats,
    measured: Sequence[MeasuredCoupling],
    order: tuple[int, ...],
) -> RotamerPopulations:
    values = np.array([measured[index].j_hz for index in order])
    sds = np.array([measured[index].j_sd_hz for index in order])
    sds = np.hypot(sds, RULE_SD_HZ)
    mixtures = _mixtures(len(wells))
    deviations = (mixtures @ rotamers - values) / sds
    log_likelihood = -0.5 * np.sum(deviations**2, axis=1)
    best = int(np.argmax(log_likelihood))
    shifted = np.exp(log_likelihood - log_likelihood[best])
    posterior = shifted / shifted.sum()
    shares = posterior @ mixtures
    weights = frame.conformers.weights
    angles = frame.dihedral_deg(*torsion) % 360.0
    return RotamerPopulations(
        torsion=torsion,
        angles_deg=np.array([np.average(angles[w], weights=weights[w]) for w in wells]),
        shares=shares,
        share_sds=np.sqrt(np.maximum(posterior @ mixtures**2 - shares**2, 0.0)),
        prior_shares=np.array([weights[w].sum() for w in wells]),
        couplings_hz=mixtures[best] @ rotamers,
        misfit_sd=float(np.abs(deviations[best]).max()),
        log_evidence=float(np.log(shifted.mean()) + log_likelihood[best]),
        order=order,
    )


def _mixtures(n_rotamers: int) -> Floats:
    """Every mixture on the grid, shape (n_mixtures, n_rotamers)."""
    if n_rotamers == 1:
        return np.ones((1, 1))
    if n_rotamers == 2:
        first = np.linspace(0.0, 1.0, GRID_STEPS + 1)
        return np.column_stack([first, 1.0 - first])
    grid = [
        (i, j, GRID_STEPS - i - j)
        for i in range(GRID_STEPS + 1)
        for j in range(GRID_STEPS + 1 - i)
    ]
    return np.array(grid) / GRID_STEPS
