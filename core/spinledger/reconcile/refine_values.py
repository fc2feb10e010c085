"""What goes into a refinement and what comes out; shifts in ppm, couplings in Hz."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.spins.clusters import FULL_EFFORT, QUICK_EFFORT, Effort
from spinledger.values.ledger import ClaimLines

Floats = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Start:
    """Where a refinement begins.

    Attributes
    ----------
    shifts_ppm : numpy.ndarray, shape (n_claims,), ppm
    couplings_hz : numpy.ndarray, shape (n_couplings,), Hz
    absent : frozenset of int
        Claims that show no lines: not found, exchanged, or hidden.
    """

    shifts_ppm: Floats
    couplings_hz: Floats
    absent: frozenset[int] = frozenset()


@dataclass(frozen=True, slots=True, kw_only=True)
class Stage:
    """One step of the schedule.

    Attributes
    ----------
    broadening_hz : float, Hz
        Lorentz half width that data and model are broadened by.
    max_steps : int
        Most Levenberg-Marquardt steps.
    """

    broadening_hz: float
    max_steps: int


@dataclass(frozen=True, slots=True, kw_only=True)
class RefineSettings:
    """Schedule and effort of a refinement.

    Attributes
    ----------
    stages : tuple of Stage
        From broad to sharp. A start from a match needs 6, 2, 0.5, 0 Hz; one
        that may be 0.03 ppm off needs 10, 3, 1, 0 Hz.
    effort : Effort
        Of the simulation.
    fit_shape : bool
        Fit the Gauss share, and try the common kernel, at the end.
    exact_slopes : bool
        Use the derivatives of intensities too in the last stage.
    second_thoughts : int
        Rounds in which claims with misfit are put elsewhere and fitted again.
    time_budget_s : float or None, s
        Stop at the next step after this; None keeps results reproducible on
        machines of any speed.
    """

    stages: tuple[Stage, ...] = (
        Stage(broadening_hz=6.0, max_steps=12),
        Stage(broadening_hz=2.0, max_steps=12),
        Stage(broadening_hz=0.5, max_steps=12),
        Stage(broadening_hz=0.0, max_steps=20),
    )
    effort: Effort = FULL_EFFORT
    fit_shape: bool = True
    exact_slopes: bool = True
    second_thoughts: int = 2
    time_budget_s: float | None = None


FROM_MATCH = RefineSettings()
FROM_AFAR = RefineSettings(
    stages=(
        Stage(broadening_hz=10.0, max_steps=15),
        Stage(broadening_hz=3.0, max_steps=15),
        Stage(broadening_hz=1.0, max_steps=12),
        Stage(broadening_hz=0.0, max_steps=20),
    )
)
QUICK = RefineSettings(
    stages=(
        Stage(broadening_hz=6.0, max_steps=6),
        Stage(broadening_hz=2.0, max_steps=6),
        Stage(broadening_hz=0.7, max_steps=6),
    ),
    effort=QUICK_EFFORT,
    fit_shape=False,
    exact_slopes=False,
    second_thoughts=0,
)


@dataclass(frozen=True, slots=True, kw_only=True)
class KnownSum:
    """Two couplings of which only the sum is determined."""

    first: int
    second: int
    sum_hz: float
    sd_hz: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Residuals:
    """How well the model leaves the measured spectrum explained.

    Shares are of the summed |intensity| of what is compared (signals and model,
    without recognised strays).

    Attributes
    ----------
    boxcar_share : float
        |Residual| share after a boxcar of +- 3 Hz over data and model.
    share : float
        |Residual| share, point by point.
    r_squared : float
    unexplained_share : float
        Measured area that the model does not reach, by boxcar.
    unsupported_share : float
        Model area that the data do not reach, by boxcar.
    claim_shares : numpy.ndarray, shape (n_claims,)
        |Residual| share (boxcar) where the claim's own lines are; nan if absent.
    ln_amplitude_ratios : numpy.ndarray, shape (n_claims,)
        ln of fitted over claimed area, against the common proton; nan if absent.
    ln_width_ratios : numpy.ndarray, shape (n_claims,)
        ln of the claim's width over the common width; nan if absent.
    shift_z, coupling_z : numpy.ndarray
        Fitted minus predicted over predicted sd; nan where nothing was fitted.
    """

    boxcar_share: float
    share: float
    r_squared: float
    unexplained_share: float
    unsupported_share: float
    claim_shares: Floats
    ln_amplitude_ratios: Floats
    ln_width_ratios: Floats
    shift_z: Floats
    coupling_z: Floats


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Refinement:
    """Fitted parameters, how well they are known, and what is left over.

    Attributes
    ----------
    shifts_ppm, shift_sds_ppm : numpy.ndarray, shape (n_claims,), ppm
        Start values and nan for claims that took no part.
    couplings_hz, coupling_sds_hz : numpy.ndarray, shape (n_couplings,), Hz
        Start values and nan for couplings that took no part.
    determined : numpy.ndarray of bool, shape (n_couplings,)
        The data, not the prior, give the value.
    known_sums : tuple of KnownSum
    widths_hz : numpy.ndarray, shape (n_claims,), Hz
        Full width at half maximum as processed; nan for absent claims.
    protons : numpy.ndarray, shape (n_claims,)
        Fitted area of each claim over that of one common proton.
    area_per_proton : float
        Intensity * Hz.
    gauss_share : float
    kernel_used : bool
    intensities : numpy.ndarray, shape (n_points,)
        Model on the evidence's own axis, without the local baselines.
    claim_lines : tuple of ClaimLines
        One per claim that is present.
    absent : frozenset of int
    residuals : Residuals
    score : float
        Lower is better; see :func:`spinledger.reconcile.refine_measures.score_of`.
    log_evidence : float
        ln of the model evidence, up to a constant of the data compared.
    covariance : numpy.ndarray
        Of ``parameter_names``, in Hz.
    parameter_names : tuple of str
    error_bound : float
        Of the simulation, as a share of the tallest line.
    converged : bool
    n_evaluations : int
    seconds : float, s
    reason : str
        One sentence where something is doubtful, else "".
    """

    shifts_ppm: Floats
    shift_sds_ppm: Floats
    couplings_hz: Floats
    coupling_sds_hz: Floats
    determined: Flags
    known_sums: tuple[KnownSum, ...]
    widths_hz: Floats
    protons: Floats
    area_per_proton: float
    gauss_share: float
    kernel_used: bool
    intensities: Floats
    claim_lines: tuple[ClaimLines, ...]
    absent: frozenset[int]
    residuals: Residuals
    score: float
    log_evidence: float
    covariance: Floats
    parameter_names: tuple[str, ...]
    error_bound: float
    converged: bool
    n_evaluations: int
    seconds: float
    reason: str = ""
