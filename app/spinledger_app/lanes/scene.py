"""What the lanes show, as frozen values; shifts in ppm, couplings in Hz."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from spinledger_app.lanes.pyramid import Pyramid
from spinledger_app.lanes.shift_map import Stretch


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Trace:
    """A curve on the spectrum's uniform axis, ready to be drawn at any scale."""

    pyramid: Pyramid
    first_point_ppm: float
    step_ppm: float

    def indices(self, high_ppm: float, low_ppm: float) -> tuple[float, float]:
        """Fractional point positions of two shifts, clipped to the trace."""
        start = (self.first_point_ppm - high_ppm) / self.step_ppm
        stop = (self.first_point_ppm - low_ppm) / self.step_ppm
        last = float(self.pyramid.n_points)
        return min(max(start, 0.0), last), min(max(stop, 0.0), last)

    def highest(self, high_ppm: float, low_ppm: float) -> float:
        """Largest value between two shifts; 0 where the trace does not reach."""
        start, stop = self.indices(high_ppm, low_ppm)
        if stop - start < 1:
            return 0.0
        return self.pyramid.extremes(int(start), int(stop))[1]

    def at(self, shift_ppm: float) -> float | None:
        """Value at the nearest point; None outside the trace."""
        index = round((self.first_point_ppm - shift_ppm) / self.step_ppm)
        if not 0 <= index < self.pyramid.n_points:
            return None
        return float(self.pyramid.values[index])


@dataclass(frozen=True, slots=True, kw_only=True)
class SignalMark:
    """Bracket over a stretch: found protons, or a stray's triangle and name.

    ``stray`` is None, "known" or "unexplained"; ``claims`` own the signal.
    """

    key: str
    low_ppm: float
    high_ppm: float
    text: str
    claims: tuple[str, ...] = ()
    stray: str | None = None
    name: str = ""
    tip: str = ""

    @property
    def centre_ppm(self) -> float:
        """Middle of the range."""
        return (self.low_ppm + self.high_ppm) / 2


@dataclass(frozen=True, slots=True, kw_only=True)
class Foot:
    """A measured line where it meets the claims."""

    shift_ppm: float
    claims: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Level:
    """One splitting of a tree: ``n_partners`` equivalent protons at one J."""

    j_hz: float
    n_partners: int
    partner: str
    predicted_j_hz: float
    predicted_j_sd_hz: float
    is_disputed: bool = False
    is_determined: bool = True


@dataclass(frozen=True, slots=True, kw_only=True)
class Leaf:
    """First-order place of a line, its exact place, and the measured line.

    ``gap_hz`` is tip minus foot where a measured line stands near enough to be
    the one that is claimed, and ``is_off`` tells that it is over 3 sd.
    """

    base_ppm: float
    tip_ppm: float
    weight: float
    gap_hz: float | None = None
    is_off: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class TreeShape:
    """A claim's splitting tree.

    Attributes
    ----------
    claim : str
    state : str
    n_protons : int
    root_ppm : float
    levels : tuple of Level
        Largest J first: at the bottom.
    leaves : tuple of Leaf
        By descending shift of the base.
    twigs_ppm : tuple of float
        Exact lines without a first-order origin.
    pattern : str
        d, dd, m …
    width_hz : float or None
        Full width of a broad signal; None for a sharp one.
    is_shared : bool
        Stands under one envelope with others.
    """

    claim: str
    state: str
    n_protons: int
    root_ppm: float
    levels: tuple[Level, ...]
    leaves: tuple[Leaf, ...]
    twigs_ppm: tuple[float, ...] = ()
    pattern: str = ""
    width_hz: float | None = None
    is_shared: bool = False


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class IntegralCurve:
    """Running integral over one signal, 0 to 1, and what it comes to."""

    low_ppm: float
    high_ppm: float
    shares: npt.NDArray[np.float64]
    amount: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class LaneScene:
    """Everything the three lanes need.

    Attributes
    ----------
    frequency_mhz : float
    whole : Stretch
        The continuous axis.
    folds : tuple of Stretch
        What stays when empty stretches are folded away.
    measured, model, residue : Trace or None
        ``residue`` in noise sd.
    noise_sd : float
    signals, feet, trees, integrals : tuples
    full_height : float
        Intensity that fills the lane at gain 1: the tallest claimed signal.
    excluded_ppm : tuple of (low_ppm, high_ppm)
        Stretches that were left out by hand.
    """

    frequency_mhz: float
    whole: Stretch
    folds: tuple[Stretch, ...]
    measured: Trace
    noise_sd: float
    full_height: float
    model: Trace | None = None
    residue: Trace | None = None
    signals: tuple[SignalMark, ...] = ()
    feet: tuple[Foot, ...] = ()
    trees: tuple[TreeShape, ...] = ()
    integrals: tuple[IntegralCurve, ...] = ()
    excluded_ppm: tuple[tuple[float, float], ...] = ()
    partners: dict[str, tuple[str, ...]] = field(default_factory=dict)

    def tree_of(self, claim: str) -> TreeShape | None:
        """Tree of a claim, None if it has none."""
        return next((tree for tree in self.trees if tree.claim == claim), None)

    def signals_of(self, claim: str) -> tuple[SignalMark, ...]:
        """Signals that a claim owns a part of."""
        return tuple(one for one in self.signals if claim in one.claims)

    def signal_at(self, shift_ppm: float) -> SignalMark | None:
        """Narrowest signal that holds a shift."""
        hits = [s for s in self.signals if s.low_ppm <= shift_ppm <= s.high_ppm]
        return min(hits, key=lambda s: s.high_ppm - s.low_ppm, default=None)

    def signal(self, key: str) -> SignalMark | None:
        """Signal by its key."""
        return next((one for one in self.signals if one.key == key), None)
