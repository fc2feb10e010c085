"""Baseline step whose mask is chosen by the spectrum; margins in Hz."""

from __future__ import annotations

from spinledger.lines.noise import EDGE_SHARE
from spinledger.lines.regions import Regions
from spinledger.processing.found_regions import FoundRegions
from spinledger.processing.recipe import Transformed
from spinledger.values.recipe import Baseline

_SIGNAL_GROWTH_HZ = 40.0
_WATER_GROWTH_HZ = 150.0


def automatic_baseline(transformed: Transformed, regions: FoundRegions) -> Baseline:
    """Baseline step with the signals masked, on the header's axis.

    Parameters
    ----------
    transformed : Transformed
    regions : FoundRegions
        Signals are masked with 40 Hz about them, water with 150 Hz; the outer
        3 % of the sweep (filter edges) take no part either.
    """
    step_ppm = transformed.step_hz / transformed.spectrometer_frequency_mhz
    edge = int(EDGE_SHARE * transformed.values.size)
    spans = [(0, edge), (transformed.values.size - edge, transformed.values.size)]
    for part, grow_hz in (
        (regions.kept, _SIGNAL_GROWTH_HZ),
        (regions.dropped, _WATER_GROWTH_HZ),
    ):
        spans += _grown(part, int(grow_hz / transformed.step_hz))
    first = transformed.first_point_ppm
    masked = tuple(
        (round(first - step_ppm * stop, 4), round(first - step_ppm * start, 4))
        for start, stop in _merged(spans)
    )
    return Baseline(method="whittaker", masked_ppm=masked)


def _grown(regions: Regions, grow: int) -> list[tuple[int, int]]:
    return [
        (int(start) - grow, int(stop) + grow)
        for start, stop in zip(regions.starts, regions.stops, strict=True)
    ]


def _merged(spans: list[tuple[int, int]]) -> list[tuple[int, int]]:
    merged: list[tuple[int, int]] = []
    for start, stop in sorted(spans):
        if merged and start <= merged[-1][1]:
            merged[-1] = (merged[-1][0], max(merged[-1][1], stop))
        else:
            merged.append((start, stop))
    return merged
