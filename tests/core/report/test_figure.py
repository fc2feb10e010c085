"""The drawing: what it must show, read back from the SVG itself."""

import re
import xml.etree.ElementTree as ET
from dataclasses import replace

import numpy as np
import pytest

from invented_ledger import invented_ledger, overlapped_ledger, with_entry
from spinledger.report.figure import expansion_svgs, overview_svg
from spinledger.report.folds import fold_axis, shown_regions
from spinledger.report.lanes import residue_height, residue_heights, ticks
from spinledger.report.sketch import sketch_svg
from spinledger.report.svg import envelope
from spinledger.report.trees import claim_tree, known_couplings_hz
from spinledger.spins.tree import Resolution, splitting_tree

SVG = "{http://www.w3.org/2000/svg}"


def texts(svg: str) -> list[str]:
    return [node.text or "" for node in ET.fromstring(svg).iter(f"{SVG}text")]


def test_figure_is_valid_svg_that_names_every_placed_claim() -> None:
    svg = overview_svg(invented_ledger())
    words = texts(svg)
    for label in ("3-H", "1′-H", "3-OH", "2-HA", "2-HB", "2′-H", "4-H", "TMS", "water"):
        assert label in words
    assert ET.fromstring(svg).find(f"{SVG}title") is not None


def test_figure_stays_small_and_has_no_raster() -> None:
    svg = overview_svg(invented_ledger())
    # Two curves and a residue of two points a half pixel over 643 px, at about
    # twelve characters a point, make 100 to 200 kB.
    assert len(svg) < 250_000
    assert "<image" not in svg


def test_overlap_prints_one_integral_for_the_whole() -> None:
    words = texts(overview_svg(invented_ledger()))
    assert "3.01" in words  # 1.00 and 2.01 are parts of one overlap
    assert "1.00" not in words


def test_names_inside_one_page_do_not_collide() -> None:
    ledger = invented_ledger()
    page = overview_svg(ledger) + "".join(svg for _, svg in expansion_svgs(ledger))
    names = re.findall(r' id="([^"]+)"', page)
    assert names
    assert len(names) == len(set(names))


def test_one_expansion_for_each_stretch_with_claims() -> None:
    captions = [caption for caption, _ in expansion_svgs(invented_ledger())]
    assert captions == ["3-H, 1′-H", "3-OH", "2-HA, 2-HB", "2′-H, 4-H"]


def test_open_claim_stands_where_it_was_claimed() -> None:
    ledger = with_entry(
        invented_ledger(), "4-H", state="open", shift_ppm=None, range_ppm=None
    )
    assert any(low < 1.20 < high for low, high in shown_regions(ledger))
    tree = claim_tree(ledger, next(e for e in ledger.entries if e.claim == "4-H"))
    assert tree is not None
    assert tree.root_ppm == 1.20
    assert "4-H" in texts(overview_svg(ledger))


def test_ledger_without_model_or_placed_claims_is_drawn_all_the_same() -> None:
    ledger = replace(
        invented_ledger(),
        model=None,
        entries=tuple(
            replace(one, state="open", shift_ppm=None, range_ppm=None)
            for one in invented_ledger().entries
        ),
    )
    ET.fromstring(overview_svg(ledger))
    assert expansion_svgs(ledger) == ()


def test_every_stretch_has_the_same_scale_and_high_shifts_stand_left() -> None:
    axis = fold_axis([(1.2, 1.3), (4.1, 4.2), (7.2, 7.4)], left=0, right=600, gap=12)
    scales = [
        (one.right - one.left) / (one.high_ppm - one.low_ppm) for one in axis.stretches
    ]
    np.testing.assert_allclose(scales, scales[0], rtol=1e-12)  # rounding only
    assert axis.stretches[0].left == 0
    assert axis.stretches[-1].right == pytest.approx(600, abs=1e-9)
    shifts = [one.high_ppm for one in axis.stretches]
    assert shifts == sorted(shifts, reverse=True)


def test_regions_that_nearly_touch_become_one_stretch() -> None:
    axis = fold_axis([(1.2, 1.3), (1.31, 1.4), (5.0, 5.1)], left=0, right=600, gap=12)
    assert len(axis.stretches) == 2


def test_crowded_spectra_are_folded_into_few_stretches() -> None:
    regions = [(k / 5, k / 5 + 0.01) for k in range(40)]
    axis = fold_axis(regions, left=0, right=600, gap=12)
    assert len(axis.stretches) <= 14
    assert axis.units_per_ppm > 0
    for low, high in regions:
        assert axis.find((low + high) / 2) is not None


def test_envelope_keeps_every_extreme_of_a_noisy_curve() -> None:
    rng = np.random.default_rng(5)
    xs = np.linspace(0.0, 100.0, 50_000)
    ys = rng.standard_normal(xs.size)
    ys[31_234] = 50.0
    thin_x, thin_y = envelope(xs, ys)
    assert thin_x.size < 2 * 202 + 2  # two points in each half-pixel column
    assert thin_y.max() == 50.0
    assert thin_y.min() == ys.min()
    assert np.all(np.diff(thin_x) > 0)


def test_residue_scale_is_linear_to_three_and_logarithmic_beyond() -> None:
    # Half the height for 3 sd, a quarter for each of the two decades to 300.
    assert residue_height(1.5) == pytest.approx(0.25)
    assert residue_height(3.0) == pytest.approx(0.5)
    assert residue_height(30.0) == pytest.approx(0.75)
    assert residue_height(-300.0) == pytest.approx(-1.0)
    assert residue_height(3e5) == 1.0
    rising = residue_heights(np.linspace(-400, 400, 801))
    assert np.all(np.diff(rising) >= 0)


def test_ticks_are_round_and_inside() -> None:
    axis = fold_axis([(1.1, 1.4)], left=0, right=300, gap=12)
    stretch = axis.stretches[0]
    found = ticks(stretch)
    assert len(found) >= 2
    for shift, label in found:
        assert stretch.holds(shift)
        assert float(label) == pytest.approx(shift, abs=5e-3)


def test_tree_levels_fall_and_exact_lines_are_its_tips() -> None:
    ledger = invented_ledger()
    tree = claim_tree(ledger, next(e for e in ledger.entries if e.claim == "3-H"))
    assert tree is not None
    assert [(level.coupling_hz, level.n_spins) for level in tree.levels] == [
        (8.60, 1),
        (6.31, 3),
        (3.41, 1),
    ]
    assert ledger.model is not None
    lines = next(one for one in ledger.model.claim_lines if one.claim == "3-H")
    assert set(tree.tips_ppm) <= set(lines.shifts_ppm.tolist())


def test_drawn_tree_is_the_one_that_names_the_pattern() -> None:
    ledger = invented_ledger()
    field_mhz = ledger.evidence.spectrum.spectrometer_frequency_mhz
    shifts = [one.shift_ppm or one.predicted_shift_ppm for one in ledger.entries]
    couplings = known_couplings_hz(ledger)
    assert np.all(np.isfinite(couplings))
    for index, entry in enumerate(ledger.entries):
        if not entry.couplings:
            continue
        drawn = claim_tree(ledger, entry)
        named = splitting_tree(
            ledger.claims,
            index,
            np.array(shifts) * field_mhz,
            couplings,
            resolution=Resolution(width_hz=entry.width_hz or 1.0),
        )
        assert drawn is not None
        assert drawn.levels == named.levels


def test_unknown_couplings_are_not_drawn() -> None:
    ledger = invented_ledger()
    entries = tuple(
        replace(
            one,
            couplings=tuple(
                replace(c, j_hz=None, determined=False) for c in one.couplings
            ),
        )
        for one in ledger.entries
    )
    bare = replace(ledger, entries=entries)
    tree = claim_tree(bare, next(e for e in bare.entries if e.claim == "3-H"))
    assert tree is not None
    assert tree.levels == ()


def test_silent_claims_have_no_tree() -> None:
    ledger = overlapped_ledger()
    entry = next(one for one in ledger.entries if one.claim == "3-OH")
    assert claim_tree(ledger, entry) is None


def test_sketch_carries_one_tag_a_claim() -> None:
    words = texts(sketch_svg(invented_ledger()))
    assert sorted(words) == sorted(
        ["3-H", "1′-H", "3-OH", "2-HA", "2-HB", "2′-H", "4-H"]
    )
