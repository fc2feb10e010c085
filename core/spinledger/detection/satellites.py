"""13C satellites and spinning sidebands of strong lines; shifts in ppm, J in Hz."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from spinledger.values.evidence import Line, Signal, Stray

# Half of 1J(CH), 115 Hz (alkanes) to 220 Hz (alkynes up to 250 are rarer).
_SATELLITE_RANGE_HZ = (57.0, 128.0)
# Each holds half of 1.1 %; a fitted height is good to a factor of two.
_SATELLITE_SHARE = (0.0025, 0.011)
_ISOTOPE_SHIFT_HZ = (-0.5, 2.0)
_EVEN_RATIO = 1.8
_MOST_PARENTS = 40
_STRONG_SHARE = 0.02
_SIDEBAND_RANGE_HZ = (8.0, 55.0)
_SIDEBAND_SHARE = (0.0005, 0.03)
_SIDEBAND_TOLERANCE_HZ = 0.3
_LEAST_SIDEBAND_PARENTS = 2
_HALF_HZ = 2.5


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class _LineTable:
    hz: npt.NDArray[np.float64]
    areas: npt.NDArray[np.float64]
    frequency_mhz: float

    def pairs_about(
        self,
        parent: int,
        range_hz: tuple[float, float],
        share_range: tuple[float, float],
        centre_hz: tuple[float, float],
    ) -> list[tuple[int, int]]:
        """Pairs of even, weak lines on both sides of a line.

        ``centre_hz`` is how far upfield the pair's centre may stand.
        """
        apart = self.hz - self.hz[parent]
        share = self.areas / self.areas[parent]
        low, high = range_hz
        weak = (share > share_range[0]) & (share < share_range[1])
        lower = np.flatnonzero(weak & (apart < -low) & (apart > -high))
        upper = np.flatnonzero(weak & (apart > low) & (apart < high))
        return [
            (int(a), int(b))
            for a in lower
            for b in upper
            if centre_hz[0] <= -(apart[a] + apart[b]) / 2 <= centre_hz[1]
            and 1 / _EVEN_RATIO < share[a] / share[b] < _EVEN_RATIO
        ]


def satellites(signals: tuple[Signal, ...], frequency_mhz: float) -> tuple[Stray, ...]:
    """13C satellites: even pairs of half a percent about a strong line.

    Parameters
    ----------
    signals : tuple of Signal
    frequency_mhz : float, MHz

    Notes
    -----
    The pair's centre stands 0 to 2 Hz upfield of the parent (isotope effect on
    the shift); 1J(CH) from 114 to 256 Hz. Both must be seen.
    """
    table = _table(signals, frequency_mhz)
    strays = []
    for parent in _parents(table):
        for low, high in table.pairs_about(
            parent, _SATELLITE_RANGE_HZ, _SATELLITE_SHARE, _ISOTOPE_SHIFT_HZ
        ):
            why = (
                f"13C satellite of the line at {table.hz[parent] / frequency_mhz:z.3f} "
                f"ppm, 1J(CH) {table.hz[high] - table.hz[low]:.0f} Hz."
            )
            strays += [_stray(table, one, "satellite", why) for one in (low, high)]
    return merged(strays)


def sidebands(signals: tuple[Signal, ...], frequency_mhz: float) -> tuple[Stray, ...]:
    """Spinning sidebands: even pairs at one distance about several strong lines."""
    table = _table(signals, frequency_mhz)
    found = [
        (parent, low, high, (table.hz[high] - table.hz[low]) / 2)
        for parent in _parents(table)
        for low, high in table.pairs_about(
            parent, _SIDEBAND_RANGE_HZ, _SIDEBAND_SHARE, (-0.2, 0.2)
        )
    ]
    rate_hz = _common_rate([(parent, rate) for parent, _, _, rate in found])
    if rate_hz is None:
        return ()
    strays = [
        _stray(table, one, "sideband", f"Spinning sideband at {rate_hz:.1f} Hz.")
        for _, low, high, rate in found
        if min(abs(rate - rate_hz), abs(rate - 2 * rate_hz)) < _SIDEBAND_TOLERANCE_HZ
        for one in (low, high)
    ]
    return merged(strays)


def merged(strays: list[Stray]) -> tuple[Stray, ...]:
    """Strays of one kind with overlapping ranges joined, by falling shift."""
    joined: list[Stray] = []
    for stray in sorted(strays, key=lambda one: one.low_ppm):
        last = joined[-1] if joined else None
        if last is not None and stray.low_ppm <= last.high_ppm:
            joined[-1] = Stray(
                low_ppm=last.low_ppm,
                high_ppm=max(last.high_ppm, stray.high_ppm),
                kind=last.kind,
                why=last.why,
            )
        else:
            joined.append(stray)
    return tuple(reversed(joined))


def _table(signals: tuple[Signal, ...], frequency_mhz: float) -> _LineTable:
    lines: list[Line] = [line for signal in signals for line in signal.lines]
    return _LineTable(
        hz=np.array([line.shift_ppm * frequency_mhz for line in lines]),
        areas=np.array([line.area for line in lines]),
        frequency_mhz=frequency_mhz,
    )


def _parents(table: _LineTable) -> list[int]:
    """Strong lines, strongest first."""
    if table.areas.size == 0:
        return []
    order = np.argsort(-table.areas, kind="stable")[:_MOST_PARENTS]
    strong = table.areas[order] > _STRONG_SHARE * table.areas[order[0]]
    return [int(one) for one in order[strong]]


def _stray(table: _LineTable, index: int, kind: str, why: str) -> Stray:
    centre, half = table.hz[index], _HALF_HZ
    return Stray(
        low_ppm=float((centre - half) / table.frequency_mhz),
        high_ppm=float((centre + half) / table.frequency_mhz),
        kind="satellite" if kind == "satellite" else "sideband",
        why=why,
    )


def _common_rate(rates: list[tuple[int, float]]) -> float | None:
    """Distance that pairs about the most different parents share, or None."""
    best, best_parents = None, _LEAST_SIDEBAND_PARENTS - 1
    for _, rate in rates:
        parents = {
            parent
            for parent, other in rates
            if abs(other - rate) < _SIDEBAND_TOLERANCE_HZ
        }
        if len(parents) > best_parents:
            best, best_parents = rate, len(parents)
    return best
