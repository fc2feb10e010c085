"""The measured side of a fit: masked, broadened, thinned, cut into windows.

Frequencies in Hz (shift times spectrometer frequency); intensities are divided by
the tallest compared point, so that every number in the fit is near one.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import numpy.typing as npt
import scipy.fft

from spinledger.reconcile.options import Constraints
from spinledger.reconcile.windows import inside_ranges, stretches, widened
from spinledger.spins.synthesis import FrequencyAxis, Treatment, treatment_of
from spinledger.values.evidence import Evidence

Floats = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]
Integers = npt.NDArray[np.int64]

MASKED_KINDS = frozenset({"solvent", "water", "reference"})

# Twelve points across a line of the given width keep all that is in it: what
# thinning takes away has decayed to exp(-6 pi).
_POINTS_PER_WIDTH = 6.0


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class PreparedEvidence:
    """A spectrum made ready for fits; shared by all hypotheses about it.

    Attributes
    ----------
    evidence : Evidence
    axis : FrequencyAxis
    intensities : numpy.ndarray, shape (n_points,)
        Over ``scale``; a straight line where masked.
    scale : float
        Tallest compared intensity.
    noise_sd : float
        Over ``scale``.
    is_compared : numpy.ndarray of bool, shape (n_points,)
        False under masks.
    is_signal : numpy.ndarray of bool, shape (n_points,)
        Where the evidence found lines.
    line_width_hz : float, Hz
        Typical width of the measured lines.
    treatment : Treatment
    """

    evidence: Evidence
    axis: FrequencyAxis
    intensities: Floats
    scale: float
    noise_sd: float
    is_compared: Flags
    is_signal: Flags
    line_width_hz: float
    treatment: Treatment

    @property
    def frequency_mhz(self) -> float:
        """Spectrometer frequency, MHz."""
        return self.evidence.spectrum.spectrometer_frequency_mhz


def prepare(
    evidence: Evidence, constraints: Constraints | None = None
) -> PreparedEvidence:
    """Mask, scale and look at the line width of a spectrum.

    Parameters
    ----------
    evidence : Evidence
    constraints : Constraints, optional
        Excluded stretches and declared impurities are masked.
    """
    spectrum = evidence.spectrum
    masked = inside_ranges(
        spectrum,
        [
            *_recognised(evidence, constraints),
            *_by_hand(constraints),
        ],
    )
    signal = inside_ranges(
        spectrum, [(s.low_ppm, s.high_ppm) for s in evidence.signals]
    )
    values = _bridged(spectrum.intensities, masked)
    tallest = float(values[signal & ~masked].max(initial=0.0))
    scale = tallest if tallest > 0.0 else float(np.abs(values).max(initial=0.0)) or 1.0
    return PreparedEvidence(
        evidence=evidence,
        axis=FrequencyAxis.of(spectrum),
        intensities=values / scale,
        scale=scale,
        noise_sd=evidence.noise_sd / scale,
        is_compared=~masked,
        is_signal=signal & ~masked,
        line_width_hz=_line_width_hz(evidence, masked),
        treatment=treatment_of(evidence.recipe, spectrum),
    )


def _recognised(
    evidence: Evidence, constraints: Constraints | None
) -> list[tuple[float, float]]:
    """Solvent, water and reference, unless the user put a claim there."""
    pins = constraints.pins if constraints else ()
    return [
        (stray.low_ppm, stray.high_ppm)
        for stray in evidence.strays
        if stray.kind in MASKED_KINDS
        and not any(
            stray.low_ppm < pin.high_ppm and pin.low_ppm < stray.high_ppm
            for pin in pins
        )
    ]


def _by_hand(constraints: Constraints | None) -> list[tuple[float, float]]:
    if constraints is None:
        return []
    declared = [(one.low_ppm, one.high_ppm) for one in constraints.impurities]
    return [*constraints.excluded_ppm, *declared]


def _bridged(values: Floats, masked: Flags) -> Floats:
    """Straight lines across masked stretches, so that broadening spills nothing."""
    bridged = np.array(values)
    for run in stretches(masked):
        left = values[max(run.start - 1, 0)]
        right = values[min(run.stop, values.size - 1)]
        bridged[run.start : run.stop] = np.linspace(left, right, run.stop - run.start)
    return bridged


def _line_width_hz(evidence: Evidence, masked: Flags) -> float:
    """Median width of the stronger lines, weighted by area."""
    spectrum = evidence.spectrum
    widths, areas = [], []
    for signal in evidence.signals:
        for line in signal.lines:
            if not masked[spectrum.index_of_ppm(line.shift_ppm)] and line.area > 0:
                widths.append(line.width_hz)
                areas.append(line.area)
    if not widths:
        return max(1.0, 2.0 * spectrum.step_hz)
    order = np.argsort(widths)
    share = np.cumsum(np.array(areas)[order])
    median = float(np.array(widths)[order][np.searchsorted(share, 0.5 * share[-1])])
    return float(np.clip(median, 0.3, 8.0))


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class StageData:
    """Compared points of one stage.

    Attributes
    ----------
    axis : FrequencyAxis
        Thinned.
    broadening_hz : float, Hz
        Lorentz half width put on the data.
    runs : tuple of slice
        Stretches of the axis that are compared, in order.
    values : numpy.ndarray, shape (n,)
    sds : numpy.ndarray, shape (n,)
        Noise and expected model error together.
    baselines : numpy.ndarray, shape (2, n)
        One constant and one slope for each window, over ``sds`` scale 1.
    baseline_sds : numpy.ndarray, shape (n_baselines,)
    windows : tuple of slice
        Where each run stands among the compared points.
    correlation : float
        Points that count as one, because the misfit is smooth.
    """

    axis: FrequencyAxis
    broadening_hz: float
    runs: tuple[slice, ...]
    values: Floats
    sds: Floats
    baselines: Floats
    baseline_sds: Floats
    windows: tuple[slice, ...]
    correlation: float

    @property
    def n_points(self) -> int:
        """Compared points."""
        return int(self.values.size)

    def overlaps(self, start: int, stop: int) -> list[tuple[slice, slice]]:
        """Compared parts of an axis stretch: slices of it, and of the points."""
        found = []
        for run, window in zip(self.runs, self.windows, strict=True):
            low, high = max(run.start, start), min(run.stop, stop)
            if low < high:
                shift = window.start - run.start
                found.append(
                    (slice(low - start, high - start), slice(low + shift, high + shift))
                )
        return found


# Model error expected before a fit: 2 % of a window's tallest point, at least
# 0.2 % of the spectrum's.
_MODEL_ERROR = 0.02
_LEAST_ERROR = 0.002


def stage_data(
    prepared: PreparedEvidence,
    lines_hz: Floats,
    *,
    broadening_hz: float,
    width_hz: float,
) -> StageData:
    """Data of one stage: signals and the stretches around the model's lines.

    Parameters
    ----------
    prepared : PreparedEvidence
    lines_hz : numpy.ndarray, shape (n_lines,), Hz
        Where the model has lines now.
    broadening_hz : float, Hz
        Lorentz half width to put on.
    width_hz : float, Hz
        Smallest line width of the model, for the thinning.
    """
    total_width = width_hz + 2.0 * broadening_hz
    step = prepared.axis.step_hz
    stride = 1
    while 2 * stride * step * _POINTS_PER_WIDTH <= total_width:
        stride *= 2
    thinned = _broadened(prepared.intensities, step, broadening_hz, stride)
    axis = prepared.axis.every(stride)
    compared = prepared.is_compared[::stride]
    wanted = _near(axis, lines_hz, 25.0 + 3.0 * broadening_hz)
    pad = round((10.0 + broadening_hz) / axis.step_hz)
    wanted |= widened(prepared.is_signal[::stride], pad)
    chosen = wanted & compared
    runs = [run for run in stretches(chosen) if run.stop - run.start >= 4]
    ends = np.cumsum([0, *(run.stop - run.start for run in runs)]).tolist()
    windows = [slice(a, b) for a, b in pairwise(ends)]
    axis_runs = tuple(slice(run.start, run.stop) for run in runs)
    values = np.concatenate([thinned[:0], *(thinned[run] for run in axis_runs)])
    noise = prepared.noise_sd / np.sqrt(
        max(1.0, np.pi * broadening_hz / prepared.axis.step_hz)
    )
    levels = [float(np.abs(values[w]).max()) for w in windows]
    top = max(levels, default=1.0)
    sds = np.empty(values.size)
    for window, level in zip(windows, levels, strict=True):
        sds[window] = max(noise, _MODEL_ERROR * level, _LEAST_ERROR * top)
    baselines, baseline_sds = _baselines(windows, levels, values.size)
    return StageData(
        axis=axis,
        broadening_hz=broadening_hz,
        runs=axis_runs,
        values=values,
        sds=sds,
        baselines=baselines,
        baseline_sds=baseline_sds,
        windows=tuple(windows),
        correlation=max(1.0, 1.5 * total_width / axis.step_hz),
    )


def _broadened(
    values: Floats, step_hz: float, half_width_hz: float, stride: int
) -> Floats:
    """Lorentz-broadened trace, every ``stride``-th point, free of aliases."""
    n_out = -(-values.size // stride)
    n_padded = n_out * stride
    padded = np.concatenate([values, np.full(n_padded - values.size, values[-1])])
    spectrum = scipy.fft.rfft(padded)[: n_out // 2 + 1]
    times = np.arange(spectrum.size) / (n_padded * step_hz)
    spectrum *= np.exp(-2.0 * np.pi * half_width_hz * times)
    return np.asarray(scipy.fft.irfft(spectrum, n=n_out) / stride)


def _near(axis: FrequencyAxis, lines_hz: Floats, reach_hz: float) -> Flags:
    near = np.zeros(axis.n_points, dtype=np.bool_)
    places = np.rint((axis.first_hz - lines_hz) / axis.step_hz).astype(np.int64)
    near[places[(places >= 0) & (places < axis.n_points)]] = True
    return widened(near, max(1, round(reach_hz / axis.step_hz)))


def _baselines(
    windows: list[slice], levels: list[float], n_points: int
) -> tuple[Floats, Floats]:
    """Constant and slope of every window, side by side, and their prior sds."""
    rows, sds = np.ones((2, n_points)), []
    for window, level in zip(windows, levels, strict=True):
        rows[1, window] = np.linspace(-1.0, 1.0, window.stop - window.start)
        # A baseline of a tenth of the window's height is already a bad one.
        sds += [0.1 * level, 0.1 * level]
    return rows, np.array(sds)
