"""Oddities of the other makers' files: Varian, JEOL, nmrML, Spinsolve."""

import struct
from pathlib import Path

import numpy as np
import pytest
from nmrglue.fileio import jeol as nmrglue_jeol
from nmrglue.fileio import varian as nmrglue_varian

from instrument_files import (
    CARRIER_PPM,
    FREQUENCY_MHZ,
    WIDTH_HZ,
    interleaved,
    jeol_record,
    known_fid,
    write_jeol,
    write_nmrml,
    write_spinsolve,
    write_varian,
)
from spinledger.io.jeol_layout import digital_filter_delay
from spinledger.io.read import list_experiments, read_acquired
from spinledger.values.acquisition import Fid, MakerSpectrum


def fid_of(place: Path) -> Fid:
    acquired = read_acquired(place)
    assert isinstance(acquired, Fid)
    return acquired


# ---- Varian


def test_varian_layout_agrees_with_nmrglue(tmp_path: Path) -> None:
    folder = write_varian(tmp_path / "x.fid")
    _, expected = nmrglue_varian.read(str(folder))
    np.testing.assert_array_equal(fid_of(folder).samples, np.conj(expected))


@pytest.mark.parametrize(
    "oddity",
    [
        "lonely\n",  # a line with too few words
        "name 2 2 8 0 0 2 1 0 1 64\n0 \n0 \n",  # a text without a value
        'note 2 2 8 0 0 2 1 0 1 64\n2 "one\n two" \n"three"\n0 \n',  # over lines
        "arr 1 1 1 1 0 2 1 0 1 64\n3 1 2 3 \n0 \n",
    ],
)
def test_odd_entries_of_older_procpar_files_do_no_harm(
    oddity: str, tmp_path: Path
) -> None:
    folder = write_varian(tmp_path / "x.fid")
    text = (folder / "procpar").read_text()
    (folder / "procpar").write_text(oddity + text + oddity)
    np.testing.assert_array_equal(fid_of(folder).samples, known_fid())


def test_procpar_that_stops_nmrglue_is_read(tmp_path: Path) -> None:
    folder = write_varian(tmp_path / "x.fid")
    (folder / "procpar").write_text(
        "name 2 2 8 0 0 2 1 0 1 64\n0 \n0 \n" + (folder / "procpar").read_text()
    )
    with pytest.raises(IndexError):  # the fault that this reader goes round
        nmrglue_varian.read(str(folder))
    assert fid_of(folder).spectral_width_hz == WIDTH_HZ


@pytest.mark.parametrize("labels", [{"ni": 128}, {"arraydim": 8}])
def test_arrayed_varian_data_are_refused(
    labels: dict[str, object], tmp_path: Path
) -> None:
    with pytest.raises(ValueError, match="2D or arrayed experiment"):
        read_acquired(write_varian(tmp_path / "x.fid", **labels))


def test_several_blocks_are_refused_before_anything_is_allocated(
    tmp_path: Path,
) -> None:
    folder = write_varian(tmp_path / "x.fid")
    content = bytearray((folder / "fid").read_bytes())
    struct.pack_into(">i", content, 0, 2**31 - 1)
    (folder / "fid").write_bytes(bytes(content))
    with pytest.raises(ValueError, match="2D or arrayed experiment"):
        read_acquired(folder)


def test_varian_carrier_without_a_reference_line(tmp_path: Path) -> None:
    fid = fid_of(write_varian(tmp_path / "x.fid", rfl="", rfp=""))
    # 1e-6 ppm: the difference of two frequencies of 12 digits.
    assert fid.carrier_ppm == pytest.approx(CARRIER_PPM, abs=1e-6)


def test_cut_varian_fid(tmp_path: Path) -> None:
    folder = write_varian(tmp_path / "x.fid")
    content = (folder / "fid").read_bytes()
    (folder / "fid").write_bytes(content[: 60 + 8 * 700])
    np.testing.assert_array_equal(fid_of(folder).samples, known_fid()[:700])
    (folder / "fid").write_bytes(content[:50])
    with pytest.raises(ValueError, match="cut short within its header"):
        read_acquired(folder)


# ---- JEOL


def test_jeol_layout_agrees_with_nmrglue(tmp_path: Path) -> None:
    path = write_jeol(tmp_path / "x.jdf", known_fid(1024))
    _, expected = nmrglue_jeol.read(str(path))
    np.testing.assert_array_equal(fid_of(path).samples, expected)


@pytest.mark.parametrize(
    ("orders", "factors", "points"),
    [
        ("2 41 73", "6  2", 20 / 12 + 36 / 2),  # 19.67, as for the acquired file
        ("24173", "62", 20 / 12 + 36 / 2),  # the same without its spaces
        ("1 25", "4", 12 / 4),
        ("3 11 21 31", "2 3 4", 5 / 24 + 10 / 12 + 15 / 4),
        ("", "", None),
        ("2 41", "6 2", None),
        ("2 41 73", "6 0", None),
        ("x", "y", None),
    ],
)
def test_delay_of_a_cascade_of_filters(
    orders: str, factors: str, points: float | None
) -> None:
    delay = digital_filter_delay(orders, factors)
    assert delay == (None if points is None else pytest.approx(points, rel=1e-12))


def test_jeol_without_filter_has_no_delay_and_without_orders_a_note(
    tmp_path: Path,
) -> None:
    off = fid_of(write_jeol(tmp_path / "a", digital_filter="FALSE"))
    assert (off.group_delay_points, off.metadata.notes) == (0.0, ())
    unknown = fid_of(write_jeol(tmp_path / "b", orders="", factors=""))
    assert any("delay" in note for note in unknown.metadata.notes)


def test_units_of_mega_and_more_in_older_files(tmp_path: Path) -> None:
    path = write_jeol(tmp_path / "x.jdf")
    content = bytearray(path.read_bytes())
    position = content.index(b"x_sweep") - 36
    content[position + 6] = 0xE1  # prefix -2 (mega), first power
    path.write_bytes(bytes(content))
    with pytest.raises(KeyError):  # the fault that this reader goes round
        nmrglue_jeol.read(str(path))
    np.testing.assert_array_equal(fid_of(path).samples, known_fid())


def test_absurd_scalers_and_titles_do_no_harm(tmp_path: Path) -> None:
    path = write_jeol(tmp_path / "x.jdf")
    content = bytearray(path.read_bytes())
    position = content.index(b"solvent") - 36
    struct.pack_into("<h", content, position + 4, 32000)
    content[48:56] = "水の試料".encode("shift_jis")
    path.write_bytes(bytes(content))
    facts = fid_of(path).metadata
    assert (facts.solvent, facts.title) == ("CHLOROFORM-D", "水の試料")


def test_jeol_units_scale_values(tmp_path: Path) -> None:
    path = write_jeol(tmp_path / "x.jdf", x_pulse=8.75, temp_get=25.0)
    content = bytearray(path.read_bytes())
    pulse, temperature = content.index(b"x_pulse") - 36, content.index(b"temp_get") - 36
    content[pulse + 6 : pulse + 8] = bytes((0x21, 28))  # microseconds
    content[temperature + 6 : temperature + 8] = bytes((0x01, 4))  # degrees Celsius
    path.write_bytes(bytes(content))
    facts = fid_of(path).metadata
    assert facts.pulse_length_us == pytest.approx(8.75)
    assert facts.temperature_k == pytest.approx(298.15)


def test_jeol_spectrum_has_its_axis_in_ppm(tmp_path: Path) -> None:
    values = np.fft.fftshift(np.fft.fft(known_fid()))[::-1]
    path = write_jeol(tmp_path / "x.jdf", values)
    content = bytearray(path.read_bytes())
    content[32:34] = bytes((0x01, 26))  # ppm
    struct.pack_into(">d", content, 272, 11.0)
    struct.pack_into(">d", content, 336, -1.0)
    path.write_bytes(bytes(content))
    acquired = read_acquired(path)
    assert isinstance(acquired, MakerSpectrum)
    np.testing.assert_allclose(acquired.spectrum.shifts_ppm[[0, -1]], [11, -1])
    np.testing.assert_allclose(acquired.spectrum.intensities, values.real)


@pytest.mark.parametrize("n_axes", [2, 3])
def test_jeol_of_more_dimensions_is_refused(n_axes: int, tmp_path: Path) -> None:
    path = write_jeol(tmp_path / "x.jdf")
    content = bytearray(path.read_bytes())
    content[24 : 24 + n_axes] = b"\3" * n_axes
    path.write_bytes(bytes(content))
    with pytest.raises(ValueError, match="2D or arrayed data"):
        read_acquired(path)


def test_absurd_jeol_sizes_are_refused(tmp_path: Path) -> None:
    path = write_jeol(tmp_path / "x.jdf")
    content = bytearray(path.read_bytes())
    struct.pack_into(">I", content, 176, 2**32 - 1)
    path.write_bytes(bytes(content))
    with pytest.raises(ValueError, match="declares 4294967295 data points"):
        read_acquired(path)


def test_jeol_record_is_64_bytes() -> None:
    assert {len(jeol_record("x", value)) for value in ("text", 1, 1.5)} == {64}


# ---- nmrML


@pytest.mark.parametrize(
    "byte_format", ["Complex128", "complex128", "class java.lang.Integer"]
)
def test_both_byte_formats_of_nmrml(byte_format: str, tmp_path: Path) -> None:
    path = write_nmrml(tmp_path / "x", byte_format=byte_format)
    np.testing.assert_array_equal(fid_of(path).samples, known_fid())


def test_nmrml_from_a_varian_keeps_the_makers_sense(tmp_path: Path) -> None:
    path = write_nmrml(tmp_path / "x", maker="Varian NMR instrument")
    np.testing.assert_array_equal(fid_of(path).samples, np.conj(known_fid()))


def test_nmrml_with_entities_is_refused(tmp_path: Path) -> None:
    bomb = '<!DOCTYPE a [<!ENTITY b "bbbbbbbbbb"><!ENTITY c "&b;&b;&b;&b;&b;">]>'
    with pytest.raises(ValueError, match="declares XML entities"):
        read_acquired(write_nmrml(tmp_path / "x", head=bomb))


def test_nmrml_that_unpacks_beyond_the_limit_is_refused(tmp_path: Path) -> None:
    huge = np.zeros(2**21 + 10, dtype=complex)
    with pytest.raises(ValueError, match="unpacks to more than"):
        read_acquired(write_nmrml(tmp_path / "x", huge))


@pytest.mark.parametrize(
    ("old", "new", "reason"),
    [
        ("</nmrML>", "", "not complete XML"),
        ("Complex128", "roman", "unknown byte format"),
        ("<fidData", "<otherData", "not complete XML|no data"),
        ('value="5000.0"', 'value="x"', "does not state its spectral width"),
    ],
)
def test_damaged_nmrml_says_what_is_wrong(
    old: str, new: str, reason: str, tmp_path: Path
) -> None:
    path = write_nmrml(tmp_path / "x")
    path.write_text(path.read_text().replace(old, new))
    with pytest.raises(ValueError, match=reason):
        read_acquired(path)


# ---- Spinsolve


def with_spectrum(folder: Path, *, mirrored: bool) -> Path:
    """Lay the maker's spectrum beside a FID, in the right sense."""
    fid = known_fid()
    folder = write_spinsolve(folder, np.conj(fid) if mirrored else fid)
    values = np.fft.fftshift(np.fft.fft(fid))
    width_ppm = WIDTH_HZ / FREQUENCY_MHZ
    axis = CARRIER_PPM + width_ppm * (np.arange(fid.size) / fid.size - 0.5)
    (folder / "spectrum.1d").write_bytes(
        (folder / "data.1d").read_bytes()[:32]
        + axis.astype("<f4").tobytes()
        + interleaved(values, "<f4")
    )
    return folder


@pytest.mark.parametrize("mirrored", [False, True])
def test_spinsolve_sense_is_told_by_the_spectrum_beside(
    tmp_path: Path, *, mirrored: bool
) -> None:
    fid = fid_of(with_spectrum(tmp_path / "x", mirrored=mirrored))
    np.testing.assert_array_equal(fid.samples, known_fid())


def test_spinsolve_spectrum_on_demand(tmp_path: Path) -> None:
    folder = with_spectrum(tmp_path / "x", mirrored=False)
    acquired = read_acquired(folder, prefer_processed=True)
    assert isinstance(acquired, MakerSpectrum)
    # 1e-5 ppm: the axis is written in single precision.
    top_ppm = CARRIER_PPM + WIDTH_HZ / FREQUENCY_MHZ * (0.5 - 1 / 1024)
    assert acquired.spectrum.first_point_ppm == pytest.approx(top_ppm, abs=1e-5)
    (listed,) = list_experiments(folder)
    assert (listed.has_fid, listed.has_spectrum) == (True, True)


def test_spinsolve_array_and_cut_files_are_refused(tmp_path: Path) -> None:
    folder = write_spinsolve(tmp_path / "x")
    content = (folder / "data.1d").read_bytes()
    struct_array = bytearray(content)
    struct.pack_into("<i", struct_array, 20, 16)
    (folder / "data.1d").write_bytes(bytes(struct_array))
    with pytest.raises(ValueError, match="2D or arrayed"):
        read_acquired(folder)
    (folder / "data.1d").write_bytes(content[:-4])
    with pytest.raises(ValueError, match="cut short or damaged"):
        read_acquired(folder)
