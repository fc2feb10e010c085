"""What bridged rings do to vicinal couplings beyond the Karplus curve, in Hz."""

from __future__ import annotations

import numpy as np

from spinledger.prediction.couplings.frame import Frame

#: Bicyclo[2.2.1]heptanes: endo protons couple less with each other than exo
#: ones at the same angle, and bridgeheads less with both.
_ENDO_ENDO_HZ = -2.7
_BRIDGEHEAD_HZ = -1.3
#: Exo protons lie about 2.7 Angstrom from the one-atom bridge, endo ones 3.3.
_EXO_LIMIT_ANGSTROM = 3.05


def bridging_effect_hz(frame: Frame, first: int, second: int) -> float:
    """Correction of an HLA value in a bicyclo[2.2.1] skeleton; 0 elsewhere.

    Parameters
    ----------
    frame : Frame
        With conformers.
    first, second : int
        Vicinal protons.

    References
    ----------
    .. [1] A. P. Marchand, Stereochemical Applications of NMR Studies in Rigid
       Bicyclic Systems, VCH 1982; values from memory.
    """
    a, b = frame.carrier(first), frame.carrier(second)
    ring = frame.ring_with(a, b) or ()
    if not frame.is_bridged(ring):
        return 0.0
    if any(_is_bridgehead(frame, carbon) for carbon in (a, b)):
        return _BRIDGEHEAD_HZ
    opposite = [i for i in ring if not {a, b} & {i, *frame.others(i)}]
    if len(opposite) != 1:
        return 0.0
    is_endo = [
        _distance(frame, h, opposite[0]) > _EXO_LIMIT_ANGSTROM for h in (first, second)
    ]
    return _ENDO_ENDO_HZ if all(is_endo) else 0.0


def _is_bridgehead(frame: Frame, carbon: int) -> bool:
    """Shared by two rings that also share two more atoms."""
    mine = [set(ring) for ring in frame.rings if carbon in ring]
    bonds_in_rings = sum(frame.ring_size(carbon, n) > 0 for n in frame.others(carbon))
    return len(mine) > 1 and bonds_in_rings > 2


def _distance(frame: Frame, first: int, second: int) -> float:
    positions = frame.conformers.positions
    apart = np.linalg.norm(positions[:, first] - positions[:, second], axis=1)
    return float(frame.conformers.weights @ apart)
