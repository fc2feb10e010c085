"""The model side of a fit: parameters, spectrum, linear amplitudes, Jacobian.

Parameters are in Hz, except the logarithms of widths and the Gauss share.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.reconcile.refine_data import StageData
from spinledger.spins.network import ClaimLineSet, ClaimNetwork
from spinledger.spins.plan import Plan
from spinledger.spins.synthesis import Images, LineList, LineShape, draw

Floats = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Layout:
    """Which number of the parameter vector is what.

    The vector holds the shifts of ``shift_claims``, the couplings
    ``couplings``, the common ln width, one ln width ratio for each of
    ``drawn``, and the Gauss share if it is fitted.

    Attributes
    ----------
    shift_claims : numpy.ndarray of int
    couplings : numpy.ndarray of int
    drawn : numpy.ndarray of int
        Claims that show lines.
    fits_gauss_share : bool
    centres, sds : numpy.ndarray, shape (n_parameters,)
        Priors.
    low, high : numpy.ndarray, shape (n_parameters,)
        Bounds.
    step_limits : numpy.ndarray, shape (n_parameters,)
        Largest change in one step.
    """

    shift_claims: Integers
    couplings: Integers
    drawn: Integers
    fits_gauss_share: bool
    centres: Floats
    sds: Floats
    low: Floats
    high: Floats
    step_limits: Floats

    @property
    def n_parameters(self) -> int:
        """Length of the parameter vector."""
        return int(self.centres.size)

    @property
    def n_moving(self) -> int:
        """Parameters that move lines: shifts and couplings."""
        return int(self.shift_claims.size + self.couplings.size)

    def shifts_hz(self, parameters: Floats, start: Floats) -> Floats:
        """Shifts of all claims, fitted ones from the vector."""
        shifts = np.array(start)
        shifts[self.shift_claims] = parameters[: self.shift_claims.size]
        return shifts

    def couplings_hz(self, parameters: Floats, start: Floats) -> Floats:
        """All couplings, fitted ones from the vector."""
        couplings = np.array(start)
        couplings[self.couplings] = parameters[self.shift_claims.size : self.n_moving]
        return couplings

    def widths_hz(self, parameters: Floats) -> Floats:
        """Full width of each drawn claim, shape (n_drawn,)."""
        begin = self.n_moving + 1
        ratios = parameters[begin : begin + self.drawn.size]
        return np.asarray(np.exp(parameters[self.n_moving] + ratios))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class AmplitudePrior:
    """What is known about the areas before the fit.

    Attributes
    ----------
    relative_sds : numpy.ndarray, shape (n_drawn,)
        Of a claim's area about the common proton.
    species : numpy.ndarray of int, shape (n_drawn,)
        Each species has its own common proton.
    is_steady : numpy.ndarray of bool, shape (n_drawn,)
        Claims whose area tells what a proton is (not exchangeable ones).
    """

    relative_sds: Floats
    species: Integers
    is_steady: Flags


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Problem:
    """Everything that stays the same during one stage."""

    network: ClaimNetwork
    plan: Plan
    layout: Layout
    start_shifts_hz: Floats
    start_couplings_hz: Floats
    amplitude_prior: AmplitudePrior
    shape: LineShape
    data: StageData
    exact_slopes: bool = False


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Evaluation:
    """The model at one parameter vector.

    Attributes
    ----------
    parameters : numpy.ndarray
    cost : float
        Half of it is the negative log posterior, up to a constant.
    residual : numpy.ndarray, shape (n_points,)
        Model minus data, unweighted.
    model : numpy.ndarray, shape (n_points,)
        Without baselines.
    amplitudes : numpy.ndarray, shape (n_drawn,)
        Area of one proton of each claim.
    common : numpy.ndarray, shape (n_drawn,)
        Common area of one proton (of the claim's species).
    gradient, hessian : numpy.ndarray
        Of half the cost, linear parameters projected out (Kaufman).
    data_hessian : numpy.ndarray
        The part of the Hessian that the data give.
    lines : ClaimLineSet
    images : tuple of Images
        Value of every drawn claim.
    """

    parameters: Floats
    cost: float
    residual: Floats
    model: Floats
    amplitudes: Floats
    common: Floats
    gradient: Floats
    hessian: Floats
    data_hessian: Floats
    lines: ClaimLineSet


def evaluate(problem: Problem, parameters: Floats) -> Evaluation:
    """Model, cost, gradient and Hessian at one parameter vector.

    Notes
    -----
    Amplitudes and baselines are linear and solved inside, with their priors;
    the Jacobian of the rest is projected onto what they cannot take up.

    References
    ----------
    .. [1] G. H. Golub, V. Pereyra, SIAM J. Numer. Anal. 10 (1973) 413-432,
       doi:10.1137/0710036.
    .. [2] L. Kaufman, BIT 15 (1975) 49-57, doi:10.1007/BF01932995.
    """
    layout, data = problem.layout, problem.data
    lines = problem.network.lines(
        layout.shifts_hz(parameters, problem.start_shifts_hz),
        layout.couplings_hz(parameters, problem.start_couplings_hz),
        derivatives=True,
        intensity_derivatives="shared" if problem.exact_slopes else False,
        plan=problem.plan,
    )
    shape = _shape_at(problem, parameters)
    weights = 1.0 / (data.sds * np.sqrt(data.correlation))
    drawn = _drawn_claims(problem, lines, parameters, shape)
    unit = drawn.values * weights
    linear = _solve_linear(problem, unit, weights)
    model = linear.amplitudes @ drawn.values
    residual = model + linear.baseline - data.values
    jacobian = _jacobian(problem, drawn, linear.amplitudes) * weights
    jacobian -= _taken_up(jacobian, linear)
    offset = (parameters - layout.centres) / layout.sds
    weighted = residual * weights
    data_hessian = jacobian @ jacobian.T
    gradient = jacobian @ weighted + offset / layout.sds
    cost = float(weighted @ weighted + offset @ offset + linear.prior_cost)
    return Evaluation(
        parameters=parameters,
        cost=cost,
        residual=residual,
        model=model,
        amplitudes=linear.amplitudes,
        common=linear.common,
        gradient=gradient,
        hessian=data_hessian + np.diag(layout.sds**-2.0),
        data_hessian=data_hessian,
        lines=lines,
    )


def _shape_at(problem: Problem, parameters: Floats) -> LineShape:
    shape = problem.shape
    if not problem.layout.fits_gauss_share:
        return shape
    return LineShape(
        gauss_share=float(parameters[-1]),
        kernel=shape.kernel,
        extra_width_hz=shape.extra_width_hz,
        treatment=shape.treatment,
    )


@dataclass(frozen=True, slots=True, eq=False)
class _Piece:
    """Where a claim's image falls among the compared points."""

    images: Images
    overlaps: list[tuple[slice, slice]]
    moving: Integers  # numbers in the parameter vector


@dataclass(frozen=True, slots=True, eq=False)
class _Drawn:
    values: Floats  # (n_drawn, n_points)
    pieces: tuple[_Piece, ...]


def _drawn_claims(
    problem: Problem, lines: ClaimLineSet, parameters: Floats, shape: LineShape
) -> _Drawn:
    layout, data = problem.layout, problem.data
    widths = layout.widths_hz(parameters)
    n_claims = problem.network.n_claims
    columns = np.concatenate([layout.shift_claims, n_claims + layout.couplings])
    depends = problem.network.parameters_of(problem.plan)[:, columns]
    bounds = np.searchsorted(lines.claim, np.arange(n_claims + 1))
    values = np.zeros((layout.drawn.size, data.n_points))
    pieces = []
    for row, claim in enumerate(layout.drawn):
        rows = slice(int(bounds[claim]), int(bounds[claim + 1]))
        moving = _that_matter(lines, rows, columns, depends[claim])
        images = draw(
            _line_list(lines, rows, columns[moving]),
            data.axis,
            width_hz=float(widths[row]),
            shape=shape,
        )
        overlaps = data.overlaps(images.start, images.start + images.value.size)
        for source, target in overlaps:
            values[row, target] = images.value[source]
        pieces.append(_Piece(images, overlaps, moving))
    return _Drawn(values, tuple(pieces))


# A parameter that moves a claim's lines by less than this share of its own
# change, and their intensities by less than this share of a proton per Hz, has
# no visible image.
_NO_EFFECT = 1e-3


def _that_matter(
    lines: ClaimLineSet, rows: slice, columns: Integers, depends: Flags
) -> Integers:
    """Which fitted parameters change the lines of one claim visibly."""
    candidates = np.flatnonzero(depends)
    if lines.d_frequency is None:
        return candidates
    weights = np.abs(lines.protons[rows])
    moved = np.abs(lines.d_frequency[rows][:, columns[candidates]])
    effect = (weights @ moved) / max(float(weights.sum()), 1e-30)
    if lines.d_protons is not None:
        changed = np.abs(lines.d_protons[rows][:, columns[candidates]]).sum(axis=0)
        effect = np.maximum(effect, changed)
    return candidates[effect > _NO_EFFECT]


def _line_list(lines: ClaimLineSet, rows: slice, columns: Integers) -> LineList:
    by_frequency, by_protons = lines.d_frequency, lines.d_protons
    return LineList(
        frequencies_hz=lines.frequencies_hz[rows],
        protons=lines.protons[rows],
        d_frequency=None if by_frequency is None else by_frequency[rows][:, columns],
        d_protons=None if by_protons is None else by_protons[rows][:, columns],
    )


def _jacobian(problem: Problem, drawn: _Drawn, amplitudes: Floats) -> Floats:
    layout = problem.layout
    jacobian = np.zeros((layout.n_parameters, problem.data.n_points))
    for row, piece in enumerate(drawn.pieces):
        images, amplitude = piece.images, amplitudes[row]
        by_parameter, by_width = images.by_parameter, images.by_log_width
        by_share = images.by_gauss_share
        if by_parameter is None or by_width is None:
            raise ValueError("lines: need derivatives for a Jacobian")
        for source, target in piece.overlaps:
            width_change = amplitude * by_width[source]
            for image, place in zip(by_parameter, piece.moving, strict=True):
                jacobian[place, target] += amplitude * image[source]
            jacobian[layout.n_moving, target] += width_change
            jacobian[layout.n_moving + 1 + row, target] = width_change
            if by_share is not None and layout.fits_gauss_share:
                jacobian[-1, target] += amplitude * by_share[source]
    return jacobian


@dataclass(frozen=True, slots=True, eq=False)
class _Linear:
    """Areas and baselines at one parameter vector.

    Baselines reach over one window each, so that their products are taken
    window by window.
    """

    unit: Floats  # weighted, (n_drawn, n_points)
    base: Floats  # weighted, (2, n_points)
    windows: tuple[slice, ...]
    normal: Floats
    amplitudes: Floats
    common: Floats
    baseline: Floats
    prior_cost: float


# Areas stay positive: at least this share of the common proton.
_LEAST_AMPLITUDE = 1e-3


def _against_base(rows: Floats, base: Floats, windows: tuple[slice, ...]) -> Floats:
    """Products of rows with both baselines of every window, (n_rows, n_base)."""
    products = np.empty((rows.shape[0], 2 * len(windows)))
    for number, window in enumerate(windows):
        place = slice(2 * number, 2 * number + 2)
        products[:, place] = rows[:, window] @ base[:, window].T
    return products


def _of_base(factors: Floats, base: Floats, windows: tuple[slice, ...]) -> Floats:
    """Sum of baselines with given factors (n_rows, n_base), (n_rows, n_points)."""
    total = np.empty((factors.shape[0], base.shape[1]))
    for number, window in enumerate(windows):
        place = slice(2 * number, 2 * number + 2)
        total[:, window] = factors[:, place] @ base[:, window]
    return total


def _solve_linear(problem: Problem, unit: Floats, weights: Floats) -> _Linear:
    """Areas with their prior about the common proton, and baselines."""
    data, prior = problem.data, problem.amplitude_prior
    base = data.baselines * weights
    values = data.values * weights
    windows = data.windows
    base_precision = data.baseline_sds**-2.0
    n_drawn = unit.shape[0]
    normal = np.zeros((n_drawn + base_precision.size,) * 2)
    normal[:n_drawn, :n_drawn] = unit @ unit.T
    normal[:n_drawn, n_drawn:] = _against_base(unit, base, windows)
    normal[n_drawn:, :n_drawn] = normal[:n_drawn, n_drawn:].T
    for number, window in enumerate(windows):
        place = slice(n_drawn + 2 * number, n_drawn + 2 * number + 2)
        normal[place, place] = base[:, window] @ base[:, window].T
    right = np.concatenate(
        [unit @ values, _against_base(values[None, :], base, windows)[0]]
    )
    common = np.full(
        n_drawn, _least_squares_area(normal, right, n_drawn, base_precision)
    )
    wide = np.maximum(prior.relative_sds, _FIRST_AREA_SD)
    for _ in range(2):
        precision = np.concatenate([(common * wide) ** -2.0, base_precision])
        found = _areas(normal, right, precision, common)
        informed = np.diag(normal)[:n_drawn] > precision[:n_drawn]
        common = _common_areas(found[:n_drawn], common, prior, informed)
    precision = np.concatenate([(common * prior.relative_sds) ** -2.0, base_precision])
    solution = _areas(normal, right, precision, common)
    amplitudes = solution[:n_drawn]
    normal[np.diag_indices(normal.shape[0])] += precision
    off = np.concatenate([amplitudes - common, solution[n_drawn:]])
    return _Linear(
        unit,
        base,
        windows,
        normal,
        amplitudes,
        common,
        _of_base(solution[None, n_drawn:], data.baselines, windows)[0],
        float(off**2 @ precision),
    )


# Prior sd of areas while the common proton is looked for.
_FIRST_AREA_SD = 2.0

# Data are scaled to a tallest point of 1; no proton has a smaller area than this.
_LEAST_AREA = 1e-5


def _areas(normal: Floats, right: Floats, precision: Floats, common: Floats) -> Floats:
    """Areas and baselines with their priors; areas stay above their floor."""
    n_drawn = common.size
    held = normal + np.diag(precision)
    pulled = right.copy()
    pulled[:n_drawn] += precision[:n_drawn] * common
    solution = np.linalg.solve(held, pulled)
    floor = _LEAST_AMPLITUDE * common
    if np.any(solution[:n_drawn] < floor):
        return _with_floor(held, pulled, solution[:n_drawn] < floor, floor)
    return np.asarray(solution)


def _least_squares_area(
    normal: Floats, right: Floats, n_drawn: int, base_precision: Floats
) -> float:
    """Area of one proton if all claims had the same."""
    n_base = base_precision.size
    summing = np.zeros((1 + n_base, n_drawn + n_base))
    summing[0, :n_drawn] = 1.0
    summing[1:, n_drawn:] = np.eye(n_base)
    together = summing @ normal @ summing.T
    together[np.diag_indices(1 + n_base)] += np.concatenate(
        [[1e-12 * max(float(np.trace(together)), 1e-30)], base_precision]
    )
    return max(float(np.linalg.solve(together, summing @ right)[0]), _LEAST_AREA)


def _common_areas(
    areas: Floats, common: Floats, prior: AmplitudePrior, informed: Flags
) -> Floats:
    """Median area of the steady, informed claims of each species.

    A mean would let one claim without a signal pull all others down.
    """
    result = common.copy()
    for kind in np.unique(prior.species):
        mine = prior.species == kind
        chosen = mine & informed & prior.is_steady
        if not chosen.any():
            chosen = mine & informed
        if chosen.any():
            result[mine] = max(float(np.median(areas[chosen])), _LEAST_AREA)
    return result


def _with_floor(normal: Floats, right: Floats, too_low: Flags, floor: Floats) -> Floats:
    """Solution with the areas that came out too low held at their floor."""
    solution = np.zeros(right.size)
    held = np.flatnonzero(too_low)
    free = np.setdiff1d(np.arange(right.size), held)
    solution[held] = floor[held]
    reduced = right[free] - normal[np.ix_(free, held)] @ floor[held]
    solution[free] = np.linalg.solve(normal[np.ix_(free, free)], reduced)
    n_areas = floor.size
    solution[:n_areas] = np.maximum(solution[:n_areas], floor)
    return solution


def _taken_up(jacobian: Floats, linear: _Linear) -> Floats:
    """Part of the Jacobian that areas and baselines absorb."""
    n_drawn = linear.unit.shape[0]
    products = np.hstack(
        [
            jacobian @ linear.unit.T,
            _against_base(jacobian, linear.base, linear.windows),
        ]
    )
    factors = np.asarray(np.linalg.solve(linear.normal, products.T).T, dtype=np.float64)
    absorbed = _of_base(factors[:, n_drawn:], linear.base, linear.windows)
    absorbed += factors[:, :n_drawn] @ linear.unit
    return absorbed
