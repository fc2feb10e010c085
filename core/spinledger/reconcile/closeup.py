"""A close view of the spectrum on which whole arrangements of claims are compared.

The claims are drawn from their exact lines at predicted couplings. Costs are in
units of the negative log likelihood by which fits are compared; shifts in ppm,
widths and steps in Hz.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy import fft

from spinledger.reconcile.beam import ABSENT, AMPLITUDE_LIMITS
from spinledger.reconcile.coarse import FloatArray, coarse_spectrum
from spinledger.reconcile.match import masked_by_hand
from spinledger.reconcile.options import Constraints
from spinledger.reconcile.search import (
    Search,
    prepare_search,
    species_share,
)
from spinledger.spins.clusters import QUICK_EFFORT
from spinledger.spins.network import ClaimNetwork
from spinledger.spins.plan import Plan
from spinledger.values.evidence import Evidence

# Wide enough to forgive J that are 1 Hz off, close enough to tell a doublet from
# a triplet.
CLOSE_HALF_WIDTH_HZ = 3.0
CLOSE_STEP_HZ = 1.0
# As the logarithm of the misfit weighs when fits are compared; the misfit is a
# square here.
MISFIT_WEIGHT = 7.5
LEAST_MISFIT = 4e-4
ROOM_HZ = 400.0
LARGEST_STEP_HZ = 4.0
DAMPING = 0.01


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Arrangement:
    """Places of all members, drawn exactly.

    Attributes
    ----------
    places : numpy.ndarray, shape (n_members,)
        In grid units; negative where a member shows no lines.
    images : numpy.ndarray, shape (n_members, n_points)
        Shape of each member at its place, area in protons.
    amplitudes : numpy.ndarray, shape (n_members,)
        Area of one proton of each member.
    residual : numpy.ndarray, shape (n_points,)
        Measured minus modelled.
    cost : float
    common : float
        Area of one proton.
    """

    places: FloatArray
    images: FloatArray
    amplitudes: FloatArray
    residual: FloatArray
    cost: float
    common: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class CloseUp:
    """The close view with everything that arrangements share.

    Attributes
    ----------
    search : Search
        Grid, weights and prior costs.
    network : ClaimNetwork
    couplings_hz : numpy.ndarray, shape (n_couplings,)
    shares : numpy.ndarray, shape (n_members,)
        Of each member's species.
    decay : numpy.ndarray
        Transform of the line shape.
    length : int
        Of the transforms.
    explain_all : float
        Weighted square of the whole spectrum.
    """

    search: Search
    network: ClaimNetwork
    couplings_hz: FloatArray
    shares: FloatArray
    decay: FloatArray
    length: int
    explain_all: float

    def places_of(self, shifts_ppm: FloatArray, gone: frozenset[int]) -> FloatArray:
        """Grid units of the members that show lines, ``ABSENT`` for the others."""
        coarse = self.search.coarse
        members = np.array(self.search.members)
        places = (shifts_ppm[members] - coarse.grid_ppm[0]) * coarse.points_per_ppm
        places = np.clip(places, 0.0, coarse.n_points - 1.0)
        shown = np.array([claim not in gone for claim in self.search.members])
        return np.where(shown, places, ABSENT)

    def shifts_of(self, places: FloatArray, before_ppm: FloatArray) -> FloatArray:
        """Shifts of all claims; those that show no lines as before."""
        coarse = self.search.coarse
        shifts = np.array(before_ppm)
        for claim, place in zip(self.search.members, places.tolist(), strict=True):
            if place >= 0:
                shifts[claim] = coarse.grid_ppm[0] + place / coarse.points_per_ppm
        return shifts

    def plan(self, places: FloatArray) -> Plan:
        """Solving plan of the network near some places."""
        shifts_hz, gone = self._drawn_at(places)
        return self.network.plan(
            shifts_hz, self.couplings_hz, without=gone, effort=QUICK_EFFORT
        )

    def arrange(self, places: FloatArray, plan: Plan) -> Arrangement:
        """Draw members near their places and fit places and areas.

        One step of least squares moves every member by a few Hz; it is taken
        where it helps.
        """
        first = self._drawn(places, plan)
        second = self._drawn(self._settled(first), plan)
        return second if second.cost < first.cost else first

    def _drawn(self, places: FloatArray, plan: Plan) -> Arrangement:
        images = self._images(places, plan)
        amplitudes, common = self._areas(images, places)
        search = self.search
        residual = search.coarse.intensities - amplitudes @ images
        cost = self.misfit_cost(residual) + self._fixed_cost(places, amplitudes, common)
        return Arrangement(
            places=places,
            images=images,
            amplitudes=amplitudes,
            residual=residual,
            cost=cost,
            common=common,
        )

    def _settled(self, now: Arrangement) -> FloatArray:
        """Places after one damped step of least squares."""
        shown = np.flatnonzero(now.places >= 0)
        drawn = now.amplitudes[shown, None] * now.images[shown]
        slopes = -np.gradient(drawn, axis=1)
        weighted = slopes * self.search.weights
        normal = weighted @ slopes.T
        damping = DAMPING * float(np.trace(normal)) / max(shown.size, 1)
        normal[np.diag_indices(shown.size)] += damping + 1e-300
        steps = np.linalg.solve(normal, weighted @ now.residual)
        limit = LARGEST_STEP_HZ / self.search.coarse.step_hz
        places = np.array(now.places)
        places[shown] += np.clip(steps, -limit, limit)
        places[shown] = np.clip(places[shown], 0.0, self.search.coarse.n_points - 1.0)
        return places

    def misfit_cost(self, residual: FloatArray) -> float:
        """Cost of what is left of the spectrum."""
        left = float((self.search.weights * residual**2).sum()) / self.explain_all
        return MISFIT_WEIGHT * float(np.log(max(left, LEAST_MISFIT)))

    def _drawn_at(self, places: FloatArray) -> tuple[FloatArray, frozenset[int]]:
        """Shifts of all claims, Hz, and the claims that show no lines."""
        listed = self.network.claims.claims
        predicted = np.array([claim.shift_ppm for claim in listed])
        shifts_hz = self.shifts_of(places, predicted) * self.search.coarse.frequency_mhz
        shown = {
            claim
            for claim, place in zip(self.search.members, places.tolist(), strict=True)
            if place >= 0
        }
        return shifts_hz, frozenset(range(len(listed))) - shown

    def _images(self, places: FloatArray, plan: Plan) -> FloatArray:
        """Exact lines of every member under the broad line shape."""
        coarse = self.search.coarse
        shifts_hz, _ = self._drawn_at(places)
        lines = self.network.lines(shifts_hz, self.couplings_hz, plan=plan)
        points = lines.frequencies_hz - coarse.grid_ppm[0] * coarse.frequency_mhz
        points = np.clip(points / coarse.step_hz, 0.0, coarse.n_points - 2.0)
        below = points.astype(np.int64)
        above = (points - below) * lines.protons
        drawn = np.zeros((len(self.search.members), self.length))
        for member, claim in enumerate(self.search.members):
            own = lines.claim == claim
            if places[member] < 0 or not own.any():
                continue
            where = below[own]
            low = np.bincount(where, lines.protons[own] - above[own], self.length)
            high = np.bincount(where + 1, above[own], self.length)
            drawn[member] = (low + high) * self.shares[member]
        smooth = fft.irfft(fft.rfft(drawn) * self.decay, self.length)
        return np.asarray(smooth[:, : coarse.n_points] / coarse.step_hz)

    def _areas(
        self, images: FloatArray, places: FloatArray
    ) -> tuple[FloatArray, float]:
        """Area of one proton of each member, about the common one."""
        search = self.search
        weighted = images * search.weights
        products = weighted @ images.T
        support = weighted @ search.coarse.intensities
        sure = (places >= 0) & (search.skip_costs > search.skip_costs.min())
        sure = sure if sure.any() else places >= 0
        whole = float(products[np.ix_(sure, sure)].sum())
        common = float(support[sure].sum()) / max(whole, 1e-300)
        common = max(common, 1e-3 * search.area_per_proton)
        stiffness = 0.5 / (search.amplitude_sds * common) ** 2
        held = products + np.diag(stiffness)
        amplitudes = np.linalg.solve(held, support + stiffness * common)
        low, high = AMPLITUDE_LIMITS
        limited = np.clip(amplitudes, low * common, high * common)
        return np.where(places >= 0, limited, 0.0), common

    def _fixed_cost(
        self, places: FloatArray, amplitudes: FloatArray, common: float
    ) -> float:
        """Cost of shifts, areas and members that show no lines."""
        shown = places >= 0
        ratios = amplitudes[shown] / common - 1.0
        cost = 0.5 * float(np.square(ratios / self.search.amplitude_sds[shown]).sum())
        nearest = np.rint(places[shown]).astype(np.int64)
        cost += float(self.search.priors[shown, nearest].sum())
        return cost + float(self.search.skip_costs[~shown].sum())


def close_up(
    evidence: Evidence,
    network: ClaimNetwork,
    couplings_hz: FloatArray,
    *,
    offset_ppm: float,
    line_width_hz: float,
    constraints: Constraints | None = None,
) -> CloseUp:
    """Prepare the close view of a spectrum for one claim set.

    Parameters
    ----------
    evidence : Evidence
    network : ClaimNetwork
    couplings_hz : numpy.ndarray, shape (n_couplings,)
    offset_ppm : float, ppm
        Common error of the reference that the match found.
    line_width_hz : float, Hz
        Natural full width at half maximum.
    constraints : Constraints, optional
    """
    view = coarse_spectrum(
        evidence,
        masked_by_hand(constraints),
        hwhm_hz=CLOSE_HALF_WIDTH_HZ,
        step_hz=CLOSE_STEP_HZ,
    )
    claims = network.claims
    search = prepare_search(
        view,
        claims,
        couplings_hz=couplings_hz,
        offset_ppm=offset_ppm,
        constraints=constraints,
    )
    room = int(ROOM_HZ / view.step_hz)
    length = fft.next_fast_len(view.n_points + room, real=True)
    times_s = np.arange(length // 2 + 1) / (length * view.step_hz)
    hwhm_hz = view.hwhm_hz + 0.5 * line_width_hz
    return CloseUp(
        search=search,
        network=network,
        couplings_hz=couplings_hz,
        shares=np.array([species_share(claims, i) for i in search.members]),
        decay=np.exp(-2.0 * np.pi * hwhm_hz * times_s),
        length=length,
        explain_all=float((search.weights * view.intensities**2).sum()),
    )


def without(arrangement: Arrangement, members: Sequence[int]) -> FloatArray:
    """Residual after some members were taken out of the model."""
    rows = list(members)
    return np.asarray(
        arrangement.residual + arrangement.amplitudes[rows] @ arrangement.images[rows]
    )
