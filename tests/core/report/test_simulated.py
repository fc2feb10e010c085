"""Predicted spectra: patterns, areas and the drawing.

The spectrum's area is checked against the number of protons, and a weakly
coupled pattern against first-order positions worked out by hand.
"""

import xml.etree.ElementTree as ET
from dataclasses import replace

import numpy as np
import pytest

from invented_ledger import invented_claims
from spinledger.report.simulated import predicted_claims, simulated_svg
from spinledger.values.claim import ClaimSet


def test_every_visible_claim_keeps_its_protons_and_silent_ones_have_none() -> None:
    claims = invented_claims()
    rows = predicted_claims(claims, field_mhz=400.0)
    for row in rows:
        assert row.tree is not None
        # The engine's line shares sum to the protons up to rounding.
        assert row.tree.line_protons.sum() == pytest.approx(
            row.claim.n_protons, rel=1e-6
        )
    hidden = replace(
        claims,
        claims=tuple(
            replace(one, visibility="silent") if one.label == "3-OH" else one
            for one in claims.claims
        ),
        particles=tuple(
            one
            for one in claims.particles
            if one.claim is None or claims.claims[one.claim].label != "3-OH"
        ),
    )
    # Leaving out a particle moves the indices of those behind it.
    shifted = replace(hidden, couplings=_moved(claims, hidden))
    trees = {
        row.claim.label: row.tree for row in predicted_claims(shifted, field_mhz=400.0)
    }
    assert trees["3-OH"] is None
    assert trees["4-H"] is not None


def _moved(before: ClaimSet, after: ClaimSet) -> tuple:  # type: ignore[type-arg]
    places = {particle.claim: k for k, particle in enumerate(after.particles)}

    def index(old: int) -> int:
        return places[before.particles[old].claim]

    return tuple(
        replace(one, pairs=tuple((index(a), index(b)) for a, b in one.pairs))
        for one in before.couplings
    )


def test_an_ethyl_group_at_high_field_is_a_quartet_and_a_triplet() -> None:
    rows = {
        row.claim.label: row
        for row in predicted_claims(invented_claims(), field_mhz=900.0)
    }
    assert rows["2'-H"].tree is not None
    assert rows["2'-H"].tree.multiplicity == "t"
    assert rows["1'-H"].tree is not None
    assert rows["1'-H"].tree.multiplicity == "q"
    strong = rows["2'-H"].tree
    heavy = strong.lines_hz[strong.line_protons > 0.3]
    # 1.25 ppm and J = 7.0 Hz at 900 MHz; second-order shifts of J^2 / (2 * 2600)
    # are 0.01 Hz, so 0.05 Hz is ample.
    np.testing.assert_allclose(
        np.unique(np.round(heavy, 1)), [1118.0, 1125.0, 1132.0], atol=0.05
    )


def test_couplings_are_listed_from_both_sides_largest_first() -> None:
    rows = {
        row.claim.label: row
        for row in predicted_claims(invented_claims(), field_mhz=400.0)
    }
    assert [one[0] for one in rows["2-HA"].couplings] == ["2-HB", "3-H"]
    assert rows["2-HA"].couplings[0][1] == rows["2-HB"].couplings[0][1] == -16.0
    assert {one[0] for one in rows["3-H"].couplings} == {"2-HA", "2-HB", "4-H"}


def test_drawing_names_every_claim() -> None:
    svg = simulated_svg(invented_claims(), field_mhz=400.0)
    words = {node.text for node in ET.fromstring(svg).iter() if node.text}
    for label in ("3-H", "1′-H", "3-OH", "2-HA", "2-HB", "2′-H", "4-H"):
        assert label in words


def test_nothing_visible_is_refused() -> None:
    claims = replace(invented_claims(), particles=(), couplings=())
    with pytest.raises(ValueError, match="nothing in this structure is visible"):
        simulated_svg(claims, field_mhz=400.0)
