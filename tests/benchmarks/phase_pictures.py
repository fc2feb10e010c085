"""Draws our phase beside the maker's where the two differ most; writes SVG files.

Run: ``python tests/benchmarks/phase_pictures.py OUT [NAME ...]``. One picture a
spectrum: the region with the largest difference, feet magnified, ours above and
the maker's below. A line in phase has feet of one height on both sides; the foot
that dips tells which of the two is off.
"""

from __future__ import annotations

import argparse
import os
import sys
from pathlib import Path

for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(name, "1")
sys.path.insert(0, str(Path(__file__).resolve().parent))

import numpy as np  # noqa: E402 - after the number of threads is set
import numpy.typing as npt  # noqa: E402
from processing import (  # noqa: E402 - a script beside this one
    Dataset,
    analyte_spans,
    both_sides,
    datasets,
    phase_differences,
)

from spinledger.detection.evidence import evidence_from  # noqa: E402

MAGNIFIED = 30.0
WIDTH, HEIGHT = 900.0, 260.0
FEET_HZ = 40.0
NOISE_SHOWN = 25.0


def panel(values: npt.NDArray[np.float64], top: float, title: str) -> str:
    """One trace with magnified feet, clipped at the panel's edges."""
    shown = max(float(values.max()) / MAGNIFIED, NOISE_SHOWN * _noise(values))
    scaled = np.clip(values / shown, -0.35, 1.0)
    base = top + HEIGHT * 0.74
    x = np.linspace(40.0, WIDTH - 20.0, values.size)
    y = base - scaled * HEIGHT * 0.66
    points = " ".join(f"{a:.1f},{b:.1f}" for a, b in zip(x, y, strict=True))
    return (
        f'<text x="40" y="{top + 16:.0f}" font-size="14">{title}</text>'
        f'<line x1="40" x2="{WIDTH - 20:.0f}" y1="{base:.1f}" y2="{base:.1f}" '
        'stroke="#999" stroke-dasharray="4 3"/>'
        f'<polyline points="{points}" fill="none" stroke="#123" stroke-width="1"/>'
    )


def picture(dataset: Dataset) -> str:
    """Ours above, the maker's below, in the region where they differ most."""
    both = both_sides(dataset)
    ours, maker, shifted = both.ours, both.maker, both.shifted
    theirs = maker.intensities.astype(np.complex128)
    if maker.imaginary is None:
        raise SystemExit(f"{dataset.name} has no imaginary part to compare phases")
    theirs.imag = maker.imaginary
    spans = analyte_spans(evidence_from(both.processed), ours)
    angles = phase_differences(shifted, theirs, spans, maker.step_hz)
    worst = int(np.argmax(np.abs(angles)))
    feet = int(FEET_HZ / maker.step_hz)
    low, high = max(spans[worst][0] - feet, 0), spans[worst][1] + feet
    title = f"{dataset.name}, feet magnified; apart by {angles[worst]:.1f} deg"
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{WIDTH:.0f}" '
        f'height="{2 * HEIGHT:.0f}" font-family="sans-serif">'
        '<rect width="100%" height="100%" fill="#fff"/>'
        + panel(_level(shifted.real[low:high]), 0.0, f"ours: {title}")
        + panel(_level(theirs.real[low:high]), HEIGHT, "the maker's")
        + "</svg>"
    )


def _level(values: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """The trace with the middle of its lower half at zero."""
    return values - float(np.quantile(values, 0.25))


def _noise(values: npt.NDArray[np.float64]) -> float:
    """Noise sd from the middle of the differences of neighbours."""
    return float(np.median(np.abs(np.diff(values)))) / 0.954


def main() -> None:
    """Write one SVG a spectrum."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("out", type=Path)
    parser.add_argument("names", nargs="*")
    arguments = parser.parse_args()
    arguments.out.mkdir(parents=True, exist_ok=True)
    for dataset in datasets(arguments.names):
        if dataset.maker is not None:
            target = arguments.out / f"{dataset.name}.svg"
            target.write_text(picture(dataset), encoding="utf-8")
            print(target)


if __name__ == "__main__":
    main()
