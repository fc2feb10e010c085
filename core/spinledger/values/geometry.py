"""What measured couplings say about the shape of the molecule; J in Hz, angles in degrees."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class DihedralShare:
    """One measured coupling over three bonds and the dihedral angles behind it.

    Attributes
    ----------
    first, second : str
        Claims.
    is_in_ring : bool
        Whether the bond between their carbons is in a ring.
    j_hz, j_sd_hz : float, Hz
        As measured.
    fitted_j_hz : float, Hz
        Mean over the reweighted conformers.
    anti_share, anti_share_sd : float
        Share of conformers with the protons antiperiplanar (beyond 120
        degrees), reweighted to all couplings together, and its sd.
    prior_anti_share : float
        The same by the force field alone.
    angle_deg, angle_sd_deg : float, degrees
        Mean of the unsigned dihedral angle, and its sd over the conformers.
    """

    first: str
    second: str
    is_in_ring: bool
    j_hz: float
    j_sd_hz: float
    fitted_j_hz: float
    anti_share: float
    anti_share_sd: float
    prior_anti_share: float
    angle_deg: float
    angle_sd_deg: float


@dataclass(frozen=True, slots=True, kw_only=True)
class ConfigurationOdds:
    """One relative configuration and its probability by the couplings alone.

    Attributes
    ----------
    smiles : str
        One of the two mirror images.
    name : str
        "cis", "trans", "syn", "anti", or which centres are turned over.
    probability : float
        Among the configurations listed, all being as likely beforehand.
    is_drawn : bool
    misfit_sd : float
        Largest deviation of a coupling from the reweighted conformers, in sd.
    """

    smiles: str
    name: str
    probability: float
    is_drawn: bool
    misfit_sd: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Geometry:
    """Populations and relative configuration by the measured couplings.

    Attributes
    ----------
    n_conformers : int
    effective_share : float
        Exponential of minus the relative entropy: 1 where the force field's
        populations needed no change.
    misfit_before, misfit_after : float
        Root mean square deviation of the couplings in sd.
    dihedrals : tuple of DihedralShare
    configurations : tuple of ConfigurationOdds
        Likeliest first; empty where there are not two centres that couplings
        could relate.
    sentences : tuple of str
        The same for the reader.
    """

    n_conformers: int
    effective_share: float
    misfit_before: float
    misfit_after: float
    dihedrals: tuple[DihedralShare, ...]
    configurations: tuple[ConfigurationOdds, ...]
    sentences: tuple[str, ...]
