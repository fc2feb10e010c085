"""Where the two unlike protons of one carbon stand about their mean; ppm."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

from rdkit import Chem

from spinledger.prediction.shifts_alkene import cis_trans_difference_ppm
from spinledger.structure.stereo_elements import TerminalAlkene, terminal_alkenes
from spinledger.structure.topicity import ProtonGroup

# Half the typical distance of two diastereotopic protons, and its sd.
_HALF_GAP_PPM: Final = 0.08
_HALF_GAP_SD_PPM: Final = 0.10
# Error of a difference of two alkene increments.
_ALKENE_SD_PPM: Final = 0.12


def pair_offsets(
    mol: Chem.Mol, groups: Sequence[ProtonGroup]
) -> tuple[tuple[float, float], ...]:
    """Offset from the mean of the carbon, and what it adds to the sd, for each group.

    Parameters
    ----------
    mol : Chem.Mol
        Settled, hydrogens implicit.
    groups : sequence of ProtonGroup

    Returns
    -------
    tuple of (float, float), ppm
        (0, 0) for groups without a partner on the same carbon.

    Notes
    -----
    Of C=CH2 the increments tell which proton is which. Of a saturated CH2 the
    order is open: the first of the two gets the higher shift, and both orders
    are for the match to try.
    """
    ends = {end.outer: end for end in terminal_alkenes(mol)}
    return tuple(_offset(mol, groups, index, ends) for index in range(len(groups)))


def _offset(
    mol: Chem.Mol,
    groups: Sequence[ProtonGroup],
    index: int,
    ends: dict[int, TerminalAlkene],
) -> tuple[float, float]:
    group = groups[index]
    if len(group.partners) != 1:
        return 0.0, 0.0
    end = ends.get(group.carriers[0])
    if end is not None:
        difference = cis_trans_difference_ppm(mol, end.inner, end.cis, end.trans)
        if difference is not None:
            other = groups[group.partners[0]]
            is_first = min(group.hydrogens) < min(other.hydrogens)
            return (difference if is_first else -difference) / 2, _ALKENE_SD_PPM
    sign = 1.0 if index < group.partners[0] else -1.0
    return sign * _HALF_GAP_PPM, _HALF_GAP_SD_PPM
