"""Bruker folders: byte orders, delays, padding, cut files, processed data."""

import hashlib
import shutil
from pathlib import Path

import numpy as np
import pytest
from nmrglue.fileio import bruker as nmrglue_bruker

from instrument_files import (
    FREQUENCY_MHZ,
    WIDTH_HZ,
    acqus_text,
    interleaved,
    known_fid,
    write_bruker,
    write_pdata,
)
from spinledger.io.read import list_experiments, read_acquired
from spinledger.values.acquisition import Fid, MakerSpectrum


def fid_of(folder: Path) -> Fid:
    acquired = read_acquired(folder)
    assert isinstance(acquired, Fid)
    return acquired


def processed_of(folder: Path) -> MakerSpectrum:
    acquired = read_acquired(folder, prefer_processed=True)
    assert isinstance(acquired, MakerSpectrum)
    return acquired


@pytest.mark.parametrize(
    ("kind", "labels"),
    [
        ("<i4", {"BYTORDA": 0, "DTYPA": 0}),
        (">i4", {"BYTORDA": 1, "DTYPA": 0}),
        ("<f8", {"BYTORDA": 0, "DTYPA": 2}),
        (">f8", {"BYTORDA": 1, "DTYPA": 2}),
        (">i4", {"BYTORDA": None, "DTYPA": None}),
        ("<i4", {"BYTORDA": None, "DTYPA": None}),
    ],
)
def test_every_number_layout_gives_the_same_samples(
    kind: str, labels: dict[str, object], tmp_path: Path
) -> None:
    fid = fid_of(write_bruker(tmp_path / "10", kind=kind, **labels))
    np.testing.assert_array_equal(fid.samples, known_fid())


def test_unknown_number_type_is_refused(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="unknown number type 7"):
        read_acquired(write_bruker(tmp_path / "10", DTYPA=7))


def test_points_after_td_are_block_padding_and_left_out(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10", known_fid(1000))
    with (folder / "fid").open("ab") as stream:
        stream.write(bytes(24 * 8))
    np.testing.assert_array_equal(fid_of(folder).samples, known_fid(1000))


def test_trailing_zeros_are_cut_with_a_note(tmp_path: Path) -> None:
    padded = np.concatenate([known_fid(900), np.zeros(124)])
    fid = fid_of(write_bruker(tmp_path / "10", padded))
    assert fid.samples.size == 900
    assert any("124 points of the FID are zeros" in note for note in fid.metadata.notes)


@pytest.mark.parametrize(
    ("labels", "delay_points"),
    [
        ({"GRPDLY": 67.984, "DECIM": 2080, "DSPFVS": 20}, 67.984),
        ({"GRPDLY": None, "DECIM": 32, "DSPFVS": 12}, 72.125),
        ({"GRPDLY": -1, "DECIM": 16, "DSPFVS": 12}, 71.625),
        ({"GRPDLY": 0, "DECIM": 6, "DSPFVS": 10}, 59.083333333333333),
        ({"GRPDLY": 76, "DECIM": 3332, "DSPFVS": 21, "DIGMOD": 3}, 76.0),
        ({"GRPDLY": None, "DECIM": 32, "DSPFVS": 12, "DIGMOD": 0}, 0.0),
        ({"GRPDLY": -1, "DECIM": 1, "DSPFVS": 12}, 0.0),
    ],
)
def test_filter_delay_from_header_or_table(
    labels: dict[str, object], delay_points: float, tmp_path: Path
) -> None:
    # 72.125, 71.625 and 59.0833: the maker's published table of delays.
    fid = fid_of(write_bruker(tmp_path / "10", **labels))
    assert fid.group_delay_points == pytest.approx(delay_points, rel=1e-12)
    assert fid.metadata.notes == ()


def test_unknown_and_absurd_delays_are_noted(tmp_path: Path) -> None:
    for name, labels in (
        ("a", {"GRPDLY": -1, "DECIM": 33, "DSPFVS": 12}),
        ("b", {"GRPDLY": 1e7}),
    ):
        fid = fid_of(write_bruker(tmp_path / name, **labels))
        assert fid.group_delay_points == 0.0
        assert any("delay" in note for note in fid.metadata.notes)


def test_cut_fid_is_used_from_half_on_and_refused_below(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10", known_fid(1000))
    content = (folder / "fid").read_bytes()
    (folder / "fid").write_bytes(content[: 8 * 600 + 5])
    fid = fid_of(folder)
    np.testing.assert_array_equal(fid.samples, known_fid(1000)[:600])
    assert any("cut short: 600 of 1000" in note for note in fid.metadata.notes)
    (folder / "fid").write_bytes(content[: 8 * 499])
    with pytest.raises(ValueError, match="holds only 499 of the 1000 points"):
        read_acquired(folder)


@pytest.mark.parametrize("label", ["SW_h", "BF1"])
def test_missing_parameters_are_named(label: str, tmp_path: Path) -> None:
    left_out = {label: None} | ({"SFO1": None} if label == "BF1" else {})
    with pytest.raises(ValueError, match=r"does not state (its|the) spectr"):
        read_acquired(write_bruker(tmp_path / "10", **left_out))


def test_width_from_ppm_where_hz_is_missing(tmp_path: Path) -> None:
    fid = fid_of(write_bruker(tmp_path / "10", SW_h=None, SW=12.0, SFO1=400.0))
    assert fid.spectral_width_hz == pytest.approx(4800.0, rel=1e-12)


def test_unknown_facts_stay_none(tmp_path: Path) -> None:
    fid = fid_of(
        write_bruker(
            tmp_path / "10",
            **dict.fromkeys(("O1", "SOLVENT", "TE", "NS", "PULPROG", "DATE", "P", "D")),
        )
    )
    facts = fid.metadata
    assert fid.carrier_ppm is None
    assert (facts.solvent, facts.temperature_k, facts.n_scans) == (None, None, None)
    assert (facts.pulse_program, facts.acquired_on, facts.title) == (None, None, None)
    assert (facts.pulse_length_us, facts.relaxation_delay_s) == (None, None)


def test_missing_nucleus_is_taken_as_1h_with_a_note(tmp_path: Path) -> None:
    facts = fid_of(write_bruker(tmp_path / "10", NUC1=None)).metadata
    assert facts.nucleus == "1H"
    assert any("does not name the nucleus" in note for note in facts.notes)


def test_header_that_ends_within_a_text_or_an_array_does_not_hang(
    tmp_path: Path,
) -> None:
    folder = write_bruker(tmp_path / "10")
    text = acqus_text()
    for ending in ("<CDC", "##$P= (0..3)\n0 1"):
        stop = text.index(ending) + len(ending)
        (folder / "acqus").write_text(text[:stop])
        with pytest.raises(ValueError, match="does not state its spectral width"):
            read_acquired(folder)


def test_sequential_sampling_falls_back_to_the_makers_spectrum(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10", AQ_mod=2)
    with pytest.raises(ValueError, match="without simultaneous quadrature"):
        read_acquired(folder)
    write_pdata(folder, np.arange(2048.0))
    acquired = read_acquired(folder)
    assert isinstance(acquired, MakerSpectrum)
    assert any("quadrature" in note for note in acquired.metadata.notes)


def test_two_dimensional_folder_is_refused(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10")
    (folder / "fid").rename(folder / "ser")
    (folder / "acqu2s").write_text(acqus_text())
    with pytest.raises(ValueError, match="2D or arrayed experiment"):
        read_acquired(folder)
    (listed,) = list_experiments(folder)
    assert listed.n_dimensions == 2


def test_parameters_without_data_are_refused(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10")
    (folder / "fid").unlink()
    (folder / "pdata").mkdir()
    with pytest.raises(ValueError, match="neither a FID nor a processed"):
        read_acquired(folder)


def test_zero_fid_is_refused(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="zeros only"):
        read_acquired(write_bruker(tmp_path / "10", np.zeros(1024, complex)))


@pytest.mark.parametrize("bad", [np.nan, np.inf, 1e200])
def test_samples_that_are_no_numbers_are_refused(bad: float, tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10", kind="<f8", DTYPA=2)
    spoiled = known_fid()
    spoiled[500] = bad
    (folder / "fid").write_bytes(interleaved(spoiled, "<f8"))
    with pytest.raises(ValueError, match="not finite numbers"):
        read_acquired(folder)


@pytest.mark.parametrize(
    ("labels", "reason"),
    [
        ({"TD": 2e12}, "declares 1000000000000 data points"),
        ({"TD": -5}, "data points, outside"),
        ({"SW_h": 1e20}, "which no proton spectrum has"),
        ({"SW_h": -5000}, "which no proton spectrum has"),
        ({"BF1": 0.001}, "which no spectrometer has"),
    ],
)
def test_absurd_header_numbers_are_refused(
    labels: dict[str, object], reason: str, tmp_path: Path
) -> None:
    with pytest.raises(ValueError, match=reason):
        read_acquired(write_bruker(tmp_path / "10", **labels))


def test_huge_file_is_refused_before_it_is_read(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10")
    with (folder / "fid").open("r+b") as stream:
        stream.truncate(2**33)  # a sparse file: it takes no room on the disk
    with pytest.raises(ValueError, match="is larger than the 33 MiB"):
        read_acquired(folder)


# ---- processed data


def lines_spectrum() -> np.ndarray:
    positions = np.arange(2048)
    return np.round(1e6 / (1 + ((positions - 700) / 3.0) ** 2))


@pytest.mark.parametrize("exponent", [-6, 0, 3])
def test_processed_data_come_on_one_scale_like_nmrglues(
    exponent: int, tmp_path: Path
) -> None:
    folder = write_bruker(tmp_path / "10")
    place = write_pdata(folder, lines_spectrum(), exponent=exponent)
    found = processed_of(folder).spectrum
    with pytest.warns(UserWarning, match="not defined, returning 1D"):
        _, expected = nmrglue_bruker.read_pdata(str(place), scale_data=True)
    np.testing.assert_array_equal(found.intensities, expected)
    assert found.first_point_ppm == pytest.approx(11.0, abs=1e-12)
    assert found.step_ppm == pytest.approx(WIDTH_HZ / FREQUENCY_MHZ / 2048, rel=1e-12)


def test_fid_wins_unless_the_spectrum_is_preferred(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10")
    write_pdata(folder, lines_spectrum())
    assert isinstance(read_acquired(folder), Fid)
    assert isinstance(read_acquired(folder, prefer_processed=True), MakerSpectrum)
    # Pointing at the processed folder, or a file in it, means that spectrum.
    for place in (folder / "pdata/1", folder / "pdata/1/1r", folder / "pdata/1/procs"):
        assert isinstance(read_acquired(place), MakerSpectrum)
    for place in (folder / "fid", folder / "acqus"):
        assert isinstance(read_acquired(place), Fid)


def test_preferring_a_spectrum_that_is_not_there_gives_the_fid(tmp_path: Path) -> None:
    assert isinstance(
        read_acquired(write_bruker(tmp_path / "10"), prefer_processed=True), Fid
    )


@pytest.mark.parametrize("sign", [1, -1])
def test_imaginary_part_comes_in_the_sense_of_a_forward_transform(
    sign: int, tmp_path: Path
) -> None:
    # Noise-free causal FID: real and imaginary part in descending order.
    fid = known_fid(2048)
    fid[0] /= 2
    complete = np.fft.fftshift(np.fft.fft(fid, 4096))[::-1]
    folder = write_bruker(tmp_path / "10")
    place = write_pdata(folder, complete.real)
    (place / "1i").write_bytes((sign * complete.imag).astype("<i4").tobytes())
    dispersive = processed_of(folder).spectrum.imaginary
    assert dispersive is not None
    # 1: the parts are rounded to whole numbers, of a height of 1e6.
    np.testing.assert_allclose(dispersive, complete.imag, atol=1.0)


def test_imaginary_part_that_does_not_belong_is_left_out(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10")
    place = write_pdata(folder, lines_spectrum())
    noise = np.random.default_rng(1).normal(0, 1e5, 2048).astype("<i4")
    (place / "1i").write_bytes(noise.tobytes())
    assert processed_of(folder).spectrum.imaginary is None


def test_cut_spectrum_keeps_its_axis_and_is_noted(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10")
    place = write_pdata(folder, lines_spectrum())
    content = (place / "1r").read_bytes()
    (place / "1r").write_bytes(content[: 4 * 1500])
    found = processed_of(folder)
    assert found.spectrum.n_points == 1500
    assert found.spectrum.step_hz == pytest.approx(WIDTH_HZ / 2048, rel=1e-12)
    assert any("cut short" in note for note in found.metadata.notes)
    (place / "1r").write_bytes(content[: 4 * 900])
    with pytest.raises(ValueError, match="holds only 900 of the 2048 points"):
        processed_of(folder)


def test_title_is_the_first_line_of_the_users_text(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10")
    place = write_pdata(folder, lines_spectrum())
    (place / "title").write_text("\nSäure 7\nsecond line\n", encoding="cp1252")
    assert read_acquired(folder).metadata.title == "Säure 7"


def test_checksum_covers_the_files_read_and_nothing_else(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10")
    first = read_acquired(folder).metadata.sha256
    write_pdata(folder, lines_spectrum())
    assert read_acquired(folder).metadata.sha256 == first
    moved = tmp_path / "elsewhere" / "77"
    shutil.copytree(folder, moved)
    assert read_acquired(moved).metadata.sha256 == first
    content = bytearray((folder / "fid").read_bytes())
    content[100] ^= 1
    (folder / "fid").write_bytes(bytes(content))
    assert read_acquired(folder).metadata.sha256 != first


def test_checksum_can_be_computed_by_hand(tmp_path: Path) -> None:
    folder = write_bruker(tmp_path / "10")
    plain = b"".join(
        name.encode() + b"\0" + (folder / name).read_bytes()
        for name in ("acqus", "fid")
    )
    assert read_acquired(folder).metadata.sha256 == hashlib.sha256(plain).hexdigest()
