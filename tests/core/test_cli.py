"""The command line as a user meets it: exit codes, one-line errors, files."""

import csv
import json
import os
import re
import shutil
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from invented_ledger import invented_ledger
from spinledger.batch.table import BatchTableError, read_table
from spinledger.cli import main
from spinledger.cli.inputs import read_candidates
from spinledger.cli.progress import ProgressLine
from spinledger.errors import StructureError
from spinledger.project.document import Project
from spinledger.project.storage import save_project
from spinledger.report.json_ledger import ledger_text

SAMPLES = Path(__file__).resolve().parents[2] / "sample_data"
BATCH = SAMPLES / "batch-117"
ESTER = "CCOC(=O)CC(C)O"


@pytest.fixture
def two_d(tmp_path: Path) -> Path:
    """A Bruker folder that looks like a 2D experiment."""
    folder = tmp_path / "cosy"
    shutil.copytree(next(BATCH.glob("*")), folder)
    (folder / "fid").rename(folder / "ser")
    shutil.copy(folder / "acqus", folder / "acqu2s")
    return folder


@pytest.fixture
def carbon(tmp_path: Path) -> Path:
    """The sample data with another nucleus in the header."""
    folder = tmp_path / "carbon"
    shutil.copytree(next(BATCH.glob("*")), folder)
    for acqus in folder.glob("acqu*"):
        text = acqus.read_text("latin-1")
        acqus.write_text(text.replace("<1H>", "<13C>"), "latin-1")
    return folder


def run(capsys: pytest.CaptureFixture[str], *words: object) -> tuple[int, str, str]:
    code = main([str(word) for word in words])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


def refused(capsys: pytest.CaptureFixture[str], out: Path, *words: object) -> str:
    """Error text of a call that must end with 1, one line, and nothing written."""
    there = sorted(out.parent.iterdir())
    code, said, error = run(capsys, *words)
    assert code == 1, error
    assert said == ""
    assert error.count("\n") == 1
    assert error.endswith("\n")
    assert error.startswith("spinledger: ")
    assert "Traceback" not in error
    assert sorted(out.parent.iterdir()) == there
    return error


@pytest.mark.parametrize("command", ["reconcile", "rank", "process"])
def test_missing_data_is_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], command: str
) -> None:
    out = tmp_path / "out"
    smiles = tmp_path / "c.smi"
    smiles.write_text("CCO ethanol\n")
    extra = {
        "reconcile": ["--structure", ESTER],
        "rank": ["--candidates", smiles],
        "process": [],
    }[command]
    error = refused(capsys, out, command, tmp_path / "absent", *extra, "--out", out)
    assert "absent" in error


def test_empty_folder_is_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "empty").mkdir()
    out = tmp_path / "out"
    error = refused(
        capsys,
        out,
        "reconcile",
        tmp_path / "empty",
        "--structure",
        ESTER,
        "--out",
        out,
    )
    assert "empty" in error


def test_two_dimensional_data_is_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], two_d: Path
) -> None:
    out = tmp_path / "out"
    error = refused(capsys, out, "reconcile", two_d, "--structure", ESTER, "--out", out)
    assert "2D" in error or "dimension" in error


def test_another_nucleus_is_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], carbon: Path
) -> None:
    out = tmp_path / "out"
    error = refused(
        capsys, out, "reconcile", carbon, "--structure", ESTER, "--out", out
    )
    assert "13C" in error


@pytest.mark.parametrize(
    ("structure", "said"),
    [
        ("C1CC", "C1CC"),  # an open ring
        ("CC(C)(C)(C)C", "CC(C)(C)(C)C"),  # five bonds on carbon
        ("ClC(Cl)(Cl)Cl", "ClC(Cl)(Cl)Cl"),  # no hydrogen at all
        ("absent.mol", "absent.mol"),
        ("", "structure"),
    ],
)
def test_a_bad_structure_is_one_line_that_names_it(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], structure: str, said: str
) -> None:
    out = tmp_path / "out"
    error = refused(
        capsys, out, "reconcile", BATCH, "--structure", structure, "--out", out
    )
    assert said in error


def test_an_output_folder_that_is_a_file_is_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    out = tmp_path / "out"
    out.write_text("mine")
    error = refused(capsys, out, "reconcile", BATCH, "--structure", ESTER, "--out", out)
    assert "this is a file" in error
    assert out.read_text() == "mine"


def test_random_bytes_are_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "data.bin"
    path.write_bytes(np.random.default_rng(1).bytes(4096))
    out = tmp_path / "out"
    refused(capsys, out, "reconcile", path, "--structure", ESTER, "--out", out)


@pytest.mark.parametrize(
    "words",
    [
        [],
        ["nonsense"],
        ["reconcile"],
        ["reconcile", "x", "--structure", "C"],
        ["predict", "CCO", "--field", "minus"],
        ["predict", "CCO", "--field", "0"],
        ["batch", "t.csv", "--out", "o", "--workers", "0"],
        ["rank", "x", "--candidates", "c.smi", "--out", "o", "--contenders", "-1"],
    ],
)
def test_wrong_usage_is_exit_2(
    capsys: pytest.CaptureFixture[str], words: list[str]
) -> None:
    assert main(words) == 2
    assert capsys.readouterr().err


def test_an_unknown_solvent_is_exit_2_and_lists_the_known_ones(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    for words in (
        ["process", BATCH, "--solvent", "lemonade"],
        ["predict", ESTER, "--solvent", "lemonade"],
        [
            *["reconcile", BATCH, "--structure", ESTER],
            *["--solvent", "lemonade", "--out", tmp_path / "o"],
        ],
    ):
        code, _, error = run(capsys, *words)
        assert code == 2
        assert error.count("\n") == 1
        assert "lemonade" in error
        assert "CDCl3" in error
    assert list(tmp_path.iterdir()) == []


def test_unknown_formats_are_exit_2(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    code, _, error = run(
        capsys,
        *["reconcile", BATCH, "--structure", ESTER],
        *["--out", tmp_path / "o", "--formats", "json,poem"],
    )
    assert code == 2
    assert "'poem' is not known" in error


def test_help_and_version_are_exit_0(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["--help"]) == 0
    words = capsys.readouterr().out
    for command in (
        *("reconcile", "rank", "process", "inspect", "predict"),
        *("batch", "open", "compare", "sample"),
    ):
        assert command in words
        assert main([command, "--help"]) == 0
    assert main(["--version"]) == 0


def test_help_needs_no_heavy_library() -> None:
    program = (
        "import sys; from spinledger.cli import main; main(['--help']);"
        "heavy = {'numpy', 'scipy', 'rdkit', 'nmrglue', 'lightgbm'} & set(sys.modules);"
        "sys.exit(', '.join(sorted(heavy)) or 0)"
    )
    start = time.perf_counter()
    done = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, check=False
    )
    seconds = time.perf_counter() - start
    assert done.returncode == 0, done.stderr
    # 0.4 s is the aim on a quiet machine; ten times that only fails if a heavy
    # import crept in while the check above was blind.
    assert seconds < 4


def test_an_old_console_does_not_stop_the_program() -> None:
    done = subprocess.run(
        [sys.executable, "-m", "spinledger", "--help"],
        capture_output=True,
        check=False,
        env={**os.environ, "PYTHONIOENCODING": "ascii:strict"},
    )
    assert done.returncode == 0


def test_inspect_prints_the_facts(capsys: pytest.CaptureFixture[str]) -> None:
    code, said, _ = run(capsys, "inspect", BATCH)
    assert code == 0
    assert "nucleus: 1H" in said
    assert "solvent: CDCl3" in said
    code, said, _ = run(capsys, "inspect", BATCH, "--json")
    assert code == 0
    assert json.loads(said)["metadata"]["nucleus"] == "1H"


def test_inspect_says_why_something_is_not_taken(
    capsys: pytest.CaptureFixture[str], two_d: Path
) -> None:
    code, said, _ = run(capsys, "inspect", two_d)
    assert code == 0
    assert "not taken:" in said


def test_process_writes_csv_jcamp_and_a_recipe_that_gives_the_same(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    first, again = tmp_path / "a.csv", tmp_path / "b.csv"
    recipe = tmp_path / "recipe.json"
    jcamp, by_ending = tmp_path / "a.jdx", tmp_path / "b.dx"
    code, said, _ = run(
        capsys,
        *["process", BATCH, "--out", first, "--jcamp", jcamp],
        *["--save-recipe", recipe],
    )
    assert code == 0
    assert "Phase:" in said
    assert re.search(r"quality: phase good to \d+\.\d degrees, baseline \d", said)
    code, _, _ = run(capsys, "process", BATCH, "--recipe", recipe, "--out", again)
    assert code == 0
    assert first.read_bytes() == again.read_bytes()
    with first.open(encoding="utf-8", newline="") as file:
        rows = csv.reader(file)
        assert next(rows) == ["ppm", "intensity"]
        high, low = float(next(rows)[0]), float(next(rows)[0])
    assert high > low
    assert run(capsys, "process", BATCH, "--out", by_ending)[0] == 0
    assert jcamp.read_text("ascii").startswith("##TITLE")
    assert by_ending.read_text("ascii").startswith("##TITLE")


def test_a_recipe_file_that_is_none_is_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "recipe.json"
    for content in ("nonsense", '{"a": 1}', '[{"step": "Boil"}]', "[3]"):
        path.write_text(content)
        out = tmp_path / "out.csv"
        error = refused(capsys, out, "process", BATCH, "--recipe", path, "--out", out)
        assert "not a stored recipe" in error


def test_open_without_the_bench_is_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("spinledger.cli.bench.find_spec", lambda _name: None)
    error = refused(capsys, tmp_path / "x", "open", BATCH)
    assert "pip install spinledger[bench]" in error


def test_open_starts_the_bench_as_a_process(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    called: list[list[str]] = []

    def call(command: list[str]) -> int:
        called.append(command)
        return 0

    monkeypatch.setattr("spinledger.cli.bench.find_spec", lambda _name: object())
    monkeypatch.setattr("spinledger.cli.bench.subprocess.call", call)
    assert run(capsys, "open", BATCH, "--structure", ESTER)[0] == 0
    assert called == [
        [sys.executable, "-m", "spinledger_app", str(BATCH), "--structure", ESTER]
    ]


def test_compare_prints_differences_and_one_offset(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    ledger, text = tmp_path / "ledger.json", tmp_path / "published.txt"
    ledger.write_text(ledger_text(invented_ledger()), "utf-8")
    text.write_text(
        "1H NMR (400 MHz, CDCl3) δ 4.22 (m, 1H), 4.19 (q, J = 7.2 Hz, 2H), "
        "1.29 (t, J = 7.1 Hz, 3H), 1.24 (d, J = 6.3 Hz, 3H)",
        "utf-8",
    )
    code, said, _ = run(capsys, "compare", ledger, text)
    assert code == 0
    assert "common offset -0.02" in said
    assert "7.1/7.2" in said
    assert "only here:" in said
    code, said, _ = run(capsys, "compare", tmp_path, text, "--json")
    assert code == 0
    assert len(json.loads(said)["pairs"]) == 4


def test_compare_refuses_other_files_in_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    ledger, text = tmp_path / "ledger.json", tmp_path / "published.txt"
    text.write_text("1H NMR 4.2 (m, 1H)")
    refused(capsys, tmp_path / "x", "compare", ledger, text)
    ledger.write_text('{"schema": 1, "entries": [{}]}')
    error = refused(capsys, tmp_path / "x", "compare", ledger, text)
    assert "not as schema 1 has it" in error


def test_report_needs_a_finished_project(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "p.sledger"
    save_project(Project(), path)
    out = tmp_path / "out"
    error = refused(capsys, out, "report", path, "--out", out)
    assert "no spectrum or no structure" in error
    path.write_text("other")
    assert "not a project file" in refused(capsys, out, "report", path, "--out", out)


def test_an_internal_fault_is_one_line_and_a_traceback_on_request(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    def broken(_path: Path) -> None:
        raise ZeroDivisionError("a bug\nof ours")

    monkeypatch.setattr("spinledger.cli.inspect.list_experiments", broken)
    error = refused(capsys, tmp_path / "x", "inspect", BATCH)
    assert "internal fault, ZeroDivisionError: a bug of ours" in error
    with pytest.raises(ZeroDivisionError, match="a bug"):
        main(["inspect", str(BATCH), "--traceback"])


def test_candidates_keep_names_order_and_what_does_not_parse(tmp_path: Path) -> None:
    path = tmp_path / "c.smi"
    path.write_bytes(
        b"\xef\xbb\xbf# a remark\r\nCCO  ethyl alcohol, 96 %\r\n\r\nC1CC broken\r\nCC\r\n"
    )
    found = read_candidates(path)
    assert [(one.smiles, one.name) for one in found] == [
        ("CCO", "ethyl alcohol, 96 %"),
        ("C1CC", "broken"),
        ("CC", "CC"),
    ]
    assert found[1].structure is None
    assert found[1].reason
    assert found[0].structure is not None


def test_candidates_may_come_as_sd_records(tmp_path: Path) -> None:
    block = (SAMPLES / "structures" / "hydroxy-ester.mol").read_text()
    _, _, rest = block.partition("\n")
    path = tmp_path / "c.sdf"
    path.write_text(f"first\n{rest}\n$$$$\nsecond one\n{rest}\n$$$$\n")
    found = read_candidates(path)
    assert [one.name for one in found] == ["first", "second one"]
    assert all(one.structure is not None for one in found)


def test_candidate_files_without_content_are_refused(tmp_path: Path) -> None:
    path = tmp_path / "c.smi"
    path.write_text("# nothing\n")
    with pytest.raises(StructureError, match="holds no candidates"):
        read_candidates(path)
    with pytest.raises(StructureError, match="could not be read"):
        read_candidates(tmp_path / "absent.smi")


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "latin-1"])
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("mark", [",", ";", "\t"])
def test_tables_are_read_in_any_dress(
    tmp_path: Path, encoding: str, end: str, mark: str
) -> None:
    path = tmp_path / "t.csv"
    lines = ["ID,Data,Structure,Solvent", "Säure 1,a/b,CCO,CDCl3", ",c,CC,"]
    text = end.join(line.replace(",", mark) for line in lines) + end
    path.write_bytes(text.encode(encoding))
    rows = read_table(path)
    assert [(row.name, row.data, row.structure, row.solvent) for row in rows] == [
        ("Säure_1", "a/b", "CCO", "CDCl3"),
        ("row-0002", "c", "CC", ""),
    ]
    assert [row.fault for row in rows] == ["", ""]


def test_faulty_rows_keep_their_own_fault(tmp_path: Path) -> None:
    path = tmp_path / "t.csv"
    path.write_text("id,data,structure\na,x,CC\nA,y,CC\nb,,CC\nc,z\n")
    faults = [row.fault for row in read_table(path)]
    assert faults[0] == ""
    assert "ids must differ" in faults[1]
    assert "column data is empty" in faults[2]
    assert "column structure is empty" in faults[3]


def test_tables_that_are_none_are_refused(tmp_path: Path) -> None:
    path = tmp_path / "t.csv"
    with pytest.raises(BatchTableError, match="no such file"):
        read_table(path)
    path.write_text("\n\n")
    with pytest.raises(BatchTableError, match="the table is empty"):
        read_table(path)
    path.write_text("a,b\n1,2\n")
    with pytest.raises(BatchTableError, match="column data is missing"):
        read_table(path)


class Terminal:
    """A stream that remembers what was written."""

    def __init__(self, *, is_terminal: bool) -> None:
        self.is_terminal = is_terminal
        self.text = ""

    def write(self, text: str) -> int:
        self.text += text
        return len(text)

    def flush(self) -> None:
        return

    def isatty(self) -> bool:
        return self.is_terminal


@pytest.mark.parametrize("is_terminal", [True, False])
def test_progress_is_silent_for_a_second(
    monkeypatch: pytest.MonkeyPatch, is_terminal: bool
) -> None:
    now = [0.0]
    monkeypatch.setattr("spinledger.cli.progress.time.monotonic", lambda: now[0])
    stream = Terminal(is_terminal=is_terminal)
    with ProgressLine(stream) as progress:  # type: ignore[arg-type]
        progress("reading", 0.1)
        assert stream.text == ""
        now[0] = 1.5
        progress("matching", 0.5)
        assert "50 %  matching" in stream.text
        before = stream.text
        progress("matching", 0.51)
        assert stream.text == before
        now[0] = 3.0
        progress("refining", 0.9)
        assert "90 %  refining" in stream.text
    assert ("\r" in stream.text) is is_terminal
