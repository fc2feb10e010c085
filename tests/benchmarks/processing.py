"""Measure processing and detection on acquired and synthetic spectra; prints JSON.

usage: python tests/benchmarks/processing.py [--only NAME ...] [--part PART ...]

Parts: maker (against the maker's own processed spectrum), reference (against
published shifts on the DSS scale), synthetic (lines that are known), time.
"""

from __future__ import annotations

import argparse
import json
import re
import sys
import time
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
import numpy.typing as npt
import scipy.fft

from spinledger.detection.evidence import evidence_from, gather_evidence
from spinledger.io.read import read_acquired
from spinledger.lines.derivative import complex_second_derivative
from spinledger.processing.automatic import process
from spinledger.processing.phase import phased
from spinledger.processing.recipe import find_step, finish, transform, with_step
from spinledger.values.acquisition import Acquired, Fid
from spinledger.values.evidence import Evidence
from spinledger.values.recipe import Apodize, Phase, Recipe, Reference, ZeroFill
from spinledger.values.spectrum import Spectrum

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))
from shared_data import SHARED

WATER_HALF_PPM = 0.25


@dataclass(frozen=True, kw_only=True)
class Dataset:
    """One acquired set: the raw data, and the maker's spectrum where there is one."""

    name: str
    raw: Path
    maker: Path | None


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
                name=folder.name, raw=place, maker=place if has_maker else None
            )
    for pattern in ("**/*.jdf", "**/*fid.dx", "**/*.dx", "**/*.jdx"):
        hits = sorted(raw.glob(pattern))
        if hits:
            maker = hits[0].parent / "1h.dx"
            return Dataset(
                name=folder.name,
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


def against_maker(dataset: Dataset) -> dict[str, object]:
    """Correlation and phase error against the maker's spectrum."""
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
    shifted = aligned(ours, maker)
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
        "seconds": None,
    }
    if maker.imaginary is not None:
        theirs.imag = maker.imaginary
        result["phase_error_deg"] = worst_phase_error(shifted, theirs, spans, maker)
    return result


def pearson(a: npt.NDArray[np.float64], b: npt.NDArray[np.float64]) -> float:
    """Correlation coefficient of two stretches."""
    return float(np.corrcoef(a, b)[0, 1])


def worst_phase_error(
    ours: npt.NDArray[np.complex128],
    theirs: npt.NDArray[np.complex128],
    spans: list[tuple[int, int]],
    maker: Spectrum,
) -> float:
    """Largest |phase difference| over the regions, deg, on second derivatives."""
    a = complex_second_derivative(ours, step_hz=maker.step_hz, sigma_hz=0.5)
    b = complex_second_derivative(theirs, step_hz=maker.step_hz, sigma_hz=0.5)
    angles = [
        float(np.degrees(np.angle(np.sum(a[i:j] * np.conj(b[i:j]))))) for i, j in spans
    ]
    return max(abs(angle) for angle in angles)


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


def main() -> None:
    """Run the chosen parts and print one JSON object."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--only", nargs="*", default=[])
    parser.add_argument("--part", nargs="*", default=["maker"])
    options = parser.parse_args()
    parts = {"maker": part_maker}
    print(
        json.dumps({name: parts[name](options.only) for name in options.part}, indent=1)
    )


if __name__ == "__main__":
    main()
