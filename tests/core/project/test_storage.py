"""Project files: there and back, atomic, and plain about damage."""

import json
import os
import subprocess
import sys
import zipfile
from dataclasses import fields, is_dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from invented_ledger import invented_fid, invented_ledger, overlapped_ledger
from spinledger.errors import OutputError
from spinledger.project.audit import audit_lines, differences_when_remade, versions
from spinledger.project.codec import Encoder, decode
from spinledger.project.document import (
    Project,
    Sample,
    SignOff,
    open_spectrum,
    open_structure,
    with_ledger,
)
from spinledger.project.edits import (
    MarkImpurity,
    PinClaim,
    RenameLabel,
    SetReference,
    SwapClaims,
    apply_edit,
)
from spinledger.project.storage import (
    MIME_TYPE,
    ProjectFileError,
    load_project,
    save_project,
)

WHEN = "2026-12-01T10:00:00+01:00"


def full_project() -> Project:
    ledger = overlapped_ledger()
    project = Project(
        name="batch 117",
        sample=Sample(
            name="tube", sign_offs=(SignOff(role="Made by", name="N. N.", when=WHEN),)
        ),
    )
    project = open_spectrum(project, invented_fid(), source_path="/data/x", when=WHEN)
    project = open_structure(project, ledger.structure, when=WHEN)
    project = with_ledger(project, ledger, when=WHEN)
    pin = PinClaim(claim="2-HB", shift_ppm=2.42, low_ppm=2.38, high_ppm=2.45)
    other = replace(pin, claim="2-HA")
    for edit in (
        pin,
        SwapClaims(first=pin, second=other),
        MarkImpurity(low_ppm=2.11, high_ppm=2.13, name="acetone"),
        SetReference(line_ppm=7.264, to_ppm=7.26),
        RenameLabel(claim="4-H", label="Me"),
    ):
        project = apply_edit(project, edit, when=WHEN)
    return project


def assert_same(one: Any, other: Any, place: str = "project") -> None:
    """Equal field by field, arrays bit for bit."""
    assert type(one) is type(other), place
    if isinstance(one, np.ndarray):
        assert one.dtype == other.dtype, place
        assert np.array_equal(one, other), place
    elif is_dataclass(one):
        for field in fields(one):
            name = field.name
            assert_same(getattr(one, name), getattr(other, name), f"{place}.{name}")
    elif isinstance(one, tuple):
        assert len(one) == len(other), place
        for rank, (first, second) in enumerate(zip(one, other, strict=True)):
            assert_same(first, second, f"{place}[{rank}]")
    else:
        assert one == other, place


def test_a_project_comes_back_bit_for_bit(tmp_path: Path) -> None:
    project = full_project()
    path = tmp_path / "p.sledger"
    save_project(project, path)
    back = load_project(path)
    assert_same(project, back)
    assert back.ledger is not None
    assert back.evidence is back.ledger.evidence  # written once, shared again
    assert back.needs_evidence == project.needs_evidence


def test_an_empty_project_comes_back(tmp_path: Path) -> None:
    save_project(Project(), tmp_path / "p.sledger")
    assert_same(Project(), load_project(tmp_path / "p.sledger"))


def test_saving_twice_gives_the_same_bytes(tmp_path: Path) -> None:
    project = full_project()
    save_project(project, tmp_path / "a.sledger")
    save_project(load_project(tmp_path / "a.sledger"), tmp_path / "b.sledger")
    assert (tmp_path / "a.sledger").read_bytes() == (
        tmp_path / "b.sledger"
    ).read_bytes()


def test_the_type_is_told_by_the_first_entry(tmp_path: Path) -> None:
    path = tmp_path / "p.sledger"
    save_project(full_project(), path)
    with zipfile.ZipFile(path) as archive:
        first = archive.infolist()[0]
        assert first.filename == "mimetype"
        assert first.compress_type == zipfile.ZIP_STORED
        assert archive.read("mimetype").decode() == MIME_TYPE
        manifest = json.loads(archive.read("manifest.json"))
        arrays = [name for name in archive.namelist() if name.startswith("arrays/")]
    assert manifest["schema"] == 1
    assert set(arrays) < set(manifest["sha256"])


def rewritten(path: Path, changes: dict[str, bytes | None]) -> None:
    """The same archive with some entries changed or left out."""
    with zipfile.ZipFile(path) as archive:
        entries = {one: archive.read(one) for one in archive.namelist()}
    entries.update({key: value for key, value in changes.items() if value is not None})
    with zipfile.ZipFile(path, "w") as archive:
        for name, data in entries.items():
            if changes.get(name, b"") is not None:
                archive.writestr(name, data)


@pytest.mark.parametrize(
    ("changes", "said"),
    [
        ({"arrays/0001.npy": b"other"}, r"arrays/0001\.npy is damaged or missing"),
        ({"arrays/0001.npy": None}, r"arrays/0001\.npy is damaged or missing"),
        ({"project.json": b"{}"}, r"project\.json is damaged or missing"),
        ({"manifest.json": b"nonsense"}, r"manifest\.json is damaged or missing"),
        ({"manifest.json": b'{"schema": 1}'}, "list of contents is damaged"),
        ({"manifest.json": b'{"schema": "x"}'}, "schema number is missing or wrong"),
        ({"manifest.json": b'{"schema": 2}'}, "newer version"),
        ({"mimetype": b"text/plain"}, "no project file"),
        ({"mimetype": None}, "no project file"),
    ],
)
def test_damage_is_said_in_one_sentence(
    tmp_path: Path, changes: dict[str, bytes | None], said: str
) -> None:
    path = tmp_path / "p.sledger"
    save_project(full_project(), path)
    rewritten(path, changes)
    with pytest.raises(ProjectFileError, match=said) as caught:
        load_project(path)
    assert str(path) in str(caught.value)
    assert "\n" not in str(caught.value)


def test_cut_and_flipped_files_never_crash(tmp_path: Path) -> None:
    path = tmp_path / "p.sledger"
    save_project(full_project(), path)
    whole = path.read_bytes()
    rng = np.random.default_rng(11)
    for _ in range(300):
        if rng.random() < 0.5:
            hurt = whole[: int(rng.integers(0, len(whole)))]
        else:
            place = int(rng.integers(0, len(whole)))
            flipped = bytes([whole[place] ^ int(rng.integers(1, 256))])
            hurt = whole[:place] + flipped + whole[place + 1 :]
        path.write_bytes(hurt)
        try:
            back = load_project(path)
        except ProjectFileError:
            continue
        # A flip in the zip's own dates or flags may do no harm at all.
        assert_same(full_project(), back)


def test_missing_files_folders_and_other_files_are_refused(tmp_path: Path) -> None:
    with pytest.raises(ProjectFileError, match="no such file"):
        load_project(tmp_path / "absent.sledger")
    with pytest.raises(ProjectFileError, match="could not be read"):
        load_project(tmp_path)
    (tmp_path / "text.sledger").write_text("hello")
    with pytest.raises(ProjectFileError, match="not a project file"):
        load_project(tmp_path / "text.sledger")


def test_unknown_classes_in_a_file_are_not_made(tmp_path: Path) -> None:
    for tree in ({"$": "Popen"}, {"$": "Path", "args": []}, {"no": "kind"}):
        with pytest.raises(ValueError, match="unknown value"):
            decode(tree, {})
    with pytest.raises(ValueError, match="array '0009' is missing"):
        decode({"$": "array", "name": "0009"}, {})
    with pytest.raises(TypeError, match=r"cannot be saved, got \w*Path"):
        Encoder().encode(Path("x"))


def test_fields_of_other_versions_are_passed_over_or_take_their_default() -> None:
    tree = Encoder().encode(Sample(name="tube"))
    tree["colour"] = "green"
    del tree["remark"]
    assert decode(tree, {}) == Sample(name="tube")


def test_a_target_that_cannot_be_written_is_one_sentence(tmp_path: Path) -> None:
    with pytest.raises(OutputError, match="could not be saved"):
        save_project(Project(), tmp_path / "absent" / "p.sledger")
    assert list(tmp_path.iterdir()) == []


def test_a_failed_save_leaves_the_old_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "p.sledger"
    save_project(Project(name="old"), path)

    def full(_handle: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(OutputError, match="No space left on device"):
        save_project(Project(name="new"), path)
    assert [one.name for one in tmp_path.iterdir()] == ["p.sledger"]
    assert load_project(path).name == "old"


KILLED = """
import sys
from pathlib import Path
sys.path[:0] = {search!r}
from invented_ledger import invented_ledger
from spinledger.project.document import Project, with_ledger
from spinledger.project.storage import save_project
target = Path({target!r})
projects = [
    with_ledger(Project(name=name), invented_ledger(), when="now")
    for name in ("one", "two")
]
save_project(projects[0], target)
print("ready", flush=True)
while True:
    for project in projects:
        save_project(project, target)
"""


def test_killed_while_saving_the_file_is_whole(tmp_path: Path) -> None:
    path = tmp_path / "p.sledger"
    search = [str(Path(__file__).resolve().parents[2])]
    program = KILLED.format(search=search, target=str(path))
    rng = np.random.default_rng(2)
    for _ in range(3):
        with subprocess.Popen(
            [sys.executable, "-c", program], stdout=subprocess.PIPE
        ) as child:
            assert child.stdout is not None
            assert child.stdout.readline() == b"ready\n"
            try:
                child.wait(timeout=0.05 + 0.2 * float(rng.random()))
            except subprocess.TimeoutExpired:
                child.kill()
        assert load_project(path).name in ("one", "two")


def test_audit_and_versions_are_plain() -> None:
    project = full_project()
    lines = audit_lines(project)
    assert lines[0].startswith(f"{WHEN}  Read batch-117")
    assert any("by hand: 4-H renamed Me." in line for line in lines)
    assert {"spinledger", "python", "numpy", "rdkit"} <= set(versions())


def test_a_report_says_when_it_would_differ() -> None:
    project = with_ledger(
        open_spectrum(Project(), invented_fid(), source_path="x", when=WHEN),
        invented_ledger(),
        when=WHEN,
    )
    assert differences_when_remade(project, versions()) == ()
    older = {**versions(), "numpy": "1.0"}
    (reason,) = differences_when_remade(project, older)
    assert reason.startswith("numpy was 1.0 then and is")
    stale = full_project()
    assert len(differences_when_remade(stale, versions())) == 2
