"""Karplus-type equation with group electronegativities; angles in degrees, J in Hz."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.substituents import electronegativity

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class ParameterSet:
    """Seven parameters of the Haasnoot-de Leeuw-Altona equation.

    Attributes
    ----------
    p1, p2, p3, p4, p5 : float, Hz
    p6_deg : float, degrees
    """

    p1: float
    p2: float
    p3: float
    p4: float
    p5: float
    p6_deg: float


#: Set for the lambda scale of group electronegativities, Altona et al. 1994.
LAMBDA_SET = ParameterSet(p1=14.63, p2=-0.78, p3=0.60, p4=0.34, p5=-2.31, p6_deg=18.4)


def vicinal_hz(
    angle_deg: npt.ArrayLike,
    substituents: Sequence[tuple[float, npt.ArrayLike]],
    parameters: ParameterSet = LAMBDA_SET,
) -> Floats:
    """Coupling of two vicinal protons on saturated carbons.

    Parameters
    ----------
    angle_deg : array_like, shape (...), degrees
        Dihedral angle H-C-C-H.
    substituents : sequence of (electronegativity, orientation)
        Relative to hydrogen; orientation +1 or -1, shape (...).
    parameters : ParameterSet

    Returns
    -------
    numpy.ndarray, shape (...), Hz

    Notes
    -----
    J = P1 cos2(phi) + P2 cos(phi) + P3
    + sum_i x_i (P4 + P5 cos2(xi_i phi + P6 abs(x_i))).

    References
    ----------
    .. [1] C. A. G. Haasnoot, F. A. A. M. de Leeuw, C. Altona, Tetrahedron 36
       (1980) 2783-2792, doi:10.1016/0040-4020(80)80155-4.
    .. [2] C. Altona et al., Magn. Reson. Chem. 32 (1994) 670-678,
       doi:10.1002/mrc.1260321107; parameters from memory.
    """
    angle = np.asarray(angle_deg, dtype=np.float64)
    cosine = np.cos(np.radians(angle))
    total = parameters.p1 * cosine**2 + parameters.p2 * cosine + parameters.p3
    for strength, orientation in substituents:
        turned = np.asarray(orientation) * angle + parameters.p6_deg * abs(strength)
        squared = np.cos(np.radians(turned)) ** 2
        total = total + strength * (parameters.p4 + parameters.p5 * squared)
    return np.asarray(total)


def freely_rotating_hz(total_electronegativity: float) -> float:
    """Mean of the equation over three staggered rotamers of a methyl group.

    The squared cosines of three angles 120 degrees apart average to one half
    and the cosines to zero, so that only the sum of the electronegativities
    of the other carbon's substituents is left.
    """
    s = LAMBDA_SET
    return s.p1 / 2 + s.p3 + total_electronegativity * (s.p4 + s.p5 / 2)


def vicinal_over_conformers_hz(
    frame: Frame, first: int, a: int, b: int, second: int
) -> Floats:
    """Coupling first-a-b-second in every conformer, shape (n_conformers,), Hz.

    Parameters
    ----------
    frame : Frame
        With a non-empty ensemble.
    first, second : int
        Hydrogens on carbons ``a`` and ``b``.
    """
    angle = frame.dihedral_deg(first, a, b, second)
    substituents = [
        (
            electronegativity(frame, atom, a),
            _orientation(frame.dihedral_deg(atom, a, b, second), angle),
        )
        for atom in frame.others(a, b)
    ]
    substituents += [
        (
            electronegativity(frame, atom, b),
            _orientation(frame.dihedral_deg(atom, b, a, first), angle),
        )
        for atom in frame.others(b, a)
    ]
    return vicinal_hz(angle, substituents)


def _orientation(substituent_deg: Floats, angle_deg: Floats) -> Floats:
    """+1 for a substituent clockwise of the coupled proton on its carbon, else -1."""
    turned = (substituent_deg - angle_deg + 180.0) % 360.0 - 180.0
    return np.where(turned < 0, 1.0, -1.0)
