"""Tables of jobs: each row on its own, finished rows kept, results in order."""

import csv
import json
import shutil
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

from invented_ledger import invented_ledger
from spinledger.batch import row as row_module
from spinledger.batch.job import Job, run_job
from spinledger.batch.row import RowTask, run_row
from spinledger.batch.run import ClusterError, run_table
from spinledger.batch.table import Row, read_table
from spinledger.cli import main
from spinledger.errors import OutputError, StructureError
from spinledger.reconcile.options import ReconcileOptions
from spinledger.report.overview import overview_html
from spinledger.report.write import write_reports
from spinledger.values.ledger import Ledger

SAMPLES = Path(__file__).resolve().parents[3] / "sample_data"

Calls = list[Job]


@pytest.fixture
def calls(monkeypatch: pytest.MonkeyPatch) -> Calls:
    """Jobs that were run; each writes the invented ledger, or fails by its name."""
    done: Calls = []

    def run(job: Job, *, progress: object = None) -> Ledger:
        done.append(job)
        if job.structure == "bad":
            raise StructureError("bad", "it does not\nparse")
        if job.structure == "bug":
            raise ZeroDivisionError("ours")
        ledger = invented_ledger()
        if job.structure == "wrong":
            verdict = replace(ledger.verdict, state="not reconciled", probability=0.01)
            ledger = replace(ledger, verdict=verdict)
        write_reports(ledger, job.folder, formats=("json", "csv"))
        return ledger

    monkeypatch.setattr(row_module, "run_job", run)
    return done


@pytest.fixture
def table(tmp_path: Path) -> Callable[..., Path]:
    """Writes a table with data files beside it."""

    def write(*rows: str) -> Path:
        folder = tmp_path / "in"
        folder.mkdir(exist_ok=True)
        for name in ("a.dx", "b.dx"):
            (folder / name).write_text("data")
        path = folder / "table.csv"
        path.write_text("id,data,structure,solvent\n" + "\n".join(rows) + "\n")
        return path

    return write


def summary(folder: Path) -> list[dict[str, str]]:
    with (folder / "summary.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_one_bad_row_never_stops_the_rest(
    tmp_path: Path, calls: Calls, table: Callable[..., Path]
) -> None:
    out = tmp_path / "out"
    path = table(
        "one,a.dx,CCO,CDCl3",
        "two,a.dx,bad,",
        "three,a.dx,bug,",
        "four,,CC,",
        "five,b.dx,CC,lemonade",
        "six,b.dx,wrong,d2o",
    )
    results = run_table(path, out)
    assert [one.has_failed for one in results] == [
        False,
        True,
        True,
        True,
        True,
        False,
    ]
    rows = summary(out)
    assert [row["id"] for row in rows] == ["one", "two", "three", "four", "five", "six"]
    assert rows[0]["result"] == "done"
    assert rows[0]["verdict"] == "reconciled"
    assert rows[0]["probability"] == "0.97"
    assert rows[0]["unexplained"] == "1"
    assert rows[1]["error"] == "bad: it does not parse"
    assert rows[2]["error"] == "internal fault, ZeroDivisionError: ours"
    assert "column data is empty" in rows[3]["error"]
    assert "'lemonade' is not known" in rows[4]["error"]
    assert [one.solvent for one in calls] == ["CDCl3", None, None, "D2O"]
    # Paths are those beside the table.
    assert calls[0].data == path.parent / "a.dx"
    assert (out / "one" / "ledger.json").is_file()
    assert not (out / "two").exists()


def test_finished_rows_are_kept_and_failed_ones_tried_again(
    tmp_path: Path, calls: Calls, table: Callable[..., Path]
) -> None:
    out = tmp_path / "out"
    path = table("one,a.dx,CCO,", "two,a.dx,bad,")
    run_table(path, out)
    first = summary(out)
    assert len(calls) == 2
    run_table(path, out)
    assert [one.structure for one in calls] == ["CCO", "bad", "bad"]
    again = summary(out)
    assert again[0]["result"] == "kept"
    assert again[0] | {"result": "done"} == first[0]


def test_a_row_is_done_again_when_what_it_depends_on_changes(
    tmp_path: Path, calls: Calls, table: Callable[..., Path]
) -> None:
    out = tmp_path / "out"
    run_table(table("one,a.dx,CCO,"), out)
    run_table(table("one,a.dx,CCC,"), out)
    assert len(calls) == 2
    run_table(table("one,a.dx,CCC,"), out, options=ReconcileOptions(quick=True))
    assert len(calls) == 3
    path = table("one,a.dx,CCC,")
    (path.parent / "a.dx").write_text("other data")
    run_table(path, out, options=ReconcileOptions(quick=True))
    assert len(calls) == 4
    # A run that was killed before its mark was written is done again.
    (out / "one" / "job.json").unlink()
    run_table(path, out, options=ReconcileOptions(quick=True))
    assert len(calls) == 5


def test_a_damaged_mark_means_not_finished(
    tmp_path: Path, calls: Calls, table: Callable[..., Path]
) -> None:
    out = tmp_path / "out"
    path = table("one,a.dx,CCO,")
    run_table(path, out)
    (out / "one" / "job.json").write_text("{half")
    run_table(path, out)
    assert len(calls) == 2


def test_a_result_lost_since_is_made_again(
    tmp_path: Path, calls: Calls, table: Callable[..., Path]
) -> None:
    out = tmp_path / "out"
    path = table("one,a.dx,CCO,")
    run_table(path, out)
    (out / "one" / "ledger.json").write_text('{"half')
    run_table(path, out)
    assert len(calls) == 2


def test_progress_counts_rows(
    tmp_path: Path, calls: Calls, table: Callable[..., Path]
) -> None:
    said: list[tuple[str, float]] = []
    run_table(
        table("one,a.dx,CCO,", "two,a.dx,bad,"),
        tmp_path / "out",
        progress=lambda words, fraction: said.append((words, fraction)),
    )
    assert said == [("1 of 2 rows, last one", 0.5), ("2 of 2 rows, last two", 1.0)]


def test_the_worst_rows_stand_first_in_the_overview(
    tmp_path: Path, calls: Calls, table: Callable[..., Path]
) -> None:
    out = tmp_path / "out"
    run_table(table("good,a.dx,CCO,", "wrong,a.dx,wrong,", "broken,a.dx,bad,"), out)
    page = (out / "overview.html").read_text("utf-8")
    places = [page.index(f">{one}") for one in ("broken", "wrong", "good")]
    assert places == sorted(places)
    assert "3 rows, 1 failed" in page
    assert 'src="good/figure.svg"' in page
    assert ">not reconciled<" not in page  # outgoing words only


def test_overview_shows_names_with_markup_as_text() -> None:
    cells = dict.fromkeys(
        (
            *("data", "solvent", "result", "verdict", "probability"),
            *("claimed_protons", "found_protons", "inconsistent", "not_observed"),
            "unexplained",
        ),
        "",
    )
    page = overview_html(
        [{**cells, "id": "<i>x", "structure": "a&b", "error": "<oh>"}], title="t<"
    )
    assert "&lt;i&gt;x" in page
    assert "a&amp;b" in page
    assert "<oh>" not in page


def test_rows_run_in_other_processes_and_keep_their_order(
    tmp_path: Path, table: Callable[..., Path]
) -> None:
    # All of them fail early, so that the processes have little to do.
    path = table(*(f"r{k},absent-{k}.dx,CCO," for k in range(4)))
    results = run_table(path, tmp_path / "out", workers=2)
    assert [one.row.name for one in results] == ["r0", "r1", "r2", "r3"]
    for rank, one in enumerate(results):
        assert one.has_failed
        assert f"absent-{rank}.dx" in one.cells["error"]


def test_a_cluster_that_is_not_there_is_one_sentence(
    tmp_path: Path, table: Callable[..., Path], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("spinledger.batch.run.find_spec", lambda _name: None)
    with pytest.raises(ClusterError, match=r"pip install spinledger\[cluster\]"):
        run_table(table("one,a.dx,CCO,"), tmp_path / "out", cluster="tcp://x:1")


def test_workers_must_be_one_or_more(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="workers must be >= 1, got 0"):
        run_table(tmp_path / "t.csv", tmp_path / "out", workers=0)


def test_structure_files_beside_the_table_are_found(
    tmp_path: Path, calls: Calls, table: Callable[..., Path]
) -> None:
    path = table("one,a.dx,ester.mol,")
    shutil.copy(SAMPLES / "structures" / "hydroxy-ester.mol", path.parent / "ester.mol")
    run_table(path, tmp_path / "out")
    assert calls[0].structure == str(path.parent / "ester.mol")


def test_a_row_that_cannot_be_written_fails_alone(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def run(_job: Job) -> Ledger:
        raise OutputError(tmp_path, "the disk is full")

    monkeypatch.setattr(row_module, "run_job", run)
    task = RowTask(
        row=Row(number=1, name="one", data="a", structure="CC", solvent=""),
        base=tmp_path,
        folder=tmp_path,
        options=ReconcileOptions(),
    )
    result = run_row(task)
    assert result.has_failed
    assert "the disk is full" in result.cells["error"]


def test_command_ends_with_1_if_any_row_failed(
    tmp_path: Path,
    calls: Calls,
    table: Callable[..., Path],
    capsys: pytest.CaptureFixture[str],
) -> None:
    path = table("one,a.dx,CCO,", "two,a.dx,bad,")
    assert main(["batch", str(path), "--out", str(tmp_path / "out")]) == 1
    said = capsys.readouterr().out
    assert "failed: row 2 (two): bad: it does not parse" in said
    assert "1 of 2 rows done" in said
    path = table("one,a.dx,CCO,")
    assert main(["batch", str(path), "--out", str(tmp_path / "out")]) == 0


def test_all_inputs_of_a_job_are_checked_before_the_work(tmp_path: Path) -> None:
    job = Job(data=SAMPLES / "batch-117", structure="C1CC", folder=tmp_path / "out")
    said: list[str] = []
    with pytest.raises(StructureError, match="C1CC"):
        run_job(job, progress=lambda stage, _fraction: said.append(stage))
    assert said == []
    assert not (tmp_path / "out").exists()


def test_mark_of_a_finished_row_names_what_it_depends_on(
    tmp_path: Path, calls: Calls, table: Callable[..., Path]
) -> None:
    path = table("one,a.dx,CCO,CDCl3")
    run_table(path, tmp_path / "out")
    mark = json.loads((tmp_path / "out" / "one" / "job.json").read_text("utf-8"))
    assert mark["structure"] == "CCO"
    assert mark["solvent"] == "CDCl3"
    assert "spinledger" in mark["versions"]
    assert len(read_table(path)) == 1
