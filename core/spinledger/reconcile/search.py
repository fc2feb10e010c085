"""What is fixed during one beam search: shapes, priors, weights, transforms.

Costs are in units of a negative log likelihood; shifts in ppm, steps in Hz.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import fft

from spinledger.reconcile.coarse import (
    CoarseSpectrum,
    FloatArray,
    coarse_shape,
    first_order_sticks,
)
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.side_costs import hsqc_prior
from spinledger.values.claim import Claim, ClaimSet

ComplexArray = npt.NDArray[np.complex128]

EXPLAIN_ALL_COST = 60.0
SHIFT_FREEDOM = 4.0
SKIP_OPTIONAL_COST = 1.5
SKIP_SEEN_COST = 14.0
AMPLITUDE_SD = 0.15
AMPLITUDE_SD_OPTIONAL = 0.6
FLOOR_SHARE = 0.15
SHAPE_MARGIN_HZ = 60.0
FORBIDDEN_COST = 1e6
HIDDEN_REACH_SD = 2.5


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Search:
    """Everything fixed during one beam search over ``n`` grid points.

    Attributes
    ----------
    coarse : CoarseSpectrum
    members : tuple of int
        Claim index of each searched claim, in the order of the search.
    shapes : tuple of numpy.ndarray
        Shape of each searched claim on -half..half points, area in protons.
    priors : numpy.ndarray, shape (n_members, n)
        Cost of each place by the predicted shift alone.
    skip_costs, amplitude_sds : numpy.ndarray, shape (n_members,)
    weights : numpy.ndarray, shape (n,)
        Such that the weighted square of the whole spectrum is the cost of
        explaining nothing.
    area_per_proton : float
    shape_transforms, square_transforms : numpy.ndarray, shape (n_members, m)
    length : int
        Of the transforms.
    half_points : int
    kinds : tuple of int
        Equal for claims whose shape and proton count look alike.
    """

    coarse: CoarseSpectrum
    members: tuple[int, ...]
    shapes: tuple[FloatArray, ...]
    priors: FloatArray
    skip_costs: FloatArray
    amplitude_sds: FloatArray
    weights: FloatArray
    area_per_proton: float
    shape_transforms: ComplexArray
    square_transforms: ComplexArray
    overlap: FloatArray
    length: int
    half_points: int
    kinds: tuple[int, ...]


def shift_cost(z: FloatArray) -> FloatArray:
    """Student t cost, four degrees of freedom, of a shift residual in sd."""
    return np.asarray(
        0.5 * (SHIFT_FREEDOM + 1.0) * np.log1p(np.square(z) / SHIFT_FREEDOM)
    )


def prepare_search(
    coarse: CoarseSpectrum,
    claims: ClaimSet,
    *,
    couplings_hz: FloatArray,
    offset_ppm: float = 0.0,
    area_scale: float = 1.0,
    constraints: Constraints | None = None,
) -> Search:
    """Shapes, priors and transforms of one search.

    Parameters
    ----------
    coarse : CoarseSpectrum
    claims : ClaimSet
    couplings_hz : numpy.ndarray, shape (n_couplings,), Hz
        Taken for the shapes.
    offset_ppm : float, ppm
        Added to every predicted shift (error of the reference).
    area_scale : float
        Of one proton, relative to area over protons claimed.
    constraints : Constraints, optional
        Pins limit the places of a claim.
    """
    order = _search_order(claims.claims)
    sticks = first_order_sticks(claims, couplings_hz)
    widest_hz = max((float(np.abs(sticks[i][0]).max()) for i in order), default=0.0)
    half_points = int((widest_hz + SHAPE_MARGIN_HZ) / coarse.step_hz)
    shares = [species_share(claims, index) for index in order]
    shapes = tuple(
        coarse_shape(
            sticks[index], half_points, hwhm_hz=coarse.hwhm_hz, step_hz=coarse.step_hz
        )
        * share
        for index, share in zip(order, shares, strict=True)
    )
    length = fft.next_fast_len(coarse.n_points + 2 * half_points + 2, real=True)
    transforms = np.array([np.conj(fft.rfft(shape, length)) for shape in shapes])
    squares = np.array([np.conj(fft.rfft(shape**2, length)) for shape in shapes])
    area_per_proton = area_scale * coarse.area() / max(_counted(claims, order), 0.5)
    weights = _weights(coarse, coarse.area() / max(_counted(claims, order), 0.5))
    listed = [claims.claims[index] for index in order]
    overlap = correlate(weights[None, :], squares, length, half_points)
    return Search(
        coarse=coarse,
        members=tuple(order),
        shapes=shapes,
        priors=_priors(coarse, listed, offset_ppm, constraints),
        skip_costs=np.array([_skip_cost(claim, constraints) for claim in listed]),
        amplitude_sds=np.array([_amplitude_sd(claim, claims) for claim in listed]),
        weights=weights,
        area_per_proton=area_per_proton,
        shape_transforms=transforms,
        square_transforms=squares,
        overlap=overlap,
        length=length,
        half_points=half_points,
        kinds=_kinds(shapes),
    )


def _search_order(claims: tuple[Claim, ...]) -> list[int]:
    """Sure and large claims first, those that may be absent last."""
    searched = [i for i, claim in enumerate(claims) if claim.visibility != "silent"]
    return sorted(
        searched,
        key=lambda i: (
            claims[i].visibility == "optional",
            -claims[i].n_protons / (claims[i].shift_sd_ppm + 0.05),
            i,
        ),
    )


def species_share(claims: ClaimSet, index: int) -> float:
    """Expected share of a claim's species in the tube."""
    species = claims.claims[index].species
    if species < len(claims.species_shares):
        return max(claims.species_shares[species][0], 0.01)
    return 1.0


def _counted(claims: ClaimSet, order: list[int]) -> float:
    """Protons expected to be seen; those that may be absent count half."""
    return sum(
        claims.claims[i].n_protons
        * species_share(claims, i)
        * (0.5 if claims.claims[i].visibility == "optional" else 1.0)
        for i in order
    )


def _weights(coarse: CoarseSpectrum, area_per_proton: float) -> FloatArray:
    """Weight of a squared residual: proportional noise with a floor."""
    top = area_per_proton / (np.pi * coarse.hwhm_hz)
    floor = FLOOR_SHARE * top + 3.0 * coarse.noise_sd
    raw = coarse.trust / (coarse.intensities + floor)
    total = float((raw * coarse.intensities**2).sum())
    return raw * (EXPLAIN_ALL_COST / max(total, 1e-300))


def _priors(
    coarse: CoarseSpectrum,
    listed: list[Claim],
    offset_ppm: float,
    constraints: Constraints | None,
) -> FloatArray:
    rows = []
    for claim in listed:
        gap_ppm = coarse.grid_ppm - claim.shift_ppm - offset_ppm
        z = gap_ppm / max(claim.shift_sd_ppm, 0.02)
        # Nothing can hide under a mask where it is not expected.
        far_under_mask = (coarse.trust < 0.5) & (np.abs(z) > HIDDEN_REACH_SD)
        cost = np.where(far_under_mask, FORBIDDEN_COST, shift_cost(z))
        if constraints and not claim.is_exchangeable:
            cost = cost + hsqc_prior(constraints.side, coarse.grid_ppm)
        for pin in constraints.pins if constraints else ():
            if pin.claim == claim.label:
                outside = (coarse.grid_ppm < pin.low_ppm) | (
                    coarse.grid_ppm > pin.high_ppm
                )
                cost = np.where(outside, FORBIDDEN_COST, 0.0)
        if constraints and claim.label in constraints.absent:
            cost = np.full_like(cost, FORBIDDEN_COST)
        rows.append(cost)
    return np.array(rows).reshape(len(listed), coarse.n_points)


def _skip_cost(claim: Claim, constraints: Constraints | None) -> float:
    if constraints and claim.label in constraints.absent:
        return 0.0
    if constraints and any(pin.claim == claim.label for pin in constraints.pins):
        return FORBIDDEN_COST
    return SKIP_OPTIONAL_COST if claim.visibility == "optional" else SKIP_SEEN_COST


def _amplitude_sd(claim: Claim, claims: ClaimSet) -> float:
    if claim.visibility == "optional":
        return AMPLITUDE_SD_OPTIONAL
    if claim.species < len(claims.species_shares):
        share, share_sd = claims.species_shares[claim.species]
        return float(np.hypot(AMPLITUDE_SD, share_sd / max(share, 0.01)))
    return AMPLITUDE_SD


def _kinds(shapes: tuple[FloatArray, ...]) -> tuple[int, ...]:
    """Number the shapes so that look-alikes (within 15 % of area) share one."""
    kinds: list[int] = []
    for number, shape in enumerate(shapes):
        alike = [
            kinds[other]
            for other in range(number)
            if np.abs(shapes[other] - shape).sum() < 0.15 * shape.sum()
        ]
        kinds.append(alike[0] if alike else number)
    return tuple(kinds)


def correlate(
    rows: FloatArray, transforms: ComplexArray, length: int, half_points: int
) -> FloatArray:
    """Sum over j of row[i + j - half] * shape[j], for one row or one shape."""
    n_points = rows.shape[1]
    padded = np.zeros((rows.shape[0], length))
    padded[:, half_points : half_points + n_points] = rows
    return np.asarray(fft.irfft(fft.rfft(padded) * transforms, length)[:, :n_points])
