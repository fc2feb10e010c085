"""What a structure says must be in the spectrum; shifts in ppm, couplings in Hz."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Visibility = Literal["seen", "optional", "silent"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Claim:
    """One group of chemically equivalent protons.

    Attributes
    ----------
    label : str
        Unique in the set: "3-HA", "2-H", "OH-5", ...
    atoms : tuple of int
        0-based heavy atoms, in the given order, that carry the protons; all
        symmetric carriers.
    n_protons : int
    species : int
        Index of the species in a mixture, 0 for the only one.
    shift_ppm, shift_sd_ppm : float, ppm
        Prediction and its calibrated standard deviation.
    visibility : {"seen", "optional", "silent"}
        Must be seen; may be seen (exchangeable in an aprotic solvent, or slow
        exchange); not expected in this spectrum.
    is_exchangeable : bool
    why : str
        One sentence where it is not simply seen, else "".
    pair : str or None
        Label of the diastereotopic partner on the same atom(s), if any.
    shift_source : str
        How we know: "known environment to sphere 4, 17 examples", ...
    place : str
        Where it stands: "axial", "equatorial", "pro-R", "pro-S", "axial, pro-R", or
        "" where there is nothing to say or it is not known.
    """

    label: str
    atoms: tuple[int, ...]
    n_protons: int
    shift_ppm: float
    shift_sd_ppm: float
    species: int = 0
    visibility: Visibility = "seen"
    is_exchangeable: bool = False
    why: str = ""
    pair: str | None = None
    shift_source: str = ""
    place: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Particle:
    """Magnetically equivalent spins that act as one composite particle.

    Attributes
    ----------
    claim : int or None
        Index of the claim whose shift it has; None for a hetero nucleus.
    nucleus : str
        "1H", "19F", "31P", ...
    n_spins : int
    hydrogens : tuple of int
        Atom indices in the molecule with explicit hydrogens appended
        (RDKit's AddHs on the given heavy-atom order); the hetero atom itself
        for other nuclei.
    """

    claim: int | None
    nucleus: str
    n_spins: int
    hydrogens: tuple[int, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class CouplingClaim:
    """One coupling parameter and every particle pair that shares it by symmetry.

    Attributes
    ----------
    pairs : tuple of (int, int)
        Particle index pairs.
    j_hz : float, Hz
        Predicted, with sign.
    j_sd_hz : float, Hz
        Rule error and conformer doubt together.
    kind : str
        "geminal", "vicinal chain", "vicinal ring", "vinyl trans", "ortho", ...
    bonds : int
        Bonds between the nuclei.
    is_rigid : bool
        The value follows from the drawing (rings, alkenes, arenes); False for
        open chains, whose drawing claims no dihedral angle.
    source : str
        Rule or table, with citation key.
    swaps_with : int or None
        Index of the coupling that exchanges its value with this one when the
        two protons of a pair are exchanged, or J' of an AA'XX' J.
    """

    pairs: tuple[tuple[int, int], ...]
    j_hz: float
    j_sd_hz: float
    kind: str
    bonds: int
    is_rigid: bool
    source: str = ""
    swaps_with: int | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class ClaimSet:
    """All claims of one structure (or mixture) in one solvent.

    Particles of silent claims are left out of ``particles`` and couplings.

    Attributes
    ----------
    claims : tuple of Claim
    particles : tuple of Particle
    couplings : tuple of CouplingClaim
    species_smiles : tuple of str
        What is in solution, one per species (ions, anomers, hydrates).
    species_shares : tuple of (float, float)
        Expected share of each species and its sd; shares of one tube are free
        within them.
    notes : tuple of str
        Sentences for the user: zwitterion taken, anomers offered, ...
    """

    claims: tuple[Claim, ...]
    particles: tuple[Particle, ...]
    couplings: tuple[CouplingClaim, ...]
    species_smiles: tuple[str, ...] = ()
    species_shares: tuple[tuple[float, float], ...] = ((1.0, 0.0),)
    notes: tuple[str, ...] = ()

    def index_of(self, label: str) -> int:
        """Index of a claim by its label.

        Raises
        ------
        KeyError
            If there is no such claim.
        """
        for index, claim in enumerate(self.claims):
            if claim.label == label:
                return index
        raise KeyError(label)
