"""The command line on one acquired spectrum, from raw data to files.

Ethanol in D2O, an open BMRB deposition: two signals, so that the whole chain
takes seconds.
"""

import csv
import json
from pathlib import Path
from typing import Any

import pytest

from shared_data import shared
from spinledger.cli import main
from spinledger.io.read import read_acquired
from spinledger.project.document import (
    Project,
    ProjectOptions,
    open_spectrum,
    open_structure,
    with_options,
)
from spinledger.project.edits import RenameLabel, UnlinkClaim, apply_edit
from spinledger.project.solve import solve
from spinledger.project.storage import load_project, save_project
from spinledger.structure.read import read_structure

WHEN = "2026-12-01T10:00:00+01:00"


@pytest.fixture
def ethanol() -> Path:
    return shared("acquired", "br_ethanol_bmse000297", "raw", "1H")


def run(*words: object) -> int:
    return main([str(word) for word in words])


def read(path: Path) -> dict[str, Any]:
    tree: dict[str, Any] = json.loads(path.read_text(encoding="utf-8"))
    return tree


def test_reconcile_gives_the_published_shifts_and_the_same_bytes_twice(
    tmp_path: Path, ethanol: Path
) -> None:
    for name in ("first", "second"):
        code = run(
            *["reconcile", ethanol, "--structure", "CCO ethanol", "--solvent", "d2o"],
            *["--quick", "--out", tmp_path / name],
        )
        assert code == 0
    first = tmp_path / "first"
    for name in ("ledger.json", "assignment.csv", "figure.svg", "report.html"):
        assert (first / name).read_bytes() == (tmp_path / "second" / name).read_bytes()
    ledger = read(first / "ledger.json")
    assert ledger["structure"]["smiles"] == "CCO"
    assert ledger["spectrum"]["source"] == "1H"  # a name, never a path
    assert ledger["spectrum"]["solvent"] == "D2O"
    shifts = {
        tuple(entry["atoms"]): entry["shift_ppm"]
        for entry in ledger["entries"]
        if entry["shift_ppm"] is not None
    }
    # Ethanol in water: 1.17 and 3.65 ppm, J = 7.1 Hz, as Fulmer et al.,
    # Organometallics 29 (2010) 2176, doi:10.1021/om100106e, Table 1 (D2O) have it.
    assert shifts[(0,)] == pytest.approx(1.17, abs=0.02)
    assert shifts[(1,)] == pytest.approx(3.65, abs=0.02)
    couplings = {
        round(abs(one["j_hz"]), 1)
        for entry in ledger["entries"]
        for one in entry["couplings"]
        if one["j_hz"] is not None
    }
    assert couplings == {7.1}


def test_rank_keeps_names_and_what_does_not_parse(
    tmp_path: Path, ethanol: Path
) -> None:
    path = tmp_path / "c.smi"
    path.write_text("C1CC broken one\nCOC dimethyl ether\nCCO\tethyl alcohol, 96 %\n")
    code = run(
        *["rank", ethanol, "--candidates", path, "--solvent", "D2O", "--quick"],
        *["--out", tmp_path / "out"],
    )
    assert code == 0
    ranking = read(tmp_path / "out" / "ranking.json")
    assert ranking["schema"] == 1
    rows = ranking["candidates"]
    assert {row["name"] for row in rows} == {
        "broken one",
        "dimethyl ether",
        "ethyl alcohol, 96 %",
    }
    assert rows[0]["name"] == "ethyl alcohol, 96 %"
    for row in rows:
        assert set(row) == {
            *("name", "smiles", "probability", "verdict"),
            *("verdict_probability", "reasons"),
        }
    broken = next(row for row in rows if row["name"] == "broken one")
    assert broken["verdict"] == "not judged"
    assert broken["reasons"]


def test_batch_in_two_processes_with_one_bad_row(tmp_path: Path, ethanol: Path) -> None:
    table = tmp_path / "t.csv"
    table.write_text(
        "id,data,structure,solvent\n"
        f"good,{ethanol},CCO,D2O\n"
        f"bad,{ethanol},C1CC,D2O\n"
        f"twin,{ethanol},OCC,D2O\n"
    )
    words = ["batch", table, "--quick", "--workers", "2", "--out", tmp_path / "out"]
    assert run(*words) == 1
    with (tmp_path / "out" / "summary.csv").open(newline="") as file:
        rows = {row["id"]: row for row in csv.DictReader(file)}
    assert rows["good"]["verdict"] == "reconciled"
    assert rows["bad"]["result"] == "failed"
    assert rows["twin"]["result"] == "done"
    assert (tmp_path / "out" / "twin" / "report.html").is_file()
    assert run(*words) == 1
    with (tmp_path / "out" / "summary.csv").open(newline="") as file:
        results = [row["result"] for row in csv.DictReader(file)]
    assert results == ["kept", "failed", "kept"]


def test_sample_puts_several_spectra_together(tmp_path: Path, ethanol: Path) -> None:
    out = tmp_path / "out"
    code = run(
        *["sample", ethanol, ethanol, "--structure", "CCO", "--solvent", "D2O"],
        *["--quick", "--out", out],
    )
    assert code == 0
    joint = read(out / "sample.json")
    assert [one["folder"] for one in joint["spectra"]] == ["1-1H", "2-1H"]
    own = read(out / "1-1H" / "ledger.json")["verdict"]["probability"]
    assert joint["verdict"]["probability"] == own  # not multiplied
    with (out / "sample.csv").open(newline="") as file:
        rows = list(csv.reader(file))
    assert rows[0][:2] == ["claim", "protons"]
    assert len(rows[0]) == 6


def test_a_project_is_solved_edited_saved_and_reported(
    tmp_path: Path, ethanol: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    project = open_spectrum(
        Project(), read_acquired(ethanol), source_path=str(ethanol), when=WHEN
    )
    project = open_structure(project, read_structure("CCO"), when=WHEN)
    options = ProjectOptions(solvent="D2O", is_quick=True)
    project = with_options(project, options, when=WHEN)
    solved = solve(project, when=WHEN)
    assert solved.ledger is not None
    assert not solved.needs_ledger
    assert solve(solved, when=WHEN) is solved
    methyl = next(one for one in solved.ledger.entries if one.atoms == (0,))
    renamed = apply_edit(solved, RenameLabel(claim=methyl.claim, label="Me"), when=WHEN)
    edited = apply_edit(renamed, UnlinkClaim(claim="Me"), when=WHEN)
    path = tmp_path / "p.sledger"
    save_project(edited, path)
    words = ["report", path, "--out", tmp_path / "out", "--formats", "json,html"]
    assert run(*words) == 0
    assert "may differ: The ledger has to be solved again" in capsys.readouterr().out
    page = (tmp_path / "out" / "report.html").read_text("utf-8")
    assert "Me taken off its signal" in page
    assert "Before hand edits: consistent with the drawn structure" in page
    again = solve(load_project(path), when=WHEN)
    assert again.ledger is not None
    states = {one.claim: one.state for one in again.ledger.entries}
    assert states["Me"] == "open"
    assert again.verdict_before_edits == solved.ledger.verdict
    assert again.ledger.edits == ("Me taken off its signal",)
