"""Line lists drawn as spectra, through the time domain; Hz, unit area per proton.

Every line is a turning phase times the decay of its shape, so that truncation
and window of the measured FID are in the model, derivatives are exact, and the
transform is done once for all lines of a claim.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import numpy.typing as npt
import scipy.fft

from spinledger.processing.transform import apodization_window
from spinledger.values.evidence import LineKernel
from spinledger.values.recipe import Apodize, Recipe
from spinledger.values.spectrum import Spectrum

Floats = npt.NDArray[np.float64]
Singles = npt.NDArray[np.float32]
Complexes = npt.NDArray[np.complex128]
Integers = npt.NDArray[np.int64]

_FOUR_LN_2 = 4.0 * math.log(2.0)
_HALF_LN_2 = 2.0 / _FOUR_LN_2

# Lines are signal with a cubic B-spline on a grid twice as fine as the axis.
_FINER = 2

# The ends of a drawn stretch are joined; at 20 widths a Lorentz line is down to
# 6e-4 of its height.
_PAD_WIDTHS = 20.0

# A Lorentz line of 4 steps width has decayed to exp(-2 pi) = 0.2 % at the end
# of the time that the step can hold.
_SMALLEST_WIDTH_STEPS = 4.0

# Fewer lines are summed one by one, more by way of a grid (measured).
_MOST_DIRECT_LINES = 48


@dataclass(frozen=True, slots=True, kw_only=True)
class FrequencyAxis:
    """Uniform axis, highest frequency first.

    Attributes
    ----------
    first_hz : float, Hz
        Frequency (shift times spectrometer frequency) of point 0.
    step_hz : float, Hz
        Distance of neighbouring points, > 0.
    n_points : int
    """

    first_hz: float
    step_hz: float
    n_points: int

    def __post_init__(self) -> None:
        if not self.step_hz > 0:
            raise ValueError(f"step_hz must be > 0, got {self.step_hz!r}")
        if self.n_points < 2:
            raise ValueError(f"n_points must be 2 or more, got {self.n_points!r}")

    @classmethod
    def of(cls, spectrum: Spectrum) -> FrequencyAxis:
        """Axis of a spectrum."""
        return cls(
            first_hz=spectrum.first_point_ppm * spectrum.spectrometer_frequency_mhz,
            step_hz=spectrum.step_hz,
            n_points=spectrum.n_points,
        )

    def every(self, stride: int) -> FrequencyAxis:
        """Axis of every ``stride``-th point."""
        return FrequencyAxis(
            first_hz=self.first_hz,
            step_hz=self.step_hz * stride,
            n_points=(self.n_points + stride - 1) // stride,
        )

    @property
    def frequencies_hz(self) -> Floats:
        """Frequency of every point, descending."""
        return self.first_hz - self.step_hz * np.arange(self.n_points, dtype=np.float64)


@dataclass(frozen=True, slots=True, kw_only=True)
class Treatment:
    """What acquisition and processing did to the shape of every line.

    Attributes
    ----------
    window : Apodize or None
        Window of the FID. An exponential one is part of the line width and is
        not applied again.
    length_s : float or None, s
        Length of the FID; None if it is not known to be cut.
    """

    window: Apodize | None = None
    length_s: float | None = None

    def factor(self, times_s: Floats) -> Floats:
        """Factor on the decay at times >= 0."""
        factor = np.ones_like(times_s)
        if self.window is not None and self.window.kind != "exponential":
            last = float(times_s[-1]) if self.length_s is None else self.length_s
            step = self.window
            if step.kind == "lorentz_to_gauss":
                # The width is that of the processed line, so what the window
                # takes off or puts on as Lorentz is in it already.
                step = replace(step, kind="gaussian")
            factor = apodization_window(step, times_s, length_s=last)
        if self.length_s is not None:
            factor = factor * (times_s <= self.length_s)
        return np.asarray(factor, dtype=np.float64)


def treatment_of(recipe: Recipe, spectrum: Spectrum) -> Treatment:
    """Window from the recipe, FID length from the processed spectrum itself."""
    window = next((s for s in recipe.steps if isinstance(s, Apodize)), None)
    return Treatment(window=window, length_s=fid_length_s(spectrum))


def fid_length_s(spectrum: Spectrum) -> float | None:
    """Length of the FID that a zero-filled spectrum was made from, s.

    None where the spectrum has no dispersive part, or no zeros were filled in.

    Notes
    -----
    The transform of a zero-filled spectrum falls to (nearly) nothing behind the
    last sample; a baseline that was subtracted only shows near time zero.
    """
    if spectrum.imaginary is None:
        return None
    complex_spectrum = spectrum.intensities + 1j * spectrum.imaginary
    trace = np.abs(scipy.fft.fft(complex_spectrum)) ** 2
    n_blocks = 512
    size = trace.size // n_blocks
    if size < 4:
        return None
    power = trace[: size * n_blocks].reshape(n_blocks, size).mean(axis=1)
    # Descending axis: time runs forward in the forward transform.
    floor = np.median(power[: n_blocks // 4])
    # The end of a digitally filtered FID wraps round; an empty stretch is the sign.
    empty = np.flatnonzero(power[n_blocks // 4 :] < 1e-4 * floor) + n_blocks // 4
    if floor <= 0.0 or empty.size < n_blocks // 16:
        return None
    return float(int(empty[0]) * size / spectrum.spectral_width_hz)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class LineShape:
    """Shape of every line before its own width.

    Attributes
    ----------
    gauss_share : float or None
        Share of a Gauss line of the same width; None is Lorentz without asking
        what a Gauss share would do.
    kernel : LineKernel or None
        Common shape (offsets and weights) that all lines are convolved with.
    extra_width_hz : float, Hz
        Lorentz width that the measured spectrum was broadened by as well.
    treatment : Treatment
    """

    gauss_share: float | None = None
    kernel: LineKernel | None = None
    extra_width_hz: float = 0.0
    treatment: Treatment = Treatment()

    def decay(self, times_s: Floats, width_hz: float) -> Decay:
        """Decay at times >= 0 and its slopes by ln width and by the Gauss share."""
        turns = np.pi * width_hz * times_s
        lorentz = np.exp(-turns)
        common = self._common_factor(times_s)
        share = self.gauss_share
        if share is None:
            value = lorentz * common
            return Decay(value, -turns * value, None)
        gauss = np.exp(-(turns**2) / _FOUR_LN_2)
        by_width = -turns * ((1 - share) * lorentz + share * gauss * turns * _HALF_LN_2)
        return Decay(
            ((1 - share) * lorentz + share * gauss) * common,
            by_width * common,
            (gauss - lorentz) * common,
        )

    def _common_factor(self, times_s: Floats) -> Complexes:
        """Treatment, extra width and kernel: the same for all lines."""
        common = self.treatment.factor(times_s).astype(np.complex128)
        if self.extra_width_hz > 0.0:
            common *= np.exp(-np.pi * self.extra_width_hz * times_s)
        if self.kernel is not None:
            # Positive offsets are higher frequencies: lower on a falling axis.
            turns = 2j * np.pi * times_s[1] * self.kernel.offsets_hz
            waves = _waves(np.asarray(turns), times_s.size)
            common *= (self.kernel.weights @ waves)[: times_s.size]
        return common


@dataclass(frozen=True, slots=True, eq=False)
class Decay:
    """A line's decay and its derivatives at some times."""

    value: Complexes
    by_log_width: Complexes
    by_gauss_share: Complexes | None


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Images:
    """One claim's piece of spectrum and what its parameters do to it.

    Attributes
    ----------
    start : int
        Index of the first point on the axis; may be negative or stand out.
    value : numpy.ndarray, shape (n,), protons per Hz
    by_log_width, by_gauss_share : numpy.ndarray or None, shape (n,)
    by_parameter : numpy.ndarray or None, shape (n_parameters, n)
    """

    start: int
    value: Floats
    by_log_width: Floats | None = None
    by_gauss_share: Floats | None = None
    by_parameter: Singles | None = None


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class LineList:
    """Lines to draw and, where wanted, what moves them.

    Attributes
    ----------
    frequencies_hz, protons : numpy.ndarray, shape (n_lines,)
    d_frequency, d_protons : numpy.ndarray or None, shape (n_lines, n_parameters)
        Derivatives by the parameters whose images are wanted.
    """

    frequencies_hz: Floats
    protons: Floats
    d_frequency: Floats | None = None
    d_protons: Floats | None = None


def draw(
    lines: LineList,
    axis: FrequencyAxis,
    *,
    width_hz: float,
    shape: LineShape,
    pad_hz: float = 40.0,
) -> Images:
    """Spectrum of some lines, and its derivative images, around the lines.

    Parameters
    ----------
    lines : LineList
        With derivatives, the images by width, Gauss share and all parameters
        are given as well.
    axis : FrequencyAxis
    width_hz : float, Hz
        Full width at half maximum as processed.
    shape : LineShape
    pad_hz : float, Hz
        How far beyond the outermost lines the stretch goes, besides 20 widths.

    Notes
    -----
    Against the sum of analytic lines the largest error is below 1e-3 of the
    tallest point for widths of four steps and more (checked in the tests).
    """
    stretch = _Stretch.around(
        lines.frequencies_hz,
        axis,
        width_hz=width_hz + shape.extra_width_hz,
        pad_hz=pad_hz,
    )
    decay = shape.decay(stretch.times_s, width_hz)
    if lines.d_frequency is None:
        signal = stretch.signal(lines.frequencies_hz, lines.protons[None])
        value = stretch.to_axis(signal * decay.value)
        return Images(start=stretch.start, value=value[0])
    signal = stretch.signal(lines.frequencies_hz, lines.protons[None])[0]
    own = [signal * decay.value, signal * decay.by_log_width]
    if decay.by_gauss_share is not None:
        own.append(signal * decay.by_gauss_share)
    images = stretch.to_axis(np.vstack(own))
    return Images(
        start=stretch.start,
        value=images[0],
        by_log_width=images[1],
        by_gauss_share=images[2] if decay.by_gauss_share is not None else None,
        by_parameter=_by_parameter(lines, lines.d_frequency, stretch, decay.value),
    )


def _by_parameter(
    lines: LineList, d_frequency: Floats, stretch: _Stretch, decay: Complexes
) -> Singles:
    """Derivative images, (n_parameters, n); single precision is ample for them."""
    n_parameters = d_frequency.shape[1]
    columns = [d_frequency.T * lines.protons]
    if lines.d_protons is not None:
        columns.append(lines.d_protons.T)
    signal = stretch.signal(lines.frequencies_hz, np.vstack(columns).astype(np.float32))
    # Up in frequency is back on a falling axis: exp(+2 pi i f t).
    moving = ((2j * np.pi * stretch.times_s) * decay).astype(np.complex64)
    moved = signal[:n_parameters] * moving
    if lines.d_protons is not None:
        moved += signal[n_parameters:] * decay.astype(np.complex64)
    return stretch.to_axis(moved)


@dataclass(frozen=True, slots=True, eq=False)
class _Stretch:
    """A piece of the axis long enough that its ends may be joined."""

    start: int
    n_points: int
    axis: FrequencyAxis
    oversampling: int

    @classmethod
    def around(
        cls,
        frequencies_hz: Floats,
        axis: FrequencyAxis,
        *,
        width_hz: float,
        pad_hz: float,
    ) -> _Stretch:
        pad = math.ceil((pad_hz + _PAD_WIDTHS * width_hz) / axis.step_hz)
        places = (axis.first_hz - frequencies_hz) / axis.step_hz
        low = math.floor(float(places.min())) - pad
        high = math.ceil(float(places.max())) + pad
        n_points = scipy.fft.next_fast_len(max(high - low + 1, 16), real=True)
        # A narrow line's decay may outlast what the step can hold: draw finer.
        outlasts = width_hz / axis.step_hz < _SMALLEST_WIDTH_STEPS
        return cls(low, n_points, axis, 2 if outlasts else 1)

    @property
    def n_times(self) -> int:
        """Number of times that are kept."""
        return self.oversampling * self.n_points // 2 + 1

    @property
    def times_s(self) -> Floats:
        """Times of the kept half of the transform, s."""
        n_times = self.n_times
        return np.arange(n_times) / (self.n_points * self.axis.step_hz)

    def signal(
        self, frequencies_hz: Floats, weights: npt.NDArray[Any]
    ) -> npt.NDArray[Any]:
        """Time signals of lines without decay, shape (n_columns, n_times).

        In the precision of the weights.
        """
        places = (self.axis.first_hz - frequencies_hz) / self.axis.step_hz - self.start
        if places.size <= _MOST_DIRECT_LINES:
            turns = np.asarray((-2j * np.pi / self.n_points) * places)
            waves = _waves(turns, self.n_times)
            is_single = weights.dtype == np.float32
            kind = np.dtype(np.complex64 if is_single else np.complex128)
            # Real times complex: one real product over twice the columns.
            parts = weights @ waves.astype(kind, copy=False).view(weights.dtype)
            return np.asarray(parts.view(kind)[:, : self.n_times])
        return self._signal_by_grid(places, weights)

    def _signal_by_grid(
        self, places: Floats, weights: npt.NDArray[Any]
    ) -> npt.NDArray[Any]:
        """Lines spread with a cubic B-spline on a grid twice as fine as needed.

        The spline's own transform is divided out; what folds back from beyond
        the fine grid is below 1e-5 where lines have decayed at its end.
        """
        finer = 2 * self.oversampling
        n_fine = finer * self.n_points
        fine = places * finer
        nearest = np.floor(fine)
        splines = _cubic_spline(fine - nearest)
        cells = (nearest.astype(np.int64)[:, None] + np.arange(-1, 3)) % n_fine
        n_columns = weights.shape[0]
        cells = cells + n_fine * np.arange(n_columns)[:, None, None]
        shares = weights[:, :, None] * splines
        grid = np.bincount(
            cells.ravel(), weights=shares.ravel(), minlength=n_columns * n_fine
        ).reshape(n_columns, n_fine)
        grid = grid.astype(weights.dtype, copy=False)
        signal = scipy.fft.rfft(grid, axis=1)[:, : self.n_times]
        smoothed = np.sinc(np.arange(self.n_times) / n_fine) ** -4
        return np.asarray(signal * smoothed.astype(weights.dtype, copy=False))

    def to_axis(self, signal: npt.NDArray[Any]) -> npt.NDArray[Any]:
        """Real spectra per Hz, shape (n_rows, n_points)."""
        n_drawn = self.oversampling * self.n_points
        images = scipy.fft.irfft(signal, n=n_drawn, axis=1)[:, :: self.oversampling]
        return np.asarray(images * (self.oversampling / self.axis.step_hz))


def _waves(turns: Complexes, n_times: int) -> Complexes:
    """exp(turns * k) for k = 0 ... n_times - 1 and a few more, shape (n, ...).

    The wave at a + m b is that at a times that at m b, so that few exponentials
    are needed.
    """
    n_low = math.isqrt(n_times - 1) + 1
    n_high = -(-n_times // n_low)
    low = np.exp(turns[:, None] * np.arange(n_low))
    high = np.exp(turns[:, None] * (n_low * np.arange(n_high)))
    return np.asarray((high[:, :, None] * low[:, None, :]).reshape(turns.size, -1))


def _cubic_spline(part: Floats) -> Floats:
    """Weights of the four grid points around, shape (n, 4); they add up to 1."""
    rest = 1.0 - part
    return np.column_stack(
        [
            rest**3 / 6.0,
            (4.0 - 6.0 * part**2 + 3.0 * part**3) / 6.0,
            (4.0 - 6.0 * rest**2 + 3.0 * rest**3) / 6.0,
            part**3 / 6.0,
        ]
    )


def add_to(total: Floats, images: Images, *, amplitude: float = 1.0) -> None:
    """Add a claim's piece to a whole spectrum in place, clipped at its ends."""
    begin = max(images.start, 0)
    end = min(images.start + images.value.size, total.size)
    if begin < end:
        piece = images.value[begin - images.start : end - images.start]
        total[begin:end] += amplitude * piece
