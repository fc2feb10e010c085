"""Which rule speaks for a pair of nuclei; values in Hz."""

from __future__ import annotations

from spinledger.prediction.couplings import alkene
from spinledger.prediction.couplings.aromatic import aromatic, benzylic
from spinledger.prediction.couplings.estimate import Estimate
from spinledger.prediction.couplings.exchangeable import hetero_vicinal
from spinledger.prediction.couplings.fluorine import fluorine
from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.geminal import geminal
from spinledger.prediction.couplings.longrange import zigzag
from spinledger.prediction.couplings.phosphorus import phosphorus
from spinledger.prediction.couplings.vicinal import vicinal

#: Six only for methyl groups para on an aromatic ring.
MOST_BONDS = 6


def estimate_pair(frame: Frame, first: int, second: int) -> Estimate | None:
    """Predicted coupling of two nuclei, None where no rule expects one.

    Parameters
    ----------
    frame : Frame
    first, second : int
        Atoms; at least one of them a hydrogen.
    """
    elements = frame.element(first), frame.element(second)
    if elements == (1, 1):
        return _between_protons(frame, first, second)
    if elements[0] != 1:
        first, second = second, first
    hetero = max(elements)
    if min(elements) != 1:
        return None
    if hetero == 9:
        return fluorine(frame, first, second)
    return phosphorus(frame, first, second) if hetero == 15 else None


def _between_protons(frame: Frame, first: int, second: int) -> Estimate | None:
    n_bonds = frame.n_bonds(first, second)
    if n_bonds == 2:
        return geminal(frame, frame.carrier(first))
    if n_bonds == 3:
        return _three_bonds(frame, first, second)
    if not 4 <= n_bonds <= MOST_BONDS:
        return None
    return (
        aromatic(frame, first, second)
        or benzylic(frame, first, second)
        or _through_bonds(frame, first, second, n_bonds)
    )


def _three_bonds(frame: Frame, first: int, second: int) -> Estimate | None:
    a, b = frame.carrier(first), frame.carrier(second)
    ring = aromatic(frame, first, second)
    if ring is not None:
        return ring
    if not frame.element(a) == frame.element(b) == 6:
        return hetero_vicinal(frame, first, second)
    if frame.bond_order(a, b) == 2:
        return alkene.across_double_bond(frame, first, second)
    if frame.is_sp3_carbon(a) and frame.is_sp3_carbon(b):
        return vicinal(frame, first, second)
    return alkene.next_to_double_bond(frame, first, second)


def _through_bonds(
    frame: Frame, first: int, second: int, n_bonds: int
) -> Estimate | None:
    carriers = frame.carrier(first), frame.carrier(second)
    if any(frame.element(carrier) != 6 for carrier in carriers):
        return None
    if n_bonds == 4:
        through = alkene.four_bonds(frame, first, second)
        return through or zigzag(frame, first, second)
    return alkene.five_bonds(frame, first, second) if n_bonds == 5 else None
