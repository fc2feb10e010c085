"""Spectra whose lines are known: spin systems, noise, overlap; Hz and protons."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.detection.evidence import gather_evidence
from spinledger.errors import EvidenceError
from spinledger.spins.engine import simulate
from spinledger.values.acquisition import Fid, Metadata
from spinledger.values.evidence import Signal
from spinledger.values.spin_system import SpinSystem

FIELD_MHZ = 600.0
WIDTH_HZ = 9600.0
N_SAMPLES = 16384
CARRIER_PPM = 4.7
LINE_WIDTH_HZ = 1.0
SIGNAL_TO_NOISE = (5.0, 10.0, 30.0, 100.0, 1000.0)
OVERLAPS_HZ = (None, 40.0, 9.0)
LINE_BROADENING_HZ = 0.3


@dataclass(frozen=True, kw_only=True)
class Known:
    """A synthetic FID with what is in it.

    ``signal_to_noise`` is that of the tallest line in the transformed spectrum.
    """

    name: str
    fid: Fid
    frequencies_hz: npt.NDArray[np.float64]
    protons: npt.NDArray[np.float64]
    noise_sd: float
    signal_to_noise: float
    overlap_hz: float | None


def spin_systems() -> dict[str, SpinSystem]:
    """Ten systems, frequencies from their own centre in Hz."""
    return {
        "singlet": _system([3], [0.0], {}),
        "AX": _system([1, 1], [0.0, 900.0], {(0, 1): 7.2}),
        "ethyl": _system([3, 2], [0.0, 1700.0], {(0, 1): 7.1}),
        "isopropyl": _system([6, 1], [0.0, 1000.0], {(0, 1): 6.9}),
        "AMX": _system(
            [1, 1, 1], [0.0, 160.0, 1100.0], {(0, 1): 17.2, (0, 2): 10.4, (1, 2): 1.9}
        ),
        "AB": _system([1, 1], [0.0, 25.0], {(0, 1): 12.1}),
        "ABX": _system(
            [1, 1, 1], [0.0, 42.0, 900.0], {(0, 1): -16.1, (0, 2): 8.8, (1, 2): 3.9}
        ),
        "AA'XX'": _system(
            [1, 1, 1, 1],
            [0.0, 0.0, 280.0, 280.0],
            {
                (0, 2): 8.5,
                (1, 3): 8.5,
                (0, 1): 2.4,
                (2, 3): 2.6,
                (0, 3): 0.4,
                (1, 2): 0.4,
            },
        ),
        "ring": _system(
            [1, 1, 1, 1, 1],
            [0.0, 300.0, 480.0, 900.0, 980.0],
            {(0, 1): 7.9, (1, 2): 9.4, (2, 3): 8.9, (3, 4): -12.3, (2, 4): 2.6},
        ),
        "butyl": _system(
            [3, 2, 2, 2],
            [0.0, 280.0, 420.0, 1500.0],
            {(0, 1): 7.4, (1, 2): 7.5, (2, 3): 6.7},
        ),
    }


def cases() -> Iterator[Known]:
    """Every system at every signal-to-noise, alone and with a second copy near."""
    rng = np.random.default_rng(20240)
    for name, system in spin_systems().items():
        lines = simulate(system, smallest=1e-3)
        protons = lines.intensities.sum(axis=0)
        for overlap_hz in OVERLAPS_HZ:
            frequencies, sizes = _placed(lines.frequencies_hz, protons, overlap_hz)
            for signal_to_noise in SIGNAL_TO_NOISE:
                yield _known(name, frequencies, sizes, signal_to_noise, overlap_hz, rng)


def _system(
    n_spins: list[int],
    frequencies: list[float],
    couplings: dict[tuple[int, int], float],
) -> SpinSystem:
    size = len(n_spins)
    table = np.zeros((size, size))
    for (a, b), j in couplings.items():
        table[a, b] = table[b, a] = j
    return SpinSystem(
        n_spins=np.array(n_spins),
        frequencies_hz=np.array(frequencies),
        couplings_hz=table,
        nuclei=("1H",) * size,
    )


def _placed(
    frequencies_hz: npt.NDArray[np.float64],
    protons: npt.NDArray[np.float64],
    overlap_hz: float | None,
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """On the sweep, off the grid points; a second copy shifted by the overlap."""
    first = frequencies_hz - frequencies_hz.mean() + 123.4567
    if overlap_hz is None:
        return first, protons
    return (
        np.concatenate([first, first + overlap_hz]),
        np.concatenate([protons, 0.7 * protons]),
    )


def decays(
    frequencies_hz: npt.NDArray[np.float64], protons: npt.NDArray[np.float64]
) -> npt.NDArray[np.complex128]:
    """Noise-free FID: every line a decaying exponential from time zero."""
    times = np.arange(N_SAMPLES) / WIDTH_HZ
    rates = 2j * np.pi * frequencies_hz - np.pi * LINE_WIDTH_HZ
    total = np.zeros(N_SAMPLES, dtype=np.complex128)
    for rate, size in zip(rates, protons, strict=True):
        total += size * np.exp(rate * times)
    return total


def tallest_height(
    frequencies_hz: npt.NDArray[np.float64], protons: npt.NDArray[np.float64]
) -> float:
    """Height of the tallest place of the spectrum, in units of sum over samples."""
    width = LINE_WIDTH_HZ + LINE_BROADENING_HZ
    half = width / 2
    apart = frequencies_hz[:, None] - frequencies_hz
    at_lines = (half**2 / (half**2 + apart**2)) @ protons
    return float(at_lines.max()) * WIDTH_HZ / (np.pi * width)


def _known(
    name: str,
    frequencies_hz: npt.NDArray[np.float64],
    protons: npt.NDArray[np.float64],
    signal_to_noise: float,
    overlap_hz: float | None,
    rng: np.random.Generator,
) -> Known:
    clean = decays(frequencies_hz, protons)
    times = np.arange(N_SAMPLES) / WIDTH_HZ
    window_power = float(np.sum(np.exp(-2 * np.pi * LINE_BROADENING_HZ * times)))
    # sd of one channel of the spectrum = sd of one channel of the FID * sqrt(power).
    sd = tallest_height(frequencies_hz, protons) / signal_to_noise
    sd_fid = sd / np.sqrt(window_power)
    noise = rng.normal(size=N_SAMPLES) + 1j * rng.normal(size=N_SAMPLES)
    metadata = Metadata(
        source_name=name,
        sha256="",
        format_name="synthetic",
        nucleus="1H",
        spectrometer_frequency_mhz=FIELD_MHZ,
        solvent=None,
    )
    return Known(
        name=name,
        fid=Fid(
            metadata=metadata,
            samples=clean + sd_fid * noise,
            spectral_width_hz=WIDTH_HZ,
            carrier_ppm=CARRIER_PPM,
        ),
        frequencies_hz=frequencies_hz,
        protons=protons,
        noise_sd=sd_fid,
        signal_to_noise=signal_to_noise,
        overlap_hz=overlap_hz,
    )


def frequency_bound_hz(protons: float, noise_sd: float) -> float:
    """Cramer-Rao bound of a lone line's frequency, phase known, Hz.

    sigma / (2 pi A sqrt(sum t^2 exp(-2 pi w t))) with sigma the noise of one
    channel of the FID: the derivative by frequency is orthogonal to those by
    amplitude and width.
    """
    times = np.arange(N_SAMPLES) / WIDTH_HZ
    power = float(np.sum(times**2 * np.exp(-2 * np.pi * LINE_WIDTH_HZ * times)))
    return noise_sd / (2 * np.pi * protons * np.sqrt(power))


@dataclass(frozen=True, kw_only=True)
class Score:
    """What was made of one synthetic spectrum."""

    signal_to_noise: float
    overlap_hz: float | None
    n_known: int
    n_recalled: int
    n_found: int
    n_false: int
    errors_per_bound: tuple[float, ...]
    integral_errors: tuple[float, ...]


def synthetic_report() -> dict[str, object]:
    """Scores by signal-to-noise and overlap."""
    scores = [score(case) for case in cases()]
    report: dict[str, object] = {}
    for signal_to_noise in SIGNAL_TO_NOISE:
        for overlap_hz in OVERLAPS_HZ:
            chosen = [
                one
                for one in scores
                if one.signal_to_noise == signal_to_noise
                and one.overlap_hz == overlap_hz
            ]
            report[f"S/N {signal_to_noise:g}, overlap {overlap_hz}"] = _summary(chosen)
    strong = [one for one in scores if one.signal_to_noise >= 10]
    report["S/N >= 10"] = _summary(strong)
    return report


def _summary(scores: list[Score]) -> dict[str, float | int | None]:
    errors = np.array([e for one in scores for e in one.errors_per_bound])
    integrals = np.abs([e for one in scores for e in one.integral_errors])
    known = sum(one.n_known for one in scores)
    found = sum(one.n_found for one in scores)
    return {
        "known": known,
        "recall": sum(one.n_recalled for one in scores) / max(known, 1),
        "found": found,
        "false_share": sum(one.n_false for one in scores) / max(found, 1),
        "position_rms_over_bound": float(np.sqrt(np.mean(errors**2)))
        if errors.size
        else None,
        "integral_error_median": float(np.median(integrals))
        if integrals.size
        else None,
        "integral_error_worst": float(integrals.max()) if integrals.size else None,
    }


def score(case: Known) -> Score:
    """Compare what detection finds with what is in the FID.

    Lines closer than 0.9 widths count as one; a line is recalled if one is found
    within 0.75 widths, and demanded if it stands 10 sd high (or the tallest's
    signal-to-noise, where that is less).
    """
    width = LINE_WIDTH_HZ + LINE_BROADENING_HZ
    try:
        evidence = gather_evidence(case.fid)
    except EvidenceError:
        evidence = None
    signals = evidence.signals if evidence else ()
    offset = evidence.reference.offset_ppm if evidence else 0.0
    found = np.array(
        [
            (line.shift_ppm - offset - CARRIER_PPM) * FIELD_MHZ
            for signal in signals
            for line in signal.lines
        ]
    )
    groups = _groups(case, 0.9 * width)
    heights = _heights(case, np.array([group.centre for group in groups]))
    least = min(10.0, case.signal_to_noise) * 0.95
    known = recalled = 0
    errors = []
    for group, height in zip(groups, heights.tolist(), strict=True):
        miss = np.abs(np.clip(found, group.low, group.high) - found)
        hit = bool(found.size) and float(miss.min()) < 0.75 * width
        if min(height, group.alone) < least:
            continue
        known += 1
        recalled += hit
        if hit and group.n_lines == 1 and group.gap > 5.0:
            nearest = found[int(np.argmin(np.abs(found - group.centre)))]
            bound = frequency_bound_hz(group.protons, case.noise_sd)
            errors.append(float(nearest - group.centre) / bound)
    edges = [(group.low, group.high) for group in groups]
    false = sum(
        min(abs(float(np.clip(one, low, high)) - one) for low, high in edges)
        > 0.75 * width
        for one in found.tolist()
    )
    return Score(
        signal_to_noise=case.signal_to_noise,
        overlap_hz=case.overlap_hz,
        n_known=known,
        n_recalled=recalled,
        n_found=found.size,
        n_false=false,
        errors_per_bound=tuple(errors),
        integral_errors=_integral_errors(case, signals, offset),
    )


@dataclass(frozen=True, kw_only=True)
class _Group:
    centre: float
    protons: float
    low: float
    high: float
    n_lines: int
    gap: float
    alone: float


def _groups(case: Known, reach_hz: float) -> list[_Group]:
    order = np.argsort(case.frequencies_hz)
    hz, protons = case.frequencies_hz[order], case.protons[order]
    cuts = np.flatnonzero(np.diff(hz) > reach_hz) + 1
    members = np.split(np.arange(hz.size), cuts)
    centres = [float(hz[m] @ protons[m] / protons[m].sum()) for m in members]
    unit = tallest_height(case.frequencies_hz, case.protons)
    groups = []
    for place, (member, centre) in enumerate(zip(members, centres, strict=True)):
        near = [abs(centre - other) for k, other in enumerate(centres) if k != place]
        size = float(protons[member].sum())
        own = size * WIDTH_HZ / (np.pi * (LINE_WIDTH_HZ + LINE_BROADENING_HZ))
        groups.append(
            _Group(
                centre=centre,
                protons=size,
                low=float(hz[member].min()),
                high=float(hz[member].max()),
                n_lines=member.size,
                gap=min(near, default=np.inf),
                alone=own / unit * case.signal_to_noise,
            )
        )
    return groups


def _heights(case: Known, at_hz: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """Height of the spectrum at given frequencies, in noise sd."""
    half = (LINE_WIDTH_HZ + LINE_BROADENING_HZ) / 2
    shapes = half**2 / (half**2 + (case.frequencies_hz - at_hz[:, None]) ** 2)
    heights = shapes @ case.protons * WIDTH_HZ / (2 * np.pi * half)
    unit = tallest_height(case.frequencies_hz, case.protons)
    return np.asarray(heights / unit * case.signal_to_noise)


def _integral_errors(
    case: Known, signals: tuple[Signal, ...], offset_ppm: float
) -> tuple[float, ...]:
    """Relative errors of signals that hold a line of nearly the full height."""
    errors = []
    heights = _heights(case, case.frequencies_hz)
    for signal in signals:
        low = (signal.low_ppm - offset_ppm - CARRIER_PPM) * FIELD_MHZ
        high = (signal.high_ppm - offset_ppm - CARRIER_PPM) * FIELD_MHZ
        inside = (case.frequencies_hz > low) & (case.frequencies_hz < high)
        if not inside.any():
            continue
        if heights[inside].max() > 0.9 * case.signal_to_noise:
            # One decay exp(-pi w t) sums to an area of half a width per proton.
            expected = float(case.protons[inside].sum()) * WIDTH_HZ / 2
            errors.append(signal.area / expected - 1)
    return tuple(errors)
