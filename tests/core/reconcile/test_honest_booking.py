"""What must be said whatever the fit looks like: companions, limits, groups."""

from collections.abc import Callable
from dataclasses import replace

import pytest

from spinledger.reconcile.entries import book_entries
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.run import reconcile
from spinledger.reconcile.solve import solve
from spinledger.reconcile.words import shift_reason
from spinledger.structure.read import read_structure
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Evidence, Signal

Evidences = Callable[..., Evidence]
Claims = Callable[..., ClaimSet]

# Ethyl acetate in CDCl3 (Gottlieb, Kotlyar, Nudelman, doi:10.1021/jo971176v).
ETHYL_ACETATE = [(4.12, 2, [(3, 7.1)]), (2.05, 3, []), (1.26, 3, [(2, 7.1)])]
QUICK = ReconcileOptions(quick=True)


def _evidence(
    make_evidence: Evidences,
    multiplets: list[tuple[float, float, list[tuple[int, float]]]],
) -> Evidence:
    signals = tuple(
        Signal(low_ppm=s - 0.06, high_ppm=s + 0.06, area=n, area_sd=0.01, lines=())
        for s, n, _ in multiplets
    )
    return replace(make_evidence(multiplets, noise=0.003), signals=signals)


def test_given_companion_explains_its_lines(make_evidence: Evidences) -> None:
    # A third of an equivalent of dimethyl fumarate: OCH3 3.82, CH 6.87 (from
    # memory), far from any line of the table of impurities.
    tube = _evidence(make_evidence, [*ETHYL_ACETATE, (3.82, 2.0, []), (6.87, 0.67, [])])
    claimed = read_structure("CCOC(C)=O")
    alone = reconcile(tube, claimed, options=QUICK)
    companion = read_structure("COC(=O)/C=C/C(=O)OC")
    told = reconcile(tube, claimed, options=replace(QUICK, companions=(companion,)))
    kinds = {round(0.5 * (s.low_ppm + s.high_ppm), 1): s.kind for s in told.strays}
    assert kinds[3.8] == kinds[6.9] == "given"
    assert {s.kind for s in alone.strays} == {"unexplained"}
    assert told.verdict.state == "reconciled"
    before, after = alone.verdict.probability, told.verdict.probability
    assert before is not None
    assert after is not None
    assert after > before


def test_contender_without_time_is_named_and_nothing_is_unique(
    make_evidence: Evidences,
) -> None:
    tube = _evidence(make_evidence, ETHYL_ACETATE)
    hasty = ReconcileOptions(time_budget_s=1e-3)
    ledger = reconcile(tube, read_structure("CCOC(C)=O"), options=hasty)
    assert ledger.contenders
    assert {one.verdict for one in ledger.contenders} == {"not judged"}
    assert not ledger.verdict.unique
    assert any("was not tested" in reason for reason in ledger.verdict.reasons)


def test_mirror_image_is_a_caution_and_no_contender(make_evidence: Evidences) -> None:
    tube = _evidence(make_evidence, ETHYL_ACETATE)
    ledger = reconcile(tube, read_structure("CC[C@H](C)O"), options=QUICK)
    assert any("relative configuration only" in said for said in ledger.cautions)
    ledger = reconcile(tube, read_structure("CCOC(C)=O"), options=QUICK)
    assert not any("relative configuration" in said for said in ledger.cautions)


def test_claims_under_one_envelope_are_shared(
    make_evidence: Evidences, make_claims: Claims
) -> None:
    tube = _evidence(make_evidence, [(3.6, 2, []), (3.604, 3, []), (1.2, 3, [])])
    claims = make_claims([("A", 3.59, 0.1, 2), ("B", 3.61, 0.1, 3), ("C", 1.2, 0.1, 3)])
    solution = solve(tube, claims)
    assert solution is not None
    one, other, alone = book_entries(tube, solution).entries
    assert one.group is not None
    assert one.group.kind == "shared"
    assert one.group.partners == ("B",)
    assert other.group is not None
    assert other.group.partners == ("A",)
    assert alone.group is None


@pytest.mark.parametrize("shift_ppm", [-0.0, -0.001, 0.001])
def test_zero_has_no_sign(make_claims: Claims, shift_ppm: float) -> None:
    claim = make_claims([("SiMe3", 0.0, 0.1, 9)]).claims[0]
    assert "stands at 0.00 ppm" in shift_reason(claim, shift_ppm, 0.0)
