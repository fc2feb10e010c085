"""Finding the one proton experiment in a place: folders, copies, zips, odd paths."""

import hashlib
import os
import shutil
import stat
import zipfile
from pathlib import Path

import numpy as np
import pytest

from instrument_files import (
    jcamp_fid_text,
    jcamp_spectrum_text,
    known_fid,
    write_bruker,
    write_jeol,
    write_nmrml,
    write_pdata,
    write_varian,
)
from spinledger.errors import SpectrumFormatError
from spinledger.io import discover
from spinledger.io.read import list_experiments, read_acquired
from spinledger.values.acquisition import Fid, MakerSpectrum


def two_dimensional(folder: Path) -> Path:
    write_bruker(folder)
    (folder / "fid").rename(folder / "ser")
    return folder


def names(place: Path) -> list[str]:
    return [experiment.name for experiment in list_experiments(place)]


def test_only_1d_proton_experiment_of_a_folder_is_taken(tmp_path: Path) -> None:
    write_bruker(tmp_path / "11", NUC1="<13C>")
    two_dimensional(tmp_path / "2")
    write_bruker(tmp_path / "10")
    fid = read_acquired(tmp_path)
    assert isinstance(fid, Fid)
    assert fid.metadata.source_name == "10"
    assert any("10 was taken" in note for note in fid.metadata.notes)
    assert names(tmp_path) == ["2", "10", "11"]  # in the order of numbers


def test_two_proton_experiments_are_listed_not_guessed(tmp_path: Path) -> None:
    write_bruker(tmp_path / "a" / "10")
    write_bruker(tmp_path / "b" / "10", known_fid(lines_hz=(100.0,)))
    with pytest.raises(SpectrumFormatError) as caught:
        read_acquired(tmp_path)
    assert caught.value.path == tmp_path
    assert "holds 2 proton experiments: a/10 (1H, 400 MHz" in caught.value.reason
    assert "b/10" in caught.value.reason
    assert caught.value.reason.endswith("give one of them")


def test_folder_without_proton_data_says_what_there_is(tmp_path: Path) -> None:
    write_bruker(tmp_path / "11", NUC1="<13C>")
    two_dimensional(tmp_path / "12")
    with pytest.raises(ValueError, match=r"none is a 1D proton .*11 \(13C.*12 \(1H"):
        read_acquired(tmp_path)


def test_same_fid_in_two_formats_is_one_experiment(tmp_path: Path) -> None:
    write_bruker(tmp_path / "10")
    write_nmrml(tmp_path / "10.nmrML")
    (tmp_path / "10.dx").write_text(jcamp_fid_text())
    acquired = read_acquired(tmp_path)
    assert acquired.metadata.format_name == "Bruker folder"  # the maker's own form


def test_other_fid_beside_is_another_experiment(tmp_path: Path) -> None:
    write_bruker(tmp_path / "10")
    write_nmrml(tmp_path / "10.nmrML", known_fid(lines_hz=(50.0, 900.0)))
    with pytest.raises(ValueError, match="holds 2 proton experiments"):
        read_acquired(tmp_path)


def lay_spectrum(path: Path, fid: np.ndarray) -> None:
    values = np.abs(np.fft.fftshift(np.fft.fft(fid)))[::-1]
    table = "\n".join(f"{index} {value:.0f}" for index, value in enumerate(values))
    path.write_text(
        jcamp_spectrum_text(
            table,
            XUNITS="PPM",
            FIRSTX=11.25,
            LASTX=-1.25,
            NPOINTS=values.size,
            **{".OBSERVE FREQUENCY": 400.13},
        )
    )


@pytest.mark.parametrize("mirrored", [False, True])
def test_fid_and_its_spectrum_side_by_side_are_one(
    tmp_path: Path, *, mirrored: bool
) -> None:
    fid = known_fid()
    (tmp_path / "x.fid.dx").write_text(
        jcamp_fid_text(np.conj(fid) if mirrored else fid)
    )
    lay_spectrum(tmp_path / "x.dx", fid)
    acquired = read_acquired(tmp_path)
    assert isinstance(acquired, Fid)
    np.testing.assert_array_equal(acquired.samples, fid)
    assert isinstance(read_acquired(tmp_path, prefer_processed=True), MakerSpectrum)


def test_spectrum_of_another_sample_is_not_paired(tmp_path: Path) -> None:
    (tmp_path / "x.fid.dx").write_text(jcamp_fid_text())
    lay_spectrum(tmp_path / "y.dx", known_fid(lines_hz=(-2000.0, 1900.0, 700.0)))
    with pytest.raises(ValueError, match="holds 2 proton experiments"):
        read_acquired(tmp_path)


def test_empty_missing_and_foreign_places(tmp_path: Path) -> None:
    with pytest.raises(SpectrumFormatError, match="does not exist; check the path"):
        read_acquired(tmp_path / "nowhere")
    with pytest.raises(ValueError, match="does not exist"):
        read_acquired(Path("x\0y"))
    with pytest.raises(ValueError, match="holds no NMR data that can be read"):
        read_acquired(tmp_path)
    picture = tmp_path / "picture.dx"
    picture.write_bytes(b"\x89PNG\r\n\x1a\n" + bytes(range(256)) * 8)
    with pytest.raises(ValueError, match="is not an NMR data file"):
        read_acquired(picture)
    (tmp_path / "empty").write_bytes(b"")
    with pytest.raises(ValueError, match="is not an NMR data file"):
        read_acquired(tmp_path / "empty")
    with pytest.raises(ValueError, match="does not exist"):
        list_experiments(tmp_path / "nowhere")


def test_damaged_data_set_is_told_when_it_is_all_there_is(tmp_path: Path) -> None:
    write_varian(tmp_path / "x.fid")
    (tmp_path / "x.fid" / "procpar").write_text("nonsense\n")
    with pytest.raises(ValueError, match="holds no parameters"):
        read_acquired(tmp_path)


def test_every_message_is_one_sentence_with_the_path_first(tmp_path: Path) -> None:
    with pytest.raises(SpectrumFormatError) as caught:
        read_acquired(tmp_path / "nowhere")
    assert str(caught.value) == f"{tmp_path / 'nowhere'}: {caught.value.reason}"
    assert "\n" not in str(caught.value)


def test_long_and_foreign_paths(tmp_path: Path) -> None:
    place = tmp_path.joinpath(*["Ordner mit Ümläuten 試料 ☃" * 3] * 6)
    np.testing.assert_array_equal(
        read_acquired(write_bruker(place / "10")).samples,  # type: ignore[union-attr]
        known_fid(),
    )
    jeol = place / ("å" * 100 + ".jdf")
    write_jeol(jeol)
    assert read_acquired(jeol).metadata.source_name == jeol.name
    assert read_acquired(tmp_path, prefer_processed=True).metadata.source_name == "10"


@pytest.mark.parametrize("kind", ["folder", "file"])
def test_reading_changes_nothing_even_on_read_only_media(
    kind: str, tmp_path: Path
) -> None:
    folder = write_bruker(tmp_path / "disc" / "10")
    write_pdata(folder, np.arange(2048.0))
    place = folder if kind == "folder" else write_jeol(tmp_path / "disc" / "x.jdf")
    before = {
        path: (path.stat().st_mtime_ns, path.is_file() and path.read_bytes())
        for path in (tmp_path / "disc").rglob("*")
    }
    for path in sorted(before, reverse=True):
        path.chmod(stat.S_IRUSR | (stat.S_IXUSR if path.is_dir() else 0))
    try:
        read_acquired(place)
        read_acquired(place, prefer_processed=True)
        list_experiments(place)
    finally:
        for path in sorted(before):
            path.chmod(0o700)
    after = {
        path: (path.stat().st_mtime_ns, path.is_file() and path.read_bytes())
        for path in (tmp_path / "disc").rglob("*")
    }
    assert after == before


def test_links_in_circles_are_not_followed(tmp_path: Path) -> None:
    write_bruker(tmp_path / "a" / "10")
    (tmp_path / "a" / "again").symlink_to(tmp_path, target_is_directory=True)
    assert names(tmp_path) == ["a/10"]


def test_link_to_itself_is_passed_over(tmp_path: Path) -> None:
    write_bruker(tmp_path / "10")
    (tmp_path / "loop").symlink_to(tmp_path / "loop")
    assert names(tmp_path) == ["10"]


@pytest.mark.parametrize("name", ["fid", "ser", "1r"])
def test_data_without_parameters_say_what_is_missing(name: str, tmp_path: Path) -> None:
    (tmp_path / "10").mkdir()
    (tmp_path / "10" / name).write_bytes(bytes(range(256)) * 64)
    with pytest.raises(ValueError, match=rf"holds a {name} file without the parameter"):
        read_acquired(tmp_path)


def test_older_parameter_file_serves_where_the_newer_is_missing(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10")
    (folder / "acqus").rename(folder / "acqu")
    assert isinstance(read_acquired(folder), Fid)


def test_pipes_and_other_special_files_do_not_stall(tmp_path: Path) -> None:
    write_bruker(tmp_path / "10")
    os.mkfifo(tmp_path / "pipe")
    assert names(tmp_path) == ["10"]
    with pytest.raises(ValueError, match="is not a file or folder"):
        read_acquired(tmp_path / "pipe")


def test_folder_with_too_many_files_is_refused(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(discover, "_MAX_PLACES", 20)
    many = tmp_path / "many"
    many.mkdir()
    for index in range(30):
        (many / f"{index}.bin").write_bytes(b"\0")
    with pytest.raises(ValueError, match="holds more than 20 files"):
        read_acquired(many)


# ---- zip


def zipped(folder: Path, target: Path) -> Path:
    with zipfile.ZipFile(target, "w", zipfile.ZIP_DEFLATED) as archive:
        for path in sorted(folder.rglob("*")):
            archive.write(path, path.relative_to(folder.parent))
    return target


def test_zip_of_any_format_reads_like_the_folder(tmp_path: Path) -> None:
    for index, place in enumerate(
        (
            write_bruker(tmp_path / "0" / "10"),
            write_varian(tmp_path / "1" / "x.fid"),
            write_jeol(tmp_path / "2" / "x.jdf")
            if (tmp_path / "2").mkdir() is None
            else None,
        )
    ):
        assert place is not None
        packed = zipped(tmp_path / str(index), tmp_path / f"{index}.bin")
        acquired = read_acquired(packed)
        assert isinstance(acquired, Fid)
        np.testing.assert_array_equal(acquired.samples, known_fid())
        assert acquired.metadata.source_name == packed.name
        digest = hashlib.sha256(packed.read_bytes()).hexdigest()
        assert acquired.metadata.sha256 == digest
        (listed,) = list_experiments(packed)
        assert listed.path.is_relative_to(packed)
    shutil.rmtree(tmp_path / "0")


def test_faults_inside_a_zip_name_the_zip(tmp_path: Path) -> None:
    write_bruker(tmp_path / "x" / "11", NUC1="<13C>")
    packed = zipped(tmp_path / "x", tmp_path / "x.zip")
    with pytest.raises(SpectrumFormatError, match="holds 13C data") as caught:
        read_acquired(packed)
    assert caught.value.path == packed
