"""Synthetic shake pairs with known exchanged fractions, no detection in between."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from spinledger.lines.noise import noise_sd
from spinledger.sample.exchanged import Plot
from spinledger.values.acquisition import Metadata
from spinledger.values.evidence import Evidence, ProcessingQuality, Signal
from spinledger.values.recipe import Recipe, Reference
from spinledger.values.spectrum import Spectrum

FIELD_MHZ = 400.0
WIDTH_HZ = 6400.0
N_POINTS = 8192
CARRIER_PPM = 5.0

Line = tuple[float, float, float]  # shift in ppm, area in protons, width in Hz


@dataclass(frozen=True)
class ShakePair:
    """Evidence before and after, where the claims stand, and what is true."""

    before: Evidence
    after: Evidence
    plots: tuple[Plot, ...]
    fractions: dict[str, float]
    waters: tuple[tuple[float, float], ...]


def evidence_of_lines(
    lines: list[Line],
    rng: np.random.Generator,
    *,
    noise: float,
    receiver_gain: float = 1.0,
    name: str = "synthetic",
    solvent: str | None = "CDCl3",
) -> Evidence:
    """Spectrum of Lorentz lines through a noisy FID that is zero filled once."""
    times_s = np.arange(N_POINTS) / WIDTH_HZ
    fid = np.zeros(N_POINTS, dtype=np.complex128)
    for shift_ppm, area, width_hz in lines:
        at_hz = (shift_ppm - CARRIER_PPM) * FIELD_MHZ
        fid += area * np.exp((2j * np.pi * at_hz - np.pi * width_hz) * times_s)
    fid += noise * (rng.standard_normal(N_POINTS) + 1j * rng.standard_normal(N_POINTS))
    fid[0] *= 0.5
    # 0.3 Hz of exponential window, as common recipes have.
    fid *= receiver_gain * np.exp(-np.pi * 0.3 * times_s)
    points = np.fft.fftshift(np.fft.fft(fid, 2 * N_POINTS)).real / WIDTH_HZ
    spectrum = Spectrum(
        intensities=points[::-1],
        first_point_ppm=CARRIER_PPM + (0.5 - 0.5 / N_POINTS) * WIDTH_HZ / FIELD_MHZ,
        spectral_width_hz=WIDTH_HZ,
        spectrometer_frequency_mhz=FIELD_MHZ,
    )
    return Evidence(
        metadata=Metadata(
            source_name=name,
            sha256="0" * 64,
            format_name="synthetic",
            nucleus="1H",
            spectrometer_frequency_mhz=FIELD_MHZ,
            solvent=solvent,
        ),
        recipe=Recipe(steps=()),
        reference=Reference(offset_ppm=0.0, by="TMS", sd_ppm=0.001),
        spectrum=spectrum,
        noise_sd=noise_sd(spectrum.intensities),
        solvent=solvent,
        solvent_seen=solvent,
        solvent_header=solvent,
        signals=tuple(_signal(line) for line in sorted(lines, reverse=True)),
        strays=(),
        quality=ProcessingQuality(phase_sd_deg=0.1, baseline_sd=1.0),
    )


def _signal(line: Line) -> Signal:
    reach_ppm = 10.0 * line[2] / FIELD_MHZ
    return Signal(
        low_ppm=line[0] - reach_ppm,
        high_ppm=line[0] + reach_ppm,
        area=line[1],
        area_sd=0.01 * line[1],
        lines=(),
    )


def multiplet(
    shift_ppm: float, protons: float, js_hz: list[float], width_hz: float
) -> list[Line]:
    """First-order lines of a signal that couples to one proton with each J."""
    shifts = np.array([shift_ppm])
    for j_hz in js_hz:
        half_ppm = j_hz / 2.0 / FIELD_MHZ
        shifts = np.concatenate([shifts - half_ppm, shifts + half_ppm])
    return [(float(at), protons / shifts.size, width_hz) for at in shifts]


def draw_pair(rng: np.random.Generator) -> ShakePair:
    """One tube: four to six steady signals, an OH beside a CH, and an NH.

    The OH stands alone or among a CH2; its J to the CH collapses with it. After
    the shake there is HOD, another gain, another shim and another zero point.
    """
    places = rng.permutation(np.array([0.9, 1.5, 2.1, 3.1, 6.9, 7.6]))
    steady = [
        (f"C{k}", float(p), float(rng.integers(1, 4)))
        for k, p in enumerate(places[: rng.integers(4, 7)])
    ]
    width_hz, after_width_hz = rng.uniform(0.8, 2.0, size=2)
    oh_ppm = float(rng.choice([2.6, 2.13 if 2.1 in places[:4] else 2.6]))
    oh_width_hz, nh_width_hz = rng.uniform(2.0, 18.0), rng.uniform(4.0, 20.0)
    fractions = {"OH": float(rng.uniform()), "NH": float(rng.uniform())}
    j_oh_hz = float(rng.uniform(3.0, 8.0))
    before: list[Line] = []
    after: list[Line] = []
    plots: list[Plot] = []
    for name, shift, protons in steady:
        js = [float(j) for j in rng.uniform(4.0, 9.0, size=rng.integers(0, 3))]
        before += multiplet(shift, protons, js, width_hz)
        after += multiplet(shift, protons, js, after_width_hz)
        plots.append(plot_of(name, protons, shift, js, width_hz, may_exchange=False))
    gone = fractions["OH"]
    before += multiplet(3.9, 1.0, [6.5, j_oh_hz], width_hz)
    after += multiplet(3.9, 1.0 - gone, [6.5, j_oh_hz], after_width_hz)
    after += multiplet(3.9, gone, [6.5], after_width_hz)
    plots.append(plot_of("CH", 1.0, 3.9, [6.5, j_oh_hz], width_hz, may_exchange=False))
    for name, shift, wide, js in (
        ("OH", oh_ppm, oh_width_hz, [j_oh_hz]),
        ("NH", 8.4, nh_width_hz, []),
    ):
        # The shim is in every width, what exchange adds comes on top.
        own_hz = width_hz + wide
        before += multiplet(shift, 1.0, js, own_hz)
        left = 1.0 - fractions[name]
        after += multiplet(shift, left, js, after_width_hz + wide)
        plots.append(plot_of(name, 1.0, shift, js, own_hz, may_exchange=True))
    after.append((4.75, float(rng.uniform(0.3, 5.0)), 4.0))
    offset_ppm = float(rng.normal(0.0, 0.01))
    after = [(at + offset_ppm, area, wide) for at, area, wide in after]
    noise = float(10.0 ** rng.uniform(-2.6, -1.2))
    gain = float(rng.uniform(0.3, 3.0))
    return ShakePair(
        before=evidence_of_lines(before, rng, noise=noise, name="before"),
        after=evidence_of_lines(
            after, rng, noise=noise, receiver_gain=gain, name="after"
        ),
        plots=tuple(plots),
        fractions=fractions,
        waters=((4.65, 4.85),),
    )


def plot_of(
    name: str,
    protons: float,
    shift_ppm: float,
    js_hz: list[float],
    width_hz: float,
    *,
    may_exchange: bool,
) -> Plot:
    """Where a first-order signal stands."""
    half_ppm = sum(js_hz) / 2.0 / FIELD_MHZ
    return Plot(
        claim=name,
        n_protons=protons,
        low_ppm=shift_ppm - half_ppm,
        high_ppm=shift_ppm + half_ppm,
        width_hz=width_hz,
        frequency_mhz=FIELD_MHZ,
        may_exchange=may_exchange,
    )
