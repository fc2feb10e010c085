"""The whole reconciliation and ranking of a synthetic ethyl acetate spectrum.

Shifts of ethyl acetate in CDCl3: 2.05 s, 4.12 q, 1.26 t, J 7 Hz (Gottlieb,
Kotlyar, Nudelman, doi:10.1021/jo971176v, Table 1).
"""

from collections.abc import Callable
from dataclasses import replace

import pytest

from spinledger.errors import CancelledError
from spinledger.reconcile.options import (
    Candidate,
    Constraints,
    DeclaredImpurity,
    ReconcileOptions,
)
from spinledger.reconcile.run import rank, reconcile
from spinledger.structure.read import read_structure
from spinledger.values.evidence import Evidence, Signal

Evidences = Callable[..., Evidence]


@pytest.fixture
def ethyl_acetate(make_evidence: Evidences) -> Evidence:
    multiplets = [(4.12, 2, [(3, 7.1)]), (2.05, 3, []), (1.26, 3, [(2, 7.1)])]
    evidence = make_evidence(multiplets, noise=0.003)
    signals = tuple(
        Signal(low_ppm=s - 0.06, high_ppm=s + 0.06, area=n, area_sd=0.01, lines=())
        for s, n, _ in multiplets
    )
    return replace(evidence, signals=signals)


QUICK = ReconcileOptions(quick=True)


def test_right_structure_is_reconciled_and_every_claim_settled(
    ethyl_acetate: Evidence,
) -> None:
    ledger = reconcile(ethyl_acetate, read_structure("CCOC(C)=O"), options=QUICK)
    assert ledger.verdict.state == "reconciled"
    assert [entry.state for entry in ledger.entries] == ["settled"] * 3
    placed = sorted(entry.shift_ppm or 0.0 for entry in ledger.entries)
    # Noise-limited fit of lines 1.2 Hz wide: far better than 0.001 ppm.
    assert placed == pytest.approx([1.26, 2.05, 4.12], abs=0.001)
    assert not ledger.verdict.unique  # quick: no contender was tested
    assert ledger.model is not None


def test_wrong_isomer_is_not_reconciled_and_says_why(ethyl_acetate: Evidence) -> None:
    ledger = reconcile(ethyl_acetate, read_structure("CCCC(=O)O"), options=QUICK)
    assert ledger.verdict.state == "not reconciled"
    assert ledger.verdict.reasons


def test_ranking_puts_the_right_one_first_and_keeps_the_unreadable(
    ethyl_acetate: Evidence,
) -> None:
    smiles = ["CCCC(=O)O", "CCC(=O)OC", "CCOC(C)=O", "CC(=O)OCC"]
    candidates = [
        Candidate(name=f"c{i}", smiles=s, structure=read_structure(s))
        for i, s in enumerate(smiles)
    ]
    broken = Candidate(
        name="broken", smiles="C(", structure=None, reason="does not parse"
    )
    ranked = rank(ethyl_acetate, [broken, *candidates], options=QUICK).candidates
    # c2 and c3 are the same compound drawn twice: the order given decides.
    assert [one.name for one in ranked[:2]] == ["c2", "c3"]
    assert "cannot be told from c3" in ranked[0].reasons[0]
    assert ranked[-1].name == "broken"
    assert ranked[-1].reasons == ("does not parse",)
    total = sum(one.probability or 0.0 for one in ranked)
    assert total == pytest.approx(1.0, abs=1e-9)


def test_rank_and_reconcile_give_one_own_probability(ethyl_acetate: Evidence) -> None:
    structure = read_structure("CCC(=O)OC")
    ledger = reconcile(ethyl_acetate, structure, options=QUICK)
    candidate = Candidate(name="x", smiles="CCC(=O)OC", structure=structure)
    ranked = rank(ethyl_acetate, [candidate], options=QUICK).candidates[0]
    assert ranked.verdict_probability == pytest.approx(
        ledger.verdict.probability, abs=1e-12
    )


def test_declared_impurity_is_booked_and_left_out(ethyl_acetate: Evidence) -> None:
    edits = Constraints(
        impurities=(DeclaredImpurity(low_ppm=2.0, high_ppm=2.1, why="acetic acid"),)
    )
    ledger = reconcile(
        ethyl_acetate,
        read_structure("CCO"),
        options=ReconcileOptions(quick=True, constraints=edits),
    )
    booked = [stray for stray in ledger.strays if stray.kind == "impurity"]
    assert [(one.low_ppm, one.why) for one in booked] == [(2.0, "acetic acid")]
    assert not any(
        stray.kind == "unexplained" and stray.low_ppm < 2.05 < stray.high_ppm
        for stray in ledger.strays
    )
    assert ledger.edits == ("2.000 to 2.100 ppm: acetic acid",)


def test_structure_without_visible_protons_is_not_judged(
    ethyl_acetate: Evidence,
) -> None:
    # Oxalic acid has only carboxylic protons, which heavy water exchanges.
    evidence = replace(ethyl_acetate, solvent="D2O")
    ledger = reconcile(evidence, read_structure("OC(=O)C(=O)O"), options=QUICK)
    assert ledger.verdict.state == "not judged"
    assert ledger.verdict.probability is None


def test_cancel_stops_the_work(ethyl_acetate: Evidence) -> None:
    with pytest.raises(CancelledError):
        reconcile(
            ethyl_acetate,
            read_structure("CCOC(C)=O"),
            options=QUICK,
            cancelled=lambda: True,
        )
