"""Which part of the axis is looked at, and the way back; ppm and logical px."""

from __future__ import annotations

from dataclasses import dataclass, replace

from spinledger_app.lanes.scene import LaneScene
from spinledger_app.lanes.shift_map import ShiftMap, Stretch

_MARGIN_SHARE = 0.35
_LEAST_MARGIN_HZ = 12.0
_MOST_STEPS_BACK = 50


@dataclass(frozen=True, slots=True, kw_only=True)
class Camera:
    """A view of a scene's axis; every change gives a new camera.

    Attributes
    ----------
    whole : Stretch
    folds : tuple of Stretch
        What stays when empty stretches are folded away.
    map : ShiftMap
    is_folded : bool
        Whether Home means the folded axis.
    history : tuple of ShiftMap
        Views before this one, oldest first.
    """

    whole: Stretch
    folds: tuple[Stretch, ...]
    map: ShiftMap
    is_folded: bool = False
    history: tuple[ShiftMap, ...] = ()

    @classmethod
    def opened(
        cls, scene: LaneScene, left_px: float, right_px: float, *, is_folded: bool
    ) -> Camera:
        """Camera that shows all of a scene."""
        stretches = scene.folds if is_folded else (scene.whole,)
        return cls(
            whole=scene.whole,
            folds=scene.folds,
            map=ShiftMap.fitted(stretches, left_px, right_px),
            is_folded=is_folded,
        )

    @property
    def is_at_home(self) -> bool:
        """Whether all of the axis is on screen."""
        room = self.map.right_px - self.map.left_px
        is_all = self.map.stretches in ((self.whole,), self.folds)
        return is_all and self.map.content_px <= room + 1.0

    def with_scene(self, scene: LaneScene) -> Camera:
        """Camera on a new scene: the same place where one was zoomed in, else home."""
        fresh = Camera.opened(
            scene, self.map.left_px, self.map.right_px, is_folded=self.is_folded
        )
        if self.is_at_home:
            return fresh
        return replace(self, whole=scene.whole, folds=scene.folds)

    def resized(self, left_px: float, right_px: float) -> Camera:
        """Camera in a window of another width."""
        if (left_px, right_px) == (self.map.left_px, self.map.right_px):
            return self
        return replace(self, map=self.map.moved_to(left_px, right_px), history=())

    def zoomed(self, factor: float, at_px: float) -> Camera:
        """Finer or coarser about a place; wheel steps leave no step back."""
        return replace(self, map=self.map.zoomed(factor, at_px))

    def panned(self, by_px: float) -> Camera:
        """Moved along the axis."""
        return replace(self, map=self.map.panned(by_px))

    def home(self) -> Camera:
        """All of the axis, folded or not as was chosen last."""
        stretches = self.folds if self.is_folded else (self.whole,)
        return self._gone(
            ShiftMap.fitted(stretches, self.map.left_px, self.map.right_px)
        )

    def with_folding(self, is_folded: bool) -> Camera:
        """All of the axis, in the other manner."""
        return replace(self, is_folded=is_folded).home()

    def fold_opened(self, index: int) -> Camera:
        """The fold after a stretch laid open; the neighbours become one stretch."""
        stretches = self.map.stretches
        joined = Stretch(
            high_ppm=stretches[index].high_ppm, low_ppm=stretches[index + 1].low_ppm
        )
        rest = (*stretches[:index], joined, *stretches[index + 2 :])
        return self._gone(ShiftMap.fitted(rest, self.map.left_px, self.map.right_px))

    def on_range(self, low_ppm: float, high_ppm: float, frequency_mhz: float) -> Camera:
        """The continuous axis about a range, with a margin on both sides."""
        margin = max(
            _MARGIN_SHARE * (high_ppm - low_ppm), _LEAST_MARGIN_HZ / frequency_mhz
        )
        return self.on_window(low_ppm - margin, high_ppm + margin)

    def on_window(self, low_ppm: float, high_ppm: float) -> Camera:
        """The continuous axis from one shift to another, no margin."""
        stretch = Stretch(
            high_ppm=max(self.whole.high_ppm, high_ppm),
            low_ppm=min(self.whole.low_ppm, low_ppm),
        )
        left, right = self.map.left_px, self.map.right_px
        scale = (right - left) / (high_ppm - low_ppm)
        scroll = (stretch.high_ppm - high_ppm) * scale
        window = ShiftMap(
            stretches=(stretch,),
            left_px=left,
            right_px=right,
            px_per_ppm=scale,
            scroll_px=scroll,
        )
        return self._gone(window.held())

    def back(self) -> Camera:
        """The view before this one; the same where there is none."""
        if not self.history:
            return self
        return replace(self, map=self.history[-1], history=self.history[:-1])

    def _gone(self, target: ShiftMap) -> Camera:
        if target == self.map:
            return self
        history = (*self.history, self.map)[-_MOST_STEPS_BACK:]
        return replace(self, map=target, history=history)
