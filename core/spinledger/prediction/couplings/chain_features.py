"""Numbers that describe a bond between two saturated carbons, from the graph alone."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.substituents import electronegativity

Floats = npt.NDArray[np.float64]


def bond_features(frame: Frame, a: int, b: int) -> Floats:
    """Features of the bond a-b, the same for b-a.

    Parameters
    ----------
    frame : Frame
    a, b : int
        Saturated carbons.

    Returns
    -------
    numpy.ndarray, shape (n_features,)
        Sum and absolute difference of the two ends, then the bond itself.
    """
    first, second = _end(frame, a, b), _end(frame, b, a)
    return np.concatenate([first + second, np.abs(first - second), _bond(frame, a, b)])


def _end(frame: Frame, carbon: int, other: int) -> Floats:
    substituents = frame.others(carbon, other)
    strengths = [electronegativity(frame, s, carbon) for s in substituents]
    elements = [frame.element(s) for s in substituents]
    beyond = [n for s in substituents for n in frame.others(s, carbon)]
    return np.array(
        [
            sum(strengths),
            max(strengths, default=0.0),
            len(substituents),
            elements.count(8),
            elements.count(7),
            elements.count(16) + elements.count(34),
            sum(element in (9, 17, 35, 53) for element in elements),
            sum(_is_unsaturated_carbon(frame, s) for s in substituents),
            sum(frame.is_aromatic(s) for s in substituents),
            sum(frame.atom(s).GetFormalCharge() for s in substituents),
            sum(frame.atom(n).GetFormalCharge() for n in beyond),
            len(beyond),
            sum(frame.atom(s).IsInRing() for s in substituents),
            frame.n_hydrogens(carbon),
            sum(frame.is_sp3_carbon(s) for s in substituents),
            sum(frame.is_sp2_carbon(s) for s in substituents),
            sum(_is_ionic_group(frame, s, carbon) for s in substituents),
            sum(len(frame.others(n)) - 1 for n in beyond),
        ],
        dtype=np.float64,
    )


def _is_ionic_group(frame: Frame, atom: int, carbon: int) -> bool:
    """Ammonium, or a group with a negative end such as carboxylate."""
    if frame.atom(atom).GetFormalCharge():
        return True
    return any(frame.atom(n).GetFormalCharge() < 0 for n in frame.others(atom, carbon))


def _is_unsaturated_carbon(frame: Frame, index: int) -> bool:
    return frame.element(index) == 6 and not frame.is_sp3_carbon(index)


def _bond(frame: Frame, a: int, b: int) -> Floats:
    ring = frame.ring_with(a, b) or ()
    counts = frame.n_hydrogens(a), frame.n_hydrogens(b)
    return np.array(
        [
            len(ring),
            sum(a in other and b in other for other in frame.rings),
            sum(frame.element(i) != 6 for i in ring),
            sum(not frame.is_sp3_carbon(i) and frame.element(i) == 6 for i in ring),
            min(counts),
            max(counts),
        ],
        dtype=np.float64,
    )
