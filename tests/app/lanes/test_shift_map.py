"""The mapping from shift to screen: scale, folds, zoom and way back."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spinledger_app.lanes.shift_map import FOLD_WIDTH_PX, ShiftMap, Stretch

FOLDS = (
    Stretch(high_ppm=7.3, low_ppm=7.2),
    Stretch(high_ppm=4.3, low_ppm=4.0),
    Stretch(high_ppm=1.4, low_ppm=1.1),
)


def test_fitted_map_fills_the_window_with_one_scale() -> None:
    shift_map = ShiftMap.fitted(FOLDS, 88.0, 718.0)
    # 630 px less two folds of 14 px over 0.7 ppm, by hand.
    assert shift_map.px_per_ppm == pytest.approx(602 / 0.7)
    assert shift_map.x_of(7.3) == pytest.approx(88.0)
    assert shift_map.x_of(1.1) == pytest.approx(718.0)
    lengths = [end - start for start, end in map(shift_map.span, range(3))]
    assert lengths == pytest.approx([86.0, 258.0, 258.0])
    gap = shift_map.span(1)[0] - shift_map.span(0)[1]
    assert gap == pytest.approx(FOLD_WIDTH_PX)


def test_shift_goes_left_and_folded_shifts_have_no_place() -> None:
    shift_map = ShiftMap.fitted(FOLDS, 0.0, 600.0)
    left, right = shift_map.x_of(4.2), shift_map.x_of(4.1)
    assert left is not None
    assert right is not None
    assert left < right
    assert shift_map.x_of(6.0) is None
    assert shift_map.fold_at(shift_map.span(0)[1] + 5) == 0


@given(
    shift=st.sampled_from([7.21, 7.29, 4.05, 4.28, 1.11, 1.39]),
    factor=st.floats(1.0, 50.0),
    at=st.floats(90.0, 700.0),
)
@settings(max_examples=60, deadline=None)
def test_place_and_shift_are_inverse_at_any_zoom(
    shift: float, factor: float, at: float
) -> None:
    shift_map = ShiftMap.fitted(FOLDS, 88.0, 718.0).zoomed(factor, at)
    place = shift_map.x_of(shift)
    assert place is not None
    # 1e-9 ppm: rounding of doubles at 80 000 px per ppm.
    assert shift_map.ppm_at(place) == pytest.approx(shift, abs=1e-9)


def test_zoom_keeps_the_shift_under_the_cursor() -> None:
    shift_map = ShiftMap.fitted((Stretch(high_ppm=9, low_ppm=-0.5),), 88.0, 718.0)
    before = shift_map.ppm_at(400.0)
    assert shift_map.zoomed(3.0, 400.0).ppm_at(400.0) == pytest.approx(before)


def test_map_never_leaves_its_axis() -> None:
    shift_map = ShiftMap.fitted((Stretch(high_ppm=9, low_ppm=-0.5),), 88.0, 718.0)
    far = shift_map.zoomed(4.0, 400.0).panned(1e9)
    assert far.ppm_at(718.0) == pytest.approx(-0.5)
    assert shift_map.zoomed(0.01, 400.0).px_per_ppm == pytest.approx(
        shift_map.px_per_ppm
    )


def test_many_places_agree_with_single_ones() -> None:
    shift_map = ShiftMap.fitted(FOLDS, 0.0, 600.0).zoomed(2.0, 200.0)
    shifts = np.array([4.28, 4.2, 4.05])
    singly = [shift_map.x_of(float(one), 1) for one in shifts]
    assert shift_map.xs_of(shifts, 1) == pytest.approx(singly)


def test_half_way_between_two_views_is_between_them() -> None:
    start = ShiftMap.fitted(FOLDS, 0.0, 600.0)
    end = start.zoomed(4.0, 300.0)
    middle = start.between(end, 0.5)
    # Geometric mean: zooming looks even when every step multiplies alike.
    assert middle.px_per_ppm == pytest.approx(2.0 * start.px_per_ppm)
    assert start.between(end, 1.0) == end


def test_stretch_refuses_a_reversed_range() -> None:
    with pytest.raises(ValueError, match=r"low_ppm must be < high_ppm"):
        Stretch(high_ppm=1.0, low_ppm=2.0)
