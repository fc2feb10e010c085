"""NMReDATA records against the published list of tags, and there and back.

Tags, separators and digits: M. Pupier et al., Magn. Reson. Chem. 56 (2018)
703-715, doi:10.1002/mrc.4737.
"""

import csv
import re
from dataclasses import replace
from pathlib import Path

import pytest
from rdkit import Chem

from invented_ledger import invented_ledger, overlapped_ledger
from shared_data import shared
from spinledger.report.nmredata import (
    RecordError,
    nmredata_record,
    quoted,
    read_nmredata,
)


def test_tags_are_those_of_the_standard() -> None:
    with shared("reference", "nmredata_facts.csv").open(encoding="utf-8") as file:
        known = {row["tag"] for row in csv.DictReader(file)}
    tags = re.findall(r"^>  <([^>]+)>$", nmredata_record(invented_ledger()), re.M)
    assert tags
    assert set(tags) <= known
    for needed in ("NMREDATA_VERSION", "NMREDATA_LEVEL", "NMREDATA_ASSIGNMENT"):
        assert needed in tags


def test_every_line_of_a_tag_ends_as_version_1_1_wants_it() -> None:
    record = nmredata_record(invented_ledger())
    tags = record.split("M  END\n")[1].split("$$$$")[0]
    lines = [one for one in tags.splitlines() if one and not one.startswith(">")]
    assert lines
    assert all(line.endswith("\\") for line in lines)


def test_record_comes_back_with_its_digits(tmp_path: Path) -> None:
    ledger = overlapped_ledger()
    path = tmp_path / "record.sdf"
    path.write_text(nmredata_record(ledger), "utf-8")
    record = read_nmredata(path)
    assert record.smiles == Chem.CanonSmiles(ledger.structure.smiles)
    assert record.field_mhz == 400.13
    assert record.solvent == "CDCl3"
    shifts = {one.label: one.shift_ppm for one in record.assignments}
    assert shifts == {
        entry.claim: None if entry.shift_ppm is None else round(entry.shift_ppm, 5)
        for entry in ledger.entries
    }
    atoms = {one.label: one.atoms for one in record.assignments}
    assert atoms["2-HA"] == ("H6",)  # counted from 1
    couplings = {frozenset((c.first, c.second)): c.j_hz for c in record.couplings}
    assert couplings[frozenset(("2-HA", "2-HB"))] == -16.5
    assert len(couplings) == 5
    assert record.interchangeable == (("2-HA", "2-HB"),)


def test_level_says_whether_assignments_are_open() -> None:
    assert "<NMREDATA_LEVEL>\n0\\\n" in nmredata_record(invented_ledger())
    assert "<NMREDATA_LEVEL>\n1\\\n" in nmredata_record(overlapped_ledger())


def test_attributes_stand_in_the_order_of_the_standard() -> None:
    with shared("reference", "nmredata_facts.csv").open(encoding="utf-8") as file:
        facts = {row["tag"]: row["content"] for row in csv.DictReader(file)}
    order = [one.strip() for one in facts["1D attribute order"].split(",")]
    text = nmredata_record(invented_ledger()).split("<NMREDATA_1D_1H>")[1]
    lines = [line for line in text.splitlines() if "S=" in line]
    assert len(lines) == 7
    for line in lines:
        found = re.findall(r"\b([A-Z][A-Za-z0-9]*)=", line)
        ranks = [order.index(one) for one in found]
        assert ranks == sorted(ranks)


def test_rdkit_reads_the_record() -> None:
    supplier = Chem.SDMolSupplier()
    supplier.SetData(nmredata_record(invented_ledger()))
    molecule = supplier[0]
    assert molecule.GetNumAtoms() == 9
    assert molecule.GetProp("NMREDATA_FORMULA").startswith("C6H12O3")


def test_labels_with_separators_are_quoted_and_read_back(tmp_path: Path) -> None:
    assert quoted("2-HA") == "2-HA"
    assert quoted("H, axial") == '<"H, axial">'
    ledger = invented_ledger()
    odd = replace(
        ledger,
        entries=tuple(
            replace(one, claim="4-H (a/b)", couplings=()) if one.claim == "4-H" else one
            for one in ledger.entries
        ),
    )
    path = tmp_path / "record.sdf"
    path.write_text(nmredata_record(odd), "utf-8")
    labels = [one.label for one in read_nmredata(path).assignments]
    assert "4-H (a/b)" in labels


def test_other_files_are_refused_in_one_sentence(tmp_path: Path) -> None:
    path = tmp_path / "other.sdf"
    with pytest.raises(RecordError, match="no such file"):
        read_nmredata(path)
    path.write_text("hello")
    with pytest.raises(RecordError, match="no structure that can be read"):
        read_nmredata(path)
    path.write_text(Chem.MolToMolBlock(Chem.MolFromSmiles("CCO")) + "$$$$\n")
    with pytest.raises(RecordError, match="no NMReDATA tags"):
        read_nmredata(path)
