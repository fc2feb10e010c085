"""Advice is foretold by simulation: patterns, contacts, fields and odds."""

from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import replace
from itertools import pairwise
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from scipy.stats import cauchy

from spinledger.errors import CancelledError
from spinledger.prediction.claims import make_claims as claims_of_structure
from spinledger.reconcile.advice import advise
from spinledger.reconcile.advice_fields import Simulator, other_fields, overlaps
from spinledger.reconcile.advice_pairs import (
    cosy_finding,
    decoupling_finding,
    shake_finding,
)
from spinledger.reconcile.advice_precision import coupling_sds_hz
from spinledger.reconcile.advice_solvent import (
    exchangeable_patterns,
    solvent_finding,
)
from spinledger.reconcile.advice_view import (
    View,
    odds_of_chances,
    pattern_difference,
    pattern_words,
)
from spinledger.reconcile.evaluate import evaluate, lay_out
from spinledger.reconcile.noe import contact_distances, noe_finding
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.solve import FINISH_QUICK, Limits
from spinledger.structure.read import read_structure
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence, Signal

Claims = Callable[..., ClaimSet]
Evidences = Callable[..., Evidence]


def view(
    claims: ClaimSet,
    *,
    name: str = "the structure",
    field_mhz: float = 400.0,
    solvent: str = "CDCl3",
    structure: str = "C",
    width_hz: float = 1.0,
) -> View:
    """A fit that stands where the claims are predicted."""
    refinement = SimpleNamespace(
        shifts_ppm=np.array([one.shift_ppm for one in claims.claims]),
        couplings_hz=np.array([one.j_hz for one in claims.couplings]),
        determined=np.ones(len(claims.couplings), dtype=bool),
        widths_hz=np.full(len(claims.claims), width_hz),
        area_per_proton=1.0,
    )
    solution: Any = SimpleNamespace(
        best=SimpleNamespace(refinement=refinement),
        absent=frozenset(),
        hidden=frozenset(),
        odds=(),
    )
    evidence = SimpleNamespace(
        solvent=solvent, spectrum=SimpleNamespace(spectrometer_frequency_mhz=field_mhz)
    )
    evaluation: Any = SimpleNamespace(
        claims=claims,
        evidence=evidence,
        structure=read_structure(structure),
        booking=None,
    )
    return View(evaluation=evaluation, solution=solution, name=name)


@pytest.mark.parametrize(
    ("splittings", "words"),
    [
        ([], "a singlet"),
        ([(15.5, 1)], "a doublet (15.5 Hz)"),
        ([(15.5, 1), (8.9, 1)], "a doublet of doublets (15.5, 8.9 Hz)"),
        ([(7.1, 3)], "a quartet (7.1 Hz)"),
        ([(7.1, 2), (7.0, 1)], "a quartet (7.1 Hz)"),
    ],
)
def test_pattern_in_words(splittings: list[tuple[float, int]], words: str) -> None:
    assert pattern_words(splittings) == words


def test_pattern_difference_is_that_of_lorentzian_lines() -> None:
    assert pattern_difference([(7.0, 2)], [(7.0, 1), (7.0, 1)]) == pytest.approx(0.0)
    # A singlet against a doublet of 40 Hz: the tails of 1.5 Hz lines 20 Hz away
    # are all that they share.
    far = pattern_difference([], [(40.0, 1)])
    assert far == pytest.approx(2 / np.pi * np.arctan(10 / 0.75), abs=0.02)
    # Two doublets of J and J + d: each line misses by d / 2, and half the area
    # between two lines d apart is 2/pi atan(d / 2w); tails add one per cent.
    near = pattern_difference([(40.0, 1)], [(42.0, 1)])
    assert near == pytest.approx(2 / np.pi * np.arctan(0.5 / 0.75), abs=0.03)


def test_odds_of_chances_are_the_mean_divergence() -> None:
    p, q = 0.95, 0.03
    rng = np.random.default_rng(4)
    seen = rng.random(200_000) < p
    right = np.where(seen, np.log(p / q), np.log((1 - p) / (1 - q))).mean()
    seen = rng.random(200_000) < q
    wrong = np.where(seen, np.log(q / p), np.log((1 - q) / (1 - p))).mean()
    # Sampling error of 200 000 draws is below 0.01.
    expected = min((right + wrong) / 2, 5.0)
    assert odds_of_chances(p, q) == pytest.approx(expected, abs=0.02)
    assert odds_of_chances(p, p) == pytest.approx(0.0, abs=1e-12)


ROWS = [("2-HA", 2.79, 0.1, 1), ("2-HB", 2.40, 0.1, 1), ("3-H", 4.20, 0.1, 1)]


def test_decoupling_says_what_collapses_to_what(make_claims: Claims) -> None:
    own = view(make_claims(ROWS, [(0, 1, 15.5), (0, 2, 8.9), (1, 2, 4.0)]))
    # The other structure has its proton at 4.20 ppm far from both; the same
    # splittings come from elsewhere.
    rows = [*ROWS, ("9-H", 5.80, 0.1, 1)]
    other = view(
        make_claims(rows, [(0, 1, 15.5), (0, 3, 8.9), (1, 3, 4.0)]), name="CCC"
    )
    found = decoupling_finding(own, other)
    assert found is not None
    assert found.look_for == (
        "irradiate at 4.20 ppm: the signal at 2.79 ppm (2-HA) collapses to a doublet "
        "(15.5 Hz) if the structure is right, stays a doublet of doublets "
        "(15.5, 8.9 Hz) if CCC is"
    )
    assert decoupling_finding(own, own) is None


def test_cosy_names_the_cross_peak_of_one_structure(make_claims: Claims) -> None:
    own = view(make_claims(ROWS, [(0, 1, 15.5), (0, 2, 8.9)]))
    other = view(make_claims(ROWS, [(0, 1, 15.5)]), name="CCC")
    found = cosy_finding(own, other)
    assert found is not None
    assert found.look_for.startswith(
        "a cross peak between 4.20 and 2.79 ppm if the structure is right"
    )
    turned = cosy_finding(other, own)
    assert turned is not None
    assert turned.log_odds == pytest.approx(found.log_odds)
    assert "if the structure is right, none if CCC" in turned.look_for
    assert cosy_finding(own, own) is None


def test_shake_sees_what_goes_and_only_where_it_can(make_claims: Claims) -> None:
    rows = [("1-H", 2.0, 0.1, 1), ("OH", 3.5, 1.0, 1)]
    alcohol = make_claims(rows, optional=frozenset({"OH"}))
    ether = view(make_claims(rows), name="COC")
    found = shake_finding(view(alcohol), ether)
    assert found is not None
    assert found.look_for == (
        "the signal at 3.50 ppm goes if the structure is right (OH), and stays if COC is"
    )
    assert shake_finding(view(alcohol, solvent="D2O"), ether) is None
    assert shake_finding(ether, ether) is None


def test_alcohols_in_dmso_are_told_by_their_splitting() -> None:
    # OH of a primary alcohol is a triplet, of a secondary one a doublet, of a
    # tertiary one a singlet: O. L. Chapman, R. W. King, J. Am. Chem. Soc. 86 (1964)
    # 1256-1258, doi:10.1021/ja01060a074.
    smiles = {"CCCCO": "triplet", "CCC(C)O": "doublet", "CC(C)(C)O": "singlet"}
    for one, word in smiles.items():
        found = exchangeable_patterns(read_structure(one))
        assert found == Counter({("OH", f"a {word}"): 1})
    claims = claims_of_structure(read_structure("CCCCO"), solvent="CDCl3")
    views = [view(claims, structure=one, name=one) for one in ("CCCCO", "CCC(C)O")]
    found_advice = solvent_finding(views[0], views[1])
    assert found_advice is not None
    assert "1 OH, a triplet if CCCCO is right" in found_advice.look_for
    assert solvent_finding(views[0], views[0]) is None
    assert exchangeable_patterns(read_structure("CC(=O)[O-].[Na+]")) is None


def test_contact_distances_of_a_benzene_ring() -> None:
    claims = claims_of_structure(read_structure("Clc1ccccc1"), solvent="CDCl3")
    found = contact_distances(view(claims, structure="Clc1ccccc1"))
    labels = [one.label for one in claims.claims]
    pair = tuple(sorted((labels.index("2,6-H"), labels.index("3,5-H"))))
    # Hydrogens of benzene stand 2.48 Angstrom from the centre, so that ortho ones
    # are 2.48 and para ones 4.96 apart; a 2,6-H has one 3,5-H at each.
    expected = ((2.48**-6 + 4.96**-6) / 2) ** (-1 / 6)
    assert found[pair] == pytest.approx(expected, abs=0.1)  # force-field geometry


def test_contacts_tell_e_from_z() -> None:
    e, z = "C/C=C/C(=O)OC", "C/C=C\\C(=O)OC"
    views = [
        view(
            claims_of_structure(read_structure(one), solvent="CDCl3"),
            structure=one,
            name=one,
        )
        for one in (e, z)
    ]
    # The same places for both, so that only distances differ.
    shifts = views[0].solution.best.refinement.shifts_ppm
    same: Any = views[1].solution.best.refinement
    same.shifts_ppm = shifts
    near, far = (contact_distances(one) for one in views)
    found = noe_finding(views[0], views[1], (near, far))
    assert found is not None
    carriers = [one.atoms for one in views[0].evaluation.claims.claims]
    methyl, vinyl = carriers.index((0,)), carriers.index((2,))
    pair = (min(methyl, vinyl), max(methyl, vinyl))
    # CH3 and 2-H stand on one side in E, on opposite sides in Z.
    assert near[pair] < 3.2
    assert far[pair] > 3.6


def test_overlap_of_two_lines_follows_the_field(make_claims: Claims) -> None:
    claims = make_claims([("1-H", 2.00, 0.1, 1), ("2-H", 2.01, 0.1, 1)])
    found = Simulator(view(claims, width_hz=3.0))
    for field in (300.0, 800.0):
        gap_hz, half_hz = 0.01 * field, 1.5
        expected = 2 * cauchy(scale=half_hz).cdf(-gap_hz / 2)
        # The grid of half a Hz and tails cut at 40 widths.
        assert overlaps(found, field)[0] == pytest.approx(expected, abs=0.03)


def test_precision_of_a_doublet_is_the_bound_in_closed_form(
    make_claims: Claims,
) -> None:
    claims = make_claims([("1-H", 2.0, 0.1, 1), ("2-H", 6.0, 0.1, 1)], [(0, 1, 20.0)])
    noise = 5.0  # so much that real line shapes and priors do not matter
    claims = replace(
        claims, couplings=tuple(replace(c, j_sd_hz=1e6) for c in claims.couplings)
    )
    found = coupling_sds_hz(
        Simulator(view(claims, width_hz=2.0)), 400.0, noise_per_hz=noise
    )
    # The integral of a squared Lorentzian's slope is 1 / (4 pi h^3) for unit area;
    # four lines of half a proton move by half of a change of J.
    per_line = 0.5**2 / (4 * np.pi * 1.0**3) / noise**2
    # Points of a quarter Hz, and windows of 20 Hz.
    assert found[0] == pytest.approx(1 / np.sqrt(4 * 0.25 * per_line), rel=0.02)


def test_the_field_at_hand_is_not_advised() -> None:
    assert other_fields(600.13) == (300.0, 400.0, 500.0, 800.0)
    assert 400.0 not in other_fields(399.9)


@pytest.fixture
def ethyl_acetate(make_evidence: Evidences) -> Evidence:
    """Shifts of Gottlieb et al., doi:10.1021/jo971176v, Table 1."""
    multiplets: Sequence[Any] = [
        (4.12, 2, [(3, 7.1)]),
        (2.05, 3, []),
        (1.26, 3, [(2, 7.1)]),
    ]
    signals = tuple(
        Signal(low_ppm=s - 0.06, high_ppm=s + 0.06, area=n, area_sd=0.01, lines=())
        for s, n, _ in multiplets
    )
    return replace(make_evidence(multiplets, noise=0.003), signals=signals)


def test_advice_is_ranked_and_stops_when_asked(ethyl_acetate: Evidence) -> None:
    bench = lay_out(ethyl_acetate, ReconcileOptions(quick=True))
    limits = Limits(max_refined=2, finish=FINISH_QUICK)
    own = evaluate(read_structure("CCOC(C)=O"), bench, limits)
    other = evaluate(read_structure("CC(C)C(=O)O"), bench, limits)
    found = advise(own, [("CC(C)C(=O)O", other)], limits)
    by_name = {one.measurement: one for one in found}
    # Three carbons with protons here, two there, of other types.
    assert "4 lines (2 CH3, 1 CH2 and 1 C) if the structure is right, 3 (" in (
        by_name["13C with DEPT"].look_for
    )
    for one in found:
        assert one.expected_discrimination == pytest.approx(
            np.sqrt(2 * one.expected_log_odds)
        )
        assert one.against == ("CC(C)C(=O)O",)
    # Dearer measurements need more odds to come first, by at most 0.6.
    odds = [one.expected_log_odds for one in found]
    assert all(a > b - 0.61 for a, b in pairwise(odds))

    def stop() -> None:
        raise CancelledError("stopped")

    with pytest.raises(CancelledError, match="stopped"):
        advise(own, [("CC(C)C(=O)O", other)], Limits(check=stop))
