"""Measure processing and detection on acquired and synthetic spectra; prints JSON.

usage: python tests/benchmarks/processing.py [--only NAME ...] [--part PART ...]

Parts: maker (against the maker's own processed spectrum), reference (against
published shifts on the DSS scale, and CHCl3), stress (added noise and first-order
phase), synthetic (lines that are known), time (with nmrglue's autops as yardstick).
"""

from __future__ import annotations

import argparse
import contextlib
import io
import json
import re
import sys
import time
from dataclasses import asdict, dataclass, replace
from itertools import pairwise
from pathlib import Path
from typing import Any

import nmrglue
import numpy as np
import numpy.typing as npt
import scipy.fft

from spinledger.detection.evidence import evidence_from, gather_evidence
from spinledger.io.read import read_acquired
from spinledger.lines.derivative import complex_second_derivative
from spinledger.lines.noise import noise_sd
from spinledger.processing.automatic import ProcessedSpectrum, process
from spinledger.processing.automatic_phase import automatic_phase
from spinledger.processing.found_regions import FoundRegions, found_regions
from spinledger.processing.phase import phased, sweep_positions
from spinledger.processing.recipe import (
    Transformed,
    find_step,
    finish,
    transform,
    with_step,
)
from spinledger.processing.tail_phase import tail_correction
from spinledger.spins.engine import simulate
from spinledger.values.acquisition import Fid
from spinledger.values.evidence import Evidence
from spinledger.values.recipe import Apodize, Phase, Recipe, ZeroFill
from spinledger.values.spectrum import Spectrum
from spinledger.values.spin_system import SpinSystem, Transitions

sys.path[:0] = [str(Path(__file__).resolve().parents[1]), str(Path(__file__).parent)]
from synthetic_lines import synthetic_report  # noqa: E402 - the same

from shared_data import SHARED  # noqa: E402 - a sibling, found by the line above

WATER_HALF_PPM = 0.25
N_YARDSTICK = 8
STRESSES = (
    ("slope", 200.0),
    ("slope", -350.0),
    ("slope", 350.0),
    ("noise", 5.0),
    ("noise", 15.0),
    ("noise", 50.0),
)


@dataclass(frozen=True, kw_only=True)
class Dataset:
    """One acquired set: the raw data, and the maker's spectrum where there is one."""

    name: str
    folder: Path
    raw: Path
    maker: Path | None


@dataclass(frozen=True, eq=False, kw_only=True)
class Published:
    """Simulated lines of published shifts and J, one row a group of protons."""

    lines: Transitions
    n_groups: int


@dataclass(frozen=True, kw_only=True)
class Stressed:
    """One stress run: its worst phase error and the error that was foretold."""

    name: str
    kind: str
    signal_to_noise: float
    error_deg: float
    sd_deg: float


def datasets(only: list[str]) -> list[Dataset]:
    """All sets that can be read, with their maker's spectrum."""
    found = []
    for folder in sorted((SHARED / "acquired").iterdir()):
        if not (folder / "truth.json").exists() or folder.name.startswith("neg_"):
            continue
        if only and not any(word in folder.name for word in only):
            continue
        found.append(_dataset(folder))
    return found


def _dataset(folder: Path) -> Dataset:
    raw = folder / "raw"
    for pattern in ("**/acqus", "**/procpar"):
        hits = sorted(raw.glob(pattern))
        if hits:
            place = hits[0].parent
            has_maker = (place / "pdata" / "1" / "1r").exists()
            return Dataset(
                name=folder.name,
                folder=folder,
                raw=place,
                maker=place if has_maker else None,
            )
    for pattern in ("**/*.jdf", "**/*fid.dx", "**/*.dx", "**/*.jdx"):
        hits = sorted(raw.glob(pattern))
        if hits:
            maker = hits[0].parent / "1h.dx"
            return Dataset(
                name=folder.name,
                folder=folder,
                raw=hits[0],
                maker=maker if maker.exists() and maker != hits[0] else None,
            )
    raise SystemExit(f"no dataset under {raw}")


def maker_line_broadening(dataset: Dataset) -> float:
    """LB of the maker's processing, Hz, as the header writes it."""
    assert dataset.maker is not None
    if dataset.maker.is_dir():
        text = (dataset.maker / "pdata" / "1" / "procs").read_text(errors="replace")
    else:
        text = dataset.maker.read_text(errors="replace")
    match = re.search(r"##\$LB= *([-\d.eE+]+)", text)
    return float(match.group(1)) if match else 0.3


def aligned(ours: Spectrum, maker: Spectrum) -> npt.NDArray[np.complex128]:
    """Our complex spectrum shifted onto the maker's grid, found by correlation."""
    assert ours.imaginary is not None
    values = ours.intensities + 1j * ours.imaginary
    theirs = maker.intensities.astype(np.complex128)
    if maker.imaginary is not None:
        theirs.imag = maker.imaginary
    a = np.abs(complex_second_derivative(values, step_hz=ours.step_hz, sigma_hz=0.8))
    b = np.abs(complex_second_derivative(theirs, step_hz=maker.step_hz, sigma_hz=0.8))
    lags = np.real(scipy.fft.ifft(scipy.fft.fft(b) * np.conj(scipy.fft.fft(a))))
    top = int(np.argmax(lags))
    left, mid, right = lags[top - 1], lags[top], lags[(top + 1) % lags.size]
    shift = top + 0.5 * (left - right) / (left - 2 * mid + right)
    turns = np.exp(-2j * np.pi * scipy.fft.fftfreq(values.size) * shift)
    return np.asarray(scipy.fft.ifft(scipy.fft.fft(values) * turns))


@dataclass(frozen=True, slots=True)
class BothSides:
    """Our spectrum and the maker's, made alike and laid on one grid."""

    fid: Fid
    recipe: Recipe
    processed: ProcessedSpectrum
    ours: Spectrum
    maker: Spectrum
    shifted: npt.NDArray[np.complex128]


def both_sides(dataset: Dataset) -> BothSides:
    """Our chain with the maker's window and size, beside the maker's result."""
    assert dataset.maker is not None
    fid = read_acquired(dataset.raw)
    made = read_acquired(dataset.maker, prefer_processed=True)
    assert isinstance(fid, Fid)
    assert not isinstance(made, Fid)
    maker = made.spectrum
    processed = process(fid)
    recipe = processed.run.recipe
    broadening = maker_line_broadening(dataset)
    apodize = Apodize(kind="exponential", line_broadening_hz=broadening)
    recipe = with_step(with_step(recipe, apodize), ZeroFill(n_points=maker.n_points))
    ours = finish(transform(fid, recipe), recipe)
    return BothSides(
        fid=fid,
        recipe=recipe,
        processed=processed,
        ours=ours,
        maker=maker,
        shifted=aligned(ours, maker),
    )


def against_maker(dataset: Dataset) -> dict[str, object]:
    """Correlation and phase error against the maker's spectrum."""
    both = both_sides(dataset)
    fid, recipe, processed = both.fid, both.recipe, both.processed
    ours, maker, shifted = both.ours, both.maker, both.shifted
    evidence = evidence_from(processed)
    spans = analyte_spans(evidence, ours)
    theirs = maker.intensities.astype(np.complex128)
    worst_region = min(
        (pearson(shifted.real[a:b], theirs.real[a:b]) for a, b in spans), default=None
    )
    inside = np.concatenate([np.arange(a, b) for a, b in spans])
    result: dict[str, object] = {
        "correlation": pearson(shifted.real[inside], theirs.real[inside]),
        "worst_region": worst_region,
        "phase_error_deg": None,
        "phase_sd_deg": processed.quality.phase_sd_deg,
    }
    if maker.imaginary is not None:
        theirs.imag = maker.imaginary
        angles = phase_differences(shifted, theirs, spans, maker.step_hz)
        result["phase_error_deg"] = float(np.abs(angles).max())
        # Which of the two is off: what the tails of the lines ask of each.
        regions = found_regions(
            replace(transform(fid, recipe), values=shifted),
            water_at_carrier=processed.presaturated,
        )
        result["tails_ask_of_ours_deg"] = tails_ask_deg(shifted, regions, ours)
        result["tails_ask_of_maker_deg"] = tails_ask_deg(theirs, regions, ours)
    return result


def tails_ask_deg(
    values: npt.NDArray[np.complex128], regions: FoundRegions, grid: Spectrum
) -> float:
    """Largest phase error that the tails beside strong lines show, deg."""
    asked = tail_correction(
        values, regions.kept, dropped=regions.dropped, step_hz=grid.step_hz
    )
    x = sweep_positions(values.size)[regions.kept.peaks]
    angles = np.abs(asked.constant_rad + asked.slope_rad * x)
    return float(np.degrees(angles.max(initial=0.0)))


def pearson(a: npt.NDArray[np.float64], b: npt.NDArray[np.float64]) -> float:
    """Correlation coefficient of two stretches."""
    return float(np.corrcoef(a, b)[0, 1])


def phase_differences(
    ours: npt.NDArray[np.complex128],
    theirs: npt.NDArray[np.complex128],
    spans: list[tuple[int, int]],
    step_hz: float,
) -> npt.NDArray[np.float64]:
    """Phase difference in every region, deg, on second derivatives.

    These do not feel what the maker's program did to the baseline of the real
    part alone.
    """
    a = complex_second_derivative(ours, step_hz=step_hz, sigma_hz=0.5)
    b = complex_second_derivative(theirs, step_hz=step_hz, sigma_hz=0.5)
    return np.array(
        [np.degrees(np.angle(np.sum(a[i:j] * np.conj(b[i:j])))) for i, j in spans]
    )


def analyte_spans(evidence: Evidence, grid: Spectrum) -> list[tuple[int, int]]:
    """Point ranges of the signals that are not water and above S/N 20."""
    spans = []
    for signal in evidence.signals:
        wet = any(
            stray.kind == "water"
            and stray.low_ppm < signal.high_ppm
            and stray.high_ppm > signal.low_ppm
            for stray in evidence.strays
        )
        piece = evidence.spectrum.intensities[
            evidence.spectrum.window(signal.low_ppm, signal.high_ppm)
        ]
        near_water = (
            evidence.presaturated
            and abs((signal.low_ppm + signal.high_ppm) / 2 - 4.75) < WATER_HALF_PPM
        )
        if wet or near_water or piece.max() < 20 * evidence.noise_sd:
            continue
        spans.append(
            (grid.index_of_ppm(signal.high_ppm), grid.index_of_ppm(signal.low_ppm) + 1)
        )
    return spans


def part_maker(only: list[str]) -> dict[str, object]:
    """All sets that have a maker's spectrum."""
    rows = {}
    for dataset in datasets(only):
        if dataset.maker is None or not isinstance(read_acquired(dataset.raw), Fid):
            continue
        rows[dataset.name] = against_maker(dataset)
    correlations = [float(row["correlation"]) for row in rows.values()]
    errors = [
        float(row["phase_error_deg"])
        for row in rows.values()
        if row["phase_error_deg"] is not None
    ]
    return {
        "n": len(rows),
        "correlation_median": float(np.median(correlations)),
        "correlation_worst": min(correlations),
        "phase_error_median_deg": float(np.median(errors)),
        "phase_error_p90_deg": float(np.quantile(errors, 0.9)),
        "phase_error_worst_deg": max(errors),
        "rows": rows,
    }


def published_lines(truth: dict[str, Any], field_mhz: float) -> Published | None:
    """Simulated lines of every published shift; None where there are no J."""
    if not truth.get("protons") or not truth.get("j_hz"):
        return None
    labels = list(dict.fromkeys(p["label"] for p in truth["protons"]))
    shift = {p["label"]: p["shift_ppm"] for p in truth["protons"]}
    couplings = {}
    for a, b, j_hz in truth["j_hz"]:
        couplings[a, b] = couplings[b, a] = j_hz
    groups: list[list[str]] = []
    for label in labels:
        home = next(
            (
                group
                for group in groups
                if abs(shift[group[0]] - shift[label]) < 1e-7
                and all(
                    abs(
                        couplings.get((group[0], x), 0.0)
                        - couplings.get((label, x), 0.0)
                    )
                    < 1e-6
                    for x in labels
                    if x not in (group[0], label)
                )
            ),
            None,
        )
        if home is None:
            groups.append([label])
        else:
            home.append(label)
    table = np.array(
        [
            [0.0 if a is b else couplings.get((a[0], b[0]), 0.0) for b in groups]
            for a in groups
        ]
    )
    if sum(len(group) for group in groups) > 13:
        return None
    system = SpinSystem(
        n_spins=np.array([len(group) for group in groups]),
        frequencies_hz=np.array([shift[group[0]] * field_mhz for group in groups]),
        couplings_hz=table,
        nuclei=("1H",) * len(groups),
    )
    return Published(lines=simulate(system), n_groups=len(groups))


def axis_offset_ppm(evidence: Evidence, published: Published) -> float | None:
    """Median over the published multiplets of where they correlate best, ppm."""
    spectrum = evidence.spectrum
    frequency = spectrum.spectrometer_frequency_mhz
    offsets = []
    for row in published.lines.intensities:
        strong = row > 0.02 * row.max()
        lines, sizes = published.lines.frequencies_hz[strong], row[strong]
        if abs(lines.mean() / frequency - 4.75) < WATER_HALF_PPM:
            continue
        window = spectrum.window(
            (lines.min() - 12) / frequency, (lines.max() + 12) / frequency
        )
        x = spectrum.shifts_ppm[window] * frequency
        y = spectrum.intensities[window] - np.median(spectrum.intensities[window])
        if x.size < 30:
            continue
        moves = np.arange(-10.0, 10.05, 0.1)
        models = np.array(
            [
                (sizes / (1 + ((x[:, None] - lines - move) / 0.7) ** 2)).sum(axis=1)
                for move in moves
            ]
        )
        models -= models.mean(axis=1, keepdims=True)
        scores = models @ y / np.sqrt((models**2).sum(axis=1) * (y @ y))
        top = int(np.argmax(scores))
        if scores[top] < 0.5 or top in (0, moves.size - 1):
            continue
        left, mid, right = scores[top - 1 : top + 2]
        fine = 0.5 * (left - right) / (left - 2 * mid + right)
        offsets.append((moves[top] + 0.1 * fine) / frequency)
    return float(np.median(offsets)) if offsets else None


def part_reference(only: list[str]) -> dict[str, object]:
    """Where our zero stands against published shifts; CHCl3 on our axis."""
    offsets, chloroform = {}, {}
    for dataset in datasets(only):
        evidence = gather_evidence(read_acquired(dataset.raw))
        truth = json.loads((dataset.folder / "truth.json").read_text())
        if evidence.reference.by == "DSS" and dataset.name.startswith("br_"):
            published = published_lines(
                truth, evidence.spectrum.spectrometer_frequency_mhz
            )
            offset = axis_offset_ppm(evidence, published) if published else None
            if offset is not None:
                offsets[dataset.name] = offset
        if truth["solvent"] == "CDCl3":
            solvent = [one for one in evidence.strays if one.kind == "solvent"]
            chloroform[dataset.name] = {
                "by": evidence.reference.by,
                "chloroform_ppm": (solvent[0].low_ppm + solvent[0].high_ppm) / 2
                if solvent
                else None,
            }
    errors = np.abs(list(offsets.values())) if offsets else np.zeros(0)
    return {
        "dss_sets": len(offsets),
        "offset_median_ppm": float(np.median(errors)) if errors.size else None,
        "offset_worst_ppm": float(errors.max()) if errors.size else None,
        "offsets_ppm": offsets,
        "chloroform": chloroform,
    }


def part_stress(only: list[str]) -> dict[str, object]:
    """Phase under added noise and extra first-order phase, random zero order."""
    rows = []
    for dataset in datasets(only):
        if dataset.maker is None:
            continue
        fid = read_acquired(dataset.raw)
        made = read_acquired(dataset.maker, prefer_processed=True)
        if not isinstance(fid, Fid) or isinstance(made, Fid):
            continue
        if made.spectrum.imaginary is not None:
            rows += stressed(dataset, fid, made.spectrum)
    return {
        "by_kind": by_kind(rows),
        "by_signal_to_noise": by_signal_to_noise(rows),
        "flagged": flagged(rows),
        "over_5_deg": [asdict(row) for row in rows if row.error_deg > 5],
        "n": len(rows),
    }


def stressed(dataset: Dataset, fid: Fid, maker: Spectrum) -> list[Stressed]:
    """All stress runs of one set, against the maker's phase."""
    processed = process(fid)
    recipe = processed.run.recipe
    comparable = with_step(
        with_step(
            recipe,
            Apodize(
                kind="exponential", line_broadening_hz=maker_line_broadening(dataset)
            ),
        ),
        ZeroFill(n_points=maker.n_points),
    )
    ours = finish(transform(fid, comparable), comparable)
    shifted = aligned(ours, maker)
    spans = analyte_spans(evidence_from(processed), ours)
    assert maker.imaginary is not None
    theirs = maker.intensities + 1j * maker.imaginary
    angles = phase_differences(shifted, theirs, spans, maker.step_hz)
    middles = [(a + b) // 2 for a, b in spans]
    x = sweep_positions(maker.n_points)[middles]
    phase = find_step(recipe, Phase)
    assert phase is not None
    true_deg = phase.phase0_deg + phase.phase1_deg * x - angles
    heights = np.array([ours.intensities[a:b].max() for a, b in spans])
    sd = noise_sd(ours.intensities)
    rng = np.random.default_rng(len(dataset.name))
    rows = []
    for kind, size in STRESSES:
        values, extra = stress(fid, recipe, kind, size, rng)
        regions = found_regions(values, water_at_carrier=processed.presaturated)
        found = automatic_phase(values, regions)
        ratio = heights / sd / (size if kind == "noise" else 1.0)
        visible = ratio > 20
        if found is None or not visible.any():
            continue
        miss = found.step.phase0_deg + found.step.phase1_deg * x
        miss = miss + extra.phase0_deg + extra.phase1_deg * x - true_deg
        miss = (miss + 180) % 360 - 180
        rows.append(
            Stressed(
                name=dataset.name,
                kind=f"{kind} {size:g}",
                signal_to_noise=float(np.median(ratio)),
                error_deg=float(np.abs(miss[visible]).max()),
                sd_deg=found.sd_deg,
            )
        )
    return rows


def stress(
    fid: Fid, recipe: Recipe, kind: str, size: float, rng: np.random.Generator
) -> tuple[Transformed, Phase]:
    """A transformed FID with noise or phase put on, and the phase put on."""
    extra = Phase(
        phase0_deg=float(rng.uniform(-180, 180)),
        phase1_deg=size if kind == "slope" else 0.0,
    )
    plain = transform(fid, recipe)
    if kind == "noise":
        level = noise_sd(plain.values) * np.sqrt(size**2 - 1)
        window = find_step(recipe, Apodize)
        assert window is not None
        times = np.arange(fid.samples.size) / fid.spectral_width_hz
        power = np.sum(np.exp(-2 * np.pi * window.line_broadening_hz * times))
        noise = rng.normal(size=(2, fid.samples.size)) * level / np.sqrt(power)
        noisy = replace(fid, samples=fid.samples + noise[0] + 1j * noise[1])
        plain = transform(noisy, recipe)
    return replace(plain, values=phased(plain.values, extra)), extra


def by_kind(rows: list[Stressed]) -> dict[str, dict[str, float]]:
    """Median, 90 % and worst error of every kind of stress."""
    return {
        kind: {
            "n": len(errors),
            "median_deg": float(np.median(errors)),
            "p90_deg": float(np.quantile(errors, 0.9)),
            "worst_deg": max(errors),
        }
        for kind in dict.fromkeys(row.kind for row in rows)
        if (errors := [row.error_deg for row in rows if row.kind == kind])
    }


def by_signal_to_noise(rows: list[Stressed]) -> dict[str, dict[str, float]]:
    """Median and 90 % error by the median signal-to-noise of the regions."""
    edges = (0.0, 20.0, 40.0, 80.0, 150.0, 400.0, np.inf)
    return {
        f"{low:g} to {high:g}": {
            "n": len(errors),
            "median_deg": float(np.median(errors)),
            "p90_deg": float(np.quantile(errors, 0.9)),
        }
        for low, high in pairwise(edges)
        if (errors := [r.error_deg for r in rows if low <= r.signal_to_noise < high])
    }


def flagged(rows: list[Stressed]) -> dict[str, int]:
    """How many results over 10 degrees the quality figure warns of."""
    bad = [row for row in rows if row.error_deg > 10]
    return {
        "over_10_deg": len(bad),
        "of_these_flagged": sum(row.sd_deg > 3 for row in bad),
        "flagged_of_all": sum(row.sd_deg > 3 for row in rows),
    }


def part_synthetic(only: list[str]) -> dict[str, object]:
    """Recall, false lines, position against the bound, integrals."""
    del only
    return synthetic_report()


def part_time(only: list[str]) -> dict[str, object]:
    """CPU seconds from FID to evidence, one core, imports and reading apart."""
    rows, yardstick = {}, {}
    for dataset in datasets(only):
        fid = read_acquired(dataset.raw)
        gather_evidence(fid)
        begin = time.process_time()
        gather_evidence(fid)
        rows[dataset.name] = time.process_time() - begin
        if isinstance(fid, Fid) and len(yardstick) < N_YARDSTICK:
            values = transform(fid, process(fid).run.recipe).values[::-1]
            begin = time.process_time()
            with contextlib.redirect_stdout(io.StringIO()):
                nmrglue.process.proc_autophase.autops(values, "acme")
            yardstick[dataset.name] = time.process_time() - begin
    ratios = [yardstick[name] / rows[name] for name in yardstick]
    return {
        "median_s": float(np.median(list(rows.values()))),
        "worst_s": max(rows.values()),
        "nmrglue_autops_over_whole_chain": float(np.median(ratios)) if ratios else None,
        "rows": rows,
    }


def main() -> None:
    """Run the chosen parts and print one JSON object."""
    parts = {
        "maker": part_maker,
        "reference": part_reference,
        "stress": part_stress,
        "synthetic": part_synthetic,
        "time": part_time,
    }
    parser = argparse.ArgumentParser()
    parser.add_argument("--only", nargs="*", default=[])
    parser.add_argument("--part", nargs="*", default=list(parts), choices=list(parts))
    options = parser.parse_args()
    print(
        json.dumps({name: parts[name](options.only) for name in options.part}, indent=1)
    )


if __name__ == "__main__":
    main()
