"""One spectrum laid upon another of the same sample: offset and scale.

Shifts and offsets in ppm, areas in intensity * Hz.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.ndimage import gaussian_filter1d
from scipy.signal import correlate

from spinledger.errors import EvidenceError
from spinledger.sample.roles import same_field
from spinledger.sample.traces import Range, integral, resampled, trace_of
from spinledger.values.evidence import Evidence

Floats = npt.NDArray[np.float64]

# The reference of either axis may be off by this much.
REACH_PPM = 0.3
# A signal moves by less than this against its neighbours (concentration, water).
LOCAL_REACH_PPM = 0.03
# Pearson correlation from which two stretches show the same signal.
SAME_SIGNAL = 0.7
# Share of the signals that has to be common to both.
LEAST_SHARE = 0.34
# Gauss width put on both, so that shim and a field apart do not matter; Hz, ppm.
SMOOTHING_HZ = 1.5
FIELDS_APART_SMOOTHING_PPM = 0.012
MARGIN_HZ = 6.0
# Integrals of one compound agree no better than this [common practice].
LEAST_SCATTER = 0.002
_FIXED_STRAYS = ("solvent", "water", "reference", "satellite", "sideband")


@dataclass(frozen=True, slots=True, kw_only=True)
class CommonSignal:
    """One stretch that both spectra show.

    Attributes
    ----------
    low_ppm, high_ppm : float, ppm
        On the axis of the main spectrum.
    offset_ppm : float, ppm
        What has to be added to the other spectrum's shifts here.
    correlation : float
        Pearson correlation of the two line shapes after smoothing.
    ratio, ratio_sd : float
        Area in the main spectrum over area in the other, and its sd by noise.
    """

    low_ppm: float
    high_ppm: float
    offset_ppm: float
    correlation: float
    ratio: float
    ratio_sd: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Alignment:
    """How another spectrum is laid upon the main one.

    Attributes
    ----------
    offset_ppm, offset_sd_ppm : float, ppm
        Added to the other's shifts.
    scale, scale_sd : float
        Factor on the other's intensities.
    scatter : float
        Relative scatter of the ratios beyond the noise, one sd of a signal.
    signals : tuple of CommonSignal
    n_missing : int
        Signals of the main spectrum without a counterpart.
    """

    offset_ppm: float
    offset_sd_ppm: float
    scale: float
    scale_sd: float
    scatter: float
    signals: tuple[CommonSignal, ...]
    n_missing: int


def align(
    main: Evidence, other: Evidence, windows: Sequence[Range] | None = None
) -> Alignment:
    """Offset and scale that lay another spectrum upon the main one.

    Parameters
    ----------
    main, other : Evidence
    windows : sequence of (low_ppm, high_ppm), optional
        Stretches of the main spectrum to align on, such as signals that do not
        exchange; all of its signals if not given.

    Raises
    ------
    EvidenceError
        If the two have no signal in common, or one axis runs the other way.
    """
    chosen = list(windows) if windows is not None else compound_windows(main)
    if not chosen:
        raise EvidenceError(
            main.metadata.source_name, "there is no signal in it to align on"
        )
    views = _Views.of(main, other)
    rough_ppm = views.rough_offset(chosen)
    found = [views.common(window, rough_ppm) for window in chosen]
    common = [one for one in found if one is not None]
    if len(common) < max(1.0, LEAST_SHARE * len(chosen)):
        raise EvidenceError(other.metadata.source_name, _nothing_common(main, other))
    return _summed_up(_with_ratios(main, other, common), len(chosen) - len(common))


def compound_windows(evidence: Evidence) -> list[Range]:
    """Stretches of the signals that are not solvent, water, reference or weak."""
    strays = [one for one in evidence.strays if one.kind in _FIXED_STRAYS]
    rows = [
        signal
        for signal in evidence.signals
        if not any(
            signal.low_ppm < stray.high_ppm and stray.low_ppm < signal.high_ppm
            for stray in strays
        )
    ]
    largest = max((one.area for one in rows), default=0.0)
    return [(one.low_ppm, one.high_ppm) for one in rows if one.area > 0.02 * largest]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class _Views:
    """Both spectra smoothed, on one grid."""

    top_ppm: float
    step_ppm: float
    main: Floats
    other: Floats

    @classmethod
    def of(cls, main: Evidence, other: Evidence) -> _Views:
        spectra = (main.spectrum, other.spectrum)
        fields = [one.spectrometer_frequency_mhz for one in spectra]
        sigma_ppm = SMOOTHING_HZ / min(fields)
        if not same_field(fields[0], fields[1]):
            sigma_ppm = max(sigma_ppm, FIELDS_APART_SMOOTHING_PPM)
        step_ppm = sigma_ppm / 3.0
        top = max(one.first_point_ppm for one in spectra)
        bottom = min(one.last_point_ppm for one in spectra)
        grid = top - step_ppm * np.arange(int((top - bottom) / step_ppm) + 1)
        smooth = [
            gaussian_filter1d(resampled(one, grid), sigma_ppm / step_ppm)
            for one in spectra
        ]
        return cls(top_ppm=top, step_ppm=step_ppm, main=smooth[0], other=smooth[1])

    def rough_offset(self, windows: Sequence[Range]) -> float:
        """Offset at which most of the windows look alike."""
        reach = round(REACH_PPM / self.step_ppm)
        total = np.zeros(2 * reach + 1)
        for window in windows:
            curve = self._correlations(window, 0.0, reach)
            total += np.clip(curve, 0.0, None)
        return self._lag_ppm(total, reach)

    def common(self, window: Range, rough_ppm: float) -> CommonSignal | None:
        """The window in the other spectrum, if it is there."""
        reach = round(LOCAL_REACH_PPM / self.step_ppm)
        curve = self._correlations(window, rough_ppm, reach)
        best = float(curve.max())
        if best < SAME_SIGNAL:
            return None
        return CommonSignal(
            low_ppm=window[0],
            high_ppm=window[1],
            offset_ppm=rough_ppm + self._lag_ppm(curve, reach),
            correlation=best,
            ratio=1.0,
            ratio_sd=0.0,
        )

    def _correlations(self, window: Range, middle_ppm: float, reach: int) -> Floats:
        """Pearson correlation for the other moved by -reach..reach steps."""
        margin = 6
        first = int((self.top_ppm - window[1]) / self.step_ppm) - margin
        last = int((self.top_ppm - window[0]) / self.step_ppm) + margin + 1
        first, last = max(first, 0), min(last, self.main.size)
        shape = self.main[first:last] - self.main[first:last].mean()
        # Moving the other up by k steps reads it k points further down.
        start = first + round(middle_ppm / self.step_ppm) - reach
        padded = np.pad(self.other, self.other.size)
        start += self.other.size
        piece = padded[start : start + shape.size + 2 * reach]
        rows = np.lib.stride_tricks.sliding_window_view(piece, shape.size)
        centred = rows - rows.mean(axis=1, keepdims=True)
        norms = np.linalg.norm(centred, axis=1) * np.linalg.norm(shape)
        return np.asarray(centred @ shape / np.maximum(norms, 1e-300))

    def _lag_ppm(self, curve: Floats, reach: int) -> float:
        """Place of the maximum, by a parabola through its neighbours."""
        k = int(np.argmax(curve))
        shift = 0.0
        if 0 < k < curve.size - 1:
            left, middle, right = curve[k - 1 : k + 2]
            bend = left - 2.0 * middle + right
            shift = 0.5 * (left - right) / bend if bend < 0.0 else 0.0
        return (k + shift - reach) * self.step_ppm


def _with_ratios(
    main: Evidence, other: Evidence, common: Sequence[CommonSignal]
) -> tuple[CommonSignal, ...]:
    first, second = trace_of(main), trace_of(other)
    rows = []
    for one in common:
        margin_ppm = MARGIN_HZ / min(first.frequency_mhz, second.frequency_mhz)
        low, high = one.low_ppm - margin_ppm, one.high_ppm + margin_ppm
        here = integral(first, low, high)
        there = integral(second, low - one.offset_ppm, high - one.offset_ppm)
        if here.area <= 0.0 or there.area <= 0.0:
            continue
        ratio = here.area / there.area
        sd = ratio * float(np.hypot(here.sd / here.area, there.sd / there.area))
        rows.append(
            CommonSignal(
                low_ppm=one.low_ppm,
                high_ppm=one.high_ppm,
                offset_ppm=one.offset_ppm,
                correlation=one.correlation,
                ratio=ratio,
                ratio_sd=sd,
            )
        )
    if not rows:
        raise EvidenceError(
            other.metadata.source_name, "no common signal has an area in both spectra"
        )
    return tuple(rows)


def _summed_up(signals: tuple[CommonSignal, ...], n_missing: int) -> Alignment:
    offsets = np.array([one.offset_ppm for one in signals])
    offset = _weighted_median(
        offsets, np.array([1.0 / (1.0 - one.correlation + 0.002) for one in signals])
    )
    # 1.2533: sd of a median over that of a mean; 1.4826: median deviation to sd.
    spread = 1.4826 * float(np.median(np.abs(offsets - offset)))
    offset_sd = 1.2533 * max(spread, 1e-4) / np.sqrt(offsets.size)
    scale, scale_sd, scatter = robust_scale(
        np.array([one.ratio for one in signals]),
        np.array([one.ratio_sd for one in signals]),
    )
    return Alignment(
        offset_ppm=offset,
        offset_sd_ppm=float(offset_sd),
        scale=scale,
        scale_sd=scale_sd,
        scatter=scatter,
        signals=signals,
        n_missing=n_missing,
    )


def _weighted_median(values: Floats, weights: Floats) -> float:
    """Median in which signals that look alike count more than those that changed."""
    order = np.argsort(values)
    shares = np.cumsum(weights[order]) - 0.5 * weights[order]
    return float(np.interp(0.5 * weights.sum(), shares, values[order]))


def robust_scale(ratios: Floats, sds: Floats) -> tuple[float, float, float]:
    """Common ratio, its sd, and the relative scatter beyond the noise.

    Parameters
    ----------
    ratios, sds : numpy.ndarray, shape (n,)

    Notes
    -----
    Weighted mean of logarithms with Student weights (four degrees of freedom)
    about the median, so that a signal that lost area does not set the scale; the
    scatter is what the weighted residuals show beyond the noise.
    """
    values, noise = np.log(ratios), sds / ratios
    centre = float(np.median(values))
    scatter = LEAST_SCATTER
    weights = np.ones(values.size)
    for _ in range(20):
        variances = noise**2 + scatter**2
        z2 = (values - centre) ** 2 / variances
        weights = (4.0 + 1.0) / (4.0 + z2) / variances
        centre = float(np.sum(weights * values) / np.sum(weights))
        excess = (values - centre) ** 2 - noise**2
        if values.size > 2:
            # 0.4549: median of a squared normal deviate.
            wide = float(np.median(excess)) / 0.4549
            scatter = float(np.sqrt(max(wide, LEAST_SCATTER**2)))
    few = values.size / max(values.size - 1.0, 0.5)
    sd = float(np.sqrt(few / np.sum(1.0 / (noise**2 + scatter**2))))
    scale = float(np.exp(centre))
    return scale, scale * sd, scatter


def _nothing_common(main: Evidence, other: Evidence) -> str:
    name = main.metadata.source_name
    if runs_backwards(main, other):
        return (
            f"its shift axis runs the other way than that of {name}; turn it round "
            "before the two are compared"
        )
    return (
        f"it has no signal in common with {name} to align on; it may be another "
        "compound"
    )


def runs_backwards(main: Evidence, other: Evidence) -> bool:
    """Whether the other spectrum fits much better with its axis turned round."""
    step_ppm = 0.01
    shapes = []
    for one in (main, other):
        spectrum = one.spectrum
        span = spectrum.first_point_ppm - spectrum.last_point_ppm
        grid = spectrum.first_point_ppm - step_ppm * np.arange(int(span / step_ppm))
        values = np.clip(resampled(spectrum, grid), 0.0, None)
        # The cube root keeps one tall line from deciding alone.
        smooth = np.cbrt(gaussian_filter1d(values, 2.0))
        shapes.append(smooth - np.median(smooth))
    norm = float(np.linalg.norm(shapes[0]) * np.linalg.norm(shapes[1]))
    along = float(correlate(shapes[0], shapes[1]).max()) / norm
    against = float(correlate(shapes[0], shapes[1][::-1]).max()) / norm
    return against > 0.8 and against > along + 0.1
