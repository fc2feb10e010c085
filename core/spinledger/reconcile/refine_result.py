"""From the last evaluation to the result: precision, determinacy, residuals."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from spinledger.reconcile.refine_data import PreparedEvidence
from spinledger.reconcile.refine_measures import residuals_of, score_of
from spinledger.reconcile.refine_model import Evaluation, Layout, Problem
from spinledger.reconcile.refine_steps import Descent
from spinledger.reconcile.refine_values import (
    KnownSum,
    Refinement,
    Residuals,
    Start,
)
from spinledger.spins.network import ClaimNetwork
from spinledger.spins.synthesis import LineList, LineShape, add_to, draw
from spinledger.values.claim import ClaimSet
from spinledger.values.ledger import ClaimLines

Floats = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Outcome:
    """A finished descent with what is needed to report it."""

    prepared: PreparedEvidence
    network: ClaimNetwork
    problem: Problem
    descent: Descent
    start: Start
    n_evaluations: int
    seconds: float
    ran_out_of_time: bool

    @property
    def evaluation(self) -> Evaluation:
        """The last evaluation."""
        return self.descent.evaluation

    @property
    def layout(self) -> Layout:
        """Of the parameter vector."""
        return self.problem.layout

    @property
    def claims(self) -> ClaimSet:
        """The claims that were fitted."""
        return self.network.claims


def make_refinement(outcome: Outcome) -> Refinement:
    """Everything that is reported about a finished fit."""
    evaluation, layout = outcome.evaluation, outcome.layout
    frequency_mhz = outcome.prepared.frequency_mhz
    claims = outcome.claims
    n_claims, n_couplings = len(claims.claims), len(claims.couplings)
    covariance: Floats = np.asarray(np.linalg.inv(evaluation.hessian), np.float64)
    sds = np.sqrt(np.diag(covariance))
    n_shifts = layout.shift_claims.size
    shift_sds = np.full(n_claims, np.nan)
    shift_sds[layout.shift_claims] = sds[:n_shifts] / frequency_mhz
    coupling_sds = np.full(n_couplings, np.nan)
    coupling_sds[layout.couplings] = sds[n_shifts : layout.n_moving]
    shifts = np.array(outcome.start.shifts_ppm, dtype=np.float64)
    shifts[layout.shift_claims] = evaluation.parameters[:n_shifts] / frequency_mhz
    couplings = layout.couplings_hz(
        evaluation.parameters, outcome.problem.start_couplings_hz
    )
    determined = _determined(layout, sds, n_couplings)
    protons, widths = np.full(n_claims, np.nan), np.full(n_claims, np.nan)
    claimed = np.array([claim.n_protons for claim in claims.claims], dtype=np.float64)
    common = evaluation.common[0] if evaluation.common.size else 1.0
    drawn = layout.drawn
    protons[drawn] = claimed[drawn] * evaluation.amplitudes / common
    widths[drawn] = layout.widths_hz(evaluation.parameters)
    fitted_j = np.zeros(n_couplings, dtype=np.bool_)
    fitted_j[layout.couplings] = True
    residuals = _residuals(
        outcome,
        shifts=shifts,
        couplings=np.where(fitted_j & determined, couplings, np.nan),
    )
    return Refinement(
        shifts_ppm=shifts,
        shift_sds_ppm=shift_sds,
        couplings_hz=couplings,
        coupling_sds_hz=coupling_sds,
        determined=determined,
        known_sums=_known_sums(layout, evaluation, covariance, determined),
        widths_hz=widths,
        protons=protons,
        area_per_proton=float(common) * outcome.prepared.scale,
        gauss_share=float(evaluation.parameters[-1])
        if layout.fits_gauss_share
        else 0.0,
        kernel_used=outcome.problem.shape.kernel is not None,
        intensities=_whole_model(outcome),
        claim_lines=_claim_lines(outcome),
        absent=outcome.start.absent,
        residuals=residuals,
        score=score_of(residuals, claims, outcome.start.absent),
        log_evidence=_log_evidence(outcome),
        covariance=covariance,
        parameter_names=_names(outcome),
        error_bound=evaluation.lines.error_bound,
        converged=outcome.descent.converged,
        n_evaluations=outcome.n_evaluations,
        seconds=outcome.seconds,
        reason=_reason(outcome),
    )


# A parameter is determined by the data if they at least halve its prior sd.
_DETERMINED_SHARE = 0.5


def _determined(layout: Layout, sds: Floats, n_couplings: int) -> Flags:
    determined = np.zeros(n_couplings, dtype=np.bool_)
    own = slice(layout.shift_claims.size, layout.n_moving)
    determined[layout.couplings] = sds[own] <= _DETERMINED_SHARE * layout.sds[own]
    return determined


def _known_sums(
    layout: Layout, evaluation: Evaluation, covariance: Floats, determined: Flags
) -> tuple[KnownSum, ...]:
    """Pairs of undetermined couplings whose sum the data do determine."""
    begin = layout.shift_claims.size
    open_ones = [
        (begin + k, int(coupling))
        for k, coupling in enumerate(layout.couplings)
        if not determined[coupling]
    ]
    sums = []
    for index, (row, first) in enumerate(open_ones):
        for column, second in open_ones[index + 1 :]:
            variance = (
                covariance[row, row]
                + covariance[column, column]
                + 2.0 * covariance[row, column]
            )
            prior = float(np.hypot(layout.sds[row], layout.sds[column]))
            sd = float(np.sqrt(max(variance, 0.0)))
            # A third: two halves of a sum alone cannot come under it.
            if sd <= prior / 3.0:
                total = evaluation.parameters[row] + evaluation.parameters[column]
                sums.append(
                    KnownSum(first=first, second=second, sum_hz=float(total), sd_hz=sd)
                )
    return tuple(sums)


def _residuals(outcome: Outcome, *, shifts: Floats, couplings: Floats) -> Residuals:
    evaluation, data, layout = outcome.evaluation, outcome.problem.data, outcome.layout
    claims = outcome.claims
    baseline = evaluation.residual - evaluation.model + data.values
    found, left = residuals_of(
        data,
        residual=evaluation.residual,
        baseline=baseline,
        model=evaluation.model,
        noise_sd=outcome.prepared.noise_sd,
    )
    n_claims = len(claims.claims)
    shares = np.full(n_claims, np.nan)
    amplitudes, widths = np.full(n_claims, np.nan), np.full(n_claims, np.nan)
    amplitudes[layout.drawn] = np.log(evaluation.amplitudes / evaluation.common)
    begin = layout.n_moving + 1
    ratios = evaluation.parameters[begin : begin + layout.drawn.size]
    if ratios.size:
        widths[layout.drawn] = ratios - np.median(ratios)
    measured = np.abs(data.values - baseline)
    for claim in layout.drawn:
        near = _points_near(outcome, int(claim))
        shares[claim] = left[near].sum() / max(float(measured[near].sum()), 1e-30)
    predicted = np.array([c.shift_ppm for c in claims.claims])
    sds = np.array([max(c.shift_sd_ppm, 0.02) for c in claims.claims])
    shift_z = np.full(n_claims, np.nan)
    moved = layout.shift_claims
    shift_z[moved] = (shifts[moved] - predicted[moved]) / sds[moved]
    predicted_j = np.array([c.j_hz for c in claims.couplings])
    sds_j = np.array([max(c.j_sd_hz, 0.3) for c in claims.couplings])
    return replace(
        found,
        claim_shares=shares,
        ln_amplitude_ratios=amplitudes,
        ln_width_ratios=widths,
        shift_z=shift_z,
        coupling_z=(couplings - predicted_j) / sds_j,
    )


def _points_near(outcome: Outcome, claim: int) -> Flags:
    """Compared points within 10 Hz of a claim's lines."""
    data, lines = outcome.problem.data, outcome.evaluation.lines
    near = np.zeros(data.n_points, dtype=np.bool_)
    reach = round(10.0 / data.axis.step_hz)
    own = lines.frequencies_hz[lines.claim == claim]
    places = np.rint((data.axis.first_hz - own) / data.axis.step_hz).astype(np.int64)
    for place in np.unique(places).tolist():
        for _, target in data.overlaps(place - reach, place + reach + 1):
            near[target] = True
    return near


def _shape(outcome: Outcome) -> LineShape:
    shape = replace(outcome.problem.shape, extra_width_hz=0.0)
    if outcome.layout.fits_gauss_share:
        return replace(shape, gauss_share=float(outcome.evaluation.parameters[-1]))
    return shape


def _whole_model(outcome: Outcome) -> Floats:
    """Model on the evidence's own axis and scale."""
    evaluation, layout = outcome.evaluation, outcome.layout
    axis = outcome.prepared.axis
    total = np.zeros(axis.n_points)
    widths = layout.widths_hz(evaluation.parameters)
    lines = evaluation.lines
    for row, claim in enumerate(layout.drawn):
        own = lines.claim == claim
        images = draw(
            LineList(
                frequencies_hz=lines.frequencies_hz[own], protons=lines.protons[own]
            ),
            axis,
            width_hz=float(widths[row]),
            shape=_shape(outcome),
            pad_hz=200.0,
        )
        amplitude = float(evaluation.amplitudes[row]) * outcome.prepared.scale
        add_to(total, images, amplitude=amplitude)
    return total


def _claim_lines(outcome: Outcome) -> tuple[ClaimLines, ...]:
    evaluation, layout = outcome.evaluation, outcome.layout
    lines = evaluation.lines
    widths = layout.widths_hz(evaluation.parameters)
    found = []
    for row, claim in enumerate(layout.drawn):
        own = lines.claim == claim
        ratio = evaluation.amplitudes[row] / evaluation.common[0]
        found.append(
            ClaimLines(
                claim=outcome.claims.claims[claim].label,
                shifts_ppm=lines.frequencies_hz[own] / outcome.prepared.frequency_mhz,
                protons=lines.protons[own] * ratio,
                width_hz=float(widths[row]),
            )
        )
    return tuple(found)


def _log_evidence(outcome: Outcome) -> float:
    """Laplace approximation; the data's own constant is left out.

    ln Z = -cost/2 - sum ln sd_prior - ln det(H)/2 - sum ln sd_point / correlation.
    """
    evaluation, layout, data = outcome.evaluation, outcome.layout, outcome.problem.data
    _, log_det = np.linalg.slogdet(evaluation.hessian)
    spread = float(np.log(data.sds).sum()) / data.correlation
    return float(
        -0.5 * evaluation.cost - np.log(layout.sds).sum() - 0.5 * log_det - spread
    )


def _names(outcome: Outcome) -> tuple[str, ...]:
    claims, layout = outcome.claims, outcome.layout
    names = [f"shift {claims.claims[k].label}" for k in layout.shift_claims]
    names += [f"J {_pair_name(claims, int(k))}" for k in layout.couplings]
    names += ["ln width"]
    names += [f"ln width ratio {claims.claims[k].label}" for k in layout.drawn]
    if layout.fits_gauss_share:
        names.append("Gauss share")
    return tuple(names)


def _pair_name(claims: ClaimSet, coupling: int) -> str:
    names = []
    for number in claims.couplings[coupling].pairs[0]:
        owner = claims.particles[number].claim
        names.append(
            claims.particles[number].nucleus
            if owner is None
            else claims.claims[owner].label
        )
    return f"{names[0]}, {names[1]} ({coupling})"


def _reason(outcome: Outcome) -> str:
    if outcome.ran_out_of_time:
        return "The time ran out before the fit had settled."
    if not outcome.descent.converged:
        return "The fit had not settled after the allowed number of steps."
    return ""
