"""Where two groups that differ by their place in space stand about their mean; ppm."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Final

from rdkit import Chem

from spinledger.prediction.shifts import ShiftPrediction
from spinledger.prediction.shifts_alkene import cis_trans_difference_ppm
from spinledger.prediction.shifts_rotation import formamide_sign, rotation_gap_ppm
from spinledger.structure.mobility import slow_bonds
from spinledger.structure.stereo_elements import (
    TerminalAlkene,
    stereo_elements,
    terminal_alkenes,
)
from spinledger.structure.topicity import ProtonGroup
from spinledger.structure.vantage import axial_preferences

# Where increments say less than this, they do not tell which proton is which.
_LEAST_DIFFERENCE_PPM: Final = 0.03
# Excess of the axial place from which on the equatorial proton is the lower field one.
_LEAST_PREFERENCE: Final = 0.3
# The two NH of primary amides (acetamide in DMSO-d6: 7.30 and 6.70; from memory).
_AMIDE_NH2_PPM: Final = 0.5
_AMIDE_NH2_SD_PPM: Final = 0.3
_ALONE: Final = (0.0, 0.0)


def pair_offsets(
    mol: Chem.Mol,
    groups: Sequence[ProtonGroup],
    predicted: Mapping[int, ShiftPrediction],
    *,
    temperature_k: float | None = None,
) -> tuple[tuple[float, float], ...]:
    """Offset from the mean of the carbon, and what it adds to the sd, for each group.

    Parameters
    ----------
    mol : Chem.Mol
        Settled, hydrogens implicit.
    groups : sequence of ProtonGroup
    predicted : mapping of int to ShiftPrediction
        By carrier.
    temperature_k : float, K, optional
        Decides which amide bonds are slow.

    Returns
    -------
    tuple of (float, float), ppm
        (0, 0) for groups without an unlike twin.

    Notes
    -----
    Twins are two groups on the same carbon, or two groups of the same constitution
    (methyls of an isopropyl beside a stereocentre, the two sides of a slow amide).
    Of C=CH2 the increments tell which proton is which; of a ring CH2 held in one
    chair the equatorial proton gets the higher shift, as it has in nearly all
    cyclohexanes [1]_. Of the others the order is open: the first gets the higher
    shift, and both orders are for the match to try. The sd that is added is the
    doubt about half the distance.

    References
    ----------
    .. [1] E. W. Garbisch, M. G. Griffith, J. Am. Chem. Soc. 90 (1968) 6543-6544,
       doi:10.1021/ja01025a069: 0.48 ppm in cyclohexane itself.
    """
    maker = _Offsets(mol, groups, predicted, temperature_k)
    return tuple(maker.of(index) for index in range(len(groups)))


@dataclass(frozen=True, slots=True, kw_only=True)
class _Gap:
    """Distance of two twins and its sd, ppm."""

    size_ppm: float
    sd_ppm: float


class _Offsets:
    """Offsets of the groups of one molecule."""

    def __init__(
        self,
        mol: Chem.Mol,
        groups: Sequence[ProtonGroup],
        predicted: Mapping[int, ShiftPrediction],
        temperature_k: float | None,
    ) -> None:
        self.mol = mol
        self.groups = groups
        self.predicted = predicted
        self.ends = {end.outer: end for end in terminal_alkenes(mol)}
        self.twins = _twins(mol, groups)
        self.slow = slow_bonds(mol, temperature_k)
        self.links = stereo_elements(mol, temperature_k).links
        self.preferences = axial_preferences(mol, groups)

    def of(self, index: int) -> tuple[float, float]:
        """Offset and added sd of one group."""
        twin = self.twins.get(index)
        gap = None if twin is None else self._gap(index, twin)
        if twin is None or gap is None:
            return _ALONE
        sign = self._sign(index, twin) or (1.0 if index < twin else -1.0)
        return sign * gap.size_ppm / 2, gap.sd_ppm / 2

    def _gap(self, index: int, twin: int) -> _Gap | None:
        mine, other = self.groups[index].carriers[0], self.groups[twin].carriers[0]
        if mine != other:
            found = rotation_gap_ppm(self.mol, self.slow, (mine, other))
            if found is not None:
                return _Gap(size_ppm=found[0], sd_ppm=found[1])
        known = self.predicted.get(mine)
        if known is None:
            return self._amide_gap(mine)
        factor = known.gap_factor
        spread = known.gap_ppm * (factor - 1.0 / factor) / 2
        return _Gap(size_ppm=known.gap_ppm, sd_ppm=spread)

    def _amide_gap(self, nitrogen: int) -> _Gap | None:
        """Of the two protons of an amide NH2."""
        if any(bond.atoms[1] == nitrogen for bond in self.slow):
            return _Gap(size_ppm=_AMIDE_NH2_PPM, sd_ppm=_AMIDE_NH2_SD_PPM)
        return None

    def _sign(self, index: int, twin: int) -> float | None:
        """+1 or -1 where it is known which of two twins stands at lower field."""
        group = self.groups[index]
        end = self.ends.get(group.carriers[0])
        if end is not None:
            return _alkene_sign(self.mol, end, group, self.groups[twin])
        of_formamide = formamide_sign(self.mol, self.links, group.carriers[0])
        if of_formamide is not None:
            return of_formamide
        preference = self.preferences.get(index, 0.0)
        if abs(preference) >= _LEAST_PREFERENCE:
            return -1.0 if preference > 0 else 1.0
        return None


def _twins(mol: Chem.Mol, groups: Sequence[ProtonGroup]) -> dict[int, int]:
    """The one other group that differs from a group by its place in space only."""
    ranks = list(Chem.CanonicalRankAtoms(mol, breakTies=False, includeChirality=False))
    found: dict[int, int] = {}
    alike: dict[tuple[int, ...], list[int]] = defaultdict(list)
    for index, group in enumerate(groups):
        if len(group.partners) == 1:
            found[index] = group.partners[0]
        else:
            alike[tuple(sorted({ranks[i] for i in group.carriers}))].append(index)
    for members in alike.values():
        if len(members) == 2:
            found[members[0]], found[members[1]] = members[1], members[0]
    return found


def _alkene_sign(
    mol: Chem.Mol, end: TerminalAlkene, group: ProtonGroup, other: ProtonGroup
) -> float | None:
    """+1 where increments put a proton of C=CH2 above the other, None if they do not."""
    difference = cis_trans_difference_ppm(mol, end.inner, end.cis, end.trans)
    if difference is None or abs(difference) < _LEAST_DIFFERENCE_PPM:
        return None
    is_first = min(group.hydrogens) < min(other.hydrogens)
    return 1.0 if (difference > 0) == is_first else -1.0
