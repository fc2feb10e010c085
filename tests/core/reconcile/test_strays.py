"""Strays: released to a claimed standard, named by table, told from satellites."""

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from spinledger.reconcile.strays import (
    Unowned,
    own_satellites,
    released,
    table_impurities,
)
from spinledger.structure.read import read_structure
from spinledger.values.evidence import Evidence, Line, Signal, Stray
from spinledger.values.ledger import ClaimLines

Evidences = Callable[..., Evidence]

REFERENCE = Stray(low_ppm=-0.02, high_ppm=0.02, kind="reference", why="zero")
WATER = Stray(low_ppm=1.5, high_ppm=1.6, kind="water", why="H2O")
SOLVENT = Stray(low_ppm=7.25, high_ppm=7.27, kind="solvent", why="CHCl3")


@pytest.mark.parametrize(
    ("smiles", "kept"),
    [
        ("C[Si](C)(C)C", {"water", "solvent"}),
        ("C[Si](C)(C)CCCS(=O)(=O)O", {"water", "solvent"}),
        ("C[Si](C)(C)CCCS(=O)(=O)[O-].[Na+]", {"water", "solvent"}),
        ("ClC(Cl)Cl", {"water", "reference"}),
        ("CCO", {"water", "solvent", "reference"}),
    ],
)
def test_claimed_standard_or_solvent_owns_its_line(
    make_evidence: Evidences, smiles: str, kept: set[str]
) -> None:
    evidence = make_evidence([(1.0, 3, [])], strays=(REFERENCE, WATER, SOLVENT))
    found = released(evidence, read_structure(smiles))
    assert {stray.kind for stray in found.strays} == kept


def unowned(centre: float, area: float, half_width: float = 0.01) -> Unowned:
    return Unowned(
        low_ppm=centre - half_width,
        high_ppm=centre + half_width,
        centre_ppm=centre,
        area=area,
        share=1.0,
        reach_hz=800.0 * max(half_width - 0.0075, 0.0),
    )


def test_ethyl_acetate_is_named_with_all_its_lines(make_evidence: Evidences) -> None:
    # CDCl3: 2.05 s, 4.12 q, 1.26 t; Gottlieb et al., doi:10.1021/jo971176v, Table 1.
    evidence = make_evidence([(7.0, 1, [])])
    rows = [unowned(4.12, 2.0, 0.05), unowned(2.05, 3.0), unowned(1.26, 3.0, 0.04)]
    named = table_impurities(evidence, rows)
    assert set(named) == {0, 1, 2}
    assert all("ethyl acetate" in why.lower() for _, why in named.values())


def test_half_of_an_impurity_is_not_enough(make_evidence: Evidences) -> None:
    evidence = make_evidence([(7.0, 1, [])])
    # The quartet of ethyl acetate alone; no table compound has only this line.
    assert table_impurities(evidence, [unowned(4.12, 2.0, 0.05)]) == {}


def test_wide_stretch_is_no_singlet(make_evidence: Evidences) -> None:
    evidence = make_evidence([(7.0, 1, [])])
    # Acetone in CDCl3 is a singlet at 2.17; 0.2 ppm at 400 MHz is 80 Hz.
    assert 0 in table_impurities(evidence, [unowned(2.17, 1.0)])
    assert table_impurities(evidence, [unowned(2.17, 1.0, 0.1)]) == {}


def test_satellites_stand_beside_their_line(make_evidence: Evidences) -> None:
    evidence = make_evidence([(2.0, 3, [])])
    lines = ClaimLines(
        claim="Me", shifts_ppm=np.array([2.0]), protons=np.array([3.0]), width_hz=1.0
    )
    # 62.5 Hz (half of 125 Hz) at 400 MHz is 0.156 ppm; 0.55 % of 3 H.
    beside = unowned(2.0 + 62.5 / 400.0, 3 * 0.0055)
    far = unowned(2.5, 3 * 0.0055)
    large = unowned(2.0 - 62.5 / 400.0, 0.5)
    named = own_satellites(evidence, [beside, far, large], [lines], 1.0)
    assert set(named) == {0}


def test_signal_value_can_stand_in_for_a_line_on_top(make_evidence: Evidences) -> None:
    # The methyl singlet of ethyl acetate lies under another signal.
    line = Line(
        shift_ppm=2.05,
        shift_sd_ppm=0.001,
        area=9.0,
        area_sd=0.1,
        width_hz=1.0,
        width_sd_hz=0.1,
    )
    signal = Signal(low_ppm=1.9, high_ppm=2.2, area=9.0, area_sd=0.1, lines=(line,))
    evidence = replace(make_evidence([(7.0, 1, [])]), signals=(signal,))
    rows = [unowned(4.12, 2.0, 0.05), unowned(1.26, 3.0, 0.04)]
    assert set(table_impurities(evidence, rows)) == {0, 1}
