"""The one mapping from shift to screen that every layer uses; ppm and logical px."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np
import numpy.typing as npt

FOLD_WIDTH_PX = 14.0
MOST_PX_PER_PPM = 80_000.0  # 200 px a Hz at 400 MHz: far finer than any line


@dataclass(frozen=True, slots=True, kw_only=True)
class Stretch:
    """A part of the axis that is shown, ``high_ppm`` at its left end."""

    high_ppm: float
    low_ppm: float

    def __post_init__(self) -> None:
        if not self.low_ppm < self.high_ppm:
            raise ValueError(
                f"low_ppm must be < high_ppm, got {self.low_ppm!r}, {self.high_ppm!r}"
            )

    @property
    def width_ppm(self) -> float:
        """Length of the stretch, ppm."""
        return self.high_ppm - self.low_ppm

    def holds(self, shift_ppm: float) -> bool:
        """Whether a shift lies in the stretch, both ends included."""
        return self.low_ppm <= shift_ppm <= self.high_ppm


@dataclass(frozen=True, slots=True, kw_only=True)
class ShiftMap:
    """Piecewise linear map: same ppm per px in every stretch, folds between.

    Attributes
    ----------
    stretches : tuple of Stretch
        By descending shift, not overlapping.
    left_px, right_px : float
        The window on the screen.
    px_per_ppm : float
    scroll_px : float
        How far the window is moved along the folded axis, >= 0.
    """

    stretches: tuple[Stretch, ...]
    left_px: float
    right_px: float
    px_per_ppm: float
    scroll_px: float = 0.0
    _starts: tuple[float, ...] = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        if not self.stretches:
            raise ValueError("stretches: need one or more")
        if not self.px_per_ppm > 0:
            raise ValueError(f"px_per_ppm must be > 0, got {self.px_per_ppm!r}")
        starts = [self.left_px - self.scroll_px]
        for stretch in self.stretches[:-1]:
            width_px = stretch.width_ppm * self.px_per_ppm
            starts.append(starts[-1] + width_px + FOLD_WIDTH_PX)
        object.__setattr__(self, "_starts", tuple(starts))

    @classmethod
    def fitted(
        cls, stretches: tuple[Stretch, ...], left_px: float, right_px: float
    ) -> ShiftMap:
        """Map that shows all stretches between two places on the screen."""
        total_ppm = sum(one.width_ppm for one in stretches)
        folds_px = FOLD_WIDTH_PX * (len(stretches) - 1)
        room_px = max(right_px - left_px - folds_px, 8.0 * len(stretches))
        return cls(
            stretches=stretches,
            left_px=left_px,
            right_px=right_px,
            px_per_ppm=room_px / total_ppm,
        )

    @property
    def is_folded(self) -> bool:
        """Whether anything is folded away."""
        return len(self.stretches) > 1

    @property
    def content_px(self) -> float:
        """Length of the whole folded axis at this scale, px."""
        total_ppm = sum(one.width_ppm for one in self.stretches)
        return total_ppm * self.px_per_ppm + FOLD_WIDTH_PX * (len(self.stretches) - 1)

    @property
    def shown_ppm(self) -> float:
        """How much of the axis is on screen, ppm."""
        return (
            sum(
                max(0.0, (min(end, self.right_px) - max(start, self.left_px)))
                for start, end in (self.span(i) for i in range(len(self.stretches)))
            )
            / self.px_per_ppm
        )

    def px_per_hz(self, frequency_mhz: float) -> float:
        """Scale of the axis in px per Hz."""
        return self.px_per_ppm / frequency_mhz

    def span(self, index: int) -> tuple[float, float]:
        """Left and right end of a stretch on the screen, not clipped, px."""
        start = self._starts[index]
        return start, start + self.stretches[index].width_ppm * self.px_per_ppm

    def visible(self) -> tuple[int, ...]:
        """Stretches that are at least partly on screen."""
        spans = (self.span(i) for i in range(len(self.stretches)))
        return tuple(
            i
            for i, (start, end) in enumerate(spans)
            if end > self.left_px and start < self.right_px
        )

    def window_ppm(self, index: int) -> tuple[float, float] | None:
        """Shifts (high, low) of a stretch that are on screen; None if none."""
        start, end = self.span(index)
        left, right = max(start, self.left_px), min(end, self.right_px)
        if right <= left:
            return None
        high = self.stretches[index].high_ppm
        return (
            high - (left - start) / self.px_per_ppm,
            high - (right - start) / self.px_per_ppm,
        )

    def stretch_of(self, shift_ppm: float) -> int | None:
        """Index of the stretch that holds a shift; None if it is folded away."""
        for index, stretch in enumerate(self.stretches):
            if stretch.holds(shift_ppm):
                return index
        return None

    def x_of(self, shift_ppm: float, index: int | None = None) -> float | None:
        """Place of a shift on the screen; None if it is folded away.

        With ``index`` the stretch is given, and a shift outside it is placed
        where it would be if the stretch went on.
        """
        if index is None:
            index = self.stretch_of(shift_ppm)
        if index is None:
            return None
        high = self.stretches[index].high_ppm
        return self._starts[index] + (high - shift_ppm) * self.px_per_ppm

    def xs_of(
        self, shifts_ppm: npt.NDArray[np.float64], index: int
    ) -> npt.NDArray[np.float64]:
        """Places of many shifts as seen from one stretch, px."""
        start, _ = self.span(index)
        high = self.stretches[index].high_ppm
        return np.asarray(start + (high - shifts_ppm) * self.px_per_ppm)

    def ppm_at(self, x: float) -> float | None:
        """Shift under a place on the screen; None on a fold or outside."""
        for index, stretch in enumerate(self.stretches):
            start, end = self.span(index)
            if start <= x <= end:
                return stretch.high_ppm - (x - start) / self.px_per_ppm
        return None

    def nearest_ppm(self, x: float) -> float:
        """Shift under a place, or the nearest one that is shown."""
        best, best_distance = self.stretches[0].high_ppm, float("inf")
        for index, stretch in enumerate(self.stretches):
            start, end = self.span(index)
            held = min(max(x, start), end)
            if abs(held - x) < best_distance:
                best_distance = abs(held - x)
                best = stretch.high_ppm - (held - start) / self.px_per_ppm
        return best

    def fold_at(self, x: float) -> int | None:
        """Index of the fold under a place: the one after that stretch."""
        for index in range(len(self.stretches) - 1):
            end = self.span(index)[1]
            if end < x < end + FOLD_WIDTH_PX:
                return index
        return None

    def moved_to(self, left_px: float, right_px: float) -> ShiftMap:
        """Same axis in another window on the screen, as much of it shown as before."""
        share = (right_px - left_px) / max(self.right_px - self.left_px, 1.0)
        folds = FOLD_WIDTH_PX * (len(self.stretches) - 1)
        scale = self.px_per_ppm * share
        if abs(self.content_px - (self.right_px - self.left_px)) < 1.0:
            scale = max(right_px - left_px - folds, 8.0 * len(self.stretches)) / sum(
                one.width_ppm for one in self.stretches
            )
        return replace(
            self,
            left_px=left_px,
            right_px=right_px,
            px_per_ppm=scale,
            scroll_px=self.scroll_px * share,
        ).held()

    def held(self) -> ShiftMap:
        """Map kept within the axis: never smaller than the window, never beyond it."""
        smallest = ShiftMap.fitted(self.stretches, self.left_px, self.right_px)
        scale = min(max(self.px_per_ppm, smallest.px_per_ppm), MOST_PX_PER_PPM)
        sized = replace(self, px_per_ppm=scale)
        most = max(0.0, sized.content_px - (self.right_px - self.left_px))
        return replace(sized, scroll_px=min(max(self.scroll_px, 0.0), most))

    def zoomed(self, factor: float, at_px: float) -> ShiftMap:
        """Map ``factor`` times finer; the shift under ``at_px`` stays where it is."""
        anchor_ppm = self.nearest_ppm(at_px)
        smallest = ShiftMap.fitted(self.stretches, self.left_px, self.right_px)
        scale = min(max(self.px_per_ppm * factor, smallest.px_per_ppm), MOST_PX_PER_PPM)
        scaled = replace(self, px_per_ppm=scale, scroll_px=0.0)
        place = scaled.x_of(anchor_ppm, self.stretch_of(anchor_ppm))
        assert place is not None  # the anchor is a shift of this very axis
        return replace(scaled, scroll_px=place - at_px).held()

    def panned(self, by_px: float) -> ShiftMap:
        """Map moved along the axis; positive moves towards lower shifts."""
        return replace(self, scroll_px=self.scroll_px + by_px).held()

    def centred_on(self, shift_ppm: float) -> ShiftMap:
        """Map moved so that a shift stands in the middle, as far as the axis goes."""
        place = self.x_of(shift_ppm)
        if place is None:
            return self
        return self.panned(place - (self.left_px + self.right_px) / 2)

    def between(self, other: ShiftMap, share: float) -> ShiftMap:
        """Map on the way to another one of the same stretches, share 0 to 1."""
        if other.stretches != self.stretches:
            return other
        ratio = other.px_per_ppm / self.px_per_ppm
        return replace(
            other,
            px_per_ppm=self.px_per_ppm * ratio**share,
            scroll_px=self.scroll_px + (other.scroll_px - self.scroll_px) * share,
        )
