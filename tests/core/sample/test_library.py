from dataclasses import replace
from pathlib import Path

import pytest

from invented_ledger import overlapped_ledger
from spinledger.errors import OutputError, StructureError
from spinledger.sample.library import (
    Library,
    Record,
    RecordClaim,
    library_structures,
    load_library,
    named_by_library,
    neighbours,
    record_of,
    save_record,
    sharpened,
)
from spinledger.structure.read import read_structure
from spinledger.values.claim import Claim, ClaimSet
from spinledger.values.evidence import Signal
from spinledger.values.ledger import Ledger


@pytest.fixture(scope="module")
def ledger() -> Ledger:
    plain = overlapped_ledger()
    return replace(plain, verdict=replace(plain.verdict, state="reconciled"))


def one_record(miss_ppm: float) -> Record:
    claim = RecordClaim(
        label="2-H", atoms=(1,), protons=2, shift_ppm=2.4 + miss_ppm, predicted_ppm=2.4
    )
    return Record(
        name="known", smiles="CCC(=O)N(C)C", solvent="CDCl3", field_mhz=400.0,
        sha256="0" * 64, claims=(claim,), lines=(),
    )  # fmt: skip


def claims(sd_ppm: float) -> ClaimSet:
    claim = Claim(
        label="2-H", atoms=(1,), n_protons=2, shift_ppm=2.35, shift_sd_ppm=sd_ppm
    )
    return ClaimSet(claims=(claim,), particles=(), couplings=())


def test_record_goes_to_the_folder_and_comes_back(
    ledger: Ledger, tmp_path: Path
) -> None:
    record = record_of(ledger, "batch 117 / ester")
    save_record(record, tmp_path / "library")
    save_record(record, tmp_path / "library")
    (back,) = load_library(tmp_path / "library").records
    assert back.name == record.name
    assert [one.label for one in back.claims] == [one.label for one in record.claims]
    assert back.claims[0].shift_ppm == pytest.approx(
        record.claims[0].shift_ppm, abs=5e-5
    )


def test_file_that_is_no_record_is_said_and_the_others_stay(
    ledger: Ledger, tmp_path: Path
) -> None:
    save_record(record_of(ledger, "ester"), tmp_path)
    (tmp_path / "notes.json").write_text('{"schema": 1}', encoding="utf-8")
    (tmp_path / "broken.json").write_text("{", encoding="utf-8")
    library = load_library(tmp_path)
    assert len(library.records) == 1
    assert len(library.problems) == 2
    with pytest.raises(OutputError, match="no such library folder"):
        load_library(tmp_path / "missing")


def test_ledger_that_is_not_reconciled_teaches_nothing(ledger: Ledger) -> None:
    doubtful = replace(ledger, verdict=replace(ledger.verdict, state="undecided"))
    with pytest.raises(StructureError, match="only reconciled compounds"):
        record_of(doubtful, "ester")


def test_miss_of_a_near_relative_corrects_the_prediction() -> None:
    structure = read_structure("CCC(=O)N(C)CC")
    library = Library(records=(one_record(0.3),))
    found = sharpened(claims(0.2), structure, library, solvent="CDCl3").claims[0]
    (near,) = neighbours(library, structure, claims(0.2).claims[0], solvent="CDCl3")
    assert near.bonds == 2
    # By hand: two bonds give 0.15 ppm; gain 0.04 / (0.04 + 0.0225).
    gain = 0.2**2 / (0.2**2 + 0.15**2)
    assert found.shift_ppm == pytest.approx(2.35 + gain * 0.3)
    assert found.shift_sd_ppm == pytest.approx(0.2 * (1.0 - gain) ** 0.5)
    assert "own library: 2-H of known" in found.shift_source


def test_stranger_leaves_the_prediction_alone() -> None:
    structure = read_structure("c1ccccc1")
    plain = claims(0.2)
    library = Library(records=(one_record(0.3),))
    assert sharpened(plain, structure, library, solvent="CDCl3") == plain


def test_library_names_the_compound_of_a_spectrum(ledger: Ledger) -> None:
    record = record_of(ledger, "ester")
    stranger = replace(
        record,
        name="stranger",
        lines=tuple(replace(one, shift_ppm=8.9) for one in record.lines),
    )
    library = Library(records=(stranger, record))
    signals = tuple(
        Signal(
            low_ppm=one.range_ppm[0] - 0.01,
            high_ppm=one.range_ppm[1] + 0.01,
            area=1.0,
            area_sd=0.01,
            lines=(),
        )
        for one in ledger.entries
        if one.range_ppm is not None
    )
    evidence = replace(ledger.evidence, signals=signals)
    found = named_by_library(evidence, library)
    assert [one.name for one, _ in found] == ["ester"]
    assert [one.smiles for one in library_structures(library)] == [record.smiles]
