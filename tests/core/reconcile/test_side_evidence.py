"""Side evidence changes placements and verdicts, and never raises a probability."""

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from rdkit import Chem

from shared_data import shared
from spinledger.detection.evidence import gather_evidence
from spinledger.io.read import read_acquired
from spinledger.reconcile.evaluate import evaluate, lay_out
from spinledger.reconcile.exchange import best_order
from spinledger.reconcile.match import match
from spinledger.reconcile.options import Constraints, ReconcileOptions
from spinledger.reconcile.run import reconcile
from spinledger.reconcile.side_costs import (
    carbon_result,
    expected_carbons,
    hsqc_result,
)
from spinledger.reconcile.side_reading import read_side_evidence
from spinledger.reconcile.solve import FINISH_QUICK, Limits, solve
from spinledger.structure.read import read_structure
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence, Signal

Evidences = Callable[..., Evidence]
Claims = Callable[..., ClaimSet]


def given(text: str) -> Constraints:
    return Constraints(side=read_side_evidence(text))


def cost_of(smiles: str, text: str) -> float:
    must, may = expected_carbons([Chem.MolFromSmiles(smiles)], [1.0])
    return carbon_result(must, may, read_side_evidence(text)).cost


def test_carbon_count_tells_symmetry_of_ring_isomers() -> None:
    # Bromochlorobenzenes: para shows 4 lines, ortho and meta 6.
    para, meta = "Clc1ccc(Br)cc1", "Clc1cccc(Br)c1"
    assert cost_of(para, "carbons: 4") == 0.0
    assert cost_of(meta, "carbons: 6") == 0.0
    # Two lines too many or two missing: odds worse than 100 to 1 either way.
    assert cost_of(para, "carbons: 6") > np.log(100)
    assert cost_of(meta, "carbons: 4") > np.log(100)


def test_one_line_off_is_doubt_and_not_a_verdict() -> None:
    # Overlap or a weak line: about 30 to 1 at most, so that it alone cannot
    # carry a faultless fit (odds of 60 to 1) under the lower limit.
    for text in ("carbons: 3", "carbons: 5"):
        assert 0.0 < cost_of("CCOC(C)=O", text) <= np.log(35)


def test_types_and_impossible_places_count() -> None:
    ester, acid = "CCOC(C)=O", "CC(C)C(=O)O"
    seen = "types: 2 CH3, 1 CH2, 1 C"
    assert cost_of(ester, seen) == 0.0
    assert cost_of(acid, seen) > 3.0
    assert cost_of(ester, "13C: 171.4, 60.5, 21.0, 14.2") == 0.0
    assert cost_of("C=COCC", "13C: 171.4, 60.5, 21.0, 14.2") > 3.0
    # DEPT shows no carbon without protons, and none is missed there.
    assert cost_of(ester, "DEPT: 60.5, 21.0, 14.2") == 0.0


@pytest.fixture
def ethyls(make_claims: Claims) -> ClaimSet:
    """Two ethyl groups whose triplets are predicted the wrong way round."""
    rows = [
        ("1-H", 4.04, 0.05, 2),
        ("1'-H", 4.30, 0.05, 2),
        ("2-H", 1.20, 0.15, 3),
        ("2'-H", 1.32, 0.15, 3),
    ]
    return make_claims(rows, [(0, 2, 7.1), (1, 3, 7.1)])


@pytest.fixture
def two_ethyls(make_evidence: Evidences) -> Evidence:
    return make_evidence(
        [
            (4.04, 2, [(3, 7.1)]),
            (4.30, 2, [(3, 7.1)]),
            (1.20, 3, [(2, 7.1)]),
            (1.32, 3, [(2, 7.1)]),
        ]
    )


def test_cosy_pairs_decide_which_triplet_belongs_to_which_quartet(
    ethyls: ClaimSet, two_ethyls: Evidence
) -> None:
    plain = match(two_ethyls, ethyls).hypotheses[0]
    assert plain.shifts_ppm[2] == pytest.approx(1.20, abs=0.01)
    crossed = match(
        two_ethyls, ethyls, constraints=given("COSY: 4.04-1.32, 4.30-1.20")
    ).hypotheses[0]
    assert crossed.shifts_ppm[2] == pytest.approx(1.32, abs=0.01)
    assert crossed.shifts_ppm[3] == pytest.approx(1.20, abs=0.01)


def test_cosy_pairs_carry_through_the_fit(
    ethyls: ClaimSet, two_ethyls: Evidence
) -> None:
    solution = solve(
        two_ethyls, ethyls, constraints=given("COSY: 4.04-1.32, 4.30-1.20")
    )
    assert solution is not None
    shifts = solution.best.refinement.shifts_ppm
    # Noise-limited fit: far better than 0.002 ppm.
    assert shifts == pytest.approx([4.04, 4.30, 1.32, 1.20], abs=0.002)


def test_hsqc_resolves_a_swap_of_look_alikes(
    make_claims: Claims, make_evidence: Evidences
) -> None:
    # Two isolated CH2 singlets beside one CH3 each would be look-alikes; here
    # two methyl singlets, of which HSQC types one carbon as a CH2 pair.
    rows = [("a", 2.10, 0.2, 1), ("b", 2.20, 0.2, 1), ("c", 2.45, 0.2, 1)]
    claims = make_claims(rows)
    claims = replace(
        claims,
        claims=(
            replace(claims.claims[0], atoms=(0,), pair="c"),
            claims.claims[1],
            replace(claims.claims[2], atoms=(0,), pair="a"),
        ),
    )
    evidence = make_evidence([(2.05, 1, []), (2.25, 1, []), (2.50, 1, [])])
    # The pair on one carbon stands at 2.25 and 2.50, not at 2.05 and 2.50.
    edits = given("HSQC: 2.25/33.0, 2.50/33.0, 2.05/51.0")
    plain, told = solve(evidence, claims), solve(evidence, claims, constraints=edits)
    assert plain is not None
    assert told is not None
    assert plain.best.refinement.shifts_ppm == pytest.approx(
        [2.05, 2.25, 2.50], abs=0.002
    )
    assert told.best.refinement.shifts_ppm[1] == pytest.approx(2.05, abs=0.002)
    # Which of the pair is which stays open: HSQC does not tell.
    _, odds = best_order(claims, told.best.refinement, frozenset(), constraints=edits)
    assert {(one.first, one.second) for one in odds} >= {(0, 2)}


def test_two_carbons_of_one_shift_are_doubt_and_no_refusal(
    make_claims: Claims,
) -> None:
    claims = make_claims([("a", 7.20, 0.1, 1), ("b", 7.40, 0.1, 1)])
    shifts = np.array([7.20, 7.40])
    alike = read_side_evidence("HSQC: 7.20/128.5 CH, 7.40/128.5 CH")
    apart = read_side_evidence("HSQC: 7.20/128.5 CH, 7.40/129.5 CH")
    assert hsqc_result(claims, shifts, frozenset(), apart).cost == 0.0
    # Odds below 5 to 1, so that a faultless fit stays over the upper limit.
    cost = hsqc_result(claims, shifts, frozenset(), alike).cost
    assert 0.0 < cost < np.log(5.0)
    # Far from any peak, both of the wrong type, is another matter.
    wrong = read_side_evidence("HSQC: 7.00/128.5 CH2, 7.60/129.5 CH3")
    assert hsqc_result(claims, shifts, frozenset(), wrong).cost > np.log(1000.0)


@pytest.fixture
def ethyl_acetate(make_evidence: Evidences) -> Evidence:
    """Shifts of Gottlieb et al., doi:10.1021/jo971176v, Table 1."""
    multiplets = [(4.12, 2, [(3, 7.1)]), (2.05, 3, []), (1.26, 3, [(2, 7.1)])]
    evidence = make_evidence(multiplets, noise=0.003)
    signals = tuple(
        Signal(low_ppm=s - 0.06, high_ppm=s + 0.06, area=n, area_sd=0.01, lines=())
        for s, n, _ in multiplets
    )
    return replace(evidence, signals=signals)


@pytest.mark.parametrize(
    ("text", "is_against"),
    [
        ("13C: 171.4 C, 60.5 CH2, 21.0 CH3, 14.2 CH3", False),
        ("types: 3 CH3, 2 CH, 1 C", True),
        ("HSQC: 4.12/60.5 CH2, 2.05/21.0 CH3, 1.26/14.2 CH3", False),
        ("HSQC: 4.12/60.5 CH, 2.05/21.0 CH2, 1.26/14.2 CH3", True),
        ("COSY: 4.12-1.26", False),
        ("COSY: 4.12-2.05, 2.05-1.26", True),
    ],
)
def test_agreement_changes_nothing_and_disagreement_lowers_the_verdict(
    ethyl_acetate: Evidence, text: str, is_against: bool
) -> None:
    structure = read_structure("CCOC(C)=O")
    plain = reconcile(ethyl_acetate, structure, options=ReconcileOptions(quick=True))
    told = reconcile(
        ethyl_acetate,
        structure,
        options=ReconcileOptions(quick=True, constraints=given(text)),
    )
    assert plain.verdict.probability is not None
    assert told.verdict.probability is not None
    assert told.edits == ()
    if is_against:
        assert told.verdict.state == "not reconciled"
        assert told.side[0].cost > 0
        assert told.side[0].sentence in told.verdict.reasons
    else:
        assert told.side[0].cost == 0.0
        assert told.verdict.probability == pytest.approx(
            plain.verdict.probability, abs=1e-9
        )


def test_cosy_pairs_refuse_an_isomer_that_the_proton_spectrum_leaves_open() -> None:
    # Aspirin in CDCl3: neighbours in the ring by the published assignment, 6-H 8.04,
    # 5-H 7.28, 4-H 7.53, 3-H 7.07 ppm. The meta isomer has a proton without a
    # neighbour, so that one listed pair must run over four bonds.
    evidence = gather_evidence(read_acquired(shared("acquired", "jc_aspirin")))
    limits = Limits(max_refined=2, finish=FINISH_QUICK)
    edits = given("COSY: 8.04-7.28, 7.28-7.53, 7.53-7.07")
    ortho, meta = "CC(=O)Oc1ccccc1C(=O)O", "CC(=O)Oc1cccc(C(=O)O)c1"

    def logit(smiles: str, constraints: Constraints) -> float:
        options = ReconcileOptions(quick=True, constraints=constraints)
        found = evaluate(read_structure(smiles), lay_out(evidence, options), limits)
        assert found.logit is not None
        return found.logit

    plain = [logit(one, Constraints()) for one in (ortho, meta)]
    told = [logit(one, edits) for one in (ortho, meta)]
    assert told[0] == pytest.approx(plain[0], abs=0.2)
    # At least odds of two to one more against the isomer than the spectrum alone.
    assert told[1] < plain[1] - np.log(2.0)
