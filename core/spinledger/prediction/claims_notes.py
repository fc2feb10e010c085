"""Sentences that go with the claims of a structure: what they leave out or take for granted."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Final

from rdkit import Chem

from spinledger.structure.mobility import (
    ROOM_TEMPERATURE_K,
    merging_barrier_kcal,
    slow_bonds,
    turning_bonds,
)
from spinledger.structure.settled import open_centres, settled
from spinledger.structure.species import Solution
from spinledger.structure.symmetry import Symmetry

_PARAMAGNETIC: Final = frozenset({24, 25, 26, 27, 28, 29, *range(58, 71)})
# Barriers this near to where two signals merge make both broad.
_BROAD_KCAL: Final = 1.5
# Element, and what its magnetic isotopes add beside a proton (abundances from the
# IUPAC tables; couplings are usual values, from memory).
_SATELLITES: Final = (
    (14, "29Si (4.7 %) gives satellites at 3 to 4 Hz on either side of SiCH"),
    (34, "77Se (7.6 %) gives satellites at 5 to 10 Hz on either side of SeCH"),
    (50, "117Sn and 119Sn (16 %) give satellites 25 to 30 Hz on either side of SnCH"),
    (78, "195Pt (34 %) gives satellites beside protons two to four bonds away"),
    (5, "10B and 11B split and broaden protons on boron into 1:1:1:1 patterns"),
)


def notes_on(
    drawn: Chem.Mol, solution: Solution, temperature_k: float | None
) -> tuple[str, ...]:
    """Notes on a structure in solution.

    Parameters
    ----------
    drawn : Chem.Mol
        Hydrogens implicit, as given.
    solution : Solution
    temperature_k : float, K, optional
    """
    return (
        *solution.notes,
        *_on_rotation(drawn, temperature_k),
        *_on_configuration(drawn),
        *_on_nuclei(drawn),
    )


def _on_rotation(drawn: Chem.Mol, temperature_k: float | None) -> Iterator[str]:
    kinds = sorted({bond.kind for bond in slow_bonds(drawn, temperature_k)})
    if kinds:
        yield (
            f"Rotation about the {' and '.join(kinds)} C-N bond is slow at this "
            "temperature; groups on its two sides are claimed apart."
        )
    merging = merging_barrier_kcal(temperature_k or ROOM_TEMPERATURE_K)
    near = sorted(
        {
            bond.kind
            for bond in turning_bonds(drawn)
            if abs(bond.barrier_kcal - merging) < _BROAD_KCAL
        }
    )
    if near:
        yield (
            f"Rotation of the {' and '.join(near)} is neither fast nor slow at this "
            "temperature; signals on its two sides may be broad or merged."
        )
    rotamers = Symmetry(drawn, temperature_k=temperature_k).rotamers()
    if rotamers:
        yield (
            f"The {' and '.join(rotamers)} may show two rotamers, that is, two sets of "
            "signals; one set is claimed."
        )


def _on_configuration(drawn: Chem.Mol) -> Iterator[str]:
    if open_centres(settled(drawn)):
        yield (
            "The drawing leaves stereocentres open; one configuration is taken for "
            "couplings, and geminal protons beside them are claimed apart."
        )


def _on_nuclei(drawn: Chem.Mol) -> Iterator[str]:
    numbers = {atom.GetAtomicNum() for atom in drawn.GetAtoms()}
    if numbers & _PARAMAGNETIC:
        yield "A metal that may be paramagnetic is drawn; its shifts cannot be foretold."
    if any(a.GetTotalNumHs() == 4 and a.GetFormalCharge() for a in drawn.GetAtoms()):
        yield (
            "NH4+ is a 1:1:1 triplet of 51 Hz by nitrogen-14 where it exchanges slowly; "
            "one line is claimed."
        )
    if any(a.GetIsotope() in (2, 3) for a in drawn.GetAtoms()):
        yield "Deuterium shows no 1H signal, and couplings to it are left out."
    for number, words in _SATELLITES:
        if number in numbers:
            yield f"{words}; they belong to the integral of their parent."
