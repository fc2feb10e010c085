"""Hostile zip files: entries that climb out, bombs, lies, locks, damage."""

import os
import struct
import zipfile
from pathlib import Path

import pytest

from instrument_files import write_bruker
from spinledger.errors import SpectrumFormatError
from spinledger.io import archive
from spinledger.io.read import read_acquired


def zip_of(path: Path, entries: dict[str, bytes]) -> Path:
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as packed:
        for name, content in entries.items():
            packed.writestr(zipfile.ZipInfo(name), content, zipfile.ZIP_DEFLATED)
    return path


@pytest.mark.parametrize(
    "name",
    ["../escaped", "a/../../escaped", "/escaped", "C:/escaped", "..\\escaped"],
)
def test_entries_outside_the_folder_are_refused(name: str, tmp_path: Path) -> None:
    place = tmp_path / "in"
    place.mkdir()
    packed = zip_of(place / "x.zip", {"good": b"1", name: b"bad"})
    with pytest.raises(SpectrumFormatError, match="outside their folder"):
        read_acquired(packed)
    assert not list(tmp_path.rglob("*escaped*"))


def test_links_are_written_as_plain_files(tmp_path: Path) -> None:
    link = zipfile.ZipInfo("link")
    link.external_attr = 0o120777 << 16
    path = tmp_path / "x.zip"
    with zipfile.ZipFile(path, "w") as packed:
        packed.writestr(link, "/etc/passwd")
    with archive.unpacked(path) as folder:
        assert not (folder / "link").is_symlink()
        assert (folder / "link").read_text() == "/etc/passwd"


def test_bomb_is_stopped_at_the_limit(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(archive, "MAX_UNPACKED_BYTES", 2**22)
    packed = zip_of(tmp_path / "x.zip", {"a": bytes(2**21), "b": bytes(2**22)})
    assert packed.stat().st_size < 2**14
    with pytest.raises(ValueError, match="unpacks to more than 4 MiB"):
        read_acquired(packed)


def test_header_that_lies_about_the_size_does_not_help(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(archive, "MAX_UNPACKED_BYTES", 2**20)
    packed = zip_of(tmp_path / "x.zip", {"a": bytes(2**22)})
    content = packed.read_bytes()
    packed.write_bytes(content.replace(struct.pack("<I", 2**22), struct.pack("<I", 9)))
    with pytest.raises(SpectrumFormatError, match=r"unpacks to more|damaged zip"):
        read_acquired(packed)


def test_too_many_entries_are_refused(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(archive, "MAX_ENTRIES", 10)
    packed = zip_of(tmp_path / "x.zip", {str(index): b"" for index in range(11)})
    with pytest.raises(ValueError, match="holds more than 10 files"):
        read_acquired(packed)


def test_locked_zip_is_refused(tmp_path: Path) -> None:
    packed = zip_of(tmp_path / "x.zip", {"a": b"secret"})
    content = bytearray(packed.read_bytes())
    for signature, offset in ((b"PK\3\4", 6), (b"PK\1\2", 8)):
        content[content.index(signature) + offset] |= 1
    packed.write_bytes(bytes(content))
    with pytest.raises(ValueError, match="locked with a password"):
        read_acquired(packed)


def test_damaged_zip_is_refused(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "d" / "10")
    packed = zip_of(
        tmp_path / "x.zip",
        {path.name: path.read_bytes() for path in folder.iterdir()},
    )
    content = packed.read_bytes()
    for damaged in (content[:200], content[:400] + b"x" * 50 + content[450:]):
        packed.write_bytes(damaged)
        with pytest.raises(ValueError, match="damaged zip file"):
            read_acquired(packed)


def test_empty_zip_holds_nothing(tmp_path: Path) -> None:
    packed = zip_of(tmp_path / "x.zip", {})
    with pytest.raises(ValueError, match="holds no NMR data"):
        read_acquired(packed)


def test_zip_in_a_zip_is_not_followed(tmp_path: Path) -> None:
    inner = zip_of(tmp_path / "in.zip", {"a": b"1"})
    packed = zip_of(tmp_path / "x.zip", {"in.zip": inner.read_bytes()})
    with pytest.raises(ValueError, match=r"holds the zip file in\.zip; give that file"):
        read_acquired(packed)


def test_unpacked_folder_is_gone_afterwards(tmp_path: Path) -> None:
    packed = zip_of(tmp_path / "x.zip", {"sub/a": b"1"})
    with archive.unpacked(packed) as folder:
        assert (folder / "sub" / "a").read_bytes() == b"1"
    assert not folder.exists()


def test_unusual_compression_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "x.zip"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_BZIP2) as packed:
        packed.writestr("a", os.urandom(100))
    with pytest.raises(ValueError, match="packed in an unusual way"):
        read_acquired(path)
