"""The text form of side evidence: many spellings, one meaning; faults in a sentence."""

from pathlib import Path

import pytest

from spinledger.errors import SideEvidenceError
from spinledger.reconcile.side_evidence import ANY_COUNT, SideEvidence
from spinledger.reconcile.side_reading import read_side_evidence, side_evidence_from


def carbons(side: SideEvidence) -> list[tuple[float | None, frozenset[int]]]:
    return [(one.shift_ppm, one.n_protons) for one in side.carbons]


@pytest.mark.parametrize(
    "text",
    [
        "13C: 171.2, 129.9, 60.5, 14.2",
        "13C NMR (101 MHz, CDCl3) δ 171.2, 129.9 (2C), 60.5, 14.2.",
        "¹³C\n171.2\n129.9\n60.5\n14.2 ppm",
        "13c = 171,2; 129,9; 60,5; 14,2",
        "# from the robot\n13C\t171.2\t129.9\t60.5\t14.2",
    ],
)
def test_carbon_list_in_any_spelling(text: str) -> None:
    found = read_side_evidence(text)
    assert carbons(found) == [(s, ANY_COUNT) for s in (171.2, 129.9, 60.5, 14.2)]
    assert found.shows_quaternary


@pytest.mark.parametrize(
    "text",
    [
        "DEPT: CH3: 14.2, 20.9; CH2: 60.5",
        "DEPT 14.2 CH3, 20.9 CH3, 60.5 CH2",
        "DEPT-135\n14.2 q\n20.9 q\n60.5 t",
        "dept: CH₃ 14.2 20.9; CH₂ 60.5",
    ],
)
def test_dept_list_in_any_spelling(text: str) -> None:
    found = read_side_evidence(text)
    three, two = frozenset({3}), frozenset({2})
    assert carbons(found) == [(14.2, three), (20.9, three), (60.5, two)]
    assert not found.shows_quaternary


@pytest.mark.parametrize(
    "text",
    [
        "HSQC: 4.12/60.5, 1.26/14.2",
        "HSQC\n4.12 60.5\n1.26\t14.2",
        "hsqc 60.5 -> 4.12; 14.2 -> 1.26",
        "HSQC: 4,12/60,5; 1,26/14,2",
        "HSQC (4.12, 60.5), (1.26, 14.2)",
    ],
)
def test_hsqc_pairs_in_any_spelling(text: str) -> None:
    found = read_side_evidence(text)
    pairs = [(one.proton_ppm, one.carbon_ppm) for one in found.hsqc]
    assert pairs == [(4.12, 60.5), (1.26, 14.2)]


@pytest.mark.parametrize(
    "text", ["COSY: 4.12-1.26", "cosy 1.26 / 4.12, 2.0/2.0", "COSY\n4.12 – 1.26"]
)
def test_cosy_pairs_high_shift_first_without_the_diagonal(text: str) -> None:
    found = read_side_evidence(text)
    assert [(p.first_ppm, p.second_ppm) for p in found.cosy] == [(4.12, 1.26)]


def test_counts_stand_for_lines_and_blocks_may_share_a_line() -> None:
    found = read_side_evidence("types: 2 CH3, 1 CH2, 3 C; HSQC 4.12/60.5 CH2")
    assert sorted(sum(one.n_protons) for one in found.carbons) == [0, 0, 0, 2, 3, 3]
    assert found.hsqc[0].n_protons == frozenset({2})
    assert len(read_side_evidence("carbons: 9").carbons) == 9


@pytest.mark.parametrize(
    ("text", "fault"),
    [
        ("", "there is nothing in it"),
        ("13C", "there is nothing in it"),
        ("hello", "line 1: 'hello' holds no value"),
        ("4.1 2.2", "line 1: .* stands under no heading"),
        ("HSQC 4.1", "line 1: '4.1' is no pair"),
        ("HSQC: a/b", "line 1: .* holds no value"),
        ("HSQC\n1.2/14\n4.1", "line 3: '4.1' is no pair"),
        ("COSY: 171.2/4", "171.2 ppm is no shift from -10 to 30"),
        ("13C: 1712", "1712 ppm is no shift from -60 to 260"),
        ("carbons: 9.5", "must be one whole number"),
        ("carbons: 900", "more than 200 carbons"),
        ("types: CH3", "a whole number with every type"),
    ],
)
def test_fault_is_one_sentence_with_its_line(text: str, fault: str) -> None:
    with pytest.raises(SideEvidenceError, match=fault):
        read_side_evidence(text)


def test_file_or_text_are_told_apart(tmp_path: Path) -> None:
    file = tmp_path / "side.txt"
    file.write_text("carbons: 4\n", encoding="utf-8-sig")
    assert len(side_evidence_from(str(file)).carbons) == 4
    assert len(side_evidence_from("carbons: 3").carbons) == 3
    with pytest.raises(SideEvidenceError, match="could not be read"):
        side_evidence_from(str(tmp_path / "missing.txt"))
