"""What a carbon count, HSQC or COSY said, typed in by the user; shifts in ppm."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

SideKind = Literal["carbons", "HSQC", "COSY"]
ProtonCounts = frozenset[int]

ANY_COUNT: ProtonCounts = frozenset({0, 1, 2, 3})


@dataclass(frozen=True, slots=True, kw_only=True)
class ListedCarbon:
    """One line of a carbon list.

    Attributes
    ----------
    shift_ppm : float or None, ppm
        None where only counted.
    n_protons : frozenset of int
        Attached protons that the list allows: {2} for CH2, {1, 3} for a line
        that points up in DEPT-135, all four where nothing is said.
    """

    shift_ppm: float | None = None
    n_protons: ProtonCounts = ANY_COUNT


@dataclass(frozen=True, slots=True, kw_only=True)
class HsqcPeak:
    """A proton shift and the shift of the carbon that carries it."""

    proton_ppm: float
    carbon_ppm: float
    n_protons: ProtonCounts = ANY_COUNT


@dataclass(frozen=True, slots=True, kw_only=True)
class CosyPeak:
    """Two proton shifts with a cross peak between them."""

    first_ppm: float
    second_ppm: float


@dataclass(frozen=True, slots=True, kw_only=True)
class SideEvidence:
    """Further evidence of the same sample.

    Attributes
    ----------
    carbons : tuple of ListedCarbon
        Every carbon line seen, the solvent's left out; one item a line, also
        where only a count was given. Empty where no list was given.
    shows_quaternary : bool
        Whether carbons without protons would be in the list (not in DEPT).
    hsqc : tuple of HsqcPeak
    cosy : tuple of CosyPeak
        Off the diagonal.
    """

    carbons: tuple[ListedCarbon, ...] = ()
    shows_quaternary: bool = True
    hsqc: tuple[HsqcPeak, ...] = ()
    cosy: tuple[CosyPeak, ...] = ()

    @property
    def is_empty(self) -> bool:
        """Whether there is nothing to go by."""
        return not (self.carbons or self.hsqc or self.cosy)
